//! Access for pages of other origins, where origins are configured.

use axum::Router;
use http::{HeaderName, HeaderValue, Method, header};
use tower_http::cors::CorsLayer;

use crate::answer::{REPR_DIGEST, SERVER_TIMING};
use crate::middleware::X_REQUEST_ID;

/// Lets the pages of `origins` call; without any, nothing is added.
pub(crate) fn allow(router: Router, origins: Vec<HeaderValue>) -> Router {
    if origins.is_empty() {
        return router;
    }
    router.layer(
        CorsLayer::new()
            .allow_origin(origins)
            .allow_methods([Method::GET, Method::HEAD, Method::POST])
            .allow_headers([
                header::CONTENT_TYPE,
                header::AUTHORIZATION,
                header::ACCEPT,
                X_REQUEST_ID,
                HeaderName::from_static("traceparent"),
                header::IF_NONE_MATCH,
            ])
            .expose_headers([
                header::ETAG,
                REPR_DIGEST,
                X_REQUEST_ID,
                header::RETRY_AFTER,
                header::WWW_AUTHENTICATE,
                SERVER_TIMING,
            ]),
    )
}
