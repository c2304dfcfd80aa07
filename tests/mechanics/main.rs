//! Checks of the mechanics crate against published values, and its invariants.

mod propagation;
