//! Taylor series of the equations of motion: recurrences, step size, dense output, variational equations.
//!
//! The series come by recurrence (automatic differentiation; Moore 1966, *Interval Analysis*; Steffensen 1956,
//! K. Danske Vidensk. Selsk. Mat.-Fys. Medd. 30, 18, for this problem). Order and step follow Jorba & Zou 2005,
//! Exper. Math. 14, 99, with the order fixed.

mod dispatch;
pub mod extended;
mod lanes;
mod motion;
mod opening;
mod packed;
mod primaries;
mod step;
mod swarm;
mod tables;
mod variational;

use crate::arithmetic::{Quad, Real};

pub use dispatch::{
    Path, advance, advance_variational, expand, expand_variational, flow, jacobi_constant, run,
};
pub(crate) use dispatch::{advance_four, eight, run_four};
pub use motion::{Halt, Place, Stride};
pub use primaries::Primaries;
pub use step::{MAX_STEP, STEP_FLOOR, StepSize};
pub(crate) use swarm::{Lane, Pause, Swarm};
pub use variational::{Columns, Transition};

/// Order of the velocity series. At double precision 20 to 26 cost the same within 5 %.
pub const ORDER: usize = 22;

/// Coefficients of the position series, which the second-order equations carry one order further.
pub const TERMS: usize = ORDER + 2;

/// The Taylor series about one instant: position relative to the nearer primary, and what the recurrences
/// make on the way. Coefficient k belongs to the k-th power of the time since that instant. What belongs to the two
/// primaries lies side by side, the nearer one first.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Series {
    /// x relative to the nearer primary, y and z; the fourth lane is 0.
    pub position: [Quad<f64>; TERMS],
    /// Half the squared distances of two orders, k and k + 1, at each k up to two before the last.
    squares: [Quad<f64>; TERMS],
    /// Mass shares over cubed distances.
    pub force: [[f64; 2]; TERMS],
    /// The sums of the two.
    pub total: [f64; TERMS],
    /// The nearer primary's x minus the farther one's: 1 where the smaller primary is nearer, else −1.
    pub side: f64,
    /// Jacobi constant.
    pub jacobi: f64,
    /// Base-2 logarithm of the radius of convergence, estimated.
    pub log2_radius: f64,
}

impl Series {
    /// Room for a series.
    #[must_use]
    pub fn new() -> Self {
        Self {
            position: [Quad::splat(0.0); TERMS],
            squares: [Quad::splat(0.0); TERMS],
            force: [[0.0; 2]; TERMS],
            total: [0.0; TERMS],
            side: 0.0,
            jacobi: 0.0,
            log2_radius: 0.0,
        }
    }

    /// Half the squared distances of order `k`.
    #[must_use]
    pub fn half_square(&self, k: usize) -> [f64; 2] {
        // What an odd order's own place holds is not complete in the last pair.
        let Quad([near, far, next_near, next_far]) = self.squares[k - k % 2];
        if k.is_multiple_of(2) { [near, far] } else { [next_near, next_far] }
    }

    fn set_half_square(&mut self, k: usize, [near, far]: [f64; 2]) {
        let at = 2 * (k % 2);
        self.squares[k - k % 2].0[at..at + 2].copy_from_slice(&[near, far]);
    }

    /// Whether no coefficient has overflowed: one that has spoils all later ones.
    #[must_use]
    pub fn is_finite(&self) -> bool {
        let [a, b] = [TERMS - 2, TERMS - 1].map(|k| {
            let Quad([x, y, z, _]) = self.position[k];
            (x + y) + z
        });
        (a + b).is_finite()
    }
}

impl Default for Series {
    fn default() -> Self {
        Self::new()
    }
}

/// What position and velocity, the series of the position having these coefficients, change by within `time`.
///
/// With U the sum of `p[k + 2]` tᵏ, the position changes by t (p₁ + t U) and the velocity by t (2 U + t U′), so that each
/// change is rounded relative to itself. U and U′ come by Horner's rule, in t², the even and the odd orders apart.
#[inline(always)]
fn horner<R: Real>(time: R, coefficient: impl Fn(usize) -> R) -> [R; 2] {
    let square = time * time;
    let ([even, even_slope], [odd, odd_slope]) =
        (alternate(square, TERMS - 2, &coefficient), alternate(square, TERMS - 1, &coefficient));
    let odd = time * odd;
    let place = (even + odd).mul_add(time, coefficient(1)) * time;
    let slopes = odd_slope.mul_add(time, even_slope);
    let (two, three) = (R::from_f64(2.0), R::from_f64(3.0));
    let rate = slopes.mul_add(two * square, odd.mul_add(three, even + even)) * time;
    [place, rate]
}

/// Every other order from 2 or 3 up to `last` as a polynomial in t², and its derivative with respect to t².
#[inline(always)]
fn alternate<R: Real>(square: R, last: usize, coefficient: impl Fn(usize) -> R) -> [R; 2] {
    let mut slope = coefficient(last);
    let mut value = slope.mul_add(square, coefficient(last - 2));
    for k in (2 + last % 2..=last - 4).rev().step_by(2) {
        slope = slope.mul_add(square, value);
        value = value.mul_add(square, coefficient(k));
    }
    [value, slope]
}
