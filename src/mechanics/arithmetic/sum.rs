//! Sums that keep their rounding error (Knuth 1969, *The Art of Computer Programming* 2, §4.2.2; Kahan 1965).

/// A value and the part of it that its rounding lost.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Compensated {
    /// The value, rounded.
    pub value: f64,
    /// What the rounding lost, at most half a unit in the last place of `value`.
    pub rest: f64,
}

impl Compensated {
    /// `value` with nothing lost.
    #[must_use]
    pub fn new(value: f64) -> Self {
        Self { value, rest: 0.0 }
    }

    /// `a + b` without error.
    #[must_use]
    #[inline(always)]
    pub fn sum(a: f64, b: f64) -> Self {
        let value = a + b;
        let of_b = value - a;
        Self { value, rest: (a - (value - of_b)) + (b - of_b) }
    }

    /// This plus `increment`.
    #[must_use]
    #[inline(always)]
    pub fn plus(self, increment: f64) -> Self {
        Self::sum(self.value, self.rest + increment)
    }

    /// This minus `other`: [`minus`](Self::minus), and what that loses.
    #[must_use]
    #[inline(always)]
    pub fn difference(self, other: Self) -> Self {
        let value = self.minus(other);
        let leading = Self::sum(self.value, -other.value);
        Self { value, rest: (leading.value - value) + (leading.rest + (self.rest - other.rest)) }
    }

    /// This minus `other`, rounded once or twice.
    #[must_use]
    #[inline(always)]
    pub fn minus(self, other: Self) -> f64 {
        (self.value - other.value) + (self.rest - other.rest)
    }
}
