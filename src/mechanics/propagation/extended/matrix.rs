//! The state transition matrix in double-double arithmetic, leg by leg between manoeuvres.

use nalgebra::Matrix6;

use crate::arithmetic::{DoubleDouble, Matrix};
use crate::propagation::matrix::{Legs, worse};
use crate::taylor::Path;
use crate::taylor::extended::{self, Columns, Series};

/// The matrix of the leg under way, and of all before it.
pub(in crate::propagation) struct ExtendedTransition {
    columns: Box<Columns>,
    leg: Matrix<6>,
    before: Matrix<6>,
    determinant_defect: f64,
    symplectic_defect: f64,
}

impl ExtendedTransition {
    pub(in crate::propagation) fn new() -> Self {
        Self {
            columns: Box::default(),
            leg: Matrix::identity(),
            before: Matrix::identity(),
            determinant_defect: 0.0,
            symplectic_defect: 0.0,
        }
    }

    /// Prepares a step along `series`.
    pub(in crate::propagation) fn expand(&mut self, path: Path, series: &Series) {
        extended::expand_variational(path, series, &self.leg.0, &mut self.columns);
    }

    /// The leg's matrix `at` a time after the start of the step along `series`.
    fn leg_at(&self, path: Path, series: &Series, at: DoubleDouble) -> Matrix<6> {
        let change = extended::flow_variational(path, series, &self.columns, at);
        Matrix::from_fn(|row, column| self.leg.0[row][column] + change[row][column])
    }

    /// d(state)/d(initial state) `at` a time after the start of the step along `series`.
    pub(in crate::propagation) fn at(&self, path: Path, series: &Series, at: DoubleDouble) -> Matrix6<f64> {
        rounded(&self.leg_at(path, series, at).times(&self.before))
    }

    pub(in crate::propagation) fn advance(&mut self, path: Path, series: &Series, at: DoubleDouble) {
        self.leg = self.leg_at(path, series, at);
    }

    /// Takes the leg's defects into account.
    fn measure(&mut self) {
        let m = canonical(&self.leg);
        let determinant = (m.determinant() - 1.0).abs().to_f64();
        let j = symplectic_unit();
        let product = m.transposed().times(&j).times(&m);
        let symplectic = product.0.iter().flatten().zip(j.0.iter().flatten());
        let symplectic = symplectic.map(|(a, b)| (*a - *b).abs().to_f64()).fold(0.0, worse);
        self.determinant_defect = worse(self.determinant_defect, determinant);
        self.symplectic_defect = worse(self.symplectic_defect, symplectic);
    }
}

impl Legs for ExtendedTransition {
    fn here(&self) -> Matrix6<f64> {
        rounded(&self.leg.times(&self.before))
    }

    fn end_leg(&mut self, jump: Option<&Matrix6<f64>>) {
        self.measure();
        self.before = self.leg.times(&self.before);
        if let Some(jump) = jump {
            let jump = Matrix::from_fn(|row, column| DoubleDouble::from(jump[(row, column)]));
            self.before = jump.times(&self.before);
        }
        self.leg = Matrix::identity();
    }

    fn defects(&mut self) -> (f64, f64) {
        self.measure();
        (self.determinant_defect, self.symplectic_defect)
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
        DoubleDouble::from(if column == row + 3 {
            1.0
        } else if row == column + 3 {
            -1.0
        } else {
            0.0
        })
    })
}
