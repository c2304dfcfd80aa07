//! The variational equations along a series: the state transition matrix by the same recurrences, whose
//! coefficients the six columns share.
//!
//! With A the gradient of the acceleration along the trajectory, each column (ξ, η, ζ) obeys
//! ξ″ = 2 η′ + (A ξ)_x, η″ = −2 ξ′ + (A ξ)_y, ζ″ = (A ξ)_z. A is made of the forces n and f of the recurrences and
//! of q = 3 n/r² for the nearer, p = 3 f/r² for the farther primary:
//!
//! ```text
//! A = diag(1, 1, 0) − (n + f) I + q d dᵀ + p (d + side·x̂)(d + side·x̂)ᵀ
//! ```
//!
//! One trajectory has its columns side by side in the lanes, several trajectories have a lane each. Every operation
//! on a value is the same in both, so both have the same bits.

mod lanes;
mod packed;

use super::{ORDER, TERMS};
use crate::arithmetic::{Lanes, Packed, Quad, Real};

pub(crate) use lanes::LaneColumns;
pub use packed::Columns;
pub(super) use packed::{change, expand};

/// The registers that one trajectory's gradient and columns are expanded in.
pub(super) trait Registers {
    /// Those of the gradient.
    type Gradient: Packed;
    /// Those of the columns.
    type Column: Lanes;
}

/// Plain code.
pub(super) struct Plain;

impl Registers for Plain {
    type Gradient = Quad<f64>;
    type Column = Quad<f64>;
}

/// AVX2.
#[cfg(target_arch = "x86_64")]
pub(super) struct Four;

#[cfg(target_arch = "x86_64")]
impl Registers for Four {
    type Gradient = crate::arithmetic::x86::Wide4;
    type Column = crate::arithmetic::x86::Wide4;
}

/// AVX-512.
#[cfg(target_arch = "x86_64")]
pub(super) struct Eight;

#[cfg(target_arch = "x86_64")]
impl Registers for Eight {
    type Gradient = crate::arithmetic::x86::Wide4;
    type Column = crate::arithmetic::x86::Wide8;
}

/// How the coefficients lie in memory.
trait Layout {
    type Value: Real;
    type Gradient;
    type Column;

    /// xx, xy, xz, yy, yz, zz of one order.
    fn gradient(&self, from: &Self::Gradient) -> [Self::Value; 6];
    /// x, y, z of one order.
    fn read(&self, from: &Self::Column) -> [Self::Value; 3];
    fn write(&self, coefficient: [Self::Value; 3], to: &mut Self::Column);
}

/// 1/((k + 1)(k + 2)) and 2/(k + 2): from the series of the forces on a column, and from its rate, to its own.
const INTEGRATED: [[f64; 2]; TERMS] = {
    let mut factors = [[0.0; 2]; TERMS];
    let mut k = 0;
    while k < TERMS {
        #[expect(clippy::cast_precision_loss, reason = "orders are small")]
        let (divisor, next) = (((k + 1) * (k + 2)) as f64, (k + 2) as f64);
        factors[k] = [1.0 / divisor, 2.0 / next];
        k += 1;
    }
    factors
};

/// Expands a column whose coefficients 0 and 1 are known.
#[inline(always)]
fn expand_column<T: Layout>(layout: &T, gradient: &[T::Gradient; TERMS], column: &mut [T::Column; TERMS]) {
    for k in (0..ORDER).step_by(2) {
        let (mut even, mut odd) = (Sums::new(), Sums::new());
        odd.add(layout.gradient(&gradient[k + 1]), layout.read(&column[0]));
        for (gradient, columns) in gradient[..=k].iter().rev().zip(column[..k + 2].windows(2)) {
            let gradient = layout.gradient(gradient);
            even.add(gradient, layout.read(&columns[0]));
            odd.add(gradient, layout.read(&columns[1]));
        }
        let next = integrated(k, even.total(), layout.read(&column[k + 1]));
        layout.write(next, &mut column[k + 2]);
        layout.write(integrated(k + 1, odd.total(), next), &mut column[k + 3]);
    }
}

/// Coefficient k + 2 of a column from coefficient k of the forces and k + 1 of the column.
#[inline(always)]
fn integrated<R: Real>(k: usize, [x, y, z]: [R; 3], [rate_x, rate_y, _]: [R; 3]) -> [R; 3] {
    let [factor, turn] = INTEGRATED[k].map(R::from_f64);
    [rate_y.mul_add(turn, x * factor), rate_x.neg_mul_add(turn, y * factor), z * factor]
}

/// Sums of the products of the gradient with a column: two an axis, so that neither waits for itself.
struct Sums<R> {
    in_plane: [R; 3],
    vertical: [R; 3],
}

impl<R: Real> Sums<R> {
    #[inline(always)]
    fn new() -> Self {
        let zero = R::from_f64(0.0);
        Self { in_plane: [zero; 3], vertical: [zero; 3] }
    }

    #[inline(always)]
    fn add(&mut self, [xx, xy, xz, yy, yz, zz]: [R; 6], [x, y, z]: [R; 3]) {
        for (axis, [by_x, by_y, by_z]) in [[xx, xy, xz], [xy, yy, yz], [xz, yz, zz]].into_iter().enumerate() {
            self.in_plane[axis] = by_y.mul_add(y, by_x.mul_add(x, self.in_plane[axis]));
            self.vertical[axis] = by_z.mul_add(z, self.vertical[axis]);
        }
    }

    #[inline(always)]
    fn total(&self) -> [R; 3] {
        [0, 1, 2].map(|axis| self.in_plane[axis] + self.vertical[axis])
    }
}
