//! `GET /docs`: a page to read the contract and to try it. Everything it needs is in it.

use std::sync::LazyLock;

use axum::response::Response;
use http::{HeaderMap, HeaderValue, header};

use crate::answer::{Document, negotiation::negotiate};
use crate::problem::Problem;

const HTML: &str = "text/html; charset=utf-8";

static PAGE: LazyLock<Document> = LazyLock::new(|| {
    let page = include_str!("page.html")
        .replace("/*style*/", include_str!("style.css"))
        .replace("/*script*/", include_str!("script.js"));
    Document::new(HTML, page)
});

/// The interface, to read and to try
#[utoipa::path(get, path = "/docs", tag = "server", responses((status = 200,
    description = "A page that needs nothing but this server", body = String, content_type = "text/html")))]
pub(crate) async fn docs(headers: HeaderMap) -> Result<Response, Problem> {
    negotiate(&headers, &[HTML])?;
    let mut response = PAGE.respond(&headers);
    response.headers_mut().insert(header::CONTENT_SECURITY_POLICY, HeaderValue::from_static(POLICY));
    Ok(response)
}

/// Nothing but the page itself, and calls to this very server.
const POLICY: &str = "default-src 'none'; style-src 'unsafe-inline'; script-src 'unsafe-inline'; \
    connect-src 'self'; img-src data:; base-uri 'none'; form-action 'none'; frame-ancestors 'none'";
