//! Double precision.

use super::Real;

/// Bits of a double's fraction.
pub(super) const FRACTION_BITS: u32 = 52;
/// A double's exponent bias.
pub(super) const BIAS: i64 = 1023;
/// log₂ of 1 + s over s in powers of s, from √½ to √2 within 4e-6: interpolated at Chebyshev's points.
pub(super) const LOG2: [f64; 6] = [
    1.442_701_799_767_528,
    -0.721_208_467_555_427_4,
    0.479_793_884_155_257_64,
    -0.366_413_259_384_624_7,
    0.318_407_118_377_148_63,
    -0.206_858_124_217_345_45,
];
/// (ln 2)^k/k!: the Taylor coefficients of 2^f, cut where |f| ≤ 1/2 leaves 3e-6.
pub(super) const EXP2: [f64; 6] = [
    1.0,
    std::f64::consts::LN_2,
    0.240_226_506_959_100_7,
    0.055_504_108_664_821_58,
    0.009_618_129_107_628_477,
    0.001_333_355_814_642_844_2,
];
/// 1.5 × 2^52: adding and subtracting it rounds to the nearest integer.
pub(super) const ROUNDER: f64 = 6_755_399_441_055_744.0;
/// Brings a mantissa into [√½, √2): the difference of the bit patterns of 1 and √½.
pub(super) const TO_ONE: u64 = 1.0_f64.to_bits() - std::f64::consts::FRAC_1_SQRT_2.to_bits();

/// 2 to this power, for powers within ±1000.
#[inline(always)]
pub(crate) const fn power_of_two(power: i64) -> f64 {
    f64::from_bits(((power + BIAS) << FRACTION_BITS).cast_unsigned())
}

impl Real for f64 {
    #[inline(always)]
    fn from_f64(value: f64) -> Self {
        value
    }

    #[inline(always)]
    fn mul_add(self, factor: Self, addend: Self) -> Self {
        Self::mul_add(self, factor, addend)
    }

    #[inline(always)]
    fn neg_mul_add(self, factor: Self, addend: Self) -> Self {
        Self::mul_add(-self, factor, addend)
    }

    #[inline(always)]
    fn sqrt(self) -> Self {
        Self::sqrt(self)
    }

    #[inline(always)]
    fn abs(self) -> Self {
        Self::abs(self)
    }

    #[inline(always)]
    fn max(self, other: Self) -> Self {
        if self > other { self } else { other }
    }

    #[inline(always)]
    fn min(self, other: Self) -> Self {
        if self < other { self } else { other }
    }

    #[inline(always)]
    fn select_less(self, other: Self, yes: Self, no: Self) -> Self {
        if self < other { yes } else { no }
    }

    #[inline(always)]
    #[expect(clippy::cast_possible_wrap, clippy::cast_precision_loss, reason = "an exponent has 11 bits")]
    fn log2_coarse(self) -> Self {
        let shifted = self.to_bits().wrapping_add(TO_ONE);
        let exponent = (shifted >> FRACTION_BITS) as i64 - BIAS;
        let mantissa =
            Self::from_bits(self.to_bits().wrapping_sub((exponent << FRACTION_BITS).cast_unsigned()));
        let rest = mantissa - 1.0;
        let [a, b, c, d, e, g] = LOG2;
        let ratio = g.mul_add(rest, e).mul_add(rest, d).mul_add(rest, c).mul_add(rest, b).mul_add(rest, a);
        ratio.mul_add(rest, exponent as Self)
    }

    #[inline(always)]
    #[expect(clippy::cast_possible_truncation, reason = "the power is within ±1000")]
    fn exp2_coarse(self) -> Self {
        let whole = (self + ROUNDER) - ROUNDER;
        let f = self - whole;
        let [a, b, c, d, e, g] = EXP2;
        let fraction = g.mul_add(f, e).mul_add(f, d).mul_add(f, c).mul_add(f, b).mul_add(f, a);
        fraction * power_of_two(whole as i64)
    }
}

#[cfg(test)]
#[expect(clippy::disallowed_methods, reason = "compared within a tolerance, not in their bits")]
mod tests {
    use super::Real;

    /// Against the standard library's own logarithm.
    #[test]
    fn coarse_logarithm_and_power() {
        let mut value = 1e-300;
        while value < 1e300 {
            assert!((value.log2_coarse() - value.log2()).abs() < 4e-6, "{value}");
            value *= 1.37;
        }
        let mut power = -990.0;
        while power < 990.0 {
            assert!((power.exp2_coarse() / power.exp2() - 1.0).abs() < 5e-6, "{power}");
            power += 0.173;
        }
    }
}
