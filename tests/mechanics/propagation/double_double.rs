//! Trajectories computed in double-double arithmetic and rounded.

use std::num::NonZeroU64;

use mechanics::arithmetic::DoubleDouble;
use mechanics::interrupt::{AfterPolls, Never, Stop};
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{
    Arithmetic, BurnAxes, Contact, Failure, Manoeuvre, MatrixOutput, Outcome, Request, RequestParts,
    Sampling, Trajectory, solve,
};
use mechanics::quantity::{Distance, Quantity};
use mechanics::state::State;
use mechanics::taylor::Path;
use mechanics::taylor::extended::Motion;
use nalgebra::Vector3;
use proptest::prelude::*;

use super::{HALO, HALO_PERIOD, MU, any_frame, apart, parts, run};
use crate::extended::{ARENSTORF, ARENSTORF_MU, ARENSTORF_PERIOD, RECTILINEAR, motion, propagated, truth};

fn precise(mu: f64, state: [f64; 6], duration: f64) -> RequestParts {
    RequestParts { arithmetic: Arithmetic::DoubleDouble, ..parts(mu, state, duration) }
}

fn components(state: &State) -> [f64; 6] {
    state.components().into()
}

/// y = 0, in either direction.
fn crossing(stop_after: Option<u64>) -> Event {
    Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Either,
        only: None,
        stop_after: stop_after.and_then(NonZeroU64::new),
    }
}

#[test]
fn final_states_are_the_nearest_doubles() {
    for (case, mu, state, duration) in [
        ("halo_period", MU, HALO, HALO_PERIOD),
        ("arenstorf", ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD),
        ("nrho_30", MU, RECTILINEAR, 30.0),
    ] {
        let last = run(precise(mu, state, duration)).last;
        for (found, truth) in components(&last).into_iter().zip(truth(case, "final")) {
            let error = (truth - found).abs().to_f64();
            // Beside half a last digit, what 106 bits leave of Arenstorf's orbit.
            assert!(
                error <= 0.5 * (found.next_up() - found).max(found - found.next_down()) + 1e-26,
                "{case} {error:e}"
            );
        }
    }
}

#[test]
fn matrices_are_the_nearest_doubles() {
    for (case, state, duration) in [("stm_halo", HALO, HALO_PERIOD), ("stm_nrho", RECTILINEAR, 1.511)] {
        let mut request = precise(MU, state, duration);
        request.matrix = MatrixOutput::Final;
        let trajectory = run(request);
        let matrix = trajectory.matrix.expect("asked for");
        for row in 0..6 {
            let truth = truth(case, &format!("m{row}"));
            for column in 0..6 {
                let (found, rounded) = (matrix[(row, column)], truth[column].to_f64());
                assert_eq!(found.to_bits(), rounded.to_bits(), "{case} {row} {column}");
            }
        }
        let evidence = trajectory.evidence;
        assert!(evidence.determinant_defect < Some(1e-20), "{evidence:?}");
        assert!(evidence.symplectic_defect < Some(1e-22), "{evidence:?}");
    }
}

#[test]
fn evidence() {
    let evidence = run(precise(MU, HALO, HALO_PERIOD)).evidence;
    assert_eq!(evidence.steps, 27);
    assert!(evidence.jacobi_drift < 1e-29, "{evidence:?}");
}

#[test]
fn backwards() {
    // The halo starts at right angles to the plane y = 0, so that its past is the mirror image of its future.
    let mirror = [1.0, -1.0, 1.0, -1.0, 1.0, -1.0];
    let truth = truth("halo_period", "final");
    let last = components(&run(precise(MU, HALO, -HALO_PERIOD)).last);
    let expected: [f64; 6] = std::array::from_fn(|i| truth[i].to_f64() * mirror[i]);
    assert_eq!(last.map(f64::to_bits), expected.map(f64::to_bits));
}

#[test]
fn samples_are_the_nearest_doubles() {
    let times = vec![0.0, 0.01, 0.02, 0.7, 1.9, 3.0];
    let mut request = precise(MU, HALO, 3.0);
    request.sampling = Sampling::Times(times.clone());
    request.matrix = MatrixOutput::Samples;
    let trajectory = run(request);
    let samples = &trajectory.samples;
    assert_eq!(samples.times, times);
    for (i, &time) in times.iter().enumerate().skip(1) {
        let there = propagated(motion(MU, HALO), time);
        let state = there.state.map(DoubleDouble::to_f64);
        let (position, velocity) = (samples.positions[i], samples.velocities[i]);
        let found = [position.x, position.y, position.z, velocity.x, velocity.y, velocity.z];
        assert_eq!(found.map(f64::to_bits), state.map(f64::to_bits));
    }
    assert_eq!(samples.matrices.last(), trajectory.matrix.as_ref());

    let mut request = precise(MU, HALO, 3.0);
    request.sampling = Sampling::EveryStep;
    let trajectory = run(request);
    assert_eq!(trajectory.samples.times.len() as u64, trajectory.evidence.steps + 1);
}

#[test]
fn events() {
    let mut request = precise(MU, HALO, HALO_PERIOD + 0.1);
    request.events = vec![crossing(None)];
    let trajectory = run(request);
    let [half, whole] = &trajectory.events[..] else { panic!("{:?}", trajectory.events) };
    for event in [half, whole] {
        let there = propagated(motion(MU, HALO), event.state.time);
        // How far the time is from that of the crossing.
        let [_, y, _, _, vy, _] = there.state.map(DoubleDouble::to_f64);
        assert!((y / vy).abs() <= 2.0 * f64::EPSILON * event.state.time, "{event:?}");
        for (found, expected) in components(&event.state).into_iter().zip(there.state) {
            assert!((found - expected.to_f64()).abs() < 1e-15);
        }
    }
}

#[test]
fn an_event_stops() {
    let mut request = precise(MU, HALO, HALO_PERIOD);
    request.events = vec![crossing(Some(1))];
    let trajectory = run(request.clone());
    assert_eq!((trajectory.outcome, trajectory.stopped_by), (Outcome::StoppedByEvent, Some(0)));
    assert_eq!(trajectory.events[0].state, trajectory.last);
    let double = run(RequestParts { arithmetic: Arithmetic::Double, ..request });
    assert!((trajectory.last.time - double.last.time).abs() < 1e-13);
    assert!(apart(&trajectory.last, &double.last) < 1e-13);
}

#[test]
fn contact() {
    let start = [1.0 - MU + 0.1, 0.0, 0.0, 0.0, 0.05, 0.0];
    let mut request = precise(MU, start, 3.0);
    request.contact = Contact { larger: None, smaller: Some(Distance::new(0.02).expect("in range")) };
    let trajectory = run(request.clone());
    assert_eq!(trajectory.outcome, Outcome::ContactSmaller);
    let from_centre = trajectory.last.position - Vector3::new(1.0 - MU, 0.0, 0.0);
    assert!((from_centre.norm() - 0.02).abs() < 1e-16 + f64::EPSILON);
    let double = run(RequestParts { arithmetic: Arithmetic::Double, ..request });
    assert!((trajectory.last.time - double.last.time).abs() < 1e-13);
}

pub(super) fn burn(time: f64, delta_v: [f64; 3], axes: BurnAxes) -> Manoeuvre {
    Manoeuvre { time, delta_v: Vector3::from(delta_v), axes, trajectories: None }
}

/// A burn along fixed axes at 1, and one along the velocity at 2.
pub(super) fn burns() -> Vec<Manoeuvre> {
    vec![
        burn(1.0, [0.01, -0.02, 0.005], BurnAxes::Frame),
        burn(2.0, [0.03, 0.0, 0.0], BurnAxes::VelocityNormalBinormal),
    ]
}

/// The halo orbit with these burns, by hand, at 3.
pub(super) fn burnt() -> Motion {
    let mut course = propagated(motion(MU, HALO), 1.0);
    course.kick(&[0.01, -0.02, 0.005].map(DoubleDouble::from));
    let mut course = propagated(course, 1.0);
    let velocity: [DoubleDouble; 3] = std::array::from_fn(|i| course.state[i + 3]);
    let [x, y, z] = velocity.map(DoubleDouble::squared);
    let speed = (x + y + z).sqrt();
    course.kick(&velocity.map(|component| component / speed * 0.03));
    propagated(course, 1.0)
}

#[test]
fn manoeuvres() {
    let mut request = precise(MU, HALO, 3.0);
    request.manoeuvres = burns();
    request.matrix = MatrixOutput::Final;
    let trajectory = run(request.clone());
    let rounded = burnt().state.map(|component| component.to_f64().to_bits());
    assert_eq!(components(&trajectory.last).map(f64::to_bits), rounded);
    assert!(trajectory.evidence.jacobi_drift < 1e-29, "{:?}", trajectory.evidence);

    let double = run(RequestParts { arithmetic: Arithmetic::Double, ..request }).matrix.expect("asked for");
    let matrix = trajectory.matrix.expect("asked for");
    assert!((matrix - double).amax() < 1e-11 * matrix.amax());
}

#[test]
fn the_same_bits_on_every_path_and_among_others() {
    let mut request = precise(MU, HALO, 1.0);
    request.states = vec![request.states[0], State::new(0.0, RECTILINEAR), request.states[0]];
    request.events = vec![crossing(None)];
    request.matrix = MatrixOutput::Final;
    request.sampling = Sampling::Count(5);
    let request = Request::new(request).expect("valid");
    let on = |path| solve(&request.clone().on(path), &Never).expect("not cancelled");
    let plain = on(Path::PORTABLE);
    for path in Path::available() {
        assert_eq!(on(path), plain, "{}", path.name());
    }
    assert_eq!(Trajectory { index: 0, ..plain[2].clone() }, plain[0]);
}

#[test]
fn steps_count_more() {
    let mut request = precise(MU, HALO, HALO_PERIOD);
    request.limits.steps = 250;
    let trajectory = run(request);
    assert_eq!((trajectory.outcome, trajectory.evidence.steps), (Outcome::StepLimit, 10));
    assert!(trajectory.last.time > 0.5 && trajectory.last.time < 2.0);
}

#[test]
fn interrupted() {
    let request = Request::new(precise(MU, HALO, 100.0)).expect("valid");
    let after = |polls, stop| solve(&request, &AfterPolls::new(polls, stop));
    assert_eq!(after(3, Stop::Cancelled), Err(Failure::Cancelled));
    let all = after(4, Stop::WallTime).expect("not cancelled");
    assert_eq!(all[0].outcome, Outcome::WallTimeLimit);
    // One poll starts the trajectory, then one each 16 steps.
    assert!(all[0].evidence.steps <= 64, "{}", all[0].evidence.steps);
}

#[test]
fn fly_bys_at_a_millionth() {
    let across = 0.0010229694772434343;
    let start = [1.0 - MU + 0.01, 0.0, 0.0, 0.0, across, across + 0.01];
    let request = precise(MU, start, 0.02);
    let trajectory = run(request.clone());
    assert_eq!(trajectory.outcome, Outcome::Complete);
    assert!(trajectory.last.components().iter().all(|component| component.is_finite()));
    let double = run(RequestParts { arithmetic: Arithmetic::Double, ..request });
    assert!(apart(&trajectory.last, &double.last) < 1e-7);
}

proptest! {
    #[test]
    fn every_frame_shows_the_same(frame in any_frame(), time in -5.0..5.0) {
        let mut request: RequestParts = precise(MU, HALO, 1.0);
        request.states[0].time = time;
        let default: Trajectory = run(request.clone());
        request.states[0] = frame.from_default(request.mass_parameter, &request.states[0]);
        request.frame = frame;
        let trajectory = run(request.clone());
        let back = frame.to_default(request.mass_parameter, &trajectory.last);
        prop_assert!(apart(&back, &default.last) < 1e-14);
        prop_assert!((back.velocity - default.last.velocity).norm() < 1e-14);
    }
}
