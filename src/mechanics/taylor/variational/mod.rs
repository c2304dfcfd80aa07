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
pub use packed::{Columns, Transition};
pub(super) use packed::{advance, expand};

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
    /// Whether there are registers enough for the sums of two orders at once.
    const BOTH: bool;
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
        if k == 0 {
            odd.add(second, newest);
        } else if T::BOTH {
            let mut older = layout.read(&column[0]);
            odd.add(layout.gradient(&gradient[k + 1]), older);
            for (gradient, column) in gradient[2..=k].iter().rev().zip(&column[1..k]) {
                let (gradient, newer) = (layout.gradient(gradient), layout.read(column));
                even.add(gradient, older);
                odd.add(gradient, newer);
                older = newer;
            }
            even.add(second, older);
            odd.add(second, newest);
        } else {
            for (gradient, column) in gradient[1..=k].iter().rev().zip(&column[..k]) {
                even.add(layout.gradient(gradient), layout.read(column));
            }
            for (gradient, column) in gradient[2..=k + 1].iter().rev().zip(&column[..k]) {
                odd.add(layout.gradient(gradient), layout.read(column));
            }
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
    let (factor, turn) = (R::from_f64(INTEGRATED[k][0]), R::from_f64(INTEGRATED[k][1]));
    let [x, y, z] = forces.total();
    [rate_y.mul_add(turn, x * factor), rate_x.neg_mul_add(turn, y * factor), z * factor]
}

/// Sums of the products of the gradient with a column, by axis and component: none waits for another.
#[derive(Clone, Copy)]
struct Sums<R>([[R; 3]; 3]);

impl<R: Real> Sums<R> {
    #[inline(always)]
    fn new() -> Self {
        Self([[R::from_f64(0.0); 3]; 3])
    }

    #[inline(always)]
    fn add(&mut self, [xx, xy, xz, yy, yz, zz]: [R; 6], [x, y, z]: [R; 3]) {
        let [along_x, along_y, along_z] = &mut self.0;
        along_x[0] = xx.mul_add(x, along_x[0]);
        along_y[0] = xy.mul_add(x, along_y[0]);
        along_z[0] = xz.mul_add(x, along_z[0]);
        along_x[1] = xy.mul_add(y, along_x[1]);
        along_y[1] = yy.mul_add(y, along_y[1]);
        along_z[1] = yz.mul_add(y, along_z[1]);
        along_x[2] = xz.mul_add(z, along_x[2]);
        along_y[2] = yz.mul_add(z, along_y[2]);
        along_z[2] = zz.mul_add(z, along_z[2]);
    }

    #[inline(always)]
    fn total(&self) -> [R; 3] {
        let [x, y, z] = self.0;
        [(x[0] + x[1]) + x[2], (y[0] + y[1]) + y[2], (z[0] + z[1]) + z[2]]
    }
}
