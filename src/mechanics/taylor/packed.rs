//! The recurrences of one trajectory, packed: d, y and z side by side, and the two primaries of two orders.
//!
//! Every operation on a value is the one that [`super::lanes`] does, so both have the same bits. The fourth lane of a
//! position is nothing: what it holds is never read.

use super::lanes::{plus, stage, sum};
use super::opening::{Leading, Opening};
use super::tables::{CORIOLIS, REST_MATTERS, TWICE_INTEGRATED, WEIGHT, WEIGHT_PAIRS};
use super::{Primaries, Series, TERMS, step};
use crate::arithmetic::sum::Compensated;
use crate::arithmetic::{Packed, Quad};

/// [`Leading`], packed.
struct Constants<P> {
    inverse: P,
    slope: P,
    far_slope: P,
    bend: P,
    tilt: P,
    pull: P,
    side: P,
    place: P,
    rate: P,
}

/// What the last pair of orders found, kept in registers.
struct Newest<P> {
    position: [P; 2],
    squares: P,
    /// Each twice.
    force: [P; 2],
    /// Each in every lane.
    total: [P; 2],
    sums: Sums<P>,
}

/// The sums of a pair of orders: products of positions, products of forces with positions, and of squares with
/// forces (both orders side by side). None is one that has not begun.
#[derive(Clone, Copy)]
struct Sums<P> {
    even: Option<P>,
    odd: Option<P>,
    pull_even: Option<P>,
    pull_odd: Option<P>,
    force: Option<P>,
}

/// Lanes of the farther primary.
const FAR: i32 = 0b1010;
/// The lane of x.
const X: i32 = 0b0001;
/// The lanes of x and y.
const IN_PLANE: i32 = 0b0011;

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
        far_slope: P::from_f64(far_slope),
        bend: P::twice(&bend),
        tilt: P::twice(&tilt),
        pull: quad([in_plane, in_plane, vertical, 0.0]),
        side: P::from_f64(side),
        place: position[0],
        rate: position[1],
    };
    let mut newest = Newest {
        position: [position[2], position[3]],
        squares,
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
        let mut sums = Self { even: None, odd: None, pull_even: None, pull_odd: None, force: None };
        let p = |j: usize| P::load(&s.position[j]);
        let middle = K / 2;
        if middle > 2 {
            sums.even = Some((p(middle) * p(middle)) * P::from_f64(0.5));
            for j in (3..middle).rev() {
                sums.even = plus(sums.even, p(j), p(K - j));
            }
        }
        if middle > 3 {
            sums.odd = Some(p(middle).mul_add(p(middle + 1), P::from_f64(0.0)));
            for j in (4..middle).rev() {
                sums.odd = plus(sums.odd, p(j), p(K + 1 - j));
            }
        }
        for j in 4..K.max(2) - 2 {
            sums.pull(P::from_f64(s.total[j]), p(K - j), p(K + 1 - j));
        }
        for j in 3..K.max(3) - 3 {
            sums.force::<K>(j, P::load(&s.squares[j]), P::twice(&s.force[K - j]));
        }
        sums
    }

    /// The same sums, which the compiler may not put off.
    #[inline(always)]
    fn settle(self) -> Self {
        let settle = |sum: Option<P>| match sum {
            Some(sum) => Some(sum.settle()),
            None => None,
        };
        Self {
            even: settle(self.even),
            odd: settle(self.odd),
            pull_even: settle(self.pull_even),
            pull_odd: settle(self.pull_odd),
            force: settle(self.force),
        }
    }

    /// A term of the products of forces and positions.
    #[inline(always)]
    fn pull(&mut self, force: P, even: P, odd: P) {
        self.pull_even = plus(self.pull_even, force, even);
        self.pull_odd = plus(self.pull_odd, force, odd);
    }

    /// Term `j` of the products of squares and forces, of the orders `K` and `K` + 1.
    #[inline(always)]
    fn force<const K: usize>(&mut self, j: usize, squares: P, force: P) {
        self.force = plus(self.force, P::load(&WEIGHT_PAIRS[K][j]) * squares, force);
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
    let Newest { position: newest, squares: before, force, total, mut sums } = newest;
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
        sums.even = Some((at(middle) * at(middle)) * P::from_f64(0.5));
    }
    if middle <= 3 {
        sums.odd = Some(at(middle).mul_add(at(middle + 1), P::from_f64(0.0)));
    }
    if middle > 3 {
        sums.odd = plus(sums.odd, at(3), at(K - 2));
    }
    if middle > 2 {
        sums.even = plus(sums.even, at(2), at(K - 2));
        sums.odd = plus(sums.odd, at(2), at(K - 1));
    }
    if middle > 1 {
        sums.even = plus(sums.even, at(1), at(K - 1));
        sums.odd = plus(sums.odd, at(1), at(K));
    }
    let even = at(0).mul_add(at(K), sum(sums.even));
    let odd = at(0).mul_add(at(K + 1), sum(sums.odd));

    // The nearer half squares, and the farther ones beside them.
    let (near_even, near_odd) = (even.sum(), odd.sum());
    let (d_even, d_odd) = (newest[0].firsts(), newest[1].firsts());
    let squares_even = near_even.with::<FAR>(c.side.mul_add(d_even, near_even));
    let squares_odd = near_odd.with::<FAR>(c.side.mul_add(d_odd, near_odd));
    let across = before.high_with_low(squares_even);
    let squares = squares_even.low_with_low(squares_odd);
    across.store(&mut s.squares[K - 1]);
    squares.store(&mut s.squares[K]);

    if K > 4 {
        sums.force::<K>(K - 3, P::load(&s.squares[K - 3]), P::twice(&s.force[3]));
        sums.force::<K>(K - 2, before, P::twice(&s.force[2]));
        sums.force::<K>(2, P::load(&s.squares[2]), force[0]);
    } else if K > 2 {
        sums.force::<K>(K - 2, before, force[0]);
    }
    if K > 2 {
        sums.force::<K>(1, P::load(&s.squares[1]), force[1]);
    }
    let settled = sums.force.map_or(P::from_f64(0.0), |total| total * c.inverse);
    let settled_even =
        (P::from_f64(WEIGHT[K][K - 1]) * c.tilt).mul_add(before.high_twice(), settled.low_twice());
    let settled_even = settled_even.with::<FAR>(c.far_slope.mul_add(d_even, settled_even));
    let force_even = near_even.mul_add(c.slope, settled_even);
    let settled_odd = settled.high_twice();
    let settled_odd = settled_odd.with::<FAR>(c.far_slope.mul_add(d_odd, settled_odd));
    let settled_odd = (P::from_f64(WEIGHT[K + 1][1]) * c.bend).mul_add(force_even, settled_odd);
    let settled_odd = (P::from_f64(WEIGHT[K + 1][K]) * c.tilt).mul_add(squares_even, settled_odd);
    let force_odd = near_odd.mul_add(c.slope, settled_odd);
    let total_even = force_even + force_even.swap();
    let total_odd = force_odd + force_odd.swap();

    if K > 4 {
        sums.pull(P::from_f64(s.total[3]), at(K - 3), at(K - 2));
        sums.pull(P::from_f64(s.total[2]), at(K - 2), at(K - 1));
    }
    if K > 2 {
        sums.pull(total[0], at(2), at(3));
        sums.pull(total[1], at(1), at(2));
    }
    sums.pull(P::from_f64(s.total[1]), at(K - 1), at(K));
    let pull_even = c.pull.mul_add(at(K), sum(sums.pull_even));
    let pull_odd = c.pull.mul_add(at(K + 1), sum(sums.pull_odd));
    force_even.low_with_low(force_odd).store_pairs(&mut s.force, K);
    s.total[K] = total_even.first();
    s.total[K + 1] = total_odd.first();

    // The newest terms of the products, and the position two orders on.
    let turned = |pull: P, k: usize, rate: P| {
        let twice = Quad([-CORIOLIS[k], CORIOLIS[k], 0.0, 0.0]);
        pull.with::<IN_PLANE>(P::load(&twice).mul_add(rate.swap(), pull))
    };
    let toward = |pull: P, force: P| pull.with::<X>(c.side.mul_add(force.seconds(), pull));
    let pull_even = total_even.mul_add(c.place, toward(pull_even, force_even));
    let even = twice_integrated(K, turned(pull_even, K, newest[1]));
    even.store(&mut s.position[K + 2]);

    let pull_odd = toward(total_even.mul_add(c.rate, pull_odd), force_odd);
    let pull_odd = turned(total_odd.mul_add(c.place, pull_odd), K + 1, even);
    let odd = twice_integrated(K + 1, pull_odd);
    odd.store(&mut s.position[K + 3]);
    stage();
    let sums = Sums::old::<NEXT>(s).settle();
    stage();
    Newest {
        position: [even, odd],
        squares,
        force: [force_even, force_odd],
        total: [total_even, total_odd],
        sums,
    }
}

/// [`super::lanes::twice_integrated`], packed.
#[inline(always)]
fn twice_integrated<P: Packed>(k: usize, pull: P) -> P {
    let (factor, rest) = TWICE_INTEGRATED[k];
    let factor = P::from_f64(factor);
    if k < REST_MATTERS { pull.mul_add(factor, pull * P::from_f64(rest)) } else { pull * factor }
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
