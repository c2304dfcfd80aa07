//! The pair of primaries: mass parameter, scales, names and radii, and the [`catalogue`] of known pairs.
//!
//! Only the mass parameter is needed for a normalised computation. Scales turn normalised numbers into physical
//! ones, radii make contact with a surface possible; both are optional and whoever needs a missing one is told.

mod parts;

pub mod catalogue;

use std::borrow::Cow;

use crate::quantity::{Kilometres, KilometresPerSecond, MassParameter, Quantity, Radius, Seconds};

pub use parts::{Member, SystemError, SystemParts};

/// One of the two massive bodies.
#[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
pub enum Primary {
    /// The one with the share 1 − μ of the mass, at x = −μ.
    Larger,
    /// The one with the share μ of the mass, at x = 1 − μ.
    Smaller,
}

/// What is known of a primary besides its share of the mass.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Body {
    /// What people call it.
    pub name: Option<Cow<'static, str>>,
    /// Gravitational parameter, km³/s².
    pub gm_km3_s2: Option<f64>,
    /// Mean radius, km.
    pub radius_km: Option<f64>,
}

/// A pair of primaries whose members have been checked, alone and against each other.
///
/// Built from [`SystemParts`], a mass parameter alone, or the [`catalogue`].
#[derive(Clone, Debug, PartialEq)]
pub struct System {
    id: Option<&'static str>,
    mass_parameter: MassParameter,
    larger: Body,
    smaller: Body,
    radius_larger: Option<Radius>,
    radius_smaller: Option<Radius>,
    length: Option<Kilometres>,
    time: Option<Seconds>,
    velocity: Option<KilometresPerSecond>,
}

impl System {
    /// A system without scales, names and radii.
    #[must_use]
    pub fn from_mass_parameter(mass_parameter: MassParameter) -> Self {
        Self {
            id: None,
            mass_parameter,
            larger: Body::default(),
            smaller: Body::default(),
            radius_larger: None,
            radius_smaller: None,
            length: None,
            time: None,
            velocity: None,
        }
    }

    /// Its identifier in the catalogue, if it comes from there.
    #[must_use]
    pub fn id(&self) -> Option<&'static str> {
        self.id
    }

    /// μ, the smaller primary's share of the total mass.
    #[must_use]
    pub fn mass_parameter(&self) -> MassParameter {
        self.mass_parameter
    }

    /// Name, gravitational parameter and radius of a primary, as far as known.
    #[must_use]
    pub fn body(&self, primary: Primary) -> &Body {
        match primary {
            Primary::Larger => &self.larger,
            Primary::Smaller => &self.smaller,
        }
    }

    /// Radius of a primary in separations.
    #[must_use]
    pub fn radius(&self, primary: Primary) -> Option<f64> {
        match primary {
            Primary::Larger => self.radius_larger,
            Primary::Smaller => self.radius_smaller,
        }
        .map(Quantity::get)
    }

    /// Separation of the primaries, km: the unit of length.
    #[must_use]
    pub fn length_km(&self) -> Option<f64> {
        self.length.map(Quantity::get)
    }

    /// Inverse mean motion of the primaries, s: the unit of time.
    #[must_use]
    pub fn time_s(&self) -> Option<f64> {
        self.time.map(Quantity::get)
    }

    /// Separation times mean motion, km/s: the unit of velocity.
    #[must_use]
    pub fn velocity_km_s(&self) -> Option<f64> {
        self.velocity.map(Quantity::get)
    }

    /// Everything known, in the form that [`SystemParts::resolve`] turns back into this very system.
    #[must_use]
    pub fn parts(&self) -> SystemParts {
        SystemParts {
            id: self.id.map(Cow::Borrowed),
            larger: self.larger.clone(),
            smaller: self.smaller.clone(),
            mass_parameter: Some(self.mass_parameter.get()),
            radius_larger: self.radius(Primary::Larger),
            radius_smaller: self.radius(Primary::Smaller),
            length_km: self.length_km(),
            time_s: self.time_s(),
            velocity_km_s: self.velocity_km_s(),
            ..SystemParts::default()
        }
    }
}

/// The unit of time of two bodies by Kepler's third law, s: √(separation³ / (GM₁ + GM₂)), in km and km³/s².
fn kepler_time(separation: f64, total_gm: f64) -> f64 {
    (separation * separation * separation / total_gm).sqrt()
}
