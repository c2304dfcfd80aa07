//! How far a series may be carried (Jorba & Zou 2005, §3.2, with a fixed order).

use super::ORDER;
use crate::arithmetic::Real;

/// Longest step in inverse mean motions. The rotation of the axes alone has an entire series, which at this
/// order is good to the round-off up to here, so that its sine and cosine may share the step.
pub const MAX_STEP: f64 = 2.0;

/// Shortest step: with a radius of convergence below about this the highest coefficients overflow.
pub const STEP_FLOOR: f64 = 1e-13;

/// The two orders of the velocity that estimate the radius. Not the last two: these are ready earlier, so the
/// estimate is made beside the last sums.
pub(super) const ESTIMATED_FROM: [usize; 2] = [ORDER - 3, ORDER - 2];

/// Keeps the logarithm finite where a coefficient vanishes.
pub(super) const SMALLEST_COEFFICIENT: f64 = 1e-300;

/// 2 to this power and its inverse are far outside what is ever a step, and inside what the coarse power can do.
pub(super) const WIDEST_POWER: f64 = 100.0;

/// log₂ of the radius of convergence, from the largest components of the velocity, of the coefficients of
/// [`ESTIMATED_FROM`] (those of the position an order later), and half the squared distance to the nearer primary.
#[inline(always)]
pub(super) fn log2_radius<R: Real>(sizes: [R; 2], speed: R, half_square: R) -> R {
    // A body at rest in the rotating axes still moves with them, at this distance times the mean motion.
    let distance = (half_square + half_square).sqrt();
    let log2_scale = speed.max(distance).log2_coarse();
    estimate(ESTIMATED_FROM[0], sizes[0], log2_scale).min(estimate(ESTIMATED_FROM[1], sizes[1], log2_scale))
}

#[inline(always)]
fn estimate<R: Real>(k: usize, size: R, log2_scale: R) -> R {
    #[expect(clippy::cast_precision_loss, reason = "orders are small")]
    let (factor, power) = (R::from_f64((k + 1) as f64), R::from_f64(1.0 / k as f64));
    let coefficient = (size * factor).max(R::from_f64(SMALLEST_COEFFICIENT));
    (log2_scale - coefficient.log2_coarse()) * power
}

/// The share of the tolerance left to truncation, which always errs to the same side: at the default tolerance it
/// then stays below the round-off over thousands of revolutions.
const TRUNCATION_SHARE: f64 = 0.25;

/// The step that keeps the last coefficient kept below a share of the tolerance.
#[derive(Clone, Copy, Debug)]
pub struct StepSize {
    log2_fraction: f64,
}

impl StepSize {
    /// For this relative local error per step.
    #[must_use]
    pub fn new(tolerance: f64) -> Self {
        #[expect(clippy::cast_precision_loss, reason = "orders are small")]
        Self { log2_fraction: libm::log2(tolerance * TRUNCATION_SHARE) / ORDER as f64 }
    }

    /// The step, at most [`MAX_STEP`], for a radius of convergence.
    #[must_use]
    #[inline(always)]
    pub(super) fn at_log2_radius<R: Real>(self, log2_radius: R) -> R {
        // What is no number becomes the shortest.
        let power = log2_radius + R::from_f64(self.log2_fraction);
        power
            .max(R::from_f64(-WIDEST_POWER))
            .min(R::from_f64(WIDEST_POWER))
            .exp2_coarse()
            .min(R::from_f64(MAX_STEP))
    }
}
