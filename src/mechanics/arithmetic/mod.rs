//! The one generic axis of this crate: a formula is written once over [`Real`] and instantiated for each
//! arithmetic. Every contraction is an explicit `mul_add`, so an instantiation has the same bits on every
//! machine.

mod double;
mod double_double;
mod quad;
pub mod sum;

use std::ops::{Add, Div, Mul, Neg, Sub};

pub use double_double::{DoubleDouble, Half, Matrix, SumOfProducts};
pub use quad::Quad;

/// The operations the Taylor recurrences need.
pub trait Real:
    Copy
    + Add<Output = Self>
    + Sub<Output = Self>
    + Mul<Output = Self>
    + Div<Output = Self>
    + Neg<Output = Self>
    + Send
    + Sync
    + 'static
{
    /// The constant `value`.
    fn from_f64(value: f64) -> Self;

    /// `self * factor + addend`, rounded once.
    #[must_use]
    fn mul_add(self, factor: Self, addend: Self) -> Self;

    /// The square root, correctly rounded.
    #[must_use]
    fn sqrt(self) -> Self;

    /// The absolute value.
    #[must_use]
    fn abs(self) -> Self;

    /// The larger of two ordered values.
    #[must_use]
    fn max(self, other: Self) -> Self;

    /// The smaller of two ordered values.
    #[must_use]
    fn min(self, other: Self) -> Self;

    /// `yes` where `self < other`, else `no`.
    #[must_use]
    fn select_less(self, other: Self, yes: Self, no: Self) -> Self;

    /// log₂ of a positive value to about 1e-7: enough to choose a step.
    #[must_use]
    fn log2_coarse(self) -> Self;

    /// 2 to this power to about 1e-6, for powers within ±1000.
    #[must_use]
    fn exp2_coarse(self) -> Self;
}
