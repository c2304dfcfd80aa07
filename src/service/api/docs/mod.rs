//! `GET /docs`: a page to read the contract and to try it. Everything it needs is in it.

use std::sync::LazyLock;

use axum::response::Response;
use base64::Engine;
use base64::prelude::BASE64_STANDARD;
use http::{HeaderMap, HeaderValue, header};
use sha2::{Digest, Sha256};

use crate::answer::{Document, negotiation::negotiate};
use crate::problem::Problem;

const HTML: &str = "text/html; charset=utf-8";
const STYLE: &str = include_str!("style.css");
const SCRIPT: &str = include_str!("script.js");

static PAGE: LazyLock<Document> = LazyLock::new(|| {
    let page = include_str!("page.html").replace("/*style*/", STYLE).replace("/*script*/", SCRIPT);
    Document::new(HTML, page)
});

/// Nothing but the page's own style and script, known by their hashes, and calls to this very server.
static POLICY: LazyLock<HeaderValue> = LazyLock::new(|| {
    let hash = |text: &str| BASE64_STANDARD.encode(Sha256::digest(text));
    let policy = format!(
        "default-src 'none'; style-src 'sha256-{}'; script-src 'sha256-{}'; connect-src 'self'; img-src data:; \
         base-uri 'none'; form-action 'none'; frame-ancestors 'none'",
        hash(STYLE),
        hash(SCRIPT)
    );
    HeaderValue::from_str(&policy).unwrap_or_else(|_| HeaderValue::from_static("default-src 'none'"))
});

/// The interface, to read and to try
#[utoipa::path(get, path = "/docs", tag = "server", responses((status = 200,
    description = "A page that needs nothing but this server", body = String, content_type = "text/html")))]
pub(crate) async fn docs(headers: HeaderMap) -> Result<Response, Problem> {
    negotiate(&headers, &[HTML])?;
    let mut response = PAGE.respond(&headers);
    response.headers_mut().insert(header::CONTENT_SECURITY_POLICY, POLICY.clone());
    Ok(response)
}
