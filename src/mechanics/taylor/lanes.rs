//! The recurrences, one trajectory a lane.

use std::sync::atomic::{Ordering, compiler_fence};

use super::opening::{Leading, Opening};
use super::tables::{CORIOLIS, REST_MATTERS, TWICE_INTEGRATED, WEIGHTS};
use super::{ORDER, Primaries, Series, TERMS, step};
use crate::arithmetic::{Lanes, Quad, Real};

/// Series of as many trajectories as the arrays `A` have values; see [`super::Series`].
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub(crate) struct LaneSeries<A> {
    pub(super) position: [[A; 3]; TERMS],
    pub(super) half_square: [[A; 2]; TERMS],
    pub(super) force: [[A; 2]; TERMS],
    pub(super) total: [A; TERMS],
    pub(super) side: A,
    pub(super) jacobi: A,
    pub(super) log2_radius: A,
}

impl<A: Copy + AsRef<[f64]>> LaneSeries<A> {
    pub(super) fn new(zero: A) -> Self {
        Self {
            position: [[zero; 3]; TERMS],
            half_square: [[zero; 2]; TERMS],
            force: [[zero; 2]; TERMS],
            total: [zero; TERMS],
            side: zero,
            jacobi: zero,
            log2_radius: zero,
        }
    }

    /// Coefficient `k` of an axis.
    #[inline(always)]
    fn position<L: Lanes<Array = A>>(&self, k: usize, axis: usize) -> L {
        L::from_array(&self.position[k][axis])
    }

    /// The sum of the last coefficients: one that has overflowed spoils all later ones.
    #[inline(always)]
    pub(super) fn newest<L: Lanes<Array = A>>(&self) -> L {
        let size = |k: usize| {
            let [x, y, z] = [0, 1, 2].map(|i| L::from_array(&self.position[k][i]));
            (x + y) + z
        };
        size(TERMS - 2) + size(TERMS - 1)
    }

    /// Writes what events and samples need of a lane's series.
    pub(crate) fn extract(&self, lane: usize, series: &mut Series) {
        for k in 0..TERMS {
            let [d, y, z] = [0, 1, 2].map(|i| self.position[k][i].as_ref()[lane]);
            series.position[k] = Quad([d, y, z, 0.0]);
        }
        for k in 0..ORDER {
            series.set_half_square(k, [0, 1].map(|i| self.half_square[k][i].as_ref()[lane]));
        }
        series.side = self.side.as_ref()[lane];
        series.jacobi = self.jacobi.as_ref()[lane];
        series.log2_radius = self.log2_radius.as_ref()[lane];
    }
}

/// Stages end here for the compiler, which would otherwise keep more coefficients in registers than there are.
#[inline(always)]
pub(super) fn stage() {
    compiler_fence(Ordering::AcqRel);
}

/// Expands the solutions through (x, y, z, vx, vy, vz), whose x is so far from the larger and the smaller primary, into
/// `series`.
#[inline(always)]
pub(super) fn expand<L: Lanes>(
    primaries: &Primaries,
    state: &[L; 6],
    away: [L; 2],
    series: &mut LaneSeries<L::Array>,
) {
    let Opening { leading, position, half_square, force, total, side, jacobi } =
        Opening::new(primaries, state, away);
    for k in 0..position.len() {
        series.position[k] = position[k].map(L::to_array);
    }
    for k in 0..force.len() {
        series.half_square[k] = half_square[k].map(L::to_array);
        series.force[k] = force[k].map(L::to_array);
        series.total[k] = total[k].to_array();
    }
    series.side = side.to_array();
    series.jacobi = jacobi.to_array();
    stage();
    pair::<L, 2>(&leading, side, series, 2);
    pair::<L, 4>(&leading, side, series, 4);
    for k in (LONG..ORDER).step_by(2) {
        pair::<L, LONG>(&leading, side, series, k);
    }
    let size = |k: usize| {
        let [d, y, z] = [0, 1, 2].map(|i| L::from_array(&series.position[k][i]).abs());
        d.max(y).max(z)
    };
    let sizes = step::ESTIMATED_FROM.map(|k| size(k + 1));
    let half_square = L::from_array(&series.half_square[0][0]);
    series.log2_radius = step::log2_radius(sizes, size(1), half_square).to_array();
}

/// From this order on a pair of orders has all kinds of terms.
const LONG: usize = 6;

/// Coefficients of two orders.
#[derive(Clone, Copy)]
struct Pair<T> {
    even: T,
    odd: T,
}

/// From the position's coefficients up to k + 1, those of order k + 2 and k + 3; k is `FORM`, or the `order` from [`LONG`]
/// on, so that the short ones are compiled apart and the long ones share their code, which has to stay in the cache.
#[inline(always)]
fn pair<L: Lanes, const FORM: usize>(
    leading: &Leading<L>,
    side: L,
    s: &mut LaneSeries<L::Array>,
    order: usize,
) {
    let k = if FORM == LONG { order } else { FORM };
    assert!(k >= FORM && k < ORDER);
    let squares = half_squares(side, s, k);
    stage();
    let sums = Sums::new(leading, s, k);
    let forces = forces(leading, s, k, &squares, &sums);
    positions(side, s, k, &sums, &forces);
    stage();
}

/// The half squares of the orders k and k + 1.
#[inline(always)]
fn half_squares<L: Lanes>(side: L, s: &mut LaneSeries<L::Array>, k: usize) -> Pair<[L; 2]> {
    let (zero, half) = (L::from_f64(0.0), L::from_f64(0.5));
    let middle = k / 2;
    let centre: [L; 3] = read(&s.position[middle]);
    // Each coefficient is loaded once and serves two orders.
    let mut newer: [L; 3] = read(&s.position[middle + 1]);
    let (mut even, mut odd) = ([zero; 3], [zero; 3]);
    for i in 0..3 {
        even[i] = (centre[i] * centre[i]) * half;
        odd[i] = centre[i].mul_add(newer[i], zero);
    }
    for (a, b) in s.position[..middle].iter().rev().zip(&s.position[middle + 2..k + 2]) {
        let (a, b): ([L; 3], [L; 3]) = (read(a), read(b));
        for i in 0..3 {
            even[i] = a[i].mul_add(newer[i], even[i]);
            odd[i] = a[i].mul_add(b[i], odd[i]);
        }
        newer = b;
    }
    let (even, odd) = ((even[0] + even[1]) + even[2], (odd[0] + odd[1]) + odd[2]);
    let even = [even, side.mul_add(s.position::<L>(k, 0), even)];
    let odd = [odd, side.mul_add(s.position::<L>(k + 1, 0), odd)];
    s.half_square[k] = [even[0].to_array(), even[1].to_array()];
    s.half_square[k + 1] = [odd[0].to_array(), odd[1].to_array()];
    Pair { even, odd }
}

/// Sums of two orders: products of forces with positions, and of squares with forces, all taken away from 0. The terms
/// come in the order in which their factors become known, where one trajectory waits for them.
struct Sums<L> {
    pull: Pair<[L; 3]>,
    force: Pair<[L; 2]>,
}

impl<L: Lanes> Sums<L> {
    #[inline(always)]
    fn new(leading: &Leading<L>, s: &LaneSeries<L::Array>, k: usize) -> Self {
        let zero = L::from_f64(0.0);
        let mut sums = Self {
            pull: Pair { even: [zero; 3], odd: [zero; 3] },
            force: Pair { even: [zero; 2], odd: [zero; 2] },
        };
        sums.add_old(s, k);
        if k > 4 {
            sums.add_pull(s, k, 3);
            sums.add_pull(s, k, 2);
        }
        if k > 2 {
            sums.add_pull(s, k, k - 2);
            sums.add_pull(s, k, k - 1);
        }
        sums.add_pull(s, k, 1);
        for i in 0..3 {
            let pull = &mut sums.pull;
            pull.even[i] = leading.pull[i].neg_mul_add(s.position(k, i), pull.even[i]);
            pull.odd[i] = leading.pull[i].neg_mul_add(s.position(k + 1, i), pull.odd[i]);
        }

        if k > 4 {
            sums.add_force(s, k, k - 3);
        }
        if k > 2 {
            sums.add_force(s, k, k - 2);
        }
        // The even order's term of force 1; the odd one's waits for the newest half square.
        let weight = L::from_f64(WEIGHTS[k][k - 1]);
        for i in 0..2 {
            let weighted = weight * L::from_array(&s.half_square[k - 1][i]);
            sums.force.even[i] = weighted.neg_mul_add(L::from_array(&s.force[1][i]), sums.force.even[i]);
        }
        if k > 4 {
            sums.add_force(s, k, 2);
        }
        if k > 2 {
            sums.add_force(s, k, 1);
        }
        sums
    }

    /// The terms in between.
    #[inline(always)]
    fn add_old(&mut self, s: &LaneSeries<L::Array>, k: usize) {
        if k <= LONG {
            return;
        }
        let Self { pull, force } = self;
        let pulls = s.total[4..k - 2].iter().rev().zip(&s.position[4..k - 2]);
        let weights = WEIGHTS[k][3..k - 3].iter().zip(&WEIGHTS[k + 1][4..k - 2]).rev();
        let forces = s.half_square[3..k - 3].iter().rev().zip(&s.force[4..k - 2]);
        let mut older: [L; 3] = read(&s.position[3]);
        let mut newer: [L; 2] = read(&s.half_square[k - 3]);
        for (((total, p), (even, odd)), (h, w)) in pulls.zip(weights).zip(forces) {
            let (total, p) = (L::from_array(total), read(p));
            for i in 0..3 {
                pull.even[i] = total.neg_mul_add(older[i], pull.even[i]);
                pull.odd[i] = total.neg_mul_add(p[i], pull.odd[i]);
            }
            older = p;
            let (even, odd): (L, L) = (L::from_f64(*even), L::from_f64(*odd));
            let (h, w): ([L; 2], [L; 2]) = (read(h), read(w));
            for i in 0..2 {
                force.even[i] = (even * h[i]).neg_mul_add(w[i], force.even[i]);
                force.odd[i] = (odd * newer[i]).neg_mul_add(w[i], force.odd[i]);
            }
            newer = h;
        }
    }

    #[inline(always)]
    fn add_pull(&mut self, s: &LaneSeries<L::Array>, k: usize, j: usize) {
        let total = L::from_array(&s.total[j]);
        for i in 0..3 {
            self.pull.even[i] = total.neg_mul_add(s.position(k - j, i), self.pull.even[i]);
            self.pull.odd[i] = total.neg_mul_add(s.position(k + 1 - j, i), self.pull.odd[i]);
        }
    }

    #[inline(always)]
    fn add_force(&mut self, s: &LaneSeries<L::Array>, k: usize, j: usize) {
        let (even, odd) = (L::from_f64(WEIGHTS[k][j]), L::from_f64(WEIGHTS[k + 1][j + 1]));
        for i in 0..2 {
            let force = L::from_array(&s.force[k - j][i]);
            let (h, next) = (L::from_array(&s.half_square[j][i]), L::from_array(&s.half_square[j + 1][i]));
            self.force.even[i] = (even * h).neg_mul_add(force, self.force.even[i]);
            self.force.odd[i] = (odd * next).neg_mul_add(force, self.force.odd[i]);
        }
    }
}

/// The forces of the orders k and k + 1, and their totals.
#[inline(always)]
fn forces<L: Lanes>(
    leading: &Leading<L>,
    s: &mut LaneSeries<L::Array>,
    k: usize,
    squares: &Pair<[L; 2]>,
    sums: &Sums<L>,
) -> Pair<[L; 2]> {
    let zero = L::from_f64(0.0);
    let (mut even, mut odd) = ([zero; 2], [zero; 2]);
    let (bend, tilt) = (L::from_f64(WEIGHTS[k + 1][1]), L::from_f64(WEIGHTS[k + 1][k]));
    for i in 0..2 {
        let (mut settled, mut settled_odd) =
            (sums.force.even[i] * leading.inverse[i], sums.force.odd[i] * leading.inverse[i]);
        if i == 1 {
            settled = leading.far_slope.mul_add(s.position(k, 0), settled);
            settled_odd = leading.far_slope.mul_add(s.position(k + 1, 0), settled_odd);
        }
        even[i] = squares.even[0].mul_add(leading.slope[i], settled);
        let bent = (bend * leading.bend[i]).neg_mul_add(even[i], settled_odd);
        let tilted = (tilt * leading.tilt[i]).neg_mul_add(squares.even[i], bent);
        odd[i] = squares.odd[0].mul_add(leading.slope[i], tilted);
    }
    s.force[k] = [even[0].to_array(), even[1].to_array()];
    s.force[k + 1] = [odd[0].to_array(), odd[1].to_array()];
    Pair { even, odd }
}

/// The newest terms of the products, and the position two orders on.
#[inline(always)]
fn positions<L: Lanes>(
    side: L,
    s: &mut LaneSeries<L::Array>,
    k: usize,
    sums: &Sums<L>,
    forces: &Pair<[L; 2]>,
) {
    let Pair { even: mut pull, odd: mut next_pull } = sums.pull;
    let (total, next_total) = (forces.even[0] + forces.even[1], forces.odd[0] + forces.odd[1]);
    s.total[k] = total.to_array();
    s.total[k + 1] = next_total.to_array();

    let turn = L::from_f64(CORIOLIS[k]);
    pull[0] = side.neg_mul_add(forces.even[1], pull[0]);
    for i in 0..3 {
        pull[i] = total.neg_mul_add(s.position(0, i), pull[i]);
    }
    pull[0] = s.position::<L>(k + 1, 1).mul_add(turn, pull[0]);
    pull[1] = s.position::<L>(k + 1, 0).neg_mul_add(turn, pull[1]);
    let mut even = pull;
    for i in 0..3 {
        even[i] = twice_integrated(k, pull[i]);
        s.position[k + 2][i] = even[i].to_array();
    }

    for i in 0..3 {
        next_pull[i] = total.neg_mul_add(s.position(1, i), next_pull[i]);
    }
    next_pull[0] = side.neg_mul_add(forces.odd[1], next_pull[0]);
    for i in 0..3 {
        next_pull[i] = next_total.neg_mul_add(s.position(0, i), next_pull[i]);
    }
    let turn = L::from_f64(CORIOLIS[k + 1]);
    next_pull[0] = even[1].mul_add(turn, next_pull[0]);
    next_pull[1] = even[0].neg_mul_add(turn, next_pull[1]);
    for i in 0..3 {
        s.position[k + 3][i] = twice_integrated(k + 1, next_pull[i]).to_array();
    }
}

#[inline(always)]
fn read<L: Lanes, const N: usize>(from: &[L::Array; N]) -> [L; N] {
    std::array::from_fn(|i| L::from_array(&from[i]))
}

/// Coefficient k + 2 of the position from coefficient k of the acceleration.
#[inline(always)]
pub(super) fn twice_integrated<R: Real>(k: usize, acceleration: R) -> R {
    let (factor, rest) = TWICE_INTEGRATED[k];
    let factor = R::from_f64(factor);
    if REST_MATTERS.contains(&k) {
        acceleration.mul_add(factor, acceleration * R::from_f64(rest))
    } else {
        acceleration * factor
    }
}

/// What position and velocity change by within `time`.
#[inline(always)]
pub(super) fn change<L: Lanes>(position: &[[L::Array; 3]; TERMS], time: L) -> [L; 6] {
    let mut all = [time; 6];
    for i in 0..3 {
        [all[i], all[i + 3]] = super::horner(time, |k| L::from_array(&position[k][i]));
    }
    all
}
