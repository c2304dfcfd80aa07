use std::time::Duration;

use mechanics::elements::Elements;
use mechanics::frame::NotCanonical;

use super::convert::{Given, Target};
use crate::config::Limits;
use crate::decode::{Errors, Field, Path, choices, request};
use crate::wire::{About, Conventions, FrameSpec, LimitsSpec, StatesSpec, SystemSpec, UnitsSpec};

choices! {
    /// What goes with a position.
    pub(crate) enum Variables { Velocity = "velocity", Momentum = "momentum" }
}

request! {
    /// The states to convert.
    #[example("example.json")]
    pub(crate) struct FramesConvertRequest {
        /// The primaries.
        required system: SystemSpec,
        /// The states.
        required states: StatesSpec,
        /// Units where `from` or `to` says none; normalised if absent.
        optional units: UnitsSpec,
        /// Frame where `from` or `to` says none; rotating, barycentric, x toward the smaller primary if absent.
        optional frame: FrameSpec,
        /// What the states are in.
        optional from: FramesConvertFrom,
        /// What to give them in; velocities if absent.
        optional to: FramesConvertTo,
        /// How much the computation may take.
        optional limits: LimitsSpec,
    }
}

request! {
    /// What the given states are in.
    pub(crate) struct FramesConvertFrom {
        /// Units; those of the request if absent.
        optional units: UnitsSpec,
        /// Frame; that of the request if absent.
        optional frame: FrameSpec,
    }
}

request! {
    /// What to give the states in.
    pub(crate) struct FramesConvertTo {
        /// Units; those of the request if absent.
        optional units: UnitsSpec,
        /// Frame; that of the request if absent.
        optional frame: FrameSpec,
        /// What goes with the positions: velocities if absent, or canonical momenta, which need rotating axes about the
        /// barycentre.
        optional variables: Variables,
        /// Adds osculating elements about that primary.
        optional elements_about: About,
    }
}

/// A checked request.
#[derive(Debug)]
pub(crate) struct Task {
    pub(super) from: Conventions,
    pub(super) to: Target,
    pub(super) states: Vec<Given>,
    pub(super) wall_time: Duration,
}

impl FramesConvertRequest {
    pub(super) fn task(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        let granted = LimitsSpec::check(self.limits, limits, errors);
        let (from_at, to_at) = (Path::ROOT.member("from"), Path::ROOT.member("to"));
        let (from_units, from_frame) = match self.from {
            Field::Given(from) => (from.units, from.frame),
            Field::Absent => (Field::Absent, Field::Absent),
            Field::Faulty => (Field::Faulty, Field::Faulty),
        };
        let both = Both { units: self.units, frame: self.frame };
        let from = both.conventions(from_at, self.system.clone(), from_units, from_frame, errors);
        let to = target(self.system, both, self.to, to_at, errors);

        let at = Path::ROOT.member("states");
        let states = self.states.given().and_then(|states| states.at_most(limits.states, at, errors));
        let from = from?;
        let about = to.as_ref().and_then(|to| to.elements_about);
        let mu = from.system.mass_parameter();
        let states = states?.check(at, |state, places| {
            let (frame, state) = from.state_given(state, places, errors)?;
            let x_axis = to.as_ref().map_or(from.frame.x_axis, |to| to.conventions.frame.x_axis);
            let elements = about
                .map(|about| Elements::from_state_of(frame, mu, &state, about.into(), x_axis))
                .transpose();
            match elements {
                Ok(elements) => Some(Given { frame, state, elements }),
                Err(error) => {
                    places.report("position", "", error.to_string(), errors);
                    None
                }
            }
        });
        Some(Task { to: to?, from, states: states?, wall_time: granted?.wall_time })
    }
}

/// Units and frame of the whole request.
#[derive(Clone, Copy)]
struct Both {
    units: Field<UnitsSpec>,
    frame: Field<FrameSpec>,
}

impl Both {
    /// What the object `at` says, and where it says nothing, what the request says.
    fn conventions(
        self,
        at: Path<'_>,
        system: Field<SystemSpec>,
        units: Field<UnitsSpec>,
        frame: Field<FrameSpec>,
        errors: &mut Errors,
    ) -> Option<Conventions> {
        let at = if units.is_absent() { Path::ROOT } else { at };
        Conventions::check_under(at, system, units.before(self.units), frame.before(self.frame), errors)
    }
}

fn target(
    system: Field<SystemSpec>,
    both: Both,
    to: Field<FramesConvertTo>,
    at: Path<'_>,
    errors: &mut Errors,
) -> Option<Target> {
    let Some(to) = to.optional()? else {
        let conventions = both.conventions(at, system, Field::Absent, Field::Absent, errors)?;
        return Some(Target { conventions, variables: Variables::Velocity, elements_about: None });
    };
    let variables = to.variables.or(Variables::Velocity);
    let frame = to.frame.before(both.frame).or(FrameSpec::default());
    let canonical = frame.is_none_or(|FrameSpec(frame)| frame.is_canonical());
    if variables == Some(Variables::Momentum) && !canonical {
        errors.push(at.member("variables"), NotCanonical.to_string());
    }
    let conventions = both.conventions(at, system, to.units, to.frame, errors);
    Some(Target {
        conventions: conventions?,
        variables: variables?,
        elements_about: to.elements_about.optional()?,
    })
}
