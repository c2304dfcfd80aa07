//! One trajectory, its matrix, its events: each answer is asserted inside the loop.

use std::hint::black_box;
use std::num::NonZeroU64;

use criterion::{Criterion, criterion_group, criterion_main};
use mechanics::frame::Frame;
use mechanics::interrupt::Never;
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{
    Arithmetic, Contact, Durations, Limits, MatrixOutput, Request, RequestParts, Sampling, Trajectory, solve,
};
use mechanics::quantity::{Duration, MassParameter, Quantity, Tolerance};
use mechanics::state::State;

const MU: f64 = 0.01215058560962404;
const HALO: [f64; 6] = [1.1720459535998, 0.0, -0.0862, 0.0, -0.1880035431733172, 0.0];
const HALO_PERIOD: f64 = 3.3517255182390353;
/// Hairer, Nørsett & Wanner, *Solving Ordinary Differential Equations I*, §II.0.
const ARENSTORF_MU: f64 = 0.012277471;
const ARENSTORF: [f64; 6] = [0.994, 0.0, 0.0, 0.0, -2.00158510637908252240537862224, 0.0];
const ARENSTORF_PERIOD: f64 = 17.0652165601579625588917206249;

fn parts(mu: f64, state: [f64; 6], duration: f64) -> RequestParts {
    RequestParts {
        mass_parameter: MassParameter::new(mu).expect("in range"),
        frame: Frame::default(),
        states: vec![State::new(0.0, state)],
        durations: Durations::All(Duration::new(duration).expect("in range")),
        tolerance: Tolerance::new(1e-15).expect("in range"),
        sampling: Sampling::None,
        matrix: MatrixOutput::None,
        events: Vec::new(),
        manoeuvres: Vec::new(),
        contact: Contact::default(),
        arithmetic: Arithmetic::Double,
        audit: false,
        limits: Limits { steps: 1_000_000, events: 100_000, sample_values: 20_000_000 },
    }
}

fn first(request: &Request) -> Trajectory {
    solve(black_box(request), &Never).expect("not cancelled").remove(0)
}

fn closes(request: &Request, within: f64) {
    let start = request.parts().states[0].position;
    let end = black_box(first(request)).last.position;
    assert!((end - start).norm() < within);
}

fn trajectories(criterion: &mut Criterion) {
    let halo = Request::new(parts(MU, HALO, HALO_PERIOD)).expect("valid");
    criterion.bench_function("halo_period", |b| b.iter(|| closes(&halo, 1e-12)));

    let arenstorf = Request::new(parts(ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD)).expect("valid");
    criterion.bench_function("arenstorf", |b| b.iter(|| closes(&arenstorf, 1e-12)));

    let mut with_matrix = parts(MU, HALO, HALO_PERIOD);
    with_matrix.matrix = MatrixOutput::Final;
    let with_matrix = Request::new(with_matrix).expect("valid");
    criterion.bench_function("stm_halo", |b| {
        b.iter(|| {
            let matrix = first(&with_matrix).matrix.expect("asked for");
            assert!((matrix.trace() - HALO_TRACE).abs() < 1e-8);
        });
    });

    let mut with_event = parts(MU, HALO, HALO_PERIOD);
    with_event.events = vec![Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Increasing,
        only: None,
        stop_after: NonZeroU64::new(2),
    }];
    let with_event = Request::new(with_event).expect("valid");
    criterion.bench_function("halo_period_with_an_event", |b| {
        b.iter(|| assert!((first(&with_event).events[0].state.time - 0.5 * HALO_PERIOD).abs() < 1e-12));
    });
}

/// Trace of the halo's monodromy matrix, from the 333-bit matrix in `tests/mechanics/reference/halo_matrix.txt`.
const HALO_TRACE: f64 = 693.6197609139388;

criterion_group!(benches, trajectories);
criterion_main!(benches);
