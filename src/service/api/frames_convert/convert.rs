use mechanics::elements::Elements;
use mechanics::frame::Frame;
use mechanics::state::State;

use super::request::Variables;
use super::response::{ConvertedState, FramesConvertEvidence};
use crate::wire::{About, Conventions, ElementsEcho};

/// A state in the frame that it was given in, with its elements if they are asked.
#[derive(Debug)]
pub(crate) struct Given {
    pub(super) frame: Frame,
    pub(super) state: State,
    pub(super) elements: Option<Elements>,
}

/// What to give states in.
#[derive(Debug)]
pub(crate) struct Target {
    pub(super) conventions: Conventions,
    pub(super) variables: Variables,
    pub(super) elements_about: Option<About>,
}

/// A converted state, and how far it leads back from the one it came from, normalised.
#[derive(Debug)]
pub(crate) struct Converted {
    pub(super) state: ConvertedState,
    pub(super) evidence: FramesConvertEvidence,
}

impl Target {
    pub(super) fn convert(&self, given: &Given) -> Converted {
        let Conventions { system, scale, frame, .. } = &self.conventions;
        let mu = system.mass_parameter();
        let state = given.frame.convert(*frame, mu, &given.state);
        let mut answer = scale.state_out(&state);
        let mut back = scale.state_in(&answer);
        let momentum = match self.variables {
            Variables::Velocity => None,
            Variables::Momentum => frame.momentum(&state).ok(),
        };
        if let Some(momentum) = momentum {
            answer.velocity = scale.velocity_out(&momentum);
            let momentum = scale.velocity_in(&answer.velocity);
            back.velocity = frame.velocity_from_momentum(&back.position, &momentum).unwrap_or(back.velocity);
        }
        let back = frame.convert(given.frame, mu, &back);
        let elements = given.elements.as_ref();
        Converted {
            evidence: FramesConvertEvidence {
                position_error: (back.position - given.state.position).norm(),
                velocity_error: (back.velocity - given.state.velocity).norm(),
                elements_error: elements.and_then(|elements| self.elements_error(elements, given)),
            },
            state: self.state(&answer, momentum.is_some(), elements),
        }
    }

    /// How far from the state it leads that the elements describe, in separations.
    fn elements_error(&self, elements: &Elements, given: &Given) -> Option<f64> {
        let Conventions { system, frame, .. } = &self.conventions;
        let (mu, about) = (system.mass_parameter(), self.elements_about?.into());
        let back = elements.to_state_about(mu, given.state.time, about).ok()?;
        let back = Elements::frame(about, frame.x_axis).convert(given.frame, mu, &back);
        Some((back.position - given.state.position).norm())
    }

    fn state(&self, answer: &State, canonical: bool, elements: Option<&Elements>) -> ConvertedState {
        let rate: [f64; 3] = answer.velocity.into();
        let about_larger = self.elements_about == Some(About::Larger);
        ConvertedState {
            time: answer.time,
            position: answer.position.into(),
            velocity: (!canonical).then_some(rate),
            momentum: canonical.then_some(rate),
            elements: elements.map(|elements| ElementsEcho::new(elements, &self.conventions.scale)),
            elements_about: self.elements_about,
            tisserand_parameter: elements.filter(|_| about_larger).and_then(Elements::tisserand_parameter),
        }
    }
}
