//! `POST /v1/jacobi`: Jacobi constants, energies and reachable regions of states.

mod request;
mod response;

use std::sync::Arc;
use std::time::Duration;

use axum::extract::State;
use mechanics::equilibria::Equilibria;

use crate::answer::{Answer, Effort};
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::Submission;
use crate::operation::{self, Operation, Solved};
use crate::pool::Context;
use crate::problem::Problem;
use crate::state::App;
use request::{JacobiRequest, Task};
use response::{Energetics, JacobiAnswer};

/// Jacobi constant, energy and reachable regions of states
///
/// Of each state its Jacobi constant, where it is relative to the passages at L1, L2 and L3, which of them its energy
/// opens, and which regions it can reach through them.
#[utoipa::path(post, path = "/v1/jacobi", tag = "states", request_body = JacobiRequest,
    responses((status = 200, body = JacobiAnswer, description = "The states' constants, in the request's order")))]
pub(crate) async fn jacobi(State(app): State<App>, submission: Submission) -> Result<Answer, Problem> {
    operation::answer::<JacobiRequest>(app, submission).await
}

impl Operation for JacobiRequest {
    type Task = Task;
    type Output = JacobiAnswer;

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.task(limits, errors)
    }

    fn cost(task: &Task) -> Duration {
        /// Measured, with writing the answer, of a state whose region is found by ascent.
        const PER_STATE: Duration = Duration::from_micros(3);
        PER_STATE.saturating_mul(u32::try_from(task.states.len()).unwrap_or(u32::MAX))
    }

    fn wall_time(task: &Task) -> Option<Duration> {
        Some(task.wall_time)
    }

    fn solve(task: Task, context: &Context) -> Result<Solved<JacobiAnswer>, Problem> {
        let Task { conventions, form, states, .. } = task;
        let effort = Effort { steps: u64::try_from(states.len()).unwrap_or(u64::MAX), outcome: None };
        let equilibria = Equilibria::of(conventions.system.mass_parameter());
        let scale = conventions.scale;
        let states = Arc::new(states);
        let each = Arc::clone(&states);
        let energetics = operation::batch(context, states.len(), move |index| {
            Energetics::new(&each[index], &equilibria, &scale, form.into())
        })?;
        let output = JacobiAnswer::new(conventions, form, &equilibria, &states, energetics);
        Ok(Solved { output, effort })
    }
}
