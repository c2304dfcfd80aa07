//! All places where a polynomial changes sign on the unit interval.
//!
//! Vincent–Collins–Akritas isolation in the Bernstein basis (Rouillier & Zimmermann 2004, J. Comput. Appl. Math.
//! 162, 33): the sign changes of the Bernstein coefficients are an upper bound of the roots, of the same parity.
//! None means no root, one means one; otherwise the interval is halved. Each bracketed root is refined by Newton's
//! method kept inside its bracket.

use crate::taylor::TERMS;

/// Coefficient k belongs to the k-th power.
pub(super) type Polynomial = [f64; TERMS];

/// Halvings after which roots that are still together count as one place: 2^−48 of a step is round-off in time.
const DEEPEST: usize = 48;

/// Newton steps and halvings of one bracket: a double has 53 bits, and each iteration at worst halves.
const REFINEMENTS: usize = 64;

/// C(i, k)/C(n, k): from the power basis to the Bernstein basis of degree n.
#[expect(clippy::cast_precision_loss, reason = "exact: the binomials of 23 stay below 2^53")]
const BERNSTEIN: [[f64; TERMS]; TERMS] = {
    const fn binomial(n: usize, k: usize) -> u64 {
        let mut value = 1;
        let mut i = 0;
        while i < k {
            value = value * (n - i) as u64 / (i + 1) as u64;
            i += 1;
        }
        value
    }
    let mut table = [[0.0; TERMS]; TERMS];
    let mut i = 0;
    while i < TERMS {
        let mut k = 0;
        while k <= i {
            table[i][k] = binomial(i, k) as f64 / binomial(TERMS - 1, k) as f64;
            k += 1;
        }
        i += 1;
    }
    table
};

/// A function's polynomial over a step and how far rounding alone may have moved its values.
pub(super) struct Composed {
    pub polynomial: Polynomial,
    pub noise: f64,
}

/// Appends to `roots`, in increasing order, the places in [0, 1] where the polynomial changes sign, coming from
/// the side `sign` (±1) at 0; 0 takes the side on which the polynomial starts. Values within the noise have no sign, so touching zero
/// is no root, and a change that happens within the noise of one end is left to the neighbour, which is told
/// the side. Returns the side at 1, 0 where the whole polynomial lies within the noise.
pub(super) fn sign_changes(composed: &Composed, sign: f64, roots: &mut Vec<f64>) -> f64 {
    let (a, noise) = (&composed.polynomial, composed.noise);
    if let Some(side) = one_sided(a, noise) {
        if sign * side < 0.0 {
            roots.push(0.0);
        }
        return side;
    }
    let mut first = [0.0; TERMS];
    for (b, row) in first.iter_mut().zip(&BERNSTEIN) {
        *b = row.iter().zip(a).map(|(weight, coefficient)| weight * coefficient).sum();
    }
    let (changes, end) = count_changes(&first, sign, noise);
    match changes {
        0 => end,
        1 => {
            roots.push(refine(a, 0.0, 1.0, end));
            end
        }
        _ => subdivide(composed, first, sign, roots),
    }
}

/// The same by halving, from the left to the right, so that the side before each part is known.
fn subdivide(composed: &Composed, whole: Polynomial, sign: f64, roots: &mut Vec<f64>) -> f64 {
    let mut side = sign;
    let mut pending = [([0.0; TERMS], 0.0, 0_usize); DEEPEST + 2];
    pending[0] = (whole, 0.0, 0);
    let mut count = 1;
    while count > 0 {
        count -= 1;
        let (b, from, depth) = pending[count];
        let width = halved(depth);
        let (changes, end) = count_changes(&b, side, composed.noise);
        if changes > 1 && depth < DEEPEST {
            let (left, right) = halves(&b);
            pending[count] = (right, from + width / 2.0, depth + 1);
            pending[count + 1] = (left, from, depth + 1);
            count += 2;
            continue;
        }
        if changes % 2 == 1 {
            roots.push(refine(&composed.polynomial, from, from + width, end));
        }
        if changes <= 1 || changes % 2 == 1 {
            side = end;
        }
    }
    side
}

/// The sign of a polynomial whose first coefficients outweigh the rest, so that it has no root in [0, 1].
fn one_sided(a: &Polynomial, noise: f64) -> Option<f64> {
    let (start, end) = (a[0], a[0] + a[1]);
    let rest: f64 = a[2..].iter().map(|c| c.abs()).sum();
    let clear = rest + noise;
    if start > clear && end > clear {
        Some(1.0)
    } else if start < -clear && end < -clear {
        Some(-1.0)
    } else {
        None
    }
}

/// 2 to the power −`depth`.
fn halved(depth: usize) -> f64 {
    const BIAS: u64 = 1023;
    f64::from_bits((BIAS - depth as u64) << (f64::MANTISSA_DIGITS - 1))
}

/// Sign changes of the side before followed by the coefficients, and the last sign.
fn count_changes(b: &Polynomial, before: f64, noise: f64) -> (usize, f64) {
    let mut last = before;
    let mut changes = 0;
    for &coefficient in b {
        if coefficient.abs() <= noise {
            continue;
        }
        let sign = coefficient.signum();
        if sign * last < 0.0 {
            changes += 1;
        }
        last = sign;
    }
    (changes, last)
}

/// De Casteljau's subdivision at the middle.
fn halves(b: &Polynomial) -> (Polynomial, Polynomial) {
    let mut left = *b;
    let mut right = *b;
    for level in 1..TERMS {
        for i in 0..TERMS - level {
            right[i] = 0.5 * (right[i] + right[i + 1]);
        }
        left[level] = right[0];
    }
    (left, right)
}

/// The one root in [`from`, `to`], beyond which the polynomial has the sign `end`.
fn refine(a: &Polynomial, from: f64, to: f64, end: f64) -> f64 {
    let (mut low, mut high) = (from, to);
    let mut at = 0.5 * (from + to);
    for _ in 0..REFINEMENTS {
        let (value, slope) = value_and_slope(a, at);
        if value * end > 0.0 {
            high = at;
        } else {
            low = at;
        }
        let newton = at - value / slope;
        let next = if newton >= low && newton <= high { newton } else { 0.5 * (low + high) };
        if (next - at).abs() <= f64::EPSILON * at {
            return next;
        }
        at = next;
    }
    at
}

/// The polynomial and its derivative.
pub(super) fn value_and_slope(a: &Polynomial, at: f64) -> (f64, f64) {
    let mut value = a[TERMS - 1];
    let mut slope = 0.0;
    for &coefficient in a[..TERMS - 1].iter().rev() {
        slope = slope * at + value;
        value = value * at + coefficient;
    }
    (value, slope)
}

#[cfg(test)]
mod tests {
    use super::{Composed, Polynomial, TERMS, sign_changes};
    use proptest::prelude::*;

    /// The polynomial with these roots, scaled to a largest coefficient of 1.
    fn with_roots(roots: &[f64]) -> Polynomial {
        let mut a = [0.0; TERMS];
        a[0] = 1.0;
        for (degree, root) in roots.iter().enumerate() {
            for k in (0..=degree + 1).rev() {
                a[k] = if k > 0 { a[k - 1] } else { 0.0 } - root * a[k];
            }
        }
        let largest = a.iter().fold(0.0_f64, |m, c| m.max(c.abs()));
        a.map(|c| c / largest)
    }

    fn found(roots: &[f64]) -> Vec<f64> {
        let mut all = Vec::new();
        sign_changes(&Composed { polynomial: with_roots(roots), noise: 1e-16 }, 0.0, &mut all);
        all
    }

    #[test]
    fn several_roots_close_roots_and_a_touch() {
        assert_eq!(found(&[-0.5, 1.5]).len(), 0);
        assert_eq!(found(&[0.5, 0.5]).len(), 0, "a touch is no change of sign");
        assert_eq!(found(&[0.5, 0.5, 0.5]).len(), 1, "a triple root is one change of sign");
        let close = found(&[0.3, 0.300_01, 0.9]);
        assert_eq!(close.len(), 3);
        assert!((close[0] - 0.3).abs() < 1e-10 && (close[1] - 0.300_01).abs() < 1e-10);
        let halves = found(&[0.25, 0.5, 0.75]);
        assert_eq!(halves.len(), 3, "roots on the points of subdivision are found once");
        assert!(halves.iter().zip([0.25, 0.5, 0.75]).all(|(root, planted)| (root - planted).abs() < 1e-15));
    }

    #[test]
    fn a_root_at_the_boundary_belongs_to_one_side() {
        let mut all = Vec::new();
        let ends = Composed { polynomial: with_roots(&[1.0]), noise: 1e-15 };
        let side = sign_changes(&ends, -1.0, &mut all);
        assert!(all.is_empty() && side < 0.0, "not crossed yet at the end");
        let mut begins = Composed { polynomial: [0.0; TERMS], noise: 1e-15 };
        begins.polynomial[0] = 1e-17;
        begins.polynomial[1] = 1.0;
        assert!(sign_changes(&begins, side, &mut all) > 0.0);
        assert_eq!(all.len(), 1, "the neighbour finds it");
        all.clear();
        begins.polynomial[0] = -1e-17;
        assert!(sign_changes(&begins, 1.0, &mut all) > 0.0);
        assert!(all.is_empty(), "already crossed: rounding does not bring it back");
    }

    proptest! {
        #[test]
        fn every_planted_root_is_found(mut roots in proptest::collection::vec(0.01_f64..0.99, 1..6)) {
            roots.sort_by(f64::total_cmp);
            prop_assume!(roots.windows(2).all(|pair| pair[1] - pair[0] > 1e-3));
            let all = found(&roots);
            prop_assert_eq!(all.len(), roots.len());
            for (root, planted) in all.iter().zip(&roots) {
                // Five roots a thousandth apart amplify a rounding of 1e-16 by up to 1e12/4!.
                prop_assert!((root - planted).abs() < 1e-5);
            }
        }
    }
}
