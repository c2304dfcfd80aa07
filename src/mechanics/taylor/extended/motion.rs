//! One trajectory's place, and its steps.

use super::recurrence::Start;
use super::{Series, expand, flow};
use crate::arithmetic::DoubleDouble;
use crate::taylor::{Halt, Path, Primaries, STEP_FLOOR, Stride};

/// The place that an integration has reached, and the series about it.
#[derive(Clone, Debug)]
pub struct Motion {
    path: Path,
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

impl Motion {
    /// At the start.
    #[must_use]
    pub fn new(path: Path, primaries: Primaries, state: [DoubleDouble; 6]) -> Self {
        Self {
            path,
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

    /// Takes steps from here, in the direction ±1 of the stride, as long as they end before its target.
    pub fn run(&mut self, stride: &Stride) -> Halt {
        let Stride { target, direction, most, watched } = *stride;
        let target = DoubleDouble::from(target);
        for _ in 0..most {
            expand(self.path, &self.primaries, &self.state, &mut self.series);
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
        let change = flow(self.path, &self.series, at);
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

    /// Ends a leg; the next one's Jacobi constant may be another.
    pub fn end_leg(&mut self) {
        if self.reference.is_some() {
            let jacobi = Start::new(&self.primaries, &self.state).jacobi(&self.state);
            self.measure(jacobi);
            self.reference = None;
        }
    }

    /// Takes the Jacobi constant of a place on the leg into account.
    fn measure(&mut self, jacobi: DoubleDouble) {
        let reference = *self.reference.get_or_insert(jacobi);
        let departure = (jacobi - reference).abs().to_f64();
        self.drift = if departure > self.drift { departure } else { self.drift };
    }
}
