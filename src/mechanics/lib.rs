//! Mechanics of the circular restricted three-body problem.
//!
//! Pure computation: no clock, thread, file, environment, logging or network. Everything a request can make
//! wrong is refused when its validated quantities are built, so the computations themselves cannot panic.
//!
//! # Conventions
//!
//! *Units* are normalised throughout: the distance of the primaries is 1, the sum of their masses is 1 and
//! their mean motion is 1, so one revolution of the primaries takes 2π. [`units`] converts to and from
//! physical units at the boundary.
//!
//! *Axes* are, unless a [`frame::Frame`] says otherwise, the synodic (rotating) ones about the barycentre: the
//! larger primary, with the share 1 − μ of the mass, rests at x = −μ, the smaller, with the share μ, at
//! x = 1 − μ; both turn counter-clockwise about z. μ is the mass parameter, in (0, 0.5].
//!
//! *Signs*: the effective potential Ω = (x² + y²)/2 + (1 − μ)/r₁ + μ/r₂ is positive and the Jacobi constant is
//! C = 2Ω − v².
//!
//! # Errors
//!
//! Each module has an error type of its own that knows nothing of HTTP. An error of a computation carries the
//! effort spent and the residual reached.

pub mod arithmetic;
pub mod elements;
pub mod equilibria;
pub mod frame;
pub mod hill;
pub mod interrupt;
pub mod potential;
pub mod propagation;
pub mod quantity;
pub mod state;
pub mod system;
pub mod taylor;
pub mod units;
