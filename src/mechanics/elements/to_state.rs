//! From elements to a state.

use nalgebra::Vector3;
use thiserror::Error;

use super::angle::{degrees, sincos_degrees, true_from_mean};
use super::{CIRCULAR, Elements, gravity};
use crate::frame::XAxis;
use crate::quantity::{
    Angle, Eccentricity, Inclination, MassParameter, OutOfRange, PeriapsisDistance, Quantity, SemiMajorAxis,
};
use crate::state::State;
use crate::system::Primary;

/// Largest relative disagreement of semi-major axis and periapsis distance.
const AGREEMENT: f64 = 1e-9;
/// Rounding of 1 − e, in units of the last place of e, that is no disagreement.
const ROUNDING: f64 = 4.0 * f64::EPSILON;

/// A member of [`Elements`].
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Member {
    /// Semi-major axis.
    SemiMajorAxis,
    /// Periapsis distance.
    PeriapsisDistance,
    /// Eccentricity.
    Eccentricity,
    /// Inclination.
    Inclination,
    /// Longitude of the ascending node.
    AscendingNode,
    /// Argument of periapsis.
    ArgumentOfPeriapsis,
    /// True anomaly.
    TrueAnomaly,
    /// Mean anomaly.
    MeanAnomaly,
    /// Mean longitude.
    MeanLongitude,
}

impl Member {
    /// Where the member lies inside the elements, as a JSON pointer (RFC 6901).
    #[must_use]
    pub const fn pointer(self) -> &'static str {
        match self {
            Self::SemiMajorAxis => "/semi_major_axis",
            Self::PeriapsisDistance => "/periapsis_distance",
            Self::Eccentricity => "/eccentricity",
            Self::Inclination => "/inclination",
            Self::AscendingNode => "/ascending_node",
            Self::ArgumentOfPeriapsis => "/argument_of_periapsis",
            Self::TrueAnomaly => "/true_anomaly",
            Self::MeanAnomaly => "/mean_anomaly",
            Self::MeanLongitude => "/mean_longitude",
        }
    }
}

/// What is wrong with elements that should describe a state.
#[derive(Clone, Copy, Debug, Error, PartialEq)]
pub enum ElementsError {
    /// A value outside its range.
    #[error("{1}")]
    OutOfRange(Member, OutOfRange),
    /// A member that this orbit needs.
    #[error("missing: {1}")]
    Missing(Member, &'static str),
    /// A semi-major axis of the wrong sign.
    #[error("must be positive for an ellipse and negative for a hyperbola, got {0}")]
    Sign(f64),
    /// A periapsis distance other than a(1 − e).
    #[error("contradicts semi-major axis and eccentricity, from which {expected} follows, got {given}")]
    Contradiction {
        /// The periapsis distance.
        given: f64,
        /// a(1 − e).
        expected: f64,
    },
    /// A true anomaly that the orbit never has.
    #[error("lies at or beyond the asymptote of this orbit, got {0}")]
    BeyondAsymptote(f64),
    /// A state that cannot be written as doubles.
    #[error("the elements give a state beyond the range of double precision")]
    Range,
}

impl ElementsError {
    /// The member at fault, if it is one alone.
    #[must_use]
    pub fn member(&self) -> Option<Member> {
        match *self {
            Self::OutOfRange(member, _) | Self::Missing(member, _) => Some(member),
            Self::Sign(_) => Some(Member::SemiMajorAxis),
            Self::Contradiction { .. } => Some(Member::PeriapsisDistance),
            Self::BeyondAsymptote(_) => Some(Member::TrueAnomaly),
            Self::Range => None,
        }
    }
}

impl Elements {
    /// The state, in the default frame at `time`, that has these elements about `about` in the inertial axes whose
    /// x points along `x_axis` at time 0.
    ///
    /// Needed are eccentricity, inclination, a size and three angles; what the special cases leave undefined may
    /// be absent. The size is `semi_major_axis` or `periapsis_distance`, for a parabola the latter. The place on an
    /// ellipse may be given by `mean_anomaly` or `mean_longitude` if `true_anomaly` is absent; beside it they are
    /// ignored.
    ///
    /// # Errors
    /// Everything that is missing, out of range or contradictory, all at once.
    pub fn to_state(
        &self,
        mass_parameter: MassParameter,
        time: f64,
        about: Primary,
        x_axis: XAxis,
    ) -> Result<State, Vec<ElementsError>> {
        let state = self.to_state_about(mass_parameter, time, about)?;
        Ok(Self::frame(about, x_axis).to_default(mass_parameter, &state))
    }

    /// The same state in the frame that the elements refer to, [`Elements::frame`], where it keeps its digits however
    /// near the primary it is.
    ///
    /// # Errors
    /// Everything that is missing, out of range or contradictory, all at once.
    pub fn to_state_about(
        &self,
        mass_parameter: MassParameter,
        time: f64,
        about: Primary,
    ) -> Result<State, Vec<ElementsError>> {
        let mut errors = Vec::new();
        let eccentricity =
            require::<Eccentricity>(Member::Eccentricity, Some(self.eccentricity), &mut errors);
        let shape = eccentricity.and_then(|e| self.shape(e, &mut errors));
        let inclination = require::<Inclination>(Member::Inclination, self.inclination, &mut errors);
        let node = match (self.ascending_node, inclination) {
            (None, Some(inclination)) if inclination % 180.0 == 0.0 => Some(0.0),
            (node, _) => require::<Angle>(Member::AscendingNode, node, &mut errors),
        };
        let periapsis = match self.argument_of_periapsis {
            None if self.eccentricity <= CIRCULAR => Some(0.0),
            periapsis => require::<Angle>(Member::ArgumentOfPeriapsis, periapsis, &mut errors),
        };
        let place = self.place(node, periapsis, shape, &mut errors);
        let (Some(shape), Some(inclination), Some(node), Some(periapsis), Some(anomaly)) =
            (shape, inclination, node, periapsis, place)
        else {
            return Err(errors);
        };
        if !errors.is_empty() {
            return Err(errors);
        }

        let Shape { periapsis_distance, eccentricity, shortfall } = shape;
        // 1 + e cos ν without the cancellation at the far end of a long ellipse.
        let (sin_half, cos_half) = sincos_degrees(anomaly / 2.0);
        let flight = shortfall + 2.0 * eccentricity * cos_half * cos_half;
        if flight <= 0.0 {
            return Err(vec![ElementsError::BeyondAsymptote(anomaly)]);
        }
        let semi_latus_rectum = periapsis_distance * (1.0 + eccentricity);
        let distance = semi_latus_rectum / flight;
        let speed = (gravity(mass_parameter, about) / semi_latus_rectum).sqrt();
        let (radial, transverse) = (speed * eccentricity * 2.0 * sin_half * cos_half, speed * flight);

        let (sin_u, cos_u) = sincos_degrees(periapsis + anomaly);
        let (sin_node, cos_node) = sincos_degrees(node);
        let (sin_i, cos_i) = sincos_degrees(inclination);
        let toward_node = Vector3::new(cos_node, sin_node, 0.0);
        let ahead = Vector3::new(-sin_node * cos_i, cos_node * cos_i, sin_i);
        let outward = toward_node * cos_u + ahead * sin_u;
        let along = ahead * cos_u - toward_node * sin_u;
        let state =
            State { time, position: outward * distance, velocity: outward * radial + along * transverse };
        if state.components().iter().all(|component| component.is_finite()) {
            Ok(state)
        } else {
            Err(vec![ElementsError::Range])
        }
    }

    /// The conic that size and eccentricity describe.
    fn shape(&self, eccentricity: f64, errors: &mut Vec<ElementsError>) -> Option<Shape> {
        let a = within::<SemiMajorAxis>(Member::SemiMajorAxis, self.semi_major_axis, errors)?;
        let q = within::<PeriapsisDistance>(Member::PeriapsisDistance, self.periapsis_distance, errors)?;
        let shortfall = 1.0 - eccentricity;
        let parabola = shortfall == 0.0;
        let (periapsis_distance, shortfall) = match (a, q) {
            (_, None) if parabola => {
                let why = "a parabola has no semi-major axis, its periapsis distance gives the size";
                errors.push(ElementsError::Missing(Member::PeriapsisDistance, why));
                return None;
            }
            (None, None) => {
                errors.push(ElementsError::Missing(Member::SemiMajorAxis, SemiMajorAxis::WHAT));
                return None;
            }
            (None, Some(q)) => (q, shortfall),
            (Some(a), _) if a * shortfall <= 0.0 && !parabola => {
                errors.push(ElementsError::Sign(a));
                return None;
            }
            (Some(a), None) => (a * shortfall, shortfall),
            (Some(a), Some(q)) => {
                let expected = a * shortfall;
                let agrees = (q - expected).abs() <= AGREEMENT * q + ROUNDING * a.abs();
                if !agrees {
                    errors.push(ElementsError::Contradiction { given: q, expected });
                    return None;
                }
                (q, q / a)
            }
        };
        Some(Shape { periapsis_distance, eccentricity, shortfall })
    }

    /// True anomaly, degrees, from whatever tells the place on the orbit.
    fn place(
        &self,
        node: Option<f64>,
        periapsis: Option<f64>,
        shape: Option<Shape>,
        errors: &mut Vec<ElementsError>,
    ) -> Option<f64> {
        if self.true_anomaly.is_some() {
            return require::<Angle>(Member::TrueAnomaly, self.true_anomaly, errors);
        }
        let mean = within::<Angle>(Member::MeanAnomaly, self.mean_anomaly, errors)?;
        let longitude = within::<Angle>(Member::MeanLongitude, self.mean_longitude, errors)?;
        let shape = shape?;
        if shape.shortfall <= 0.0 || mean.or(longitude).is_none() {
            errors.push(ElementsError::Missing(Member::TrueAnomaly, "it tells the place on the orbit"));
            return None;
        }
        let mean = mean.or(longitude
            .zip(node.zip(periapsis))
            .map(|(longitude, (node, periapsis))| longitude - node - periapsis))?;
        Some(degrees(true_from_mean(mean, shape.eccentricity, shape.shortfall)))
    }
}

/// A conic.
#[derive(Clone, Copy)]
struct Shape {
    periapsis_distance: f64,
    eccentricity: f64,
    /// 1 − e, with more digits than the eccentricity has where size and periapsis distance tell it.
    shortfall: f64,
}

/// A value that must be there, checked.
fn require<Q: Quantity>(member: Member, value: Option<f64>, errors: &mut Vec<ElementsError>) -> Option<f64> {
    if value.is_none() {
        errors.push(ElementsError::Missing(member, Q::WHAT));
    }
    within::<Q>(member, value, errors)?
}

/// A value that may be absent, checked if it is there; nothing if it is wrong.
#[expect(clippy::option_option, reason = "wrong, absent and given are three things")]
fn within<Q: Quantity>(
    member: Member,
    value: Option<f64>,
    errors: &mut Vec<ElementsError>,
) -> Option<Option<f64>> {
    match value.map(Q::new).transpose() {
        Ok(value) => Some(value.map(Quantity::get)),
        Err(error) => {
            errors.push(ElementsError::OutOfRange(member, error));
            None
        }
    }
}
