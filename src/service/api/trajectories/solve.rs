//! From the checked request to the answer's items.

use std::collections::BTreeMap;
use std::ops::Range;
use std::sync::Arc;
use std::time::Duration;

use mechanics::interrupt::Interrupt;
use mechanics::propagation::{
    Arithmetic, EXTENDED_WEIGHT, Failure, Outcome, Request, SampleBudget, Samples, Sampling, Sink,
    Trajectory, VALUES_PER_EVENT, propagate,
};

use super::request::TrajectoriesRequest;
use super::response::outcome_name;
use super::span::{DurationSpec, SamplesSpec};
use crate::answer::{Effort, JSON, NDJSON, written};
use crate::config::Limits;
use crate::decode::{Errors, Path};
use crate::operation::{Items, LARGEST_PART, Lines, Operation, Out, SMALLEST_PART, Tally, Work};
use crate::problem::{Problem, Slug};
use crate::wire::Conventions;

/// What a trajectory may take is not known before; a thread that serves HTTP is not risked for it.
const UNKNOWN_COST: Duration = Duration::from_millis(1);
/// Samples of one line of a stream.
const SAMPLES_PER_LINE: usize = 10_000;
/// Numbers in the samples of a part: what is written of it then fits into the room that a part of a stream has.
const VALUES_PER_PART: u64 = 32 << 10;
/// Lines of samples that may still be written of one trajectory when the time is up: those of the step under way, if it
/// does not hold more than anybody can use.
const LATE_LINES: usize = 100;
/// Samples or events of a trajectory that has one at every step, roughly.
const STEPS: u64 = 128;

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
    const OFFERED: &'static [&'static str] = &[JSON, NDJSON];

    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        self.checked(limits, errors)
    }

    fn cost(_: &Task) -> Duration {
        UNKNOWN_COST
    }

    fn wall_time(task: &Task) -> Option<Duration> {
        Some(task.wall_time())
    }

    fn work(task: Task, streamed: bool) -> Work {
        let budget = SampleBudget::new(task.request.limits().sample_values);
        let trajectories = Arc::new(Trajectories { task, budget, totals: Tally::default() });
        if streamed { Work::Lines(trajectories) } else { Work::Items(trajectories) }
    }
}

/// The trajectories to be computed.
struct Trajectories {
    task: Task,
    budget: SampleBudget,
    totals: Tally<Totals>,
}

/// What is known of all trajectories together.
#[derive(Clone, Debug, Default)]
pub(super) struct Totals {
    /// How many ended in which way.
    pub outcomes: BTreeMap<&'static str, u64>,
    /// Steps of all.
    pub steps: u64,
    /// Largest drift of the Jacobi constant, normalised.
    pub jacobi_drift: f64,
}

impl Totals {
    fn take(&mut self, other: &Self) {
        for (outcome, count) in &other.outcomes {
            *self.outcomes.entry(outcome).or_default() += count;
        }
        self.steps += other.steps;
        self.jacobi_drift = self.jacobi_drift.max(other.jacobi_drift);
    }

    /// Whether all trajectories had the time that they needed.
    pub(super) fn outcome(&self) -> Outcome {
        let cut_short = [Outcome::WallTimeLimit, Outcome::NotStarted].map(outcome_name);
        if cut_short.iter().any(|outcome| self.outcomes.contains_key(outcome)) {
            Outcome::WallTimeLimit
        } else {
            Outcome::Complete
        }
    }
}

impl Trajectories {
    /// About how many times as long a trajectory takes as it would in double precision.
    fn weight(&self) -> usize {
        let parts = self.task.request.parts();
        let extended = parts.audit || parts.arithmetic == Arithmetic::DoubleDouble;
        if extended { usize::try_from(EXTENDED_WEIGHT).unwrap_or(1) } else { 1 }
    }
}

impl Items for Trajectories {
    fn count(&self) -> usize {
        self.task.request.count()
    }

    fn largest_part(&self) -> usize {
        let (request, most) = (&self.task.request, LARGEST_PART / self.weight());
        // The first trajectory stands for all: nothing but the size of the parts hangs on it.
        let samples = request.planned_samples(0).unwrap_or(STEPS).saturating_mul(request.values_per_sample());
        let events = if request.parts().events.is_empty() { 0 } else { STEPS * VALUES_PER_EVENT };
        match samples.saturating_add(events) {
            0 => most,
            values => usize::try_from(VALUES_PER_PART / values).unwrap_or(1).clamp(1, most),
        }
    }

    fn smallest_part(&self) -> usize {
        (SMALLEST_PART / self.weight()).max(self.fewest_together())
    }

    fn fewest_together(&self) -> usize {
        if self.task.request.is_extended() { 1 } else { self.task.request.lanes() }
    }

    fn compute(
        &self,
        range: Range<usize>,
        out: &mut Out<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<(), Problem> {
        let task = &self.task;
        let mut writer = Writer {
            task,
            out,
            interrupt,
            handed_over: (0, 0),
            late_lines: 0,
            totals: Totals::default(),
            problem: None,
        };
        let propagated = propagate(&task.request, range, &self.budget, &mut writer, interrupt);
        let Writer { totals, problem, .. } = writer;
        self.totals.add(|all| all.take(&totals));
        match (problem, propagated) {
            (Some(problem), _) => Err(problem),
            (None, Err(failure)) => Err(refused(failure, task)),
            (None, Ok(())) => Ok(()),
        }
    }

    fn envelope(&self) -> Result<Vec<u8>, Problem> {
        written(&self.task.envelope(&self.totals.sum()))
    }

    fn effort(&self) -> Effort {
        let totals = self.totals.sum();
        Effort { steps: totals.steps, outcome: Some(outcome_name(totals.outcome())) }
    }
}

impl Lines for Trajectories {
    fn header(&self, out: &mut Out<'_>) -> Result<(), Problem> {
        out.line("header", &self.task.echo())
    }

    fn summary(&self, out: &mut Out<'_>) -> Result<(), Problem> {
        out.line("summary", &self.task.summary(&self.totals.sum()))
    }
}

/// Writes trajectories as they are computed.
struct Writer<'a, 'o> {
    task: &'a Task,
    out: &'a mut Out<'o>,
    interrupt: &'a dyn Interrupt,
    /// The trajectory of the last samples that were written before its end, and how many of it.
    handed_over: (usize, usize),
    /// Lines of samples written since the time was up.
    late_lines: usize,
    totals: Totals,
    /// What went wrong with writing.
    problem: Option<Problem>,
}

impl Writer<'_, '_> {
    fn handed_over(&self, index: usize) -> usize {
        if self.handed_over.0 == index { self.handed_over.1 } else { 0 }
    }

    fn check(&mut self, written: Result<(), Problem>) -> Result<(), Failure> {
        written.map_err(|problem| {
            self.problem = Some(problem);
            Failure::Cancelled
        })
    }
}

impl Sink for Writer<'_, '_> {
    fn samples_at_once(&self) -> Option<usize> {
        self.out.is_streamed().then_some(SAMPLES_PER_LINE)
    }

    fn samples(&mut self, index: usize, samples: Samples) -> Result<(), Failure> {
        let before = self.handed_over(index);
        self.handed_over = (index, before + samples.times.len());
        self.late_lines += usize::from(self.interrupt.poll().is_some());
        if self.late_lines > LATE_LINES {
            let detail =
                format!("The time granted was too short for the samples of one step of trajectory {index}");
            return self.check(Err(Problem::new(Slug::WallTimeLimit, detail)));
        }
        let written = self.out.line("samples", &self.task.samples_line(index, &samples, before));
        self.check(written)
    }

    fn trajectory(&mut self, trajectory: Trajectory) -> Result<(), Failure> {
        *self.totals.outcomes.entry(outcome_name(trajectory.outcome)).or_default() += 1;
        self.totals.steps += trajectory.evidence.steps;
        self.totals.jacobi_drift = self.totals.jacobi_drift.max(trajectory.evidence.jacobi_drift);
        let before = self.handed_over(trajectory.index);
        let written = self.out.item("trajectory", &self.task.answer(&trajectory, before));
        self.check(written)
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
