//! `GET /livez` and `GET /readyz`, for whoever runs the server.

use axum::extract::State;
use serde::Serialize;
use utoipa::ToSchema;

use crate::answer::Answer;
use crate::problem::Problem;
use crate::state::App;

/// The server's own view of its health.
#[derive(Serialize, ToSchema)]
pub(crate) struct Health {
    /// `live` or `ready`.
    status: &'static str,
}

/// Whether the process is alive
#[utoipa::path(get, path = "/livez", tag = "server", responses((status = 200, body = Health,
    description = "The process answers")))]
pub(crate) async fn livez() -> Result<Answer, Problem> {
    Answer::json(&Health { status: "live" })
}

/// Whether the server takes new work
#[utoipa::path(get, path = "/readyz", tag = "server", responses((status = 200, body = Health,
    description = "The server takes new work; 503 as soon as it is asked to stop")))]
pub(crate) async fn readyz(State(app): State<App>) -> Result<Answer, Problem> {
    if app.is_stopping() {
        return Err(Problem::overloaded("The server is stopping"));
    }
    Answer::json(&Health { status: "ready" })
}
