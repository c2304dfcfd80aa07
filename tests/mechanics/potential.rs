//! Effective potential, its derivatives, Jacobi constant.

use mechanics::frame::Origin;
use mechanics::potential::{
    AtPrimary, JacobiConstant, JacobiForm, distances, distances_from, effective_potential, gradient, hessian,
};
use mechanics::state::State;
use nalgebra::Vector3;
use proptest::prelude::*;

use crate::reference::{JACOBI, assert_close, mass_parameter, number, rows};

/// Required of C, relative to the largest term of the plain form.
const ACCURACY: f64 = 4e-16;

/// Beside a primary C is all but 2GM/r, with the digits of r if r is counted from that primary.
#[test]
fn digits_survive_beside_a_primary() {
    let (mu, r) = (0.3, 1e-25);
    for (origin, gm) in [(Origin::Larger, 1.0 - mu), (Origin::Smaller, mu)] {
        let position = Vector3::new(0.6 * r, 0.0, -0.8 * r);
        let at_rest =
            JacobiConstant::at_rest_from(origin, mass_parameter(mu), &position).expect("off the centre");
        assert!((at_rest.value(JacobiForm::Plain) * r / (2.0 * gm) - 1.0).abs() <= ACCURACY);
        let distances = distances_from(origin, mass_parameter(mu), &position);
        assert!((distances.larger.min(distances.smaller) / r - 1.0).abs() <= ACCURACY);
        assert!((distances.larger.max(distances.smaller) - 1.0).abs() <= ACCURACY);
        let still = State { time: 0.0, position, velocity: Vector3::zeros() };
        assert!(at_rest.departure_from_definition(origin, &still) < 1e-15);
        let other = at_rest.plus(at_rest.value(JacobiForm::Plain));
        assert!((other.departure_from_definition(origin, &still) - 1.0).abs() < 1e-14, "an error shows");
    }
    assert_eq!(
        JacobiConstant::at_rest_from(Origin::Smaller, mass_parameter(mu), &Vector3::zeros()),
        Err(AtPrimary::Smaller)
    );
}

#[test]
fn jacobi_constant_agrees_with_40_digits() {
    for row in rows(JACOBI) {
        let [mu, x, y, z, vx, vy, vz, want, largest] =
            <[f64; 9]>::try_from(row.iter().map(|f| number(f)).collect::<Vec<_>>()).expect("nine columns");
        let constant =
            JacobiConstant::of(mass_parameter(mu), &Vector3::new(x, y, z), &Vector3::new(vx, vy, vz))
                .expect("off the primaries");
        let error = (constant.value(JacobiForm::Plain) - want).abs();
        assert!(error <= ACCURACY * largest, "{row:?}: off by {error:e}");
    }
}

/// Hairer, Nørsett & Wanner, *Solving Ordinary Differential Equations I*, II.0 (initial values of Arenstorf's
/// orbit); its constant worked out at 40 digits.
#[test]
fn arenstorf_orbit_has_its_constant() {
    let constant = JacobiConstant::of(
        mass_parameter(0.012_277_471),
        &Vector3::new(0.994, 0.0, 0.0),
        &Vector3::new(0.0, -2.001_585_106_379_082_5, 0.0),
    );
    assert_close(constant.expect("off the primaries").value(JacobiForm::Plain), 2.856_412_520_209_858, 1e-14);
}

#[test]
fn forms_differ_by_the_product_of_the_masses() {
    let mu = 0.3;
    let at = |form| {
        let position = Vector3::new(0.4, 0.7, -0.2);
        let potential = effective_potential(mass_parameter(mu), &position, form).expect("off the primaries");
        let constant = JacobiConstant::of(mass_parameter(mu), &position, &Vector3::new(0.1, 0.2, 0.3))
            .expect("off the primaries");
        assert_close(2.0 * potential - 0.14, constant.value(form), 1e-15);
        assert_close(constant.energy(form), -0.5 * constant.value(form), 0.0);
        constant.value(form)
    };
    assert_close(at(JacobiForm::Symmetric) - at(JacobiForm::Plain), mu * (1.0 - mu), 1e-14);
}

#[test]
fn offsets_are_never_differenced() {
    let mu = mass_parameter(0.012_150_585_6);
    let constant = JacobiConstant::new(mu, 3.1, JacobiForm::Plain);
    // Far below the round-off of 3.1.
    assert_close(constant.plus(1e-25).above(&constant), 1e-25, 1e-6);
    assert_close(JacobiConstant::from_energy(mu, -1.55, JacobiForm::Plain).above(&constant), 0.0, 0.0);
}

#[test]
fn centres_are_refused() {
    let mu = 0.012_150_585_6;
    let at = |x: f64, y: f64| JacobiConstant::at_rest(mass_parameter(mu), &Vector3::new(x, y, 0.0));
    assert_eq!(at(-mu, 0.0), Err(AtPrimary::Larger));
    assert_eq!(at(-mu, 1e-170), Err(AtPrimary::Larger));
    assert_eq!(
        JacobiConstant::at_rest(mass_parameter(0.25), &Vector3::new(0.75, 0.0, 0.0)),
        Err(AtPrimary::Smaller)
    );
    // 1 − μ is not a double here, so the nearest one is a small but true distance away.
    assert!(at(1.0 - mu, 0.0).expect("off the primaries").value(JacobiForm::Plain) > 1e12);
}

/// The centre of the smaller primary is not a double: the distance from the nearest one is still right.
#[test]
fn distance_near_the_smaller_primary_is_not_rounded_off() {
    // 1 − 1e-20 rounds to 1.
    let near = distances(mass_parameter(1e-20), &Vector3::new(1.0, 0.0, 0.0));
    assert_close(near.smaller, 1e-20, 1e-16);
    assert_close(near.larger, 1.0, 1e-16);
}

/// Positions that keep off both primaries, where difference quotients are good.
fn position() -> impl Strategy<Value = (f64, Vector3<f64>)> {
    (1e-9..0.5, -2.0..2.0, -2.0..2.0, -2.0..2.0)
        .prop_map(|(mu, x, y, z)| (mu, Vector3::new(x, y, z)))
        .prop_filter("keeps off the primaries", |(mu, position)| {
            let r = distances(mass_parameter(*mu), position);
            r.larger > 0.2 && r.smaller > 0.2
        })
}

proptest! {
    #[test]
    fn gradient_is_the_slope_of_the_potential((mu, position) in position()) {
        let mu = mass_parameter(mu);
        let slope = gradient(mu, &position);
        // Balances truncation against rounding for third derivatives of the size met here.
        let h = 1e-5;
        for axis in 0..3 {
            let mut step = Vector3::zeros();
            step[axis] = h;
            let value = |r: Vector3<f64>| effective_potential(mu, &r, JacobiForm::Plain).expect("off the primaries");
            let quotient = (value(position + step) - value(position - step)) / (2.0 * h);
            prop_assert!((quotient - slope[axis]).abs() < 1e-6, "{quotient} {}", slope[axis]);
        }
    }

    #[test]
    fn hessian_is_the_slope_of_the_gradient((mu, position) in position()) {
        let mu = mass_parameter(mu);
        let slope = hessian(mu, &position);
        prop_assert!((slope - slope.transpose()).norm() < 1e-13);
        // Laplace: attraction has none, the centrifugal potential 2.
        prop_assert!((slope.trace() - 2.0).abs() < 1e-11);
        let h = 1e-5;
        for axis in 0..3 {
            let mut step = Vector3::zeros();
            step[axis] = h;
            let quotient = (gradient(mu, &(position + step)) - gradient(mu, &(position - step))) / (2.0 * h);
            prop_assert!((quotient - slope.column(axis)).norm() < 1e-5);
        }
    }

    #[test]
    fn potential_is_symmetric((mu, r) in position()) {
        let mu = mass_parameter(mu);
        let value = |r: Vector3<f64>| effective_potential(mu, &r, JacobiForm::Plain).expect("off the primaries");
        prop_assert_eq!(value(r).to_bits(), value(Vector3::new(r.x, -r.y, r.z)).to_bits());
        prop_assert_eq!(value(r).to_bits(), value(Vector3::new(r.x, r.y, -r.z)).to_bits());
    }
}
