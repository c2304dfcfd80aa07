//! Unevaluated sums of two doubles: about 106 bits.

use std::ops::{Add, Div, Mul, Neg, Sub};

use super::sum::Compensated;

/// `hi + lo` with |lo| at most half a unit in the last place of `hi`.
///
/// Sums, products, quotients and square roots are good to a relative 2⁻¹⁰² as long as the smaller half neither
/// overflows nor underflows. Methods: Dekker 1971, *A floating-point technique for extending the available
/// precision*, Numerische Mathematik 18:224, with the error of a product taken from a fused multiply-add; the
/// square root by Karp & Markstein 1997, ACM TOMS 23:561.
///
/// Finite numbers only: an infinite operand gives NaN.
#[derive(Clone, Copy, Debug, Default, PartialEq, PartialOrd)]
pub struct DoubleDouble {
    // The derived order compares `hi` first, which is right for normalised pairs.
    hi: f64,
    lo: f64,
}

impl DoubleDouble {
    /// The exact sum of two doubles.
    #[must_use]
    pub fn sum(a: f64, b: f64) -> Self {
        let Compensated { value, rest } = Compensated::sum(a, b);
        Self { hi: value, lo: rest }
    }

    /// The exact product of two doubles.
    #[must_use]
    pub fn product(a: f64, b: f64) -> Self {
        let hi = a * b;
        Self { hi, lo: a.mul_add(b, -hi) }
    }

    /// The exact square of a double.
    #[must_use]
    pub fn square(a: f64) -> Self {
        Self::product(a, a)
    }

    /// `hi + lo`, where `lo` is already known to be the smaller.
    fn normalized(hi: f64, lo: f64) -> Self {
        let sum = hi + lo;
        Self { hi: sum, lo: lo - (sum - hi) }
    }

    /// The nearest double.
    #[must_use]
    pub fn to_f64(self) -> f64 {
        self.hi
    }

    /// The product with itself.
    #[must_use]
    pub fn squared(self) -> Self {
        self * self
    }

    /// The square root of a number that is not negative; the root of 0 is 0.
    #[must_use]
    pub fn sqrt(self) -> Self {
        if self.hi == 0.0 {
            return Self::default();
        }
        let root = self.hi.sqrt();
        let rest = self - Self::square(root);
        Self::normalized(root, rest.hi / (2.0 * root))
    }
}

impl From<f64> for DoubleDouble {
    fn from(value: f64) -> Self {
        Self { hi: value, lo: 0.0 }
    }
}

impl Neg for DoubleDouble {
    type Output = Self;

    fn neg(self) -> Self {
        Self { hi: -self.hi, lo: -self.lo }
    }
}

impl Add for DoubleDouble {
    type Output = Self;

    fn add(self, other: Self) -> Self {
        let (high, low) = (Self::sum(self.hi, other.hi), Self::sum(self.lo, other.lo));
        let first = Self::normalized(high.hi, high.lo + low.hi);
        Self::normalized(first.hi, first.lo + low.lo)
    }
}

impl Mul for DoubleDouble {
    type Output = Self;

    fn mul(self, other: Self) -> Self {
        let high = Self::product(self.hi, other.hi);
        let cross = self.hi.mul_add(other.lo, self.lo * other.hi);
        Self::normalized(high.hi, high.lo + cross)
    }
}

impl Div for DoubleDouble {
    type Output = Self;

    fn div(self, other: Self) -> Self {
        let first = self.hi / other.hi;
        let rest = self - other * first;
        let second = rest.hi / other.hi;
        let third = (rest - other * second).hi / other.hi;
        Self::normalized(first, second) + third
    }
}

impl Sub for DoubleDouble {
    type Output = Self;

    fn sub(self, other: Self) -> Self {
        self + -other
    }
}

macro_rules! with_double {
    ($($operation:ident $method:ident)*) => {$(
        impl $operation<f64> for DoubleDouble {
            type Output = Self;

            fn $method(self, other: f64) -> Self {
                self.$method(Self::from(other))
            }
        }
    )*};
}

with_double!(Add add Sub sub Mul mul Div div);
