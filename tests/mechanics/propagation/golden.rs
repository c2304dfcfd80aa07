//! The same bits on every machine, and no allocation on the way.

use allocation_counter::measure;
use mechanics::propagation::{MatrixOutput, Outcome, RequestParts, Sampling, Trajectory};
use mechanics::state::State;
use mechanics::taylor::Path;

use super::{HALO, MU, parts};
use crate::reference::golden::{request, solved, table};

#[test]
fn golden_bits() {
    // Another machine, build or path gives these very bits; a change of the recurrences gives others.
    for path in Path::available() {
        assert_eq!(table(path), include_str!("../reference/golden.txt"), "{}", path.name());
    }
}

#[test]
fn the_same_bits_alone_and_among_others() {
    let whole = request();
    let plain = RequestParts { matrix: MatrixOutput::None, events: Vec::new(), ..whole.clone() };
    let unwatched = RequestParts { events: Vec::new(), ..whole.clone() };
    for request in [&whole, &plain, &unwatched] {
        let mut expected = Vec::new();
        for state in &whole.states {
            expected.extend(solved(Path::PORTABLE, RequestParts { states: vec![*state], ..request.clone() }));
        }
        for path in Path::available() {
            for count in [1, 3, 7, 8, 9, whole.states.len()] {
                for (group, indices) in whole.states.chunks(count).enumerate() {
                    let mut states = indices.to_vec();
                    states.reverse();
                    let mut found = solved(path, RequestParts { states, ..request.clone() });
                    found.reverse();
                    for (trajectory, expected) in found.into_iter().zip(&expected[group * count..]) {
                        assert_eq!(&Trajectory { index: 0, ..trajectory }, expected, "{}", path.name());
                    }
                }
            }
        }
    }
}

#[test]
fn the_same_on_the_way_into_a_centre() {
    // Some begin so close to a centre that their first step is too short, some fall into one later, some do neither.
    let mut states: Vec<_> = [1e-20, 1e-12, 1e-9, 1e-6, 1e-3]
        .iter()
        .flat_map(|&away| [[1.0 - MU, away, 0.0, 0.0, 0.0, 0.0], [-MU, away, 0.0, 0.0, 0.0, 0.0]])
        // Their matrices overflow before they do.
        .chain([[0.8082, 0.0, 0.0, 0.0, 0.0, 0.0], [-MU - 0.002, 0.0, 0.0, 0.0, 0.0, 0.0]])
        .map(|components| State::new(0.0, components))
        .collect();
    states.extend(request().states.iter().take(10));
    for matrix in [MatrixOutput::None, MatrixOutput::Final] {
        for watched in [false, true] {
            let mut request = parts(MU, HALO, 2.0);
            (request.states, request.matrix) = (states.clone(), matrix);
            if watched {
                request.events = self::request().events;
            }
            for path in Path::available() {
                let together = solved(path, request.clone());
                let floors = together.iter().filter(|t| t.outcome == Outcome::StepFloor).count();
                assert!(floors > 1 && floors < together.len(), "{floors}");
                let finite = |value: Option<f64>| value.is_none_or(f64::is_finite);
                assert!(together.iter().all(|t| t.matrix.is_none_or(|m| m.iter().all(|e| e.is_finite()))));
                assert!(together.iter().all(|t| finite(t.evidence.determinant_defect)
                    && finite(t.evidence.symplectic_defect)
                    && t.evidence.jacobi_drift.is_finite()));
                for (trajectory, state) in together.into_iter().zip(&states) {
                    let alone = solved(path, RequestParts { states: vec![*state], ..request.clone() });
                    assert_eq!(Trajectory { index: 0, ..trajectory }, alone[0], "{}", path.name());
                }
            }
        }
    }
}

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
