use std::time::Duration;

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
    /// Each with the constant of rest at its position.
    pub(super) states: Vec<(State, JacobiConstant)>,
    pub(super) wall_time: Duration,
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
            let state = conventions.state_in(state, places, errors)?;
            match JacobiConstant::at_rest(mu, &state.position) {
                Ok(at_rest) => Some((state, at_rest)),
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
