//! `POST /v1/frames/convert`: states between units, frames and variables.

mod convert;
mod request;
mod response;

use std::sync::Arc;
use std::time::Duration;

use axum::extract::State;

use crate::answer::{Answer, Effort};
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::Submission;
use crate::operation::{self, Operation, Solved};
use crate::pool::Context;
use crate::problem::Problem;
use crate::state::App;
use request::{FramesConvertRequest, Task};
use response::FramesConvertAnswer;

/// States between units, frames, velocity, momentum and elements
///
/// Each state of the answer can be sent wherever a request in the answer's units and frame takes one.
#[utoipa::path(post, path = "/v1/frames/convert", tag = "states", request_body = FramesConvertRequest,
    responses((status = 200, body = FramesConvertAnswer, description = "The states, in the request's order")))]
pub(crate) async fn frames_convert(
    State(app): State<App>,
    submission: Submission,
) -> Result<Answer, Problem> {
    operation::answer::<FramesConvertRequest>(app, submission).await
}

impl Operation for FramesConvertRequest {
    type Task = Task;
    type Output = FramesConvertAnswer;

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.task(limits, errors)
    }

    fn cost(task: &Task) -> Duration {
        /// Measured, with elements and with writing the answer.
        const PER_STATE: Duration = Duration::from_micros(2);
        PER_STATE.saturating_mul(u32::try_from(task.states.len()).unwrap_or(u32::MAX))
    }

    fn wall_time(task: &Task) -> Option<Duration> {
        Some(task.wall_time)
    }

    fn solve(task: Task, context: &Context) -> Result<Solved<FramesConvertAnswer>, Problem> {
        let Task { from, to, states, .. } = task;
        let count = states.len();
        let (states, shared) = (Arc::new(states), Arc::new(to));
        let to = Arc::clone(&shared);
        let converted = operation::batch(context, count, move |index| to.convert(&states[index]))?;
        let output = FramesConvertAnswer::new(&from, &shared, converted);
        let effort = Effort { steps: u64::try_from(count).unwrap_or(u64::MAX), outcome: None };
        Ok(Solved { output, effort })
    }
}
