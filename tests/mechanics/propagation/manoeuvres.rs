//! Impulses: where they lie on the clock, their axes, both directions of time.

use mechanics::frame::{Axes, Frame, Origin, XAxis};
use mechanics::propagation::{BurnAxes, Durations, Invalid, Manoeuvre, Request, Sampling};
use mechanics::quantity::{Duration, Quantity};
use mechanics::state::State;
use nalgebra::Vector3;

use super::{HALO, MU, apart, parts, run};

fn burn(time: f64, delta_v: [f64; 3]) -> Manoeuvre {
    Manoeuvre { time, delta_v: Vector3::from(delta_v), axes: BurnAxes::Frame, trajectories: None }
}

#[test]
fn a_manoeuvre_is_a_new_start_with_another_velocity() {
    let mut request = parts(MU, HALO, 2.0);
    request.manoeuvres = vec![burn(0.8, [0.01, -0.02, 0.03])];
    let one = run(request).last;
    let mut there = run(parts(MU, HALO, 0.8)).last;
    there.velocity += Vector3::new(0.01, -0.02, 0.03);
    let mut rest = parts(MU, HALO, 1.2);
    rest.states[0] = there;
    let two = run(rest).last;
    assert!(apart(&one, &two) < 1e-14);
}

#[test]
fn backwards_undoes_forwards() {
    let manoeuvres =
        vec![burn(0.5, [0.01, 0.0, 0.0]), burn(1.0, [0.0, 0.02, 0.0]), burn(2.0, [0.0, 0.0, 0.03])];
    let mut request = parts(MU, HALO, 2.0);
    request.manoeuvres = manoeuvres.clone();
    let there = run(request).last;
    let mut request = parts(MU, HALO, -2.0);
    request.states[0] = there;
    request.manoeuvres = manoeuvres;
    let home = run(request).last;
    assert!(apart(&home, &State::new(0.0, HALO)) < 1e-13);
    assert!((home.velocity.y - HALO[4]).abs() < 1e-13);
}

#[test]
fn the_state_at_a_manoeuvre_is_its_far_side() {
    let kick = [0.1, 0.0, 0.0];
    let mut request = parts(MU, HALO, 1.0);
    request.manoeuvres = vec![burn(0.0, kick), burn(0.5, kick), burn(1.0, kick)];
    request.sampling = Sampling::Times(vec![0.0, 0.5, 1.0]);
    let trajectory = run(request);
    let before: Vec<f64> = {
        let mut request = parts(MU, HALO, 0.5);
        request.manoeuvres = vec![burn(0.0, kick)];
        request.sampling = Sampling::Times(vec![0.0, 0.5]);
        run(request).samples.velocities.iter().map(|v| v.x).collect()
    };
    assert!((trajectory.samples.velocities[0].x - 0.1).abs() < 1e-16);
    assert!((trajectory.samples.velocities[1].x - (before[1] + 0.1)).abs() < 1e-15);
    assert_eq!(trajectory.samples.velocities[2], trajectory.last.velocity);
}

#[test]
fn a_sample_told_for_the_time_of_a_manoeuvre_is_its_far_side() {
    let mut request = parts(MU, [0.5, 0.0, 0.0, 0.0, 1.0, 0.0], 2.0);
    request.states[0].time = 2.2;
    request.sampling = Sampling::Interval(0.3);
    let times = run(request.clone()).samples.times;
    for (index, time) in times.iter().enumerate() {
        request.manoeuvres = vec![burn(*time, [0.0, 0.0, 0.5])];
        let vertical = run(request.clone()).samples.velocities[index].z;
        assert!((vertical - 0.5).abs() < 1e-15, "{time}");
    }
}

#[test]
fn the_axes_are_those_of_the_frame() {
    let frame = Frame { axes: Axes::Inertial, origin: Origin::Smaller, x_axis: XAxis::TowardLarger };
    let kick = Vector3::new(0.01, 0.02, 0.03);
    let mut request = parts(MU, HALO, 1.0);
    request.frame = frame;
    request.manoeuvres = vec![burn(1.0, kick.into())];
    let mut plain = parts(MU, HALO, 1.0);
    plain.frame = frame;
    let (with, without) = (run(request).last, run(plain).last);
    assert!((with.velocity - without.velocity - kick).norm() < 1e-15);
    assert!(apart(&with, &without) < 1e-15);
}

#[test]
fn along_velocity_normal_and_binormal() {
    let mut plain = parts(MU, HALO, 0.9);
    plain.frame = Frame { axes: Axes::Inertial, origin: Origin::Smaller, x_axis: XAxis::TowardSmaller };
    let before = run(plain.clone()).last;
    let (r, v) = (before.position, before.velocity);
    let normal = r.cross(&v);
    let expected = v + 0.01 * v.normalize() + 0.02 * normal.normalize() + 0.03 * v.cross(&normal).normalize();
    plain.manoeuvres =
        vec![Manoeuvre { axes: BurnAxes::VelocityNormalBinormal, ..burn(0.9, [0.01, 0.02, 0.03]) }];
    let after = run(plain).last;
    assert!((after.velocity - expected).norm() < 1e-14);
}

#[test]
fn a_manoeuvre_applies_to_the_trajectories_it_names() {
    let mut request = parts(MU, HALO, 1.0);
    request.states = vec![request.states[0]; 3];
    request.manoeuvres = vec![Manoeuvre { trajectories: Some(vec![2, 1]), ..burn(0.5, [0.1, 0.0, 0.0]) }];
    let all =
        mechanics::propagation::solve(&Request::new(request).expect("valid"), &mechanics::interrupt::Never)
            .expect("not cancelled");
    assert_eq!(all[0].last.position, run(parts(MU, HALO, 1.0)).last.position);
    assert_ne!(all[0].last.position, all[1].last.position);
    assert_eq!(all[1].last.position, all[2].last.position);
}

#[test]
fn what_is_wrong_is_told() {
    let mut request = parts(MU, HALO, 1.0);
    request.states.push(request.states[0]);
    request.durations = Durations::Each([1.0, -1.0].map(|d| Duration::new(d).expect("in range")).to_vec());
    request.manoeuvres = vec![
        burn(2.0, [0.0; 3]),
        Manoeuvre { trajectories: Some(vec![0, 7]), ..burn(0.5, [0.0; 3]) },
        Manoeuvre {
            axes: BurnAxes::VelocityNormalBinormal,
            trajectories: Some(vec![1]),
            ..burn(-0.5, [0.0; 3])
        },
    ];
    let problems = Request::new(request).expect_err("invalid");
    assert!(matches!(problems[0], Invalid::ManoeuvreOutside { index: 0, trajectory: 0, .. }));
    assert!(matches!(problems[1], Invalid::ManoeuvreFor { index: 1, place: 1, trajectory: 7, .. }));
    assert!(matches!(problems[2], Invalid::ManoeuvreBackwards { index: 2, trajectory: 1 }));
    assert_eq!(problems.len(), 3);
}
