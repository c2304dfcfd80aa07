//! Trial step and step size.

use super::recurrence::number;
use super::{ORDER, Series};
use crate::arithmetic::{Quad, Real, power_of_two};
use crate::taylor::step::{MAX_STEP, SMALLEST_COEFFICIENT, WIDEST_POWER};

/// The two orders of the velocity that estimate the radius.
const ESTIMATED_FROM: [usize; 2] = [ORDER - 1, ORDER];

/// Base-2 logarithm of 1 over the relative local error per step. Up to 98 the error of the result follows it; beyond
/// 102 there is only round-off.
const TOLERANCE_BITS: u32 = 102;

/// Relative local error per step.
pub const EXTENDED_TOLERANCE: f64 = power_of_two(-(TOLERANCE_BITS as i64));

/// The shortest trial step, 2^-100: far below every step.
const SHORTEST_TRIAL: f64 = power_of_two(-100);

/// A power of two near the radius of convergence, from the distance to the nearer primary, the speed and the square
/// root of both primaries' forces over the distance.
#[inline(always)]
pub(super) fn trial(distance: f64, speed: f64, rate: f64) -> f64 {
    let time = Real::min(Real::min(distance / speed, 1.0 / rate), 1.0);
    let time = if time > SHORTEST_TRIAL { time } else { SHORTEST_TRIAL };
    // The exponent without the fraction: an infinity has all its bits, and no other.
    f64::from_bits(time.to_bits() & f64::INFINITY.to_bits())
}

/// log₂ of the radius of convergence, as for a series in double precision.
#[inline(always)]
pub(super) fn log2_radius(s: &Series) -> f64 {
    let size = |k: usize| {
        let Quad([x, y, z, _]) = s.position[k].to_double();
        Real::max(Real::max(Real::abs(x), Real::abs(y)), Real::abs(z))
    };
    // A body at rest in the rotating axes still moves with them, at this distance times the mean motion.
    let distance = (2.0 * s.half_square.leading[0][0]).sqrt() * s.trial_step;
    let log2_scale = Real::max(size(1), distance).log2_coarse();
    let estimate = |k: usize| {
        let coefficient = Real::max(size(k + 1) * number(k + 1), SMALLEST_COEFFICIENT);
        (log2_scale - coefficient.log2_coarse()) / number(k)
    };
    let [earlier, later] = ESTIMATED_FROM;
    Real::min(estimate(earlier), estimate(later)) + s.trial_step.log2_coarse()
}

/// The step, at most [`MAX_STEP`], for a radius of convergence.
pub(super) fn from_log2_radius(log2_radius: f64) -> f64 {
    let step = (log2_radius - f64::from(TOLERANCE_BITS) / number(ORDER))
        .clamp(-WIDEST_POWER, WIDEST_POWER)
        .exp2_coarse();
    // Not `min`, which would make a step of what is no number.
    if step > MAX_STEP { MAX_STEP } else { step }
}
