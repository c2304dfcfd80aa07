//! The same bits on every machine, and no allocation on the way.

use allocation_counter::measure;
use mechanics::propagation::{MatrixOutput, Sampling};

use super::{HALO, MU, parts, run};

/// FNV-1a, 64 bit (Fowler, Noll & Vo).
fn hashed(values: impl Iterator<Item = f64>) -> u64 {
    values
        .flat_map(|value| value.to_bits().to_le_bytes())
        .fold(0xcbf2_9ce4_8422_2325, |hash, byte| (hash ^ u64::from(byte)).wrapping_mul(0x0100_0000_01b3))
}

/// Final states and matrices of two hundred trajectories over all mass parameters, close approaches included. A change
/// of the recurrences changes this number; another machine, build or path must not.
#[test]
fn golden_bits() {
    let mut all = Vec::new();
    for i in 0..200 {
        let i = f64::from(i);
        let mu = libm::exp2(-1.0 - 0.1 * i);
        let state = [0.3 + 0.003 * i, 0.01 * i - 1.0, 0.002 * i - 0.2, 0.1, 1.2 - 0.01 * i, 0.05];
        let mut request = parts(mu, state, 3.0);
        request.matrix = MatrixOutput::Final;
        let trajectory = run(request);
        all.extend(trajectory.last.components().iter());
        all.extend(trajectory.matrix.expect("asked for").iter());
    }
    assert_eq!(hashed(all.into_iter()), GOLDEN);
}

const GOLDEN: u64 = 5380448846444963817;

#[test]
fn no_allocation_per_step() {
    let allocations = |duration| {
        let mut request = parts(MU, HALO, duration);
        request.matrix = MatrixOutput::Final;
        request.sampling = Sampling::Count(10);
        let request = mechanics::propagation::Request::new(request).expect("valid");
        let solve = || {
            let all = mechanics::propagation::solve(&request, &mechanics::interrupt::Never);
            assert_eq!(all.expect("not cancelled").len(), 1);
        };
        measure(solve).count_total
    };
    assert_eq!(allocations(1.0), allocations(100.0));
}
