//! `POST /v1/jacobi`: Jacobi constants, energies and reachable regions of states.

mod request;
mod response;

use std::ops::Range;
use std::sync::Arc;
use std::time::Duration;

use axum::extract::State;
use axum::response::Response;
use mechanics::equilibria::Equilibria;
use mechanics::interrupt::Interrupt;

use crate::answer::{Effort, written};
use crate::config::Limits;
use crate::decode::Errors;
use crate::extract::Submission;
use crate::operation::{self, Items, Operation, Out, Tally, Work};
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
pub(crate) async fn jacobi(State(app): State<App>, submission: Submission) -> Result<Response, Problem> {
    operation::answer::<JacobiRequest>(app, submission).await
}

impl Operation for JacobiRequest {
    type Task = Task;

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

    fn work(task: Task, _: bool) -> Work {
        let equilibria = Equilibria::of(task.conventions.system.mass_parameter());
        Work::Items(Arc::new(Energies { task, equilibria, largest_departure: Tally::default() }))
    }
}

/// The states' constants, to be computed.
struct Energies {
    task: Task,
    equilibria: Equilibria,
    largest_departure: Tally<f64>,
}

impl Items for Energies {
    fn count(&self) -> usize {
        self.task.states.len()
    }

    fn compute(
        &self,
        range: Range<usize>,
        out: &mut Out<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<(), Problem> {
        let Task { conventions, form, states, .. } = &self.task;
        let mut largest = 0.0_f64;
        operation::each(range, interrupt, |index| {
            let state = &states[index];
            largest = largest.max(state.departure_from_definition());
            out.item("state", &Energetics::new(state, &self.equilibria, &conventions.scale, (*form).into()))
        })?;
        self.largest_departure.add(|sum| *sum = sum.max(largest));
        Ok(())
    }

    fn envelope(&self) -> Result<Vec<u8>, Problem> {
        let Task { conventions, form, .. } = &self.task;
        written(&JacobiAnswer::new(conventions, *form, &self.equilibria, self.largest_departure.sum()))
    }

    fn effort(&self) -> Effort {
        Effort { steps: u64::try_from(self.count()).unwrap_or(u64::MAX), outcome: None }
    }
}
