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
use crate::arithmetic::{Quad, Real, sum::Compensated};

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

/// Weight (2k + j)/2k of the recurrence for the power −3/2, correctly rounded.
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
const fn weight(k: usize, j: usize) -> f64 {
    (2 * k + j) as f64 / (2 * k) as f64
}

/// Weights of the terms j of order k and j + 1 of order k + 1, each for two primaries.
static WEIGHTS: [[Quad<f64>; TERMS]; TERMS] = {
    let mut weights = [[Quad([0.0; 4]); TERMS]; TERMS];
    let mut k = 1;
    while k < TERMS {
        let mut j = 0;
        while j < TERMS {
            let (even, odd) = (weight(k, j), weight(k + 1, j + 1));
            weights[k][j] = Quad([even, even, odd, odd]);
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
    // The last pair makes the coefficients 22 and 23 of the position.
    for k in (0..ORDER).step_by(2) {
        pair(&leading, series, k);
    }
    series.log2_radius = step::log2_radius(series);
}

/// What every order needs again, formed once.
struct Leading<R> {
    x: R,
    /// 3/2 of the force coefficients 0, the factors of the newest half squares.
    steepened: [R; 2],
    /// −1 over the half squares 0.
    inverse: [R; 2],
    /// −side in x: the direction in which the farther primary's force acts beside d.
    toward: Quad<R>,
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
    let (zero, one, two, half) = (constant(0.0), constant(1.0), constant(2.0), constant(0.5));
    let off_axis = z.mul_add(z, y * y);
    let square_larger = to_larger.mul_add(to_larger, off_axis);
    let square_smaller = to_smaller.mul_add(to_smaller, off_axis);
    let pick = |smaller: R, larger: R| square_smaller.select_less(square_larger, smaller, larger);

    let share_smaller = constant(primaries.mass_parameter);
    let share_larger = constant(primaries.one_minus.value);
    let square = [pick(square_smaller, square_larger), pick(square_larger, square_smaller)];
    let share = [pick(share_smaller, share_larger), pick(share_larger, share_smaller)];
    s.side = pick(one, -one);
    s.position[0] = Quad([pick(to_smaller, to_larger), y, z, zero]);
    s.position[1] = Quad([vx, vy, vz, zero]);
    s.half_square[0] = square.map(|square| square * half);
    s.force[0] = std::array::from_fn(|i| share[i] / (square[i] * square[i].sqrt()));
    let [near, far] = s.force[0];
    s.total[0] = near + far;

    let speed_square = vz.mul_add(vz, vy.mul_add(vy, vx * vx));
    let potential = near.mul_add(square[0], far * square[1]);
    s.jacobi = two.mul_add(potential, y.mul_add(y, x * x)) - speed_square;

    Leading {
        x,
        steepened: s.force[0].map(|force| force * constant(weight(1, 1))),
        inverse: s.half_square[0].map(|half_square| -one / half_square),
        toward: Quad([-s.side, zero, zero, zero]),
    }
}

/// From the position's coefficients up to `k` + 1, those of order `k` + 2 and `k` + 3.
#[inline(always)]
fn pair<R: Real>(leading: &Leading<R>, s: &mut Series<R>, k: usize) {
    let zero = R::from_f64(0.0);
    let half_squares = half_squares(&s.position, k);
    let [settled_even, settled_odd] = settled_products(&s.total, &s.position, k);

    for (order, near) in [(k, half_squares[0]), (k + 1, half_squares[1])] {
        if order > 0 {
            s.half_square[order] = [near, s.side.mul_add(s.position[order].0[0], near)];
        }
    }
    let [even, odd] = inverse_cubes(&s.half_square, &s.force, leading, k);
    if k > 0 {
        s.force[k] = even;
        s.total[k] = even[0] + even[1];
    }
    s.force[k + 1] = odd;
    s.total[k + 1] = odd[0] + odd[1];

    // The newest terms of the products, and the position two orders on.
    let p = &mut s.position;
    let (g_even, g_odd) = (Quad::splat(s.total[k]), Quad::splat(s.total[k + 1]));
    let (far_even, far_odd) = (Quad::splat(s.force[k][1]), Quad::splat(s.force[k + 1][1]));
    let in_plane = |x: R, y: R| Quad([x, y, zero, zero]);
    let turned = |order: usize, rate: Quad<R>| {
        let factor = R::from_f64(CORIOLIS[order]);
        in_plane(factor * rate.0[1], -factor * rate.0[0])
    };
    let toward_center = -p[0];

    let centrifugal = in_plane(if k > 0 { p[k].0[0] } else { leading.x }, p[k].0[1]);
    let rest = (centrifugal - settled_even) + turned(k, p[k + 1]);
    let acceleration = leading.toward.mul_add(far_even, toward_center.mul_add(g_even, rest));
    p[k + 2] = twice_integrated(k, acceleration);

    let mut rest = in_plane(p[k + 1].0[0], p[k + 1].0[1]) - settled_odd;
    if k > 0 {
        rest = (-p[1]).mul_add(g_even, rest);
    }
    let rest = leading.toward.mul_add(far_odd, toward_center.mul_add(g_odd, rest));
    p[k + 3] = twice_integrated(k + 1, rest + turned(k + 1, p[k + 2]));
}

/// Beyond this order what the factors lost is far below the round-off of the sum of the series.
const REST_MATTERS: usize = 10;

/// Coefficient k + 2 of the position from coefficient k of the acceleration.
#[inline(always)]
fn twice_integrated<R: Real>(k: usize, acceleration: Quad<R>) -> Quad<R> {
    let (factor, rest) = TWICE_INTEGRATED[k];
    let (factor, rest) = (Quad::splat(R::from_f64(factor)), Quad::splat(R::from_f64(rest)));
    if k < REST_MATTERS { acceleration.mul_add(factor, acceleration * rest) } else { acceleration * factor }
}

/// Half the squared distance to the nearer primary, orders `k` and `k` + 1: half squares need no doubling.
#[inline(always)]
fn half_squares<R: Real>(p: &[Quad<R>; TERMS], k: usize) -> [R; 2] {
    let middle = k / 2;
    let mut even = p[middle] * p[middle] * Quad::splat(R::from_f64(0.5));
    let mut odd = p[middle] * p[middle + 1];
    for j in (0..middle).rev() {
        even = p[j].mul_add(p[k - j], even);
        odd = p[j].mul_add(p[k + 1 - j], odd);
    }
    // The fourth lane is 0, and four are as fast as three.
    [even, odd].map(|Quad([d, y, z, none])| (d + y) + (z + none))
}

/// The products of force and position of order `k` and `k` + 1, as far as they don't need the force's newest
/// two coefficients.
#[inline(always)]
fn settled_products<R: Real>(g: &[R; TERMS], p: &[Quad<R>; TERMS], k: usize) -> [Quad<R>; 2] {
    if k == 0 {
        return [Quad::splat(R::from_f64(0.0)), Quad::splat(g[0]) * p[1]];
    }
    let mut even = Quad::splat(g[1]) * p[k - 1];
    let mut odd = Quad::splat(g[1]) * p[k];
    for j in 2..k {
        even = Quad::splat(g[j]).mul_add(p[k - j], even);
        odd = Quad::splat(g[j]).mul_add(p[k + 1 - j], odd);
    }
    [Quad::splat(g[0]).mul_add(p[k], even), Quad::splat(g[0]).mul_add(p[k + 1], odd)]
}

/// Orders `k` and `k` + 1 of the forces from their lower orders and the half squares h: with w ∝ h^(−3/2),
/// `w[k] = −1/h[0] Σ (1 + j/2k) h[j] w[k−j]`, j = 1 … k.
#[inline(always)]
fn inverse_cubes<R: Real>(
    h: &[[R; 2]; TERMS],
    w: &[[R; 2]; TERMS],
    leading: &Leading<R>,
    k: usize,
) -> [[R; 2]; 2] {
    let steepened = Quad::twice(leading.steepened);
    let newest = Quad::join(h[k], h[k + 1]);
    if k == 0 {
        let odd = (steepened * newest).0;
        return [w[0], [odd[2] * leading.inverse[0], odd[3] * leading.inverse[1]]];
    }
    let term = |j: usize| Quad(WEIGHTS[k][j].0.map(R::from_f64)) * Quad::join(h[j], h[j + 1]);
    let mut sum = term(1) * Quad::twice(w[k - 1]);
    for j in 2..k {
        sum = term(j).mul_add(Quad::twice(w[k - j]), sum);
    }
    let Quad([near, far, next_near, next_far]) = steepened.mul_add(newest, sum);
    let even = [near * leading.inverse[0], far * leading.inverse[1]];
    let first = R::from_f64(WEIGHTS[k][0].0[2]);
    let odd = std::array::from_fn(|i| {
        (first * h[1][i]).mul_add(even[i], [next_near, next_far][i]) * leading.inverse[i]
    });
    [even, odd]
}
