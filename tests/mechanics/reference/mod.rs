//! Tables of values from outside the crate. `make.py` made them and says how.

pub(crate) mod cases;
pub(crate) mod effort;
pub(crate) mod golden;
pub(crate) mod truth;

use mechanics::quantity::{MassParameter, Quantity};

/// 40-digit equilibria: see the table's first line for its columns.
pub(crate) const EQUILIBRIA: &str = include_str!("equilibria.txt");
/// 40-digit Jacobi constants of 400 states, near both primaries, among them and far away.
pub(crate) const JACOBI: &str = include_str!("jacobi.txt");
/// Where the ascent from 300 positions near the borders of the basins ends.
pub(crate) const REGIONS: &str = include_str!("regions.txt");

/// The rows of a table, each split into its fields.
pub(crate) fn rows(table: &str) -> impl Iterator<Item = Vec<&str>> {
    table.lines().filter(|line| !line.starts_with('#')).map(|line| line.split_whitespace().collect())
}

/// A field, rounded to the nearest double.
pub(crate) fn number(field: &str) -> f64 {
    field.parse().expect("the table holds numbers")
}

/// A mass parameter known to be in range.
pub(crate) fn mass_parameter(mu: f64) -> MassParameter {
    MassParameter::new(mu).expect("in range")
}

/// |got − want| / |want|, and 0 for equal numbers, zeros included.
#[expect(clippy::float_cmp, reason = "equal zeros have no relative difference")]
pub(crate) fn relative_error(got: f64, want: f64) -> f64 {
    if got == want { 0.0 } else { ((got - want) / want).abs() }
}

/// Asserts agreement to `tolerance` relative to `want`.
#[track_caller]
pub(crate) fn assert_close(got: f64, want: f64, tolerance: f64) {
    assert!(relative_error(got, want) <= tolerance, "got {got:e}, want {want:e}");
}
