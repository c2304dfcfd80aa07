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
    for k in (6..ORDER).step_by(2) {
        pair::<L, 6>(&leading, side, series, k);
    }
    let size = |k: usize| {
        let [d, y, z] = [0, 1, 2].map(|i| L::from_array(&series.position[k][i]).abs());
        d.max(y).max(z)
    };
    let sizes = step::ESTIMATED_FROM.map(|k| size(k + 1));
    let half_square = L::from_array(&series.half_square[0][0]);
    series.log2_radius = step::log2_radius(sizes, size(1), half_square).to_array();
}

/// From the position's coefficients up to `K` + 1, those of order `K` + 2 and `K` + 3.
#[inline(always)]
fn pair<L: Lanes, const FORM: usize>(leading: &Leading<L>, side: L, s: &mut LaneSeries<L::Array>, k: usize) {
    let K = if FORM == 6 { k } else { FORM };
    assert!(K >= FORM && K < ORDER);
    let zero = L::from_f64(0.0);
    let p = |s: &LaneSeries<L::Array>, k: usize, i: usize| L::from_array(&s.position[k][i]);
    let middle = K / 2;
    let mut even = [0, 1, 2].map(|i| (p(s, middle, i) * p(s, middle, i)) * L::from_f64(0.5));
    let mut odd = [0, 1, 2].map(|i| p(s, middle, i).mul_add(p(s, middle + 1, i), zero));
    // Each coefficient is loaded once and serves two orders.
    let mut newer = read(&s.position[middle + 1]);
    for (a, b) in s.position[..middle].iter().rev().zip(&s.position[middle + 2..K + 2]) {
        let (a, b): ([L; 3], [L; 3]) = (read(a), read(b));
        for i in 0..3 {
            even[i] = a[i].mul_add(newer[i], even[i]);
            odd[i] = a[i].mul_add(b[i], odd[i]);
        }
        newer = b;
    }
    let (near_even, near_odd) = ((even[0] + even[1]) + even[2], (odd[0] + odd[1]) + odd[2]);
    let far_even = side.mul_add(p(s, K, 0), near_even);
    s.half_square[K] = [near_even, far_even].map(L::to_array);
    s.half_square[K + 1] = [near_odd, side.mul_add(p(s, K + 1, 0), near_odd)].map(L::to_array);
    stage();

    // The oldest coefficients first, as where they fill the time that the newest take.
    let g = |k: usize| L::from_array(&s.total[k]);
    let (mut pull_even, mut pull_odd) = ([None; 3], [None; 3]);
    macro_rules! pull {
        ($j:expr) => {{
            let j = $j;
            for i in 0..3 {
                pull_even[i] = plus(pull_even[i], g(j), p(s, K - j, i));
                pull_odd[i] = plus(pull_odd[i], g(j), p(s, K + 1 - j, i));
            }
        }};
    }
    let h = |k: usize, i: usize| L::from_array(&s.half_square[k][i]);
    let w = |k: usize, i: usize| L::from_array(&s.force[k][i]);
    let (mut sum_even, mut sum_odd) = ([None; 2], [None; 2]);
    macro_rules! settle {
        ($j:expr) => {{
            let j = $j;
            for i in 0..2 {
                sum_even[i] = plus(sum_even[i], L::from_f64(WEIGHTS[K][j]) * h(j, i), w(K - j, i));
                sum_odd[i] = plus(sum_odd[i], L::from_f64(WEIGHTS[K + 1][j + 1]) * h(j + 1, i), w(K - j, i));
            }
        }};
    }
    if K > 6 {
        pull!(4);
        settle!(3);
        let pulls = s.total[5..K - 2].iter().zip(s.position[3..K - 4].iter().rev());
        let weights = WEIGHTS[K][4..K - 3].iter().zip(&WEIGHTS[K + 1][5..K - 2]);
        let settles = s.half_square[5..K - 2].iter().zip(s.force[4..K - 3].iter().rev());
        let mut newer: [L; 3] = read(&s.position[K - 4]);
        let mut older: [L; 2] = read(&s.half_square[4]);
        for (((total, p), (even, odd)), (h, w)) in pulls.zip(weights).zip(settles) {
            let (total, p) = (L::from_array(total), read(p));
            for i in 0..3 {
                pull_even[i] = plus(pull_even[i], total, p[i]);
                pull_odd[i] = plus(pull_odd[i], total, newer[i]);
            }
            newer = p;
            let (even, odd): (L, L) = (L::from_f64(*even), L::from_f64(*odd));
            let (h, w): ([L; 2], [L; 2]) = (read(h), read(w));
            for i in 0..2 {
                sum_even[i] = plus(sum_even[i], even * older[i], w[i]);
                sum_odd[i] = plus(sum_odd[i], odd * h[i], w[i]);
            }
            older = h;
        }
    }
    if K > 4 {
        pull!(3);
        pull!(2);
    }
    if K > 2 {
        pull!(K - 2);
        pull!(K - 1);
    }
    pull!(1);
    let mut pull_even = [0, 1, 2].map(|i| leading.pull[i].mul_add(p(s, K, i), sum(pull_even[i])));
    let mut pull_odd = [0, 1, 2].map(|i| leading.pull[i].mul_add(p(s, K + 1, i), sum(pull_odd[i])));

    if K > 4 {
        settle!(K - 3);
        settle!(K - 2);
        settle!(2);
    } else if K > 2 {
        settle!(K - 2);
    }
    if K > 2 {
        settle!(1);
    }
    let settled = |sums: [Option<L>; 2], i: usize| sums[i].map_or(zero, |sum| sum * leading.inverse[i]);
    let mut force_even = [0, 1].map(|i| {
        let tilt = L::from_f64(WEIGHTS[K][K - 1]) * leading.tilt[i];
        tilt.mul_add(h(K - 1, i), settled(sum_even, i))
    });
    force_even[1] = leading.far_slope.mul_add(p(s, K, 0), force_even[1]);
    let force_even = [0, 1].map(|i| near_even.mul_add(leading.slope[i], force_even[i]));
    let mut force_odd = [0, 1].map(|i| settled(sum_odd, i));
    force_odd[1] = leading.far_slope.mul_add(p(s, K + 1, 0), force_odd[1]);
    let force_odd = [0, 1].map(|i| {
        let bend = L::from_f64(WEIGHTS[K + 1][1]) * leading.bend[i];
        let tilt = L::from_f64(WEIGHTS[K + 1][K]) * leading.tilt[i];
        let settled = tilt.mul_add([near_even, far_even][i], bend.mul_add(force_even[i], force_odd[i]));
        near_odd.mul_add(leading.slope[i], settled)
    });
    let (total_even, total_odd) = (force_even[0] + force_even[1], force_odd[0] + force_odd[1]);
    s.force[K] = force_even.map(L::to_array);
    s.force[K + 1] = force_odd.map(L::to_array);
    s.total[K] = total_even.to_array();
    s.total[K + 1] = total_odd.to_array();

    // The newest terms of the products, and the position two orders on.
    let turn = L::from_f64(CORIOLIS[K]);
    pull_even[0] = side.mul_add(force_even[1], pull_even[0]);
    for i in 0..3 {
        pull_even[i] = total_even.mul_add(p(s, 0, i), pull_even[i]);
    }
    pull_even[0] = p(s, K + 1, 1).neg_mul_add(turn, pull_even[0]);
    pull_even[1] = p(s, K + 1, 0).mul_add(turn, pull_even[1]);
    let even = [0, 1, 2].map(|i| twice_integrated(K, pull_even[i]));
    s.position[K + 2] = even.map(L::to_array);

    for i in 0..3 {
        pull_odd[i] = total_even.mul_add(p(s, 1, i), pull_odd[i]);
    }
    pull_odd[0] = side.mul_add(force_odd[1], pull_odd[0]);
    for i in 0..3 {
        pull_odd[i] = total_odd.mul_add(p(s, 0, i), pull_odd[i]);
    }
    let turn = L::from_f64(CORIOLIS[K + 1]);
    pull_odd[0] = even[1].neg_mul_add(turn, pull_odd[0]);
    pull_odd[1] = even[0].mul_add(turn, pull_odd[1]);
    s.position[K + 3] = pull_odd.map(|pull| twice_integrated(K + 1, pull).to_array());
    stage();
}

#[inline(always)]
fn read<L: Lanes, const N: usize>(from: &[L::Array; N]) -> [L; N] {
    std::array::from_fn(|i| L::from_array(&from[i]))
}

/// The sum with one more product; none is one that has not begun.
#[inline(always)]
pub(super) fn plus<R: Real>(sum: Option<R>, a: R, b: R) -> Option<R> {
    Some(match sum {
        Some(sum) => a.mul_add(b, sum),
        None => a * b,
    })
}

/// A sum that has begun.
#[inline(always)]
pub(super) fn sum<R: Real>(sum: Option<R>) -> R {
    sum.unwrap_or_else(|| R::from_f64(0.0))
}

/// Coefficient k + 2 of the position from coefficient k of the pull.
#[inline(always)]
pub(super) fn twice_integrated<R: Real>(k: usize, pull: R) -> R {
    let (factor, rest) = TWICE_INTEGRATED[k];
    let factor = R::from_f64(factor);
    if k < REST_MATTERS { pull.mul_add(factor, pull * R::from_f64(rest)) } else { pull * factor }
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
