//! One trajectory's place, and its steps.

use super::{Series, expand, flow};
use crate::arithmetic::DoubleDouble;
use crate::taylor::{Primaries, STEP_FLOOR};

/// The place that an integration has reached, and the series about it.
#[derive(Clone, Debug)]
pub struct Motion {
    primaries: Primaries,
    /// x, y, z, vx, vy, vz in the default frame.
    pub state: [DoubleDouble; 6],
    /// Signed time since the start.
    pub elapsed: DoubleDouble,
    /// Jacobi constant at the start of the leg; none before its first step.
    pub reference: Option<DoubleDouble>,
    /// Largest departure from it.
    pub drift: f64,
    /// Steps taken.
    pub steps: u64,
    /// The series about the last place it was expanded at.
    pub series: Box<Series>,
    /// Signed length of the step that the series is expanded for.
    length: DoubleDouble,
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

impl Motion {
    /// At the start.
    #[must_use]
    pub fn new(primaries: Primaries, state: [DoubleDouble; 6]) -> Self {
        Self {
            primaries,
            state,
            elapsed: DoubleDouble::default(),
            reference: None,
            drift: 0.0,
            steps: 0,
            series: Box::default(),
            length: DoubleDouble::default(),
        }
    }

    /// Takes steps from here, in the `direction` ±1, as long as they end before `target`, at most `most`. Where
    /// `watched` it stops at each step.
    pub fn run(&mut self, target: DoubleDouble, direction: f64, most: u64, watched: bool) -> Halt {
        for _ in 0..most {
            expand(&self.primaries, &self.state, &mut self.series);
            let remaining = target - self.elapsed;
            let step = self.series.step();
            let last = step >= remaining.abs().to_f64();
            // Written so that a step that is no number counts as too small.
            if !(self.series.is_finite() && (last || step >= STEP_FLOOR)) {
                return Halt::Floor;
            }
            self.measure(self.series.jacobi());
            self.steps += 1;
            self.length = if last { remaining } else { DoubleDouble::from(step * direction) };
            if last || watched {
                return Halt::Step { length: self.length.to_f64(), last };
            }
            self.step();
        }
        Halt::Steps
    }

    /// The state `at` a time after the start of the step.
    #[must_use]
    pub fn state_at(&self, at: DoubleDouble) -> [DoubleDouble; 6] {
        let change = flow(&self.series, at);
        std::array::from_fn(|i| self.state[i] + change[i])
    }

    /// Moves on by `time` within the step.
    pub fn advance(&mut self, time: DoubleDouble) {
        self.state = self.state_at(time);
        self.elapsed = self.elapsed + time;
    }

    /// Moves on to the end of the step.
    pub fn step(&mut self) {
        self.advance(self.length);
    }

    /// The length of the step, whose rounded value a [`Halt`] tells.
    #[must_use]
    pub fn length(&self) -> DoubleDouble {
        self.length
    }

    /// Adds to the velocity.
    pub fn kick(&mut self, change: &[DoubleDouble; 3]) {
        for (component, change) in self.state[3..].iter_mut().zip(change) {
            *component = *component + *change;
        }
    }

    /// Takes the Jacobi constant of a place on the leg into account.
    pub fn measure(&mut self, jacobi: DoubleDouble) {
        let reference = *self.reference.get_or_insert(jacobi);
        let departure = (jacobi - reference).abs().to_f64();
        self.drift = if departure > self.drift { departure } else { self.drift };
    }
}
