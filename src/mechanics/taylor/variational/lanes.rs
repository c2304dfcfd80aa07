//! One trajectory a lane.

use super::super::lanes::LaneSeries;
use super::{Layout, ORDER, TERMS, expand_column};
use crate::arithmetic::Lanes;
use std::marker::PhantomData;

/// Taylor series of the columns, six one after the other, and of the gradient they share.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub(crate) struct LaneColumns<A> {
    /// By column, order and axis.
    pub(in super::super) position: [[[A; 3]; TERMS]; 6],
    steep: [[A; 2]; TERMS],
    total: [A; TERMS],
    lever: [[A; 3]; TERMS],
    gradient: [[A; 6]; TERMS],
}

struct InLanes<L>(PhantomData<L>);

impl<L: Lanes> Layout for InLanes<L> {
    const BOTH: bool = L::COUNT == 8;
    type Value = L;
    type Gradient = [L::Array; 6];
    type Column = [L::Array; 3];

    #[inline(always)]
    fn gradient(&self, from: &[L::Array; 6]) -> [L; 6] {
        std::array::from_fn(|i| L::from_array(&from[i]))
    }

    #[inline(always)]
    fn read(&self, from: &[L::Array; 3]) -> [L; 3] {
        std::array::from_fn(|i| L::from_array(&from[i]))
    }

    #[inline(always)]
    fn write(&self, coefficient: [L; 3], to: &mut [L::Array; 3]) {
        for i in 0..3 {
            to[i] = coefficient[i].to_array();
        }
    }
}

impl<A: Copy + AsRef<[f64]> + AsMut<[f64]>> LaneColumns<A> {
    pub(in super::super) fn new(zero: A) -> Self {
        Self {
            position: [[[zero; 3]; TERMS]; 6],
            steep: [[zero; 2]; TERMS],
            total: [zero; TERMS],
            lever: [[zero; 3]; TERMS],
            gradient: [[zero; 6]; TERMS],
        }
    }

    /// The sum of a column's last coefficients: one that has overflowed spoils all later ones.
    #[inline(always)]
    pub(in super::super) fn newest<L: Lanes<Array = A>>(&self, column: usize) -> L {
        let size = |k: usize| {
            let [x, y, z] = &self.position[column][k];
            (L::from_array(x) + L::from_array(y)) + L::from_array(z)
        };
        size(TERMS - 2) + size(TERMS - 1)
    }

    /// Expands the column through (x, y, z, vx, vy, vz) along the gradient.
    #[inline(always)]
    pub(in super::super) fn expand_column<L: Lanes<Array = A>>(&mut self, column: usize, start: [L; 6]) {
        let [x, y, z, vx, vy, vz] = start.map(L::to_array);
        self.position[column][0] = [x, y, z];
        self.position[column][1] = [vx, vy, vz];
        expand_column(&InLanes::<L>(PhantomData), &self.gradient, &mut self.position[column]);
    }

    /// Expands the gradient along the series.
    #[inline(always)]
    pub(in super::super) fn expand_gradient<L: Lanes<Array = A>>(&mut self, s: &LaneSeries<A>) {
        let half_square = |k: usize, i: usize| L::from_array(&s.half_square[k][i]);
        let inverse = [0, 1].map(|i| L::from_f64(1.0) / half_square(0, i));
        let bend = [0, 1].map(|i| half_square(1, i));
        for k in (0..ORDER).step_by(2) {
            self.steepen::<L>(s, k, inverse, bend);
            self.pull_levers::<L>(s, k);
            self.grade::<L>(s, k);
        }
    }

    #[inline(always)]
    fn steepen<L: Lanes<Array = A>>(&mut self, s: &LaneSeries<A>, k: usize, inverse: [L; 2], bend: [L; 2]) {
        let zero = L::from_f64(0.0);
        let (mut even, mut odd) = ([zero; 2], [zero; 2]);
        for (squares, steep) in s.half_square[1..k + 2].windows(2).rev().zip(&self.steep[..k]) {
            for i in 0..2 {
                let steep = L::from_array(&steep[i]);
                even[i] = L::from_array(&squares[0][i]).mul_add(steep, even[i]);
                odd[i] = L::from_array(&squares[1][i]).mul_add(steep, odd[i]);
            }
        }
        let force = |k: usize, i: usize| L::from_array(&s.force[k][i]) * L::from_f64(1.5);
        let even = [0, 1].map(|i| (force(k, i) - even[i]) * inverse[i]);
        let odd = [0, 1].map(|i| (force(k + 1, i) - bend[i].mul_add(even[i], odd[i])) * inverse[i]);
        self.steep[k] = even.map(L::to_array);
        self.steep[k + 1] = odd.map(L::to_array);
        self.total[k] = (even[0] + even[1]).to_array();
        self.total[k + 1] = (odd[0] + odd[1]).to_array();
    }

    #[inline(always)]
    fn pull_levers<L: Lanes<Array = A>>(&mut self, s: &LaneSeries<A>, k: usize) {
        let zero = L::from_f64(0.0);
        let (mut even, mut odd) = ([zero; 3], [zero; 3]);
        for (total, positions) in self.total[..=k].iter().zip(s.position[..k + 2].windows(2).rev()) {
            let total = L::from_array(total);
            for i in 0..3 {
                even[i] = total.mul_add(L::from_array(&positions[0][i]), even[i]);
                odd[i] = total.mul_add(L::from_array(&positions[1][i]), odd[i]);
            }
        }
        let last = L::from_array(&self.total[k + 1]);
        for i in 0..3 {
            odd[i] = last.mul_add(L::from_array(&s.position[0][i]), odd[i]);
        }
        let side = L::from_array(&s.side);
        even[0] = side.mul_add(L::from_array(&self.steep[k][1]), even[0]);
        odd[0] = side.mul_add(L::from_array(&self.steep[k + 1][1]), odd[0]);
        self.lever[k] = even.map(L::to_array);
        self.lever[k + 1] = odd.map(L::to_array);
    }

    #[inline(always)]
    fn grade<L: Lanes<Array = A>>(&mut self, s: &LaneSeries<A>, k: usize) {
        let zero = L::from_f64(0.0);
        // xx, xy, xz, yy, yz, zz, and the farther one's share in d.
        let (mut even, mut odd) = ([zero; 7], [zero; 7]);
        let add = |sums: &mut [L; 7], lever: &[A; 3], steep: &[A; 2], position: &[A; 3]| {
            let [x, y, z] = [0, 1, 2].map(|i| L::from_array(&lever[i]));
            let [d, e, f] = [0, 1, 2].map(|i| L::from_array(&position[i]));
            let far = L::from_array(&steep[1]);
            let factors = [(x, d), (x, e), (x, f), (y, e), (y, f), (z, f), (far, d)];
            for (sum, (a, b)) in sums.iter_mut().zip(factors) {
                *sum = a.mul_add(b, *sum);
            }
        };
        for ((lever, steep), positions) in
            self.lever[..=k].iter().zip(&self.steep[..=k]).zip(s.position[..k + 2].windows(2).rev())
        {
            add(&mut even, lever, steep, &positions[0]);
            add(&mut odd, lever, steep, &positions[1]);
        }
        add(&mut odd, &self.lever[k + 1], &self.steep[k + 1], &s.position[0]);
        for (k, [xx, xy, xz, yy, yz, zz, far_d]) in [(k, even), (k + 1, odd)] {
            let total = L::from_array(&s.total[k]);
            let diagonal = if k == 0 { L::from_f64(1.0) - total } else { zero - total };
            let offset = L::from_array(&s.side).mul_add(far_d, L::from_array(&self.steep[k][1]));
            self.gradient[k] =
                [(xx + offset) + diagonal, xy, xz, yy + diagonal, yz, zz - total].map(L::to_array);
        }
    }
}
