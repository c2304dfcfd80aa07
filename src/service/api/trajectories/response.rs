//! The answer: trajectories in the units and the frame of the request.

use std::collections::BTreeMap;

use mechanics::propagation::{Audit, Evidence, Outcome, Samples, Sampling, Trajectory};
use mechanics::units::Scale;
use nalgebra::{Matrix6, Vector3};
use serde::Serialize;
use utoipa::ToSchema;

use super::solve::{Task, Totals};
use super::span::{DurationSpec, SamplesSpec};
use crate::problem::ProblemBody;
use crate::wire::{FrameEcho, StateEcho, SystemEcho, UnitsEcho};

/// Trajectories, in the order of their initial states.
#[derive(Serialize, ToSchema)]
pub(super) struct TrajectoriesAnswer<'a> {
    /// The system that was computed in.
    system: SystemEcho<'a>,
    /// The units of all numbers.
    units: UnitsEcho,
    /// The frame of all states and matrices.
    frame: FrameEcho,
    /// Relative local error per step, that of the arithmetic in double-double.
    tolerance: f64,
    /// The primaries whose surfaces end a trajectory.
    contact_bodies: Vec<&'static str>,
    /// `complete`, or `wall_time_limit` where some trajectories were cut short by it.
    outcome: &'static str,
    /// How many trajectories ended in which way.
    outcomes: BTreeMap<&'static str, u64>,
    /// How good all of them are.
    evidence: TotalEvidence,
    /// The trajectories.
    trajectories: Vec<TrajectoryAnswer<'a>>,
}

/// A line of the trajectories of a stream.
#[derive(ToSchema)]
#[serde(tag = "kind", rename_all = "snake_case")]
#[expect(dead_code, reason = "describes what is written")]
pub(super) enum TrajectoriesLine<'a> {
    /// The first.
    Header(TrajectoriesEcho<'a>),
    /// Samples that a trajectory has beyond its last 10,000, before its own line.
    Samples(SamplesLine),
    /// A trajectory, one for each initial state in their order.
    Trajectory(Box<TrajectoryAnswer<'a>>),
    /// The last of a stream that ends well.
    Summary(TrajectoriesSummary),
    /// The last of a stream that does not.
    Problem(ProblemBody<'a>),
}

/// What trajectories have in common.
#[derive(Serialize, ToSchema)]
#[schema(as = TrajectoriesHeader)]
pub(super) struct TrajectoriesEcho<'a> {
    /// The system that was computed in.
    system: SystemEcho<'a>,
    /// The units of all numbers.
    units: UnitsEcho,
    /// The frame of all states and matrices.
    frame: FrameEcho,
    /// Relative local error per step.
    tolerance: f64,
    /// The primaries whose surfaces end a trajectory.
    contact_bodies: Vec<&'static str>,
}

/// How all trajectories ended.
#[derive(Serialize, ToSchema)]
pub(super) struct TrajectoriesSummary {
    /// `complete`, or `wall_time_limit` where some trajectories were cut short by it.
    outcome: &'static str,
    /// How many trajectories ended in which way.
    outcomes: BTreeMap<&'static str, u64>,
    /// How good all of them are.
    evidence: TotalEvidence,
}

/// Samples of a trajectory that are sent before its end.
#[derive(Serialize, ToSchema)]
pub(super) struct SamplesLine {
    /// Index of its initial state.
    index: usize,
    #[serde(flatten)]
    samples: SamplesAnswer,
}

/// How good all trajectories are.
#[derive(Serialize, ToSchema)]
struct TotalEvidence {
    /// Integration steps of all trajectories.
    steps: u64,
    /// Largest drift of the Jacobi constant within one leg, in the velocity unit squared.
    jacobi_drift: f64,
}

/// A trajectory.
#[derive(Serialize, ToSchema)]
#[schema(as = Trajectory)]
pub(super) struct TrajectoryAnswer<'a> {
    /// Index of its initial state.
    index: usize,
    /// Why it ended: complete, `stopped_by_event`, `contact_larger`, `contact_smaller`, `step_limit`, `event_limit`,
    /// `step_floor` (on the way into a primary's centre), `wall_time_limit` or `not_started`.
    outcome: &'static str,
    /// The state at its end, from which it can go on.
    r#final: StateEcho,
    /// Index of the event that stopped it; null if none did.
    stopped_by: Option<usize>,
    /// The samples; null if none were asked for.
    samples: Option<SamplesAnswer>,
    /// The events, in the order of the integration.
    events: Vec<Occurrence<'a>>,
    /// d(final)/d(initial), rows and columns (x, y, z, vx, vy, vz); null if not asked for, or where an element is
    /// beyond all doubles, on the way into a centre.
    state_transition_matrix: Option<[[f64; 6]; 6]>,
    /// How good it is, measured along it.
    evidence: EvidenceAnswer,
}

/// Samples as columns of equal length.
#[derive(Serialize, ToSchema)]
#[schema(as = Samples)]
struct SamplesAnswer {
    /// Instants on the absolute clock.
    time: Vec<f64>,
    /// Positions [x, y, z].
    position: Vec<[f64; 3]>,
    /// Velocities [vx, vy, vz].
    velocity: Vec<[f64; 3]>,
    /// d(state)/d(initial state) of each sample; absent if not asked for.
    #[serde(skip_serializing_if = "Option::is_none")]
    state_transition_matrix: Option<Vec<[[f64; 6]; 6]>>,
}

/// An event that happened.
#[derive(Serialize, ToSchema)]
#[schema(as = EventOccurrence)]
struct Occurrence<'a> {
    /// Index of the event in the request.
    event: usize,
    /// Its name; null if it has none.
    name: Option<&'a str>,
    /// Instant on the absolute clock.
    time: f64,
    /// Position [x, y, z].
    position: [f64; 3],
    /// Velocity [vx, vy, vz].
    velocity: [f64; 3],
}

/// How good a trajectory is.
#[derive(Serialize, ToSchema)]
#[schema(as = TrajectoryEvidence)]
struct EvidenceAnswer {
    /// Integration steps.
    steps: u64,
    /// Largest drift of the Jacobi constant within one leg between manoeuvres, in the velocity unit squared.
    jacobi_drift: f64,
    /// |det - 1| of the normalised rotating canonical matrix, the largest of the legs; null without a matrix, or
    /// where it is beyond all doubles.
    determinant_defect: Option<f64>,
    /// Largest element of `|M^T J M - J|` of that matrix, the largest of the legs; null without a matrix, or
    /// where it is beyond all doubles.
    symplectic_defect: Option<f64>,
    /// The true error of the final state; null if not asked for.
    audit: Option<AuditAnswer>,
}

/// The difference of the final state from that of the same trajectory in double-double arithmetic.
#[derive(Serialize, ToSchema)]
#[schema(as = Audit)]
struct AuditAnswer {
    /// `double_double`.
    arithmetic: &'static str,
    /// `complete`, or why the time of the final state was not reached: `step_limit`, `step_floor`, `wall_time_limit` or
    /// `not_started`.
    outcome: &'static str,
    /// Euclidean norm of the error of the final position; null unless complete.
    position_error: Option<f64>,
    /// Euclidean norm of the error of the final velocity; null unless complete.
    velocity_error: Option<f64>,
}

impl Task {
    pub(super) fn echo(&self) -> TrajectoriesEcho<'_> {
        let (conventions, parts) = (&self.conventions, self.request.parts());
        let bodies = [("larger", parts.contact.larger), ("smaller", parts.contact.smaller)];
        TrajectoriesEcho {
            system: (&conventions.system).into(),
            units: UnitsEcho(conventions.units),
            frame: conventions.frame.into(),
            tolerance: self.request.tolerance(),
            contact_bodies: bodies.into_iter().filter_map(|(name, radius)| radius.map(|_| name)).collect(),
        }
    }

    pub(super) fn summary(&self, totals: &Totals) -> TrajectoriesSummary {
        let jacobi_drift = totals.jacobi_drift * self.conventions.scale.energy();
        TrajectoriesSummary {
            outcome: outcome_name(totals.outcome()),
            outcomes: totals.outcomes.clone(),
            evidence: TotalEvidence { steps: totals.steps, jacobi_drift },
        }
    }

    /// The answer without its trajectories.
    pub(super) fn envelope(&self, totals: &Totals) -> TrajectoriesAnswer<'_> {
        let TrajectoriesEcho { system, units, frame, tolerance, contact_bodies } = self.echo();
        let TrajectoriesSummary { outcome, outcomes, evidence } = self.summary(totals);
        let trajectories = Vec::new();
        TrajectoriesAnswer {
            system,
            units,
            frame,
            tolerance,
            contact_bodies,
            outcome,
            outcomes,
            evidence,
            trajectories,
        }
    }

    /// A trajectory in the client's units, of whose samples so many have been given before.
    pub(super) fn answer<'a>(&'a self, trajectory: &Trajectory, before: usize) -> TrajectoryAnswer<'a> {
        let scale = &self.conventions.scale;
        let mut last = StateEcho::from(scale.state_out(&trajectory.last));
        match trajectory.outcome {
            // The planned end in the client's own digits, not as a sum of rounded conversions.
            Outcome::Complete => {
                last.time = self.given_times[trajectory.index] + self.duration(trajectory.index);
            }
            Outcome::NotStarted => last.time = self.given_times[trajectory.index],
            _ => {}
        }
        TrajectoryAnswer {
            index: trajectory.index,
            outcome: outcome_name(trajectory.outcome),
            r#final: last,
            stopped_by: trajectory.stopped_by,
            samples: (self.request.parts().sampling != Sampling::None)
                .then(|| self.samples(trajectory.index, &trajectory.samples, before)),
            events: trajectory
                .events
                .iter()
                .map(|occurrence| {
                    let StateEcho { time, position, velocity } = scale.state_out(&occurrence.state).into();
                    let name = self.names[occurrence.event].as_deref();
                    Occurrence { event: occurrence.event, name, time, position, velocity }
                })
                .collect(),
            state_transition_matrix: trajectory.matrix.as_ref().map(|matrix| rows(scale, matrix)),
            evidence: evidence(scale, &trajectory.evidence),
        }
    }

    /// The instants of samples in the client's own digits where it planned them, as it would count them.
    fn sample_times(&self, index: usize, computed: &[f64], before: usize) -> Vec<f64> {
        let (start, duration) = (self.given_times[index], self.duration(index));
        let numbers = before..before + computed.len();
        #[expect(clippy::cast_precision_loss, reason = "nobody has the time to compute 2^53 samples")]
        let planned = |at: &dyn Fn(f64) -> f64| numbers.clone().map(|i| start + at(i as f64)).collect();
        match &self.given_samples {
            Some(SamplesSpec::Times(times)) => times[numbers].to_vec(),
            #[expect(clippy::cast_precision_loss, reason = "a count is at most 2^53")]
            Some(SamplesSpec::Count(count)) => {
                let last = (count - 1) as f64;
                planned(&|i| if i < last { duration * (i / last) } else { duration })
            }
            Some(SamplesSpec::Interval(interval)) => {
                planned(&|i| (interval * i).min(duration.abs()) * duration.signum())
            }
            Some(SamplesSpec::None | SamplesSpec::EveryStep) | None => {
                let scale = self.conventions.scale.time;
                computed.iter().map(|time| time * scale).collect()
            }
        }
    }

    fn duration(&self, index: usize) -> f64 {
        match &self.given_duration {
            DurationSpec::All(all) => *all,
            DurationSpec::Each(each) => each[index],
        }
    }

    pub(super) fn samples_line(&self, index: usize, samples: &Samples, before: usize) -> SamplesLine {
        SamplesLine { index, samples: self.samples(index, samples, before) }
    }

    fn samples(&self, index: usize, samples: &Samples, before: usize) -> SamplesAnswer {
        let scale = &self.conventions.scale;
        let scaled = |vectors: &[Vector3<f64>], factor: f64| {
            vectors.iter().map(|vector| (vector * factor).into()).collect::<Vec<[f64; 3]>>()
        };
        SamplesAnswer {
            time: self.sample_times(index, &samples.times, before),
            position: scaled(&samples.positions, scale.length),
            velocity: scaled(&samples.velocities, scale.velocity),
            state_transition_matrix: (!samples.matrices.is_empty())
                .then(|| samples.matrices.iter().map(|matrix| rows(scale, matrix)).collect()),
        }
    }
}

fn rows(scale: &Scale, matrix: &Matrix6<f64>) -> [[f64; 6]; 6] {
    let matrix = scale.matrix_out(matrix);
    std::array::from_fn(|row| std::array::from_fn(|column| matrix[(row, column)]))
}

fn evidence(scale: &Scale, evidence: &Evidence) -> EvidenceAnswer {
    EvidenceAnswer {
        steps: evidence.steps,
        jacobi_drift: evidence.jacobi_drift * scale.energy(),
        determinant_defect: evidence.determinant_defect,
        symplectic_defect: evidence.symplectic_defect,
        audit: evidence.audit.map(|Audit { outcome, position_error, velocity_error }| AuditAnswer {
            arithmetic: "double_double",
            outcome: outcome_name(outcome),
            position_error: position_error.map(|error| error * scale.length),
            velocity_error: velocity_error.map(|error| error * scale.velocity),
        }),
    }
}

/// The name of an outcome in the contract.
pub(super) fn outcome_name(outcome: Outcome) -> &'static str {
    match outcome {
        Outcome::Complete => "complete",
        Outcome::StoppedByEvent => "stopped_by_event",
        Outcome::ContactLarger => "contact_larger",
        Outcome::ContactSmaller => "contact_smaller",
        Outcome::StepLimit => "step_limit",
        Outcome::EventLimit => "event_limit",
        Outcome::StepFloor => "step_floor",
        Outcome::WallTimeLimit => "wall_time_limit",
        Outcome::NotStarted => "not_started",
    }
}
