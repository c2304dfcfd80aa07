//! One trajectory, step by step.

mod sampling;

use std::ops::ControlFlow;

use nalgebra::{Matrix6, Vector3};

use super::audit::End;
use super::event::When;
use super::matrix::Transition;
use super::request::{Contact, MatrixOutput, Request, Sampling};
use super::watch::{Hit, Stretch, Watch};
use super::{Audit, Evidence, Failure, Occurrence, Outcome, SampleBudget, Samples, Sink, Trajectory};
use crate::arithmetic::sum::Compensated;
use crate::interrupt::{Interrupt, Stop};
use crate::potential::gradient;
use crate::quantity::{Distance, Quantity};
use crate::state::State;
use crate::system::Primary;
use crate::taylor::{self, STEP_FLOOR, Series};

/// Steps between two polls: a tenth of a millisecond with a matrix, less without.
const STEPS_PER_POLL: u64 = 64;
/// A start this near to a surface is on it: coordinates of the order of 1 are rounded to about this.
const SURFACE: f64 = 8.0 * f64::EPSILON;
/// Numbers of an event in the answer: which, its time, position and velocity.
const VALUES_PER_EVENT: u64 = 8;

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
type Flow = Result<ControlFlow<Outcome>, Failure>;

/// A trajectory under way.
pub(super) struct Course<'a> {
    request: &'a Request,
    index: usize,
    budget: &'a SampleBudget,
    sink: &'a mut dyn Sink,
    interrupt: &'a dyn Interrupt,
    /// +1 forwards, −1 backwards.
    direction: f64,
    start: f64,
    duration: f64,
    state: [Compensated; 6],
    /// Signed time since the start.
    elapsed: Compensated,
    series: Box<Series<f64>>,
    transition: Option<Transition>,
    watches: Vec<Watch>,
    counts: Vec<u64>,
    surfaces: Vec<(Primary, Watch)>,
    scratch: Scratch,
    /// Jacobi constant at the start of the leg.
    leg_jacobi: Option<f64>,
    next_sample: u64,
    samples: Samples,
    events: Vec<Occurrence>,
    stopped_by: Option<usize>,
    /// Manoeuvres applied.
    applied: usize,
    evidence: Evidence,
}

/// What is used anew in each step.
#[derive(Default)]
struct Scratch {
    roots: Vec<f64>,
    hits: Vec<Hit>,
    /// Hits of all watches, each with what it is a hit of.
    found: Vec<(Hit, Found)>,
}

#[derive(Clone, Copy)]
enum Found {
    Event(usize),
    Surface(Primary),
}

impl<'a> Course<'a> {
    pub(super) fn new(
        request: &'a Request,
        index: usize,
        budget: &'a SampleBudget,
        sink: &'a mut dyn Sink,
        interrupt: &'a dyn Interrupt,
    ) -> Self {
        let parts = request.parts();
        let initial = &parts.states[index];
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
            sink,
            interrupt,
            direction: if duration < 0.0 { -1.0 } else { 1.0 },
            start: initial.time,
            duration,
            state: request.start_of(index),
            elapsed: Compensated::default(),
            series: Box::default(),
            transition: (parts.matrix != MatrixOutput::None).then(Transition::new),
            counts: vec![0; watches.len()],
            watches,
            surfaces,
            scratch: Scratch::default(),
            leg_jacobi: None,
            next_sample: 0,
            samples: Samples::default(),
            events: Vec::new(),
            stopped_by: None,
            applied: 0,
            evidence: Evidence::default(),
        }
    }

    pub(super) fn run(mut self) -> Result<Trajectory, Failure> {
        let outcome = match self.legs()? {
            ControlFlow::Break(outcome) => outcome,
            ControlFlow::Continue(()) => Outcome::Complete,
        };
        self.end_leg();
        if self.request.parts().audit {
            let end = End {
                state: self.state,
                elapsed: self.elapsed,
                manoeuvres: self.applied,
                steps: self.evidence.steps,
            };
            self.evidence.audit = Some(Audit::of(self.request, self.index, &end, self.interrupt)?);
        }
        let last = self.seen(self.time_here(), &[0.0; 6]);
        let matrix = self.transition.as_mut().map(|transition| {
            let (determinant, symplectic) = transition.defects();
            self.evidence.determinant_defect = Some(determinant);
            self.evidence.symplectic_defect = Some(symplectic);
            transition.here()
        });
        Ok(Trajectory {
            index: self.index,
            outcome,
            last,
            stopped_by: self.stopped_by,
            samples: self.samples,
            events: self.events,
            matrix: matrix.map(|m| in_frame(self.request, &m, self.start, last.time)),
            evidence: self.evidence,
        })
    }

    /// The legs between manoeuvres.
    fn legs(&mut self) -> Flow {
        if let Some(outcome) = self.inside() {
            self.sample_here(false)?;
            return Ok(ControlFlow::Break(outcome));
        }
        let manoeuvres = self.request.manoeuvres_of(self.index);
        let mut rest = manoeuvres.as_slice();
        loop {
            // All manoeuvres of one instant, then the samples of that very instant, on their far side.
            while let Some(((at, manoeuvre), later)) = rest.split_first()
                && at.minus(self.elapsed) * self.direction <= 0.0
            {
                self.apply(*manoeuvre)?;
                self.applied += 1;
                rest = later;
            }
            let end = Compensated::new(self.duration);
            let finished = end.minus(self.elapsed) * self.direction <= 0.0;
            self.sample_here(finished)?;
            if finished {
                return Ok(ControlFlow::Continue(()));
            }
            let target = rest.first().map_or(end, |(at, _)| *at);
            if let ControlFlow::Break(outcome) = self.leg(target)? {
                return Ok(ControlFlow::Break(outcome));
            }
            self.elapsed = target;
        }
    }

    /// Steps up to `target`, or to where the trajectory ends before.
    fn leg(&mut self, target: Compensated) -> Flow {
        let limits = self.request.limits();
        loop {
            if self.evidence.steps % STEPS_PER_POLL == STEPS_PER_POLL - 1
                && let ControlFlow::Break(outcome) = self.poll()?
            {
                return Ok(ControlFlow::Break(outcome));
            }
            if self.evidence.steps == limits.steps {
                return Ok(ControlFlow::Break(Outcome::StepLimit));
            }
            taylor::expand(self.request.primaries(), &self.state, &mut self.series);
            let remaining = target.minus(self.elapsed);
            let step = self.request.step_size().from_log2_radius(self.series.log2_radius);
            let last = step >= remaining.abs();
            // Written so that a step that is no number counts as too small.
            if !(self.series.is_finite() && (last || step >= STEP_FLOOR)) {
                return Ok(ControlFlow::Break(Outcome::StepFloor));
            }
            self.measure(self.series.jacobi);
            self.evidence.steps += 1;
            if let Some(transition) = &mut self.transition {
                transition.expand(&self.series);
            }
            let length = if last { remaining } else { step * self.direction };
            let known = self.events.len();
            let at_end = last && target == Compensated::new(self.duration);
            let stop = self.watch(length, at_end);
            self.budget.take(VALUES_PER_EVENT * (self.events.len() - known) as u64)?;
            let end = stop.map_or(length, |(at, _)| at);
            self.sample_within(end, last && stop.is_none())?;
            self.advance(end);
            if let Some((_, outcome)) = stop {
                return Ok(ControlFlow::Break(outcome));
            }
            if last {
                return Ok(ControlFlow::Continue(()));
            }
            if self.request.parts().sampling == Sampling::EveryStep {
                self.push_sample(0.0, None)?;
            }
        }
    }

    fn poll(&self) -> Flow {
        match self.interrupt.poll() {
            Some(Stop::Cancelled) => Err(Failure::Cancelled),
            Some(Stop::WallTime) => Ok(ControlFlow::Break(Outcome::WallTimeLimit)),
            None => Ok(ControlFlow::Continue(())),
        }
    }

    /// Takes the Jacobi constant of a place on the leg into account.
    fn measure(&mut self, jacobi: f64) {
        let reference = *self.leg_jacobi.get_or_insert(jacobi);
        self.evidence.jacobi_drift = self.evidence.jacobi_drift.max((jacobi - reference).abs());
    }

    fn end_leg(&mut self) {
        if self.leg_jacobi.is_some() {
            self.measure(taylor::jacobi_constant(self.request.primaries(), &self.state));
        }
        self.leg_jacobi = None;
    }

    fn advance(&mut self, length: f64) {
        let change = taylor::flow(&self.series, length);
        for (component, change) in self.state.iter_mut().zip(change) {
            *component = component.plus(change);
        }
        if let Some(transition) = &mut self.transition {
            transition.advance(length);
        }
        self.elapsed = self.elapsed.plus(length);
    }

    /// The outcome of a start inside a primary.
    fn inside(&self) -> Option<Outcome> {
        let contact = self.request.parts().contact;
        if contact == Contact::default() {
            return None;
        }
        let primaries = self.request.primaries();
        let velocity = Vector3::new(self.state[3].value, self.state[4].value, self.state[5].value);
        let position = Vector3::new(self.state[0].value, self.state[1].value, self.state[2].value);
        let coriolis = 2.0 * Vector3::new(velocity.y, -velocity.x, 0.0);
        let acceleration = gradient(self.request.parts().mass_parameter, &position) + coriolis;
        let below = |radius: Option<Distance>, centre: Compensated| {
            let away = Vector3::new(self.state[0].minus(centre), self.state[1].value, self.state[2].value);
            let rate = away.dot(&velocity) * self.direction;
            let inwards =
                rate < 0.0 || (rate == 0.0 && away.dot(&acceleration) + velocity.norm_squared() < 0.0);
            // On the surface as far as a state's digits tell, the way it moves decides.
            radius.is_some_and(|radius| {
                let height = away.norm() - radius.get();
                if height.abs() <= SURFACE { inwards } else { height < 0.0 }
            })
        };
        if below(contact.larger, primaries.larger_x()) {
            Some(Outcome::ContactLarger)
        } else if below(contact.smaller, primaries.smaller_x()) {
            Some(Outcome::ContactSmaller)
        } else {
            None
        }
    }

    fn apply(&mut self, index: usize) -> Result<(), Failure> {
        self.end_leg();
        let parts = self.request.parts();
        let manoeuvre = &parts.manoeuvres[index];
        let before = self.seen(manoeuvre.time, &[0.0; 6]);
        let (change, jump) = manoeuvre
            .impulse(parts.frame, &before)
            .ok_or(Failure::UndefinedAxes { manoeuvre: index, trajectory: self.index })?;
        for (component, change) in self.state[3..].iter_mut().zip(change.iter()) {
            *component = component.plus(change * self.direction);
        }
        if let Some(transition) = &mut self.transition {
            transition.end_leg(jump.as_ref());
        }
        Ok(())
    }

    /// Records the events of a step; gives where and why the trajectory ends in it, if it does.
    fn watch(&mut self, length: f64, at_end: bool) -> Option<(f64, Outcome)> {
        if self.watches.is_empty() && self.surfaces.is_empty() {
            return None;
        }
        let stretch = Stretch::new(
            &self.series,
            &self.state,
            self.start + self.elapsed.value,
            length,
            self.elapsed.value,
        );
        let Scratch { roots, hits, found } = &mut self.scratch;
        found.clear();
        let events = self.watches.iter_mut().enumerate().map(|(entry, watch)| (Found::Event(entry), watch));
        let surfaces = self.surfaces.iter_mut().map(|(primary, watch)| (Found::Surface(*primary), watch));
        for (what, watch) in events.chain(surfaces) {
            hits.clear();
            watch.scan(&stretch, at_end, roots, hits);
            found.extend(hits.iter().map(|hit| (*hit, what)));
        }
        // Stable: ties stay in the order of the entries, surfaces last.
        found.sort_by(|(a, _), (b, _)| a.at.abs().total_cmp(&b.at.abs()));

        let parts = self.request.parts();
        for (hit, what) in &*found {
            match *what {
                // Only inwards along the integration; a way out shows where a trajectory began on the surface.
                Found::Surface(primary) if hit.rate * self.direction < 0.0 => {
                    let outcome = match primary {
                        Primary::Larger => Outcome::ContactLarger,
                        Primary::Smaller => Outcome::ContactSmaller,
                    };
                    return Some((hit.at, outcome));
                }
                Found::Surface(_) => {}
                Found::Event(entry) => {
                    let event = &parts.events[entry];
                    let time = self.start + (self.elapsed.value + (self.elapsed.rest + hit.at));
                    let change = taylor::flow(&self.series, hit.at);
                    let state = seen(self.request, &self.state, time, &change);
                    let admitted = event.direction.admits(hit.rate)
                        && event.only.is_none_or(|only| only.admits(&state.position));
                    if !admitted {
                        continue;
                    }
                    self.events.push(Occurrence { event: entry, state });
                    self.counts[entry] += 1;
                    if event.stop_after.is_some_and(|count| count.get() == self.counts[entry]) {
                        self.stopped_by = Some(entry);
                        return Some((hit.at, Outcome::StoppedByEvent));
                    }
                    if self.events.len() == parts.limits.events {
                        return Some((hit.at, Outcome::EventLimit));
                    }
                }
            }
        }
        None
    }

    fn time_here(&self) -> f64 {
        self.start + (self.elapsed.value + self.elapsed.rest)
    }

    /// The state after a change, in the request's frame.
    fn seen(&self, time: f64, change: &[f64; 6]) -> State {
        seen(self.request, &self.state, time, change)
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
