//! What the numbers of a request and its answer mean: system, units and frame. They go together, because a number can
//! be checked only when all three are known.

use std::borrow::Cow;

use mechanics::elements::Elements;
use mechanics::frame::Frame;
use mechanics::quantity::{Coordinate, Epoch, MassParameter, OutOfRange, Quantity, Speed};
use mechanics::state::State;
use mechanics::system::System;
use mechanics::units::{Scale, Units};
use nalgebra::Vector3;
use serde::{Serialize, Serializer};
use utoipa::ToSchema;
use utoipa::openapi::{RefOr, Schema};

use super::state::{Motion, Places, StateEcho, StateSpec};
use super::{FrameEcho, FrameSpec, SystemEcho, SystemSpec, UnitsEcho, UnitsSpec};
use crate::decode::{Errors, Field, Path, Schemas, refusal};

/// System, units and frame of a request and its answer.
#[derive(Clone, Debug, PartialEq)]
pub struct Conventions {
    /// The primaries.
    pub system: System,
    /// The units of all numbers.
    pub units: Units,
    /// The same as factors.
    pub scale: Scale,
    /// The frame of all states.
    pub frame: Frame,
}

/// The echo that every computed answer begins with.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = Conventions)]
pub struct ConventionsEcho<'a> {
    /// The system that was computed in.
    pub system: SystemEcho<'a>,
    /// The units of all numbers.
    pub units: UnitsEcho,
    /// The frame of all states.
    pub frame: FrameEcho,
}

impl Conventions {
    /// Checks the members `system`, `units` and `frame` of a request against each other.
    pub fn check(
        system: Field<SystemSpec>,
        units: Field<UnitsSpec>,
        frame: Field<FrameSpec>,
        errors: &mut Errors,
    ) -> Option<Self> {
        Self::check_under(Path::ROOT, system, units, frame, errors)
    }

    /// The same where `units` and `frame` lie in the object `at`.
    pub fn check_under(
        at: Path<'_>,
        system: Field<SystemSpec>,
        units: Field<UnitsSpec>,
        frame: Field<FrameSpec>,
        errors: &mut Errors,
    ) -> Option<Self> {
        let frame = frame.or(FrameSpec::default());
        let UnitsSpec(units) = units.or(UnitsSpec::default())?;
        let SystemSpec(system) = system.given()?;
        match units.scale(&system) {
            Ok(scale) => Some(Self { system, units, scale, frame: frame?.0 }),
            Err(missing) => {
                errors.push(at.member("units"), missing.to_string());
                None
            }
        }
    }

    /// The echo, which is also how they are serialised.
    #[must_use]
    pub fn echo(&self) -> ConventionsEcho<'_> {
        ConventionsEcho {
            system: (&self.system).into(),
            units: UnitsEcho(self.units),
            frame: self.frame.into(),
        }
    }

    /// A stand-in for those of a request whose system is wrong, to look for its other faults with: in normalised units
    /// they do not depend on the system.
    #[must_use]
    pub fn without_system(units: Field<UnitsSpec>, frame: Field<FrameSpec>) -> Option<Self> {
        let any = System::from_mass_parameter(MassParameter::constant(0.1));
        let UnitsSpec(units) = units.or(UnitsSpec::default())?;
        let FrameSpec(frame) = frame.or(FrameSpec::default())?;
        let normalized = units == Units::Normalized;
        normalized.then_some(Self { system: any, units, scale: Scale::IDENTITY, frame })
    }

    /// The state in normalised units, each component within its range, and the frame that it was given in, so that no
    /// digit is lost near a primary: the request's, or that of its elements.
    pub fn state_given(
        &self,
        given: StateSpec,
        places: &Places<'_>,
        errors: &mut Errors,
    ) -> Option<(Frame, State)> {
        let good = errors.count();
        let time = in_range::<Epoch>(given.time, self.scale.time)
            .map_err(|detail| places.report("time", "", detail, errors))
            .ok()?;
        let state = match given.motion {
            Motion::Velocity(position, velocity) => {
                let position = vector::<Coordinate>("position", position, self.scale.length, places, errors);
                let velocity = vector::<Speed>("velocity", velocity, self.scale.velocity, places, errors);
                State { time, position: position?, velocity: velocity? }
            }
            Motion::Momentum(position, momentum) => {
                let position = vector::<Coordinate>("position", position, self.scale.length, places, errors);
                let momentum = vector::<Speed>("momentum", momentum, self.scale.velocity, places, errors);
                let (position, momentum) = (position?, momentum?);
                match self.frame.velocity_from_momentum(&position, &momentum) {
                    Ok(velocity) => State { time, position, velocity },
                    Err(error) => {
                        places.report("momentum", "", error.to_string(), errors);
                        return None;
                    }
                }
            }
            Motion::Elements(elements, about) => {
                let elements = elements.normalized(&self.scale);
                let mu = self.system.mass_parameter();
                return match elements.to_state_about(mu, time, about.into()) {
                    Ok(state) => Some((Elements::frame(about.into(), self.frame.x_axis), state)),
                    Err(faults) => {
                        for fault in faults {
                            let member = fault.member().map_or("", |member| member.pointer());
                            places.report("elements", member, fault.to_string(), errors);
                        }
                        None
                    }
                };
            }
        };
        (errors.count() == good).then_some((self.frame, state))
    }

    /// A state of the default frame in the units and the frame of the answer.
    #[must_use]
    pub fn state_out(&self, state: &State) -> StateEcho {
        self.scale.state_out(&self.frame.from_default(self.system.mass_parameter(), state)).into()
    }
}

impl Serialize for Conventions {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        self.echo().serialize(serializer)
    }
}

impl utoipa::PartialSchema for Conventions {
    fn schema() -> RefOr<Schema> {
        ConventionsEcho::schema()
    }
}

impl ToSchema for Conventions {
    fn name() -> Cow<'static, str> {
        ConventionsEcho::name()
    }

    fn schemas(schemas: &mut Schemas) {
        ConventionsEcho::schemas(schemas);
    }
}

fn vector<Q: Quantity>(
    member: &str,
    given: [f64; 3],
    factor: f64,
    places: &Places<'_>,
    errors: &mut Errors,
) -> Option<Vector3<f64>> {
    let mut good = true;
    let components = std::array::from_fn(|index| match in_range::<Q>(given[index], factor) {
        Ok(value) => value,
        Err(detail) => {
            good = false;
            places.report(member, &format!("/{index}"), detail, errors);
            f64::NAN
        }
    });
    good.then(|| Vector3::from(components))
}

/// The normalised value of a number in units of which `factor` make one normalised unit, or what would be right.
fn in_range<Q: Quantity>(given: f64, factor: f64) -> Result<f64, String> {
    let value = given / factor;
    Q::new(value).map(Quantity::get).map_err(|OutOfRange { mut range, .. }| {
        range.min *= factor;
        range.max *= factor;
        refusal(&OutOfRange { value: given, range })
    })
}

/// The quantity of a number in units of which `factor` make one normalised unit; outside its range a fault at `at`,
/// told in those units.
pub fn scaled<Q: Quantity>(given: f64, factor: f64, at: Path<'_>, errors: &mut Errors) -> Option<Q> {
    match in_range::<Q>(given, factor) {
        Ok(value) => Q::new(value).ok(),
        Err(detail) => {
            errors.push(at, detail);
            None
        }
    }
}
