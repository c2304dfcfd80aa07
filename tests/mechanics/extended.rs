//! Motion in double-double arithmetic, before anything is rounded.

use mechanics::arithmetic::sum::Compensated;
use mechanics::arithmetic::{DoubleDouble, Matrix};
use mechanics::taylor::extended::{self, Columns, Motion};
use mechanics::taylor::{Halt, Path, Primaries, Stride};
use proptest::prelude::*;

use crate::propagation::{HALO, HALO_PERIOD, MU};
use crate::reference::{number, rows};

/// Final states and matrices; the table says where they are from.
const TRUTH: &str = include_str!("reference/trajectories.txt");
/// More final states. `make.py` made them and says how.
const EXTRAPOLATIONS: &str = include_str!("reference/extrapolations.txt");

pub(crate) use crate::reference::cases::{ARENSTORF, ARENSTORF_MU, ARENSTORF_PERIOD, RECTILINEAR};

/// A printed number with all the digits that double-double has.
pub(crate) fn precise(printed: &str) -> DoubleDouble {
    let (mantissa, exponent) = printed.split_once('e').unwrap_or((printed, "0"));
    let (sign, mantissa) = mantissa.strip_prefix('-').map_or((1.0, mantissa), |rest| (-1.0, rest));
    let (whole, fraction) = mantissa.split_once('.').unwrap_or((mantissa, ""));
    let mut value = DoubleDouble::default();
    for digit in whole.chars().chain(fraction.chars()).filter_map(|c| c.to_digit(10)) {
        value = value * 10.0 + f64::from(digit);
    }
    let exponent: i32 = exponent.parse().expect("an exponent");
    let places = exponent - i32::try_from(fraction.len()).expect("a short number");
    for _ in 0..places.abs() {
        value = if places < 0 { value / 10.0 } else { value * 10.0 };
    }
    value * sign
}

/// The six numbers of a row of the table.
pub(crate) fn truth(case: &str, which: &str) -> [DoubleDouble; 6] {
    let row = rows(TRUTH).find(|row| row[0] == case && row[1] == which).expect("a row of the table");
    std::array::from_fn(|i| precise(row[i + 2]))
}

/// A motion after a time.
pub(crate) fn propagated(mut motion: Motion, duration: f64) -> Motion {
    let target = motion.elapsed + DoubleDouble::from(duration);
    let halt = motion.run(&Stride {
        target: target.into(),
        direction: 1.0_f64.copysign(duration),
        most: 100_000,
        watched: false,
    });
    assert!(matches!(halt, Halt::Step { last: true, .. }), "{halt:?}");
    motion.step();
    motion
}

/// One step towards a time.
fn one_step(target: f64) -> Stride {
    Stride { target: Compensated::new(target), direction: 1.0, most: 1, watched: true }
}

pub(crate) fn motion(mu: f64, state: [f64; 6]) -> Motion {
    Motion::new(Path::fastest(), Primaries::new(mu), state.map(DoubleDouble::from))
}

proptest! {
    /// Everywhere, and at every mass parameter: relative to the largest terms of the constant on the way.
    #[test]
    fn the_jacobi_constant_keeps_its_digits(
        magnitude in -9.0..-0.31_f64,
        position in [-2.0..2.0_f64, -2.0..2.0, -1.0..1.0],
        velocity in [-1.5..1.5_f64, -1.5..1.5, -1.0..1.0],
        distance in prop::sample::select(&[1.0, 1.0, 1.0, 100.0][..]),
    ) {
        let [[x, y, z], [vx, vy, vz]] = [position, velocity].map(|v| v.map(|c| c * distance));
        let mut motion = motion(10.0_f64.powf(magnitude), [x, y, z, vx, vy, vz]);
        let mut finished = false;
        let mut largest: f64 = 0.0;
        while !finished {
            let halt = motion.run(&one_step(3.0));
            let Halt::Step { last, .. } = halt else { panic!("{halt:?}") };
            motion.step();
            let [x, y, .., vx, vy, vz] = motion.state.map(DoubleDouble::to_f64);
            largest = largest.max(x * x + y * y).max(vx * vx + vy * vy + vz * vz);
            finished = last;
        }
        prop_assert!(motion.drift <= 1e-28 * largest, "{:e} {largest:e}", motion.drift);
    }
}

/// Largest difference of the positions' or the velocities' components.
fn apart(found: &[DoubleDouble], expected: &[DoubleDouble]) -> f64 {
    found.iter().zip(expected).map(|(a, b)| (*a - *b).abs().to_f64()).fold(0.0, f64::max)
}

#[test]
fn final_states_of_many_digits() {
    // The table's 46 digits come from an integration with about 100, which a second one confirms to 31. The bounds are
    // what 106 bits leave where the orbit amplifies the first rounding by up to 1e8.
    for (case, mu, state, duration, bounds) in [
        ("halo_period", MU, HALO, HALO_PERIOD, [1e-29, 1e-29]),
        ("arenstorf", ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD, [1e-27, 1e-25]),
        ("nrho_30", MU, RECTILINEAR, 30.0, [1e-22, 1e-22]),
    ] {
        let end = propagated(motion(mu, state), duration);
        let truth = truth(case, "final");
        let errors = [apart(&end.state[..3], &truth[..3]), apart(&end.state[3..], &truth[3..])];
        assert!(errors[0] <= bounds[0] && errors[1] <= bounds[1], "{case}: {errors:?}");
    }
}

#[test]
fn effort() {
    // Steps, not seconds: a slow-down shows without a clock.
    assert_eq!(propagated(motion(MU, HALO), HALO_PERIOD).steps, 27);
    assert_eq!(propagated(motion(ARENSTORF_MU, ARENSTORF), ARENSTORF_PERIOD).steps, 185);
}

#[test]
fn matrices_of_many_digits() {
    for (case, state, duration) in [("stm_halo", HALO, HALO_PERIOD), ("stm_nrho", RECTILINEAR, 1.511)] {
        let mut motion = motion(MU, state);
        let mut matrix = Matrix::<6>::identity();
        let (path, mut columns) = (Path::fastest(), Columns::new());
        let mut finished = false;
        while !finished {
            let halt = motion.run(&one_step(duration));
            let Halt::Step { last, .. } = halt else { panic!("{halt:?}") };
            extended::expand_variational(path, &motion.series, &matrix.0, &mut columns);
            let change = extended::flow_variational(path, &motion.series, &columns, motion.length());
            matrix = Matrix::from_fn(|i, j| matrix.0[i][j] + change[i][j]);
            motion.step();
            finished = last;
        }
        let truth: [_; 6] = std::array::from_fn(|i| truth(case, &format!("m{i}")));
        let largest = truth.iter().flatten().map(|e| e.abs().to_f64()).fold(0.0, f64::max);
        for (row, expected) in matrix.0.iter().zip(&truth) {
            let error = apart(row, expected) / largest;
            assert!(error < 1e-26, "{case}: {error:e}");
        }
    }
}

#[test]
fn there_and_back() {
    let end = propagated(motion(MU, HALO), HALO_PERIOD);
    let start = propagated(end, -HALO_PERIOD);
    assert!(apart(&start.state, &HALO.map(DoubleDouble::from)) < 1e-27);
}

/// The errors of a row of the other table.
fn extrapolation_errors(row: &[&str]) -> [f64; 2] {
    let start = std::array::from_fn(|i| number(row[i + 2]));
    let end = propagated(motion(number(row[1]), start), number(row[8]));
    let truth: [_; 6] = std::array::from_fn(|i| precise(row[i + 9]));
    [apart(&end.state[..3], &truth[..3]), apart(&end.state[3..], &truth[3..])]
}

#[test]
fn a_revolution_of_a_regular_orbit() {
    let row = rows(EXTRAPOLATIONS).find(|row| row[0] == "regular").expect("a row of the table");
    let errors = extrapolation_errors(&row);
    assert!(errors[0] < 1e-28 && errors[1] < 1e-28, "{errors:?}");
}

/// At 1e-5, 1e-6 and 1e-7 of the smaller primary's centre.
#[test]
fn fly_bys_stay_finite_and_accurate() {
    for row in rows(EXTRAPOLATIONS).filter(|row| row[0] == "fly_by") {
        let errors = extrapolation_errors(&row);
        // What 1e-32 of the distance between the primaries grows to: it turns the fly-by by 1e-32 of its own size.
        assert!(errors[0] < 1e-20 && errors[1] < 1e-18, "{}: {errors:?}", row[15]);
    }
}

#[test]
fn dense_output_is_a_shorter_step() {
    let mut motion = motion(MU, HALO);
    let halt = motion.run(&one_step(1.0));
    let Halt::Step { length: step, last: false } = halt else { panic!("{halt:?}") };
    for share in [0.0, 0.25, 0.7, 1.0] {
        let at = DoubleDouble::from(share * step);
        let within = motion.state_at(at);
        let mut shorter = motion.clone();
        shorter.advance(at);
        assert_eq!(shorter.state, within);
    }
}

#[test]
fn the_rounded_series_is_that_of_double_precision() {
    let mut motion = motion(MU, RECTILINEAR);
    motion.run(&one_step(1.0));
    let path = Path::fastest();
    let (mut rounded, mut double) = Default::default();
    motion.series.round_to(&mut rounded);
    mechanics::taylor::expand(path, &Primaries::new(MU), &RECTILINEAR.map(Compensated::new), &mut double);
    for time in [0.01, -0.02] {
        let found = mechanics::taylor::flow(path, &rounded, time);
        let expected = mechanics::taylor::flow(path, &double, time);
        for (found, expected) in found.iter().zip(expected) {
            assert!((found - expected).abs() <= 1e-15, "{found:e} {expected:e}");
        }
    }
    assert!((rounded.jacobi - double.jacobi).abs() < 1e-14);
    assert!((rounded.log2_radius - double.log2_radius).abs() < 0.5);
}
