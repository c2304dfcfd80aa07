//! Events of all kinds: none missed, none twice, each at its place to round-off.

use std::num::NonZeroU64;

use mechanics::propagation::event::{Direction, Event, Only, Plane, Side, When};
use mechanics::propagation::{BurnAxes, Manoeuvre, Outcome, Sampling, Trajectory};
use mechanics::quantity::{Distance, Duration, Quantity, Tolerance};
use mechanics::system::Primary;
use nalgebra::Vector3;
use proptest::prelude::*;

use super::{HALO, HALO_PERIOD, MU, any_frame, parts, run};

fn event(when: When) -> Event {
    Event { when, direction: Direction::Either, only: None, stop_after: None }
}

fn distance(value: f64) -> Distance {
    Distance::new(value).expect("in range")
}

/// A near-rectilinear orbit: fast near the smaller primary, slow far from it.
const RECTILINEAR: [f64; 6] = [1.022026179865368, 0.0, -0.1821, 0.0, -0.10326652171473427, 0.0];

#[test]
fn a_halo_crosses_its_plane_of_symmetry_at_half_its_period() {
    let mut request = parts(MU, HALO, 0.75 * HALO_PERIOD);
    request.events = vec![event(When::Plane(Plane::across(1, 0.0)))];
    let events = run(request).events;
    assert_eq!(events.len(), 1, "the start on the plane is no event");
    assert!((events[0].state.time - 0.5 * HALO_PERIOD).abs() < 1e-12);
    assert!(events[0].state.position.y.abs() < 1e-16);
    assert!(events[0].state.velocity.x.abs() < 1e-11, "at right angles");
}

#[test]
fn directions_are_those_of_increasing_time_backwards_too() {
    // Up after half a period and after one and a half, down after a whole one, either way in time.
    for (direction, expected) in [(Direction::Increasing, 2), (Direction::Decreasing, 1)] {
        for duration in [1.6 * HALO_PERIOD, -1.6 * HALO_PERIOD] {
            let mut request = parts(MU, HALO, duration);
            request.events = vec![Event { direction, ..event(When::Plane(Plane::across(1, 0.0))) }];
            let events = run(request).events;
            assert_eq!(events.len(), expected, "{direction:?} over {duration}");
            assert!(events.iter().all(|e| direction.admits(e.state.velocity.y)));
        }
    }
}

#[test]
fn several_crossings_in_one_step_are_all_found() {
    // Leaving the plane z = c by a hair and coming back: two crossings a few thousandths of a step apart.
    let mut request = parts(MU, RECTILINEAR, 1.6);
    request.sampling = Sampling::Count(200_001);
    request.events = vec![event(When::Periapsis(Primary::Smaller)), event(When::Apoapsis(Primary::Smaller))];
    let trajectory = run(request);
    assert_eq!(trajectory.events.len(), 2, "one of each in a revolution of 1.51");

    let top = trajectory.samples.positions.iter().map(|p| p.z).fold(f64::MIN, f64::max);
    let mut request = parts(MU, RECTILINEAR, 1.6);
    request.events = vec![event(When::Plane(Plane::across(2, top - 1e-9)))];
    let events = run(request).events;
    assert_eq!(events.len(), 2);
    assert!(events[1].state.time - events[0].state.time < 1e-3);
}

#[test]
fn a_touch_is_no_event() {
    // A planar orbit lies in the plane z = 0 all the time.
    let mut request = parts(MU, [0.3, 0.0, 0.0, 0.0, 1.5, 0.0], 20.0);
    request.events = vec![event(When::Plane(Plane::across(2, 0.0)))];
    assert!(run(request).events.is_empty());
}

#[test]
fn apses_are_extremes_of_the_distance() {
    for (when, sign) in [(When::Periapsis(Primary::Smaller), 1.0), (When::Apoapsis(Primary::Smaller), -1.0)] {
        let mut request = parts(MU, RECTILINEAR, 15.0);
        request.events = vec![event(when)];
        let events = run(request).events;
        assert!((9..=10).contains(&events.len()));
        for found in events {
            let from_smaller = |offset: f64| {
                let last = run(parts(MU, RECTILINEAR, found.state.time + offset)).last;
                (last.position - Vector3::new(1.0 - MU, 0.0, 0.0)).norm()
            };
            let here = from_smaller(0.0);
            assert!((from_smaller(1e-3) - here) * sign > 0.0);
            assert!((from_smaller(-1e-3) - here) * sign > 0.0);
        }
    }
}

#[test]
fn only_filters_before_counting_and_stop_after_ends_there() {
    let mut request = parts(MU, HALO, 10.0 * HALO_PERIOD);
    let below = Only { axis: 0, side: Side::Above, value: 1.0 };
    request.events = vec![
        Event {
            only: Some(Only { side: Side::Below, ..below }),
            stop_after: NonZeroU64::new(1),
            ..event(When::Plane(Plane::across(1, 0.0)))
        },
        Event {
            only: Some(below),
            stop_after: NonZeroU64::new(3),
            ..event(When::Plane(Plane::across(1, 0.0)))
        },
    ];
    let trajectory = run(request);
    assert_eq!(trajectory.outcome, Outcome::StoppedByEvent);
    assert_eq!(trajectory.stopped_by, Some(1));
    assert_eq!(trajectory.events.len(), 3);
    assert_eq!(trajectory.last, trajectory.events[2].state);
    assert!((trajectory.last.time - 1.5 * HALO_PERIOD).abs() < 1e-10);
}

#[test]
fn a_trajectory_goes_on_from_the_event_that_ended_another() {
    let stop = Event { stop_after: NonZeroU64::new(1), ..event(When::Plane(Plane::across(1, 0.0))) };
    let mut request = parts(MU, HALO, 10.0);
    request.events = vec![stop.clone()];
    let first = run(request);
    let mut request = parts(MU, HALO, 10.0);
    request.states[0] = first.last;
    request.events = vec![stop];
    let second = run(request);
    assert!((second.last.time - HALO_PERIOD).abs() < 1e-11, "not the same event again");
}

#[test]
fn events_are_counted_up_to_their_limit() {
    let mut request = parts(MU, [0.3, 0.0, 0.0, 0.0, 1.5, 0.0], 100.0);
    request.limits.events = 7;
    request.events = vec![event(When::Plane(Plane::across(1, 0.0)))];
    let trajectory = run(request);
    assert_eq!(trajectory.outcome, Outcome::EventLimit);
    assert_eq!(trajectory.events.len(), 7);
    assert_eq!(trajectory.last, trajectory.events[6].state);
}

const PROGRADE: [f64; 6] = [0.3, 0.0, 0.0, 0.0, 1.2, 0.0];

fn apses() -> Vec<Event> {
    vec![event(When::Periapsis(Primary::Larger)), event(When::Apoapsis(Primary::Larger))]
}

#[test]
fn an_apsis_at_a_manoeuvre_is_not_lost() {
    let mut request = parts(MU, PROGRADE, 8.0);
    request.events = apses();
    let plain = run(request.clone()).events;
    for found in &plain {
        for along in [0.0, 0.001, 0.05] {
            let velocity = found.state.velocity.normalize() * along;
            request.manoeuvres = vec![Manoeuvre {
                time: found.state.time,
                delta_v: velocity,
                axes: BurnAxes::Frame,
                trajectories: None,
            }];
            let burnt = run(request.clone()).events;
            let there: Vec<_> =
                burnt.iter().filter(|e| (e.state.time - found.state.time).abs() < 1e-9).collect();
            assert_eq!(there.len(), 1, "{} {along}", found.state.time);
            assert_eq!(there[0].event, found.event);
        }
    }
}

#[test]
fn an_event_at_the_very_end_is_found() {
    let mut request = parts(MU, PROGRADE, 8.0);
    request.events = apses();
    request.events.push(event(When::Plane(Plane::across(1, 0.0))));
    let all = run(request.clone()).events;
    for (index, found) in all.iter().enumerate() {
        let duration = Duration::new(found.state.time).expect("in range");
        request.durations = mechanics::propagation::Durations::All(duration);
        let shorter = run(request.clone());
        assert_eq!(shorter.events.len(), index + 1, "{}", found.state.time);
        // And not a second time by whoever goes on.
        let mut rest = request.clone();
        rest.states[0] = shorter.last;
        rest.durations = mechanics::propagation::Durations::All(Duration::new(0.05).expect("in range"));
        let again = run(rest).events;
        assert!(again.iter().all(|e| e.event != found.event || e.state.time - found.state.time > 1e-3));
    }
}

#[test]
fn an_event_at_the_end_of_a_step_is_found_once_at_every_tolerance() {
    for tolerance in [1e-3, 1e-6, 1e-9, 1e-12, 1e-15] {
        let mut request = parts(MU, [0.3, 0.0, 0.1, 0.0, 1.2, 0.1], 6.0);
        request.tolerance = Tolerance::new(tolerance).expect("in range");
        request.sampling = Sampling::EveryStep;
        let path = run(request.clone());
        let centre = Vector3::new(-MU, 0.0, 0.0);
        for step_end in &path.samples.positions[1..] {
            for offset in [-1e-4, -1e-6, -1e-8, -1e-11, 0.0, 1e-15, 1e-13, 1e-9, 1e-7, 1e-5] {
                let radius = (step_end - centre).norm() * (1.0 + offset);
                request.events = vec![event(When::Distance(Primary::Larger, distance(radius)))];
                let times: Vec<f64> = run(request.clone()).events.iter().map(|e| e.state.time).collect();
                for pair in times.windows(2) {
                    assert!(pair[1] - pair[0] > 1e-4, "{tolerance} {offset} {pair:?}");
                }
            }
        }
    }
}

#[test]
fn late_times_do_not_double_events_of_inertial_axes() {
    let mut request = parts(MU, PROGRADE, 3.0);
    request.states[0].time = 1e6;
    request.frame.axes = mechanics::frame::Axes::Inertial;
    request.sampling = Sampling::EveryStep;
    let path = run(request.clone());
    for step_end in &path.samples.positions[1..] {
        for offset in [-1e-10, -1e-11, 0.0, 1e-12, 1e-11, 1e-10] {
            request.events = vec![event(When::Plane(Plane::across(1, step_end.y + offset)))];
            let times: Vec<f64> = run(request.clone()).events.iter().map(|e| e.state.time).collect();
            assert!(times.windows(2).all(|pair| pair[1] - pair[0] > 1e-6), "{offset} {times:?}");
        }
    }
}

/// Sign changes of a condition between dense samples.
fn counted(trajectory: &Trajectory, condition: impl Fn(&Vector3<f64>, &Vector3<f64>) -> f64) -> usize {
    let values: Vec<f64> = trajectory
        .samples
        .positions
        .iter()
        .zip(&trajectory.samples.velocities)
        .map(|(position, velocity)| condition(position, velocity))
        .collect();
    values.windows(2).filter(|pair| pair[0] * pair[1] < 0.0).count()
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn events_found_are_those_seen_by_dense_sampling(
        frame in any_frame(),
        mu in 0.001_f64..0.5,
        state in [0.2_f64..0.6, -0.3..0.3, -0.2..0.2, -0.5..0.5, 0.5..1.5, -0.5..0.5],
        backwards in any::<bool>(),
        normal in [-1.0_f64..1.0, -1.0..1.0, -1.0..1.0],
        value in -0.2_f64..0.2,
    ) {
        let duration = if backwards { -6.0 } else { 6.0 };
        let mut request = parts(mu, state, duration);
        request.states[0].time = 0.7;
        request.states[0] = frame.from_default(request.mass_parameter, &request.states[0]);
        request.frame = frame;
        request.sampling = Sampling::Count(20_001);
        let normal = Vector3::from(normal);
        prop_assume!(normal.norm() > 0.1);
        let plane = Plane::through(normal, Vector3::new(value, 0.1, 0.0)).expect("a direction");
        let unit = plane.normal();
        let offset = plane.offset();
        let radius = 0.3 + value;
        request.events = vec![
            event(When::Plane(plane)),
            event(When::Distance(Primary::Larger, distance(radius))),
            event(When::Periapsis(Primary::Smaller)),
            event(When::Apoapsis(Primary::Smaller)),
        ];
        let trajectory = run(request);
        let found = |entry| trajectory.events.iter().filter(|e| e.event == entry).count();

        prop_assert_eq!(found(0), counted(&trajectory, |r, _| unit.dot(r) - offset));

        // Distances in the rotating barycentric frame, for these depend on none.
        let mut request = parts(mu, state, duration);
        request.sampling = Sampling::Count(20_001);
        let plain = run(request);
        let larger = Vector3::new(-mu, 0.0, 0.0);
        let smaller = Vector3::new(1.0 - mu, 0.0, 0.0);
        prop_assert_eq!(found(1), counted(&plain, |r, _| (r - larger).norm() - radius));
        prop_assert_eq!(found(2) + found(3), counted(&plain, |r, v| (r - smaller).dot(v)));

        for one in &trajectory.events {
            if one.event == 0 {
                prop_assert!((unit.dot(&one.state.position) - offset).abs() < 1e-14);
            }
        }
        let along = |e: &f64| if backwards { -e } else { *e };
        let times: Vec<f64> = trajectory.events.iter().map(|e| along(&e.state.time)).collect();
        prop_assert!(times.windows(2).all(|pair| pair[0] <= pair[1]));
    }
}
