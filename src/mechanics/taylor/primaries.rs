//! The two bodies.

use crate::arithmetic::sum::Compensated;

/// The primaries' mass shares and places. `1 − μ` is kept with its rounding error, so that the distance to the
/// smaller primary is exact however close.
#[derive(Clone, Copy, Debug)]
pub struct Primaries {
    mass_parameter: f64,
    one_minus: Compensated,
}

impl Primaries {
    /// The primaries at a mass parameter in (0, 0.5].
    #[must_use]
    pub fn new(mass_parameter: f64) -> Self {
        Self { mass_parameter, one_minus: Compensated::sum(1.0, -mass_parameter) }
    }

    /// The smaller primary's mass share μ.
    #[must_use]
    pub fn mass_parameter(&self) -> f64 {
        self.mass_parameter
    }

    /// The larger primary's x, exact.
    #[must_use]
    pub fn larger_x(&self) -> Compensated {
        Compensated::new(-self.mass_parameter)
    }

    /// The smaller primary's x with its rounding error.
    #[must_use]
    pub fn smaller_x(&self) -> Compensated {
        self.one_minus
    }
}
