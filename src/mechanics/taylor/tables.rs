//! The constants of the recurrences, correctly rounded, order by order.

use super::TERMS;
use crate::arithmetic::Quad;

/// A factor for each order.
type PerOrder = [f64; TERMS];

/// Weight (2k + j)/2k of term j of order k in the recurrence for the power −3/2.
pub(super) const WEIGHT: [PerOrder; TERMS + 1] = {
    let mut weights = [[0.0; TERMS]; TERMS + 1];
    let mut k = 1;
    while k <= TERMS {
        let mut j = 0;
        while j < TERMS {
            weights[k][j] = exact(2 * k + j) / exact(2 * k);
            j += 1;
        }
        k += 1;
    }
    weights
};

/// The same in memory.
pub(super) static WEIGHTS: [PerOrder; TERMS + 1] = WEIGHT;

/// The weights of term j of order k and of term j + 1 of order k + 1, each for two primaries.
pub(super) static WEIGHT_PAIRS: [[Quad<f64>; TERMS]; TERMS] = {
    let mut pairs = [[Quad([0.0; 4]); TERMS]; TERMS];
    let mut k = 1;
    while k < TERMS {
        let mut j = 0;
        while j + 1 < TERMS {
            let (even, odd) = (WEIGHT[k][j], WEIGHT[k + 1][j + 1]);
            pairs[k][j] = Quad([even, even, odd, odd]);
            j += 1;
        }
        k += 1;
    }
    pairs
};

/// 1/((k + 1)(k + 2)), from the series of the acceleration to that of the position, and what rounding it lost: left
/// out, that would bend every step the same way, and the Jacobi constant would drift linearly.
pub(super) const TWICE_INTEGRATED: [(f64, f64); TERMS] = {
    let mut factors = [(0.0, 0.0); TERMS];
    let mut k = 0;
    while k < TERMS {
        let divisor = exact((k + 1) * (k + 2));
        let factor = 1.0 / divisor;
        // The remainder 1 − factor · divisor, exactly, the factor split so that both products are exact.
        let high = f64::from_bits(factor.to_bits() & !((1 << 27) - 1));
        let rest = ((1.0 - high * divisor) - (factor - high) * divisor) / divisor;
        factors[k] = (factor, rest);
        k += 1;
    }
    factors
};

/// From this order on what the factors lost is far below the round-off of the sum of the series; at order 0, where the factor
/// is a half, it is nothing.
pub(super) const REST_MATTERS: std::ops::Range<usize> = 1..5;

/// 2 (k + 1): from coefficient k + 1 of the position to coefficient k of the Coriolis acceleration.
pub(super) const CORIOLIS: PerOrder = {
    let mut factors = [0.0; TERMS];
    let mut k = 0;
    while k < TERMS {
        factors[k] = exact(2 * (k + 1));
        k += 1;
    }
    factors
};

#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const fn exact(number: usize) -> f64 {
    number as f64
}
