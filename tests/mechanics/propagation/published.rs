//! Closed orbits of the literature, and final states computed elsewhere with many more digits.

use mechanics::state::State;
use nalgebra::Vector3;

use super::{HALO, HALO_PERIOD, MU, parts, run};

/// Final position of a propagation from binary64 input, by a 333-bit Taylor integration with a general-purpose
/// library (heyoka), which agrees with a 50-digit integrator to 31 digits.
fn error(state: [f64; 6], mu: f64, time: f64, truth: [&str; 3]) -> f64 {
    let last = run(parts(mu, state, time)).last;
    let truth = truth.map(|digits| digits.parse::<f64>().expect("a number"));
    (last.position - Vector3::from(truth)).norm()
}

/// Periodic orbit of Hairer, Nørsett & Wanner, *Solving Ordinary Differential Equations I*, §II.0.
const ARENSTORF_MU: f64 = 0.012277471;
const ARENSTORF: [f64; 6] = [0.994, 0.0, 0.0, 0.0, -2.00158510637908252240537862224, 0.0];
const ARENSTORF_PERIOD: f64 = 17.0652165601579625588917206249;

#[test]
fn arenstorf_orbit_closes() {
    let trajectory = run(parts(ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD));
    let first = State::new(0.0, ARENSTORF);
    assert!((trajectory.last.position - first.position).norm() <= 1e-12);
    assert!(trajectory.evidence.jacobi_drift < 1e-13);
}

#[test]
fn shampine_gordon_orbit_closes() {
    // Shampine & Gordon 1975, *Computer Solution of Ordinary Differential Equations*.
    let start = [1.2, 0.0, 0.0, 0.0, -1.04935750983031990726, 0.0];
    let trajectory = run(parts(1.0 / 82.45, start, 6.19216933131963970674));
    let first = State::new(0.0, start);
    assert!((trajectory.last.position - first.position).norm() <= 1e-12);
    assert!((trajectory.last.velocity - first.velocity).norm() <= 1e-11);
}

#[test]
fn final_positions_of_many_digits() {
    let halo = [
        "1.172045953599626347586278718838320571741375889",
        "4.483386743635753480813570114e-14",
        "-0.08619999999997241272235678925481536309635575999",
    ];
    assert!(error(HALO, MU, HALO_PERIOD, halo) <= 5e-14);

    let arenstorf = [
        "0.9939999999999739957652582384615532896040098680",
        "-8.855134620121083523394802433614544698e-14",
        "0",
    ];
    assert!(error(ARENSTORF, ARENSTORF_MU, ARENSTORF_PERIOD, arenstorf) <= 1e-12);

    // A near-rectilinear orbit over twenty revolutions: rounding of the input alone is amplified to 2e-9 and more.
    let rectilinear = [1.022026179865368, 0.0, -0.1821, 0.0, -0.10326652171473427, 0.0];
    let end = [
        "1.018741035507730499388712819358462366913425215",
        "0.02222780712706970680572705112217046492964262205",
        "-0.1693947240968161479101427891626047686594337059",
    ];
    assert!(error(rectilinear, MU, 30.0, end) <= 6e-8);
}

#[test]
fn effort_of_the_published_orbits() {
    // Steps, not seconds: a slow-down shows without a clock.
    assert_eq!(run(parts(MU, HALO, HALO_PERIOD)).evidence.steps, 19);
    assert_eq!(run(parts(ARENSTORF_MU, ARENSTORF, ARENSTORF_PERIOD)).evidence.steps, 129);
}

#[test]
fn jacobi_constant_of_regular_orbits_over_a_thousand_revolutions() {
    // About the larger primary, with roughly their Kepler periods. A systematic error would make the drift grow
    // with the number of revolutions; a random walk makes it grow with its root.
    for (start, period) in [
        ([0.31, 0.0, 0.05, 0.0, 1.52, 0.1], 1.117),
        ([0.5, 0.0, 0.0, 0.0, 0.9, 0.05], 2.3),
        ([0.6, 0.0, 0.0, 0.0, 0.7, 0.05], 3.0),
    ] {
        let drift = |revolutions: f64| run(parts(MU, start, revolutions * period)).evidence.jacobi_drift;
        let (hundred, thousand) = (drift(100.0), drift(1000.0));
        assert!(thousand < 1e-13, "{thousand}");
        assert!(thousand < 8.0 * hundred.max(5e-15), "{hundred} then {thousand}");
    }
}
