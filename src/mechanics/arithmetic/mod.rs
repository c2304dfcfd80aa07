//! The one generic axis of this crate: a formula is written once over [`Real`] and instantiated for each
//! arithmetic. Every contraction is an explicit `mul_add`, so an instantiation has the same bits on every
//! machine.

mod double;
mod double_double;
mod quad;
pub mod sum;
#[cfg(target_arch = "x86_64")]
pub(crate) mod x86;

use std::ops::{Add, Div, Mul, Neg, Sub};

pub(crate) use double::power_of_two;
pub use double_double::{DoubleDouble, Matrix, SumOfProducts};
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

    /// `addend − self * factor`, rounded once.
    #[must_use]
    fn neg_mul_add(self, factor: Self, addend: Self) -> Self;

    /// The square root, correctly rounded.
    #[must_use]
    fn sqrt(self) -> Self;

    /// The absolute value.
    #[must_use]
    fn abs(self) -> Self;

    /// The larger of two values; the second where they are equal or one is no number.
    #[must_use]
    fn max(self, other: Self) -> Self;

    /// The smaller of two values; the second where they are equal or one is no number.
    #[must_use]
    fn min(self, other: Self) -> Self;

    /// `yes` where `self < other`, else `no`.
    #[must_use]
    fn select_less(self, other: Self, yes: Self, no: Self) -> Self;

    /// log₂ of a positive value within 4e-6: enough to choose a step.
    #[must_use]
    fn log2_coarse(self) -> Self;

    /// 2 to this power to about 1e-6, for powers within ±1000.
    #[must_use]
    fn exp2_coarse(self) -> Self;
}

/// Values side by side, on which every operation acts one by one.
pub trait Lanes: Real {
    /// How many.
    const COUNT: usize;
    /// The values.
    type Array: Copy + AsRef<[f64]> + AsMut<[f64]>;

    /// From an array.
    fn from_array(values: &Self::Array) -> Self;

    /// To an array.
    fn to_array(self) -> Self::Array;

    /// From the beginning of a slice.
    fn read(values: &[f64]) -> Self;

    /// To the beginning of a slice.
    fn write(self, values: &mut [f64]);

    /// The lanes where this is less than `other`, as bits.
    fn less(self, other: Self) -> u32;
}

/// Four doubles side by side of one trajectory, which also move between the lanes.
pub trait Packed: Real {
    /// From memory.
    fn load(quad: &Quad<f64>) -> Self;

    /// To memory.
    fn store(self, quad: &mut Quad<f64>);

    /// Two values, twice.
    fn twice(pair: &[f64; 2]) -> Self;

    /// (b, c, c, a).
    #[must_use]
    fn bcca(self) -> Self;

    /// (b, b, c, d).
    #[must_use]
    fn bbcd(self) -> Self;

    /// To two pairs in memory, from `at` on.
    fn store_pairs(self, pairs: &mut [[f64; 2]], at: usize);

    /// The first value.
    fn first(self) -> f64;

    /// (a + b) + (c + d) in every lane.
    #[must_use]
    fn sum(self) -> Self;

    /// (b, a, d, c).
    #[must_use]
    fn swap(self) -> Self;

    /// (a, a, a, a).
    #[must_use]
    fn firsts(self) -> Self;

    /// (a, b) and the other's (a, b).
    #[must_use]
    fn low_with_low(self, other: Self) -> Self;

    /// (c, d) and the other's (a, b).
    #[must_use]
    fn high_with_low(self, other: Self) -> Self;

    /// (c, d, 0, 0).
    #[must_use]
    fn high_alone(self) -> Self;

    /// (a, b, a, b).
    #[must_use]
    fn low_twice(self) -> Self;

    /// (c, d, c, d).
    #[must_use]
    fn high_twice(self) -> Self;

    /// The same values, which a compiler may not put off computing.
    #[must_use]
    fn settle(self) -> Self;

    /// The lanes of `other` whose bit is set, else these.
    #[must_use]
    fn with<const MASK: i32>(self, other: Self) -> Self;
}
