//! A trajectory under way in double-double arithmetic: its motion, its time and its matrix, leg by leg between
//! manoeuvres.

use nalgebra::Matrix6;

use crate::arithmetic::{DoubleDouble, Matrix, sum::Compensated};
use crate::taylor::extended::Motion;
use crate::taylor::{Primaries, Series};

/// Motion in double-double arithmetic.
pub(super) struct ExtendedMotion {
    motion: Motion,
    /// Signed time since the start.
    elapsed: DoubleDouble,
    /// What the search for events sees of the step.
    rounded: Box<Series<f64>>,
    /// The matrix of the legs before.
    before: Matrix<6>,
    determinant_defect: f64,
    symplectic_defect: f64,
    /// The Jacobi constant at the start of the leg.
    leg_jacobi: Option<DoubleDouble>,
    jacobi_drift: f64,
}

impl ExtendedMotion {
    pub(super) fn new(primaries: Primaries, start: &[Compensated; 6], with_matrix: bool) -> Self {
        Self {
            motion: Motion::new(primaries, start.map(DoubleDouble::from), with_matrix),
            elapsed: DoubleDouble::default(),
            rounded: Box::default(),
            before: Matrix::identity(),
            determinant_defect: 0.0,
            symplectic_defect: 0.0,
            leg_jacobi: None,
            jacobi_drift: 0.0,
        }
    }

    /// Prepares a step.
    pub(super) fn expand(&mut self) {
        self.motion.expand();
        self.motion.series().round_to(&mut self.rounded);
        let jacobi = self.motion.series().jacobi();
        self.measure_jacobi(jacobi);
    }

    fn measure_jacobi(&mut self, jacobi: DoubleDouble) {
        let reference = *self.leg_jacobi.get_or_insert(jacobi);
        self.jacobi_drift = self.jacobi_drift.max((jacobi - reference).abs().to_f64());
    }

    pub(super) fn series(&self) -> &Series<f64> {
        &self.rounded
    }

    /// The state `at` a time after the start of the step.
    pub(super) fn state_at(&self, at: Compensated) -> [Compensated; 6] {
        self.motion.state_at(at.into()).map(Compensated::from)
    }

    /// d(state)/d(initial state) `at` a time after the start of the step.
    pub(super) fn matrix_at(&self, at: Compensated) -> Option<Matrix6<f64>> {
        self.motion.matrix_at(at.into()).map(|leg| rounded(&leg.times(&self.before)))
    }

    pub(super) fn advance(&mut self, at: Compensated) {
        let at = DoubleDouble::from(at);
        self.motion.advance(at);
        self.elapsed = self.elapsed + at;
    }

    /// Ends a leg, measuring it; the next one begins after a change of velocity and a jump of the matrix.
    pub(super) fn end_leg(&mut self, jump: Option<&Matrix6<f64>>) {
        self.leg_jacobi = None;
        let Some(leg) = self.motion.matrix().copied() else { return };
        self.measure_matrix(&leg);
        self.before = leg.times(&self.before);
        if let Some(jump) = jump {
            let jump = Matrix::from_fn(|row, column| DoubleDouble::from(jump[(row, column)]));
            self.before = jump.times(&self.before);
        }
        self.motion.restart_matrix();
    }

    fn measure_matrix(&mut self, leg: &Matrix<6>) {
        let m = canonical(leg);
        let determinant = (m.determinant() - 1.0).abs().to_f64();
        let j = symplectic_unit();
        let product = m.transposed().times(&j).times(&m);
        let defects = product.0.iter().flatten().zip(j.0.iter().flatten());
        let symplectic = defects.map(|(a, b)| (*a - *b).abs().to_f64()).fold(0.0, f64::max);
        self.determinant_defect = self.determinant_defect.max(determinant);
        self.symplectic_defect = self.symplectic_defect.max(symplectic);
    }
}

fn rounded(matrix: &Matrix<6>) -> Matrix6<f64> {
    Matrix6::from_fn(|row, column| matrix.0[row][column].to_f64())
}

/// The matrix of canonical momenta p = v + ẑ × r instead of velocities.
fn canonical(matrix: &Matrix<6>) -> Matrix<6> {
    let with = |sign: f64| {
        let mut turned = Matrix::identity();
        turned.0[3][1] = DoubleDouble::from(-sign);
        turned.0[4][0] = DoubleDouble::from(sign);
        turned
    };
    with(1.0).times(matrix).times(&with(-1.0))
}

fn symplectic_unit() -> Matrix<6> {
    Matrix::from_fn(|row, column| {
        DoubleDouble::from(match (row < 3, column) {
            (true, column) if column == row + 3 => 1.0,
            (false, column) if column + 3 == row => -1.0,
            _ => 0.0,
        })
    })
}
