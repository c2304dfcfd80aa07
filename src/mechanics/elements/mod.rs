//! Osculating elements of the two-body orbit about one primary.
//!
//! The primary's own gravitational parameter, 1 − μ or μ, holds the orbit; the axes are the inertial ones, which
//! coincide with the rotating ones at time 0, about that primary. Formulas as in Battin 1999, *An Introduction
//! to the Mathematics and Methods of Astrodynamics*, chapters 3 and 4, in forms that keep their digits near the
//! circle and near the parabola.
//!
//! # Special cases
//!
//! What is not defined is `None`.
//! - *Circle* (eccentricity up to [`CIRCULAR`]): no periapsis, so neither `argument_of_periapsis` nor an anomaly;
//!   `mean_longitude` tells where the body is.
//! - *Equatorial* (inclination exactly 0 or 180): no `ascending_node`; the x axis takes its place in
//!   `argument_of_periapsis` and `mean_longitude`, both along the motion.
//! - *Parabola*: no `semi_major_axis`, `mean_anomaly` or `mean_longitude`; `periapsis_distance` gives its size.
//! - *Hyperbola*: `semi_major_axis` is negative, anomalies are signed, there is no `mean_longitude`.
//! - *Radial motion*: eccentricity 1, periapsis distance 0, no orbital plane and so no angle.

mod angle;
mod to_state;

use nalgebra::Vector3;
use thiserror::Error;

use crate::frame::{Axes, Frame, Origin, XAxis};
use crate::quantity::{MassParameter, Quantity};
use crate::state::State;
use crate::system::Primary;

use angle::{degrees, less_sine, sincos_degrees, sinh_less, turn};

pub use to_state::{ElementsError, Member};

/// Eccentricity up to which an orbit is a circle: below it the direction of periapsis is made of rounding errors.
pub const CIRCULAR: f64 = 1e-15;

/// Largest |r/a| of a parabola, r the distance: the rounding error of the energy.
const PARABOLIC: f64 = 2e-15;

/// |1 − e²| up to which the eccentricity follows from the energy.
const NEARLY_PARABOLIC: f64 = 0.25;

/// Eccentricity up to which the anomalies are taken from their small differences, so that their sum with the
/// argument of periapsis keeps its digits near the circle.
const NEARLY_CIRCULAR: f64 = 0.5;

/// Osculating elements: lengths in separations of the primaries, angles in degrees, those of an ellipse in
/// [0, 360).
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Elements {
    /// Negative for a hyperbola.
    pub semi_major_axis: Option<f64>,
    /// Distance of the periapsis; may take the place of the semi-major axis, and must for a parabola.
    pub periapsis_distance: Option<f64>,
    /// 0 for a circle, 1 for a parabola, above 1 for a hyperbola.
    pub eccentricity: f64,
    /// From 0 to 180, above 90 for motion against that of the primaries.
    pub inclination: Option<f64>,
    /// From the x axis to where the orbit crosses z = 0 upwards.
    pub ascending_node: Option<f64>,
    /// From the ascending node to periapsis, along the motion.
    pub argument_of_periapsis: Option<f64>,
    /// From periapsis to the body, along the motion.
    pub true_anomaly: Option<f64>,
    /// Mean motion times the time since periapsis.
    pub mean_anomaly: Option<f64>,
    /// Sum of ascending node, argument of periapsis and mean anomaly.
    pub mean_longitude: Option<f64>,
    /// Mean longitude minus the smaller primary's longitude as seen from the larger.
    pub longitude_from_smaller: Option<f64>,
}

/// A state has no osculating elements.
#[derive(Clone, Copy, Debug, Eq, Error, PartialEq)]
pub enum NotOsculating {
    /// It lies on the primary.
    #[error("the position is the primary's centre, where no elements are defined")]
    AtCentre,
    /// Its elements cannot be written as doubles.
    #[error("the elements are beyond the range of double precision")]
    Range,
}

impl Elements {
    /// The elements of a state of the default frame, about the primary `about`, in the inertial axes whose x
    /// points along `x_axis` at time 0.
    ///
    /// # Errors
    /// [`NotOsculating`] on the primary itself, or where the elements overflow.
    pub fn from_state(
        mass_parameter: MassParameter,
        state: &State,
        about: Primary,
        x_axis: XAxis,
    ) -> Result<Self, NotOsculating> {
        Self::from_state_of(Frame::default(), mass_parameter, state, about, x_axis)
    }

    /// The same of a state of `frame`. A state counted from the primary keeps its digits however near it is.
    ///
    /// # Errors
    /// [`NotOsculating`] on the primary itself, or where the elements overflow.
    pub fn from_state_of(
        frame: Frame,
        mass_parameter: MassParameter,
        state: &State,
        about: Primary,
        x_axis: XAxis,
    ) -> Result<Self, NotOsculating> {
        let axes = Self::frame(about, x_axis);
        let State { time, position, velocity } = frame.convert(axes, mass_parameter, state);
        let gm = gravity(mass_parameter, about);
        let distance = position.norm();
        if distance == 0.0 {
            return Err(NotOsculating::AtCentre);
        }
        let reciprocal = 2.0 / distance - velocity.norm_squared() / gm;
        let is_parabola = (reciprocal * distance).abs() <= PARABOLIC;
        let reciprocal = if is_parabola { 0.0 } else { reciprocal };
        let semi_major_axis = if is_parabola { None } else { Some(1.0 / reciprocal) };

        let momentum = position.cross(&velocity);
        let elements = if momentum == Vector3::zeros() {
            Self { semi_major_axis, periapsis_distance: Some(0.0), eccentricity: 1.0, ..Self::default() }
        } else {
            let semi_latus_rectum = momentum.norm_squared() / gm;
            let radial = position.dot(&velocity);
            let e_cos = semi_latus_rectum / distance - 1.0;
            let e_sin = momentum.norm() * (radial / distance) / gm;
            // 1 − e², which keeps eccentricity and semi-major axis in step near the parabola.
            let defect = semi_latus_rectum * reciprocal;
            let eccentricity = if defect.abs() < NEARLY_PARABOLIC {
                (1.0 - defect).sqrt()
            } else {
                libm::hypot(e_cos, e_sin)
            };
            let periapsis_distance = semi_latus_rectum / (1.0 + eccentricity);
            let orbit = Orbit {
                eccentricity,
                // 1 − e from the energy keeps the digits that subtracting e has lost.
                shortfall: periapsis_distance * reciprocal,
                true_anomaly: libm::atan2(e_sin, e_cos),
                reciprocal,
                distance,
                radial: radial / gm.sqrt(),
            };
            let elements = Self {
                semi_major_axis,
                periapsis_distance: Some(periapsis_distance),
                eccentricity,
                ..Self::default()
            };
            elements.oriented(&orbit, &position, &momentum, longitude_of_smaller(time, x_axis))
        };
        if elements.is_finite() { Ok(elements) } else { Err(NotOsculating::Range) }
    }

    /// The frame that elements about `about` refer to, whose x points along `x_axis` at time 0.
    #[must_use]
    pub fn frame(about: Primary, x_axis: XAxis) -> Frame {
        let origin = match about {
            Primary::Larger => Origin::Larger,
            Primary::Smaller => Origin::Smaller,
        };
        Frame { axes: Axes::Inertial, origin, x_axis }
    }

    /// Tisserand's parameter with respect to the smaller primary, T = 1/a + 2 √(a(1 − e²)) cos i, of elements
    /// about the larger; a in separations. `None` if the size or the inclination is missing.
    ///
    /// Tisserand 1896, *Traité de mécanique céleste* IV; Murray & Dermott 1999, *Solar System Dynamics*, 3.4.
    #[must_use]
    pub fn tisserand_parameter(&self) -> Option<f64> {
        let e = self.eccentricity;
        let reciprocal = self.semi_major_axis.map_or(0.0, f64::recip);
        let periapsis = self.periapsis_distance.or(self.semi_major_axis.map(|a| a * (1.0 - e)))?;
        if periapsis == 0.0 {
            return Some(reciprocal);
        }
        let (_, cos) = sincos_degrees(self.inclination?);
        Some(reciprocal + 2.0 * (periapsis * (1.0 + e)).sqrt() * cos)
    }

    fn oriented(
        self,
        orbit: &Orbit,
        position: &Vector3<f64>,
        momentum: &Vector3<f64>,
        longitude_of_smaller: f64,
    ) -> Self {
        let tilt = libm::hypot(momentum.x, momentum.y);
        let (node, toward_node) = if tilt == 0.0 {
            (None, Vector3::x())
        } else {
            let node = libm::atan2(momentum.x, -momentum.y);
            (Some(node), Vector3::new(-momentum.y / tilt, momentum.x / tilt, 0.0))
        };
        let ahead = momentum.normalize().cross(&toward_node);
        let latitude = libm::atan2(position.dot(&ahead), position.dot(&toward_node));
        let periapsis = (orbit.eccentricity > CIRCULAR).then_some(latitude - orbit.true_anomaly);
        let is_ellipse = orbit.reciprocal > 0.0;
        let equation_of_centre = is_ellipse.then(|| orbit.mean_minus_true());
        let mean_longitude = equation_of_centre.map(|difference| node.unwrap_or(0.0) + latitude + difference);
        let anomaly = |radians: f64| if is_ellipse { turn(radians) } else { degrees(radians) };
        let mean_anomaly = match equation_of_centre {
            Some(difference) => Some(turn(orbit.true_anomaly + difference)),
            None => (orbit.reciprocal < 0.0).then(|| degrees(orbit.hyperbolic_mean_anomaly())),
        };
        Self {
            inclination: Some(degrees(libm::atan2(tilt, momentum.z))),
            ascending_node: node.map(turn),
            argument_of_periapsis: periapsis.map(turn),
            true_anomaly: periapsis.map(|_| anomaly(orbit.true_anomaly)),
            mean_anomaly: periapsis.and(mean_anomaly),
            mean_longitude: mean_longitude.map(turn),
            longitude_from_smaller: mean_longitude.map(|longitude| turn(longitude - longitude_of_smaller)),
            ..self
        }
    }

    fn is_finite(&self) -> bool {
        self.eccentricity.is_finite()
            && [
                self.semi_major_axis,
                self.periapsis_distance,
                self.inclination,
                self.ascending_node,
                self.argument_of_periapsis,
                self.true_anomaly,
                self.mean_anomaly,
                self.mean_longitude,
                self.longitude_from_smaller,
            ]
            .iter()
            .flatten()
            .all(|value| value.is_finite())
    }
}

/// The place on a conic, radians.
struct Orbit {
    eccentricity: f64,
    /// 1 − e.
    shortfall: f64,
    true_anomaly: f64,
    /// 1/a.
    reciprocal: f64,
    distance: f64,
    /// r·v/√GM.
    radial: f64,
}

impl Orbit {
    /// Mean minus true anomaly of an ellipse, of the order of the eccentricity.
    fn mean_minus_true(&self) -> f64 {
        let Self { eccentricity: e, shortfall, true_anomaly, .. } = *self;
        if e <= NEARLY_CIRCULAR {
            let beta = e / (1.0 + (shortfall * (1.0 + e)).sqrt());
            let (sin, cos) = libm::sincos(true_anomaly);
            let eccentric_minus_true = -2.0 * libm::atan2(beta * sin, 1.0 + beta * cos);
            eccentric_minus_true - e * libm::sin(true_anomaly + eccentric_minus_true)
        } else {
            let e_sin = self.radial * self.reciprocal.sqrt();
            let eccentric = libm::atan2(e_sin, 1.0 - self.distance * self.reciprocal);
            less_sine(eccentric) + shortfall * libm::sin(eccentric) - true_anomaly
        }
    }

    /// e sinh H − H.
    fn hyperbolic_mean_anomaly(&self) -> f64 {
        let sinh = self.radial * (-self.reciprocal).sqrt() / self.eccentricity;
        let anomaly = libm::asinh(sinh);
        sinh_less(anomaly) - self.shortfall * sinh
    }
}

/// The gravitational parameter of a primary, in total masses.
fn gravity(mass_parameter: MassParameter, about: Primary) -> f64 {
    match about {
        Primary::Larger => 1.0 - mass_parameter.get(),
        Primary::Smaller => mass_parameter.get(),
    }
}

/// Longitude of the smaller primary as seen from the larger, radians.
fn longitude_of_smaller(time: f64, x_axis: XAxis) -> f64 {
    let (sin, cos) = libm::sincos(time);
    match x_axis {
        XAxis::TowardSmaller => libm::atan2(sin, cos),
        XAxis::TowardLarger => libm::atan2(-sin, -cos),
    }
}
