//! How long trajectories run and where they are sampled, in the request's units.

use mechanics::propagation::{Durations, Sampling};
use mechanics::quantity::{Duration, Epoch, Quantity};
use utoipa::ToSchema;
use utoipa::openapi::schema::{AdditionalProperties, ArrayBuilder, ObjectBuilder, OneOfBuilder, Type};
use utoipa::openapi::{RefOr, Schema};

use crate::decode::{
    Decode, Errors, Field, Integer, MANY, Named, Node, Path, Schemas, by_name, choice, one_of_names,
    with_description,
};
use crate::wire::{Conventions, scaled};

/// One duration for all, or one for each.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum DurationSpec {
    All(f64),
    Each(Vec<f64>),
}

impl Named for DurationSpec {
    const NAME: &'static str = "DurationSpec";
}

impl Decode for DurationSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        match node {
            Node::Numbers(_) | Node::Vectors(_) | Node::Array(_) => {
                Decode::decode(node, at, errors).map(Self::Each)
            }
            Node::Number(all) => Some(Self::All(*all)),
            _ => {
                errors.push(at, format!("must be a finite number or an array of them, got {}", node.kind()));
                None
            }
        }
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

impl utoipa::PartialSchema for DurationSpec {
    fn schema() -> RefOr<Schema> {
        let number = f64::describe(&mut Vec::new());
        let either = OneOfBuilder::new().item(number.clone()).item(ArrayBuilder::new().items(number));
        with_description(RefOr::T(either.build().into()), "One duration for all states, or one for each.")
    }
}

impl ToSchema for DurationSpec {
    fn name() -> std::borrow::Cow<'static, str> {
        Self::NAME.into()
    }
}

/// Where trajectories are sampled, in the request's units.
#[derive(Clone, Debug, PartialEq)]
pub(super) enum SamplesSpec {
    None,
    EveryStep,
    Count(u64),
    Interval(f64),
    Times(Vec<f64>),
}

const NONE: &str = "none";
const EVERY_STEP: &str = "every_step";
pub(super) const COUNT: &str = "count";
pub(super) const INTERVAL: &str = "interval";
pub(super) const TIMES: &str = "times";

impl Named for SamplesSpec {
    const NAME: &'static str = "SamplesSpec";
}

impl Decode for SamplesSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let (name, value) = choice(node, at, &[NONE, EVERY_STEP], &[COUNT, INTERVAL, TIMES], errors)?;
        let under = at.member(name);
        match (name, value) {
            (EVERY_STEP, _) => Some(Self::EveryStep),
            (COUNT, Some(value)) => {
                Integer::<2, MANY>::decode(value, under, errors).map(|Integer(count)| Self::Count(count))
            }
            (INTERVAL, Some(value)) => f64::decode(value, under, errors).map(Self::Interval),
            (TIMES, Some(value)) => Vec::decode(value, under, errors).map(Self::Times),
            _ => Some(Self::None),
        }
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

impl utoipa::PartialSchema for SamplesSpec {
    fn schema() -> RefOr<Schema> {
        let number = || ObjectBuilder::new().schema_type(Type::Number);
        let count = with_description(
            Integer::<2, MANY>::describe(&mut Vec::new()),
            "So many, evenly spaced, both planned ends included.",
        );
        let interval =
            number().exclusive_minimum(Some(0.0)).description(Some("From the start, so often; a time."));
        let times = ArrayBuilder::new().items(number()).description(Some(
            "At these instants, strictly along the integration and within each trajectory.",
        ));
        let names = "Nowhere, or at the initial state and at the end of each step.";
        let one = OneOfBuilder::new()
            .item(one_of_names(&[NONE, EVERY_STEP], names))
            .item(keyed(COUNT, count))
            .item(keyed(INTERVAL, RefOr::T(interval.build().into())))
            .item(keyed(TIMES, RefOr::T(times.build().into())));
        with_description(RefOr::T(one.build().into()), "Where trajectories are sampled.")
    }
}

impl ToSchema for SamplesSpec {
    fn name() -> std::borrow::Cow<'static, str> {
        Self::NAME.into()
    }
}

/// The schema of an object with exactly this one member.
pub(super) fn keyed(name: &str, schema: RefOr<Schema>) -> RefOr<Schema> {
    let object = ObjectBuilder::new()
        .schema_type(Type::Object)
        .property(name, schema)
        .required(name)
        .additional_properties(Some(AdditionalProperties::FreeForm(false)));
    RefOr::T(object.build().into())
}

pub(super) fn durations(
    field: Field<&DurationSpec>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<Durations> {
    let at = Path::ROOT.member("duration");
    let scale = conventions.scale.time;
    match field.given()? {
        DurationSpec::All(all) => scaled::<Duration>(*all, scale, at, errors).map(Durations::All),
        DurationSpec::Each(each) => {
            let checked: Vec<_> = each
                .iter()
                .enumerate()
                .filter_map(|(index, duration)| scaled::<Duration>(*duration, scale, at.item(index), errors))
                .collect();
            (checked.len() == each.len()).then_some(Durations::Each(checked))
        }
    }
}

pub(super) fn sampling(
    field: Field<&SamplesSpec>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<Sampling> {
    let at = Path::ROOT.member("samples");
    let scale = conventions.scale.time;
    match field {
        Field::Absent | Field::Given(SamplesSpec::None) => Some(Sampling::None),
        Field::Faulty => None,
        Field::Given(SamplesSpec::EveryStep) => Some(Sampling::EveryStep),
        Field::Given(SamplesSpec::Count(count)) => Some(Sampling::Count(*count)),
        Field::Given(SamplesSpec::Interval(interval)) => Some(Sampling::Interval(interval / scale)),
        Field::Given(SamplesSpec::Times(times)) => {
            let under = at.member(TIMES);
            let checked: Vec<f64> = times
                .iter()
                .enumerate()
                .filter_map(|(index, time)| scaled::<Epoch>(*time, scale, under.item(index), errors))
                .map(Quantity::get)
                .collect();
            (checked.len() == times.len()).then_some(Sampling::Times(checked))
        }
    }
}
