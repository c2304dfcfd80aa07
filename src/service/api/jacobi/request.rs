use std::time::Duration;

use mechanics::frame::{Frame, Origin};
use mechanics::potential::JacobiConstant;
use mechanics::state::State;

use crate::config::Limits;
use crate::decode::{Errors, Path, request};
use crate::wire::{Conventions, FrameSpec, JacobiForm, LimitsSpec, StatesSpec, SystemSpec, UnitsSpec};

request! {
    /// The states whose Jacobi constants are asked.
    #[example("example.json")]
    pub(crate) struct JacobiRequest {
        /// The primaries.
        required system: SystemSpec,
        /// Units of the request and of the answer; normalised if absent.
        optional units: UnitsSpec,
        /// Frame of the states; rotating, barycentric, x toward the smaller primary if absent.
        optional frame: FrameSpec,
        /// Which Jacobi constant; plain if absent.
        optional jacobi_form: JacobiForm,
        /// The states.
        required states: StatesSpec,
        /// How much the computation may take.
        optional limits: LimitsSpec,
    }
}

/// A checked request.
#[derive(Debug)]
pub(crate) struct Task {
    pub(super) conventions: Conventions,
    pub(super) form: JacobiForm,
    pub(super) states: Vec<Subject>,
    pub(super) wall_time: Duration,
}

/// A state, in rotating axes.
#[derive(Debug)]
pub(crate) struct Subject {
    /// Where its position is counted from: the origin it was given from, so that no digit is lost near a primary.
    pub(super) origin: Origin,
    pub(super) state: State,
    /// The constant of rest at its position.
    pub(super) at_rest: JacobiConstant,
}

impl Subject {
    /// How far the definition's terms, summed in double precision, are from its constant, relative to the largest.
    pub(super) fn departure_from_definition(&self) -> f64 {
        self.at_rest.moving(&self.state.velocity).departure_from_definition(self.origin, &self.state)
    }
}

impl JacobiRequest {
    pub(super) fn task(self, limits: &Limits, errors: &mut Errors) -> Option<Task> {
        let granted = LimitsSpec::check(self.limits, limits, errors);
        let conventions = Conventions::check(self.system, self.units, self.frame, errors);
        let at = Path::ROOT.member("states");
        let states = self.states.given().and_then(|states| states.at_most(limits.states, at, errors));
        let conventions = conventions?;
        let mu = conventions.system.mass_parameter();
        let states = states?.check(at, |state, places| {
            let (frame, state) = conventions.state_given(state, places, errors)?;
            let origin = frame.origin;
            let state = frame.convert(Frame { origin, ..Frame::default() }, mu, &state);
            match JacobiConstant::at_rest_from(origin, mu, &state.position) {
                Ok(at_rest) => Some(Subject { origin, state, at_rest }),
                Err(at_primary) => {
                    places.report("position", "", at_primary.to_string(), errors);
                    None
                }
            }
        });
        Some(Task {
            conventions,
            form: self.jacobi_form.or(JacobiForm::default())?,
            states: states?,
            wall_time: granted?.wall_time,
        })
    }
}
