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
pub struct StatesSpec {
    /// The states in order.
    pub states: Vec<StateSpec>,
    /// Whether they came as columns, so that faults are placed in the right form.
    columns: bool,
}

impl StatesSpec {
    /// The states, unless there are more than `limit`.
    pub fn at_most(self, limit: u64, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        let asked = u64::try_from(self.states.len()).unwrap_or(u64::MAX);
        if asked > limit {
            errors.beyond(at, "states", limit, asked);
            return None;
        }
        Some(self)
    }

    /// Calls `each` with the index, the state and its places of time, position and velocity.
    pub fn check<T>(
        self,
        at: Path<'_>,
        mut each: impl FnMut(StateSpec, &Places<'_>) -> Option<T>,
    ) -> Option<Vec<T>> {
        let (count, columns) = (self.states.len(), self.columns);
        let checked = self
            .states
            .into_iter()
            .enumerate()
            .filter_map(|(index, state)| each(state, &Places { at, index: Some(index), columns }));
        let checked: Vec<T> = checked.collect();
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
        let columns = matches!(node, Node::Object(_));
        let states = if columns { from_columns(node, at, errors)? } else { Vec::decode(node, at, errors)? };
        if states.is_empty() {
            errors.push(at, "must hold at least one state");
            return None;
        }
        Some(Self { states, columns })
    }

    fn describe(named: &mut Schemas) -> RefOr<Schema> {
        by_name::<Self>(named)
    }
}

fn from_columns(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Vec<StateSpec>> {
    let columns = StateColumns::decode(node, at, errors)?;
    if columns.velocity.is_absent() == columns.momentum.is_absent() {
        errors.push(at, "must have exactly one of `velocity` and `momentum`");
        return None;
    }
    let way = if columns.velocity.is_absent() { "momentum" } else { "velocity" };
    let with_velocity = !columns.velocity.is_absent();
    let rates = if with_velocity { columns.velocity } else { columns.momentum };
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
    let time = columns.time.or_else(|| vec![0.0; count])?;
    let rates = rates.given()?;
    if !(fits("time", time.len()) & fits(way, rates.len())) {
        return None;
    }
    let states = time.into_iter().zip(position).zip(rates).map(|((time, position), rate)| {
        let motion =
            if with_velocity { Motion::Velocity(position, rate) } else { Motion::Momentum(position, rate) };
        StateSpec { time, motion }
    });
    Some(states.collect())
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
