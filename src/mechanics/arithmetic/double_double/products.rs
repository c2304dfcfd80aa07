//! Sums of products.

use super::super::Real;
use super::{DoubleDouble, two_product, two_sum};

/// A sum of products of double-doubles that is made a double-double only at its end: the leading halves are summed
/// with their rounding errors, everything smaller in plain doubles (Ogita, Rump & Oishi 2005, SIAM J. Sci. Comput.
/// 26:1955, with the smaller halves of the factors taken along). After n terms the error is below about
/// n² · 2⁻¹⁰⁵ times the sum of their magnitudes.
#[derive(Clone, Copy, Debug)]
pub struct SumOfProducts<V> {
    leading: V,
    rest: V,
}

impl<V: Real> SumOfProducts<V> {
    /// The sum of none.
    #[must_use]
    #[inline(always)]
    pub fn none() -> Self {
        Self { leading: V::from_f64(0.0), rest: V::from_f64(0.0) }
    }

    /// One product.
    #[must_use]
    #[inline(always)]
    pub fn of(a: DoubleDouble<V>, b: DoubleDouble<V>) -> Self {
        let [leading, rest] = two_product(a.hi, b.hi);
        Self { leading, rest: a.hi.mul_add(b.lo, a.lo.mul_add(b.hi, rest)) }
    }

    /// This and the product of `a` and `b`.
    #[must_use]
    #[inline(always)]
    pub fn and(self, a: DoubleDouble<V>, b: DoubleDouble<V>) -> Self {
        let [product, lost] = two_product(a.hi, b.hi);
        let [leading, lost_in_sum] = two_sum(self.leading, product);
        let small = a.hi.mul_add(b.lo, a.lo.mul_add(b.hi, lost + lost_in_sum));
        Self { leading, rest: self.rest + small }
    }

    /// The sum.
    #[must_use]
    #[inline(always)]
    pub fn total(self) -> DoubleDouble<V> {
        DoubleDouble::sum(self.leading, self.rest)
    }
}
