//! Contact with a primary's surface, and what happens without one.

use mechanics::frame::{Frame, Origin};
use mechanics::propagation::{Contact, Outcome};
use mechanics::quantity::{Distance, Quantity};
use nalgebra::Vector3;

use super::{MU, parts, run};

fn radius(value: f64) -> Distance {
    Distance::new(value).expect("in range")
}

/// Falls towards the smaller primary from rest beside it.
const FALLING: [f64; 6] = [1.0 - MU + 0.05, 0.0, 0.01, 0.0, 0.0, 0.0];

#[test]
fn a_fall_ends_on_the_surface() {
    let mut request = parts(MU, FALLING, 5.0);
    request.contact = Contact { larger: Some(radius(0.0166)), smaller: Some(radius(0.0045)) };
    let trajectory = run(request);
    assert_eq!(trajectory.outcome, Outcome::ContactSmaller);
    let height = (trajectory.last.position - Vector3::new(1.0 - MU, 0.0, 0.0)).norm() - 0.0045;
    let speed = trajectory.last.velocity.norm();
    assert!(height.abs() < 4e-16 + 1e-16 * speed, "{height}");
}

#[test]
fn a_grazing_pass_between_two_steps_is_seen() {
    // The surface reaches out to just above the closest approach: contact lasts a small part of one step.
    let mut request = parts(MU, FALLING, 0.4);
    request.sampling = mechanics::propagation::Sampling::Count(200_001);
    let path = run(request);
    let centre = Vector3::new(1.0 - MU, 0.0, 0.0);
    let closest = path.samples.positions.iter().map(|p| (p - centre).norm()).fold(f64::MAX, f64::min);
    for (surface, expected) in
        [(closest * (1.0 + 1e-6), Outcome::ContactSmaller), (closest * (1.0 - 1e-3), Outcome::Complete)]
    {
        let mut request = parts(MU, FALLING, 0.4);
        request.contact = Contact { larger: None, smaller: Some(radius(surface)) };
        assert_eq!(run(request).outcome, expected);
    }
}

#[test]
fn a_start_inside_ends_at_once() {
    let mut request = parts(MU, FALLING, 5.0);
    request.contact = Contact { larger: None, smaller: Some(radius(0.06)) };
    let trajectory = run(request);
    assert_eq!(trajectory.outcome, Outcome::ContactSmaller);
    assert_eq!(trajectory.evidence.steps, 0);
    assert_eq!(trajectory.last.time.to_bits(), 0.0_f64.to_bits());
}

#[test]
fn a_start_at_rest_on_the_surface_stays_there() {
    let mut request = parts(MU, [0.0166, 0.0, 0.0, 0.0, 0.0, 0.0], 1.0);
    request.frame = Frame { origin: Origin::Larger, ..Frame::default() };
    request.contact = Contact { larger: Some(radius(0.0166)), smaller: None };
    let trajectory = run(request.clone());
    assert_eq!(trajectory.outcome, Outcome::ContactLarger);
    assert_eq!(trajectory.evidence.steps, 0);
    // Fast enough along the surface it is on an orbit that rises from there.
    request.states[0].velocity.y = 9.0;
    request.durations =
        mechanics::propagation::Durations::All(mechanics::quantity::Duration::new(1e-3).expect("in range"));
    assert_eq!(run(request).outcome, Outcome::Complete);
}

#[test]
fn a_start_on_the_surface_may_leave() {
    // Straight up at a speed that does not come back within the time given.
    let up = [1.0 - MU + 0.01, 0.0, 0.0, 1.5, 0.0, 0.0];
    let mut request = parts(MU, up, 0.01);
    request.contact = Contact { larger: None, smaller: Some(radius(0.01 - 1e-17)) };
    assert_eq!(run(request).outcome, Outcome::Complete);
}

#[test]
fn a_fall_into_the_centre_ends_at_the_step_floor() {
    let trajectory = run(parts(MU, [1.0 - MU, 0.0, 1e-6, 0.0, 0.0, 0.0], 1e-3));
    assert_eq!(trajectory.outcome, Outcome::StepFloor);
    assert!(trajectory.last.position.iter().all(|c| c.is_finite()));
    assert!(trajectory.evidence.steps < 100_000);
}

#[test]
fn a_close_approach_loses_no_more_than_its_conditioning() {
    // Down to a millionth from the smaller primary's centre, and back along the same path in time.
    let x = 1e-6;
    let fast = (2.0 * MU / x * 0.999).sqrt();
    let start = [1.0 - MU + x, 0.0, 0.0, 0.0, fast, 0.0];
    let out = run(parts(MU, start, 0.3));
    let mut back = parts(MU, start, -0.3);
    back.states[0] = out.last;
    let home = run(back).last;
    // The position at closest approach is a double near 1, so a part in 1e10 of its distance is rounding.
    assert!((home.position.x - start[0]).abs() < 1e-9);
    assert!(out.evidence.jacobi_drift < 1e-10 * fast * fast, "{}", out.evidence.jacobi_drift);
}

#[test]
fn a_start_next_to_a_centre_ends_at_the_step_floor_however_near() {
    let mut distance = 1e-8;
    while distance > 1e-150 {
        for centre in [-MU, 1.0 - MU] {
            let trajectory = run(parts(MU, [centre, distance, 0.0, 0.0, 0.0, 0.0], 1.0));
            assert!(trajectory.last.components().iter().all(|c| c.is_finite()), "{distance}");
            assert!(trajectory.evidence.jacobi_drift.is_finite());
            if distance < 1e-10 {
                assert_eq!(trajectory.outcome, Outcome::StepFloor, "{distance}");
            }
        }
        distance /= 7.0;
    }
}

#[test]
fn a_trajectory_that_ended_on_a_surface_does_not_go_on_inside() {
    let mut fallen = 0;
    for i in 0..100 {
        let angle = 0.0628 * f64::from(i);
        let start = [0.2 * libm::cos(angle) - MU, 0.2 * libm::sin(angle), 0.01, 0.0, 0.0, 0.0];
        let mut request = parts(MU, start, 5.0);
        request.contact = Contact { larger: Some(radius(0.0166)), smaller: Some(radius(0.0045)) };
        let first = run(request.clone());
        if first.outcome != Outcome::ContactLarger {
            continue;
        }
        fallen += 1;
        request.states[0] = first.last;
        let second = run(request);
        assert_eq!(second.outcome, Outcome::ContactLarger);
        assert!(second.last.time - first.last.time < 1e-12, "{angle}");
    }
    assert!(fallen > 10, "{fallen} fall onto the larger primary");
}

#[test]
fn a_state_counted_from_a_primary_keeps_its_digits() {
    for origin in [Origin::Larger, Origin::Smaller] {
        let mut distance = 1e-3;
        while distance > 1e-17 {
            let mut request = parts(MU, [distance, distance / 3.0, 0.0, 0.0, 0.0, 0.0], 0.0);
            request.frame = Frame { origin, ..Frame::default() };
            let last = run(request).last;
            assert_eq!(last.position.x.to_bits(), distance.to_bits());
            distance /= 7.0;
        }
    }
}
