//! One trajectory's bookkeeping: legs, events, samples, and what is measured. The integration itself is elsewhere,
//! alone ([`super::alone`]) or among others ([`super::swarm`]).

mod sampling;
mod watching;

use std::ops::ControlFlow;

use nalgebra::Matrix6;

use self::watching::Scratch;
use super::audit::End;
use super::event::When;
use super::extended::ExtendedTransition;
use super::matrix::{Legs, Transition};
use super::request::{Request, Sampling};
use super::watch::Watch;
use super::{
    Audit, Evidence, Failure, Occurrence, Outcome, SampleBudget, Samples, Sink, Trajectory, VALUES_PER_EVENT,
};
use crate::arithmetic::DoubleDouble;
use crate::arithmetic::sum::Compensated;
use crate::interrupt::{Interrupt, Stop};
use crate::state::State;
use crate::system::Primary;
use crate::taylor::{self, Place, Series};

/// The trajectory of an initial state that nobody had time for.
pub(super) fn not_started(request: &Request, index: usize) -> Trajectory {
    let parts = request.parts();
    Trajectory {
        index,
        outcome: Outcome::NotStarted,
        last: parts.states[index],
        stopped_by: None,
        samples: Samples::default(),
        events: Vec::new(),
        matrix: None,
        evidence: Evidence {
            audit: parts.audit.then(|| Audit::unfinished(Outcome::NotStarted)),
            ..Evidence::default()
        },
    }
}

/// Why the integration stops here, or does not go on at all.
pub(super) type Flow = Result<ControlFlow<Outcome>, Failure>;

/// Where samples go that a trajectory does not keep.
pub(super) struct Outlet<'a>(pub Option<&'a mut dyn Sink>);

/// A trajectory under way.
pub(super) struct Course<'a> {
    pub request: &'a Request,
    pub index: usize,
    budget: &'a SampleBudget,
    interrupt: &'a dyn Interrupt,
    /// +1 forwards, −1 backwards.
    pub direction: f64,
    start: f64,
    duration: f64,
    /// Where it is, and how long it has taken to get there.
    pub motion: Place,
    /// Signed time since the start at which the leg under way ends.
    pub target: Compensated,
    pub transition: Option<Transition>,
    /// The same in double-double arithmetic.
    pub extended_transition: Option<Box<ExtendedTransition>>,
    manoeuvres: Vec<(Compensated, usize)>,
    /// Manoeuvres that have been met.
    met: usize,
    watches: Vec<Watch>,
    counts: Vec<u64>,
    surfaces: Vec<(Primary, Watch)>,
    scratch: Scratch,
    next_sample: u64,
    samples: Samples,
    events: Vec<Occurrence>,
    stopped_by: Option<usize>,
}

/// A step about to be taken.
#[derive(Clone, Copy)]
pub(super) struct Step {
    /// Its signed length.
    pub length: f64,
    /// Whether it ends at the end of the leg.
    pub last: bool,
}

/// What is known of a step about to be taken.
pub(super) trait Ahead {
    /// Its series, as the search for events sees it.
    fn series(&self) -> &Series;

    /// The state `at` a time after `place`, at its start, as a state and a change of it.
    fn state(&self, place: &[Compensated; 6], at: Compensated) -> ([Compensated; 6], [f64; 6]);

    /// The course's matrix there.
    fn matrix(&self, course: &Course, at: Compensated) -> Option<Matrix6<f64>>;
}

impl<'a> Course<'a> {
    pub(super) fn new(
        request: &'a Request,
        index: usize,
        budget: &'a SampleBudget,
        interrupt: &'a dyn Interrupt,
    ) -> Self {
        let parts = request.parts();
        let duration = request.duration(index);
        let origin = request.origin_x();
        let watches: Vec<_> =
            parts.events.iter().map(|event| Watch::new(&event.when, parts.frame, origin)).collect();
        let surface = |(primary, radius): (Primary, Option<_>)| {
            radius.map(|r| (primary, Watch::new(&When::Distance(primary, r), parts.frame, origin)))
        };
        let surfaces = [(Primary::Larger, parts.contact.larger), (Primary::Smaller, parts.contact.smaller)]
            .into_iter()
            .filter_map(surface)
            .collect();
        Self {
            request,
            index,
            budget,
            interrupt,
            direction: if duration < 0.0 { -1.0 } else { 1.0 },
            start: parts.states[index].time,
            duration,
            motion: Place::new(request.start_of(index)),
            target: Compensated::default(),
            transition: (request.with_matrix() && !request.is_extended()).then(Transition::new),
            extended_transition: (request.with_matrix() && request.is_extended())
                .then(|| Box::new(ExtendedTransition::new())),
            manoeuvres: request.manoeuvres_of(index),
            met: 0,
            counts: vec![0; watches.len()],
            watches,
            surfaces,
            scratch: Scratch::default(),
            next_sample: 0,
            samples: Samples::default(),
            events: Vec::new(),
            stopped_by: None,
        }
    }

    /// Whether each step has to be looked at: for events, surfaces or samples.
    pub(super) fn is_watched(&self) -> bool {
        !self.watches.is_empty()
            || !self.surfaces.is_empty()
            || self.request.parts().sampling != Sampling::None
    }

    /// What happens at the start, before any step.
    pub(super) fn open(&mut self, outlet: &mut Outlet) -> Flow {
        if let Some(outcome) = self.inside() {
            self.sample_here(false, outlet)?;
            return Ok(ControlFlow::Break(outcome));
        }
        self.next_leg(outlet)
    }

    /// What happens between two legs; the next one's end is then the target.
    pub(super) fn next_leg(&mut self, outlet: &mut Outlet) -> Flow {
        // All manoeuvres of one instant, then the samples of that very instant, on their far side.
        while let Some(&(at, manoeuvre)) = self.manoeuvres.get(self.met)
            && at.minus(self.motion.elapsed) * self.direction <= 0.0
        {
            self.apply(manoeuvre)?;
            self.met += 1;
        }
        let end = Compensated::new(self.duration);
        let finished = end.minus(self.motion.elapsed) * self.direction <= 0.0;
        self.sample_here(finished, outlet)?;
        if finished {
            return Ok(ControlFlow::Break(Outcome::Complete));
        }
        self.target = self.manoeuvres.get(self.met).map_or(end, |(at, _)| *at);
        Ok(ControlFlow::Continue(()))
    }

    /// Records the events and samples of a step; gives how far it goes, and why the trajectory ends there if it does.
    pub(super) fn observe(
        &mut self,
        ahead: &dyn Ahead,
        step: Step,
        outlet: &mut Outlet,
    ) -> Result<(f64, Option<Outcome>), Failure> {
        let known = self.events.len();
        let at_end = step.last && self.target == Compensated::new(self.duration);
        let stop = self.watch(ahead, step.length, at_end);
        self.budget.take(VALUES_PER_EVENT * (self.events.len() - known) as u64)?;
        let end = stop.map_or(step.length, |(at, _)| at);
        self.sample_within(ahead, end, step.last && stop.is_none(), outlet)?;
        Ok((end, stop.map(|(_, outcome)| outcome)))
    }

    /// What happens at the end of a step that goes on.
    pub(super) fn arrive(&mut self, last: bool, outlet: &mut Outlet) -> Flow {
        if last {
            self.motion.elapsed = self.target;
            return self.next_leg(outlet);
        }
        if self.request.parts().sampling == Sampling::EveryStep {
            self.push_sample(None, None, outlet)?;
        }
        Ok(ControlFlow::Continue(()))
    }

    /// A reason to end here, if there is one.
    pub(super) fn poll(&self) -> Flow {
        match self.interrupt.poll() {
            Some(Stop::Cancelled) => Err(Failure::Cancelled),
            Some(Stop::WallTime) => Ok(ControlFlow::Break(Outcome::WallTimeLimit)),
            None => Ok(ControlFlow::Continue(())),
        }
    }

    /// The trajectory, which ends here.
    pub(super) fn close(mut self, outcome: Outcome) -> Result<Trajectory, Failure> {
        self.end_leg();
        let last = self.seen(self.time_here());
        let mut evidence = Evidence {
            steps: self.motion.steps,
            jacobi_drift: self.motion.drift,
            determinant_defect: None,
            symplectic_defect: None,
            audit: None,
        };
        if self.request.parts().audit {
            let end = End { place: &self.motion, manoeuvres: self.met };
            evidence.audit = Some(Audit::of(self.request, self.index, &end, self.interrupt)?);
        }
        let matrix = self.legs().map(|legs| {
            let (determinant, symplectic) = legs.defects();
            evidence.determinant_defect = Some(determinant).filter(|defect| defect.is_finite());
            evidence.symplectic_defect = Some(symplectic).filter(|defect| defect.is_finite());
            legs.here()
        });
        let matrix = matrix
            .map(|matrix| in_frame(self.request, &matrix, self.start, last.time))
            .filter(|matrix| matrix.iter().all(|element| element.is_finite()));
        Ok(Trajectory {
            index: self.index,
            outcome,
            last,
            stopped_by: self.stopped_by,
            samples: self.samples,
            events: self.events,
            matrix,
            evidence,
        })
    }

    /// The matrix, in whichever arithmetic.
    fn legs(&mut self) -> Option<&mut dyn Legs> {
        match (&mut self.transition, &mut self.extended_transition) {
            (Some(transition), _) => Some(transition),
            (None, Some(transition)) => Some(&mut **transition),
            (None, None) => None,
        }
    }

    fn end_leg(&mut self) {
        if self.motion.reference.is_some() {
            let jacobi =
                taylor::jacobi_constant(self.request.path(), self.request.primaries(), &self.motion.state);
            self.motion.measure(jacobi);
            self.motion.reference = None;
        }
    }

    fn apply(&mut self, index: usize) -> Result<(), Failure> {
        self.end_leg();
        let parts = self.request.parts();
        let manoeuvre = &parts.manoeuvres[index];
        let undefined = Failure::UndefinedAxes { manoeuvre: index, trajectory: self.index };
        let before = self.seen(manoeuvre.time);
        let (change, jump) = manoeuvre.impulse(parts.frame, &before).ok_or(undefined)?;
        if self.request.is_extended() {
            let state = self.motion.state.map(DoubleDouble::from);
            let origin = self.request.origin_x().into();
            let change = manoeuvre.precise_impulse(parts.frame, origin, &state).ok_or(undefined)?;
            for axis in 0..3 {
                let velocity = state[axis + 3] + change[axis].scaled(self.direction);
                self.motion.state[axis + 3] = velocity.into();
            }
        } else {
            for (component, change) in self.motion.state[3..].iter_mut().zip(change.iter()) {
                *component = component.plus(change * self.direction);
            }
        }
        if let Some(legs) = self.legs() {
            legs.end_leg(jump.as_ref());
        }
        Ok(())
    }

    fn time_here(&self) -> f64 {
        self.start + (self.motion.elapsed.value + self.motion.elapsed.rest)
    }

    /// The state reached, in the request's frame.
    fn seen(&self, time: f64) -> State {
        seen(self.request, &self.motion.state, time, &[0.0; 6])
    }
}

/// A state of the default frame after a change, in the request's frame, with all the digits that it has about that
/// frame's origin.
fn seen(request: &Request, state: &[Compensated; 6], time: f64, change: &[f64; 6]) -> State {
    let components = about(request.origin_x(), state, change);
    let parts = request.parts();
    let co_rotating = State::new(time, components);
    parts.frame.co_rotating().convert(parts.frame, parts.mass_parameter, &co_rotating)
}

/// The components of a state of the default frame after a change, rounded, its x counted from `origin`.
pub(super) fn about(origin: Compensated, state: &[Compensated; 6], change: &[f64; 6]) -> [f64; 6] {
    let mut components: [f64; 6] = std::array::from_fn(|i| state[i].plus(change[i]).value);
    components[0] = (state[0].value - origin.value) + ((state[0].rest - origin.rest) + change[0]);
    components
}

/// A matrix of the default frame between two instants in the request's frame.
fn in_frame(request: &Request, matrix: &Matrix6<f64>, from: f64, to: f64) -> Matrix6<f64> {
    let frame = request.parts().frame;
    if frame.is_default() {
        return *matrix;
    }
    frame.jacobian(to) * matrix * frame.inverse_jacobian(from)
}
