//! `POST /v1/trajectories`.

mod events;
mod request;
mod response;
mod solve;
mod span;

use axum::extract::State;
use axum::response::Response;

use crate::extract::Submission;
use crate::operation;
use crate::problem::Problem;
use crate::state::App;

use request::TrajectoriesRequest;
use response::{TrajectoriesAnswer, TrajectoriesLine};

/// Trajectories of one or many states
///
/// Propagates each state by its Taylor series, with samples from the dense polynomial, events, manoeuvres, contact
/// with the primaries' surfaces and state transition matrices. A trajectory that ends early says why in its
/// `outcome`, and a client can go on from its `final` state. As `application/x-ndjson` each is sent in a line of its own
/// once it is computed, in ascending order and without a limit on the number of samples.
#[utoipa::path(post, path = "/v1/trajectories", tag = "motion", request_body = TrajectoriesRequest, responses(
    (status = 200, description = "The trajectories, in the order of their initial states", content(
        (TrajectoriesAnswer = "application/json"), (TrajectoriesLine = "application/x-ndjson")))))]
pub(crate) async fn trajectories(
    State(app): State<App>,
    submission: Submission,
) -> Result<Response, Problem> {
    operation::answer::<TrajectoriesRequest>(app, submission).await
}
