//! Taylor series of the equations of motion: recurrences, step size, dense output, variational equations.
//!
//! The series come by recurrence (automatic differentiation; Moore 1966, *Interval Analysis*; Steffensen 1956,
//! K. Danske Vidensk. Selsk. Mat.-Fys. Medd. 30, 18, for this problem). Order and step follow Jorba & Zou 2005,
//! Exper. Math. 14, 99, with the order fixed.

#[macro_use]
mod dispatch;
pub mod extended;
mod recurrence;
mod step;
mod variational;

use crate::arithmetic::{Quad, Real};

pub use dispatch::{accelerated, expand, expand_variational, flow, flow_variational, jacobi_constant};
pub use recurrence::Primaries;
pub use step::{MAX_STEP, STEP_FLOOR, StepSize};
pub use variational::Columns;

/// Order of the velocity series. At double precision 20 to 26 cost the same within 5 %.
pub const ORDER: usize = 22;

/// Coefficients of the position series, which the second-order equations carry one order further.
pub const TERMS: usize = ORDER + 2;

/// The Taylor series about one instant: position relative to the nearer primary, and what the recurrences
/// make on the way. Coefficient k belongs to the k-th power of the time since that instant. What belongs to the two
/// primaries lies side by side, the nearer one first.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Series<R> {
    /// x relative to the nearer primary, y and z; the fourth lane is 0.
    pub position: [Quad<R>; TERMS],
    /// Half the squared distances.
    pub half_square: [[R; 2]; TERMS],
    /// Mass shares over cubed distances.
    pub force: [[R; 2]; TERMS],
    /// The sums of the two.
    pub total: [R; TERMS],
    /// The nearer primary's x minus the farther one's: 1 where the smaller primary is nearer, else −1.
    pub side: R,
    /// Jacobi constant.
    pub jacobi: R,
    /// Base-2 logarithm of the radius of convergence, estimated.
    pub log2_radius: R,
}

impl<R: Real> Series<R> {
    /// Room for a series.
    #[must_use]
    pub fn new() -> Self {
        let zero = R::from_f64(0.0);
        Self {
            position: [Quad::splat(zero); TERMS],
            half_square: [[zero; 2]; TERMS],
            force: [[zero; 2]; TERMS],
            total: [zero; TERMS],
            side: zero,
            jacobi: zero,
            log2_radius: zero,
        }
    }
}

impl Series<f64> {
    /// Whether no coefficient has overflowed: one that has spoils all later ones.
    #[must_use]
    pub fn is_finite(&self) -> bool {
        self.position[TERMS - 2..].iter().all(|Quad([x, y, z, _])| (x + y + z).is_finite())
    }
}

impl<R: Real> Default for Series<R> {
    fn default() -> Self {
        Self::new()
    }
}
