//! The primaries: a catalogue id, or an object with any sufficient choice of members.

use std::borrow::Cow;

use mechanics::quantity::Quantity;
use mechanics::system::{Body, Primary, System, SystemError, SystemParts, catalogue};
use serde::Serialize;
use utoipa::ToSchema;
use utoipa::openapi::schema::{AnyOfBuilder, ObjectBuilder, Type};
use utoipa::openapi::{RefOr, Schema};

use crate::decode::{
    Decode, Errors, Named, Node, Path, Schemas, Text, by_name, did_you_mean, request, with_description,
};

request! {
    /// One of the two massive bodies.
    pub(crate) struct BodySpec {
        /// What people call it.
        optional name: Text,
        /// Gravitational parameter, km^3/s^2; of both bodies or of none, with the separation.
        optional gm_km3_s2: f64,
        /// Mean radius, km.
        optional radius_km: f64,
    }
}

request! {
    /// A system by its members. Sufficient are `mass_parameter`, or an `id`, or the bodies' gravitational parameters
    /// and their separation. Members beyond that must agree with the others to a relative 1e-9.
    pub(crate) struct SystemObject {
        /// Catalogue id; see /v1/systems.
        optional id: Text,
        /// The larger primary.
        optional larger: BodySpec,
        /// The smaller primary.
        optional smaller: BodySpec,
        /// The smaller primary's share of the total mass, above 0 and at most 0.5.
        optional mass_parameter: f64,
        /// Separation of the primaries, km: the unit of length.
        optional length_km: f64,
        /// Inverse mean motion of the primaries, s: the unit of time.
        optional time_s: f64,
        /// Separation times mean motion, km/s: the unit of velocity.
        optional velocity_km_s: f64,
        /// The same as `length_km`.
        optional separation_km: f64,
        /// Radius of the larger primary, km.
        optional radius_larger_km: f64,
        /// Radius of the smaller primary, km.
        optional radius_smaller_km: f64,
        /// Radius of the larger primary, in separations.
        optional radius_larger: f64,
        /// Radius of the smaller primary, in separations.
        optional radius_smaller: f64,
        /// What the catalogue says of it; ignored.
        optional published_period_d: f64,
        /// What the catalogue says of it; ignored.
        optional sources: Vec<SourceSpec>,
    }
}

request! {
    /// A constant of the catalogue, as answers give it; ignored.
    pub(crate) struct SourceSpec {
        /// Which constant.
        optional constant: Text,
        /// Its value.
        optional value: f64,
        /// Where it was published.
        optional source: Text,
    }
}

impl From<BodySpec> for Body {
    fn from(body: BodySpec) -> Self {
        Self {
            name: body.name.given().map(|Text(name)| Cow::Owned(name)),
            gm_km3_s2: body.gm_km3_s2.given(),
            radius_km: body.radius_km.given(),
        }
    }
}

impl From<SystemObject> for SystemParts {
    fn from(object: SystemObject) -> Self {
        Self {
            id: object.id.given().map(|Text(id)| Cow::Owned(id)),
            larger: object.larger.given().map_or_else(Body::default, Body::from),
            smaller: object.smaller.given().map_or_else(Body::default, Body::from),
            mass_parameter: object.mass_parameter.given(),
            length_km: object.length_km.given(),
            time_s: object.time_s.given(),
            velocity_km_s: object.velocity_km_s.given(),
            separation_km: object.separation_km.given(),
            radius_larger_km: object.radius_larger_km.given(),
            radius_smaller_km: object.radius_smaller_km.given(),
            radius_larger: object.radius_larger.given(),
            radius_smaller: object.radius_smaller.given(),
        }
    }
}

/// A system, resolved.
#[derive(Clone, Debug, PartialEq)]
pub struct SystemSpec(pub System);

impl Named for SystemSpec {
    const NAME: &'static str = "SystemSpec";
}

impl Decode for SystemSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        match node {
            Node::String(id) => {
                let entry = catalogue::find(id);
                if entry.is_none() {
                    errors.push(at, SystemSpec::unknown(id));
                }
                entry.map(|entry| Self(entry.system()))
            }
            Node::Object(_) => {
                let sound = errors.count();
                let object = SystemObject::decode(node, at, errors)?;
                // Members that are wrong by themselves would only bring up contradictions.
                if errors.count() > sound {
                    return None;
                }
                match SystemParts::from(object).resolve() {
                    Ok(system) => Some(Self(system)),
                    Err(faults) => {
                        for fault in &faults {
                            report(fault, at, errors);
                        }
                        None
                    }
                }
            }
            _ => {
                errors.push(at, format!("must be a catalogue id or an object, got {}", node.kind()));
                None
            }
        }
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

fn report(fault: &SystemError, at: Path<'_>, errors: &mut Errors) {
    let detail = match fault {
        SystemError::OutOfRange(_, out) => crate::decode::refusal(out),
        SystemError::UnknownId(id) => SystemSpec::unknown(id),
        _ => fault.to_string(),
    };
    errors.push_under(at, fault.member().map_or("", |member| member.pointer()), detail);
}

impl SystemSpec {
    /// What to say of an id that the catalogue lacks.
    #[must_use]
    pub fn unknown(id: &str) -> String {
        let known: Vec<&str> = catalogue::entries().iter().map(catalogue::Entry::id).collect();
        format!("the catalogue has no such system; {}", did_you_mean(id, &known))
    }
}

impl utoipa::PartialSchema for SystemSpec {
    fn schema() -> RefOr<Schema> {
        let ids = catalogue::entries().iter().map(catalogue::Entry::id);
        let id = ObjectBuilder::new().schema_type(Type::String).enum_values(Some(ids));
        let either = AnyOfBuilder::new().item(id).item(SystemObject::describe(&mut Vec::new()));
        with_description(
            RefOr::T(either.build().into()),
            "The primaries: a catalogue id, or an object with any sufficient choice of members.",
        )
    }
}

impl ToSchema for SystemSpec {
    fn schemas(schemas: &mut Schemas) {
        let _ = SystemObject::describe(schemas);
    }
}

/// One of the two massive bodies, absent members null.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = Body)]
pub struct BodyEcho<'a> {
    /// What people call it.
    name: Option<&'a str>,
    /// Gravitational parameter, km^3/s^2.
    gm_km3_s2: Option<f64>,
    /// Mean radius, km.
    radius_km: Option<f64>,
}

/// The system that was computed in, with its scales; absent members null.
#[derive(Debug, Serialize, ToSchema)]
#[schema(as = System)]
pub struct SystemEcho<'a> {
    /// Catalogue id.
    id: Option<&'a str>,
    /// The larger primary.
    larger: BodyEcho<'a>,
    /// The smaller primary.
    smaller: BodyEcho<'a>,
    /// The smaller primary's share of the total mass.
    mass_parameter: f64,
    /// Separation of the primaries, km: the unit of length.
    length_km: Option<f64>,
    /// Inverse mean motion of the primaries, s: the unit of time.
    time_s: Option<f64>,
    /// Separation times mean motion, km/s: the unit of velocity.
    velocity_km_s: Option<f64>,
    /// Radius of the larger primary, in separations.
    radius_larger: Option<f64>,
    /// Radius of the smaller primary, in separations.
    radius_smaller: Option<f64>,
}

impl<'a> From<&'a Body> for BodyEcho<'a> {
    fn from(body: &'a Body) -> Self {
        Self { name: body.name.as_deref(), gm_km3_s2: body.gm_km3_s2, radius_km: body.radius_km }
    }
}

impl<'a> From<&'a System> for SystemEcho<'a> {
    fn from(system: &'a System) -> Self {
        Self {
            id: system.id(),
            larger: system.body(Primary::Larger).into(),
            smaller: system.body(Primary::Smaller).into(),
            mass_parameter: system.mass_parameter().get(),
            length_km: system.length_km(),
            time_s: system.time_s(),
            velocity_km_s: system.velocity_km_s(),
            radius_larger: system.radius(Primary::Larger),
            radius_smaller: system.radius(Primary::Smaller),
        }
    }
}

/// Serialises a system as its echo.
///
/// # Errors
/// The serializer's.
pub fn as_system_echo<S: serde::Serializer>(system: &System, serializer: S) -> Result<S::Ok, S::Error> {
    SystemEcho::from(system).serialize(serializer)
}
