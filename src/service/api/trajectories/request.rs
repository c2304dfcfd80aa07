//! What is asked: trajectories of one or many states.

use std::time::Duration as WallTime;

use mechanics::propagation::{
    Arithmetic, BurnAxes, Contact, EXTENDED_WEIGHT, Invalid, Limits as Granted, Manoeuvre, MatrixOutput,
    Request, RequestParts,
};
use mechanics::quantity::{Distance, Epoch, Quantity, Speed, Tolerance};
use mechanics::state::State;
use mechanics::system::Primary;
use nalgebra::Vector3;

use super::events::{EventSpec, MOST_EVENTS};
use super::solve::Task;
use super::span::{COUNT, DurationSpec, INTERVAL, SamplesSpec, TIMES, durations, sampling};
use crate::config::Limits;
use crate::decode::{Errors, Field, Integer, MANY, Path, Scalar, choices, request};
use crate::wire::{Conventions, FrameSpec, LimitsSpec, StatesSpec, SystemSpec, UnitsSpec, scaled};

/// Default of `tolerance`.
const TOLERANCE: f64 = 1e-15;
/// The most manoeuvres of a request: each is looked at for every trajectory.
const MOST_MANOEUVRES: usize = 1000;
choices! {
    /// The state transition matrices to return: none, that of the final state, or those of the samples as well.
    pub(super) enum MatrixSpec = MatrixOutput { None = "none", Final = "final", Samples = "samples" }
}

choices! {
    /// Whether a trajectory ends at a primary's surface.
    pub(super) enum ContactSpec { Stop = "stop", Ignore = "ignore" }
}

choices! {
    /// The axes of a change of velocity: the request's frame, or v, r x v and v x (r x v) of the state before.
    pub(super) enum BurnAxesSpec = BurnAxes {
        Frame = "frame", VelocityNormalBinormal = "velocity_normal_binormal"
    }
}

choices! {
    /// Double precision, or double-double: about 31 digits on the way, and the answer rounded.
    pub(super) enum ArithmeticSpec = Arithmetic { Double = "double", DoubleDouble = "double_double" }
}

request! {
    /// An impulsive change of velocity.
    pub(super) struct ManoeuvreSpec {
        /// Instant on the absolute clock, within each trajectory it is for.
        required time: f64,
        /// Change of velocity [x, y, z] along the axes, a velocity.
        required delta_v: [f64; 3],
        /// Its axes; `frame` if absent. `velocity_normal_binormal` needs a positive duration.
        optional axes: BurnAxesSpec,
        /// Indices of the initial states whose trajectories it is for; all if absent.
        optional r#for: Vec<Integer<0, MANY>>,
    }
}

request! {
    /// Trajectories of one or many states.
    #[example("example.json")]
    pub(super) struct TrajectoriesRequest {
        /// The primaries.
        required system: SystemSpec,
        /// Units of the request and of its answer; normalised if absent.
        optional units: UnitsSpec,
        /// Frame of states, events, manoeuvres and matrices; barycentric rotating axes if absent.
        optional frame: FrameSpec,
        /// The states to start from.
        required initial_states: StatesSpec,
        /// How long the trajectories run, a time; negative runs backwards. A list gives one for each state.
        required duration: DurationSpec,
        /// Relative local error per step in double precision; 1e-15 if absent. In double-double it is always 2^-102.
        optional tolerance: Scalar<Tolerance>,
        /// Where the trajectories are sampled; `none` if absent.
        optional samples: SamplesSpec,
        /// The state transition matrices to return; `none` if absent.
        optional state_transition_matrix: MatrixSpec,
        /// What to watch for.
        optional events: Vec<EventSpec>,
        /// Changes of velocity.
        optional manoeuvres: Vec<ManoeuvreSpec>,
        /// Whether the surfaces of primaries with a known radius end a trajectory; `stop` if absent.
        optional contact: ContactSpec,
        /// What the trajectories are computed in; `double` if absent. With `double_double` each state counts as 25 of
        /// the states, and each step as 25 of the steps that are granted: it takes as long.
        optional arithmetic: ArithmeticSpec,
        /// Whether each trajectory is computed again in double-double from the same bits and manoeuvres to the same time,
        /// to measure its true error; not if absent. States and the steps of the audit count as with `double_double`.
        optional audit: bool,
        /// How much the computation may take.
        optional limits: LimitsSpec,
    }
}

impl TrajectoriesRequest {
    /// Checks the members against each other and against the server's limits.
    pub(super) fn checked(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        let granted = LimitsSpec::check(self.limits, limits, errors);
        let (known, units, frame) = (self.system.is_good(), self.units, self.frame);
        let conventions = Conventions::check(self.system, units, frame, errors);
        let tolerance = self.tolerance.or_else(|| Scalar(Tolerance::constant(TOLERANCE)));
        let arithmetic = self.arithmetic.or(ArithmeticSpec::Double).map_or(Arithmetic::Double, Into::into);
        let audit = self.audit.or(false).unwrap_or(false);
        let extended = audit || arithmetic == Arithmetic::DoubleDouble;
        let few = count_states(&self.initial_states, extended, limits, errors)
            & at_most("events", &self.events, MOST_EVENTS, errors)
            & at_most("manoeuvres", &self.manoeuvres, MOST_MANOEUVRES, errors);
        if !few {
            return None;
        }
        // Without units and frame no number can be given a meaning; a system that is wrong matters to few.
        let conventions = match conventions {
            None if !known => Conventions::without_system(units, frame)?,
            conventions => conventions?,
        };
        let (states, given_times) = states(self.initial_states, &conventions, errors).unzip();
        let durations = durations(self.duration.as_ref(), &conventions, errors);
        let sampling = sampling(self.samples.as_ref(), &conventions, errors);
        let events = events(self.events, &conventions, errors);
        let manoeuvres = manoeuvres(self.manoeuvres, &conventions, errors);
        let contact = if known { contact(self.contact, &conventions, errors) } else { None };
        let matrix = self.state_transition_matrix.or(MatrixSpec::None);
        // Whatever is faulty is left out of the checks across members, so that these find the rest.
        let (events, names) = events.unwrap_or_default().into_iter().unzip();
        let parts = RequestParts {
            mass_parameter: conventions.system.mass_parameter(),
            frame: conventions.frame,
            states: states?,
            durations: durations?,
            tolerance: tolerance.map_or(Tolerance::constant(TOLERANCE), |Scalar(tolerance)| tolerance),
            sampling: sampling.unwrap_or_default(),
            matrix: matrix.map_or(MatrixOutput::None, Into::into),
            events,
            manoeuvres: manoeuvres.unwrap_or_default(),
            contact: contact.unwrap_or_default(),
            arithmetic,
            audit,
            limits: Granted {
                steps: granted.map_or(limits.steps, |granted| granted.steps),
                events: usize::try_from(limits.events).unwrap_or(usize::MAX),
                sample_values: limits.sample_values,
            },
        };
        match Request::new(parts) {
            Ok(request) => Some(Task {
                request,
                conventions,
                names,
                given_times: given_times?,
                given_duration: self.duration.given()?,
                given_samples: self.samples.given(),
                wall_time: granted?.wall_time,
            }),
            Err(faults) => {
                for fault in faults {
                    report(&fault, errors);
                }
                None
            }
        }
    }
}

impl Task {
    /// The time that the request is granted.
    pub(super) fn wall_time(&self) -> WallTime {
        self.wall_time
    }
}

fn count_states(states: &Field<StatesSpec>, extended: bool, limits: &Limits, errors: &mut Errors) -> bool {
    let Field::Given(states) = states else { return true };
    let (most, what) = if extended {
        ((limits.states / EXTENDED_WEIGHT).max(1), "states in double_double or with an audit")
    } else {
        (limits.states, "states")
    };
    let count = states.count() as u64;
    if count > most {
        errors.beyond(Path::ROOT.member("initial_states"), what, most, count);
    }
    count <= most
}

fn at_most<T>(name: &str, list: &Field<Vec<T>>, most: usize, errors: &mut Errors) -> bool {
    let Field::Given(list) = list else { return true };
    if list.len() > most {
        errors.beyond(Path::ROOT.member(name), name, most as u64, list.len() as u64);
    }
    list.len() <= most
}

/// The states in the request's frame, and the times as they were given.
fn states(
    field: Field<StatesSpec>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<(Vec<State>, Vec<f64>)> {
    let at = Path::ROOT.member("initial_states");
    let checked = field.given()?.check(at, |given, places| {
        let time = given.time;
        let (frame, state) = conventions.state_given(given, places, errors)?;
        Some((frame.convert(conventions.frame, conventions.system.mass_parameter(), &state), time))
    });
    checked.map(|all| all.into_iter().unzip())
}

fn events(
    field: Field<Vec<EventSpec>>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<Vec<(mechanics::propagation::event::Event, Option<String>)>> {
    let at = Path::ROOT.member("events");
    let given = field.or_else(Vec::new)?;
    let count = given.len();
    let checked: Vec<_> = given
        .into_iter()
        .enumerate()
        .filter_map(|(index, event)| event.check(at.item(index), conventions, errors))
        .collect();
    (checked.len() == count).then_some(checked)
}

fn manoeuvres(
    field: Field<Vec<ManoeuvreSpec>>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<Vec<Manoeuvre>> {
    let at = Path::ROOT.member("manoeuvres");
    let given = field.or_else(Vec::new)?;
    let count = given.len();
    let checked: Vec<_> = given
        .into_iter()
        .enumerate()
        .filter_map(|(index, spec)| manoeuvre(spec, at.item(index), conventions, errors))
        .collect();
    (checked.len() == count).then_some(checked)
}

fn manoeuvre(
    spec: ManoeuvreSpec,
    at: Path<'_>,
    conventions: &Conventions,
    errors: &mut Errors,
) -> Option<Manoeuvre> {
    let scale = &conventions.scale;
    let time = spec
        .time
        .given()
        .and_then(|time| scaled::<Epoch>(time, scale.time, at.member("time"), errors))
        .map(Quantity::get);
    let delta_v = spec.delta_v.given().and_then(|delta_v| {
        let place = at.member("delta_v");
        let [x, y, z] = std::array::from_fn(|i| {
            scaled::<Speed>(delta_v[i], scale.velocity, place.item(i), errors).map(Quantity::get)
        });
        Some(Vector3::new(x?, y?, z?))
    });
    let axes = spec.axes.or(BurnAxesSpec::Frame)?.into();
    let trajectories = spec.r#for.optional()?.map(|list| {
        list.into_iter().map(|Integer(index)| usize::try_from(index).unwrap_or(usize::MAX)).collect()
    });
    Some(Manoeuvre { time: time?, delta_v: delta_v?, axes, trajectories })
}

/// The surfaces that end a trajectory.
fn contact(field: Field<ContactSpec>, conventions: &Conventions, errors: &mut Errors) -> Option<Contact> {
    let radius = |primary| conventions.system.radius(primary).and_then(|radius| Distance::new(radius).ok());
    let known = Contact { larger: radius(Primary::Larger), smaller: radius(Primary::Smaller) };
    let asked = !field.is_absent();
    match field.or(ContactSpec::Stop)? {
        ContactSpec::Ignore => Some(Contact::default()),
        ContactSpec::Stop if asked && known == Contact::default() => {
            errors.push(
                Path::ROOT.member("contact"),
                "needs the radius of a primary, and the system has none: give `radius_larger` or `radius_smaller`",
            );
            None
        }
        ContactSpec::Stop => Some(known),
    }
}

/// The fault in the place of the member that should change.
fn report(fault: &Invalid, errors: &mut Errors) {
    let root = Path::ROOT;
    let (samples, manoeuvres) = (root.member("samples"), root.member("manoeuvres"));
    match fault {
        Invalid::DurationCount { .. } => errors.push(root.member("duration"), fault.to_string()),
        Invalid::OnPrimary { state, .. } => {
            errors.push(root.member("initial_states").item(*state), fault.to_string());
        }
        Invalid::TooFewSamples(_) => errors.push(samples.member(COUNT), fault.to_string()),
        Invalid::Interval(_) | Invalid::LongInterval { .. } => {
            errors.push(samples.member(INTERVAL), fault.to_string());
        }
        Invalid::TimeOrder { index, .. } | Invalid::TimeOutside { index, .. } => {
            errors.push(samples.member(TIMES).item(*index), fault.to_string());
        }
        Invalid::ManoeuvreOutside { index, .. } => {
            errors.push(manoeuvres.item(*index).member("time"), fault.to_string());
        }
        Invalid::ManoeuvreFor { index, place, .. } => {
            errors.push(manoeuvres.item(*index).member("for").item(*place), fault.to_string());
        }
        Invalid::ManoeuvreBackwards { index, .. } => {
            errors.push(manoeuvres.item(*index).member("axes"), fault.to_string());
        }
        Invalid::AuditOfDoubleDouble => errors.push(root.member("audit"), fault.to_string()),
        Invalid::AuditSteps { asked, limit, .. } => {
            errors.beyond(root.member("audit"), "steps", *limit, *asked);
        }
        Invalid::SampleValues { asked, limit } => {
            errors.beyond(samples, "sample values", *limit, u64::try_from(*asked).unwrap_or(u64::MAX));
        }
    }
}
