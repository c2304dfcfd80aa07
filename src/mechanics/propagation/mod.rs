//! Trajectories: samples, events, manoeuvres, contact, state transition matrices.
//!
//! The integration is [`crate::taylor`]'s; state and time are accumulated with compensation, so that the drift of
//! the Jacobi constant stays a random walk of the unit round-off. Samples and events are evaluated from the
//! Taylor polynomial of the step they fall into: they cost no step and change none.

mod alone;
mod audit;
mod course;
pub mod event;
mod extended;
mod invalid;
mod manoeuvre;
mod matrix;
mod request;
mod roots;
mod swarm;
mod watch;

use std::ops::Range;
use std::sync::atomic::{AtomicU64, Ordering};

use nalgebra::{Matrix6, Vector3};
use thiserror::Error;

use crate::interrupt::Interrupt;
use crate::state::State;

pub use extended::{Arithmetic, EXTENDED_WEIGHT};
pub use invalid::Invalid;
pub use manoeuvre::{BurnAxes, Manoeuvre};
pub use request::{Contact, Durations, Limits, MatrixOutput, Request, RequestParts, Sampling};

/// Numbers of an event in the answer: which, its time, position and velocity.
pub const VALUES_PER_EVENT: u64 = 8;

/// Why a trajectory ended.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Outcome {
    /// It ran its whole duration.
    Complete,
    /// An event reached its count.
    StoppedByEvent,
    /// It reached the larger primary's surface, or began inside.
    ContactLarger,
    /// It reached the smaller primary's surface, or began inside.
    ContactSmaller,
    /// The steps granted were used up.
    StepLimit,
    /// The events granted were used up.
    EventLimit,
    /// The step shrank below [`crate::taylor::STEP_FLOOR`], on the way into a primary's centre.
    StepFloor,
    /// The time granted was used up.
    WallTimeLimit,
    /// The time granted was used up before it began.
    NotStarted,
}

/// States along a trajectory in the request's frame, as columns of one length.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Samples {
    /// Instants on the absolute clock.
    pub times: Vec<f64>,
    /// Positions (x, y, z).
    pub positions: Vec<Vector3<f64>>,
    /// Velocities (vx, vy, vz).
    pub velocities: Vec<Vector3<f64>>,
    /// d(state)/d(initial state), where asked for.
    pub matrices: Vec<Matrix6<f64>>,
}

/// An event that happened.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Occurrence {
    /// Index of the event in the request.
    pub event: usize,
    /// The state at that instant, in the request's frame.
    pub state: State,
}

/// How good a trajectory is, measured along it.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Evidence {
    /// Steps taken.
    pub steps: u64,
    /// Largest departure of the Jacobi constant from its value at the start of the leg between two manoeuvres.
    pub jacobi_drift: f64,
    /// |det − 1| of the normalised rotating canonical matrix, the largest of the legs; none where it is beyond all doubles.
    pub determinant_defect: Option<f64>,
    /// Largest element of `|MᵀJM − J|` of that matrix, the largest of the legs; none where it is beyond all doubles.
    pub symplectic_defect: Option<f64>,
    /// The true error of the last state, where asked for.
    pub audit: Option<Audit>,
}

/// The difference of a trajectory from the same one in double-double arithmetic: from the same bits, with the same
/// manoeuvres, at the very time that it ended.
///
/// What is compared is the last state as it is answered, in rotating axes about the frame's origin. What turning it
/// into inertial axes rounds, and the turning of inertial initial states and impulses into rotating axes, is not part
/// of the error: both computations take the same.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Audit {
    /// [`Outcome::Complete`], or why the time that the trajectory ended at was not reached.
    pub outcome: Outcome,
    /// Euclidean norm of the error of the position in the request's frame, where it was reached.
    pub position_error: Option<f64>,
    /// The same of the velocity.
    pub velocity_error: Option<f64>,
}

/// A trajectory in the request's frame.
#[derive(Clone, Debug, PartialEq)]
pub struct Trajectory {
    /// Index of its initial state in the request.
    pub index: usize,
    /// Why it ended.
    pub outcome: Outcome,
    /// The state at its end, from which it can go on; its initial state where it did not start.
    pub last: State,
    /// The event that stopped it.
    pub stopped_by: Option<usize>,
    /// The samples asked for.
    pub samples: Samples,
    /// The events that happened, in the order of the integration.
    pub events: Vec<Occurrence>,
    /// d(last)/d(initial); none where an element is beyond all doubles, on the way into a centre.
    pub matrix: Option<Matrix6<f64>>,
    /// How good it is.
    pub evidence: Evidence,
}

/// Why there is no solution.
#[derive(Clone, Copy, Debug, Eq, Error, PartialEq)]
pub enum Failure {
    /// Nobody waits for it.
    #[error("the computation was cancelled")]
    Cancelled,
    /// A manoeuvre is given along an axis that the state before it does not define.
    #[error("the state before it leaves an axis of this manoeuvre undefined")]
    UndefinedAxes {
        /// The manoeuvre.
        manoeuvre: usize,
        /// The trajectory.
        trajectory: usize,
    },
    /// Samples at every step and events, whose number shows only on the way, came to more than was granted.
    #[error("samples and events hold more than {limit} values")]
    TooManySamples {
        /// The values granted.
        limit: u64,
    },
}

/// What the samples and events of all trajectories of a request may hold together.
#[derive(Debug)]
pub struct SampleBudget {
    left: AtomicU64,
    limit: u64,
}

impl SampleBudget {
    /// So many numbers.
    #[must_use]
    pub fn new(limit: u64) -> Self {
        Self { left: AtomicU64::new(limit), limit }
    }

    fn take(&self, values: u64) -> Result<(), Failure> {
        self.left
            .fetch_update(Ordering::Relaxed, Ordering::Relaxed, |left| left.checked_sub(values))
            .map(drop)
            .map_err(|_| Failure::TooManySamples { limit: self.limit })
    }
}

/// Takes over what is computed, in ascending order of the trajectories' indices.
pub trait Sink {
    /// So many samples of one trajectory are handed over before it ends, so that its memory stays bounded; none to
    /// get them all with the trajectory.
    fn samples_at_once(&self) -> Option<usize>;

    /// The next samples of a trajectory that is under way.
    ///
    /// # Errors
    /// [`Failure`] to end the computation.
    fn samples(&mut self, index: usize, samples: Samples) -> Result<(), Failure>;

    /// A trajectory at its end, with the samples that have not been handed over yet.
    ///
    /// # Errors
    /// [`Failure`] to end the computation.
    fn trajectory(&mut self, trajectory: Trajectory) -> Result<(), Failure>;
}

impl Sink for Vec<Trajectory> {
    fn samples_at_once(&self) -> Option<usize> {
        None
    }

    fn samples(&mut self, _: usize, _: Samples) -> Result<(), Failure> {
        Ok(())
    }

    fn trajectory(&mut self, trajectory: Trajectory) -> Result<(), Failure> {
        self.push(trajectory);
        Ok(())
    }
}

/// All trajectories of a request, in its order.
///
/// # Errors
/// [`Failure`] where the computation was cancelled, outgrew its sample budget, or met a burn along axes that are not
/// defined.
pub fn solve(request: &Request, interrupt: &dyn Interrupt) -> Result<Vec<Trajectory>, Failure> {
    let budget = SampleBudget::new(request.limits().sample_values);
    let mut trajectories = Vec::with_capacity(request.count());
    propagate(request, 0..request.count(), &budget, &mut trajectories, interrupt)?;
    Ok(trajectories)
}

/// Some trajectories of a request, whose indices must be below [`Request::count`]. How a request is cut into ranges
/// changes no bit of any of them.
///
/// # Errors
/// [`Failure`] where the computation was cancelled, outgrew the sample budget, or met a burn along axes that are not
/// defined, and what the sink answers.
pub fn propagate(
    request: &Request,
    range: Range<usize>,
    budget: &SampleBudget,
    sink: &mut dyn Sink,
    interrupt: &dyn Interrupt,
) -> Result<(), Failure> {
    if request.is_extended() {
        alone::one_by_one(request, range, budget, sink, interrupt, extended::run)
    } else if swarm::suits(request, range.clone(), &*sink) {
        swarm::propagate(request, range, budget, sink, interrupt)
    } else {
        alone::propagate(request, range, budget, sink, interrupt)
    }
}
