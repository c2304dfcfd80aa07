//! The true error that an audit measures.

use std::num::NonZeroU64;

use mechanics::arithmetic::DoubleDouble;
use mechanics::frame::{Axes, Frame, Origin, XAxis};
use mechanics::interrupt::{AfterPolls, Never, Stop};
use mechanics::propagation::event::{Direction, Event, Plane, When};
use mechanics::propagation::{
    Arithmetic, Audit, BurnAxes, Failure, Invalid, Outcome, Request, RequestParts, Trajectory, solve,
};
use mechanics::quantity::{MassParameter, Quantity};
use mechanics::state::State;
use mechanics::taylor::extended::Motion;
use mechanics::taylor::{Path, Primaries};
use nalgebra::Vector6;

use super::double_double::{burn, burns, burnt};
use super::{HALO, HALO_PERIOD, MU, parts, run};
use crate::extended::{ARENSTORF, ARENSTORF_MU, ARENSTORF_PERIOD, RECTILINEAR, motion, propagated, truth};

fn audited(parts: RequestParts) -> Trajectory {
    run(RequestParts { audit: true, ..parts })
}

fn audit(trajectory: &Trajectory) -> Audit {
    trajectory.evidence.audit.expect("asked for")
}

/// Norms of the differences of position and velocity.
fn errors(last: &State, truth: &[DoubleDouble; 6]) -> [f64; 2] {
    let last = last.components();
    let error: Vector6<f64> = Vector6::from_fn(|i, _| (DoubleDouble::from(last[i]) - truth[i]).to_f64());
    [error.fixed_rows::<3>(0).norm(), error.fixed_rows::<3>(3).norm()]
}

#[track_caller]
fn assert_measured(trajectory: &Trajectory, truth: &[DoubleDouble; 6], relative: f64) {
    let audit = audit(trajectory);
    let [position, velocity] = errors(&trajectory.last, truth);
    let agree = |found: Option<f64>, expected: f64| {
        found.is_some_and(|found| (found - expected).abs() <= relative * expected)
    };
    assert_eq!(audit.outcome, Outcome::Complete);
    assert!(agree(audit.position_error, position), "{audit:?} {position:e}");
    assert!(agree(audit.velocity_error, velocity), "{audit:?} {velocity:e}");
}

#[test]
fn the_error_is_the_difference_from_many_digits() {
    for (case, mu, state, duration) in [
        ("halo_period", MU, HALO, HALO_PERIOD),
        ("arenstorf", ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD),
        ("nrho_30", MU, RECTILINEAR, 30.0),
    ] {
        let trajectory = audited(parts(mu, state, duration));
        assert_measured(&trajectory, &truth(case, "final"), 1e-9);
        // The audit changes nothing of what it measures.
        assert_eq!(trajectory.last, run(parts(mu, state, duration)).last);
    }
}

#[test]
fn many_at_once_as_alone() {
    let mut many = parts(MU, HALO, 2.0);
    many.states = (0..21).map(|i| State::new(0.0, HALO.map(|c| c * (1.0 + 0.001 * f64::from(i))))).collect();
    many.audit = true;
    let together = solve(&Request::new(many.clone()).expect("valid"), &Never).expect("not cancelled");
    for (trajectory, state) in together.iter().zip(&many.states) {
        let alone = run(RequestParts { states: vec![*state], ..many.clone() });
        assert_eq!(audit(trajectory), audit(&alone));
        assert_eq!(audit(trajectory).outcome, Outcome::Complete);
    }
}

#[test]
fn backwards() {
    // The halo starts at right angles to the plane y = 0, so that its past is the mirror image of its future.
    let mirror = [1.0, -1.0, 1.0, -1.0, 1.0, -1.0];
    let truth = truth("halo_period", "final");
    let mirrored = std::array::from_fn(|i| truth[i] * mirror[i]);
    assert_measured(&audited(parts(MU, HALO, -HALO_PERIOD)), &mirrored, 1e-9);
}

#[test]
fn of_a_loose_tolerance() {
    let mut loose = parts(MU, HALO, HALO_PERIOD);
    loose.tolerance = Quantity::new(1e-6).expect("in range");
    let trajectory = audited(loose);
    assert!(audit(&trajectory).position_error > Some(1e-9));
    assert_measured(&trajectory, &truth("halo_period", "final"), 1e-9);
}

#[test]
fn with_manoeuvres() {
    let request = RequestParts { manoeuvres: burns(), ..parts(MU, HALO, 3.0) };
    assert_measured(&audited(request), &burnt().state, 1e-9);
}

#[test]
fn burns_along_moving_axes_are_those_of_the_trajectory() {
    // Normal and binormal, in each frame: the audit's burn is the trajectory's but for the round-off.
    for axes in [Axes::Rotating, Axes::Inertial] {
        for origin in [Origin::Barycenter, Origin::Larger, Origin::Smaller] {
            let frame = Frame { axes, origin, x_axis: XAxis::TowardLarger };
            let mut request = parts(MU, HALO, 0.5);
            request.frame = frame;
            request.states = vec![frame.from_default(mass(MU), &State::new(0.0, HALO))];
            request.manoeuvres = vec![burn(0.2, [0.01, 0.02, 0.03], BurnAxes::VelocityNormalBinormal)];
            let audit = audit(&audited(request));
            assert!(audit.position_error.is_some_and(|error| error < 3e-15), "{audit:?}");
            assert!(audit.velocity_error.is_some_and(|error| error < 3e-15), "{audit:?}");
        }
    }
}

fn mass(mu: f64) -> MassParameter {
    MassParameter::new(mu).expect("in range")
}

#[test]
fn in_inertial_axes() {
    // Sensitive enough that the error is far above the rounding of the conversion.
    let frame = Frame { axes: Axes::Inertial, origin: Origin::Smaller, x_axis: XAxis::TowardSmaller };
    let start = frame.from_default(mass(MU), &State::new(0.0, RECTILINEAR));
    let mut request = parts(MU, RECTILINEAR, 30.0);
    (request.frame, request.states) = (frame, vec![start]);
    let trajectory = audited(request);
    let centre = DoubleDouble::sum(1.0, -MU);
    let co_rotating = frame.convert(frame.co_rotating(), mass(MU), &start);
    let mut bits = co_rotating.components().map(DoubleDouble::from);
    bits[0] = bits[0] + centre;
    let bits: [DoubleDouble; 6] = std::array::from_fn(|i| bits[i]);
    let end = propagated(Motion::new(Path::fastest(), Primaries::new(MU), bits), 30.0);
    let mut end = end.state;
    end[0] = end[0] - centre;
    let end = State::new(trajectory.last.time, end.map(DoubleDouble::to_f64));
    let end = frame.co_rotating().convert(frame, mass(MU), &end);
    let truth: [f64; 6] = end.components().into();
    assert!(audit(&trajectory).position_error > Some(1e-10));
    assert_measured(&trajectory, &truth.map(DoubleDouble::from), 1e-4);
}

#[test]
fn where_an_event_stopped_the_trajectory() {
    let mut request = parts(MU, HALO, HALO_PERIOD);
    request.events = vec![Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Either,
        only: None,
        stop_after: NonZeroU64::new(1),
    }];
    let trajectory = audited(request);
    assert_eq!(trajectory.outcome, Outcome::StoppedByEvent);
    let there = propagated(motion(MU, HALO), trajectory.last.time);
    // The answer tells the time rounded, the audit knows it better.
    let rounding = 4e-16;
    let [position, velocity] = errors(&trajectory.last, &there.state);
    let audit = audit(&trajectory);
    assert!(audit.position_error.is_some_and(|error| (error - position).abs() < rounding), "{audit:?}");
    assert!(audit.velocity_error.is_some_and(|error| (error - velocity).abs() < rounding), "{audit:?}");
}

#[test]
fn on_the_way_into_a_primary() {
    // Down from rest in inertial axes: the step floor ends the trajectory, or its audit before it gets there.
    let trajectory = audited(parts(MU, [1.0 - MU + 0.01, 0.0, 0.0, 0.0, -0.01, 0.0], 0.1));
    assert_eq!(trajectory.outcome, Outcome::StepFloor);
    let Audit { outcome, position_error, velocity_error } = audit(&trajectory);
    assert!(matches!(outcome, Outcome::StepFloor | Outcome::Complete), "{outcome:?}");
    let finished = outcome == Outcome::Complete;
    assert_eq!((position_error.is_some(), velocity_error.is_some()), (finished, finished));
}

#[test]
fn steps_in_double_double_count_more() {
    let mut few = parts(MU, HALO, HALO_PERIOD);
    few.limits.steps = 100;
    let trajectory = audited(few.clone());
    assert_eq!(trajectory.outcome, Outcome::Complete);
    let unfinished = Audit { outcome: Outcome::StepLimit, position_error: None, velocity_error: None };
    assert_eq!(audit(&trajectory), unfinished);
    few.limits.steps = 1000;
    assert_eq!(audit(&audited(few)).outcome, Outcome::Complete);
}

#[test]
fn interrupted() {
    let request = Request::new(RequestParts { audit: true, ..parts(MU, HALO, HALO_PERIOD) }).expect("valid");
    // One poll starts the trajectory, whose few steps ask no more; the audit asks at once and every 16 steps.
    let after = |polls, stop| solve(&request, &AfterPolls::new(polls, stop));
    assert_eq!(after(1, Stop::Cancelled), Err(Failure::Cancelled));
    assert_eq!(after(2, Stop::Cancelled), Err(Failure::Cancelled));
    let timed = |polls| after(polls, Stop::WallTime).expect("not cancelled").remove(0);
    assert_eq!(audit(&timed(0)).outcome, Outcome::NotStarted);
    assert_eq!(audit(&timed(1)).outcome, Outcome::WallTimeLimit);
    assert_eq!(timed(1).outcome, Outcome::Complete);
    assert_eq!(audit(&timed(2)).outcome, Outcome::WallTimeLimit);
    assert_eq!(audit(&timed(3)).outcome, Outcome::Complete);
}

#[test]
fn what_cannot_be_audited_is_refused() {
    let finest = RequestParts { arithmetic: Arithmetic::DoubleDouble, audit: true, ..parts(MU, HALO, 1.0) };
    assert_eq!(Request::new(finest).expect_err("nothing finer"), [Invalid::AuditOfDoubleDouble]);

    let long = RequestParts { audit: true, ..parts(MU, HALO, 1e5) };
    let asked = 26 * 50_000;
    let fault = Invalid::AuditSteps { trajectory: 0, asked, limit: 1_000_000 };
    assert_eq!(Request::new(long.clone()).expect_err("too long"), [fault]);
    // What may end early may cost less.
    let event = Event {
        when: When::Plane(Plane::across(1, 0.0)),
        direction: Direction::Either,
        only: None,
        stop_after: NonZeroU64::new(1),
    };
    assert!(Request::new(RequestParts { events: vec![event], ..long }).is_ok());
}
