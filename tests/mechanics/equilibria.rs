//! The five equilibria and the linear motion about them.

use std::f64::consts::TAU;

use mechanics::equilibria::{Equilibria, Equilibrium, Point, ROUTH};
use mechanics::frame::Origin;
use mechanics::potential::{JacobiConstant, JacobiForm, distances, gradient};
use proptest::prelude::*;

use crate::reference::{EQUILIBRIA, assert_close, mass_parameter, number, relative_error, rows};

fn equilibria(mu: f64) -> Equilibria {
    Equilibria::of(mass_parameter(mu))
}

fn point(name: &str) -> Point {
    Point::ALL.into_iter().find(|point| point.name() == name).expect("a point's name")
}

fn plain(equilibrium: &Equilibrium) -> f64 {
    equilibrium.jacobi_constant().value(JacobiForm::Plain)
}

/// Frequencies in the plane, slowest first.
fn in_plane_frequencies(equilibrium: &Equilibrium) -> Vec<f64> {
    equilibrium.linear_motion().in_plane_periods().map(|period| TAU / period).collect()
}

#[test]
fn distances_and_constants_agree_with_40_digits() {
    for row in rows(EQUILIBRIA) {
        let all = equilibria(number(row[0]));
        let found = all.get(point(row[1]));
        assert_close(found.distance_to_larger(), number(row[2]), 4e-16);
        assert_close(found.distance_to_smaller(), number(row[3]), 4e-16);
        assert_close(plain(found), number(row[4]), 4e-16);
        let above = found.jacobi_constant().above(&all.get(Point::L4).jacobi_constant());
        assert_close(above, number(row[5]), 4e-16);
    }
}

/// The differences between collinear points are of the order of μ, the constants of 3.
#[test]
fn differences_of_constants_keep_their_digits() {
    let table: Vec<_> = rows(EQUILIBRIA).collect();
    for group in table.chunks(4).filter(|group| number(group[0][0]) >= 1e-16) {
        let all = equilibria(number(group[0][0]));
        let differ = |a, b| all.get(a).jacobi_constant().above(&all.get(b).jacobi_constant());
        let above_l4 = |row: usize| number(group[row][5]);
        // The reference is itself differenced here, of doubles, hence the tolerance.
        for (row, (a, b)) in [(Point::L1, Point::L2), (Point::L2, Point::L3)].into_iter().enumerate() {
            let want = above_l4(row) - above_l4(row + 1);
            let rounding = 4e-16 * above_l4(row);
            assert!((differ(a, b) - want).abs() <= rounding, "{a:?} {b:?} {}", group[0][0]);
        }
    }
    // C1 − C2 = 4μ/3 + … as μ → 0 (Szebehely 1967, from memory; confirmed at 60 digits for μ = 1e-16).
    let all = equilibria(1e-16);
    let difference = all.get(Point::L1).jacobi_constant().above(&all.get(Point::L2).jacobi_constant());
    assert_close(difference, 4.0e-16 / 3.0, 1e-10);
}

#[test]
fn eigenvalues_agree_with_40_digits() {
    for row in rows(EQUILIBRIA) {
        let motion = equilibria(number(row[0])).get(point(row[1])).linear_motion();
        for (found, want) in motion.eigenvalues.iter().zip(row[6..].chunks(2)) {
            assert_close(found.re, number(want[0]), 1e-13);
            assert_close(found.im, number(want[1]), 1e-13);
        }
    }
}

#[test]
fn residuals_are_those_of_rounding() {
    for mu in [5e-324, 1e-300, 1e-60, 1e-16, 1e-9, 0.012_150_585_6, 0.3, 0.5] {
        let residual = equilibria(mu).largest_residual();
        assert!(residual < 1e-15, "{mu:e}: {residual:e}");
    }
}

/// From a primary the digits are those of the distances; elsewhere it is the same place.
#[test]
fn positions_count_from_any_origin() {
    for mu in [1e-30, 1e-5, 0.3] {
        for found in equilibria(mu).iter() {
            let x = found.position().x;
            for (origin, from_barycenter) in
                [(Origin::Barycenter, 0.0), (Origin::Larger, -mu), (Origin::Smaller, 1.0 - mu)]
            {
                let seen = found.position_from(origin);
                assert!((seen.x - (x - from_barycenter)).abs() < 3e-16, "{mu:e} {origin:?} {found:?}");
                assert_eq!((seen.y, seen.z), (found.position().y, 0.0));
            }
            let larger = found.position_from(Origin::Larger).norm() / found.distance_to_larger();
            let smaller = found.position_from(Origin::Smaller).norm() / found.distance_to_smaller();
            assert!((larger - 1.0).abs() < 3e-16 && (smaller - 1.0).abs() < 3e-16, "{mu:e} {found:?}");
        }
    }
}

/// No mass parameter that the type admits breaks the formulas.
#[test]
fn smallest_mass_parameters_stay_finite() {
    for mu in [5e-324, 1e-310, f64::MIN_POSITIVE, 1e-300] {
        for found in equilibria(mu).iter() {
            let motion = found.linear_motion();
            assert!(found.position().iter().all(|x| x.is_finite()) && plain(found).is_finite());
            assert!(
                motion.eigenvalues.iter().all(|e| e.re.is_finite() && e.im.is_finite()),
                "{mu:e} {motion:?}"
            );
            assert!(motion.in_plane_periods().all(f64::is_finite) && motion.vertical_period.is_finite());
            assert!(found.distance_to_smaller() > 0.0);
        }
    }
}

/// Szebehely & Williams 1964, Astronomical Journal 69:460, Table Ia: |x| of the point beyond the smaller primary
/// and its constant in the symmetric form.
#[test]
fn table_of_szebehely_and_williams() {
    let table = [
        (0.10, 1.259_7, 3.556_684),
        (0.12, 1.265_57, 3.599_958),
        (0.14, 1.269_193, 3.636_081),
        (0.16, 1.271_094, 3.666_304),
        (0.18, 1.271_628, 3.691_52),
    ];
    for (mu, x, constant) in table {
        let l2 = *equilibria(mu).get(Point::L2);
        assert!((l2.position().x - x).abs() <= 1e-6, "{mu}: {}", l2.position().x);
        assert!((l2.jacobi_constant().value(JacobiForm::Symmetric) - constant).abs() <= 1e-6, "{mu}");
    }
}

/// The Copenhagen case; Szebehely 1967, *Theory of Orbits* (from memory).
#[test]
fn equal_masses() {
    let all = equilibria(0.5);
    assert_close(all.get(Point::L2).position().x, 1.198_406_144_554_92, 1e-14);
    assert_close(all.get(Point::L3).position().x, -1.198_406_144_554_92, 1e-14);
    assert!(all.get(Point::L1).position().x.abs() < 1e-16);
    assert_close(plain(all.get(Point::L1)), 4.0, 4e-16);
    assert_close(plain(all.get(Point::L2)), 3.456_796_224_086_15, 1e-14);
    assert_close(plain(all.get(Point::L3)), 3.456_796_224_086_15, 1e-14);
}

/// Worked out at 40 digits from μ; no outside authority.
#[test]
fn mass_parameter_0_01215() {
    let all = equilibria(0.01215);
    let want = [
        (Point::L1, 0.836_918_007_316_93, 3.188_335_717_53),
        (Point::L2, 1.155_679_913_094_74, 3.172_155_838_88),
        (Point::L3, -1.005_062_401_820_5, 3.012_146_565_42),
        (Point::L4, 0.487_85, 2.987_997_622_5),
        (Point::L5, 0.487_85, 2.987_997_622_5),
    ];
    for (point, x, constant) in want {
        assert_close(all.get(point).position().x, x, 1e-13);
        assert_close(plain(all.get(point)), constant, 1e-11);
    }
}

/// Hill's lunar problem (Szebehely 1967, *Theory of Orbits*, 10; from memory): coordinates scale by μ^(1/3),
/// constants above 3 by μ^(2/3), with 0.6933612743506347 = 3^(-1/3) and 4.326748710922225 = 3^(4/3).
#[test]
fn limit_of_hill() {
    let mu = 1e-30;
    let all = equilibria(mu);
    for point in [Point::L1, Point::L2] {
        assert_close(all.get(point).distance_to_smaller() / 1e-10, 0.693_361_274_350_634_7, 1e-9);
        let above_3 = all.get(point).jacobi_constant().above(&JacobiConstant::new(
            mass_parameter(mu),
            3.0,
            JacobiForm::Plain,
        ));
        assert_close(above_3 / 1e-20, 4.326_748_710_922_225, 1e-9);
    }
}

/// Routh 1875; Szebehely 1967 (from memory): (1 − √69/9)/2.
#[test]
fn triangular_points_lose_stability_at_the_value_of_routh() {
    assert_close(ROUTH, 0.038_520_896_504_551_4, 1e-15);
    assert_close(ROUTH, 0.5 * (1.0 - 69.0_f64.sqrt() / 9.0), 1e-15);
    let below = equilibria(ROUTH.next_down()).get(Point::L4).linear_motion();
    assert!(below.stable && below.growth_rate.to_bits() == 0 && below.in_plane_periods().count() == 2);
    // The nearest double lies above the true value.
    let above = equilibria(ROUTH).get(Point::L5).linear_motion();
    assert!(!above.stable && above.growth_rate > 0.0 && above.in_plane_periods().count() == 1);
    for motion in [below, above] {
        // All in-plane frequencies meet at 1/√2.
        assert!(motion.in_plane_periods().all(|period| relative_error(period, TAU * 2.0_f64.sqrt()) < 1e-7));
    }
}

/// Deprit & Deprit-Bartholomé 1967, Astronomical Journal 72:173: frequencies at L4 in the ratios 2:1 and 3:1.
#[test]
fn resonant_mass_parameters_of_deprit() {
    for (mu, ratio) in [(0.024_293_897_142_052, 2.0), (0.013_516_016_022_453, 3.0)] {
        let frequencies = in_plane_frequencies(equilibria(mu).get(Point::L4));
        assert_close(frequencies[1] / frequencies[0], ratio, 1e-12);
    }
}

/// Five digits of these appear in the literature.
#[test]
fn linear_frequencies() {
    let earth_moon = equilibria(0.012_150_585_6);
    for (point, in_plane, vertical, growth) in
        [(Point::L1, 2.334_39, 2.268_83, 2.932_06), (Point::L2, 1.862_65, 1.786_18, 2.158_68)]
    {
        let motion = earth_moon.get(point).linear_motion();
        assert!((in_plane_frequencies(earth_moon.get(point))[0] - in_plane).abs() <= 6e-6);
        assert!((TAU / motion.vertical_period - vertical).abs() <= 6e-6);
        assert!((motion.growth_rate - growth).abs() <= 6e-6 && !motion.stable);
    }
    for (mu, long, short) in
        [(0.012_150_585_6, 0.298_21, 0.954_5), (0.000_953_881_151_934_512, 0.080_46, 0.996_76)]
    {
        let frequencies = in_plane_frequencies(equilibria(mu).get(Point::L4));
        assert!(
            (frequencies[0] - long).abs() <= 6e-6 && (frequencies[1] - short).abs() <= 6e-6,
            "{frequencies:?}"
        );
    }
}

/// Richardson 1980, Celestial Mechanics 22:241: the Sun-Earth+Moon L1, to the digits printed there.
#[test]
fn example_of_richardson() {
    let all = equilibria(3.040_357_143e-6);
    let l1 = all.get(Point::L1);
    let motion = l1.linear_motion();
    assert_close(l1.distance_to_smaller(), 0.010_010_904_75, 1e-9);
    assert_close(motion.c2, 4.061_073_566, 1e-9);
    assert_close(in_plane_frequencies(l1)[0], 2.086_453_455, 1e-9);
    assert_close(motion.amplitude_ratio().expect("collinear"), 3.229_268_096, 1e-9);
    assert_eq!(all.get(Point::L4).linear_motion().amplitude_ratio(), None);
    assert_eq!(equilibria(0.1).get(Point::L4).linear_motion().amplitude_ratio(), None);
    // c₂ rounds to 1 here.
    assert!(equilibria(1e-18).get(Point::L3).linear_motion().amplitude_ratio().is_some());
}

proptest! {
    /// Down to 1e-16, evenly in the logarithm.
    #[test]
    fn returned_positions_are_equilibria(exponent in -16.0..0.0_f64) {
        let mu = mass_parameter(0.5 * 10.0_f64.powf(exponent));
        for found in Equilibria::of(mu).iter() {
            // Rounding of x times the largest second derivative, 17 at most.
            prop_assert!(gradient(mu, &found.position()).norm() < 1e-14);
            let r = distances(mu, &found.position());
            prop_assert!((r.smaller - found.distance_to_smaller()).abs() < 3e-16);
            prop_assert!((r.larger - found.distance_to_larger()).abs() < 3e-16);
        }
    }

    #[test]
    fn eigenvalues_satisfy_the_characteristic_polynomial(exponent in -12.0..0.0_f64) {
        let mu = mass_parameter(0.5 * 10.0_f64.powf(exponent));
        for found in Equilibria::of(mu).iter() {
            let u = mechanics::potential::hessian(mu, &found.position());
            // Rounding of a position that is only γ from the smaller primary shows in the Hessian.
            let tolerance = 1e-13 + 2e-14 / found.distance_to_smaller();
            for e in found.linear_motion().eigenvalues {
                let square = e * e;
                let in_plane = square * square + square * (4.0 - u.m11 - u.m22) + (u.m11 * u.m22 - u.m12 * u.m12);
                let vertical = square - u.m33;
                let scale = 1.0 + square.norm_sqr();
                prop_assert!((in_plane * vertical).norm_sqr().sqrt() / scale < 100.0 * tolerance, "{found:?}");
            }
        }
    }

    #[test]
    fn eigenvalues_come_in_opposite_conjugate_pairs_in_order(exponent in -16.0..0.0_f64) {
        for found in equilibria(0.5 * 10.0_f64.powf(exponent)).iter() {
            let all = found.linear_motion().eigenvalues;
            for e in all {
                prop_assert!(all.contains(&-e) && all.contains(&e.conj()));
            }
            prop_assert!(all.windows(2).all(|w| (w[0].re, w[0].im) >= (w[1].re, w[1].im)));
        }
    }

    #[test]
    fn constants_descend_from_the_first_point_to_the_last(exponent in -16.0..-0.001_f64) {
        let all = equilibria(0.5 * 10.0_f64.powf(exponent));
        let constants: Vec<_> = all.iter().map(Equilibrium::jacobi_constant).collect();
        prop_assert!(constants.windows(2).take(3).all(|w| w[0] > w[1]));
        prop_assert_eq!(constants[3], constants[4]);
    }
}
