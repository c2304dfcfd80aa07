//! One trajectory's integration, step by step.

use super::{Columns, Series, expand, expand_variational, flow, flow_variational};
use crate::arithmetic::{DoubleDouble, Matrix};
use crate::taylor::Primaries;

/// A state under way in double-double arithmetic, with d(state)/d(state at the start) if wanted.
///
/// A step is [`expand`](Self::expand), then [`advance`](Self::advance) by at most [`step`](Self::step); in between the
/// state is known at any time within it.
#[derive(Clone, Debug)]
pub struct Motion {
    primaries: Primaries,
    state: [DoubleDouble; 6],
    series: Box<Series>,
    transition: Option<Box<Transition>>,
}

#[derive(Clone, Debug)]
struct Transition {
    matrix: Matrix<6>,
    columns: Columns,
}

impl Transition {
    fn new() -> Self {
        Self { matrix: Matrix::identity(), columns: Columns::new() }
    }

    fn at(&self, series: &Series, time: DoubleDouble) -> Matrix<6> {
        let change = flow_variational(series, &self.columns, time);
        Matrix::from_fn(|row, column| self.matrix.0[row][column] + change[row][column])
    }
}

impl Motion {
    /// From (x, y, z, vx, vy, vz) in the default frame.
    #[must_use]
    pub fn new(primaries: Primaries, state: [DoubleDouble; 6], with_matrix: bool) -> Self {
        let transition = with_matrix.then(|| Box::new(Transition::new()));
        Self { primaries, state, series: Box::default(), transition }
    }

    /// The state reached.
    #[must_use]
    pub fn state(&self) -> &[DoubleDouble; 6] {
        &self.state
    }

    /// The series of the step under way.
    #[must_use]
    pub fn series(&self) -> &Series {
        &self.series
    }

    /// Prepares a step from the state reached.
    pub fn expand(&mut self) {
        expand(&self.primaries, &self.state, &mut self.series);
    }

    /// Prepares the matrix for the step that is already prepared.
    pub fn expand_matrix(&mut self) {
        if let Some(transition) = &mut self.transition {
            let Transition { matrix, columns } = &mut **transition;
            expand_variational(&self.series, &matrix.0, columns);
        }
    }

    /// The state `at` a time after the start of the step.
    #[must_use]
    pub fn state_at(&self, at: DoubleDouble) -> [DoubleDouble; 6] {
        let change = flow(&self.series, at);
        std::array::from_fn(|i| self.state[i] + change[i])
    }

    /// d(state)/d(state at the start) for the state reached, rows x, y, z, vx, vy, vz, where wanted.
    #[must_use]
    pub fn matrix(&self) -> Option<&Matrix<6>> {
        self.transition.as_ref().map(|transition| &transition.matrix)
    }

    /// The same `at` a time after the start of the step.
    #[must_use]
    pub fn matrix_at(&self, at: DoubleDouble) -> Option<Matrix<6>> {
        self.transition.as_ref().map(|transition| transition.at(&self.series, at))
    }

    /// Goes on to `at` a time after the start of the step.
    pub fn advance(&mut self, at: DoubleDouble) {
        self.state = self.state_at(at);
        if let Some(transition) = &mut self.transition {
            transition.matrix = transition.at(&self.series, at);
        }
    }

    /// Adds to the velocity.
    pub fn kick(&mut self, change: &[DoubleDouble; 3]) {
        for (component, change) in self.state[3..].iter_mut().zip(change) {
            *component = *component + *change;
        }
    }

    /// Makes the place reached the start that the matrix refers to.
    pub fn restart_matrix(&mut self) {
        if let Some(transition) = &mut self.transition {
            transition.matrix = Matrix::identity();
        }
    }
}
