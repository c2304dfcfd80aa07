//! What a client may watch for.

use std::num::NonZeroU64;

use mechanics::propagation::event::{Event, Only, Plane, Side, When};
use mechanics::quantity::Coordinate;
use nalgebra::Vector3;
use utoipa::ToSchema;
use utoipa::openapi::schema::OneOfBuilder;
use utoipa::openapi::{RefOr, Schema};

use crate::decode::{
    Decode, Errors, Field, Integer, MANY, Named, Node, Path, Schemas, Text, by_name, choice, choices,
    request, with_description,
};
use crate::wire::{About, Conventions, scaled};

choices! {
    /// A coordinate axis of the request's frame.
    pub(super) enum Axis { X = "x", Y = "y", Z = "z" }
}

impl Axis {
    fn index(self) -> usize {
        self as usize
    }
}

choices! {
    /// The sign of the rate, in increasing time.
    pub(super) enum Direction = mechanics::propagation::event::Direction {
        Either = "either", Increasing = "increasing", Decreasing = "decreasing"
    }
}

request! {
    /// The plane on which one coordinate has a value.
    pub(super) struct PlaneCrossing {
        /// The coordinate.
        required axis: Axis,
        /// Its value, a length.
        required value: f64,
    }
}

request! {
    /// The plane at right angles to a direction through a point.
    pub(super) struct AnyPlane {
        /// The direction [x, y, z], of any length.
        required normal: [f64; 3],
        /// The point [x, y, z].
        required through: [f64; 3],
    }
}

request! {
    /// The sphere about a primary.
    pub(super) struct DistanceValue {
        /// The primary.
        required body: About,
        /// The distance from its centre, above 0.
        required value: f64,
    }
}

/// A condition as the client told it.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum WhenSpec {
    PlaneCrossing(PlaneCrossing),
    Plane(AnyPlane),
    Distance(DistanceValue),
    Periapsis(About),
    Apoapsis(About),
}

const PLANE_CROSSING: &str = "plane_crossing";
const PLANE: &str = "plane";
const DISTANCE: &str = "distance";
const PERIAPSIS: &str = "periapsis";
const APOAPSIS: &str = "apoapsis";

impl Named for WhenSpec {
    const NAME: &'static str = "EventCondition";
}

impl Decode for WhenSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let names = [PLANE_CROSSING, PLANE, DISTANCE, PERIAPSIS, APOAPSIS];
        let (name, value) = choice(node, at, &[], &names, errors)?;
        let (value, at) = (value?, at.member(name));
        match name {
            PLANE_CROSSING => Decode::decode(value, at, errors).map(Self::PlaneCrossing),
            PLANE => Decode::decode(value, at, errors).map(Self::Plane),
            DISTANCE => Decode::decode(value, at, errors).map(Self::Distance),
            PERIAPSIS => Decode::decode(value, at, errors).map(Self::Periapsis),
            _ => Decode::decode(value, at, errors).map(Self::Apoapsis),
        }
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

impl utoipa::PartialSchema for WhenSpec {
    fn schema() -> RefOr<Schema> {
        let keyed = |name: &str, schema: RefOr<Schema>, description: &str| {
            super::span::keyed(name, with_description(schema, description))
        };
        let one = OneOfBuilder::new()
            .item(keyed(
                PLANE_CROSSING,
                PlaneCrossing::describe(&mut Vec::new()),
                "An axis plane is crossed.",
            ))
            .item(keyed(PLANE, AnyPlane::describe(&mut Vec::new()), "Any plane is crossed."))
            .item(keyed(DISTANCE, DistanceValue::describe(&mut Vec::new()), "A distance is reached."))
            .item(keyed(PERIAPSIS, About::describe(&mut Vec::new()), "The distance is smallest."))
            .item(keyed(APOAPSIS, About::describe(&mut Vec::new()), "The distance is largest."));
        let text = "When an event happens; positions are in the request's frame and units.";
        with_description(RefOr::T(one.build().into()), text)
    }
}

impl ToSchema for WhenSpec {
    fn name() -> std::borrow::Cow<'static, str> {
        Self::NAME.into()
    }

    fn schemas(schemas: &mut Schemas) {
        let _ = PlaneCrossing::describe(schemas);
        let _ = AnyPlane::describe(schemas);
        let _ = DistanceValue::describe(schemas);
        let _ = About::describe(schemas);
    }
}

request! {
    /// The side of an axis plane on which events count; exactly one of `above` and `below`.
    pub(super) struct OnlySpec {
        /// The coordinate.
        required axis: Axis,
        /// Events count where the coordinate is larger.
        optional above: f64,
        /// Events count where the coordinate is smaller.
        optional below: f64,
    }
}

request! {
    /// Something to watch for. Touching without a change of sign is no event, nor is a zero within 1e-12 normalised time
    /// units of the start.
    pub(super) struct EventSpec {
        /// A name to be repeated in the answer.
        optional name: Text,
        /// The condition.
        required when: WhenSpec,
        /// The sign of its rate in increasing time; apses take none. `either` if absent.
        optional direction: Direction,
        /// Counts only the occurrences on one side of an axis plane.
        optional only: OnlySpec,
        /// Ends the trajectory at this many of this entry's occurrences; never if absent.
        optional stop_after: Integer<1, MANY>,
    }
}

impl EventSpec {
    /// The computation's event, and its name.
    pub(super) fn check(
        self,
        at: Path<'_>,
        conventions: &Conventions,
        errors: &mut Errors,
    ) -> Option<(Event, Option<String>)> {
        let apsis = matches!(self.when, Field::Given(WhenSpec::Periapsis(_) | WhenSpec::Apoapsis(_)));
        if apsis && !self.direction.is_absent() {
            errors.push(at.member("direction"), "must be absent: a periapsis or an apoapsis has none");
        }
        let when = self.when.given().and_then(|when| condition(when, at.member("when"), conventions, errors));
        let only = match self.only {
            Field::Absent => Some(None),
            Field::Faulty => None,
            Field::Given(only) => half_space(&only, at.member("only"), conventions, errors).map(Some),
        };
        let name = self.name.optional()?.map(|Text(name)| name);
        let direction = self.direction.or(Direction::Either)?.into();
        let stop_after = self.stop_after.optional()?.and_then(|Integer(count)| NonZeroU64::new(count));
        Some((Event { when: when?, direction, only: only?, stop_after }, name))
    }
}

fn half_space(only: &OnlySpec, at: Path<'_>, conventions: &Conventions, errors: &mut Errors) -> Option<Only> {
    let (side, name, value) = match (only.above, only.below) {
        (Field::Absent, Field::Absent) | (Field::Given(_), Field::Given(_)) => {
            errors.push(at, "must have exactly one of `above` and `below`");
            return None;
        }
        (Field::Given(value), Field::Absent) => (Side::Above, "above", value),
        (Field::Absent, Field::Given(value)) => (Side::Below, "below", value),
        _ => return None,
    };
    let value = coordinate(value, at.member(name), conventions, errors)?;
    Some(Only { axis: only.axis.as_ref().given()?.index(), side, value })
}

fn coordinate(value: f64, at: Path<'_>, conventions: &Conventions, errors: &mut Errors) -> Option<f64> {
    scaled::<Coordinate>(value, conventions.scale.length, at, errors).map(mechanics::quantity::Quantity::get)
}

fn condition(when: WhenSpec, at: Path<'_>, conventions: &Conventions, errors: &mut Errors) -> Option<When> {
    match when {
        WhenSpec::PlaneCrossing(plane) => {
            let under = at.member(PLANE_CROSSING);
            let value = coordinate(plane.value.given()?, under.member("value"), conventions, errors);
            Some(When::Plane(Plane::across(plane.axis.given()?.index(), value?)))
        }
        WhenSpec::Plane(plane) => {
            let under = at.member(PLANE);
            let through = plane.through.given().and_then(|point| {
                let place = under.member("through");
                let [x, y, z] =
                    std::array::from_fn(|i| coordinate(point[i], place.item(i), conventions, errors));
                Some(Vector3::new(x?, y?, z?))
            });
            let normal = plane.normal.given()?;
            let plane = Plane::through(Vector3::from(normal), through.unwrap_or_default());
            if plane.is_none() {
                errors.push(under.member("normal"), "must have a direction, got the zero vector");
            }
            through.and(plane).map(When::Plane)
        }
        WhenSpec::Distance(sphere) => {
            let place = at.member(DISTANCE);
            let value =
                scaled(sphere.value.given()?, conventions.scale.length, place.member("value"), errors);
            Some(When::Distance(sphere.body.given()?.into(), value?))
        }
        WhenSpec::Periapsis(body) => Some(When::Periapsis(body.into())),
        WhenSpec::Apoapsis(body) => Some(When::Apoapsis(body.into())),
    }
}

/// The most events that may be watched for at once: each costs every step of every trajectory something.
pub(super) const MOST_EVENTS: usize = 1000;
