//! `GET /v1/version`.

use axum::response::Response;
use serde::Serialize;
use std::sync::LazyLock;
use utoipa::ToSchema;

use crate::answer::{Document, JSON};
use crate::extract::Plain;

/// What is running.
#[derive(Serialize, ToSchema)]
pub(crate) struct Version {
    /// Name of the service.
    name: &'static str,
    /// Its version.
    #[serde(rename = "version")]
    release: &'static str,
    /// The commit it was built from, `unknown` outside a repository.
    commit: &'static str,
    /// How multiply-add is done: `fma` in one instruction; `software` where the processor has none, with the same
    /// bits but slowly.
    arithmetic: &'static str,
}

/// How this processor does a fused multiply-add.
#[must_use]
pub fn arithmetic() -> &'static str {
    #[cfg(target_arch = "x86_64")]
    if !std::arch::is_x86_feature_detected!("fma") {
        return "software";
    }
    "fma"
}

static VERSION: LazyLock<Document> = LazyLock::new(|| {
    let version = Version {
        name: env!("CARGO_PKG_NAME"),
        release: env!("CARGO_PKG_VERSION"),
        commit: env!("SOURCE_COMMIT"),
        arithmetic: arithmetic(),
    };
    Document::new(JSON, serde_json::to_vec(&version).unwrap_or_default())
});

/// Version, commit and arithmetic path
#[utoipa::path(get, path = "/v1/version", tag = "server", responses((status = 200, body = Version,
    description = "What is running")))]
pub(crate) async fn version(request: Plain) -> Response {
    VERSION.respond(&request.0)
}
