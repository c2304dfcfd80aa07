//! State transition matrices.

use mechanics::frame::{Axes, Frame, Origin, XAxis};
use mechanics::propagation::{BurnAxes, Manoeuvre, MatrixOutput, RequestParts, Sampling};
use mechanics::quantity::{Quantity, Tolerance};
use nalgebra::{Matrix6, Vector3, Vector6};
use proptest::prelude::*;

use super::{HALO, HALO_PERIOD, MU, any_frame, parts, run};
use crate::reference::cases::case;
use crate::reference::truth::matrix_error;

/// Central differences of the propagation itself, with the round-off and the truncation each about 1e-8.
fn by_differences(request: &RequestParts) -> Matrix6<f64> {
    const NUDGE: f64 = 1e-5;
    let given = request.states[0];
    let mut matrix = Matrix6::zeros();
    for column in 0..6 {
        let end = |nudge: f64| -> Vector6<f64> {
            let mut components = given.components();
            components[column] += nudge;
            let mut nudged = request.clone();
            nudged.states[0] = mechanics::state::State::new(given.time, components.into());
            run(nudged).last.components()
        };
        // Richardson's extrapolation of two central differences.
        let (half, whole) = (NUDGE / 2.0, NUDGE);
        let fine = (end(half) - end(-half)) / (2.0 * half);
        let coarse = (end(whole) - end(-whole)) / (2.0 * whole);
        matrix.set_column(column, &((fine * 4.0 - coarse) / 3.0));
    }
    matrix
}

#[test]
fn matrices_of_many_digits() {
    // The near-rectilinear revolution passes the smaller primary closely, where every rounding is amplified: of forty orbits
    // about it the median error is 4e-13, of those about the halo orbit 7e-14.
    for (name, bound) in [("stm_halo", 1e-13), ("stm_nrho", 1e-12)] {
        let matrix = run(case(name).expect("a case")).matrix.expect("asked for");
        let error = matrix_error(name, &matrix);
        assert!(error <= bound, "{name}: {error}");
    }
}

#[test]
fn the_trajectory_has_the_same_bits_with_a_matrix() {
    let plain = run(parts(MU, HALO, HALO_PERIOD));
    let mut request = parts(MU, HALO, HALO_PERIOD);
    request.matrix = MatrixOutput::Final;
    assert_eq!(run(request).last, plain.last);
}

#[test]
fn sampled_matrices_are_those_of_shorter_trajectories() {
    let mut request = parts(MU, HALO, 2.0);
    request.matrix = MatrixOutput::Samples;
    request.sampling = Sampling::Times(vec![0.0, 0.7, 2.0]);
    let trajectory = run(request);
    assert_eq!(trajectory.samples.matrices[0], Matrix6::identity());
    assert_eq!(Some(trajectory.samples.matrices[2]), trajectory.matrix);
    let mut request = parts(MU, HALO, 0.7);
    request.matrix = MatrixOutput::Final;
    let shorter = run(request).matrix.expect("asked for");
    assert!((trajectory.samples.matrices[1] - shorter).amax() < 1e-14 * shorter.amax());
}

#[test]
fn a_burn_along_the_velocity_turns_with_it() {
    for frame in [
        Frame::default(),
        Frame { axes: Axes::Inertial, origin: Origin::Smaller, x_axis: XAxis::TowardLarger },
    ] {
        let mut request = parts(MU, HALO, 1.5);
        request.states[0] = frame.from_default(request.mass_parameter, &request.states[0]);
        request.frame = frame;
        request.matrix = MatrixOutput::Final;
        request.manoeuvres = vec![Manoeuvre {
            time: 0.6,
            delta_v: Vector3::new(0.05, 0.03, -0.02),
            axes: BurnAxes::VelocityNormalBinormal,
            trajectories: None,
        }];
        let trajectory = run(request.clone());
        let matrix = trajectory.matrix.expect("asked for");
        let expected = by_differences(&request);
        assert!((matrix - expected).amax() < 1e-7 * expected.amax());
        assert!(trajectory.evidence.symplectic_defect.expect("measured") < 1e-11, "of the legs");
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(24))]

    #[test]
    fn matrix_agrees_with_differences_and_is_symplectic(
        frame in any_frame(),
        mu in 1e-6_f64..0.5,
        state in [0.3_f64..0.6, -0.3..0.3, -0.2..0.2, -0.3..0.3, 0.5..1.2, -0.3..0.3],
        duration in -2.0_f64..2.0,
    ) {
        let mut request = parts(mu, state, duration);
        request.states[0].time = 0.4;
        request.states[0] = frame.from_default(request.mass_parameter, &request.states[0]);
        request.frame = frame;
        request.matrix = MatrixOutput::Final;
        // A close approach amplifies the rounding on the way, which the last matrix does not show.
        request.sampling = Sampling::EveryStep;
        let trajectory = run(request.clone());
        request.sampling = Sampling::None;
        let fastest = trajectory.samples.velocities.iter().map(Vector3::norm).fold(0.0, f64::max);
        prop_assume!(fastest < 3.0);
        let matrix = trajectory.matrix.expect("asked for");
        let expected = by_differences(&request);
        let scale = expected.amax();
        prop_assert!((matrix - expected).amax() < 1e-6 * scale * scale.max(1.0));
        let defect = trajectory.evidence.symplectic_defect.expect("measured");
        prop_assert!(defect < 1e-12 * scale * scale, "{defect} {scale}");
        prop_assert!(trajectory.evidence.determinant_defect.expect("measured") < 1e-9 * scale * scale);
    }
}

#[test]
fn matrices_on_the_way_into_a_centre_are_finite_or_none() {
    for (mu, state, duration, tolerance) in [
        (0.2, [-0.188_244_005_433_575_4, 0.0, 0.0, 0.0, 0.0, 0.0], -3.0, 1e-15),
        (
            0.5,
            [0.505_617_994_972_893_8, 0.0, -0.004_526_297_828_117_165, 0.0, 0.006_333_593_353_681_137, 0.0],
            -3.0,
            1e-15,
        ),
        (0.2, [-0.25, 0.0, 0.0, 0.0, 0.0, 0.0], 0.5, 1e-3),
    ] {
        let mut request = parts(mu, state, duration);
        request.tolerance = Tolerance::new(tolerance).expect("in range");
        request.matrix = MatrixOutput::Final;
        let trajectory = run(request);
        assert!(trajectory.matrix.is_none_or(|matrix| matrix.iter().all(|element| element.is_finite())));
        let evidence = trajectory.evidence;
        for defect in [evidence.determinant_defect, evidence.symplectic_defect, Some(evidence.jacobi_drift)] {
            assert!(defect.is_none_or(f64::is_finite), "{evidence:?}");
        }
        assert!(trajectory.last.components().iter().all(|component| component.is_finite()));
    }
}
