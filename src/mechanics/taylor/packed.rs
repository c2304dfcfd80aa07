//! The recurrences of one trajectory, packed: d, y and z side by side, and the two primaries of two orders.
//!
//! Every operation on a value is the one that [`super::lanes`] does, so both have the same bits; where a lane has
//! nothing to add it adds a 0, which changes none (see [`super::opening`]). The fourth lane of a position stays 0.

use super::lanes::stage;
use super::opening::{Leading, Opening};
use super::tables::{CORIOLIS, REST_MATTERS, TWICE_INTEGRATED, WEIGHT, WEIGHT_PAIRS};
use super::{Primaries, Series, TERMS, step};
use crate::arithmetic::sum::Compensated;
use crate::arithmetic::{Packed, Quad};

/// [`Leading`], packed.
struct Constants<P> {
    inverse: P,
    slope: P,
    /// In the lanes of the farther primary.
    far_slope: P,
    bend: P,
    tilt: P,
    /// The forces of order 1, twice.
    force: P,
    pull: P,
    /// In the lanes of the farther primary.
    side: P,
    /// In the lane of x.
    toward: P,
    place: P,
    rate: P,
}

/// What the last pair of orders found, kept in registers.
#[derive(Clone, Copy)]
struct Newest<P> {
    position: [P; 2],
    squares: P,
    /// The half squares of the last but two and the last but one order.
    across: P,
    /// Each twice.
    force: [P; 2],
    /// Each in every lane.
    total: [P; 2],
    sums: Sums<P>,
}

/// The sums of a pair of orders: products of positions, products of forces with positions and of squares with forces
/// (both orders side by side), the last two taken away.
#[derive(Clone, Copy)]
struct Sums<P> {
    even: P,
    odd: P,
    pull_even: P,
    pull_odd: P,
    force: P,
}

/// Expands the solution through `state` (x, y, z, vx, vy, vz) into `series`.
#[inline(always)]
pub(super) fn expand<P: Packed>(primaries: &Primaries, state: &[Compensated; 6], series: &mut Series) {
    let away = [primaries.larger_x(), primaries.smaller_x()].map(|centre| state[0].minus(centre));
    let rounded = state.map(|component| component.value);
    let Opening { leading, position, half_square, force, total, side, jacobi } =
        Opening::new(primaries, &rounded, away);
    // Made in registers: a load can't be served from several stores under way.
    let quad = |values: [f64; 4]| P::load(&Quad(values));
    let position = position.map(|[d, y, z]| quad([d, y, z, 0.0]));
    for k in 0..position.len() {
        position[k].store(&mut series.position[k]);
    }
    let squares = quad([half_square[0][0], half_square[0][1], half_square[1][0], half_square[1][1]]);
    squares.store(&mut series.squares[0]);
    quad([force[0][0], force[0][1], force[1][0], force[1][1]]).store_pairs(&mut series.force, 0);
    series.total[0] = total[0];
    series.total[1] = total[1];
    series.side = side;
    series.jacobi = jacobi;
    let Leading { inverse, slope, far_slope, bend, tilt, pull: [in_plane, _, vertical] } = leading;
    let constants = Constants {
        inverse: P::twice(&inverse),
        slope: P::twice(&slope),
        far_slope: quad([0.0, far_slope, 0.0, far_slope]),
        bend: P::twice(&bend),
        tilt: P::twice(&tilt),
        force: P::twice(&force[1]),
        pull: quad([in_plane, in_plane, vertical, 0.0]),
        side: quad([0.0, side, 0.0, side]),
        toward: quad([side, 0.0, 0.0, 0.0]),
        place: position[0],
        rate: position[1],
    };
    let mut newest = Newest {
        position: [position[2], position[3]],
        squares,
        across: squares,
        force: force.map(|force| P::twice(&force)),
        total: total.map(P::from_f64),
        sums: Sums::old::<2>(series),
    };
    stage();
    macro_rules! pairs {
        ($($k:literal $next:literal,)*) => {$(newest = pair::<P, $k, $next>(&constants, series, newest);)*};
    }
    pairs!(2 4, 4 6, 6 8, 8 10, 10 12, 12 14, 14 16, 16 18, 18 20, 20 0,);
    let size = |k: usize| {
        let Quad([d, y, z, _]) = series.position[k];
        d.abs().max(y.abs()).max(z.abs())
    };
    series.log2_radius =
        step::log2_radius(step::ESTIMATED_FROM.map(|k| size(k + 1)), size(1), series.squares[0].0[0]);
}

impl<P: Packed> Sums<P> {
    /// The terms of the orders `K` and `K` + 1 that were known before the last pair of orders, which is still on its way:
    /// they fill the time that its newest terms wait for each other.
    #[inline(always)]
    fn old<const K: usize>(s: &Series) -> Self {
        let zero = P::from_f64(0.0);
        let mut sums = Self { even: zero, odd: zero, pull_even: zero, pull_odd: zero, force: zero };
        let p = |j: usize| P::load(&s.position[j]);
        let middle = K / 2;
        if middle > 2 {
            sums.even = (p(middle) * p(middle)) * P::from_f64(0.5);
            for j in (3..middle).rev() {
                sums.even = p(j).mul_add(p(K - j), sums.even);
            }
        }
        if middle > 3 {
            for j in (3..middle).rev() {
                sums.odd = p(j + 1).mul_add(p(K - j), sums.odd);
            }
        }
        for j in (4..K.max(2) - 2).rev() {
            sums.pull(P::from_f64(s.total[j]), p(K - j), p(K + 1 - j));
        }
        for j in (3..K.max(3) - 3).rev() {
            sums.force::<K>(j, P::load(&s.squares[j]), P::twice(&s.force[K - j]));
        }
        sums
    }

    /// The same sums, which the compiler may not put off.
    #[inline(always)]
    fn settle(self) -> Self {
        Self {
            even: self.even.settle(),
            odd: self.odd.settle(),
            pull_even: self.pull_even.settle(),
            pull_odd: self.pull_odd.settle(),
            force: self.force.settle(),
        }
    }

    /// A term of the products of forces and positions.
    #[inline(always)]
    fn pull(&mut self, force: P, even: P, odd: P) {
        self.pull_even = force.neg_mul_add(even, self.pull_even);
        self.pull_odd = force.neg_mul_add(odd, self.pull_odd);
    }

    /// Term `j` of the products of squares and forces, of the orders `K` and `K` + 1.
    #[inline(always)]
    fn force<const K: usize>(&mut self, j: usize, squares: P, force: P) {
        self.force = (P::load(&WEIGHT_PAIRS[K][j]) * squares).neg_mul_add(force, self.force);
    }
}

/// From the position's coefficients up to `K` + 1, the last two of which are among the `newest`, those of order `K` + 2
/// and `K` + 3; and the old terms of the orders `NEXT` and `NEXT` + 1.
#[inline(always)]
fn pair<P: Packed, const K: usize, const NEXT: usize>(
    c: &Constants<P>,
    s: &mut Series,
    newest: Newest<P>,
) -> Newest<P> {
    let Newest { position: newest, squares: before, across: across_before, force, total, mut sums } = newest;
    let p = &s.position;
    let at = |j: usize| {
        if j >= K {
            newest[j - K]
        } else if j == 0 {
            c.place
        } else if j == 1 {
            c.rate
        } else {
            P::load(&p[j])
        }
    };
    let middle = K / 2;
    if middle <= 2 {
        sums.even = (at(middle) * at(middle)) * P::from_f64(0.5);
    }
    if middle <= 3 {
        sums.odd = at(middle).mul_add(at(middle + 1), sums.odd);
    }
    if middle > 3 {
        sums.odd = at(3).mul_add(at(K - 2), sums.odd);
    }
    if middle > 2 {
        sums.even = at(2).mul_add(at(K - 2), sums.even);
        sums.odd = at(2).mul_add(at(K - 1), sums.odd);
    }
    if middle > 1 {
        sums.even = at(1).mul_add(at(K - 1), sums.even);
        sums.odd = at(1).mul_add(at(K), sums.odd);
    }
    let even = at(0).mul_add(at(K), sums.even);
    let odd = at(0).mul_add(at(K + 1), sums.odd);

    // The nearer half squares, and the farther ones beside them.
    let (near_even, near_odd) = (even.sum(), odd.sum());
    let (d_even, d_odd) = (newest[0].firsts(), newest[1].firsts());
    let squares_even = c.side.mul_add(d_even, near_even);
    let squares_odd = c.side.mul_add(d_odd, near_odd);
    let across = before.high_with_low(squares_even);
    let squares = squares_even.low_with_low(squares_odd);
    across.store(&mut s.squares[K - 1]);
    squares.store(&mut s.squares[K]);

    if K > 4 {
        sums.force::<K>(K - 3, across_before, P::twice(&s.force[3]));
    }
    if K > 2 {
        sums.force::<K>(K - 2, before, if K > 4 { P::twice(&s.force[2]) } else { force[0] });
    }
    // The even order's term of force 1; the odd one's waits for the newest half square.
    sums.force = (P::from_f64(WEIGHT[K][K - 1]) * before.high_alone()).neg_mul_add(c.force, sums.force);
    if K > 4 {
        sums.force::<K>(2, P::load(&s.squares[2]), force[0]);
    }
    if K > 2 {
        sums.force::<K>(1, P::load(&s.squares[1]), force[1]);
    }
    let settled = sums.force * c.inverse;
    let settled_even = c.far_slope.mul_add(d_even, settled.low_twice());
    let force_even = near_even.mul_add(c.slope, settled_even);
    let settled_odd = c.far_slope.mul_add(d_odd, settled.high_twice());
    let (bend, tilt) = (P::from_f64(WEIGHT[K + 1][1]) * c.bend, P::from_f64(WEIGHT[K + 1][K]) * c.tilt);
    let settled_odd = tilt.neg_mul_add(squares_even, bend.neg_mul_add(force_even, settled_odd));
    let force_odd = near_odd.mul_add(c.slope, settled_odd);
    let (swapped_even, swapped_odd) = (force_even.swap(), force_odd.swap());
    let total_even = force_even + swapped_even;
    let total_odd = force_odd + swapped_odd;

    if K > 4 {
        sums.pull(P::from_f64(s.total[3]), at(K - 3), at(K - 2));
        sums.pull(P::from_f64(s.total[2]), at(K - 2), at(K - 1));
    }
    if K > 2 {
        sums.pull(total[0], at(2), at(3));
        sums.pull(total[1], at(1), at(2));
    }
    sums.pull(P::from_f64(s.total[1]), at(K - 1), at(K));
    let pull_even = c.pull.neg_mul_add(at(K), sums.pull_even);
    let pull_odd = c.pull.neg_mul_add(at(K + 1), sums.pull_odd);
    force_even.low_with_low(force_odd).store_pairs(&mut s.force, K);
    s.total[K] = total_even.first();
    s.total[K + 1] = total_odd.first();

    // The newest terms of the products, and the position two orders on.
    let pull_even = c.toward.neg_mul_add(swapped_even, pull_even);
    let pull_even = total_even.neg_mul_add(c.place, pull_even);
    let even = twice_integrated(K, turn::<P>(K).mul_add(newest[1].swap(), pull_even));
    even.store(&mut s.position[K + 2]);

    let pull_odd = total_even.neg_mul_add(c.rate, pull_odd);
    let pull_odd = c.toward.neg_mul_add(swapped_odd, pull_odd);
    let pull_odd = total_odd.neg_mul_add(c.place, pull_odd);
    let odd = twice_integrated(K + 1, turn::<P>(K + 1).mul_add(even.swap(), pull_odd));
    odd.store(&mut s.position[K + 3]);
    stage();
    let sums = Sums::old::<NEXT>(s).settle();
    stage();
    Newest {
        position: [even, odd],
        squares,
        across,
        force: [force_even, force_odd],
        total: [total_even, total_odd],
        sums,
    }
}

/// From the swapped x and y of a rate to the Coriolis acceleration.
#[inline(always)]
fn turn<P: Packed>(k: usize) -> P {
    P::load(&Quad([CORIOLIS[k], -CORIOLIS[k], 0.0, 0.0]))
}

/// [`super::lanes::twice_integrated`], packed.
#[inline(always)]
fn twice_integrated<P: Packed>(k: usize, pull: P) -> P {
    let (factor, rest) = TWICE_INTEGRATED[k];
    let factor = P::from_f64(factor);
    if REST_MATTERS.contains(&k) { pull.mul_add(factor, pull * P::from_f64(rest)) } else { pull * factor }
}

/// What position and velocity change by within `time`.
#[inline(always)]
pub(super) fn change<P: Packed>(position: &[Quad<f64>; TERMS], time: f64) -> [Quad<f64>; 2] {
    let ends = super::horner(P::from_f64(time), |k| P::load(&position[k]));
    let mut changes = [Quad([0.0; 4]); 2];
    for (change, end) in changes.iter_mut().zip(ends) {
        end.store(change);
    }
    changes
}
