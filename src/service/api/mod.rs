//! The table of contents: every path the service answers.

mod docs;
mod equilibria;
mod frames_convert;
mod health;
mod jacobi;
mod limits;
mod openapi;
mod problems;
mod systems;
mod trajectories;
mod units_convert;
mod version;

pub use version::arithmetic;

use axum::Router;
use axum::middleware::from_fn_with_state;
use utoipa::OpenApi;
use utoipa_axum::router::OpenApiRouter;
use utoipa_axum::routes;

use crate::answer::{Document, JSON};
use crate::config::Config;
use crate::state::App;
use crate::{cors, middleware};

/// Every operation, a line each.
fn operations() -> OpenApiRouter<App> {
    OpenApiRouter::with_openapi(crate::openapi::Api::openapi())
        .routes(routes!(systems::systems))
        .routes(routes!(systems::system))
        .routes(routes!(equilibria::of_system))
        .routes(routes!(equilibria::equilibria))
        .routes(routes!(jacobi::jacobi))
        .routes(routes!(units_convert::units_convert))
        .routes(routes!(frames_convert::frames_convert))
        .routes(routes!(trajectories::trajectories))
        .routes(routes!(limits::limits))
        .routes(routes!(version::version))
        .routes(routes!(health::livez))
        .routes(routes!(health::readyz))
        .routes(routes!(openapi::openapi))
        .routes(routes!(docs::docs))
        .routes(routes!(problems::problem))
}

/// The `OpenAPI` document as a JSON text, indented, with a line break at its end.
///
/// # Panics
/// Never: the document has no part that JSON cannot write.
#[must_use]
pub fn document() -> String {
    let mut document = operations().into_openapi();
    crate::openapi::complete(&mut document);
    let mut text = document.to_pretty_json().expect("a document is JSON");
    text.push('\n');
    text
}

/// Starts the compute threads and builds the router.
///
/// # Errors
/// The operating system's, if it grants no compute thread.
pub fn start(config: Config) -> std::io::Result<(App, Router)> {
    let origins = config.cors_origins.clone();
    let app = App::start(config, Document::new(JSON, document()))?;
    let (router, _) = operations().split_for_parts();
    let router = router.layer(from_fn_with_state(app.clone(), middleware::observe)).with_state(app.clone());
    Ok((app, cors::allow(router, origins)))
}
