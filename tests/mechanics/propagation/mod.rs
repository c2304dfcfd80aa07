//! Propagation: accuracy, events, manoeuvres, contact, samples, matrices, interruption.

mod audit;
mod contact;
mod events;
mod golden;
mod interruption;
mod manoeuvres;
mod matrices;
mod properties;
mod published;
mod samples;

use mechanics::frame::{Axes, Frame, Origin, XAxis};
use mechanics::interrupt::Never;
use mechanics::propagation::{
    Arithmetic, Contact, Durations, Limits, MatrixOutput, Request, RequestParts, Sampling, Trajectory, solve,
};
use mechanics::quantity::{Duration, MassParameter, Quantity, Tolerance};
use mechanics::state::State;
use proptest::prelude::*;

/// A mass parameter near the Earth–Moon one, and a halo orbit about its L2 in x, z and vy.
pub(crate) const MU: f64 = 0.01215058560962404;
pub(crate) const HALO: [f64; 6] = [1.1720459535998, 0.0, -0.0862, 0.0, -0.1880035431733172, 0.0];
pub(crate) const HALO_PERIOD: f64 = 3.3517255182390353;

/// A request for one state with the defaults of everything else.
pub(crate) fn parts(mass_parameter: f64, state: [f64; 6], duration: f64) -> RequestParts {
    RequestParts {
        mass_parameter: MassParameter::new(mass_parameter).expect("in range"),
        frame: Frame::default(),
        states: vec![State::new(0.0, state)],
        durations: Durations::All(Duration::new(duration).expect("in range")),
        tolerance: Tolerance::new(1e-15).expect("in range"),
        sampling: Sampling::None,
        matrix: MatrixOutput::None,
        events: Vec::new(),
        manoeuvres: Vec::new(),
        contact: Contact::default(),
        arithmetic: Arithmetic::Double,
        audit: false,
        limits: Limits { steps: 1_000_000, events: 100_000, sample_values: 20_000_000 },
    }
}

pub(crate) fn run(parts: RequestParts) -> Trajectory {
    solve(&Request::new(parts).expect("valid"), &Never).expect("not cancelled").remove(0)
}

/// Euclidean distance of positions.
pub(crate) fn apart(a: &State, b: &State) -> f64 {
    (a.position - b.position).norm()
}

/// Every frame.
pub(crate) fn any_frame() -> impl Strategy<Value = Frame> {
    use proptest::sample::select;
    (
        select(&[Axes::Rotating, Axes::Inertial][..]),
        select(&[Origin::Barycenter, Origin::Larger, Origin::Smaller][..]),
        select(&[XAxis::TowardSmaller, XAxis::TowardLarger][..]),
    )
        .prop_map(|(axes, origin, x_axis)| Frame { axes, origin, x_axis })
}
