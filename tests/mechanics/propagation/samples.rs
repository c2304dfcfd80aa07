//! Samples of all kinds, on the absolute clock, forwards and backwards.

use mechanics::propagation::{Invalid, Request, Sampling};

use super::{HALO, HALO_PERIOD, MU, parts, run};

#[test]
fn count_includes_both_ends() {
    let mut request = parts(MU, HALO, HALO_PERIOD);
    request.sampling = Sampling::Count(5);
    let trajectory = run(request);
    let samples = &trajectory.samples;
    assert_eq!(samples.times.len(), 5);
    assert_eq!(samples.positions[0].x.to_bits(), HALO[0].to_bits());
    assert_eq!(samples.times[4].to_bits(), HALO_PERIOD.to_bits());
    assert_eq!(samples.positions[4], trajectory.last.position);
    assert_eq!(samples.velocities[4], trajectory.last.velocity);
}

#[test]
fn samples_cost_no_step_and_change_no_bit() {
    let plain = run(parts(MU, HALO, HALO_PERIOD));
    let mut request = parts(MU, HALO, HALO_PERIOD);
    request.sampling = Sampling::Count(10_001);
    let sampled = run(request);
    assert_eq!(plain.evidence.steps, sampled.evidence.steps);
    assert_eq!(plain.last, sampled.last);
}

#[test]
fn a_sample_is_where_a_shorter_trajectory_ends() {
    let mut request = parts(MU, HALO, 2.0);
    request.sampling = Sampling::Times(vec![0.3, 1.0, 1.7]);
    let samples = run(request).samples;
    for (time, position) in samples.times.iter().zip(&samples.positions) {
        let last = run(parts(MU, HALO, *time)).last;
        assert!((last.position - position).norm() < 2e-15, "{time}");
    }
}

#[test]
fn interval_counts_from_the_start_and_keeps_an_end_it_divides() {
    let mut request = parts(MU, HALO, 0.3);
    request.sampling = Sampling::Interval(0.1);
    let trajectory = run(request);
    assert_eq!(trajectory.samples.times.len(), 4, "three tenths hold three tenths");
    assert_eq!(trajectory.samples.positions[3], trajectory.last.position);

    let mut request = parts(MU, HALO, -0.35);
    request.sampling = Sampling::Interval(0.1);
    let times = run(request).samples.times;
    assert_eq!(times.len(), 4);
    assert!(times.windows(2).all(|pair| pair[1] < pair[0]));
}

#[test]
fn every_step_begins_with_the_initial_state_and_ends_with_the_last() {
    let mut request = parts(MU, HALO, HALO_PERIOD);
    request.sampling = Sampling::EveryStep;
    let trajectory = run(request);
    let samples = &trajectory.samples;
    assert_eq!(samples.times.len() as u64, trajectory.evidence.steps + 1);
    assert_eq!(samples.times[0].to_bits(), 0.0_f64.to_bits());
    assert_eq!(samples.positions.last(), Some(&trajectory.last.position));
}

#[test]
fn the_clock_is_absolute() {
    let mut request = parts(MU, HALO, 1.0);
    request.states[0].time = 100.0;
    request.sampling = Sampling::Times(vec![100.0, 100.5, 101.0]);
    let trajectory = run(request);
    assert_eq!(trajectory.samples.times, [100.0, 100.5, 101.0]);
    assert_eq!(trajectory.last.time.to_bits(), 101.0_f64.to_bits());
    assert_eq!(trajectory.last.position, run(parts(MU, HALO, 1.0)).last.position);
}

#[test]
fn what_is_wrong_with_the_times_is_told_one_by_one() {
    let mut request = parts(MU, HALO, 1.0);
    request.sampling = Sampling::Times(vec![0.5, 0.4, 1.5, -1.0]);
    let problems = Request::new(request).expect_err("invalid");
    assert!(matches!(problems[0], Invalid::TimeOrder { index: 1, .. }));
    assert!(matches!(problems[1], Invalid::TimeOutside { index: 2, .. }));
    assert!(matches!(problems[2], Invalid::TimeOutside { index: 3, .. }));
    assert_eq!(problems.len(), 3);

    for (sampling, text) in [
        (Sampling::Count(1), "at least 2"),
        (Sampling::Count(1_000_000_000_000), "values"),
        (Sampling::Interval(2.0), "longer than the duration"),
        (Sampling::Interval(f64::NAN), "finite"),
        (Sampling::Interval(1e-300), "values"),
    ] {
        let mut request = parts(MU, HALO, 1.0);
        request.sampling = sampling;
        let problems = Request::new(request).expect_err("invalid");
        assert_eq!(problems.len(), 1);
        assert!(problems[0].to_string().contains(text), "{}", problems[0]);
    }
}
