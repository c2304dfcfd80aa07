//! Four values side by side.

use std::ops::{Add, Div, Mul, Neg, Sub};

use super::{Lanes, Packed, Real};

/// Four values on which an operation acts one by one. A compiler that may use the instructions makes one of each
/// four; the bits are the same either way.
#[derive(Clone, Copy, Debug, PartialEq)]
#[repr(C, align(32))]
pub struct Quad<R>(pub [R; 4]);

impl<R: Copy> Quad<R> {
    /// The same value four times.
    #[must_use]
    #[inline(always)]
    pub fn splat(value: R) -> Self {
        Self([value; 4])
    }

    #[inline(always)]
    fn zip(self, other: Self, operation: impl Fn(R, R) -> R) -> Self {
        Self(std::array::from_fn(|i| operation(self.0[i], other.0[i])))
    }
}

macro_rules! operator {
    ($($trait:ident $method:ident)*) => {$(
        impl<R: Real> $trait for Quad<R> {
            type Output = Self;

            #[inline(always)]
            fn $method(self, other: Self) -> Self {
                self.zip(other, $trait::$method)
            }
        }
    )*};
}

operator!(Add add Sub sub Mul mul Div div);

impl<R: Real> Neg for Quad<R> {
    type Output = Self;

    #[inline(always)]
    fn neg(self) -> Self {
        Self(self.0.map(Neg::neg))
    }
}

impl<R: Real> Real for Quad<R> {
    #[inline(always)]
    fn from_f64(value: f64) -> Self {
        Self::splat(R::from_f64(value))
    }

    #[inline(always)]
    fn mul_add(self, factor: Self, addend: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].mul_add(factor.0[i], addend.0[i])))
    }

    #[inline(always)]
    fn neg_mul_add(self, factor: Self, addend: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].neg_mul_add(factor.0[i], addend.0[i])))
    }

    #[inline(always)]
    fn sqrt(self) -> Self {
        Self(self.0.map(Real::sqrt))
    }

    #[inline(always)]
    fn abs(self) -> Self {
        Self(self.0.map(Real::abs))
    }

    #[inline(always)]
    fn max(self, other: Self) -> Self {
        self.zip(other, Real::max)
    }

    #[inline(always)]
    fn min(self, other: Self) -> Self {
        self.zip(other, Real::min)
    }

    #[inline(always)]
    fn select_less(self, other: Self, yes: Self, no: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].select_less(other.0[i], yes.0[i], no.0[i])))
    }

    #[inline(always)]
    fn log2_coarse(self) -> Self {
        Self(self.0.map(Real::log2_coarse))
    }

    #[inline(always)]
    fn exp2_coarse(self) -> Self {
        Self(self.0.map(Real::exp2_coarse))
    }
}

impl Lanes for Quad<f64> {
    const COUNT: usize = 4;
    type Array = [f64; 4];

    #[inline(always)]
    fn from_array(values: &[f64; 4]) -> Self {
        Self(*values)
    }

    #[inline(always)]
    fn to_array(self) -> [f64; 4] {
        self.0
    }

    #[inline(always)]
    fn read(values: &[f64]) -> Self {
        Self(std::array::from_fn(|i| values[i]))
    }

    #[inline(always)]
    fn write(self, values: &mut [f64]) {
        values[..4].copy_from_slice(&self.0);
    }

    #[inline(always)]
    fn less(self, other: Self) -> u32 {
        (0..4).map(|i| u32::from(self.0[i] < other.0[i]) << i).sum()
    }
}

impl Packed for Quad<f64> {
    #[inline(always)]
    fn load(quad: &Self) -> Self {
        *quad
    }

    #[inline(always)]
    fn store(self, quad: &mut Self) {
        *quad = self;
    }

    #[inline(always)]
    fn twice(&[a, b]: &[f64; 2]) -> Self {
        Self([a, b, a, b])
    }

    #[inline(always)]
    fn bcca(self) -> Self {
        let Self([a, b, c, _]) = self;
        Self([b, c, c, a])
    }

    #[inline(always)]
    fn bbcd(self) -> Self {
        let Self([_, b, c, d]) = self;
        Self([b, b, c, d])
    }

    #[inline(always)]
    fn store_pairs(self, pairs: &mut [[f64; 2]], at: usize) {
        let Self([a, b, c, d]) = self;
        pairs[at] = [a, b];
        pairs[at + 1] = [c, d];
    }

    #[inline(always)]
    fn first(self) -> f64 {
        self.0[0]
    }

    #[inline(always)]
    fn sum(self) -> Self {
        let Self([a, b, c, d]) = self;
        Self::splat((a + b) + (c + d))
    }

    #[inline(always)]
    fn swap(self) -> Self {
        let Self([a, b, c, d]) = self;
        Self([b, a, d, c])
    }

    #[inline(always)]
    fn firsts(self) -> Self {
        Self::splat(self.0[0])
    }

    #[inline(always)]
    fn low_with_low(self, other: Self) -> Self {
        Self([self.0[0], self.0[1], other.0[0], other.0[1]])
    }

    #[inline(always)]
    fn high_with_low(self, other: Self) -> Self {
        Self([self.0[2], self.0[3], other.0[0], other.0[1]])
    }

    #[inline(always)]
    fn high_alone(self) -> Self {
        let Self([.., c, d]) = self;
        Self([c, d, 0.0, 0.0])
    }

    #[inline(always)]
    fn low_twice(self) -> Self {
        let Self([a, b, ..]) = self;
        Self([a, b, a, b])
    }

    #[inline(always)]
    fn high_twice(self) -> Self {
        let Self([.., c, d]) = self;
        Self([c, d, c, d])
    }

    #[inline(always)]
    fn settle(self) -> Self {
        self
    }

    #[inline(always)]
    fn with<const MASK: i32>(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| if MASK >> i & 1 == 1 { other.0[i] } else { self.0[i] }))
    }
}
