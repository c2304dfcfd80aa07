//! States: one by one, or as columns.

use mechanics::state::State;
use serde::Serialize;
use utoipa::ToSchema;
use utoipa::openapi::schema::{AnyOfBuilder, ArrayBuilder};
use utoipa::openapi::{RefOr, Schema};

use super::elements::{About, ElementsSpec};
use crate::decode::{Decode, Errors, Field, Named, Node, Path, Schemas, by_name, request, with_description};

request! {
    /// Position and velocity at an instant. Canonical momenta (barycentric rotating axes only) may take the velocity's
    /// place, osculating elements that of both.
    pub(crate) struct StateObject {
        /// Instant on the absolute clock; 0 if absent.
        optional time: f64,
        /// Position [x, y, z].
        optional position: [f64; 3],
        /// Velocity [vx, vy, vz].
        optional velocity: [f64; 3],
        /// Canonical momenta px = vx - n y, py = vy + n x, pz = vz; n is the mean motion.
        optional momentum: [f64; 3],
        /// Osculating elements, with `elements_about`; derived and ignored beside position and velocity.
        optional elements: ElementsSpec,
        /// The primary that the elements are about.
        optional elements_about: About,
        /// Derived; ignored.
        optional tisserand_parameter: f64,
    }
}

request! {
    /// Many states as columns of equal length.
    pub(crate) struct StateColumns {
        /// Instants; all 0 if absent.
        optional time: Vec<f64>,
        /// Positions.
        required position: Vec<[f64; 3]>,
        /// Velocities.
        optional velocity: Vec<[f64; 3]>,
        /// Canonical momenta in place of velocities.
        optional momentum: Vec<[f64; 3]>,
    }
}

/// The ways in which a state can be told.
#[derive(Clone, Debug, PartialEq)]
pub enum Motion {
    /// Position and velocity.
    Velocity([f64; 3], [f64; 3]),
    /// Position and canonical momenta.
    Momentum([f64; 3], [f64; 3]),
    /// Osculating elements and what they are about.
    Elements(Box<ElementsSpec>, About),
}

/// A state in the request's units and frame, not yet checked against either.
#[derive(Clone, Debug, PartialEq)]
pub struct StateSpec {
    /// Instant on the absolute clock.
    pub time: f64,
    /// What moves where.
    pub motion: Motion,
}

impl Decode for StateSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let object = StateObject::decode(node, at, errors)?;
        let time = object.time.or(0.0);
        let motion = motion(object, at, errors);
        Some(Self { time: time?, motion: motion? })
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        StateObject::describe(named)
    }
}

fn motion(object: StateObject, at: Path<'_>, errors: &mut Errors) -> Option<Motion> {
    let StateObject { position, velocity, momentum, elements, elements_about, .. } = object;
    let told = [!velocity.is_absent(), !momentum.is_absent()];
    let rates = told.into_iter().filter(|given| *given).count();
    if rates > 1 || (rates == 0 && elements.is_absent()) {
        errors.push(at, "must have exactly one of `velocity`, `momentum` and `elements`");
        return None;
    }
    if elements.is_absent() && !elements_about.is_absent() {
        errors.push(at.member("elements_about"), "goes with `elements` only");
        return None;
    }
    if rates == 1 {
        if position.is_absent() {
            errors.push(at.member("position"), "is required");
        }
        return match (velocity, momentum) {
            (Field::Given(velocity), _) => Some(Motion::Velocity(position.given()?, velocity)),
            (_, Field::Given(momentum)) => Some(Motion::Momentum(position.given()?, momentum)),
            _ => None,
        };
    }
    if !position.is_absent() {
        errors.push(at.member("position"), "must be absent beside `elements`, which include it");
        return None;
    }
    if elements_about.is_absent() {
        errors.push(at.member("elements_about"), "is required beside `elements`");
    }
    Some(Motion::Elements(Box::new(elements.given()?), elements_about.given()?))
}

/// States, as a list or as columns.
#[derive(Clone, Debug, PartialEq)]
pub struct StatesSpec(Form);

#[derive(Clone, Debug, PartialEq)]
enum Form {
    List(Vec<StateSpec>),
    /// Of equal length, but for the times, which may be absent. The rates are velocities or momenta.
    Columns {
        time: Option<Vec<f64>>,
        position: Vec<[f64; 3]>,
        rates: Vec<[f64; 3]>,
        canonical: bool,
    },
}

impl StatesSpec {
    /// How many there are.
    #[must_use]
    pub fn count(&self) -> usize {
        match &self.0 {
            Form::List(states) => states.len(),
            Form::Columns { position, .. } => position.len(),
        }
    }

    /// The states, unless there are more than `limit`.
    pub fn at_most(self, limit: u64, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let asked = u64::try_from(self.count()).unwrap_or(u64::MAX);
        if asked > limit {
            errors.beyond(at, "states", limit, asked);
            return None;
        }
        Some(self)
    }

    /// Calls `each` with the state and its places, and gives what it makes of them if it does so of all.
    pub fn check<T>(
        self,
        at: Path<'_>,
        mut each: impl FnMut(StateSpec, &Places<'_>) -> Option<T>,
    ) -> Option<Vec<T>> {
        let count = self.count();
        let mut checked = Vec::with_capacity(count);
        let mut keep = |index, columns, state| {
            checked.extend(each(state, &Places { at, index: Some(index), columns }));
        };
        match self.0 {
            Form::List(states) => {
                states.into_iter().enumerate().for_each(|(index, state)| keep(index, false, state));
            }
            Form::Columns { time, position, rates, canonical } => {
                let way = if canonical { Motion::Momentum } else { Motion::Velocity };
                for (index, (position, rate)) in position.into_iter().zip(rates).enumerate() {
                    let time = time.as_ref().map_or(0.0, |time| time[index]);
                    keep(index, true, StateSpec { time, motion: way(position, rate) });
                }
            }
        }
        (checked.len() == count).then_some(checked)
    }
}

/// Where the members of a state lie in the request.
#[derive(Clone, Copy, Debug)]
pub struct Places<'a> {
    at: Path<'a>,
    index: Option<usize>,
    columns: bool,
}

impl<'a> Places<'a> {
    /// Those of a single state.
    #[must_use]
    pub fn single(at: Path<'a>) -> Self {
        Self { at, index: None, columns: false }
    }

    /// Reports a fault of one member, or of the state itself if `member` is empty; `rest` is the pointer from there on.
    pub fn report(&self, member: &str, rest: &str, detail: String, errors: &mut Errors) {
        let place = match self.index {
            None if member.is_empty() => rest.to_owned(),
            None => format!("/{member}{rest}"),
            Some(index) if member.is_empty() && self.columns => format!("/position/{index}{rest}"),
            Some(index) if member.is_empty() => format!("/{index}{rest}"),
            Some(index) if self.columns => format!("/{member}/{index}{rest}"),
            Some(index) => format!("/{index}/{member}{rest}"),
        };
        errors.push_under(self.at, &place, detail);
    }
}

impl Named for StatesSpec {
    const NAME: &'static str = "StatesSpec";
}

impl Decode for StatesSpec {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let states = Self(match node {
            Node::Object(_) => columns(node, at, errors)?,
            _ => Form::List(Vec::decode(node, at, errors)?),
        });
        if states.count() == 0 {
            errors.push(at, "must hold at least one state");
            return None;
        }
        Some(states)
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

fn columns(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Form> {
    let columns = StateColumns::decode(node, at, errors)?;
    if columns.velocity.is_absent() == columns.momentum.is_absent() {
        errors.push(at, "must have exactly one of `velocity` and `momentum`");
        return None;
    }
    let canonical = columns.velocity.is_absent();
    let (way, rates) =
        if canonical { ("momentum", columns.momentum) } else { ("velocity", columns.velocity) };
    let position = columns.position.given()?;
    let count = position.len();
    let mut fits = |name: &str, length: usize| {
        if length != count {
            errors.push(
                at.member(name),
                format!("must have as many items as `position`, {count}, got {length}"),
            );
        }
        length == count
    };
    let (time, rates) = (columns.time.optional()?, rates.given()?);
    let times_fit = time.as_ref().is_none_or(|time| fits("time", time.len()));
    (fits(way, rates.len()) & times_fit).then_some(Form::Columns { time, position, rates, canonical })
}

impl utoipa::PartialSchema for StatesSpec {
    fn schema() -> RefOr<Schema> {
        let list = ArrayBuilder::new().items(StateObject::describe(&mut Vec::new())).min_items(Some(1));
        let either = AnyOfBuilder::new().item(list).item(StateColumns::describe(&mut Vec::new()));
        with_description(RefOr::T(either.build().into()), "States, as a list or as columns.")
    }
}

impl ToSchema for StatesSpec {
    fn schemas(schemas: &mut Schemas) {
        let _ = StateObject::describe(schemas);
        let _ = StateColumns::describe(schemas);
    }
}

/// Position and velocity at an instant, in the units and the frame of the answer.
#[derive(Clone, Copy, Debug, Serialize, ToSchema)]
#[schema(as = State)]
pub struct StateEcho {
    /// Instant on the absolute clock.
    pub time: f64,
    /// Position [x, y, z].
    pub position: [f64; 3],
    /// Velocity [vx, vy, vz].
    pub velocity: [f64; 3],
}

impl From<State> for StateEcho {
    fn from(state: State) -> Self {
        Self { time: state.time, position: state.position.into(), velocity: state.velocity.into() }
    }
}
