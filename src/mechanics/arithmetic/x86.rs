//! Four and eight doubles in one register of an x86-64 processor.
//!
//! # Safety
//! A value of these types must only be made and used inside functions compiled for the instruction set it names, on a
//! processor that has it: [`crate::taylor::Path`] is where that is checked, once, before such a function is called.
//! Each operation below is a single instruction of that set (or a few), without any other precondition: loads and
//! stores go through references to arrays of the right length and need no alignment.
#![expect(unsafe_code, reason = "intrinsics; see the module's safety argument")]

use std::arch::asm;
use std::arch::x86_64::{
    __m256d, __m512d, _CMP_LT_OQ, _mm_loadu_pd, _mm256_add_epi64, _mm256_add_pd, _mm256_andnot_pd,
    _mm256_blend_pd, _mm256_blendv_pd, _mm256_castpd_si256, _mm256_castpd128_pd256, _mm256_castsi256_pd,
    _mm256_cmp_pd, _mm256_cvtsd_f64, _mm256_div_pd, _mm256_fmadd_pd, _mm256_fnmadd_pd, _mm256_insertf128_pd,
    _mm256_loadu_pd, _mm256_max_pd, _mm256_min_pd, _mm256_movemask_pd, _mm256_mul_pd, _mm256_or_si256,
    _mm256_permute_pd, _mm256_permute2f128_pd, _mm256_permute4x64_pd, _mm256_set1_epi64x, _mm256_set1_pd,
    _mm256_slli_epi64, _mm256_sqrt_pd, _mm256_srli_epi64, _mm256_storeu_pd, _mm256_sub_epi64, _mm256_sub_pd,
    _mm512_abs_pd, _mm512_add_epi64, _mm512_add_pd, _mm512_castpd_si512, _mm512_castsi512_pd,
    _mm512_cmp_pd_mask, _mm512_div_pd, _mm512_fmadd_pd, _mm512_fnmadd_pd, _mm512_loadu_pd,
    _mm512_mask_blend_pd, _mm512_max_pd, _mm512_min_pd, _mm512_mul_pd, _mm512_or_si512, _mm512_set1_epi64,
    _mm512_set1_pd, _mm512_slli_epi64, _mm512_sqrt_pd, _mm512_srli_epi64, _mm512_storeu_pd, _mm512_sub_epi64,
    _mm512_sub_pd,
};
use std::ops::{Add, Div, Mul, Neg, Sub};

use super::double::{BIAS, EXP2, FRACTION_BITS, LOG2, ROUNDER, TO_ONE};
use super::{Lanes, Packed, Quad, Real};

macro_rules! wide {
    ($name:ident, $register:ty, $count:literal, $set:literal,
     $add:ident $sub:ident $mul:ident $div:ident $fmadd:ident $fnmadd:ident $sqrt:ident $max:ident $min:ident $splat:ident
     $load:ident $store:ident $less:ident $abs:ident $select:ident;
     $immediate:expr, $set1:ident $add_i:ident $sub_i:ident $or_i:ident $shift_left:ident $shift_right:ident
     $to_bits:ident $from_bits:ident) => {
        #[doc = concat!("Doubles in a register of ", $set, ".")]
        #[derive(Clone, Copy, Debug)]
        #[repr(transparent)]
        pub(crate) struct $name($register);

        wide!(@operator $name Add add $add);
        wide!(@operator $name Sub sub $sub);
        wide!(@operator $name Mul mul $mul);
        wide!(@operator $name Div div $div);

        impl Neg for $name {
            type Output = Self;

            #[inline(always)]
            fn neg(self) -> Self {
                // Not 0 − x, which makes a positive zero of a positive zero.
                self * Self::from_f64(-1.0)
            }
        }

        impl Lanes for $name {
            const COUNT: usize = $count;
            type Array = [f64; $count];

            #[inline(always)]
            fn from_array(values: &[f64; $count]) -> Self {
                // SAFETY: the module's; the array has as many values as the register.
                Self(unsafe { $load(values.as_ptr()) })
            }

            #[inline(always)]
            fn to_array(self) -> [f64; $count] {
                let mut values = [0.0; $count];
                // SAFETY: the module's; the array has as many values as the register.
                unsafe { $store(values.as_mut_ptr(), self.0) };
                values
            }

            #[inline(always)]
            fn read(values: &[f64]) -> Self {
                let values = &values[..$count];
                // SAFETY: the module's; the slice has as many values as the register.
                Self(unsafe { $load(values.as_ptr()) })
            }

            #[inline(always)]
            fn write(self, values: &mut [f64]) {
                let values = &mut values[..$count];
                // SAFETY: the module's; the slice has as many values as the register.
                unsafe { $store(values.as_mut_ptr(), self.0) };
            }

            #[inline(always)]
            fn less(self, other: Self) -> u32 {
                let (a, b) = (self.0, other.0);
                // SAFETY: the module's.
                unsafe { $less(a, b) }
            }
        }

        impl Real for $name {
            #[inline(always)]
            fn from_f64(value: f64) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $splat(value) })
            }

            #[inline(always)]
            fn mul_add(self, factor: Self, addend: Self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $fmadd(self.0, factor.0, addend.0) })
            }

            #[inline(always)]
            fn neg_mul_add(self, factor: Self, addend: Self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $fnmadd(self.0, factor.0, addend.0) })
            }

            #[inline(always)]
            fn sqrt(self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $sqrt(self.0) })
            }

            #[inline(always)]
            fn abs(self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $abs(self.0) })
            }

            #[inline(always)]
            fn max(self, other: Self) -> Self {
                // SAFETY: the module's. Where the values are equal or one is no number, the instruction gives the second.
                Self(unsafe { $max(self.0, other.0) })
            }

            #[inline(always)]
            fn min(self, other: Self) -> Self {
                // SAFETY: as for `max`.
                Self(unsafe { $min(self.0, other.0) })
            }

            #[inline(always)]
            fn select_less(self, other: Self, yes: Self, no: Self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $select(self.0, other.0, yes.0, no.0) })
            }

            #[inline(always)]
            fn log2_coarse(self) -> Self {
                /// 2^52, whose last 52 bits hold a whole number as it is.
                const WHOLE: f64 = 4_503_599_627_370_496.0;
                // SAFETY: the module's.
                let (exponent, mantissa) = unsafe {
                    let bits = $to_bits(self.0);
                    let shifted = $add_i(bits, $set1(TO_ONE.cast_signed()));
                    let biased = $shift_right::<{ $immediate }>(shifted);
                    let exponent = $from_bits($or_i(biased, $set1(WHOLE.to_bits().cast_signed())));
                    let whole = $shift_left::<{ $immediate }>($sub_i(biased, $set1(BIAS)));
                    (Self(exponent), Self($from_bits($sub_i(bits, whole))))
                };
                #[expect(clippy::cast_precision_loss, reason = "exact")]
                let exponent = exponent - Self::from_f64(WHOLE + BIAS as f64);
                let rest = mantissa - Self::from_f64(1.0);
                let [a, b, c, d, e, g] = LOG2.map(Self::from_f64);
                let ratio =
                    g.mul_add(rest, e).mul_add(rest, d).mul_add(rest, c).mul_add(rest, b).mul_add(rest, a);
                ratio.mul_add(rest, exponent)
            }

            #[inline(always)]
            fn exp2_coarse(self) -> Self {
                let rounder = Self::from_f64(ROUNDER);
                let rounded = self + rounder;
                let f = self - (rounded - rounder);
                let [a, b, c, d, e, g] = EXP2.map(Self::from_f64);
                let fraction = g.mul_add(f, e).mul_add(f, d).mul_add(f, c).mul_add(f, b).mul_add(f, a);
                // SAFETY: the module's. The last bits of the sum are the whole number, those above are shifted out.
                let power = Self(unsafe {
                    $from_bits($shift_left::<{ $immediate }>($add_i($to_bits(rounded.0), $set1(BIAS))))
                });
                fraction * power
            }
        }
    };
    (@operator $name:ident $trait:ident $method:ident $instruction:ident) => {
        impl $trait for $name {
            type Output = Self;

            #[inline(always)]
            fn $method(self, other: Self) -> Self {
                // SAFETY: the module's.
                Self(unsafe { $instruction(self.0, other.0) })
            }
        }
    };
}

wide!(Wide4, __m256d, 4, "AVX2 and FMA",
    _mm256_add_pd _mm256_sub_pd _mm256_mul_pd _mm256_div_pd _mm256_fmadd_pd _mm256_fnmadd_pd _mm256_sqrt_pd
    _mm256_max_pd _mm256_min_pd _mm256_set1_pd _mm256_loadu_pd _mm256_storeu_pd less4 abs4 select4;
    FRACTION_BITS.cast_signed(), _mm256_set1_epi64x _mm256_add_epi64 _mm256_sub_epi64 _mm256_or_si256 _mm256_slli_epi64
    _mm256_srli_epi64 _mm256_castpd_si256 _mm256_castsi256_pd);
wide!(Wide8, __m512d, 8, "AVX-512 F and DQ",
    _mm512_add_pd _mm512_sub_pd _mm512_mul_pd _mm512_div_pd _mm512_fmadd_pd _mm512_fnmadd_pd _mm512_sqrt_pd
    _mm512_max_pd _mm512_min_pd _mm512_set1_pd _mm512_loadu_pd _mm512_storeu_pd less8 _mm512_abs_pd select8;
    FRACTION_BITS, _mm512_set1_epi64 _mm512_add_epi64 _mm512_sub_epi64 _mm512_or_si512 _mm512_slli_epi64 _mm512_srli_epi64
    _mm512_castpd_si512 _mm512_castsi512_pd);

impl Packed for Wide4 {
    #[inline(always)]
    fn load(quad: &Quad<f64>) -> Self {
        Self::from_array(&quad.0)
    }

    #[inline(always)]
    fn store(self, quad: &mut Quad<f64>) {
        *quad = Quad(self.to_array());
    }

    #[inline(always)]
    fn twice(pair: &[f64; 2]) -> Self {
        // SAFETY: the module's; two doubles lie behind the reference.
        Self(unsafe {
            let half = _mm_loadu_pd(pair.as_ptr());
            _mm256_insertf128_pd::<1>(_mm256_castpd128_pd256(half), half)
        })
    }

    #[inline(always)]
    fn bcca(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute4x64_pd::<0b00_10_10_01>(self.0) })
    }

    #[inline(always)]
    fn bbcd(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute4x64_pd::<0b11_10_01_01>(self.0) })
    }

    #[inline(always)]
    fn store_pairs(self, pairs: &mut [[f64; 2]], at: usize) {
        let pairs = &mut pairs[at..at + 2];
        // SAFETY: the module's; room for four doubles.
        unsafe { _mm256_storeu_pd(pairs.as_mut_ptr().cast(), self.0) };
    }

    #[inline(always)]
    fn low_with_low(self, other: Self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute2f128_pd::<0x20>(self.0, other.0) })
    }

    #[inline(always)]
    fn high_with_low(self, other: Self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute2f128_pd::<0x21>(self.0, other.0) })
    }

    #[inline(always)]
    fn first(self) -> f64 {
        // SAFETY: the module's.
        unsafe { _mm256_cvtsd_f64(self.0) }
    }

    #[inline(always)]
    fn sum(self) -> Self {
        // SAFETY: the module's.
        unsafe {
            let pairs = _mm256_add_pd(self.0, _mm256_permute_pd::<0b0101>(self.0));
            Self(_mm256_add_pd(pairs, _mm256_permute2f128_pd::<0x01>(pairs, pairs)))
        }
    }

    #[inline(always)]
    fn swap(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute_pd::<0b0101>(self.0) })
    }

    #[inline(always)]
    fn firsts(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute4x64_pd::<0>(self.0) })
    }

    #[inline(always)]
    fn high_alone(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute2f128_pd::<0x81>(self.0, self.0) })
    }

    #[inline(always)]
    fn low_twice(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute2f128_pd::<0x00>(self.0, self.0) })
    }

    #[inline(always)]
    fn high_twice(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_permute2f128_pd::<0x11>(self.0, self.0) })
    }

    #[inline(always)]
    fn settle(self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { settle(self.0) })
    }

    #[inline(always)]
    fn with<const MASK: i32>(self, other: Self) -> Self {
        // SAFETY: the module's.
        Self(unsafe { _mm256_blend_pd::<MASK>(self.0, other.0) })
    }
}

/// The same value, computed before anything that follows.
#[inline]
#[target_feature(enable = "avx")]
fn settle(mut value: __m256d) -> __m256d {
    // SAFETY: no instruction at all.
    unsafe {
        asm!("/* {} */", inout(ymm_reg) value, options(nomem, nostack, preserves_flags));
    }
    value
}

#[inline]
#[target_feature(enable = "avx")]
fn less4(a: __m256d, b: __m256d) -> u32 {
    _mm256_movemask_pd(_mm256_cmp_pd::<_CMP_LT_OQ>(a, b)).cast_unsigned()
}

#[inline]
#[target_feature(enable = "avx512f")]
fn less8(a: __m512d, b: __m512d) -> u32 {
    u32::from(_mm512_cmp_pd_mask::<_CMP_LT_OQ>(a, b))
}

#[inline]
#[target_feature(enable = "avx")]
fn abs4(value: __m256d) -> __m256d {
    _mm256_andnot_pd(_mm256_set1_pd(-0.0), value)
}

#[inline]
#[target_feature(enable = "avx")]
fn select4(a: __m256d, b: __m256d, yes: __m256d, no: __m256d) -> __m256d {
    _mm256_blendv_pd(no, yes, _mm256_cmp_pd::<_CMP_LT_OQ>(a, b))
}

#[inline]
#[target_feature(enable = "avx512f")]
fn select8(a: __m512d, b: __m512d, yes: __m512d, no: __m512d) -> __m512d {
    _mm512_mask_blend_pd(_mm512_cmp_pd_mask::<_CMP_LT_OQ>(a, b), no, yes)
}
