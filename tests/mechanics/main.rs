//! Checks of the mechanics crate against published values, and its invariants.
#![expect(
    clippy::disallowed_methods,
    reason = "expected values are compared within a tolerance, not in their bits"
)]

mod arithmetic;
mod elements;
mod equilibria;
mod extended;
mod frame;
mod hill;
mod potential;
mod propagation;
mod reference;
mod system;
mod units;

/// Whether `a` and `b` agree to `relative` times the larger magnitude.
fn close(a: f64, b: f64, relative: f64) -> bool {
    (a - b).abs() <= relative * a.abs().max(b.abs())
}
