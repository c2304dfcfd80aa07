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
    /// The instructions that trajectories are computed with, `avx512`, `avx2`, `neon` or `software`. All give the same
    /// bits; `software`, where the processor has no fused multiply-add, slowly.
    arithmetic: &'static str,
}

/// The instructions that trajectories are computed with here.
#[must_use]
pub fn arithmetic() -> &'static str {
    let path = mechanics::taylor::Path::fastest();
    match (path.is_fused(), path.name()) {
        (false, _) => "software",
        (true, "portable") => "neon",
        (true, name) => name,
    }
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
