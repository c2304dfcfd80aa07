//! One trajectory's place, and its steps.

use super::{Primaries, STEP_FLOOR, Series, StepSize, packed};
use crate::arithmetic::Packed;
use crate::arithmetic::sum::Compensated;

/// The place that an integration has reached. Where it straddles lines of the cache, steps take up to twice as long.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Place {
    /// x, y, z, vx, vy, vz in the default frame.
    pub state: [Compensated; 6],
    /// Signed time since the start.
    pub elapsed: Compensated,
    /// Jacobi constant at the start of the leg; none before its first step.
    pub reference: Option<f64>,
    /// Largest departure from it.
    pub drift: f64,
    /// Steps taken.
    pub steps: u64,
}

/// How far an integration may go before it pauses.
#[derive(Clone, Copy, Debug)]
pub struct Stride {
    /// Signed time since the start at which the last step ends.
    pub target: Compensated,
    /// +1 forwards, −1 backwards.
    pub direction: f64,
    /// Steps.
    pub most: u64,
    /// Whether it pauses at each step.
    pub watched: bool,
}

/// Why an integration pauses.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Halt {
    /// The steps granted are taken.
    Steps,
    /// The series is expanded for a step of this signed length, the last one before the target or one that is watched.
    Step {
        /// Its length.
        length: f64,
        /// Whether it ends at the target.
        last: bool,
    },
    /// The step would be too short.
    Floor,
}

impl Place {
    /// At the start.
    #[must_use]
    pub fn new(state: [Compensated; 6]) -> Self {
        Self { state, elapsed: Compensated::default(), reference: None, drift: 0.0, steps: 0 }
    }

    #[inline(always)]
    pub(super) fn run<P: Packed>(
        &mut self,
        series: &mut Series,
        primaries: &Primaries,
        sizes: StepSize,
        stride: &Stride,
    ) -> Halt {
        super::dispatch::align_stack();
        let Stride { target, direction, most, watched } = *stride;
        for _ in 0..most {
            packed::expand::<P>(primaries, &self.state, series);
            let remaining = target.minus(self.elapsed);
            let step = sizes.at_log2_radius(series.log2_radius);
            let last = step >= remaining.abs();
            // Written so that a step that is no number counts as too small.
            if !(series.is_finite() && (last || step >= STEP_FLOOR)) {
                return Halt::Floor;
            }
            self.measure(series.jacobi);
            self.steps += 1;
            let length = if last { remaining } else { step * direction };
            if last || watched {
                return Halt::Step { length, last };
            }
            self.advance::<P>(series, length);
        }
        Halt::Steps
    }

    #[inline(always)]
    pub(super) fn advance<P: Packed>(&mut self, series: &Series, time: f64) {
        let [place, rate] = packed::change::<P>(&series.position, time);
        for axis in 0..3 {
            self.state[axis] = self.state[axis].plus(place.0[axis]);
            self.state[axis + 3] = self.state[axis + 3].plus(rate.0[axis]);
        }
        self.elapsed = self.elapsed.plus(time);
    }

    /// Takes the Jacobi constant of a place on the leg into account.
    #[inline(always)]
    pub fn measure(&mut self, jacobi: f64) {
        let reference = *self.reference.get_or_insert(jacobi);
        let departure = (jacobi - reference).abs();
        self.drift = if departure > self.drift { departure } else { self.drift };
    }
}
