//! Square matrices of double-doubles.

use std::array::from_fn;

use super::{DoubleDouble, SumOfProducts};

/// Rows of N numbers.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Matrix<const N: usize>(pub [[DoubleDouble; N]; N]);

impl<const N: usize> Matrix<N> {
    /// The matrix with these elements.
    #[must_use]
    pub fn from_fn(element: impl Fn(usize, usize) -> DoubleDouble) -> Self {
        Self(from_fn(|row| from_fn(|column| element(row, column))))
    }

    /// The unit matrix.
    #[must_use]
    pub fn identity() -> Self {
        Self::from_fn(|row, column| DoubleDouble::from(if row == column { 1.0 } else { 0.0 }))
    }

    /// The product with `other`.
    #[must_use]
    pub fn times(&self, other: &Self) -> Self {
        Self::from_fn(|row, column| {
            let terms = (0..N).map(|i| (self.0[row][i], other.0[i][column]));
            terms.fold(SumOfProducts::none(), |sum, (a, b)| sum.and(a, b)).total()
        })
    }

    /// The matrix mirrored at its diagonal.
    #[must_use]
    pub fn transposed(&self) -> Self {
        Self::from_fn(|row, column| self.0[column][row])
    }

    /// The determinant, by elimination with partial pivoting.
    #[must_use]
    pub fn determinant(mut self) -> DoubleDouble {
        let mut determinant = DoubleDouble::from(1.0);
        for k in 0..N {
            let larger =
                |a: &usize, b: &usize| self.0[*a][k].abs().to_f64().total_cmp(&self.0[*b][k].abs().to_f64());
            let pivot = (k..N).max_by(larger).unwrap_or(k);
            if pivot != k {
                self.0.swap(pivot, k);
                determinant = -determinant;
            }
            let head = self.0[k][k];
            if head == DoubleDouble::default() {
                return head;
            }
            determinant = determinant * head;
            for row in k + 1..N {
                let factor = self.0[row][k] / head;
                for column in k + 1..N {
                    self.0[row][column] = self.0[row][column] - factor * self.0[k][column];
                }
            }
        }
        determinant
    }
}
