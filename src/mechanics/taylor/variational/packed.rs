//! One trajectory, its columns side by side.

use super::{Layout, ORDER, Registers, TERMS, expand_column};
use crate::arithmetic::sum::Compensated;
use crate::arithmetic::{Lanes, Packed, Quad, Real};
use crate::taylor::{Series, horner};
use std::marker::PhantomData;

/// Six columns and two lanes of nothing.
type Row = [f64; 8];

/// A matrix with rows x, y, z, vx, vy, vz, and what its rounding lost.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Transition {
    value: [Row; 6],
    rest: [Row; 6],
}

impl Transition {
    /// The identity.
    #[must_use]
    pub fn identity() -> Self {
        let mut value = [[0.0; 8]; 6];
        for (i, row) in value.iter_mut().enumerate() {
            row[i] = 1.0;
        }
        Self { value, rest: [[0.0; 8]; 6] }
    }

    /// An element.
    #[must_use]
    pub fn get(&self, row: usize, column: usize) -> Compensated {
        Compensated { value: self.value[row][column], rest: self.rest[row][column] }
    }

    /// Sets an element.
    pub fn set(&mut self, row: usize, column: usize, to: Compensated) {
        self.value[row][column] = to.value;
        self.rest[row][column] = to.rest;
    }

    /// [`Compensated::plus`] for some columns of a row.
    #[inline(always)]
    fn add<L: Lanes>(&mut self, row: usize, at: usize, increment: L) {
        let value = L::read(&self.value[row][at..]);
        let rest = L::read(&self.rest[row][at..]) + increment;
        let sum = value + rest;
        let of_rest = sum - value;
        sum.write(&mut self.value[row][at..]);
        ((value - (sum - of_rest)) + (rest - of_rest)).write(&mut self.rest[row][at..]);
    }
}

/// Taylor series of the six columns and of the gradient they share.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub struct Columns {
    /// Coefficients of x, y and z of the six columns.
    position: [[Row; 3]; TERMS],
    /// q and p.
    steep: [[f64; 2]; TERMS],
    /// q + p.
    total: [f64; TERMS],
    /// (q + p) d + side · p in x, (q + p) y, (q + p) z.
    lever: [Quad<f64>; TERMS],
    /// y, y and z of that, and p.
    others: [Quad<f64>; TERMS],
    /// y, z, z and d of the trajectory.
    shuffled: [Quad<f64>; TERMS],
    /// xx, xy, xz, yy, yz, zz of the gradient.
    gradient: [[f64; 6]; TERMS],
}

impl Columns {
    /// Room for the series.
    #[must_use]
    pub fn new() -> Self {
        let none = Quad::splat(0.0);
        Self {
            position: [[[0.0; 8]; 3]; TERMS],
            steep: [[0.0; 2]; TERMS],
            total: [0.0; TERMS],
            lever: [none; TERMS],
            others: [none; TERMS],
            shuffled: [none; TERMS],
            gradient: [[0.0; 6]; TERMS],
        }
    }
}

impl Columns {
    /// Whether no coefficient has overflowed: one that has spoils all later ones.
    #[must_use]
    pub fn is_finite(&self) -> bool {
        let size = |k: usize, column: usize| {
            let [x, y, z] = &self.position[k];
            (x[column] + y[column]) + z[column]
        };
        (0..6).all(|column| (size(TERMS - 2, column) + size(TERMS - 1, column)).is_finite())
    }
}

impl Default for Columns {
    fn default() -> Self {
        Self::new()
    }
}

/// Some of the columns, from `at` on.
struct SideBySide<L> {
    at: usize,
    lanes: PhantomData<L>,
}

impl<L: Lanes> Layout for SideBySide<L> {
    const BOTH: bool = L::COUNT == 8;
    type Value = L;
    type Gradient = [f64; 6];
    type Column = [Row; 3];

    #[inline(always)]
    fn gradient(&self, from: &[f64; 6]) -> [L; 6] {
        std::array::from_fn(|i| L::from_f64(from[i]))
    }

    #[inline(always)]
    fn read(&self, from: &[Row; 3]) -> [L; 3] {
        std::array::from_fn(|i| L::read(&from[i][self.at..]))
    }

    #[inline(always)]
    fn write(&self, coefficient: [L; 3], to: &mut [Row; 3]) {
        for i in 0..3 {
            coefficient[i].write(&mut to[i][self.at..]);
        }
    }
}

/// Expands the columns of `matrix` along `series`.
#[inline(always)]
pub(in super::super) fn expand<T: Registers>(series: &Series, matrix: &Transition, columns: &mut Columns) {
    super::super::dispatch::align_stack();
    for axis in 0..3 {
        columns.position[0][axis] = matrix.value[axis];
        columns.position[1][axis] = matrix.value[axis + 3];
    }
    gradient::<T::Gradient>(series, columns);
    for at in (0..8).step_by(T::Column::COUNT) {
        let layout = SideBySide { at, lanes: PhantomData::<T::Column> };
        expand_column(&layout, &columns.gradient, &mut columns.position);
    }
}

/// The gradient, several convolutions at a time.
#[inline(always)]
fn gradient<P: Packed>(s: &Series, c: &mut Columns) {
    for k in 0..ORDER {
        P::load(&s.position[k]).bcca().store(&mut c.shuffled[k]);
    }
    let [near, far] = s.half_square(0).map(|half_square| 1.0 / half_square);
    let inverse = P::twice(&[near, far]);
    let bend = P::twice(&s.half_square(1));
    for k in (0..ORDER).step_by(2) {
        steepen::<P>(s, c, k, inverse, bend);
        pull_levers::<P>(s, c, k);
        grade::<P>(s, c, k);
    }
}

/// Orders `k` and `k` + 1 of q and p.
#[inline(always)]
fn steepen<P: Packed>(s: &Series, c: &mut Columns, k: usize, inverse: P, bend: P) {
    let mut sums = P::from_f64(0.0);
    for (squares, steep) in s.squares[1..=k].iter().rev().zip(&c.steep[..k]) {
        sums = P::load(squares).mul_add(P::twice(steep), sums);
    }
    let force = |k: usize| P::twice(&s.force[k]) * P::from_f64(1.5);
    let even = (force(k) - sums.low_twice()) * inverse;
    let odd = (force(k + 1) - bend.mul_add(even, sums.high_twice())) * inverse;
    even.low_with_low(odd).store_pairs(&mut c.steep, k);
    c.total[k] = (even + even.swap()).first();
    c.total[k + 1] = (odd + odd.swap()).first();
}

#[inline(always)]
fn pull_levers<P: Packed>(s: &Series, c: &mut Columns, k: usize) {
    let (mut even, mut odd) = (P::from_f64(0.0), P::from_f64(0.0));
    for (&total, positions) in c.total[..=k].iter().zip(s.position[..k + 2].windows(2).rev()) {
        let total = P::from_f64(total);
        even = total.mul_add(P::load(&positions[0]), even);
        odd = total.mul_add(P::load(&positions[1]), odd);
    }
    odd = P::from_f64(c.total[k + 1]).mul_add(P::load(&s.position[0]), odd);
    for (k, lever) in [(k, even), (k + 1, odd)] {
        let far = P::from_f64(c.steep[k][1]);
        let lever = lever.with::<0b0001>(P::from_f64(s.side).mul_add(far, lever));
        lever.store(&mut c.lever[k]);
        lever.bbcd().with::<0b1000>(far).store(&mut c.others[k]);
    }
}

#[inline(always)]
fn grade<P: Packed>(s: &Series, c: &mut Columns, k: usize) {
    let zero = P::from_f64(0.0);
    let (mut along_even, mut along_odd, mut others_even, mut others_odd) = (zero, zero, zero, zero);
    let levers = c.lever[..=k].iter().zip(&c.others[..=k]);
    let positions = s.position[..k + 2].windows(2).zip(c.shuffled[..k + 2].windows(2)).rev();
    for ((lever, others), (positions, shuffled)) in levers.zip(positions) {
        let (lever, others) = (P::from_f64(lever.0[0]), P::load(others));
        along_even = lever.mul_add(P::load(&positions[0]), along_even);
        along_odd = lever.mul_add(P::load(&positions[1]), along_odd);
        others_even = others.mul_add(P::load(&shuffled[0]), others_even);
        others_odd = others.mul_add(P::load(&shuffled[1]), others_odd);
    }
    along_odd = P::from_f64(c.lever[k + 1].0[0]).mul_add(P::load(&s.position[0]), along_odd);
    others_odd = P::load(&c.others[k + 1]).mul_add(P::load(&c.shuffled[0]), others_odd);
    for (k, along, others) in [(k, along_even, others_even), (k + 1, along_odd, others_odd)] {
        let (mut along_x, mut rest) = (Quad::splat(0.0), Quad::splat(0.0));
        along.store(&mut along_x);
        others.store(&mut rest);
        let (Quad([xx, xy, xz, _]), Quad([yy, yz, zz, far_d])) = (along_x, rest);
        let total = s.total[k];
        let diagonal = if k == 0 { 1.0 - total } else { 0.0 - total };
        let offset = s.side.mul_add(far_d, c.steep[k][1]);
        c.gradient[k] = [(xx + offset) + diagonal, xy, xz, yy + diagonal, yz, zz - total];
    }
}

/// Moves the matrix on by `time` along its columns.
#[inline(always)]
pub(in super::super) fn advance<T: Registers>(c: &Columns, matrix: &mut Transition, time: f64) {
    for at in (0..8).step_by(T::Column::COUNT) {
        for axis in 0..3 {
            let [place, rate] =
                horner(T::Column::from_f64(time), |k| T::Column::read(&c.position[k][axis][at..]));
            matrix.add(axis, at, place);
            matrix.add(axis + 3, at, rate);
        }
    }
}
