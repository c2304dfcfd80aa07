//! Propagation: accuracy, events, manoeuvres, contact, samples, matrices, interruption.

mod audit;
mod contact;
mod double_double;
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
use mechanics::propagation::{Request, RequestParts, Trajectory, solve};
use mechanics::state::State;
use proptest::prelude::*;

pub(crate) use crate::reference::cases::{HALO, HALO_PERIOD, MU, parts};

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
