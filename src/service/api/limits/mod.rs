//! `GET /v1/limits`.

use axum::extract::State;
use serde::Serialize;
use utoipa::ToSchema;

use crate::answer::Answer;
use crate::extract::Plain;
use crate::problem::Problem;
use crate::state::App;

/// How much the server does for one request.
#[derive(Serialize, ToSchema)]
pub(crate) struct ServerLimits {
    /// Size of a request's body, in bytes.
    body_bytes: usize,
    /// States in a request.
    states: u64,
    /// Integration steps per trajectory.
    steps: u64,
    /// Events per trajectory.
    events: u64,
    /// Numbers in the samples and events of a buffered answer.
    sample_values: u64,
    /// Time for a computation that asks for none, in milliseconds.
    wall_time_ms: u128,
    /// Most time that a request may ask for, in milliseconds.
    max_wall_time_ms: u128,
    /// Time for a request's head, and again for its body, to arrive, in milliseconds.
    request_timeout_ms: u128,
    /// Time for a client to take the next part of an answer, in milliseconds.
    send_timeout_ms: u128,
    /// Threads that compute.
    compute_threads: usize,
    /// Computations that may wait for a thread.
    compute_queue: usize,
}

/// The server's limits
///
/// A request that asks for more is refused before any work is done; a value is never lowered silently.
#[utoipa::path(get, path = "/v1/limits", tag = "server", responses((status = 200, body = ServerLimits,
    description = "The limits in force")))]
pub(crate) async fn limits(State(app): State<App>, _: Plain) -> Result<Answer, Problem> {
    let config = &app.config;
    Answer::json(&ServerLimits {
        body_bytes: config.limits.body_bytes,
        states: config.limits.states,
        steps: config.limits.steps,
        events: config.limits.events,
        sample_values: config.limits.sample_values,
        wall_time_ms: config.limits.wall_time.as_millis(),
        max_wall_time_ms: config.limits.max_wall_time.as_millis(),
        request_timeout_ms: config.times.request.as_millis(),
        send_timeout_ms: config.times.send.as_millis(),
        compute_threads: config.compute.threads,
        compute_queue: config.compute.queue,
    })
}
