//! What is asked for, checked as a whole.

use super::event::Event;
use super::extended::Arithmetic;
use super::invalid::Invalid;
use super::manoeuvre::{BurnAxes, Manoeuvre};
use crate::arithmetic::sum::Compensated;
use crate::frame::{Frame, Origin};
use crate::quantity::{Distance, Duration, MassParameter, Quantity, Tolerance};
use crate::state::State;
use crate::system::Primary;
use crate::taylor::extended::EXTENDED_TOLERANCE;
use crate::taylor::{Path, Primaries, StepSize};

/// Numbers of a sample: time, position and velocity.
const STATE_VALUES: u64 = 7;
/// Numbers of a state transition matrix.
const MATRIX_VALUES: u64 = 36;
/// An instant this many round-offs of the clock beyond an end of a trajectory is that end: a sum was rounded, or a
/// unit converted.
const CLOCK_SLACK: f64 = 8.0 * f64::EPSILON;
/// A last interval is not dropped because its product was rounded up past the end.
const INTERVAL_SLACK: f64 = 1.0 + 4.0 * f64::EPSILON;

/// Where a trajectory is sampled.
#[derive(Clone, Debug, Default, PartialEq)]
pub enum Sampling {
    /// Nowhere.
    #[default]
    None,
    /// At the initial state and at the end of each step.
    EveryStep,
    /// At so many instants, at least 2, evenly spaced from start to end.
    Count(u64),
    /// At the start and from there every so often.
    Interval(f64),
    /// At these instants of the absolute clock, strictly along the integration.
    Times(Vec<f64>),
}

/// Which state transition matrices are asked for.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum MatrixOutput {
    /// None.
    #[default]
    None,
    /// That of the final state.
    Final,
    /// That of the final state and of each sample.
    Samples,
}

/// The durations of the trajectories.
#[derive(Clone, Debug, PartialEq)]
pub enum Durations {
    /// One for all.
    All(Duration),
    /// One for each.
    Each(Vec<Duration>),
}

/// The surfaces that end a trajectory.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Contact {
    /// The larger primary's radius.
    pub larger: Option<Distance>,
    /// The smaller primary's radius.
    pub smaller: Option<Distance>,
}

/// What a request may use.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Limits {
    /// Steps of each trajectory.
    pub steps: u64,
    /// Events of each trajectory.
    pub events: usize,
    /// Sample numbers of all trajectories together.
    pub sample_values: u64,
}

/// The parts of a request, each valid for itself.
#[derive(Clone, Debug)]
pub struct RequestParts {
    /// μ.
    pub mass_parameter: MassParameter,
    /// The frame of states, events, manoeuvres and results.
    pub frame: Frame,
    /// Initial states.
    pub states: Vec<State>,
    /// How long each runs.
    pub durations: Durations,
    /// Relative local error per step.
    pub tolerance: Tolerance,
    /// Where they are sampled.
    pub sampling: Sampling,
    /// Which matrices are returned.
    pub matrix: MatrixOutput,
    /// What is watched for.
    pub events: Vec<Event>,
    /// Impulses.
    pub manoeuvres: Vec<Manoeuvre>,
    /// Surfaces.
    pub contact: Contact,
    /// What they are computed in.
    pub arithmetic: Arithmetic,
    /// Whether each is computed again in double-double arithmetic, to measure its true error.
    pub audit: bool,
    /// Bounds.
    pub limits: Limits,
}

/// A checked request.
#[derive(Clone, Debug)]
pub struct Request {
    parts: RequestParts,
    primaries: Primaries,
    step_size: StepSize,
    path: Path,
}

impl Request {
    /// Checks the parts against each other.
    ///
    /// # Errors
    /// Everything that is wrong between them.
    pub fn new(mut parts: RequestParts) -> Result<Self, Vec<Invalid>> {
        let mut problems = Vec::new();
        let primaries = Primaries::new(parts.mass_parameter.get());
        if let Durations::Each(durations) = &parts.durations
            && durations.len() != parts.states.len()
        {
            problems.push(Invalid::DurationCount { durations: durations.len(), states: parts.states.len() });
            // What does not hang on the durations is checked all the same.
            let stand_in = durations.first().copied().unwrap_or(Duration::constant(0.0));
            parts.durations = Durations::All(stand_in);
        }
        let spanned = problems.is_empty();
        let step_size = StepSize::new(parts.tolerance.get());
        let mut request = Self { parts, primaries, step_size, path: Path::fastest() };
        request.check_states(&mut problems);
        request.check_sampling(spanned, &mut problems);
        request.check_manoeuvres(&mut problems);
        problems.extend(request.audit_problem(spanned));
        for list in request.parts.manoeuvres.iter_mut().filter_map(|m| m.trajectories.as_mut()) {
            list.sort_unstable();
        }
        problems.retain(|problem| spanned || !problem.is_about_span());
        if problems.is_empty() { Ok(request) } else { Err(problems) }
    }

    /// Number of trajectories.
    #[must_use]
    pub fn count(&self) -> usize {
        self.parts.states.len()
    }

    /// The parts it was made of.
    #[must_use]
    pub fn parts(&self) -> &RequestParts {
        &self.parts
    }

    /// What it may use.
    #[must_use]
    pub fn limits(&self) -> Limits {
        self.parts.limits
    }

    /// The same request, computed on a certain path. The results are the same bits.
    #[must_use]
    pub fn on(mut self, path: Path) -> Self {
        self.path = path;
        self
    }

    /// How many trajectories are computed side by side, if there are enough of them.
    #[must_use]
    pub fn lanes(&self) -> usize {
        if self.path.has_eight() { 8 } else { 4 }
    }

    pub(super) fn with_matrix(&self) -> bool {
        self.parts.matrix != MatrixOutput::None
    }

    /// Whether it is computed in double-double, one trajectory after the other.
    #[must_use]
    pub fn is_extended(&self) -> bool {
        self.parts.arithmetic == Arithmetic::DoubleDouble
    }

    pub(super) fn path(&self) -> Path {
        self.path
    }

    pub(super) fn primaries(&self) -> &Primaries {
        &self.primaries
    }

    pub(super) fn step_size(&self) -> StepSize {
        self.step_size
    }

    /// The relative local error per step that is kept to.
    #[must_use]
    pub fn tolerance(&self) -> f64 {
        match self.parts.arithmetic {
            Arithmetic::Double => self.parts.tolerance.get(),
            Arithmetic::DoubleDouble => EXTENDED_TOLERANCE,
        }
    }

    /// The signed duration of a trajectory.
    #[must_use]
    pub fn duration(&self, trajectory: usize) -> f64 {
        match &self.parts.durations {
            Durations::All(duration) => duration.get(),
            Durations::Each(durations) => durations[trajectory].get(),
        }
    }

    /// Numbers of one sample.
    #[must_use]
    pub fn values_per_sample(&self) -> u64 {
        STATE_VALUES + if self.parts.matrix == MatrixOutput::Samples { MATRIX_VALUES } else { 0 }
    }

    /// Samples of a trajectory that runs to its end; none where the steps decide.
    #[must_use]
    pub fn planned_samples(&self, trajectory: usize) -> Option<u64> {
        match &self.parts.sampling {
            Sampling::None => Some(0),
            Sampling::EveryStep => None,
            Sampling::Count(count) => Some(*count),
            #[expect(
                clippy::cast_possible_truncation,
                clippy::cast_sign_loss,
                reason = "positive, and a number too large saturates and is refused"
            )]
            Sampling::Interval(interval) => Some(
                ((self.duration(trajectory).abs() / interval * INTERVAL_SLACK).floor() as u64)
                    .saturating_add(1),
            ),
            Sampling::Times(times) => Some(times.len() as u64),
        }
    }

    /// x of the frame's origin.
    pub(super) fn origin_x(&self) -> Compensated {
        match self.parts.frame.origin {
            Origin::Barycenter => Compensated::default(),
            Origin::Larger => self.primaries.larger_x(),
            Origin::Smaller => self.primaries.smaller_x(),
        }
    }

    /// An initial state in the default frame, with all the digits that it has about its own origin.
    pub(super) fn start_of(&self, trajectory: usize) -> [Compensated; 6] {
        let Self { parts, .. } = self;
        let frame = parts.frame;
        let given = frame.convert(frame.co_rotating(), parts.mass_parameter, &parts.states[trajectory]);
        let mut start: [Compensated; 6] = std::array::from_fn(|i| Compensated::new(given.components()[i]));
        let origin = self.origin_x();
        start[0] = Compensated::sum(given.position.x, origin.value).plus(origin.rest);
        start
    }

    fn check_states(&self, problems: &mut Vec<Invalid>) {
        for state in 0..self.count() {
            let [x, y, z, ..] = self.start_of(state);
            for (primary, centre) in
                [(Primary::Larger, self.primaries.larger_x()), (Primary::Smaller, self.primaries.smaller_x())]
            {
                let away = [x.minus(centre), y.value, z.value];
                if away.iter().all(|c| c * c == 0.0) {
                    problems.push(Invalid::OnPrimary { state, primary });
                }
            }
        }
    }

    fn ends(&self, trajectory: usize) -> (f64, f64) {
        let from = self.parts.states[trajectory].time;
        (from, from + self.duration(trajectory))
    }

    /// Whether an instant lies in the closed span of a trajectory.
    fn holds(&self, trajectory: usize, time: f64) -> bool {
        let (from, to) = self.ends(trajectory);
        let slack = CLOCK_SLACK * from.abs().max(to.abs());
        time >= from.min(to) - slack && time <= from.max(to) + slack
    }

    fn check_sampling(&self, spanned: bool, problems: &mut Vec<Invalid>) {
        match &self.parts.sampling {
            Sampling::None | Sampling::EveryStep => return,
            Sampling::Count(count) if *count < 2 => {
                problems.push(Invalid::TooFewSamples(*count));
                return;
            }
            Sampling::Interval(interval) if !(interval.is_finite() && *interval > 0.0) => {
                problems.push(Invalid::Interval(*interval));
                return;
            }
            Sampling::Count(_) | Sampling::Interval(_) | Sampling::Times(_) => {}
        }
        // First of all the number, which bounds the work of checking each time against each trajectory.
        let each = u128::from(self.values_per_sample());
        let asked: u128 =
            (0..self.count()).filter_map(|t| self.planned_samples(t)).map(|n| u128::from(n) * each).sum();
        let limit = self.parts.limits.sample_values;
        if asked > u128::from(limit) {
            problems.push(Invalid::SampleValues { asked, limit });
            return;
        }
        match &self.parts.sampling {
            Sampling::Interval(interval) => {
                let short = |t: &usize| {
                    let duration = self.duration(*t).abs();
                    duration > 0.0 && duration * INTERVAL_SLACK < *interval
                };
                if let Some(trajectory) = (0..self.count()).find(short) {
                    let duration = self.duration(trajectory);
                    problems.push(Invalid::LongInterval { interval: *interval, duration, trajectory });
                }
            }
            Sampling::Times(times) => self.check_times(times, spanned, problems),
            Sampling::None | Sampling::EveryStep | Sampling::Count(_) => {}
        }
    }

    /// Each wrong time is reported once, for one of the trajectories it is wrong for: the one that begins last or the one
    /// that ends first, so that the work does not grow with times and trajectories multiplied. Where the durations are
    /// not known, only the order is looked at.
    fn check_times(&self, times: &[f64], spanned: bool, problems: &mut Vec<Invalid>) {
        let each = || (0..self.count()).map(|trajectory| (trajectory, self.ends(trajectory)));
        let begins = |(_, (from, to)): &(usize, (f64, f64))| from.min(*to);
        let ends = |(_, (from, to)): &(usize, (f64, f64))| from.max(*to);
        let last_to_begin = each().reduce(|a, b| if begins(&b) > begins(&a) { b } else { a });
        let first_to_end = each().reduce(|a, b| if ends(&b) < ends(&a) { b } else { a });
        let tightest: Vec<_> = [last_to_begin, first_to_end].into_iter().flatten().collect();
        let backwards = (0..self.count()).any(|trajectory| self.duration(trajectory) < 0.0);
        let forwards = (0..self.count()).any(|trajectory| self.duration(trajectory) >= 0.0);
        for (index, &time) in times.iter().enumerate() {
            let outside = tightest.iter().find(|(trajectory, _)| !self.holds(*trajectory, time));
            if let Some(&(trajectory, (from, to))) = outside.filter(|_| spanned) {
                problems.push(Invalid::TimeOutside { index, time, trajectory, from, to });
                continue;
            }
            let follows = |before: f64| (!forwards || time > before) && (!backwards || time < before);
            let before = index.checked_sub(1).and_then(|i| times.get(i).copied());
            if let Some(before) = before.filter(|before| !follows(*before)) {
                problems.push(Invalid::TimeOrder { index, time, before });
            }
        }
    }

    fn check_manoeuvres(&self, problems: &mut Vec<Invalid>) {
        let states = self.count();
        // What all trajectories have in common is looked at once, not for each manoeuvre.
        let common =
            (0..states).map(|t| self.ends(t)).fold((f64::MIN, f64::MAX), |(low, high), (from, to)| {
                (low.max(from.min(to)), high.min(from.max(to)))
            });
        let first_backwards = (0..states).find(|t| self.duration(*t) < 0.0);
        for (index, manoeuvre) in self.parts.manoeuvres.iter().enumerate() {
            for (place, &trajectory) in manoeuvre.trajectories.iter().flatten().enumerate() {
                if trajectory >= states {
                    problems.push(Invalid::ManoeuvreFor { index, place, trajectory, states });
                }
            }
            let time = manoeuvre.time;
            let outside = |t: &usize| !self.holds(*t, time);
            let backwards = |t: &usize| self.duration(*t) < 0.0;
            let (outside, backwards) = match &manoeuvre.trajectories {
                Some(list) => {
                    let own = || list.iter().copied().filter(|t| *t < states);
                    (own().find(outside), own().find(backwards))
                }
                None if time >= common.0 && time <= common.1 => (None, first_backwards),
                None => ((0..states).find(outside), first_backwards),
            };
            if let Some(trajectory) = outside {
                let (from, to) = self.ends(trajectory);
                problems.push(Invalid::ManoeuvreOutside { index, time, trajectory, from, to });
            }
            if manoeuvre.axes == BurnAxes::VelocityNormalBinormal
                && let Some(trajectory) = backwards
            {
                problems.push(Invalid::ManoeuvreBackwards { index, trajectory });
            }
        }
    }

    /// Signed time from the start of a trajectory to an instant that it holds, within its duration.
    pub(super) fn since_start(&self, trajectory: usize, time: f64) -> Compensated {
        let since = Compensated::sum(time, -self.parts.states[trajectory].time);
        let duration = self.duration(trajectory);
        let (low, high) = (duration.min(0.0), duration.max(0.0));
        if since.value >= low && since.value <= high {
            since
        } else {
            Compensated::new(since.value.clamp(low, high))
        }
    }

    /// The manoeuvres of a trajectory, by index, with their signed time since its start, along the integration.
    pub(super) fn manoeuvres_of(&self, trajectory: usize) -> Vec<(Compensated, usize)> {
        let backwards = self.duration(trajectory) < 0.0;
        let mut own: Vec<_> = self
            .parts
            .manoeuvres
            .iter()
            .enumerate()
            .filter(|(_, manoeuvre)| concerns(manoeuvre, trajectory))
            .map(|(index, manoeuvre)| (self.since_start(trajectory, manoeuvre.time), index))
            .collect();
        let time = |index: usize| self.parts.manoeuvres[index].time;
        own.sort_by(|(_, a), (_, b)| time(*a).total_cmp(&time(*b)));
        if backwards {
            own.reverse();
        }
        own
    }
}

/// Whether a manoeuvre, its list sorted, applies to a trajectory.
fn concerns(manoeuvre: &Manoeuvre, trajectory: usize) -> bool {
    manoeuvre.trajectories.as_ref().is_none_or(|list| list.binary_search(&trajectory).is_ok())
}
