//! Final states and matrices of the cases with many more digits than a double's.

use mechanics::propagation::Trajectory;
use mechanics::state::State;
use nalgebra::{Matrix6, Vector3};

const TRUTH: &str = include_str!("trajectories.txt");

/// The six numbers of a row, each rounded to the nearest double.
fn row(case: &str, which: &str) -> Option<[f64; 6]> {
    let line =
        TRUTH.lines().find_map(|line| line.strip_prefix(case)?.strip_prefix(' ')?.strip_prefix(which))?;
    let mut fields = line.split_whitespace().map(|field| field.parse().expect("the table holds numbers"));
    let numbers = std::array::from_fn(|_| fields.next().expect("six columns"));
    Some(numbers)
}

fn apart(state: &State, truth: [f64; 6]) -> f64 {
    (state.position - Vector3::new(truth[0], truth[1], truth[2])).norm()
}

/// Distance of the final position of the case from the true one.
pub(crate) fn position_error(case: &str, state: &State) -> f64 {
    apart(state, row(case, "final ").expect("a case of one trajectory"))
}

/// Largest error of an element of d(final)/d(initial), relative to the largest element.
pub(crate) fn matrix_error(case: &str, matrix: &Matrix6<f64>) -> f64 {
    let rows =
        std::array::from_fn::<_, 6, _>(|i| row(case, &format!("m{i} ")).expect("a case with a matrix"));
    let truth = Matrix6::from_fn(|i, j| rows[i][j]);
    (matrix - truth).amax() / truth.amax()
}

/// The members of the ensemble whose final state is known.
pub(crate) fn members() -> impl Iterator<Item = usize> {
    (0..16).map(|j| 312 + 625 * j)
}

/// Largest distance of the final positions of those members from the true ones.
pub(crate) fn ensemble_error(trajectories: &[Trajectory]) -> f64 {
    members()
        .map(|member| {
            let truth = row("ensemble_10k", &format!("{member} ")).expect("a member of the table");
            apart(&trajectories[member].last, truth)
        })
        .fold(0.0, f64::max)
}
