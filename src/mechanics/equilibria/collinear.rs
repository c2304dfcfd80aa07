//! Euler's quintic for the three points on the line of the primaries.
//!
//! Form of the quintics: Szebehely 1967, *Theory of Orbits*, 4.2, here divided by μ and, for L3, expanded about
//! distance 1, so that no term cancels as μ → 0. A double-precision root by Newton's method kept inside a
//! bracket is improved by one Newton step with the residual in double-double; its error is then far below one
//! unit in the last place.

use crate::arithmetic::DoubleDouble;

/// Which side of the smaller primary.
#[derive(Clone, Copy)]
pub(super) enum Side {
    /// L1, towards the larger primary.
    Inner,
    /// L2, away from it.
    Outer,
}

/// Newton's method needs five steps or so; bisection, should it ever come to that, 54.
const MOST_STEPS: usize = 64;

/// 3^(−1/3): the radius of Hill's sphere over the cube root of μ.
const HILL: f64 = 0.693_361_274_350_634_7;

/// γ, the distance of L1 or L2 from the smaller primary, in separations.
pub(super) fn gamma(side: Side, mu: f64) -> DoubleDouble {
    let s = match side {
        Side::Inner => -1.0,
        Side::Outer => 1.0,
    };
    // First two terms of the series in the radius of Hill's sphere; γ differs from that radius by less than
    // 30 per cent for every μ.
    let hill = libm::cbrt(mu) * HILL;
    let start = hill * (1.0 + s * hill / 3.0);
    let quintic = |g: f64| {
        let q = (g + s * (3.0 - mu)) * g + (3.0 - 2.0 * mu);
        let t = g / mu * g * g;
        let value = t * q - (1.0 + s * g) * (1.0 + s * g);
        let slope = t / g * (3.0 * q + g * (2.0 * g + s * (3.0 - mu))) - 2.0 * s * (1.0 + s * g);
        (value, slope)
    };
    let root = increasing_root(0.5 * hill, 2.0 * hill, start, quintic);
    let g = DoubleDouble::from(root);
    let three_less_mu = DoubleDouble::sum(3.0, -mu);
    let q = (g + three_less_mu * s) * g + (three_less_mu - mu);
    let t = g / mu * g * g;
    let residual = t * q - (g * s + 1.0).squared();
    g - residual / quintic(root).1
}

/// 1 − r₁ of L3, in separations; about 7μ/12.
pub(super) fn departure(mu: f64) -> DoubleDouble {
    // Solved for e = (1 − r₁)/μ, which stays between 0.58 and 0.61.
    let quintic = |e: f64| {
        let d = e * mu;
        let tail = (24.0 + 13.0 * mu) - d * ((19.0 + 6.0 * mu) - d * ((7.0 + mu) - d));
        let tail_slope = -(19.0 + 6.0 * mu) + d * (2.0 * (7.0 + mu) - 3.0 * d);
        let head = 12.0 + 14.0 * mu;
        (head * e - d * e * tail - 7.0, head - 2.0 * d * tail - d * d * tail_slope)
    };
    let root = increasing_root(0.5, 0.7, 7.0 / 12.0, quintic);
    let (e, m) = (DoubleDouble::from(root), DoubleDouble::from(mu));
    let d = e * m;
    let tail = (m * 13.0 + 24.0) - d * ((m * 6.0 + 19.0) - d * ((m + 7.0) - d));
    let residual = (m * 14.0 + 12.0) * e - d * e * tail - 7.0;
    (e - residual / quintic(root).1) * m
}

/// The root of a function that is negative at `low`, positive at `high` and rises through it, from value and
/// slope: Newton's method, bisecting where a step would leave the bracket.
fn increasing_root(mut low: f64, mut high: f64, start: f64, f: impl Fn(f64) -> (f64, f64)) -> f64 {
    let mut x = start;
    for _ in 0..MOST_STEPS {
        let (value, slope) = f(x);
        if value < 0.0 {
            low = x;
        } else {
            high = x;
        }
        let newton = x - value / slope;
        let next = if newton > low && newton < high { newton } else { 0.5 * (low + high) };
        // The step in double-double takes care of the last bits.
        let close = (next - x).abs() <= 4.0 * f64::EPSILON * x;
        x = next;
        if close {
            break;
        }
    }
    x
}
