//! `POST /v1/units/convert`: quantities between normalised and physical units.

mod request;
mod response;

use std::time::Duration;

use axum::extract::State;
use axum::response::Response;

use crate::answer::Effort;
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::Submission;
use crate::operation::{self, Operation, Work};
use crate::problem::Problem;
use crate::state::App;
use request::{Task, UnitsConvertRequest};
use response::UnitsConvertAnswer;

/// Quantities between normalised and physical units
///
/// Physical units convert among themselves without any scale; to or from normalised ones the system must have it.
#[utoipa::path(post, path = "/v1/units/convert", tag = "states", request_body = UnitsConvertRequest,
    responses((status = 200, body = UnitsConvertAnswer, description = "The values, each with its result")))]
pub(crate) async fn units_convert(
    State(app): State<App>,
    submission: Submission,
) -> Result<Response, Problem> {
    operation::answer::<UnitsConvertRequest>(app, submission).await
}

impl Operation for UnitsConvertRequest {
    type Task = Task;

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.task(limits, errors)
    }

    fn cost(_: &Task) -> Duration {
        // Checking has converted already.
        Duration::ZERO
    }

    fn work(task: Task, _: bool) -> Work {
        Work::whole(|_| {
            let steps = u64::try_from(task.values.len()).unwrap_or(u64::MAX);
            Ok((UnitsConvertAnswer::new(task), Effort { steps, outcome: None }))
        })
    }
}
