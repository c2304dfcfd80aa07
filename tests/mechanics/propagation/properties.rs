//! Symmetries of the equations of motion that every trajectory keeps.

use mechanics::propagation::Sampling;
use mechanics::state::State;
use proptest::prelude::*;

use super::{apart, parts, run};

/// The reflection that reverses time: (x, −y, z, −vx, vy, −vz), Miele's mirror theorem.
fn mirrored(s: [f64; 6]) -> [f64; 6] {
    [s[0], -s[1], s[2], -s[3], s[4], -s[5]]
}

/// The bits of the components, a zero without its sign.
fn bits(components: [f64; 6]) -> [u64; 6] {
    components.map(|component| (component + 0.0).to_bits())
}

prop_compose! {
    /// Mass parameters over their whole range, evenly in their logarithm.
    fn mass_parameter()(log in -9.0_f64..-0.31) -> f64 {
        libm::pow(10.0, log)
    }
}

proptest! {
    #![proptest_config(ProptestConfig::with_cases(64))]

    #[test]
    fn jacobi_constant_is_kept(
        mu in mass_parameter(),
        state in [-1.5_f64..1.5, -1.5..1.5, -0.5..0.5, -0.8..0.8, -0.8..0.8, -0.5..0.5],
        duration in -8.0_f64..8.0,
    ) {
        let trajectory = run(parts(mu, state, duration));
        // A close approach to a primary at speed v adds the rounding of v² to the difference of two large terms.
        let fastest = {
            let mut request = parts(mu, state, duration);
            request.sampling = Sampling::EveryStep;
            run(request).samples.velocities.iter().map(nalgebra::Vector3::norm_squared).fold(1.0, f64::max)
        };
        prop_assert!(trajectory.evidence.jacobi_drift < 3e-14 * fastest);
    }

    #[test]
    fn there_and_back_again(
        mu in mass_parameter(),
        state in [0.2_f64..0.5, -0.3..0.3, -0.3..0.3, -0.3..0.3, 0.8..1.4, -0.3..0.3],
        duration in 0.1_f64..4.0,
    ) {
        let there = run(parts(mu, state, duration)).last;
        let mut back = parts(mu, state, -duration);
        back.states[0] = there;
        let home = run(back).last;
        prop_assert!(apart(&home, &State::new(0.0, state)) < 1e-10);
    }

    #[test]
    fn mirror_theorem(
        mu in mass_parameter(),
        state in [0.2_f64..0.5, -0.3..0.3, -0.3..0.3, -0.3..0.3, 0.8..1.4, -0.3..0.3],
        duration in 0.1_f64..4.0,
    ) {
        let forwards = run(parts(mu, state, duration)).last;
        let backwards = run(parts(mu, mirrored(state), -duration)).last;
        // To the bit: every operation of the one is the other's with the sign changed.
        let mirror = mirrored(forwards.components().into());
        prop_assert_eq!(bits(mirror), bits(backwards.components().into()));
    }

    #[test]
    fn reflection_in_the_plane_of_the_primaries(
        mu in mass_parameter(),
        state in [0.2_f64..0.5, -0.3..0.3, -0.3..0.3, -0.3..0.3, 0.8..1.4, -0.3..0.3],
    ) {
        let [x, y, z, vx, vy, vz] = state;
        let above = run(parts(mu, state, 3.0)).last;
        let below = run(parts(mu, [x, y, -z, vx, vy, -vz], 3.0)).last;
        prop_assert_eq!(above.position.z.to_bits(), (-below.position.z).to_bits());
        prop_assert_eq!(above.position.x.to_bits(), below.position.x.to_bits());
    }
}
