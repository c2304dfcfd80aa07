//! Closed orbits of the literature, and final states computed elsewhere with many more digits.

use mechanics::state::State;

use super::{MU, parts, run};
use crate::reference::cases::{ARENSTORF, ARENSTORF_MU, ARENSTORF_PERIOD, REGULAR, REGULAR_PERIOD, case};
use crate::reference::effort::table;
use crate::reference::golden::{hashed, solved};
use crate::reference::truth::{ensemble_error, members, position_error};

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
    // The near-rectilinear orbit amplifies the rounding of its start alone to 2e-9 and more over twenty revolutions.
    for (name, bound) in [("halo_period", 5e-14), ("arenstorf", 1e-12), ("nrho_30", 1e-7)] {
        let error = position_error(name, &run(case(name).expect("a case")).last);
        assert!(error <= bound, "{name}: {error}");
    }
}

#[test]
fn members_of_the_ensemble() {
    let mut request = case("ensemble_10k").expect("a case");
    let bytes =
        request.states.iter().flat_map(|state| state.components().iter().copied().collect::<Vec<_>>());
    assert_eq!(hashed(bytes), 0xdb8e_8bff_9a7d_2f97, "the states are those that the truth starts from");
    // Those between the members of the table add nothing to what is compared.
    request.states.truncate(members().last().expect("there are some") + 1);
    let error = ensemble_error(&solved(mechanics::taylor::Path::fastest(), request));
    assert!(error <= 2e-13, "{error}");
}

#[test]
fn effort() {
    // Steps, not seconds: a slow-down shows without a clock.
    assert_eq!(table(), include_str!("../reference/effort.txt"));
}

#[test]
fn jacobi_constant_of_regular_orbits_over_a_thousand_revolutions() {
    // About the larger primary, with roughly their Kepler periods. A systematic error would make the drift grow
    // with the number of revolutions; a random walk makes it grow with its root.
    for (start, period) in [
        (REGULAR, REGULAR_PERIOD),
        ([0.5, 0.0, 0.0, 0.0, 0.9, 0.05], 2.3),
        ([0.6, 0.0, 0.0, 0.0, 0.7, 0.05], 3.0),
    ] {
        let drift = |revolutions: f64| run(parts(MU, start, revolutions * period)).evidence.jacobi_drift;
        let (hundred, thousand) = (drift(100.0), drift(1000.0));
        assert!(thousand < 1e-13, "{thousand}");
        // A hundred revolutions may by chance end where they began; a walk of their steps reaches about 1e-14.
        assert!(thousand < 8.0 * hundred.max(1e-14), "{hundred} then {thousand}");
    }
}
