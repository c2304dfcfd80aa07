//! Dense output.
//!
//! Powers of the time first, then sums of products: Horner's rule would wait for each product and sum in turn.

use super::recurrence::number;
use super::{Columns, Series, TERMS, Wide};
use crate::arithmetic::{DoubleDouble, Packed, SumOfProducts};

/// Powers of a time in trial steps, and the derivatives of the powers.
struct Powers {
    place: [DoubleDouble; TERMS],
    rate: [DoubleDouble; TERMS],
}

impl Powers {
    #[inline(always)]
    fn new(time: DoubleDouble, trial_step: f64) -> Self {
        let per_time = 1.0 / trial_step;
        let share = time.scaled(per_time);
        let one = DoubleDouble::from(1.0);
        let square = share.squared();
        let mut place = [one; TERMS];
        let mut rate = [DoubleDouble::from(per_time); TERMS];
        place[1] = share;
        for k in 2..TERMS {
            place[k] = place[k - 2] * square;
        }
        for k in 1..TERMS {
            rate[k] = place[k - 1].times(number(k)).scaled(per_time);
        }
        Self { place, rate }
    }
}

/// The sum of all orders from `first` on, from the highest.
#[inline(always)]
fn sum<'a, P: Packed>(
    first: usize,
    coefficient: impl Fn(usize) -> &'a Wide,
    powers: &[DoubleDouble; TERMS],
) -> Wide {
    let last = TERMS - 1;
    let mut sum = SumOfProducts::of(coefficient(last).load::<P>(), DoubleDouble::splat(powers[last]));
    for k in (first..last).rev() {
        sum = sum.and(coefficient(k).load(), DoubleDouble::splat(powers[k]));
    }
    sum.total().stored()
}

/// What position and velocity change by within `time`.
#[inline(always)]
pub(super) fn change<P: Packed>(series: &Series, time: DoubleDouble) -> [DoubleDouble; 6] {
    let powers = Powers::new(time, series.trial_step);
    let place = sum::<P>(1, |k| &series.position[k], &powers.place);
    let rate = sum::<P>(2, |k| &series.position[k], &powers.rate);
    std::array::from_fn(|i| if i < 3 { place.lane(i) } else { rate.lane(i - 3) })
}

/// What the columns of the matrix change by within `time`.
#[inline(always)]
pub(super) fn matrix_change<P: Packed>(
    series: &Series,
    columns: &Columns,
    time: DoubleDouble,
) -> [[DoubleDouble; 6]; 6] {
    let powers = Powers::new(time, series.trial_step);
    let mut change = [[DoubleDouble::default(); 6]; 6];
    for axis in 0..3 {
        for half in 0..2 {
            let place = sum::<P>(1, |k| &columns.position[k][axis][half], &powers.place);
            let rate = sum::<P>(2, |k| &columns.position[k][axis][half], &powers.rate);
            for lane in 0..if half == 0 { 4 } else { 2 } {
                change[axis][4 * half + lane] = place.lane(lane);
                change[axis + 3][4 * half + lane] = rate.lane(lane);
            }
        }
    }
    change
}
