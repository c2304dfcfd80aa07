//! From the checked request to the answer.

use std::sync::Arc;
use std::time::Duration;

use mechanics::propagation::{Failure, Outcome, Request, SampleBudget, Sampling, Trajectory, propagate};

use super::request::TrajectoriesRequest;
use super::response::{Solution, outcome_name};
use super::span::{DurationSpec, SamplesSpec};
use crate::answer::Effort;
use crate::config::Limits;
use crate::decode::{Errors, Path};
use crate::operation::{Operation, Solved};
use crate::pool::Context;
use crate::problem::Problem;
use crate::wire::Conventions;

/// Trajectories that a compute thread takes at a time: enough to make the taking cheap, few enough to share.
const PART: usize = 16;
/// What a trajectory may take is not known before; a thread that serves HTTP is not risked for it.
const UNKNOWN_COST: Duration = Duration::from_millis(1);

/// A checked request, and what of it the answer repeats in the client's own digits.
#[derive(Debug)]
pub(super) struct Task {
    pub request: Request,
    pub conventions: Conventions,
    pub names: Vec<Option<String>>,
    pub given_times: Vec<f64>,
    pub given_duration: DurationSpec,
    pub given_samples: Option<SamplesSpec>,
    pub wall_time: Duration,
}

impl Operation for TrajectoriesRequest {
    type Task = Task;
    type Output = Solution;

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.checked(limits, errors)
    }

    fn cost(_: &Task) -> Duration {
        UNKNOWN_COST
    }

    fn wall_time(task: &Task) -> Option<Duration> {
        Some(task.wall_time())
    }

    fn solve(task: Task, context: &Context) -> Result<Solved<Solution>, Problem> {
        let task = Arc::new(task);
        let budget = Arc::new(SampleBudget::new(task.request.limits().sample_values));
        let parts = {
            let (task, budget) = (Arc::clone(&task), Arc::clone(&budget));
            context.parts(task.request.count(), PART, move |range, interrupt| {
                let mut trajectories = Vec::with_capacity(range.len());
                propagate(&task.request, range, &budget, &mut trajectories, interrupt).map(|()| trajectories)
            })
        };
        let mut trajectories = Vec::with_capacity(task.request.count());
        for part in parts {
            trajectories.extend(part.map_err(|failure| refused(failure, &task))?);
        }
        let cut_short = |t: &Trajectory| matches!(t.outcome, Outcome::WallTimeLimit | Outcome::NotStarted);
        let outcome =
            if trajectories.iter().any(cut_short) { Outcome::WallTimeLimit } else { Outcome::Complete };
        let steps = trajectories.iter().map(|trajectory| trajectory.evidence.steps).sum();
        let effort = Effort { steps, outcome: Some(outcome_name(outcome)) };
        Ok(Solved { output: Solution { task, outcome, steps, trajectories }, effort })
    }
}

fn refused(failure: Failure, task: &Task) -> Problem {
    match failure {
        Failure::Cancelled => Problem::overloaded("The computation was cancelled"),
        Failure::UndefinedAxes { manoeuvre, .. } => {
            let mut errors = Errors::default();
            let (root, member) = (Path::ROOT, "manoeuvres");
            errors.push(root.member(member).item(manoeuvre).member("axes"), failure.to_string());
            errors.into()
        }
        Failure::TooManySamples { limit } => {
            let mut errors = Errors::default();
            let sampled = task.request.parts().sampling != Sampling::None;
            let member = if sampled { "samples" } else { "events" };
            errors.beyond(Path::ROOT.member(member), "values", limit, limit.saturating_add(1));
            errors.into()
        }
    }
}
