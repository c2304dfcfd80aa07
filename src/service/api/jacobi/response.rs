use mechanics::equilibria::{Equilibria, Point};
use mechanics::frame::Frame;
use mechanics::hill::{self, OpenPassages};
use mechanics::potential::{self, JacobiConstant};
use mechanics::units::Scale;
use serde::Serialize;
use utoipa::ToSchema;

use super::request::Subject;
use crate::decode::choices;
use crate::wire::{Conventions, ConventionsEcho, JacobiForm};

choices! {
    /// Where steepest ascent of the effective potential from a position ends; with closed passages that is the connected
    /// component of the region of motion.
    pub(crate) enum Region = hill::Region {
        AroundLarger = "around_larger",
        AroundSmaller = "around_smaller",
        Outside = "outside",
    }
}

choices! {
    /// A passage between regions, at L1, L2 or L3; `L4_L5` when nothing is forbidden in the plane.
    pub(crate) enum Passage = hill::Passage { L1 = "L1", L2 = "L2", L3 = "L3", Triangular = "L4_L5" }
}

/// A number for each equilibrium.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
pub(crate) struct PerPoint {
    /// For L1, between the primaries.
    #[serde(rename = "L1")]
    l1: f64,
    /// For L2, beyond the smaller primary.
    #[serde(rename = "L2")]
    l2: f64,
    /// For L3, beyond the larger primary.
    #[serde(rename = "L3")]
    l3: f64,
    /// For L4, 60 degrees ahead of the smaller primary.
    #[serde(rename = "L4")]
    l4: f64,
    /// For L5, 60 degrees behind the smaller primary.
    #[serde(rename = "L5")]
    l5: f64,
}

impl PerPoint {
    fn new(equilibria: &Equilibria, number: impl Fn(&JacobiConstant) -> f64) -> Self {
        let [l1, l2, l3, l4, l5] = Point::ALL.map(|point| number(&equilibria.get(point).jacobi_constant()));
        Self { l1, l2, l3, l4, l5 }
    }
}

/// Jacobi constants of states, beside those of the equilibria.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct JacobiAnswer<'a> {
    #[serde(flatten)]
    conventions: ConventionsEcho<'a>,
    /// Which Jacobi constant is meant.
    jacobi_form: JacobiForm,
    /// How good the numbers are.
    evidence: JacobiEvidence,
    /// Jacobi constants of rest in the equilibria, in the velocity unit squared.
    equilibria: PerPoint,
    /// The states in the request's order.
    states: Vec<Energetics>,
}

/// How good the constants are, measured.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
pub(crate) struct JacobiEvidence {
    /// Largest difference between a state's constant and the definition's terms summed in double precision, relative to
    /// the largest of them. Most of it is the rounding of that sum; the constants themselves carry about 30 digits.
    largest_departure_from_definition: f64,
    /// Largest acceleration left over at rest in an equilibrium, in separations times mean motion squared, whatever the
    /// units.
    largest_residual: f64,
}

/// A state's Jacobi constant and what follows from it.
#[derive(Debug, Serialize, ToSchema)]
pub(crate) struct Energetics {
    /// Jacobi constant, in the velocity unit squared.
    jacobi_constant: f64,
    /// Minus half of that.
    energy: f64,
    /// (C + v^2)/2 of the same form, in the velocity unit squared; positive.
    effective_potential: f64,
    /// Speed in rotating axes.
    speed: f64,
    /// Distance to the larger primary's centre.
    distance_to_larger: f64,
    /// Distance to the smaller primary's centre.
    distance_to_smaller: f64,
    /// Where the position belongs.
    region: Region,
    /// The passages whose Jacobi constant lies above the state's, in the order in which they open.
    open_passages: Vec<Passage>,
    /// The regions joined to the state's own, itself included, through open passages.
    reachable_regions: Vec<Region>,
    /// The state's Jacobi constant minus that of rest in each equilibrium, without cancellation.
    above: PerPoint,
}

impl<'a> JacobiAnswer<'a> {
    /// The answer without its states.
    pub(super) fn new(
        conventions: &'a Conventions,
        jacobi_form: JacobiForm,
        equilibria: &Equilibria,
        largest_departure_from_definition: f64,
    ) -> Self {
        let energy = conventions.scale.energy();
        Self {
            evidence: JacobiEvidence {
                largest_departure_from_definition,
                largest_residual: equilibria.largest_residual(),
            },
            equilibria: PerPoint::new(equilibria, |constant| constant.value(jacobi_form.into()) * energy),
            conventions: conventions.echo(),
            jacobi_form,
            states: Vec::new(),
        }
    }
}

impl Energetics {
    pub(super) fn new(
        Subject { origin, state, at_rest }: &Subject,
        equilibria: &Equilibria,
        scale: &Scale,
        form: potential::JacobiForm,
    ) -> Self {
        let constant = at_rest.moving(&state.velocity);
        let mu = equilibria.mass_parameter();
        let distances = potential::distances_from(*origin, mu, &state.position);
        let frame = Frame { origin: *origin, ..Frame::default() };
        let region = hill::Region::of(equilibria, &frame.to_default(mu, state).position);
        let open = OpenPassages::at(equilibria, &constant);
        let energy = scale.energy();
        Self {
            jacobi_constant: constant.value(form) * energy,
            energy: constant.energy(form) * energy,
            effective_potential: 0.5 * at_rest.value(form) * energy,
            speed: state.velocity.norm() * scale.velocity,
            distance_to_larger: distances.larger * scale.length,
            distance_to_smaller: distances.smaller * scale.length,
            region: region.into(),
            open_passages: open.iter().map(Into::into).collect(),
            reachable_regions: open.reachable_from(region).map(Into::into).collect(),
            above: PerPoint::new(equilibria, |other| constant.above(other) * energy),
        }
    }
}
