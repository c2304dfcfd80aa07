//! A system as people write it down: any sufficient choice of members, redundant ones included.

use std::borrow::Cow;
use std::fmt;

use thiserror::Error;

use super::{Body, Primary, System, catalogue, kepler_time};
use crate::quantity::{
    GravitationalParameter, Kilometres, KilometresPerSecond, MassParameter, OutOfRange, Quantity, Radius,
    Seconds,
};

/// Largest relative disagreement of redundant members: beyond the rounding of any chain of conversions, below
/// the last digit that anyone writes by hand.
const AGREEMENT: f64 = 1e-9;

macro_rules! members {
    ($($(#[$doc:meta])* $name:ident = $path:literal,)*) => {
        /// A member of [`SystemParts`].
        #[derive(Clone, Copy, Debug, Eq, PartialEq)]
        pub enum Member {
            $($(#[$doc])* $name,)*
        }

        impl Member {
            /// Where the member lies inside a system, as a JSON pointer (RFC 6901).
            #[must_use]
            pub const fn pointer(self) -> &'static str {
                match self {
                    $(Self::$name => $path,)*
                }
            }
        }
    };
}

members! {
    /// Catalogue identifier.
    Id = "/id",
    /// Name of the larger primary.
    LargerName = "/larger/name",
    /// Gravitational parameter of the larger primary.
    LargerGm = "/larger/gm_km3_s2",
    /// Radius of the larger primary.
    LargerRadius = "/larger/radius_km",
    /// Name of the smaller primary.
    SmallerName = "/smaller/name",
    /// Gravitational parameter of the smaller primary.
    SmallerGm = "/smaller/gm_km3_s2",
    /// Radius of the smaller primary.
    SmallerRadius = "/smaller/radius_km",
    /// Mass parameter.
    MassParameter = "/mass_parameter",
    /// Separation, as the unit of length.
    LengthKm = "/length_km",
    /// Unit of time.
    TimeS = "/time_s",
    /// Unit of velocity.
    VelocityKmS = "/velocity_km_s",
    /// Separation.
    SeparationKm = "/separation_km",
    /// Radius of the larger primary, km.
    RadiusLargerKm = "/radius_larger_km",
    /// Radius of the smaller primary, km.
    RadiusSmallerKm = "/radius_smaller_km",
    /// Radius of the larger primary, in separations.
    RadiusLarger = "/radius_larger",
    /// Radius of the smaller primary, in separations.
    RadiusSmaller = "/radius_smaller",
}

impl fmt::Display for Member {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(&self.pointer()[1..].replace('/', "."))
    }
}

/// What is wrong with a member of a system.
#[derive(Clone, Debug, Error, PartialEq)]
pub enum SystemError {
    /// The catalogue has no such system.
    #[error("the catalogue has no system `{0}`")]
    UnknownId(String),
    /// A given or derived value outside its range.
    #[error("{1}")]
    OutOfRange(Member, OutOfRange),
    /// A member without which another means nothing.
    #[error("missing: `{needed_by}` needs it")]
    Missing {
        /// What is missing.
        member: Member,
        /// What cannot be used without it.
        needed_by: Member,
    },
    /// Nothing tells the mass parameter.
    #[error("missing: give `mass_parameter`, an `id`, or two bodies with `gm_km3_s2` and `separation_km`")]
    NoMass,
    /// A member that disagrees with what the others make of it.
    #[error("contradicts the other members, from which {expected:?} follows, got {given:?}")]
    Contradiction {
        /// The member at fault.
        member: Member,
        /// Its value.
        given: f64,
        /// What follows from the others.
        expected: f64,
    },
    /// A name other than that of the catalogue's system.
    #[error("the catalogue's name of this body is `{expected}`, got `{given}`")]
    OtherName {
        /// The member at fault.
        member: Member,
        /// Its value.
        given: String,
        /// The catalogue's name.
        expected: String,
    },
    /// The body called larger has the smaller gravitational parameter.
    #[error("the larger primary's gravitational parameter {larger:?} is below the smaller's {smaller:?}")]
    LargerIsLighter {
        /// km³/s².
        larger: f64,
        /// km³/s².
        smaller: f64,
    },
    /// The radii add up to the separation or more.
    #[error("the bodies overlap: their radii add up to {0} separations, which must be below 1")]
    Overlap(f64),
}

impl SystemError {
    /// The member at fault, if it is one alone.
    #[must_use]
    pub fn member(&self) -> Option<Member> {
        match *self {
            Self::UnknownId(_) => Some(Member::Id),
            Self::OutOfRange(member, _)
            | Self::Missing { member, .. }
            | Self::Contradiction { member, .. }
            | Self::OtherName { member, .. } => Some(member),
            Self::LargerIsLighter { .. } => Some(Member::LargerGm),
            Self::NoMass | Self::Overlap(_) => None,
        }
    }
}

/// A system in the making: members as given, unchecked. Any sufficient choice will do; members beyond it must
/// agree with the others to a relative 1e-9.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct SystemParts {
    /// Catalogue identifier; everything else then follows from it.
    pub id: Option<Cow<'static, str>>,
    /// The larger primary. Gravitational parameters come in pairs and need the separation.
    pub larger: Body,
    /// The smaller primary.
    pub smaller: Body,
    /// μ, the smaller primary's share of the total mass.
    pub mass_parameter: Option<f64>,
    /// Separation of the primaries, km.
    pub length_km: Option<f64>,
    /// Inverse mean motion, s; follows from length and velocity, or from gravitational parameters and length.
    pub time_s: Option<f64>,
    /// Separation times mean motion, km/s.
    pub velocity_km_s: Option<f64>,
    /// The same as `length_km`.
    pub separation_km: Option<f64>,
    /// The same as the larger body's `radius_km`.
    pub radius_larger_km: Option<f64>,
    /// The same as the smaller body's `radius_km`.
    pub radius_smaller_km: Option<f64>,
    /// Radius of the larger primary, in separations.
    pub radius_larger: Option<f64>,
    /// Radius of the smaller primary, in separations.
    pub radius_smaller: Option<f64>,
}

impl SystemParts {
    /// The system that the members describe. A given value is kept to the bit where others imply it too.
    ///
    /// # Errors
    /// Everything that is missing, out of range or contradictory, all at once.
    pub fn resolve(&self) -> Result<System, Vec<SystemError>> {
        match &self.id {
            Some(id) => match catalogue::find(id) {
                Some(entry) => self.check_against(entry.system()),
                None => Err(vec![SystemError::UnknownId(id.to_string())]),
            },
            None => self.reconcile(),
        }
    }

    fn check_against(&self, system: System) -> Result<System, Vec<SystemError>> {
        let mut errors = Vec::new();
        let (larger, smaller) = (&system.larger, &system.smaller);
        for (member, given, expected) in [
            (Member::LargerGm, self.larger.gm_km3_s2, larger.gm_km3_s2),
            (Member::LargerRadius, self.larger.radius_km, larger.radius_km),
            (Member::SmallerGm, self.smaller.gm_km3_s2, smaller.gm_km3_s2),
            (Member::SmallerRadius, self.smaller.radius_km, smaller.radius_km),
            (Member::MassParameter, self.mass_parameter, Some(system.mass_parameter.get())),
            (Member::LengthKm, self.length_km, system.length_km()),
            (Member::TimeS, self.time_s, system.time_s()),
            (Member::VelocityKmS, self.velocity_km_s, system.velocity_km_s()),
            (Member::SeparationKm, self.separation_km, system.length_km()),
            (Member::RadiusLargerKm, self.radius_larger_km, larger.radius_km),
            (Member::RadiusSmallerKm, self.radius_smaller_km, smaller.radius_km),
            (Member::RadiusLarger, self.radius_larger, system.radius(Primary::Larger)),
            (Member::RadiusSmaller, self.radius_smaller, system.radius(Primary::Smaller)),
        ] {
            compare(member, given, expected, &mut errors);
        }
        for (member, given, expected) in [
            (Member::LargerName, &self.larger.name, &larger.name),
            (Member::SmallerName, &self.smaller.name, &smaller.name),
        ] {
            if let (Some(given), Some(expected)) = (given, expected)
                && given != expected
            {
                let (given, expected) = (given.to_string(), expected.to_string());
                errors.push(SystemError::OtherName { member, given, expected });
            }
        }
        if errors.is_empty() { Ok(system) } else { Err(errors) }
    }

    fn reconcile(&self) -> Result<System, Vec<SystemError>> {
        let mut errors = Vec::new();
        let masses = self.masses(&mut errors);
        let mass_parameter = settle::<MassParameter>(
            Member::MassParameter,
            self.mass_parameter,
            masses.map(|(larger, smaller)| smaller / (larger + smaller)),
            &mut errors,
        );
        let no_mass = self.larger.gm_km3_s2.or(self.smaller.gm_km3_s2).or(self.mass_parameter).is_none();
        if no_mass {
            errors.push(SystemError::NoMass);
        }

        let separation = settle::<Kilometres>(Member::SeparationKm, self.separation_km, None, &mut errors);
        let time = settle::<Seconds>(Member::TimeS, self.time_s, None, &mut errors).map(Quantity::get);
        let velocity =
            settle::<KilometresPerSecond>(Member::VelocityKmS, self.velocity_km_s, None, &mut errors)
                .map(Quantity::get);
        let lacks_separation = self.length_km.or(self.separation_km).is_none();
        let swept = time.zip(velocity).filter(|_| lacks_separation).map(|(time, velocity)| time * velocity);
        let length = settle::<Kilometres>(
            Member::LengthKm,
            self.length_km,
            separation.map(Quantity::get).or(swept),
            &mut errors,
        );
        let kilometres = length.map(Quantity::get);
        let kepler =
            kilometres.zip(masses).map(|(length, (larger, smaller))| kepler_time(length, larger + smaller));
        let crossed =
            kilometres.zip(velocity).filter(|_| time.is_none()).map(|(length, velocity)| length / velocity);
        let time = settle::<Seconds>(Member::TimeS, time, kepler.or(crossed), &mut errors);
        let velocity = settle::<KilometresPerSecond>(
            Member::VelocityKmS,
            velocity,
            kilometres.zip(time).map(|(length, time)| length / time.get()),
            &mut errors,
        );

        let lacks_length = lacks_separation && swept.is_none();
        if lacks_length && masses.is_some() {
            errors.push(SystemError::Missing { member: Member::SeparationKm, needed_by: Member::LargerGm });
        }
        let mut radius_of = |primary| self.radius(primary, kilometres, lacks_length, &mut errors);
        let (radius_larger, larger_km) = radius_of(Primary::Larger);
        let (radius_smaller, smaller_km) = radius_of(Primary::Smaller);
        let sum = radius_larger.map_or(0.0, Quantity::get) + radius_smaller.map_or(0.0, Quantity::get);
        if sum >= 1.0 {
            errors.push(SystemError::Overlap(sum));
        }

        match mass_parameter {
            Some(mass_parameter) if errors.is_empty() => Ok(System {
                id: None,
                mass_parameter,
                larger: Body { radius_km: larger_km, ..self.larger.clone() },
                smaller: Body { radius_km: smaller_km, ..self.smaller.clone() },
                radius_larger,
                radius_smaller,
                length,
                time,
                velocity,
            }),
            _ => Err(errors),
        }
    }

    /// Both gravitational parameters, if they are given and sound.
    fn masses(&self, errors: &mut Vec<SystemError>) -> Option<(f64, f64)> {
        let (larger, smaller) = (self.larger.gm_km3_s2, self.smaller.gm_km3_s2);
        if larger.is_some() != smaller.is_some() {
            let (member, needed_by) = if larger.is_some() {
                (Member::SmallerGm, Member::LargerGm)
            } else {
                (Member::LargerGm, Member::SmallerGm)
            };
            errors.push(SystemError::Missing { member, needed_by });
        }
        let larger = settle::<GravitationalParameter>(Member::LargerGm, larger, None, errors);
        let smaller = settle::<GravitationalParameter>(Member::SmallerGm, smaller, None, errors);
        let (larger, smaller) = (larger?.get(), smaller?.get());
        if larger < smaller {
            errors.push(SystemError::LargerIsLighter { larger, smaller });
            return None;
        }
        Some((larger, smaller))
    }

    /// A primary's radius in separations, and in km where the separation is known.
    fn radius(
        &self,
        primary: Primary,
        length: Option<f64>,
        lacks_length: bool,
        errors: &mut Vec<SystemError>,
    ) -> (Option<Radius>, Option<f64>) {
        let (of_body, aside, normalised) = match primary {
            Primary::Larger => (
                (Member::LargerRadius, self.larger.radius_km),
                (Member::RadiusLargerKm, self.radius_larger_km),
                (Member::RadiusLarger, self.radius_larger),
            ),
            Primary::Smaller => (
                (Member::SmallerRadius, self.smaller.radius_km),
                (Member::RadiusSmallerKm, self.radius_smaller_km),
                (Member::RadiusSmaller, self.radius_smaller),
            ),
        };
        for (needed_by, given) in [of_body, aside] {
            if given.is_some() && lacks_length {
                errors.push(SystemError::Missing { member: Member::LengthKm, needed_by });
            }
        }
        let aside = settle::<Kilometres>(aside.0, aside.1, None, errors);
        let radius_km = settle::<Kilometres>(of_body.0, of_body.1, aside.map(Quantity::get), errors);
        let radius_km = radius_km.map(Quantity::get);
        let derived = radius_km.zip(length).map(|(radius, length)| radius / length);
        let radius = settle::<Radius>(normalised.0, normalised.1, derived, errors);
        (radius, radius_km.or(radius.zip(length).map(|(radius, length)| radius.get() * length)))
    }
}

/// The given value if there is one, else the derived one; complains if they disagree or the value is out of
/// range.
fn settle<Q: Quantity>(
    member: Member,
    given: Option<f64>,
    derived: Option<f64>,
    errors: &mut Vec<SystemError>,
) -> Option<Q> {
    match Q::new(given.or(derived)?) {
        Ok(value) => {
            compare(member, given, derived, errors);
            Some(value)
        }
        Err(error) => {
            errors.push(SystemError::OutOfRange(member, error));
            None
        }
    }
}

fn compare(member: Member, given: Option<f64>, expected: Option<f64>, errors: &mut Vec<SystemError>) {
    if let (Some(given), Some(expected)) = (given, expected) {
        let agrees = (given - expected).abs() <= AGREEMENT * expected.abs();
        if !agrees {
            errors.push(SystemError::Contradiction { member, given, expected });
        }
    }
}
