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
static INTEGRATED: [[f64; 2]; TERMS] = {
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
    // The newest coefficients stay in registers.
    let (mut newest, mut next) = (layout.read(&column[0]), layout.read(&column[1]));
    let (first, second) = (layout.gradient(&gradient[0]), layout.gradient(&gradient[1]));
    for k in (0..ORDER).step_by(2) {
        let (mut even, mut odd) = (Sums::new(), Sums::new());
        let mut older = layout.read(&column[0]);
        odd.add(layout.gradient(&gradient[k + 1]), older);
        if k > 0 {
            for (gradient, column) in gradient[2..=k].iter().rev().zip(&column[1..k]) {
                let (gradient, newer) = (layout.gradient(gradient), layout.read(column));
                even.add(gradient, older);
                odd.add(gradient, newer);
                older = newer;
            }
            even.add(second, older);
            odd.add(second, newest);
        }
        even.add(first, newest);
        odd.add(first, next);
        newest = integrated(k, even, next);
        next = integrated(k + 1, odd, newest);
        layout.write(newest, &mut column[k + 2]);
        layout.write(next, &mut column[k + 3]);
    }
}

/// Coefficient k + 2 of a column from coefficient k of the forces and k + 1 of the column.
#[inline(always)]
fn integrated<R: Real>(k: usize, forces: Sums<R>, [rate_x, rate_y, _]: [R; 3]) -> [R; 3] {
    let Sums { in_plane: [x, y, z], vertical: [by_x, by_y, by_z] } = forces;
    let (factor, turn) = (R::from_f64(INTEGRATED[k][0]), R::from_f64(INTEGRATED[k][1]));
    [
        rate_y.mul_add(turn, (x + by_x) * factor),
        rate_x.neg_mul_add(turn, (y + by_y) * factor),
        (z + by_z) * factor,
    ]
}

/// Sums of the products of the gradient with a column: two an axis, so that neither waits for itself.
#[derive(Clone, Copy)]
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
        self.in_plane[0] = xy.mul_add(y, xx.mul_add(x, self.in_plane[0]));
        self.in_plane[1] = yy.mul_add(y, xy.mul_add(x, self.in_plane[1]));
        self.in_plane[2] = yz.mul_add(y, xz.mul_add(x, self.in_plane[2]));
        self.vertical[0] = xz.mul_add(z, self.vertical[0]);
        self.vertical[1] = yz.mul_add(z, self.vertical[1]);
        self.vertical[2] = zz.mul_add(z, self.vertical[2]);
    }
}
