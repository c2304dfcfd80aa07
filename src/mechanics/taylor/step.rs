//! How far a series may be carried (Jorba & Zou 2005, §3.2, with a fixed order).

use super::{ORDER, Series};
use crate::arithmetic::{Quad, Real};

/// Longest step in inverse mean motions. The rotation of the axes alone has an entire series, which at this
/// order is good to the round-off up to here, so that its sine and cosine may share the step.
pub const MAX_STEP: f64 = 2.0;

/// Shortest step: with a radius of convergence below about this the highest coefficients overflow.
pub const STEP_FLOOR: f64 = 1e-13;

/// The two orders of the velocity that estimate the radius. Not the last two: these are ready earlier, so the
/// estimate is made beside the last sums.
const ESTIMATED_FROM: [usize; 2] = [ORDER - 3, ORDER - 2];

/// Keeps the logarithm finite where a coefficient vanishes.
const SMALLEST_COEFFICIENT: f64 = 1e-300;

/// log₂ of the radius of convergence, from the size of two coefficients of the velocity relative to its own.
#[inline(always)]
pub(super) fn log2_radius<R: Real>(s: &Series<R>) -> R {
    let size = |k: usize| {
        let Quad([x, y, z, _]) = s.position[k];
        x.abs().max(y.abs()).max(z.abs())
    };
    // A body at rest in the rotating axes still moves with them, at this distance times the mean motion.
    let distance = (s.half_square[0][0] + s.half_square[0][0]).sqrt();
    let log2_scale = size(1).max(distance).log2_coarse();
    let estimate = |k: usize| {
        #[expect(clippy::cast_precision_loss, reason = "orders are small")]
        let (factor, power) = (R::from_f64((k + 1) as f64), R::from_f64(1.0 / k as f64));
        let coefficient = (size(k + 1) * factor).max(R::from_f64(SMALLEST_COEFFICIENT));
        (log2_scale - coefficient.log2_coarse()) * power
    };
    let [earlier, later] = ESTIMATED_FROM;
    estimate(earlier).min(estimate(later))
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
    pub fn from_log2_radius(&self, log2_radius: f64) -> f64 {
        // 2^±100 is far outside what is ever used, and inside what the coarse power can do.
        let step = (log2_radius + self.log2_fraction).clamp(-100.0, 100.0).exp2_coarse();
        // Not `min`, which would make a step of what is no number.
        if step > MAX_STEP { MAX_STEP } else { step }
    }
}
