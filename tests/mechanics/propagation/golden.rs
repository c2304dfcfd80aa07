//! The same bits on every machine, and no allocation on the way.

use allocation_counter::measure;
use mechanics::propagation::{MatrixOutput, RequestParts, Sampling};

use super::{HALO, MU, parts};
use crate::reference::golden::{bits, line, request, solved, table};

#[test]
fn golden_bits() {
    // Another machine, build or path gives these very bits; a change of the recurrences gives others.
    assert_eq!(table(), include_str!("../reference/golden.txt"));
}

#[test]
fn the_same_bits_alone_and_among_others() {
    let whole = request();
    let lines: Vec<_> = solved(whole.clone()).iter().map(line).collect();
    let plain = RequestParts { matrix: MatrixOutput::None, events: Vec::new(), ..whole.clone() };
    for count in [1, 3, 7, 8, 9, whole.states.len()] {
        for request in [&whole, &plain] {
            for (group, indices) in whole.states.chunks(count).enumerate() {
                let mut states = indices.to_vec();
                states.reverse();
                let mut found = solved(RequestParts { states, ..request.clone() });
                found.reverse();
                for (trajectory, expected) in found.iter().zip(&lines[group * count..]) {
                    if request.matrix == MatrixOutput::None {
                        assert!(expected.starts_with(&bits(&trajectory.last)));
                    } else {
                        assert_eq!(&line(trajectory), expected);
                    }
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
