//! Frames against kinematics known from elsewhere.

use std::f64::consts::{FRAC_PI_2, PI};

use mechanics::frame::{Axes, Frame, NotCanonical, Origin, XAxis};
use mechanics::quantity::{MassParameter, Quantity};
use mechanics::state::State;
use nalgebra::{Matrix3, Matrix6, Rotation3, Vector3, Vector6};
use proptest::prelude::*;

const MU: MassParameter = MassParameter::constant(0.0121505856);

fn frames() -> Vec<Frame> {
    let mut frames = Vec::new();
    for axes in [Axes::Rotating, Axes::Inertial] {
        for origin in [Origin::Barycenter, Origin::Larger, Origin::Smaller] {
            for x_axis in [XAxis::TowardSmaller, XAxis::TowardLarger] {
                frames.push(Frame { axes, origin, x_axis });
            }
        }
    }
    frames
}

fn states() -> impl Strategy<Value = State> {
    (-100.0..100.0, prop::array::uniform6(-2.0..2.0))
        .prop_map(|(time, components)| State::new(time, components))
}

fn near(a: &Vector6<f64>, b: &Vector6<f64>, tolerance: f64) -> bool {
    (a - b).amax() <= tolerance
}

#[test]
fn the_default_frame_keeps_every_bit() {
    let state = State::new(3.0, [-0.0, 0.1, -0.0, 1e-300, -0.0, 5e-324]);
    let frame = Frame::default();
    let bits = |state: &State| state.components().map(f64::to_bits);
    assert_eq!(bits(&frame.from_default(MU, &state)), bits(&state));
    assert_eq!(bits(&frame.to_default(MU, &state)), bits(&state));
    assert_eq!(frame.jacobian(3.0), Matrix6::identity());
    assert!(
        frame.jacobian(3.0).iter().chain(&frame.inverse_jacobian(3.0)).all(|entry| entry.is_sign_positive())
    );
}

/// Every frame to every other is the way through the default one, but for the digits that the way round loses.
#[test]
fn frames_convert_into_each_other() {
    let given = State::new(2.5, [0.7, 0.3, 0.05, 0.1, -0.2, 0.02]);
    for from in frames() {
        for to in frames() {
            let direct = from.convert(to, MU, &given).components();
            let through_default = to.from_default(MU, &from.to_default(MU, &given)).components();
            assert!(near(&direct, &through_default, 2e-15), "{from:?} to {to:?}");
        }
        assert_eq!(from.convert(from, MU, &given), given);
    }
}

#[test]
fn states_about_one_origin_keep_their_digits() {
    let distance = 1e-30;
    let given = State::new(2.5, [0.6 * distance, 0.8 * distance, 0.0, 0.0, 0.0, 0.0]);
    for from in frames() {
        for to in frames().into_iter().filter(|to| to.origin == from.origin) {
            let found = from.convert(to, MU, &given);
            let error = (found.position.norm() / distance - 1.0).abs();
            assert!(error < 1e-15, "{from:?} to {to:?}: {error:e}");
        }
    }
}

#[test]
fn bodies_at_rest_in_rotating_axes_circle_the_origin() {
    // Uniform circular motion: the smaller primary seen from the larger is at (cos t, sin t) with velocity
    // (−sin t, cos t), Kepler's problem with unit separation and mean motion.
    let time = 2.5f64;
    let smaller = State::new(time, [1.0 - MU.get(), 0.0, 0.0, 0.0, 0.0, 0.0]);
    let (sin, cos) = time.sin_cos();
    let seen = |x_axis| {
        let frame = Frame { axes: Axes::Inertial, origin: Origin::Larger, x_axis };
        frame.from_default(MU, &smaller).components()
    };
    let circle = Vector6::new(cos, sin, 0.0, -sin, cos, 0.0);
    assert!(near(&seen(XAxis::TowardSmaller), &circle, 3e-16));
    assert!(near(&seen(XAxis::TowardLarger), &-circle, 3e-16));

    // A quarter of a revolution on, the barycentric inertial y axis points to the smaller primary.
    let later = State { time: FRAC_PI_2, ..smaller };
    let fixed = Frame { axes: Axes::Inertial, ..Frame::default() }.from_default(MU, &later);
    let expected = (1.0 - MU.get()) * Vector6::new(0.0, 1.0, 0.0, -1.0, 0.0, 0.0);
    assert!(near(&fixed.components(), &expected, 3e-16));
}

#[test]
fn the_other_convention_puts_the_smaller_primary_on_the_left() {
    // With x towards the larger primary it lies at x = μ and the smaller at x = μ − 1 (Szebehely 1967, Theory of
    // Orbits, whose drawings have it so).
    let frame = Frame { x_axis: XAxis::TowardLarger, ..Frame::default() };
    let seen = |x| frame.position_from_default(MU, 0.0, &Vector3::new(x, 0.0, 0.0)).x;
    assert_eq!((seen(-MU.get()), seen(1.0 - MU.get())), (MU.get(), MU.get() - 1.0));
    let half_turn = Rotation3::from_axis_angle(&Vector3::z_axis(), PI);
    let v = Vector3::new(0.1, 0.2, 0.3);
    assert!((frame.direction_from_default(5.0, &v) - half_turn * v).norm() < 1e-16);
}

#[test]
fn momenta_are_inertial_velocities_along_the_rotating_axes() {
    // Generating the canonical momenta of the rotating frame from the kinetic energy of the inertial velocity is
    // textbook (Szebehely 1967, chapter 7): they are that velocity's components along the rotating axes.
    let state = State::new(0.0, [0.4, -0.7, 0.2, 0.3, 0.8, -0.1]);
    for x_axis in [XAxis::TowardSmaller, XAxis::TowardLarger] {
        let rotating = Frame { x_axis, ..Frame::default() };
        let inertial = Frame { axes: Axes::Inertial, ..rotating };
        let seen = rotating.from_default(MU, &state);
        let momentum = rotating.momentum(&seen).expect("canonical");
        assert!((momentum - inertial.from_default(MU, &state).velocity).norm() < 1e-15);
        let velocity = rotating.velocity_from_momentum(&seen.position, &momentum).expect("canonical");
        assert!((velocity - seen.velocity).norm() < 1e-15);
    }
    let frame = Frame { origin: Origin::Smaller, ..Frame::default() };
    assert_eq!(frame.momentum(&state), Err(NotCanonical));
    let frame = Frame { axes: Axes::Inertial, ..Frame::default() };
    assert_eq!(frame.velocity_from_momentum(&state.position, &state.velocity), Err(NotCanonical));
}

#[test]
fn momenta_make_the_matrix_symplectic() {
    // Canonical variables of one frame are canonical in the other: the Jacobian in momenta satisfies MᵀJM = J.
    let mut legendre = Matrix6::identity();
    (legendre[(3, 1)], legendre[(4, 0)]) = (-1.0, 1.0);
    let mut form = Matrix6::zeros();
    form.fixed_view_mut::<3, 3>(0, 3).copy_from(&Matrix3::identity());
    form.fixed_view_mut::<3, 3>(3, 0).copy_from(&-Matrix3::identity());
    let inertial = Frame { axes: Axes::Inertial, x_axis: XAxis::TowardLarger, ..Frame::default() };
    // From rotating momenta to inertial positions and velocities, which are canonical themselves.
    let matrix = inertial.jacobian(1.2) * legendre.try_inverse().expect("unit determinant");
    assert!((matrix.transpose() * form * matrix - form).amax() < 1e-15);
}

proptest! {
    #[test]
    fn there_and_back(state in states()) {
        for frame in frames() {
            let back = frame.to_default(MU, &frame.from_default(MU, &state));
            prop_assert!(near(&back.components(), &state.components(), 3e-15), "{frame:?}");
            prop_assert_eq!(back.time.to_bits(), state.time.to_bits());
            let position = frame.position_from_default(MU, state.time, &state.position);
            prop_assert_eq!(position, frame.from_default(MU, &state).position);
            let back = frame.position_to_default(MU, state.time, &position);
            prop_assert!((back - state.position).norm() < 3e-15);
        }
    }

    #[test]
    fn velocities_are_rates_of_positions(state in states()) {
        // Central difference over a straight piece of path in the rotating frame.
        let step = 1e-5;
        for frame in frames() {
            let at = |time: f64| {
                let position = state.position + state.velocity * time;
                frame.position_from_default(MU, state.time + time, &position)
            };
            let rate = (at(step) - at(-step)) / (2.0 * step);
            let velocity = frame.from_default(MU, &state).velocity;
            prop_assert!((rate - velocity).norm() < 1e-8, "{frame:?}: {rate} against {velocity}");
        }
    }

    #[test]
    fn jacobians_are_differences_of_states(state in states(), other in states()) {
        let other = State { time: state.time, ..other };
        for frame in frames() {
            let [here, there] = [&state, &other].map(|state| frame.from_default(MU, state).components());
            let predicted = frame.jacobian(state.time) * (other.components() - state.components());
            prop_assert!(near(&(there - here), &predicted, 3e-14), "{frame:?}");
            let product = frame.jacobian(state.time) * frame.inverse_jacobian(state.time);
            prop_assert!((product - Matrix6::identity()).amax() < 1e-15, "{frame:?}");
            let direction = frame.direction_from_default(state.time, &state.velocity);
            let back = frame.direction_to_default(state.time, &direction);
            prop_assert!((back - state.velocity).norm() < 3e-15);
        }
    }

    #[test]
    fn planes_keep_their_distance(state in states(), normal in prop::array::uniform3(-1.0..1.0), offset in -2.0..2.0) {
        let normal = Vector3::from(normal);
        for frame in frames() {
            let seen = frame.position_from_default(MU, state.time, &state.position);
            let (m, d) = frame.plane_in_default(MU, state.time, &normal, offset);
            let (there, here) = (normal.dot(&seen) - offset, m.dot(&state.position) - d);
            prop_assert!((there - here).abs() < 1e-14, "{frame:?}: {there} against {here}");
        }
    }
}
