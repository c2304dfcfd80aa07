//! The recurrences of [`super::super::recurrence`], in the same order, with sums of products that keep what their
//! rounding loses.

use super::{ORDER, Pairs, Series, TERMS, Wide, step};
use crate::arithmetic::{DoubleDouble, Quad, SumOfProducts};
use crate::taylor::Primaries;

/// 1/k.
static RECIPROCAL: [DoubleDouble; TERMS] = {
    let mut reciprocals = [DoubleDouble::reciprocal(1); TERMS];
    let mut k = 2;
    while k < TERMS {
        reciprocals[k] = DoubleDouble::reciprocal(k);
        k += 1;
    }
    reciprocals
};

/// 1/((k + 1)(k + 2)), from the series of the acceleration to that of the position.
pub(super) static TWICE_INTEGRATED: [DoubleDouble; TERMS] = {
    let mut factors = [DoubleDouble::reciprocal(2); TERMS];
    let mut k = 1;
    while k < TERMS {
        factors[k] = DoubleDouble::reciprocal((k + 1) * (k + 2));
        k += 1;
    }
    factors
};

/// A small order as a number.
#[inline(always)]
#[expect(clippy::cast_precision_loss, reason = "orders are small")]
pub(super) fn number(order: usize) -> f64 {
    order as f64
}

/// What every order needs again, formed once.
struct Leading {
    x: DoubleDouble,
    /// −1 over twice the half squares 0.
    inverse: [DoubleDouble; 2],
    /// side in x: the direction in which the farther primary's force acts beside d.
    away: Wide,
    /// Twice integrated, an acceleration gains the trial step squared.
    trial_step: f64,
}

/// Expands the solution through (x, y, z, vx, vy, vz) into `series`.
#[inline(always)]
pub(super) fn expand(primaries: &Primaries, state: &[DoubleDouble; 6], series: &mut Series) {
    let leading = start(primaries, state, series);
    for k in (0..ORDER).step_by(2) {
        pair(&leading, series, k);
    }
    series.log2_radius = step::log2_radius(series);
}

/// Where the primaries are seen, the nearer one first.
pub(super) struct Start {
    /// x relative to the nearer one.
    d: DoubleDouble,
    /// The nearer one's x minus the farther one's.
    side: f64,
    share: [DoubleDouble; 2],
    square: [DoubleDouble; 2],
    distance: [DoubleDouble; 2],
}

impl Start {
    #[inline(always)]
    pub(super) fn new(primaries: &Primaries, state: &[DoubleDouble; 6]) -> Self {
        let [x, y, z, ..] = *state;
        let smaller = DoubleDouble::from(primaries.mass_parameter());
        let larger = DoubleDouble::from(primaries.smaller_x());
        let (to_larger, to_smaller) = (x + smaller, x - larger);
        let (d, side, share) = if to_smaller.abs() < to_larger.abs() {
            (to_smaller, 1.0, [smaller, larger])
        } else {
            (to_larger, -1.0, [larger, smaller])
        };
        let off_axis = y.squared() + z.squared();
        let square = [d, d + side].map(|d| d.squared() + off_axis);
        Self { d, side, share, square, distance: square.map(DoubleDouble::sqrt) }
    }

    /// The Jacobi constant.
    #[inline(always)]
    pub(super) fn jacobi(&self, state: &[DoubleDouble; 6]) -> DoubleDouble {
        let [x, y, _, vx, vy, vz] = state.map(DoubleDouble::squared);
        let potential = self.share[0] / self.distance[0] + self.share[1] / self.distance[1];
        potential.scaled(2.0) + (x + y) - (vx + vy + vz)
    }
}

/// Order 0 of everything.
#[inline(always)]
fn start(primaries: &Primaries, state: &[DoubleDouble; 6], s: &mut Series) -> Leading {
    let [x, y, z, vx, vy, vz] = *state;
    let zero = DoubleDouble::default();
    let start = Start::new(primaries, state);
    let Start { d, side, share, square, distance } = start;
    let force = [0, 1].map(|i| share[i] / (square[i] * distance[i]));
    s.side = side;
    s.half_square.set(0, square.map(|square| square.scaled(0.5)));
    s.force.set(0, force);
    s.total[0] = force[0] + force[1];
    s.jacobi = start.jacobi(state);

    let [a, b, c] = [vx, vy, vz].map(DoubleDouble::to_f64);
    let speed = (a * a + b * b + c * c).sqrt();
    s.trial_step = step::trial(distance[0].to_f64(), speed, s.total[0].to_f64().sqrt());
    s.position[0] = Wide::of([d, y, z, zero]);
    s.position[1] = Wide::of([vx, vy, vz, zero]).scaled(Quad::splat(s.trial_step));

    Leading {
        x,
        inverse: square.map(|square| DoubleDouble::from(-1.0) / square),
        away: Wide::of([DoubleDouble::from(side), zero, zero, zero]),
        trial_step: s.trial_step,
    }
}

/// From the position's coefficients up to `k` + 1, those of order `k` + 2 and `k` + 3.
#[inline(always)]
fn pair(leading: &Leading, s: &mut Series, k: usize) {
    let half_squares = half_squares(&s.position, k);
    let [settled_even, settled_odd] = settled_products(&s.total, &s.position, k);

    for (order, near) in [(k, half_squares[0]), (k + 1, half_squares[1])] {
        if order > 0 {
            let far = near + s.position[order].lane(0).scaled(s.side);
            s.half_square.set(order, [near, far]);
        }
    }
    let [even, odd] = inverse_cubes(&s.half_square, &s.force, leading, k);
    if k > 0 {
        s.force.set(k, even);
        s.total[k] = even[0] + even[1];
    }
    s.force.set(k + 1, odd);
    s.total[k + 1] = odd[0] + odd[1];

    // The newest terms of the products, and the position two orders on.
    let p = &mut s.position;
    let zero = DoubleDouble::default();
    let (g_even, g_odd) = (Wide::splat(s.total[k]), Wide::splat(s.total[k + 1]));
    let (far_even, far_odd) = (Wide::splat(s.force.at(k)[1]), Wide::splat(s.force.at(k + 1)[1]));
    let in_plane = |x: DoubleDouble, y: DoubleDouble| Wide::of([x, y, zero, zero]);
    let turned = |order: usize, rate: Wide| {
        let factor = 2.0 * number(order + 1) / leading.trial_step;
        in_plane(rate.lane(1).times(factor), rate.lane(0).times(-factor))
    };

    let x = if k > 0 { p[k].lane(0) } else { leading.x };
    let attraction = settled_even.and(p[0], g_even).and(leading.away, far_even).total();
    let acceleration = (in_plane(x, p[k].lane(1)) + turned(k, p[k + 1])) - attraction;
    p[k + 2] = twice_integrated(leading, k, acceleration);

    let mut attraction = settled_odd;
    if k > 0 {
        attraction = attraction.and(p[1], g_even);
    }
    let attraction = attraction.and(p[0], g_odd).and(leading.away, far_odd).total();
    let centrifugal = in_plane(p[k + 1].lane(0), p[k + 1].lane(1));
    let acceleration = (centrifugal - attraction) + turned(k + 1, p[k + 2]);
    p[k + 3] = twice_integrated(leading, k + 1, acceleration);
}

/// Coefficient k + 2 of the position from coefficient k of the acceleration.
#[inline(always)]
fn twice_integrated(leading: &Leading, k: usize, acceleration: Wide) -> Wide {
    let trial_square = leading.trial_step * leading.trial_step;
    acceleration * Wide::splat(TWICE_INTEGRATED[k].scaled(trial_square))
}

/// Half the squared distance to the nearer primary, orders `k` and `k` + 1: half squares need no doubling.
#[inline(always)]
fn half_squares(p: &[Wide; TERMS], k: usize) -> [DoubleDouble; 2] {
    let middle = k / 2;
    let mut even = SumOfProducts::of(p[middle].scaled(Quad::splat(0.5)), p[middle]);
    let mut odd = SumOfProducts::of(p[middle], p[middle + 1]);
    for j in (0..middle).rev() {
        even = even.and(p[j], p[k - j]);
        odd = odd.and(p[j], p[k + 1 - j]);
    }
    [even, odd].map(|sum| {
        let sum = sum.total();
        (sum.lane(0) + sum.lane(1)) + sum.lane(2)
    })
}

/// The products of force and position of order `k` and `k` + 1, as far as they don't need the force's newest
/// two coefficients.
#[inline(always)]
fn settled_products(g: &[DoubleDouble; TERMS], p: &[Wide; TERMS], k: usize) -> [SumOfProducts<Quad<f64>>; 2] {
    let first = Wide::splat(g[0]);
    if k == 0 {
        return [SumOfProducts::none(), SumOfProducts::of(first, p[1])];
    }
    let mut even = SumOfProducts::of(first, p[k]);
    let mut odd = SumOfProducts::of(first, p[k + 1]);
    for j in 1..k {
        let g = Wide::splat(g[j]);
        even = even.and(g, p[k - j]);
        odd = odd.and(g, p[k + 1 - j]);
    }
    [even, odd]
}

/// Orders `k` and `k` + 1 of the forces from their lower orders and the half squares h: with w ∝ h^(−3/2),
/// `w[k] = −1/(2k h[0]) Σ (2k + j) h[j] w[k−j]`, j = 1 … k.
#[inline(always)]
fn inverse_cubes(h: &Pairs, w: &Pairs, leading: &Leading, k: usize) -> [[DoubleDouble; 2]; 2] {
    let (order, next) = (number(2 * k), number(2 * (k + 1)));
    let scaled = |j: usize| {
        let (even, odd) = (order + number(j), next + number(j + 1));
        h.with_next(j).times(Quad([even, even, odd, odd]))
    };
    // Here 1/h[0] is −2 · inverse.
    let inverse = leading.inverse;
    if k == 0 {
        let newest = h.at(1);
        let first = w.at(0);
        return [first, std::array::from_fn(|i| (newest[i].times(3.0) * first[i]) * inverse[i])];
    }
    let mut sum = SumOfProducts::of(scaled(k), w.twice(0));
    for j in 1..k {
        sum = sum.and(scaled(j), w.twice(k - j));
    }
    let sum = sum.total();
    let even: [_; 2] = std::array::from_fn(|i| sum.lane(i) * (inverse[i] * RECIPROCAL[k]));
    let newest = h.at(1);
    let odd = std::array::from_fn(|i| {
        let all = newest[i].times(next + 1.0) * even[i] + sum.lane(2 + i);
        all * (inverse[i] * RECIPROCAL[k + 1])
    });
    [even, odd]
}
