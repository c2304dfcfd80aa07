//! Unevaluated sums of two doubles: about 106 bits.

mod matrix;
mod products;

use std::ops::{Add, Div, Mul, Neg, Sub};

pub use matrix::Matrix;
pub use products::SumOfProducts;

use super::{Packed, Quad, Real, sum::Compensated};

/// The exact sum of two, rounded and the rest.
#[inline(always)]
fn two_sum<V: Real>(a: V, b: V) -> [V; 2] {
    let sum = a + b;
    let of_b = sum - a;
    [sum, (a - (sum - of_b)) + (b - of_b)]
}

/// The exact product of two, rounded and the rest.
#[inline(always)]
fn two_product<V: Real>(a: V, b: V) -> [V; 2] {
    let product = a * b;
    [product, a.mul_add(b, -product)]
}

/// `hi + lo` with |lo| at most half a unit in the last place of `hi`.
///
/// Sums, products, quotients and square roots are good to a relative 2⁻¹⁰² as long as the smaller half neither
/// overflows nor underflows. Methods: Dekker 1971, *A floating-point technique for extending the available
/// precision*, Numerische Mathematik 18:224, with the error of a product taken from a fused multiply-add; the
/// square root by Karp & Markstein 1997, ACM TOMS 23:561.
///
/// Finite numbers only: an infinite operand gives NaN.
#[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd)]
pub struct DoubleDouble<V = f64> {
    // The derived order compares `hi` first, which is right for normalised pairs.
    hi: V,
    lo: V,
}

impl<V: Real> DoubleDouble<V> {
    /// `value` in every lane.
    #[must_use]
    #[inline(always)]
    pub fn splat(value: DoubleDouble) -> Self {
        Self { hi: V::from_f64(value.hi), lo: V::from_f64(value.lo) }
    }

    /// Two halves, which must be a value and a rest that its rounding lost.
    #[must_use]
    #[inline(always)]
    pub fn normal(hi: V, lo: V) -> Self {
        Self { hi, lo }
    }

    /// The exact sum of two doubles.
    #[must_use]
    #[inline(always)]
    pub fn sum(a: V, b: V) -> Self {
        let [hi, lo] = two_sum(a, b);
        Self { hi, lo }
    }

    /// The exact product of two doubles.
    #[must_use]
    #[inline(always)]
    pub fn product(a: V, b: V) -> Self {
        let [hi, lo] = two_product(a, b);
        Self { hi, lo }
    }

    /// The exact square of a double.
    #[must_use]
    #[inline(always)]
    pub fn square(a: V) -> Self {
        Self::product(a, a)
    }

    /// `hi + lo`, where `lo` is already known to be the smaller.
    #[inline(always)]
    fn normalized(hi: V, lo: V) -> Self {
        let sum = hi + lo;
        Self { hi: sum, lo: lo - (sum - hi) }
    }

    /// The nearest double.
    #[must_use]
    #[inline(always)]
    pub fn to_double(self) -> V {
        self.hi
    }

    /// The two halves.
    #[must_use]
    #[inline(always)]
    pub fn halves(self) -> [V; 2] {
        [self.hi, self.lo]
    }

    /// The product with itself.
    #[must_use]
    #[inline(always)]
    pub fn squared(self) -> Self {
        self * self
    }

    /// The product with a power of two, exact.
    #[must_use]
    #[inline(always)]
    pub fn scaled(self, power_of_two: V) -> Self {
        Self { hi: self.hi * power_of_two, lo: self.lo * power_of_two }
    }

    /// The product with a double.
    #[must_use]
    #[inline(always)]
    pub fn times(self, factor: V) -> Self {
        let [hi, rest] = two_product(self.hi, factor);
        Self::normalized(hi, self.lo.mul_add(factor, rest))
    }
}

impl DoubleDouble {
    /// 1/n of a positive integer of at most 26 bits.
    #[must_use]
    #[expect(clippy::cast_precision_loss, reason = "so few bits")]
    pub const fn reciprocal(n: usize) -> Self {
        let divisor = n as f64;
        let hi = 1.0 / divisor;
        // The remainder 1 − hi · divisor, exactly, with hi split so that both products are exact.
        let high = f64::from_bits(hi.to_bits() & !((1 << 27) - 1));
        Self { hi, lo: ((1.0 - high * divisor) - (hi - high) * divisor) / divisor }
    }

    /// The nearest double.
    #[must_use]
    pub fn to_f64(self) -> f64 {
        self.hi
    }

    /// The absolute value.
    #[must_use]
    pub fn abs(self) -> Self {
        if self.hi < 0.0 { -self } else { self }
    }

    /// The square root of a number that is not negative; the root of 0 is 0.
    #[must_use]
    #[inline(always)]
    pub fn sqrt(self) -> Self {
        if self.hi == 0.0 {
            return Self::default();
        }
        let root = self.hi.sqrt();
        let rest = self - Self::square(root);
        Self::normalized(root, rest.hi / (2.0 * root))
    }
}

impl DoubleDouble<Quad<f64>> {
    /// Four numbers side by side.
    #[must_use]
    #[inline(always)]
    pub fn of(lanes: [DoubleDouble; 4]) -> Self {
        Self { hi: Quad(lanes.map(|lane| lane.hi)), lo: Quad(lanes.map(|lane| lane.lo)) }
    }

    /// The four numbers from memory.
    #[inline(always)]
    pub(crate) fn load<P: Packed>(&self) -> DoubleDouble<P> {
        DoubleDouble { hi: P::load(&self.hi), lo: P::load(&self.lo) }
    }

    /// One of the four numbers.
    #[must_use]
    #[inline(always)]
    pub fn lane(self, index: usize) -> DoubleDouble {
        DoubleDouble { hi: self.hi.0[index], lo: self.lo.0[index] }
    }
}

impl<P: Packed> DoubleDouble<P> {
    /// The four numbers in memory.
    #[inline(always)]
    pub(crate) fn stored(self) -> DoubleDouble<Quad<f64>> {
        let mut halves = [Quad::splat(0.0); 2];
        self.hi.store(&mut halves[0]);
        self.lo.store(&mut halves[1]);
        let [hi, lo] = halves;
        DoubleDouble { hi, lo }
    }
}

impl From<f64> for DoubleDouble {
    #[inline(always)]
    fn from(value: f64) -> Self {
        Self { hi: value, lo: 0.0 }
    }
}

impl From<Compensated> for DoubleDouble {
    #[inline(always)]
    fn from(Compensated { value, rest }: Compensated) -> Self {
        Self::sum(value, rest)
    }
}

impl From<DoubleDouble> for Compensated {
    #[inline(always)]
    fn from(DoubleDouble { hi, lo }: DoubleDouble) -> Self {
        Self { value: hi, rest: lo }
    }
}

impl<V: Real> Neg for DoubleDouble<V> {
    type Output = Self;

    #[inline(always)]
    fn neg(self) -> Self {
        Self { hi: -self.hi, lo: -self.lo }
    }
}

impl<V: Real> Add for DoubleDouble<V> {
    type Output = Self;

    #[inline(always)]
    fn add(self, other: Self) -> Self {
        let (high, low) = (Self::sum(self.hi, other.hi), Self::sum(self.lo, other.lo));
        let first = Self::normalized(high.hi, high.lo + low.hi);
        Self::normalized(first.hi, first.lo + low.lo)
    }
}

impl<V: Real> Mul for DoubleDouble<V> {
    type Output = Self;

    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        let high = Self::product(self.hi, other.hi);
        let cross = self.hi.mul_add(other.lo, self.lo * other.hi);
        Self::normalized(high.hi, high.lo + cross)
    }
}

impl Div for DoubleDouble {
    type Output = Self;

    #[inline(always)]
    fn div(self, other: Self) -> Self {
        let first = self.hi / other.hi;
        let rest = self - other * first;
        let second = rest.hi / other.hi;
        let third = (rest - other * second).hi / other.hi;
        Self::normalized(first, second) + third
    }
}

impl<V: Real> Sub for DoubleDouble<V> {
    type Output = Self;

    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        self + -other
    }
}

macro_rules! with_double {
    ($($operation:ident $method:ident)*) => {$(
        impl $operation<f64> for DoubleDouble {
            type Output = Self;

            #[inline(always)]
            fn $method(self, other: f64) -> Self {
                self.$method(Self::from(other))
            }
        }
    )*};
}

with_double!(Add add Sub sub Mul mul Div div);
