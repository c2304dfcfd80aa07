//! The state transition matrix along a trajectory, in the default frame, leg by leg between manoeuvres.

use nalgebra::{Matrix3, Matrix6};

use crate::taylor::{self, Columns, Path, Series};

/// A matrix leg by leg, in whichever arithmetic.
pub(super) trait Legs {
    /// d(state)/d(initial state) at the last place reached.
    fn here(&self) -> Matrix6<f64>;

    /// Ends a leg, measuring it; the next one begins after a jump.
    fn end_leg(&mut self, jump: Option<&Matrix6<f64>>);

    /// |det − 1| and the largest element of `|MᵀJM − J|`, the largest of the legs.
    fn defects(&mut self) -> (f64, f64);
}

/// The matrix of the leg under way, and of all before it.
pub(super) struct Transition {
    /// Of the leg under way, at the last place reached.
    pub leg: taylor::Transition,
    before: Matrix6<f64>,
    determinant_defect: f64,
    symplectic_defect: f64,
}

impl Transition {
    pub(super) fn new() -> Self {
        Self {
            leg: taylor::Transition::identity(),
            before: Matrix6::identity(),
            determinant_defect: 0.0,
            symplectic_defect: 0.0,
        }
    }

    /// Prepares a step along `series`.
    pub(super) fn expand(&self, path: Path, series: &Series, columns: &mut Columns) {
        taylor::expand_variational(path, series, &self.leg, columns);
    }

    /// d(state)/d(initial state) `at` a time after the start of the step.
    pub(super) fn at(&self, path: Path, columns: &Columns, at: f64) -> Matrix6<f64> {
        let mut leg = self.leg.clone();
        taylor::advance_variational(path, columns, &mut leg, at);
        rounded(&leg) * self.before
    }

    pub(super) fn advance(&mut self, path: Path, columns: &Columns, at: f64) {
        taylor::advance_variational(path, columns, &mut self.leg, at);
    }

    /// Takes the leg's defects into account.
    fn measure(&mut self) {
        let m = canonical(&rounded(&self.leg));
        self.determinant_defect = worse(self.determinant_defect, (m.determinant() - 1.0).abs());
        let j = symplectic_unit();
        let residual = m.transpose() * j * m - j;
        self.symplectic_defect =
            residual.iter().fold(self.symplectic_defect, |defect, element| worse(defect, element.abs()));
    }
}

impl Legs for Transition {
    fn here(&self) -> Matrix6<f64> {
        rounded(&self.leg) * self.before
    }

    fn end_leg(&mut self, jump: Option<&Matrix6<f64>>) {
        self.measure();
        self.before = self.here();
        if let Some(jump) = jump {
            self.before = jump * self.before;
        }
        self.leg = taylor::Transition::identity();
    }

    fn defects(&mut self) -> (f64, f64) {
        self.measure();
        (self.determinant_defect, self.symplectic_defect)
    }
}

/// The larger of two defects; one that is no number is beyond all numbers.
pub(super) fn worse(defect: f64, found: f64) -> f64 {
    if found.is_nan() { f64::INFINITY } else { defect.max(found) }
}

fn rounded(matrix: &taylor::Transition) -> Matrix6<f64> {
    Matrix6::from_fn(|row, column| matrix.get(row, column).value)
}

/// The matrix of canonical momenta p = v + ẑ × r instead of velocities.
fn canonical(matrix: &Matrix6<f64>) -> Matrix6<f64> {
    let mut momenta = Matrix6::identity();
    momenta[(3, 1)] = -1.0;
    momenta[(4, 0)] = 1.0;
    let mut velocities = Matrix6::identity();
    velocities[(3, 1)] = 1.0;
    velocities[(4, 0)] = -1.0;
    momenta * matrix * velocities
}

fn symplectic_unit() -> Matrix6<f64> {
    let mut j = Matrix6::zeros();
    j.fixed_view_mut::<3, 3>(0, 3).copy_from(&Matrix3::identity());
    j.fixed_view_mut::<3, 3>(3, 0).copy_from(&-Matrix3::identity());
    j
}
