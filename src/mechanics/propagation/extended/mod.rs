//! Trajectories in double-double arithmetic, one after the other. Between the steps the bookkeeping holds the place, in
//! pairs of doubles that lose nothing of it.

mod matrix;

use std::ops::ControlFlow;

use nalgebra::Matrix6;

use super::audit::STEPS_PER_POLL;
use super::course::{Ahead, Course, Outlet, Step};
use super::{Failure, Outcome, Request};
use crate::arithmetic::DoubleDouble;
use crate::arithmetic::sum::Compensated;
use crate::taylor::extended::Motion;
use crate::taylor::{Halt, Path, Series, Stride};

pub(super) use matrix::ExtendedTransition;

/// The arithmetic that trajectories are computed in.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Arithmetic {
    /// Double precision.
    #[default]
    Double,
    /// About 31 digits; the answer is rounded. The tolerance is then [`EXTENDED_TOLERANCE`](crate::taylor::extended::EXTENDED_TOLERANCE).
    DoubleDouble,
}

/// What a step in double-double arithmetic counts among the steps granted: it takes as long as so many in double
/// precision (measured: 20 to 26).
pub const EXTENDED_WEIGHT: u64 = 25;

impl Request {
    /// The steps in double-double arithmetic that are granted after so many in double precision.
    pub(super) fn extended_steps(&self, taken: u64) -> u64 {
        self.limits().steps.saturating_sub(taken) / EXTENDED_WEIGHT
    }
}

/// A trajectory that has been opened, from where it is to its end.
pub(super) fn run(course: &mut Course, outlet: &mut Outlet) -> Result<Outcome, Failure> {
    let request = course.request;
    let start = course.motion.state.map(DoubleDouble::from);
    let mut motion = Motion::new(request.path(), *request.primaries(), start);
    let outcome = legs(course, &mut motion, outlet)?;
    motion.end_leg();
    course.motion.drift = motion.drift;
    Ok(outcome)
}

fn legs(course: &mut Course, motion: &mut Motion, outlet: &mut Outlet) -> Result<Outcome, Failure> {
    let request = course.request;
    let path = request.path();
    let limit = request.extended_steps(0);
    let watched = course.is_watched() || request.with_matrix();
    let mut rounded = Series::new();
    let mut before_poll = STEPS_PER_POLL;
    loop {
        if before_poll == 0 {
            if let ControlFlow::Break(outcome) = course.poll()? {
                return Ok(outcome);
            }
            before_poll = STEPS_PER_POLL;
        }
        let taken = motion.steps;
        if taken == limit {
            return Ok(Outcome::StepLimit);
        }
        let halt = motion.run(&Stride {
            target: course.target,
            direction: course.direction,
            most: before_poll.min(limit - taken),
            watched,
        });
        before_poll -= motion.steps - taken;
        tell(motion, course);
        let step = match halt {
            Halt::Steps => continue,
            Halt::Floor => return Ok(Outcome::StepFloor),
            Halt::Step { length, last } => Step { length, last },
        };
        motion.series.round_to(&mut rounded);
        if let Some(transition) = &mut course.extended_transition {
            transition.expand(path, &motion.series);
        }
        let ahead = ExtendedStep { path, motion, rounded: &rounded };
        let (end, stop) = course.observe(&ahead, step, outlet)?;
        let end = if stop.is_some() { DoubleDouble::from(end) } else { motion.length() };
        if let Some(transition) = &mut course.extended_transition {
            transition.advance(path, &motion.series, end);
        }
        motion.advance(end);
        tell(motion, course);
        if let Some(outcome) = stop {
            return Ok(outcome);
        }
        if step.last {
            motion.end_leg();
        }
        if let ControlFlow::Break(outcome) = course.arrive(step.last, outlet)? {
            return Ok(outcome);
        }
        // Between two legs there is a manoeuvre.
        motion.state = course.motion.state.map(DoubleDouble::from);
        motion.elapsed = course.motion.elapsed.into();
    }
}

/// Where the motion is, for the bookkeeping.
fn tell(motion: &Motion, course: &mut Course) {
    course.motion.state = motion.state.map(Compensated::from);
    course.motion.elapsed = motion.elapsed.into();
    course.motion.steps = motion.steps;
}

/// A step in double-double arithmetic.
struct ExtendedStep<'a> {
    path: Path,
    motion: &'a Motion,
    rounded: &'a Series,
}

impl Ahead for ExtendedStep<'_> {
    fn series(&self) -> &Series {
        self.rounded
    }

    fn state(&self, _: &[Compensated; 6], at: Compensated) -> ([Compensated; 6], [f64; 6]) {
        (self.motion.state_at(at.into()).map(Compensated::from), [0.0; 6])
    }

    fn matrix(&self, course: &Course, at: Compensated) -> Option<Matrix6<f64>> {
        Some(course.extended_transition.as_ref()?.at(self.path, &self.motion.series, at.into()))
    }
}
