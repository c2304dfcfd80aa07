//! The recurrences of the equations of motion.
//!
//! With d the position relative to the nearer primary, which lies `side` = ±1 along x from the farther one, the
//! equations are
//!
//! ```text
//! x″ =  2 y′ + x − (n + f) d − side · f        n = share of the nearer / r³, f = share of the farther / r³
//! y″ = −2 x′ + y − (n + f) y
//! z″ =           − (n + f) z
//! ```
//!
//! so three products serve both primaries, and the farther one's squared distance follows linearly from the
//! nearer one's: r² + 2 side · d + 1. (The other way round it would cancel.) The equations are of second order:
//! from the coefficients 0 to k + 1 of the position follow those of order k + 2 and k + 3, in pairs, so each
//! loaded coefficient serves two sums. In every sum the terms that wait for the newest coefficients come last.

use super::{ORDER, Series, TERMS, step};
use crate::arithmetic::{Real, sum::Compensated};

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

/// Weights (2k + j)/2k of the recurrence for the power −3/2, correctly rounded.
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const WEIGHTS: [[f64; TERMS]; TERMS] = {
    let mut weights = [[0.0; TERMS]; TERMS];
    let mut k = 1;
    while k < TERMS {
        let mut j = 0;
        while j < TERMS {
            weights[k][j] = (2 * k + j) as f64 / (2 * k) as f64;
            j += 1;
        }
        k += 1;
    }
    weights
};

/// 1/((k + 1)(k + 2)), from the series of the acceleration to that of the position, and what rounding it lost: left
/// out, that would bend every step the same way, and the Jacobi constant would drift linearly.
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const TWICE_INTEGRATED: [(f64, f64); TERMS] = {
    let mut factors = [(0.0, 0.0); TERMS];
    let mut k = 0;
    while k < TERMS {
        let divisor = ((k + 1) * (k + 2)) as f64;
        let factor = 1.0 / divisor;
        // The remainder 1 − factor · divisor, exactly, the factor split so that both products are exact.
        let high = f64::from_bits(factor.to_bits() & !((1 << 27) - 1));
        let rest = ((1.0 - high * divisor) - (factor - high) * divisor) / divisor;
        factors[k] = (factor, rest);
        k += 1;
    }
    factors
};

/// 2 (k + 1): from coefficient k + 1 of the position to coefficient k of the Coriolis acceleration.
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const CORIOLIS: [f64; TERMS] = {
    let mut factors = [0.0; TERMS];
    let mut k = 0;
    while k < TERMS {
        factors[k] = (2 * (k + 1)) as f64;
        k += 1;
    }
    factors
};

/// Expands the solution through (x, y, z, vx, vy, vz), whose x is so far from either primary, into `series`.
#[inline(always)]
pub(super) fn expand<R: Real>(
    primaries: &Primaries,
    state: &[R; 6],
    to_larger: R,
    to_smaller: R,
    series: &mut Series<R>,
) {
    let leading = start(primaries, state, to_larger, to_smaller, series);
    macro_rules! pairs {
        ($($k:literal)*) => { $(pair::<R, $k>(&leading, series);)* };
    }
    pairs!(0 2 4 6 8 10 12 14 16 18 20);
    const { assert!(ORDER == 22, "the last pair makes the coefficients 22 and 23 of the position") };
    series.log2_radius = step::log2_radius(series);
}

/// What every order needs again, formed once.
struct Leading<R> {
    x: R,
    /// 3/2 of the force coefficient 0, the factor of the newest half square.
    steepened_near: R,
    steepened_far: R,
    /// −1 over the half square 0.
    inverse_near: R,
    inverse_far: R,
}

/// Order 0 of everything.
#[inline(always)]
fn start<R: Real>(
    primaries: &Primaries,
    state: &[R; 6],
    to_larger: R,
    to_smaller: R,
    s: &mut Series<R>,
) -> Leading<R> {
    let [x, y, z, vx, vy, vz] = *state;
    let constant = R::from_f64;
    let (one, two, half) = (constant(1.0), constant(2.0), constant(0.5));
    let off_axis = z.mul_add(z, y * y);
    let square_larger = to_larger.mul_add(to_larger, off_axis);
    let square_smaller = to_smaller.mul_add(to_smaller, off_axis);
    let pick = |smaller: R, larger: R| square_smaller.select_less(square_larger, smaller, larger);

    let share_smaller = constant(primaries.mass_parameter);
    let share_larger = constant(primaries.one_minus.value);
    let square_near = pick(square_smaller, square_larger);
    let square_far = pick(square_larger, square_smaller);
    s.side = pick(one, -one);
    s.nearer_x = pick(share_larger, -share_smaller);

    s.position[0][0] = pick(to_smaller, to_larger);
    s.position[1][0] = y;
    s.position[2][0] = z;
    s.position[0][1] = vx;
    s.position[1][1] = vy;
    s.position[2][1] = vz;
    s.half_square_near[0] = square_near * half;
    s.half_square_far[0] = square_far * half;
    let near = pick(share_smaller, share_larger) / (square_near * square_near.sqrt());
    let far = pick(share_larger, share_smaller) / (square_far * square_far.sqrt());
    s.near[0] = near;
    s.far[0] = far;
    s.total[0] = near + far;

    let speed_square = vz.mul_add(vz, vy.mul_add(vy, vx * vx));
    let potential = near.mul_add(square_near, far * square_far);
    s.jacobi = two.mul_add(potential, y.mul_add(y, x * x)) - speed_square;

    let steep = constant(WEIGHTS[1][1]);
    Leading {
        x,
        steepened_near: steep * near,
        steepened_far: steep * far,
        inverse_near: -one / s.half_square_near[0],
        inverse_far: -one / s.half_square_far[0],
    }
}

/// From the position's coefficients up to `K` + 1, those of order `K` + 2 and `K` + 3.
#[inline(always)]
fn pair<R: Real, const K: usize>(leading: &Leading<R>, s: &mut Series<R>) {
    let constant = R::from_f64;

    let half_squares = half_squares::<R, K>(s);
    let settled = settled_products::<R, K>(s);

    if K > 0 {
        s.half_square_near[K] = half_squares[0];
        s.half_square_far[K] = s.side.mul_add(s.position[0][K], half_squares[0]);
    }
    s.half_square_near[K + 1] = half_squares[1];
    s.half_square_far[K + 1] = s.side.mul_add(s.position[0][K + 1], half_squares[1]);

    let near =
        inverse_cubes::<R, K>(&s.half_square_near, &s.near, leading.steepened_near, leading.inverse_near);
    let far = inverse_cubes::<R, K>(&s.half_square_far, &s.far, leading.steepened_far, leading.inverse_far);
    if K > 0 {
        s.near[K] = near[0];
        s.far[K] = far[0];
        s.total[K] = near[0] + far[0];
    }
    s.near[K + 1] = near[1];
    s.far[K + 1] = far[1];
    s.total[K + 1] = near[1] + far[1];

    // The newest terms of the products, and the position two orders on.
    let (g0, g1) = (s.total[K], s.total[K + 1]);
    let mut acceleration = [[constant(0.0); 2]; 3];
    for (axis, p) in s.position.iter().enumerate() {
        let pull = settled[axis];
        let even = -p[0].mul_add(g0, pull[0]);
        let odd = -p[0].mul_add(g1, if K > 0 { p[1].mul_add(g0, pull[1]) } else { pull[1] });
        acceleration[axis] = [even, odd];
    }
    let [d, y, z] = &mut s.position;
    let centrifugal = if K > 0 { d[K] } else { leading.x };
    acceleration[0][0] = acceleration[0][0] + (-s.side).mul_add(s.far[K], centrifugal);
    acceleration[0][1] = acceleration[0][1] + (-s.side).mul_add(s.far[K + 1], d[K + 1]);
    acceleration[1][0] = acceleration[1][0] + y[K];
    acceleration[1][1] = acceleration[1][1] + y[K + 1];
    d[K + 2] = twice_integrated::<R>(K, constant(CORIOLIS[K]).mul_add(y[K + 1], acceleration[0][0]));
    y[K + 2] = twice_integrated::<R>(K, constant(-CORIOLIS[K]).mul_add(d[K + 1], acceleration[1][0]));
    z[K + 2] = twice_integrated::<R>(K, acceleration[2][0]);
    d[K + 3] = twice_integrated::<R>(K + 1, constant(CORIOLIS[K + 1]).mul_add(y[K + 2], acceleration[0][1]));
    y[K + 3] = twice_integrated::<R>(K + 1, constant(-CORIOLIS[K + 1]).mul_add(d[K + 2], acceleration[1][1]));
    z[K + 3] = twice_integrated::<R>(K + 1, acceleration[2][1]);
}

/// Beyond this order what the factors lost is far below the round-off of the sum of the series.
const REST_MATTERS: usize = 10;

/// Coefficient k + 2 of the position from coefficient k of the acceleration.
#[inline(always)]
fn twice_integrated<R: Real>(k: usize, acceleration: R) -> R {
    let (factor, rest) = TWICE_INTEGRATED[k];
    if k < REST_MATTERS {
        acceleration.mul_add(R::from_f64(factor), acceleration * R::from_f64(rest))
    } else {
        acceleration * R::from_f64(factor)
    }
}

/// Half the squared distance to the nearer primary, orders `K` and `K` + 1: half squares need no doubling.
#[inline(always)]
fn half_squares<R: Real, const K: usize>(s: &Series<R>) -> [R; 2] {
    let middle = K / 2;
    let mut sums = [[R::from_f64(0.0); 2]; 3];
    for (sum, p) in sums.iter_mut().zip(&s.position) {
        let [mut even, mut odd] = [p[middle] * p[middle] * R::from_f64(0.5), p[middle] * p[middle + 1]];
        for j in (0..middle).rev() {
            even = p[j].mul_add(p[K - j], even);
            odd = p[j].mul_add(p[K + 1 - j], odd);
        }
        *sum = [even, odd];
    }
    let [d, y, z] = sums;
    [(d[0] + y[0]) + z[0], (d[1] + y[1]) + z[1]]
}

/// The products of force and position of order `K` and `K` + 1, as far as they don't need the force's newest
/// two coefficients.
#[inline(always)]
fn settled_products<R: Real, const K: usize>(s: &Series<R>) -> [[R; 2]; 3] {
    let zero = R::from_f64(0.0);
    let g = &s.total;
    let mut sums = [[zero; 2]; 3];
    for (sum, p) in sums.iter_mut().zip(&s.position) {
        if K == 0 {
            *sum = [zero, g[0] * p[1]];
            continue;
        }
        let [mut even, mut odd] = [g[1] * p[K - 1], g[1] * p[K]];
        for j in 2..K {
            even = g[j].mul_add(p[K - j], even);
            odd = g[j].mul_add(p[K + 1 - j], odd);
        }
        *sum = [g[0].mul_add(p[K], even), g[0].mul_add(p[K + 1], odd)];
    }
    sums
}

/// Orders `K` and `K` + 1 of a force from its lower orders and the half squares h: with w ∝ h^(−3/2),
/// `w[k] = −1/h[0] Σ (1 + j/2k) h[j] w[k−j]`, j = 1 … k.
#[inline(always)]
fn inverse_cubes<R: Real, const K: usize>(
    h: &[R; TERMS],
    w: &[R; TERMS],
    steepened: R,
    inverse: R,
) -> [R; 2] {
    let zero = R::from_f64(0.0);
    let weight = |k: usize, j: usize| R::from_f64(WEIGHTS[k][j]);
    if K == 0 {
        return [zero, steepened * h[1] * inverse];
    }
    let mut even = weight(K, 1) * h[1] * w[K - 1];
    let mut odd = weight(K + 1, 2) * h[2] * w[K - 1];
    for j in 2..K {
        even = (weight(K, j) * h[j]).mul_add(w[K - j], even);
        odd = (weight(K + 1, j + 1) * h[j + 1]).mul_add(w[K - j], odd);
    }
    even = steepened.mul_add(h[K], even) * inverse;
    odd = steepened.mul_add(h[K + 1], odd);
    odd = (weight(K + 1, 1) * h[1]).mul_add(even, odd) * inverse;
    [even, odd]
}
