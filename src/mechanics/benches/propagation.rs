//! Each way of propagating, with its answer asserted inside the loop.

#[path = "../../../tests/mechanics/reference/cases.rs"]
#[expect(dead_code, reason = "the tests use more of it")]
mod cases;
#[path = "../../../tests/mechanics/reference/truth.rs"]
mod truth;

use std::hint::black_box;
use std::num::NonZeroU64;

use cases::{HALO, HALO_PERIOD, MU, REGULAR, REGULAR_PERIOD, case, parts};
use criterion::{Criterion, criterion_group, criterion_main};
use mechanics::interrupt::Never;
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{Arithmetic, Request, RequestParts, Sampling, Trajectory, solve};
use truth::{ensemble_error, matrix_error, position_error};

/// Solves the request again and again, and checks each answer.
fn bench(criterion: &mut Criterion, name: &str, parts: RequestParts, check: impl Fn(&[Trajectory]) -> bool) {
    let request = Request::new(parts).expect("valid");
    criterion.bench_function(name, |bencher| {
        bencher.iter(|| {
            let all = black_box(solve(black_box(&request), &Never).expect("not cancelled"));
            assert!(check(&all), "{name}");
        });
    });
}

/// One of the cases that accuracy is stated for.
fn bench_case(criterion: &mut Criterion, name: &str, check: impl Fn(&[Trajectory]) -> bool) {
    bench(criterion, name, case(name).expect("a case"), check);
}

fn one_trajectory(criterion: &mut Criterion) {
    for (name, bound) in [("halo_period", 5e-14), ("nrho_30", 1e-7), ("arenstorf", 1e-12)] {
        bench_case(criterion, name, |all| position_error(name, &all[0].last) <= bound);
    }

    let halo = || parts(MU, HALO, HALO_PERIOD);
    let fine = RequestParts { arithmetic: Arithmetic::DoubleDouble, ..halo() };
    bench(criterion, "halo_period_in_double_double", fine, |all| {
        position_error("halo_period", &all[0].last) <= 3e-16
    });
    let audited = RequestParts { audit: true, ..halo() };
    bench(criterion, "halo_period_audited", audited, |all| {
        all[0].evidence.audit.is_some_and(|audit| audit.position_error <= Some(5e-14))
    });

    let crossing = Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Increasing,
        only: None,
        stop_after: NonZeroU64::new(2),
    };
    let with_event = RequestParts { events: vec![crossing], ..parts(MU, HALO, HALO_PERIOD) };
    bench(criterion, "halo_period_with_an_event", with_event, |all| {
        (all[0].events[0].state.time - 0.5 * HALO_PERIOD).abs() < 1e-12
    });

    // Of an odd number the middle one is half a period from the start, across the plane of symmetry.
    let sampled = RequestParts { sampling: Sampling::Count(1001), ..parts(MU, HALO, HALO_PERIOD) };
    bench(criterion, "halo_period_with_1001_samples", sampled, |all| {
        let samples = &all[0].samples;
        samples.positions.len() == 1001
            && samples.positions[500].y.abs() < 1e-12
            && samples.velocities[500].x.abs() < 1e-11
    });
}

fn matrices(criterion: &mut Criterion) {
    for (name, bound) in [("stm_halo", 1e-13), ("stm_nrho", 1e-12)] {
        let good = |t: &Trajectory| matrix_error(name, &t.matrix.expect("asked for")) <= bound;
        bench_case(criterion, name, |all| good(&all[0]));
        bench_case(criterion, &format!("{name}_lanes"), |all| good(&all[0]) && good(&all[all.len() - 1]));
    }
}

fn ensemble(criterion: &mut Criterion) {
    bench_case(criterion, "ensemble_10k", |all| ensemble_error(all) <= 2e-13);
}

/// A random walk of the round-off grows with the root of the number of revolutions, a systematic error with the number.
fn drift(criterion: &mut Criterion) {
    for (name, revolutions, bound) in
        [("revolutions_1000", 1000.0, 1e-13), ("revolutions_10000", 10000.0, 3.2e-13)]
    {
        let request = parts(MU, REGULAR, revolutions * REGULAR_PERIOD);
        bench(criterion, name, request, |all| all[0].evidence.jacobi_drift <= bound);
    }
}

criterion_group!(short, one_trajectory, matrices);
criterion_group! {
    name = long;
    // As few samples as criterion allows.
    config = Criterion::default().sample_size(10);
    targets = ensemble, drift
}
criterion_main!(short, long);
