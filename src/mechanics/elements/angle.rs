//! Degrees and Kepler's equation.

use std::f64::consts::PI;

/// Degrees in half a turn, a quarter and a full one.
const HALF: f64 = 180.0;
const QUARTER: f64 = 90.0;
const FULL: f64 = 360.0;

/// Most steps of the search for the eccentric anomaly: bisection alone needs no more for all 53 bits.
const KEPLER_STEPS: usize = 64;

/// |x| up to which x − sin x and sinh x − x are summed as a series; the last term kept is then below round-off.
const SERIES: f64 = 1.0;
/// Terms of that series.
const TERMS: u8 = 10;

/// An angle in degrees.
pub(super) fn degrees(radians: f64) -> f64 {
    radians * HALF / PI
}

/// An angle in degrees, in [0, 360).
pub(super) fn turn(radians: f64) -> f64 {
    // The remainder is exact; a tiny negative angle rounds up to a full turn, which is none.
    let rest = degrees(radians) % FULL;
    let wrapped = if rest < 0.0 { rest + FULL } else { rest };
    if wrapped >= FULL { 0.0 } else { wrapped + 0.0 }
}

/// Sine and cosine of an angle in degrees, exact at multiples of 90.
pub(super) fn sincos_degrees(angle: f64) -> (f64, f64) {
    let rest = angle % FULL;
    let quarters = (rest / QUARTER).round();
    let (sin, cos) = libm::sincos((rest - quarters * QUARTER) * PI / HALF);
    match quarters.rem_euclid(4.0) {
        1.0 => (cos, -sin),
        2.0 => (-sin, -cos),
        3.0 => (-cos, sin),
        _ => (sin, cos),
    }
}

/// x − sin x, without cancellation for small x.
pub(super) fn less_sine(x: f64) -> f64 {
    if x.abs() > SERIES { x - libm::sin(x) } else { cubic_and_higher(x, -x * x) }
}

/// sinh x − x, without cancellation for small x.
pub(super) fn sinh_less(x: f64) -> f64 {
    if x.abs() > SERIES { libm::sinh(x) - x } else { cubic_and_higher(x, x * x) }
}

/// x³/6 (1 + s/(4·5) (1 + s/(6·7) (1 + …))) with s = ±x².
fn cubic_and_higher(x: f64, square: f64) -> f64 {
    let bracket =
        (2..TERMS).rev().map(f64::from).fold(1.0, |sum, k| 1.0 + square / (2.0 * k * (2.0 * k + 1.0)) * sum);
    x * x * x / 6.0 * bracket
}

/// True anomaly, radians, of the mean anomaly `mean` in degrees on an ellipse with eccentricity `e` and `shortfall`
/// 1 − e.
pub(super) fn true_from_mean(mean: f64, e: f64, shortfall: f64) -> f64 {
    let rest = mean % FULL;
    let mean = if rest > HALF {
        rest - FULL
    } else if rest < -HALF {
        rest + FULL
    } else {
        rest
    } * PI
        / HALF;
    let eccentric = eccentric_anomaly(mean.abs(), e, shortfall).copysign(mean);
    let (sin, cos) = libm::sincos(eccentric / 2.0);
    2.0 * libm::atan2((1.0 + e).sqrt() * sin, shortfall.sqrt() * cos)
}

/// Solves E − e sin E = `mean` in [0, π] by Newton's method, kept inside a bracket by bisection.
fn eccentric_anomaly(mean: f64, e: f64, shortfall: f64) -> f64 {
    if mean == 0.0 {
        return 0.0;
    }
    let (mut low, mut high) = (mean, PI.min(mean + e));
    let mut anomaly = high;
    for _ in 0..KEPLER_STEPS {
        let (sin, cos) = libm::sincos(anomaly);
        let residual = less_sine(anomaly) + shortfall * sin - mean;
        if residual == 0.0 {
            break;
        } else if residual > 0.0 {
            high = anomaly;
        } else {
            low = anomaly;
        }
        let newton = anomaly - residual / (shortfall + e * (1.0 - cos));
        let next = if newton > low && newton < high { newton } else { f64::midpoint(low, high) };
        let step = (next - anomaly).abs();
        anomaly = next;
        if step <= f64::EPSILON * anomaly {
            break;
        }
    }
    anomaly
}
