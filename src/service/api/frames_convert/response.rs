use serde::Serialize;
use utoipa::ToSchema;

use super::convert::Target;
use super::request::Variables;
use crate::wire::{About, Conventions, ConventionsEcho, ElementsEcho, FrameEcho, UnitsEcho};

/// Converted states.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct FramesConvertAnswer<'a> {
    #[serde(flatten)]
    conventions: ConventionsEcho<'a>,
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
#[derive(Clone, Copy, Debug, Default, Serialize, ToSchema)]
#[expect(clippy::struct_field_names, reason = "the names are those of the published members")]
pub(crate) struct FramesConvertEvidence {
    /// Largest distance between a given position and the answer's, converted back, in separations.
    pub(super) position_error: f64,
    /// Largest difference between a given velocity and the answer's, converted back, in separations times mean motion.
    pub(super) velocity_error: f64,
    /// Largest distance between a given position and that of the answer's elements, in separations; null if there are no
    /// elements, or none that determine a state.
    pub(super) elements_error: Option<f64>,
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

impl FramesConvertEvidence {
    /// Takes over whatever is larger there.
    pub(super) fn take(&mut self, other: &Self) {
        self.position_error = self.position_error.max(other.position_error);
        self.velocity_error = self.velocity_error.max(other.velocity_error);
        self.elements_error = match (self.elements_error, other.elements_error) {
            (Some(a), Some(b)) => Some(a.max(b)),
            (a, b) => a.or(b),
        };
    }
}

impl<'a> FramesConvertAnswer<'a> {
    /// The answer without its states.
    pub(super) fn new(from: &Conventions, to: &'a Target, evidence: FramesConvertEvidence) -> Self {
        Self {
            conventions: to.conventions.echo(),
            variables: to.variables,
            from: ConvertedFrom { units: UnitsEcho(from.units), frame: from.frame.into() },
            evidence,
            states: Vec::new(),
        }
    }
}
