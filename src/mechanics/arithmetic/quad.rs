//! Four values side by side.

use std::ops::{Add, Mul, Neg, Sub};

use super::Real;

/// Four values on which an operation acts one by one. A compiler that may use the instructions makes one of each
/// four; the bits are the same either way.
#[derive(Clone, Copy, Debug, PartialEq)]
#[repr(C, align(32))]
pub struct Quad<R>(pub [R; 4]);

impl<R: Real> Quad<R> {
    /// The same value four times.
    #[must_use]
    #[inline(always)]
    pub fn splat(value: R) -> Self {
        Self([value; 4])
    }

    /// Two values, twice.
    #[must_use]
    #[inline(always)]
    pub fn twice([a, b]: [R; 2]) -> Self {
        Self([a, b, a, b])
    }

    /// Two values and two more.
    #[must_use]
    #[inline(always)]
    pub fn join([a, b]: [R; 2], [c, d]: [R; 2]) -> Self {
        Self([a, b, c, d])
    }

    /// `self * factor + addend`, each rounded once.
    #[must_use]
    #[inline(always)]
    pub fn mul_add(self, factor: Self, addend: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i].mul_add(factor.0[i], addend.0[i])))
    }
}

impl<R: Real> Add for Quad<R> {
    type Output = Self;

    #[inline(always)]
    fn add(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i] + other.0[i]))
    }
}

impl<R: Real> Sub for Quad<R> {
    type Output = Self;

    #[inline(always)]
    fn sub(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i] - other.0[i]))
    }
}

impl<R: Real> Mul for Quad<R> {
    type Output = Self;

    #[inline(always)]
    fn mul(self, other: Self) -> Self {
        Self(std::array::from_fn(|i| self.0[i] * other.0[i]))
    }
}

impl<R: Real> Neg for Quad<R> {
    type Output = Self;

    #[inline(always)]
    fn neg(self) -> Self {
        Self(self.0.map(Neg::neg))
    }
}
