//! Several trajectories at once, one a lane, each with its own step.

use super::lanes::{self, LaneSeries};
use super::variational::{LaneColumns, Transition};
use super::{Primaries, STEP_FLOOR, StepSize};
use crate::arithmetic::Lanes;
use crate::arithmetic::sum::Compensated;

/// Values and what their rounding lost, one a lane.
#[derive(Clone, Copy, Debug)]
#[repr(C, align(64))]
pub(crate) struct Accumulators<A> {
    value: A,
    rest: A,
}

/// Where the trajectories are. A lane without one holds a body that takes steps of no length, having no direction, for ever.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
pub(crate) struct Swarm<A> {
    state: [Accumulators<A>; 6],
    elapsed: Accumulators<A>,
    target: Accumulators<A>,
    direction: A,
    /// Jacobi constants at the start of the legs; NaN before the first step.
    reference: A,
    drift: A,
    /// 1 where each step is watched, else 0.
    watched: A,
    /// The lengths of the steps to come.
    pub(crate) length: A,
    pub(crate) series: LaneSeries<A>,
    matrix: Option<Box<Matrices<A>>>,
}

/// State transition matrices and the series of their columns.
#[derive(Clone, Debug)]
#[repr(C, align(64))]
struct Matrices<A> {
    /// By column and row.
    values: [[Accumulators<A>; 6]; 6],
    columns: LaneColumns<A>,
}

/// Lanes that pause before their step, as bits. All are expanded, none has advanced.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub(crate) struct Pause {
    /// Steps that all lanes have taken.
    pub steps: u64,
    /// Those whose step is the last before the target, is watched, or is no step at all.
    pub lanes: u32,
    /// Those whose step ends at the target.
    pub last: u32,
    /// Those whose step would be too short.
    pub floor: u32,
}

/// Arrays of zeros.
pub(crate) trait Zero {
    const ZERO: Self;
}

impl<const N: usize> Zero for [f64; N] {
    const ZERO: Self = [0.0; N];
}

/// What a lane holds of a trajectory.
#[derive(Clone, Debug)]
pub(crate) struct Lane {
    pub state: [Compensated; 6],
    pub elapsed: Compensated,
    pub target: Compensated,
    pub direction: f64,
    pub reference: Option<f64>,
    pub drift: f64,
    pub watched: bool,
}

impl<A: Copy + AsRef<[f64]> + AsMut<[f64]>> Accumulators<A> {
    fn get(&self, lane: usize) -> Compensated {
        Compensated { value: self.value.as_ref()[lane], rest: self.rest.as_ref()[lane] }
    }

    fn set(&mut self, lane: usize, to: Compensated) {
        self.value.as_mut()[lane] = to.value;
        self.rest.as_mut()[lane] = to.rest;
    }

    /// [`Compensated::plus`] in each lane.
    #[inline(always)]
    fn add<L: Lanes<Array = A>>(&mut self, increment: L) {
        let (value, rest) = (L::from_array(&self.value), L::from_array(&self.rest) + increment);
        let sum = value + rest;
        let of_rest = sum - value;
        self.value = sum.to_array();
        self.rest = ((value - (sum - of_rest)) + (rest - of_rest)).to_array();
    }

    /// [`Compensated::minus`] in each lane.
    #[inline(always)]
    fn minus<L: Lanes<Array = A>>(&self, value: L, rest: L) -> L {
        (L::from_array(&self.value) - value) + (L::from_array(&self.rest) - rest)
    }
}

impl<A: Copy + AsRef<[f64]> + AsMut<[f64]>> Swarm<A> {
    /// Lanes without trajectories, with or without room for matrices.
    pub(crate) fn new(with_matrices: bool) -> Self
    where
        A: Zero,
    {
        let zero = A::ZERO;
        let none = Accumulators { value: zero, rest: zero };
        let matrix = with_matrices
            .then(|| Box::new(Matrices { values: [[none; 6]; 6], columns: LaneColumns::new(zero) }));
        let mut swarm = Self {
            state: [none; 6],
            elapsed: none,
            target: none,
            direction: zero,
            reference: zero,
            drift: zero,
            watched: zero,
            length: zero,
            series: LaneSeries::new(zero),
            matrix,
        };
        for lane in 0..zero.as_ref().len() {
            swarm.rest(lane);
        }
        swarm
    }

    /// Puts a trajectory into a lane.
    pub(crate) fn put(&mut self, lane: usize, from: &Lane) {
        for (place, component) in self.state.iter_mut().zip(from.state) {
            place.set(lane, component);
        }
        self.elapsed.set(lane, from.elapsed);
        self.target.set(lane, from.target);
        self.direction.as_mut()[lane] = from.direction;
        self.reference.as_mut()[lane] = from.reference.unwrap_or(f64::NAN);
        self.drift.as_mut()[lane] = from.drift;
        self.watched.as_mut()[lane] = f64::from(u8::from(from.watched));
    }

    /// Empties a lane.
    pub(crate) fn rest(&mut self, lane: usize) {
        let far_from_both = [0.5, 1.0, 0.0, 0.0, 0.0, 0.0].map(Compensated::new);
        self.put(
            lane,
            &Lane {
                state: far_from_both,
                elapsed: Compensated::default(),
                target: Compensated::new(f64::INFINITY),
                direction: 0.0,
                reference: None,
                drift: 0.0,
                watched: false,
            },
        );
    }

    pub(crate) fn state(&self, lane: usize) -> [Compensated; 6] {
        [0, 1, 2, 3, 4, 5].map(|i| self.state[i].get(lane))
    }

    pub(crate) fn elapsed(&self, lane: usize) -> Compensated {
        self.elapsed.get(lane)
    }

    /// Jacobi constant at the start of the leg, and the largest departure from it.
    pub(crate) fn drift(&self, lane: usize) -> (Option<f64>, f64) {
        let reference = self.reference.as_ref()[lane];
        ((!reference.is_nan()).then_some(reference), self.drift.as_ref()[lane])
    }

    pub(crate) fn put_matrix(&mut self, lane: usize, matrix: &Transition) {
        if let Some(matrices) = &mut self.matrix {
            for row in 0..6 {
                for column in 0..6 {
                    matrices.values[column][row].set(lane, matrix.get(row, column));
                }
            }
        }
    }

    pub(crate) fn get_matrix(&self, lane: usize, matrix: &mut Transition) {
        if let Some(matrices) = &self.matrix {
            for row in 0..6 {
                for column in 0..6 {
                    matrix.set(row, column, matrices.values[column][row].get(lane));
                }
            }
        }
    }

    /// Takes steps in all lanes until one of them needs to be seen to, at most `most`.
    #[inline(always)]
    pub(super) fn run<L: Lanes<Array = A>>(
        &mut self,
        primaries: &Primaries,
        sizes: StepSize,
        most: u64,
    ) -> Pause {
        super::dispatch::align_stack();
        let zero = L::from_f64(0.0);
        let (centre, centre_rest) = (primaries.smaller_x().value, primaries.smaller_x().rest);
        for steps in 0..most {
            let x_rest = L::from_array(&self.state[0].rest);
            let state = [0, 1, 2, 3, 4, 5].map(|i| L::from_array(&self.state[i].value));
            let away = [(primaries.larger_x().value, primaries.larger_x().rest), (centre, centre_rest)]
                .map(|(value, rest)| (state[0] - L::from_f64(value)) + (x_rest - L::from_f64(rest)));
            lanes::expand::<L>(primaries, &state, away, &mut self.series);

            let remaining =
                self.target.minus(L::from_array(&self.elapsed.value), L::from_array(&self.elapsed.rest));
            let step = sizes.at_log2_radius(L::from_array(&self.series.log2_radius));
            let all = (1 << L::COUNT) - 1;
            let last = !step.less(remaining.abs()) & all;
            let finite = |sum: L| sum.abs().less(L::from_f64(f64::INFINITY));
            let mut infinite = !finite(self.series.newest::<L>()) & all;
            if let Some(matrices) = &mut self.matrix {
                matrices.expand::<L>(&self.series);
                for column in 0..6 {
                    infinite |= !finite(matrices.columns.newest::<L>(column)) & all;
                }
            }
            let floor = infinite | (step.less(L::from_f64(STEP_FLOOR)) & !last);
            // Where there is no step nothing is measured.
            let (reference, drift) = (self.reference, self.drift);
            self.measure::<L>();
            for lane in (0..L::COUNT).filter(|lane| floor >> lane & 1 == 1) {
                self.reference.as_mut()[lane] = reference.as_ref()[lane];
                self.drift.as_mut()[lane] = drift.as_ref()[lane];
            }
            let lanes = last | floor | zero.less(L::from_array(&self.watched));
            let length = step * L::from_array(&self.direction);
            let length = step.select_less(remaining.abs(), length, remaining);
            if lanes != 0 {
                self.length = length.to_array();
                return Pause { steps, lanes, last, floor };
            }
            self.move_on(length);
        }
        Pause { steps: most, ..Pause::default() }
    }

    /// Takes the Jacobi constants at the start of the step into account.
    #[inline(always)]
    fn measure<L: Lanes<Array = A>>(&mut self) {
        let jacobi = L::from_array(&self.series.jacobi);
        let reference = L::from_array(&self.reference);
        let reference = reference.select_less(L::from_f64(f64::INFINITY), reference, jacobi);
        self.reference = reference.to_array();
        // The scalar comparison keeps the old one where the new one is no number.
        self.drift = (jacobi - reference).abs().max(L::from_array(&self.drift)).to_array();
    }

    /// Moves every lane on by its length.
    #[inline(always)]
    pub(super) fn advance<L: Lanes<Array = A>>(&mut self) {
        self.move_on(L::from_array(&self.length));
    }

    #[inline(always)]
    fn move_on<L: Lanes<Array = A>>(&mut self, length: L) {
        let change = lanes::change(&self.series.position, length);
        for (place, change) in self.state.iter_mut().zip(change) {
            place.add(change);
        }
        self.elapsed.add(length);
        if let Some(matrices) = &mut self.matrix {
            for (column, values) in matrices.values.iter_mut().enumerate() {
                let change = lanes::change(&matrices.columns.position[column], length);
                for (place, change) in values.iter_mut().zip(change) {
                    place.add(change);
                }
            }
        }
    }
}

impl<A: Copy + AsRef<[f64]> + AsMut<[f64]>> Matrices<A> {
    #[inline(always)]
    fn expand<L: Lanes<Array = A>>(&mut self, series: &LaneSeries<A>) {
        self.columns.expand_gradient::<L>(series);
        for column in 0..6 {
            let start = [0, 1, 2, 3, 4, 5].map(|row| L::from_array(&self.values[column][row].value));
            self.columns.expand_column::<L>(column, start);
        }
    }
}
