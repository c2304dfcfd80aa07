use serde::Serialize;
use utoipa::ToSchema;

use super::convert::{Converted, Target};
use super::request::Variables;
use crate::wire::{About, Conventions, ElementsEcho, FrameEcho, UnitsEcho};

/// Converted states.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct FramesConvertAnswer {
    #[serde(flatten)]
    conventions: Conventions,
    /// What goes with the positions.
    variables: Variables,
    /// What the given states were in.
    from: ConvertedFrom,
    /// How good the conversion is.
    evidence: FramesConvertEvidence,
    /// The states in the request's order.
    states: Vec<ConvertedState>,
}

/// Units and frame of the given states.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct ConvertedFrom {
    /// Their units.
    units: UnitsEcho,
    /// Their frame.
    frame: FrameEcho,
}

/// How good the conversion is, measured by converting the answer back; normalised, whatever the units.
#[derive(Debug, Serialize, ToSchema)]
#[expect(clippy::struct_field_names, reason = "the names are those of the published members")]
pub(crate) struct FramesConvertEvidence {
    /// Largest distance between a given position and the answer's, converted back, in separations.
    position_error: f64,
    /// Largest difference between a given velocity and the answer's, converted back, in separations times mean motion.
    velocity_error: f64,
    /// Largest distance between a given position and that of the answer's elements, in separations; null if there are no
    /// elements, or none that determine a state.
    elements_error: Option<f64>,
}

/// A state in the units and the frame of the answer.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
pub(crate) struct ConvertedState {
    /// Instant on the absolute clock.
    pub(super) time: f64,
    /// Position [x, y, z].
    pub(super) position: [f64; 3],
    /// Velocity [vx, vy, vz].
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(required = false)]
    pub(super) velocity: Option<[f64; 3]>,
    /// Canonical momenta px = vx - n y, py = vy + n x, pz = vz, where they are asked in place of the velocity; n is the
    /// mean motion.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(required = false)]
    pub(super) momentum: Option<[f64; 3]>,
    /// Osculating elements, where they are asked.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(required = false)]
    pub(super) elements: Option<ElementsEcho>,
    /// The primary that the elements are about.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(required = false)]
    pub(super) elements_about: Option<About>,
    /// Tisserand's parameter 1/a + 2 sqrt(a (1 - e^2)) cos i with a in separations, where the elements are about the larger
    /// primary.
    #[serde(skip_serializing_if = "Option::is_none")]
    #[schema(required = false)]
    pub(super) tisserand_parameter: Option<f64>,
}

impl FramesConvertAnswer {
    pub(super) fn new(from: &Conventions, to: &Target, converted: Vec<Converted>) -> Self {
        let largest =
            |error: fn(&Converted) -> Option<f64>| converted.iter().filter_map(error).reduce(f64::max);
        let evidence = FramesConvertEvidence {
            position_error: largest(|one| Some(one.position_error)).unwrap_or_default(),
            velocity_error: largest(|one| Some(one.velocity_error)).unwrap_or_default(),
            elements_error: largest(|one| one.elements_error),
        };
        Self {
            conventions: to.conventions.clone(),
            variables: to.variables,
            from: ConvertedFrom { units: UnitsEcho(from.units), frame: from.frame.into() },
            evidence,
            states: converted.into_iter().map(|one| one.state).collect(),
        }
    }
}
