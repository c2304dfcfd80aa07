//! The true error of a trajectory: its difference from the same one in double-double arithmetic.

use nalgebra::Vector3;

use super::extended::{Arithmetic, EXTENDED_WEIGHT};
use super::{Audit, Contact, Failure, Invalid, Outcome, Request};
use crate::arithmetic::{DoubleDouble, sum::Compensated};
use crate::frame::Axes;
use crate::interrupt::{Interrupt, Stop};
use crate::taylor::extended::Motion;
use crate::taylor::{Halt, MAX_STEP, Place, Stride};

/// Steps between two polls: a tenth of a millisecond.
pub(super) const STEPS_PER_POLL: u64 = 16;

/// Where a trajectory ended.
pub(super) struct End<'a> {
    /// In the default frame, as it was integrated.
    pub place: &'a Place,
    /// Manoeuvres that were applied.
    pub manoeuvres: usize,
}

impl Audit {
    /// One that could not be finished.
    pub(super) fn unfinished(outcome: Outcome) -> Self {
        Self { outcome, position_error: None, velocity_error: None }
    }

    /// Of the trajectory of an initial state, wherever and for whatever reason it ended.
    pub(super) fn of(
        request: &Request,
        index: usize,
        end: &End<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<Self, Failure> {
        let direction = if request.duration(index) < 0.0 { -1.0 } else { 1.0 };
        let start = request.start_of(index).map(DoubleDouble::from);
        let mut recomputation = Recomputation {
            motion: Motion::new(request.path(), *request.primaries(), start),
            direction,
            most_steps: request.extended_steps(end.place.steps),
            interrupt,
        };
        let frame = request.parts().frame;
        for (at, manoeuvre) in request.manoeuvres_of(index).into_iter().take(end.manoeuvres) {
            if let Some(outcome) = recomputation.run_to(at)? {
                return Ok(Self::unfinished(outcome));
            }
            let change = request.parts().manoeuvres[manoeuvre]
                .precise_impulse(frame, request.origin_x().into(), &recomputation.motion.state)
                .ok_or(Failure::UndefinedAxes { manoeuvre, trajectory: index })?;
            recomputation.motion.kick(&change.map(|component| component.scaled(direction)));
        }
        if let Some(outcome) = recomputation.run_to(end.place.elapsed)? {
            return Ok(Self::unfinished(outcome));
        }
        Ok(Self::difference(request, &end.place.state, &recomputation.motion.state))
    }

    /// The error of a state of the default frame as the request's frame shows it, about that frame's origin and rounded.
    fn difference(request: &Request, state: &[Compensated; 6], truth: &[DoubleDouble; 6]) -> Self {
        let origin = request.origin_x();
        let rounded = super::course::about(origin, state, &[0.0; 6]);
        let error: [f64; 6] = std::array::from_fn(|i| {
            let shifted = if i == 0 { truth[0] - DoubleDouble::from(origin) } else { truth[i] };
            (DoubleDouble::from(rounded[i]) - shifted).to_f64()
        });
        let position = Vector3::new(error[0], error[1], error[2]);
        let mut velocity = Vector3::new(error[3], error[4], error[5]);
        if request.parts().frame.axes == Axes::Inertial {
            velocity += Vector3::new(-position.y, position.x, 0.0);
        }
        Self {
            outcome: Outcome::Complete,
            position_error: Some(position.norm()),
            velocity_error: Some(velocity.norm()),
        }
    }
}

impl Request {
    /// An audit is refused that cannot be done within the steps granted, as far as that is known: no step is longer than
    /// [`MAX_STEP`], and nothing may end a trajectory early.
    pub(super) fn audit_problem(&self, spanned: bool) -> Option<Invalid> {
        let parts = self.parts();
        if !parts.audit {
            return None;
        }
        if parts.arithmetic == Arithmetic::DoubleDouble {
            return Some(Invalid::AuditOfDoubleDouble);
        }
        let may_end_early = parts.contact != Contact::default()
            || parts.events.iter().any(|event| event.stop_after.is_some());
        if !spanned || may_end_early {
            return None;
        }
        let limit = parts.limits.steps;
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "not negative, and a number too large saturates and is refused"
        )]
        let steps = |t: usize| (self.duration(t).abs() / MAX_STEP).ceil() as u64;
        let asked = |t: usize| steps(t).saturating_mul(EXTENDED_WEIGHT).saturating_add(steps(t));
        let trajectory = (0..self.count()).find(|t| asked(*t) > limit)?;
        Some(Invalid::AuditSteps { trajectory, asked: asked(trajectory), limit })
    }
}

/// The recomputation under way.
struct Recomputation<'a> {
    motion: Motion,
    direction: f64,
    most_steps: u64,
    interrupt: &'a dyn Interrupt,
}

impl Recomputation<'_> {
    /// Steps up to a time since the start; gives why it did not get there, if it did not.
    fn run_to(&mut self, target: Compensated) -> Result<Option<Outcome>, Failure> {
        let left = DoubleDouble::from(target) - self.motion.elapsed;
        if left.to_f64() * self.direction <= 0.0 {
            return Ok(None);
        }
        loop {
            match self.interrupt.poll() {
                Some(Stop::Cancelled) => return Err(Failure::Cancelled),
                Some(Stop::WallTime) => return Ok(Some(Outcome::WallTimeLimit)),
                None => {}
            }
            let most = (self.most_steps - self.motion.steps).min(STEPS_PER_POLL);
            let stride = Stride { target, direction: self.direction, most, watched: false };
            match self.motion.run(&stride) {
                Halt::Steps if self.motion.steps == self.most_steps => return Ok(Some(Outcome::StepLimit)),
                Halt::Steps => {}
                Halt::Floor => return Ok(Some(Outcome::StepFloor)),
                Halt::Step { .. } => {
                    self.motion.step();
                    self.motion.elapsed = target.into();
                    return Ok(None);
                }
            }
        }
    }
}
