//! `GET /openapi.json`.

use axum::extract::State;
use axum::response::Response;
use http::HeaderMap;

use crate::answer::{JSON, negotiation::negotiate};
use crate::problem::Problem;
use crate::state::App;

/// This document
#[utoipa::path(get, path = "/openapi.json", tag = "server", responses((status = 200, body = Object,
    content_type = "application/json", description = "The OpenAPI 3.1 document")))]
pub(crate) async fn openapi(State(app): State<App>, headers: HeaderMap) -> Result<Response, Problem> {
    negotiate(&headers, &[JSON])?;
    Ok(app.openapi.respond(&headers))
}
