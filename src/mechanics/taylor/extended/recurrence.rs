//! The recurrences of [`crate::taylor`], with sums of products that keep what their rounding loses.

use super::{ORDER, Pairs, Series, TERMS, Wide, step};
use crate::arithmetic::{DoubleDouble, Packed, Quad, SumOfProducts};
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
pub(super) fn expand<P: Packed>(primaries: &Primaries, state: &[DoubleDouble; 6], series: &mut Series) {
    let leading = start(primaries, state, series);
    for k in (0..ORDER).step_by(2) {
        pair::<P>(&leading, series, k);
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
        let square = [d.squared() + off_axis, (d + side).squared() + off_axis];
        Self { d, side, share, square, distance: [square[0].sqrt(), square[1].sqrt()] }
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
    let force = [share[0] / (square[0] * distance[0]), share[1] / (square[1] * distance[1])];
    s.side = side;
    s.half_square.set(0, [square[0].scaled(0.5), square[1].scaled(0.5)]);
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
        inverse: [DoubleDouble::from(-1.0) / square[0], DoubleDouble::from(-1.0) / square[1]],
        away: Wide::of([DoubleDouble::from(side), zero, zero, zero]),
        trial_step: s.trial_step,
    }
}

/// From the position's coefficients up to `k` + 1, those of order `k` + 2 and `k` + 3.
#[inline(always)]
fn pair<P: Packed>(leading: &Leading, s: &mut Series, k: usize) {
    let half_squares = half_squares::<P>(&s.position, k);
    let [settled_even, settled_odd] = settled_products::<P>(&s.total, &s.position, k);

    for (order, near) in [(k, half_squares[0]), (k + 1, half_squares[1])] {
        if order > 0 {
            let far = near + s.position[order].lane(0).scaled(s.side);
            s.half_square.set(order, [near, far]);
        }
    }
    let [even, odd] = inverse_cubes::<P>(&s.half_square, &s.force, leading, k);
    if k > 0 {
        s.force.set(k, even);
        s.total[k] = even[0] + even[1];
    }
    s.force.set(k + 1, odd);
    s.total[k + 1] = odd[0] + odd[1];

    // The newest terms of the products, and the position two orders on.
    let p = &mut s.position;
    let (g_even, g_odd) = (DoubleDouble::<P>::splat(s.total[k]), DoubleDouble::<P>::splat(s.total[k + 1]));
    let (far_even, far_odd) =
        (DoubleDouble::splat(s.force.at(k)[1]), DoubleDouble::splat(s.force.at(k + 1)[1]));

    let x = if k > 0 { p[k].lane(0) } else { leading.x };
    let attraction =
        settled_even.and(p[0].load(), g_even).and(leading.away.load(), far_even).total().stored();
    let acceleration = (in_plane(x, p[k].lane(1)) + turned(leading, k, p[k + 1])) - attraction;
    p[k + 2] = twice_integrated(leading, k, acceleration);

    let mut attraction = settled_odd;
    if k > 0 {
        attraction = attraction.and(p[1].load(), g_even);
    }
    let attraction = attraction.and(p[0].load(), g_odd).and(leading.away.load(), far_odd).total().stored();
    let centrifugal = in_plane(p[k + 1].lane(0), p[k + 1].lane(1));
    let acceleration = (centrifugal - attraction) + turned(leading, k + 1, p[k + 2]);
    p[k + 3] = twice_integrated(leading, k + 1, acceleration);
}

/// x and y.
#[inline(always)]
fn in_plane(x: DoubleDouble, y: DoubleDouble) -> Wide {
    Wide::of([x, y, DoubleDouble::default(), DoubleDouble::default()])
}

/// The Coriolis acceleration of an order from the next coefficient of the position.
#[inline(always)]
fn turned(leading: &Leading, order: usize, next: Wide) -> Wide {
    let factor = 2.0 * number(order + 1) / leading.trial_step;
    in_plane(next.lane(1).times(factor), next.lane(0).times(-factor))
}

/// Coefficient k + 2 of the position from coefficient k of the acceleration.
#[inline(always)]
fn twice_integrated(leading: &Leading, k: usize, acceleration: Wide) -> Wide {
    let trial_square = leading.trial_step * leading.trial_step;
    acceleration * Wide::splat(TWICE_INTEGRATED[k].scaled(trial_square))
}

/// Half the squared distance to the nearer primary, orders `k` and `k` + 1: half squares need no doubling.
#[inline(always)]
fn half_squares<P: Packed>(p: &[Wide; TERMS], k: usize) -> [DoubleDouble; 2] {
    let middle = k / 2;
    let mut even = SumOfProducts::of(p[middle].load::<P>().scaled(P::from_f64(0.5)), p[middle].load::<P>());
    let mut odd = SumOfProducts::of(p[middle].load::<P>(), p[middle + 1].load::<P>());
    for j in (0..middle).rev() {
        even = even.and(p[j].load::<P>(), p[k - j].load::<P>());
        odd = odd.and(p[j].load::<P>(), p[k + 1 - j].load::<P>());
    }
    [added_up(even.total().stored()), added_up(odd.total().stored())]
}

/// The first three lanes together.
#[inline(always)]
fn added_up(sum: Wide) -> DoubleDouble {
    (sum.lane(0) + sum.lane(1)) + sum.lane(2)
}

/// The products of force and position of order `k` and `k` + 1, as far as they don't need the force's newest
/// two coefficients.
#[inline(always)]
fn settled_products<P: Packed>(
    g: &[DoubleDouble; TERMS],
    p: &[Wide; TERMS],
    k: usize,
) -> [SumOfProducts<P>; 2] {
    let first = DoubleDouble::splat(g[0]);
    if k == 0 {
        return [SumOfProducts::none(), SumOfProducts::of(first, p[1].load::<P>())];
    }
    let mut even = SumOfProducts::of(first, p[k].load::<P>());
    let mut odd = SumOfProducts::of(first, p[k + 1].load::<P>());
    for j in 1..k {
        let g = DoubleDouble::splat(g[j]);
        even = even.and(g, p[k - j].load::<P>());
        odd = odd.and(g, p[k + 1 - j].load::<P>());
    }
    [even, odd]
}

/// Orders `k` and `k` + 1 of the forces from their lower orders and the half squares h: with w ∝ h^(−3/2),
/// `w[k] = −1/(2k h[0]) Σ (2k + j) h[j] w[k−j]`, j = 1 … k.
#[inline(always)]
fn inverse_cubes<P: Packed>(h: &Pairs, w: &Pairs, leading: &Leading, k: usize) -> [[DoubleDouble; 2]; 2] {
    // −1/2h[0], of the nearer and of the farther primary.
    let [near, far] = leading.inverse;
    let [newest_near, newest_far] = h.at(1);
    if k == 0 {
        let first = w.at(0);
        let odd = [newest_near.times(3.0) * first[0] * near, newest_far.times(3.0) * first[1] * far];
        return [first, odd];
    }
    let mut sum = SumOfProducts::of(weighted::<P>(h, k, k), w.twice(0));
    for j in 1..k {
        sum = sum.and(weighted::<P>(h, k, j), w.twice(k - j));
    }
    let sum = sum.total().stored();
    let even = [sum.lane(0) * (near * RECIPROCAL[k]), sum.lane(1) * (far * RECIPROCAL[k])];
    // The term of the odd order that waited for the even one.
    let weight = number(2 * (k + 1) + 1);
    let odd =
        [newest_near.times(weight) * even[0] + sum.lane(2), newest_far.times(weight) * even[1] + sum.lane(3)];
    let odd = [odd[0] * (near * RECIPROCAL[k + 1]), odd[1] * (far * RECIPROCAL[k + 1])];
    [even, odd]
}

/// The half squares of term j of order k and of term j + 1 of order k + 1, with their weights.
#[inline(always)]
fn weighted<P: Packed>(h: &Pairs, k: usize, j: usize) -> DoubleDouble<P> {
    let (even, odd) = (number(2 * k + j), number(2 * (k + 1) + j + 1));
    h.with_next::<P>(j).times(P::load(&Quad([even, even, odd, odd])))
}
