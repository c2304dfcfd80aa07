//! Osculating two-body elements.

use mechanics::elements::Elements;
use mechanics::units::Scale;
use serde::Serialize;
use utoipa::ToSchema;

use crate::decode::{choices, request};

choices! {
    /// One of the primaries.
    pub enum About = mechanics::system::Primary { Larger = "larger", Smaller = "smaller" }
}

request! {
    /// Osculating two-body elements about one primary, with the gravity of that body alone, in inertial axes. Lengths
    /// are in the request's units, angles in degrees. What a circle or an orbit in the plane leaves undefined may be
    /// absent; derived members are ignored where the orbit is determined without them.
    pub struct ElementsSpec {
        /// Semi-major axis, negative for a hyperbola; a parabola has none.
        optional semi_major_axis: f64,
        /// Distance of the periapsis; may take the place of the semi-major axis, and must for a parabola.
        optional periapsis_distance: f64,
        /// 0 for a circle, 1 for a parabola, above 1 for a hyperbola.
        required eccentricity: f64,
        /// Inclination, from 0 to 180 degrees.
        optional inclination: f64,
        /// Longitude of the ascending node, degrees.
        optional ascending_node: f64,
        /// Argument of periapsis, degrees.
        optional argument_of_periapsis: f64,
        /// True anomaly, degrees.
        optional true_anomaly: f64,
        /// Mean anomaly, degrees; may take the place of the true one on an ellipse.
        optional mean_anomaly: f64,
        /// Mean longitude, degrees; may take the place of the true anomaly on an ellipse.
        optional mean_longitude: f64,
        /// Mean longitude minus the smaller primary's; ignored.
        optional longitude_from_smaller: f64,
    }
}

impl ElementsSpec {
    /// The elements in separations.
    #[must_use]
    pub fn normalized(self, scale: &Scale) -> Elements {
        Elements {
            semi_major_axis: self.semi_major_axis.given().map(|length| length / scale.length),
            periapsis_distance: self.periapsis_distance.given().map(|length| length / scale.length),
            eccentricity: self.eccentricity.given().unwrap_or(f64::NAN),
            inclination: self.inclination.given(),
            ascending_node: self.ascending_node.given(),
            argument_of_periapsis: self.argument_of_periapsis.given(),
            true_anomaly: self.true_anomaly.given(),
            mean_anomaly: self.mean_anomaly.given(),
            mean_longitude: self.mean_longitude.given(),
            longitude_from_smaller: self.longitude_from_smaller.given(),
        }
    }
}

/// Osculating two-body elements about one primary, in inertial axes; undefined ones null. Lengths are in the
/// answer's units, angles in degrees.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
#[schema(as = Elements)]
pub struct ElementsEcho {
    /// Semi-major axis, negative for a hyperbola, null for a parabola.
    semi_major_axis: Option<f64>,
    /// Distance of the periapsis.
    periapsis_distance: Option<f64>,
    /// 0 for a circle, 1 for a parabola, above 1 for a hyperbola.
    eccentricity: f64,
    /// Inclination.
    inclination: Option<f64>,
    /// Longitude of the ascending node.
    ascending_node: Option<f64>,
    /// Argument of periapsis.
    argument_of_periapsis: Option<f64>,
    /// True anomaly.
    true_anomaly: Option<f64>,
    /// Mean anomaly.
    mean_anomaly: Option<f64>,
    /// Ascending node plus argument of periapsis plus mean anomaly.
    mean_longitude: Option<f64>,
    /// Mean longitude minus the smaller primary's.
    longitude_from_smaller: Option<f64>,
}

impl ElementsEcho {
    /// The elements with lengths in the units of `scale`.
    #[must_use]
    pub fn new(elements: &Elements, scale: &Scale) -> Self {
        Self {
            semi_major_axis: elements.semi_major_axis.map(|length| length * scale.length),
            periapsis_distance: elements.periapsis_distance.map(|length| length * scale.length),
            eccentricity: elements.eccentricity,
            inclination: elements.inclination,
            ascending_node: elements.ascending_node,
            argument_of_periapsis: elements.argument_of_periapsis,
            true_anomaly: elements.true_anomaly,
            mean_anomaly: elements.mean_anomaly,
            mean_longitude: elements.mean_longitude,
            longitude_from_smaller: elements.longitude_from_smaller,
        }
    }
}
