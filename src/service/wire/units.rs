//! The units of numbers in requests and answers.

use mechanics::units::Units;
use serde::{Serialize, Serializer};
use utoipa::ToSchema;
use utoipa::openapi::schema::{AnyOfBuilder, ObjectBuilder, Type};
use utoipa::openapi::{RefOr, Schema};

use crate::decode::{
    Decode, Errors, Named, Node, Path, Schemas, by_name, choices, request, with_description,
};

const NORMALIZED: &str = "normalized";

choices! {
    /// A unit of length; au is 149597870.7 km.
    pub enum LengthUnit = mechanics::units::LengthUnit { M = "m", Km = "km", Au = "au" }
}

choices! {
    /// A unit of time; yr is 365.25 d.
    pub enum TimeUnit = mechanics::units::TimeUnit { S = "s", Min = "min", H = "h", D = "d", Yr = "yr" }
}

choices! {
    /// A unit of velocity.
    pub enum VelocityUnit = mechanics::units::VelocityUnit { KmPerS = "km/s", MPerS = "m/s" }
}

request! {
    /// Physical units. Jacobi constants and energies are in the velocity unit squared.
    pub(crate) struct UnitsObject {
        /// Unit of lengths.
        required length: LengthUnit,
        /// Unit of times.
        required time: TimeUnit,
        /// Unit of velocities; length over time if absent.
        optional velocity: VelocityUnit,
    }
}

/// `"normalized"` or physical units.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct UnitsSpec(pub Units);

impl Named for UnitsSpec {
    const NAME: &'static str = "UnitsSpec";
}

impl Decode for UnitsSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        match node {
            Node::String(name) if name == NORMALIZED => Some(Self(Units::Normalized)),
            Node::Object(_) => {
                let object = UnitsObject::decode(node, at, errors)?;
                Some(Self(Units::Physical {
                    length: object.length.given()?.into(),
                    time: object.time.given()?.into(),
                    velocity: object.velocity.optional()?.map(Into::into),
                }))
            }
            _ => {
                errors.push(at, "must be \"normalized\" or an object with `length` and `time`");
                None
            }
        }
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

impl utoipa::PartialSchema for UnitsSpec {
    fn schema() -> RefOr<Schema> {
        either(UnitsObject::describe(&mut Vec::new()), "Units of the request and of its answer.")
    }
}

impl ToSchema for UnitsSpec {
    fn schemas(schemas: &mut Schemas) {
        let _ = UnitsObject::describe(schemas);
    }
}

/// `"normalized"` or what `object` describes.
fn either(object: RefOr<Schema>, description: &str) -> RefOr<Schema> {
    let bare = ObjectBuilder::new().schema_type(Type::String).enum_values(Some([NORMALIZED]));
    with_description(RefOr::T(AnyOfBuilder::new().item(bare).item(object).build().into()), description)
}

/// The units that numbers are in.
#[derive(Clone, Copy, Debug)]
pub struct UnitsEcho(pub Units);

/// Physical units that numbers are in.
#[derive(Serialize, ToSchema)]
#[schema(as = PhysicalUnits)]
struct PhysicalEcho {
    /// Unit of lengths.
    length: LengthUnit,
    /// Unit of times.
    time: TimeUnit,
    /// Unit of velocities; null for length over time.
    velocity: Option<VelocityUnit>,
}

impl Serialize for UnitsEcho {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        match self.0 {
            Units::Normalized => serializer.serialize_str(NORMALIZED),
            Units::Physical { length, time, velocity } => {
                let velocity = velocity.map(Into::into);
                PhysicalEcho { length: length.into(), time: time.into(), velocity }.serialize(serializer)
            }
        }
    }
}

impl utoipa::PartialSchema for UnitsEcho {
    fn schema() -> RefOr<Schema> {
        either(
            RefOr::Ref(utoipa::openapi::Ref::from_schema_name(PhysicalEcho::name())),
            "The units that numbers are in.",
        )
    }
}

impl ToSchema for UnitsEcho {
    fn name() -> std::borrow::Cow<'static, str> {
        "Units".into()
    }

    fn schemas(schemas: &mut Schemas) {
        schemas.push((PhysicalEcho::name().into_owned(), <PhysicalEcho as utoipa::PartialSchema>::schema()));
        PhysicalEcho::schemas(schemas);
    }
}
