//! The variational equations along a series; see [`super::super::variational`] for the formulas.

use super::recurrence::{TWICE_INTEGRATED, number};
use super::{ORDER, Pairs, Series, TERMS, Wide};
use crate::arithmetic::{DoubleDouble, Packed, Quad, SumOfProducts};

/// Six columns of the matrix and two lanes of nothing.
type Row = [Wide; 2];

#[inline(always)]
fn row([a, b, c, d, e, f]: [DoubleDouble; 6]) -> Row {
    let zero = DoubleDouble::default();
    [Wide::of([a, b, c, d]), Wide::of([e, f, zero, zero])]
}

/// Taylor series of the six columns and of the gradient they share, in powers of the time in trial steps.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Columns {
    /// x, y and z of the six columns.
    pub(super) position: [[Row; 3]; TERMS],
    /// 3 n/r² of the nearer, 3 f/r² of the farther primary.
    steep: Pairs,
    /// (q + p) d + side · p in x, (q + p) y, (q + p) z.
    lever: [Wide; TERMS],
    /// y, z, z and d of the trajectory.
    shuffled: [Wide; TERMS],
    /// xx, xy, xz, yy, yz, zz of the gradient.
    gradient: [[DoubleDouble; 6]; TERMS],
}

impl Columns {
    /// Room for the series.
    #[must_use]
    pub fn new() -> Self {
        let none = Wide::splat(DoubleDouble::default());
        Self {
            position: [[[none; 2]; 3]; TERMS],
            steep: Pairs::new(),
            lever: [none; TERMS],
            shuffled: [none; TERMS],
            gradient: [[DoubleDouble::default(); 6]; TERMS],
        }
    }
}

impl Default for Columns {
    fn default() -> Self {
        Self::new()
    }
}

/// Expands the columns of `matrix` (rows x, y, z, vx, vy, vz) along `series`.
#[inline(always)]
pub(super) fn expand<P: Packed>(series: &Series, matrix: &[[DoubleDouble; 6]; 6], columns: &mut Columns) {
    gradient::<P>(series, columns);
    let [x, y, z, vx, vy, vz] = matrix.map(row);
    let trial_step = Quad::splat(series.trial_step);
    columns.position[0] = [x, y, z];
    columns.position[1] = [vx, vy, vz].map(|row| row.map(|half| half.scaled(trial_step)));
    for k in 0..ORDER {
        order::<P>(columns, k, series.trial_step);
    }
}

#[inline(always)]
fn gradient<P: Packed>(s: &Series, c: &mut Columns) {
    let [near, far] = s.half_square.at(0);
    let inverse = [DoubleDouble::from(1.0) / near, DoubleDouble::from(1.0) / far];
    for k in 0..ORDER {
        let place = s.position[k];
        c.shuffled[k] = Wide::of([place.lane(1), place.lane(2), place.lane(2), place.lane(0)]);
    }
    for k in 0..ORDER {
        // 2h · q = 3 n, so h_0 q_k = 3/2 n_k − Σ h_j q_{k−j}.
        let mut sum = SumOfProducts::<P>::none();
        for j in 1..=k {
            sum = sum.and(s.half_square.twice(j), c.steep.twice(k - j));
        }
        let sum = sum.total().stored();
        let force = s.force.at(k);
        let steep = [
            (force[0].times(1.5) - sum.lane(0)) * inverse[0],
            (force[1].times(1.5) - sum.lane(1)) * inverse[1],
        ];
        c.steep.set(k, steep);

        let mut lever = SumOfProducts::<P>::none();
        for j in 0..=k {
            let [near, far] = c.steep.at(j);
            lever = lever.and(DoubleDouble::splat(near + far), s.position[k - j].load());
        }
        let zero = DoubleDouble::default();
        c.lever[k] = lever.total().stored() + Wide::of([steep[1].scaled(s.side), zero, zero, zero]);

        let mut along_x = SumOfProducts::<P>::none();
        let mut others = SumOfProducts::<P>::none();
        for j in 0..=k {
            let lever = c.lever[j];
            along_x = along_x.and(DoubleDouble::splat(lever.lane(0)), s.position[k - j].load());
            let factors = [lever.lane(1), lever.lane(1), lever.lane(2), c.steep.at(j)[1]];
            others = others.and(Wide::of(factors).load(), c.shuffled[k - j].load());
        }
        let (along_x, others) = (along_x.total().stored(), others.total().stored());
        let total = s.total[k];
        let diagonal = if k == 0 { DoubleDouble::from(1.0) - total } else { -total };
        let offset = others.lane(3).scaled(s.side) + steep[1];
        c.gradient[k] = [
            (along_x.lane(0) + offset) + diagonal,
            along_x.lane(1),
            along_x.lane(2),
            others.lane(0) + diagonal,
            others.lane(1),
            others.lane(2) - total,
        ];
    }
}

/// From the columns' coefficients up to k + 1, those of order k + 2.
#[inline(always)]
fn order<P: Packed>(c: &mut Columns, k: usize, trial_step: f64) {
    let (before, after) = c.position.split_at_mut(k + 2);
    let (rates, next) = (&before[k + 1], &mut after[0]);
    let integrated = Wide::splat(TWICE_INTEGRATED[k].scaled(trial_step * trial_step));
    let turn = Quad::splat(2.0 * number(k + 1) / trial_step);
    for half in 0..2 {
        let mut sums = [SumOfProducts::<P>::none(); 3];
        for j in 0..=k {
            let [xx, xy, xz, yy, yz, zz] = &c.gradient[j];
            let (xy, xz, yz) = (DoubleDouble::splat(*xy), DoubleDouble::splat(*xz), DoubleDouble::splat(*yz));
            let [x, y, z] = &before[k - j];
            let (x, y, z) = (x[half].load(), y[half].load(), z[half].load());
            sums[0] = sums[0].and(DoubleDouble::splat(*xx), x).and(xy, y).and(xz, z);
            sums[1] = sums[1].and(xy, x).and(DoubleDouble::splat(*yy), y).and(yz, z);
            sums[2] = sums[2].and(xz, x).and(yz, y).and(DoubleDouble::splat(*zz), z);
        }
        let [x, y, z] = [sums[0].total().stored(), sums[1].total().stored(), sums[2].total().stored()];
        next[0][half] = (x + rates[1][half].times(turn)) * integrated;
        next[1][half] = (y - rates[0][half].times(turn)) * integrated;
        next[2][half] = z * integrated;
    }
}
