//! `POST /v1/frames/convert`: states between units, frames and variables.

mod convert;
mod request;
mod response;

use std::ops::Range;
use std::sync::Arc;
use std::time::Duration;

use axum::extract::State;
use axum::response::Response;
use mechanics::interrupt::Interrupt;

use crate::answer::{Effort, written};
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::Submission;
use crate::operation::{self, Items, Operation, Out, Tally, Work};
use crate::problem::Problem;
use crate::state::App;
use request::{FramesConvertRequest, Task};
use response::{FramesConvertAnswer, FramesConvertEvidence};

/// States between units, frames, velocity, momentum and elements
///
/// Each state of the answer can be sent wherever a request in the answer's units and frame takes one.
#[utoipa::path(post, path = "/v1/frames/convert", tag = "states", request_body = FramesConvertRequest,
    responses((status = 200, body = FramesConvertAnswer, description = "The states, in the request's order")))]
pub(crate) async fn frames_convert(
    State(app): State<App>,
    submission: Submission,
) -> Result<Response, Problem> {
    operation::answer::<FramesConvertRequest>(app, submission).await
}

impl Operation for FramesConvertRequest {
    type Task = Task;

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

    fn work(task: Task, _: bool) -> Work {
        Work::Items(Arc::new(Conversion { task, largest: Tally::default() }))
    }
}

/// The states, to be converted.
struct Conversion {
    task: Task,
    largest: Tally<FramesConvertEvidence>,
}

impl Items for Conversion {
    fn count(&self) -> usize {
        self.task.states.len()
    }

    fn compute(
        &self,
        range: Range<usize>,
        out: &mut Out<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<(), Problem> {
        let mut largest = FramesConvertEvidence::default();
        operation::each(range, interrupt, |index| {
            let converted = self.task.to.convert(&self.task.states[index]);
            largest.take(&converted.evidence);
            out.item("state", &converted.state)
        })?;
        self.largest.add(|all| all.take(&largest));
        Ok(())
    }

    fn envelope(&self) -> Result<Vec<u8>, Problem> {
        written(&FramesConvertAnswer::new(&self.task.from, &self.task.to, self.largest.sum()))
    }

    fn effort(&self) -> Effort {
        Effort { steps: u64::try_from(self.count()).unwrap_or(u64::MAX), outcome: None }
    }
}
