//! Checks of the mechanics crate against published values, and its invariants.

#![expect(clippy::unreadable_literal, reason = "published digits stay as they were printed")]

mod elements;
mod frame;
mod system;
mod units;

/// Whether `a` and `b` agree to `relative` times the larger magnitude.
fn close(a: f64, b: f64, relative: f64) -> bool {
    (a - b).abs() <= relative * a.abs().max(b.abs())
}
