//! Trajectories side by side, one a lane, each with its own steps. A lane whose trajectory ends takes the next one at
//! once; the last few, for which the lanes would be too empty, go on alone.

use std::collections::VecDeque;
use std::ops::{ControlFlow, Range};

use super::alone::{self, DoubleStep, STEPS_PER_POLL, Workspace};
use super::course::{Course, Outlet, Step, not_started};
use super::request::{MatrixOutput, Sampling};
use super::{Failure, Outcome, Request, SampleBudget, Sink, Trajectory};
use crate::interrupt::{Interrupt, Stop};
use crate::taylor::{Lane, Path, Pause, Primaries, Series, StepSize, Swarm, advance_four, eight, run_four};

/// Whether these trajectories are better computed side by side.
pub(super) fn suits(request: &Request, range: Range<usize>, sink: &dyn Sink) -> bool {
    let parts = request.parts();
    // Samples that are handed over on the way come in the order of the trajectories, so only one can be under way.
    let keeps_its_samples = |most: usize| match parts.sampling {
        Sampling::None => true,
        Sampling::EveryStep => false,
        Sampling::Count(_) | Sampling::Interval(_) | Sampling::Times(_) => range
            .clone()
            .all(|index| request.planned_samples(index).is_some_and(|samples| samples <= most as u64)),
    };
    range.len() > fewest(request.lanes(), request.with_matrix())
        && parts.matrix != MatrixOutput::Samples
        && sink.samples_at_once().is_none_or(keeps_its_samples)
}

/// Trajectories that are as fast alone as in these lanes. A step of all lanes costs as much as about 3 (of eight) or 2 (of
/// four) steps alone, with matrices 5 or 3.
fn fewest(lanes: usize, with_matrix: bool) -> usize {
    match (lanes, with_matrix) {
        (8, false) => 2,
        (8, true) => 4,
        (_, false) => 1,
        (_, true) => 2,
    }
}

pub(super) fn propagate(
    request: &Request,
    range: Range<usize>,
    budget: &SampleBudget,
    sink: &mut dyn Sink,
    interrupt: &dyn Interrupt,
) -> Result<(), Failure> {
    let school = School { request, budget, interrupt, next: range.start, end: range.end };
    let mut order = Order { sink, next: range.start, waiting: VecDeque::new() };
    if request.path().has_eight() {
        school.run(&mut Swarm::<[f64; 8]>::new(request.with_matrix()), &mut order)
    } else {
        school.run(&mut Swarm::<[f64; 4]>::new(request.with_matrix()), &mut order)
    }
}

/// Hands trajectories over in their order.
struct Order<'a> {
    sink: &'a mut dyn Sink,
    next: usize,
    /// Those that have ended before one with a smaller index, by what they are ahead.
    waiting: VecDeque<Option<Trajectory>>,
}

impl Order<'_> {
    fn take(&mut self, trajectory: Trajectory) -> Result<(), Failure> {
        let ahead = trajectory.index - self.next;
        if ahead > 0 {
            if self.waiting.len() <= ahead {
                self.waiting.resize_with(ahead + 1, || None);
            }
            self.waiting[ahead] = Some(trajectory);
            return Ok(());
        }
        self.waiting.pop_front();
        self.sink.trajectory(trajectory)?;
        self.next += 1;
        while let Some(trajectory) = self.waiting.front_mut().and_then(Option::take) {
            self.waiting.pop_front();
            self.sink.trajectory(trajectory)?;
            self.next += 1;
        }
        Ok(())
    }
}

/// A kernel with so many lanes.
trait Kernel {
    fn run(&mut self, path: Path, primaries: &Primaries, sizes: StepSize, most: u64) -> Pause;
    fn advance(&mut self, path: Path);
}

impl Kernel for Swarm<[f64; 4]> {
    fn run(&mut self, path: Path, primaries: &Primaries, sizes: StepSize, most: u64) -> Pause {
        run_four(path, primaries, sizes, self, most)
    }

    fn advance(&mut self, path: Path) {
        advance_four(path, self);
    }
}

impl Kernel for Swarm<[f64; 8]> {
    fn run(&mut self, path: Path, primaries: &Primaries, sizes: StepSize, most: u64) -> Pause {
        eight::run(path, primaries, sizes, self, most)
    }

    fn advance(&mut self, path: Path) {
        eight::advance(path, self);
    }
}

/// A trajectory in a lane.
struct Member<'a> {
    course: Course<'a>,
    watched: bool,
}

/// The trajectories still to come.
struct School<'a> {
    request: &'a Request,
    budget: &'a SampleBudget,
    interrupt: &'a dyn Interrupt,
    next: usize,
    end: usize,
}

impl<'a> School<'a> {
    fn run<const N: usize>(mut self, swarm: &mut Swarm<[f64; N]>, order: &mut Order) -> Result<(), Failure>
    where
        Swarm<[f64; N]>: Kernel,
    {
        let request = self.request;
        let (path, limit) = (request.path(), request.limits().steps);
        let mut members: [Option<Member>; N] = std::array::from_fn(|_| None);
        let mut view = Series::new();
        for lane in 0..N {
            self.fill(swarm, lane, &mut members[lane], order)?;
        }
        let fewest = fewest(N, request.with_matrix());
        let mut before_poll = STEPS_PER_POLL;
        loop {
            let active = members.iter().flatten().count();
            if active <= fewest && self.next == self.end {
                break;
            }
            let granted = members.iter().flatten().map(|member| limit - member.course.motion.steps).min();
            let most = granted.unwrap_or(0).min(before_poll);
            if most == 0 {
                self.look_round(swarm, &mut members, order)?;
                before_poll = STEPS_PER_POLL;
                continue;
            }
            let pause = swarm.run(path, request.primaries(), request.step_size(), most);
            for member in members.iter_mut().flatten() {
                member.course.motion.steps += pause.steps;
            }
            before_poll -= pause.steps;
            if pause.lanes == 0 {
                continue;
            }
            before_poll -= 1;
            let mut ends: [Option<(bool, Option<Outcome>)>; N] = [None; N];
            for lane in 0..N {
                let Some(member) = &mut members[lane] else { continue };
                if pause.floor >> lane & 1 == 1 {
                    // It ends where it is: a series that has overflowed can't be evaluated, not even at 0.
                    fetch(swarm, lane, &mut member.course);
                    swarm.length[lane] = 0.0;
                    ends[lane] = Some((false, Some(Outcome::StepFloor)));
                    continue;
                }
                member.course.motion.steps += 1;
                if pause.lanes >> lane & 1 == 0 {
                    continue;
                }
                let last = pause.last >> lane & 1 == 1;
                let mut stop = None;
                if member.watched {
                    fetch(swarm, lane, &mut member.course);
                    swarm.series.extract(lane, &mut view);
                    let step = Step { length: swarm.length[lane], last };
                    let ahead = DoubleStep { path, series: &view, columns: None };
                    let end;
                    (end, stop) = member.course.observe(&ahead, step, &mut Outlet(None))?;
                    swarm.length[lane] = end;
                }
                ends[lane] = Some((last, stop));
            }
            swarm.advance(path);
            for lane in 0..N {
                let Some((last, stop)) = ends[lane] else { continue };
                let Some(member) = &mut members[lane] else { continue };
                if pause.floor >> lane & 1 == 0 {
                    fetch(swarm, lane, &mut member.course);
                }
                let flow = match stop {
                    Some(outcome) => ControlFlow::Break(outcome),
                    None => member.course.arrive(last, &mut Outlet(None))?,
                };
                match flow {
                    ControlFlow::Continue(()) if last => put(swarm, lane, member),
                    ControlFlow::Continue(()) => {}
                    ControlFlow::Break(outcome) => {
                        if let Some(member) = members[lane].take() {
                            order.take(member.course.close(outcome)?)?;
                        }
                        self.fill(swarm, lane, &mut members[lane], order)?;
                    }
                }
            }
        }
        let mut workspace = Workspace::new(request.with_matrix());
        for lane in 0..N {
            if let Some(mut member) = members[lane].take() {
                fetch(swarm, lane, &mut member.course);
                order.take(alone::finish(member.course, &mut workspace)?)?;
            }
        }
        Ok(())
    }

    /// Ends what has used up its steps or its time, and starts others in its place.
    fn look_round<const N: usize>(
        &mut self,
        swarm: &mut Swarm<[f64; N]>,
        members: &mut [Option<Member<'a>>; N],
        order: &mut Order,
    ) -> Result<(), Failure> {
        let stop = self.interrupt.poll();
        if stop == Some(Stop::Cancelled) {
            return Err(Failure::Cancelled);
        }
        for lane in 0..N {
            let outcome = match &members[lane] {
                Some(_) if stop.is_some() => Outcome::WallTimeLimit,
                Some(member) if member.course.motion.steps >= self.request.limits().steps => {
                    Outcome::StepLimit
                }
                _ => continue,
            };
            if let Some(mut member) = members[lane].take() {
                fetch(swarm, lane, &mut member.course);
                order.take(member.course.close(outcome)?)?;
            }
            self.fill(swarm, lane, &mut members[lane], order)?;
        }
        Ok(())
    }

    /// Puts the next trajectory that takes a step at all into a lane.
    fn fill<const N: usize>(
        &mut self,
        swarm: &mut Swarm<[f64; N]>,
        lane: usize,
        member: &mut Option<Member<'a>>,
        order: &mut Order,
    ) -> Result<(), Failure> {
        while self.next < self.end {
            let index = self.next;
            self.next += 1;
            match self.interrupt.poll() {
                Some(Stop::Cancelled) => return Err(Failure::Cancelled),
                Some(Stop::WallTime) => {
                    order.take(not_started(self.request, index))?;
                    continue;
                }
                None => {}
            }
            let mut course = Course::new(self.request, index, self.budget, self.interrupt);
            match course.open(&mut Outlet(None))? {
                ControlFlow::Break(outcome) => order.take(course.close(outcome)?)?,
                ControlFlow::Continue(()) => {
                    let watched = course.is_watched();
                    put(swarm, lane, member.insert(Member { course, watched }));
                    return Ok(());
                }
            }
        }
        swarm.rest(lane);
        Ok(())
    }
}

/// From the lane to the course.
fn fetch<const N: usize>(swarm: &Swarm<[f64; N]>, lane: usize, course: &mut Course) {
    course.motion.state = swarm.state(lane);
    course.motion.elapsed = swarm.elapsed(lane);
    (course.motion.reference, course.motion.drift) = swarm.drift(lane);
    if let Some(transition) = &mut course.transition {
        swarm.get_matrix(lane, &mut transition.leg);
    }
}

/// From the course to the lane.
fn put<const N: usize>(swarm: &mut Swarm<[f64; N]>, lane: usize, member: &Member) {
    let Member { course, watched } = member;
    swarm.put(
        lane,
        &Lane {
            state: course.motion.state,
            elapsed: course.motion.elapsed,
            target: course.target,
            direction: course.direction,
            reference: course.motion.reference,
            drift: course.motion.drift,
            watched: *watched,
        },
    );
    if let Some(transition) = &course.transition {
        swarm.put_matrix(lane, &transition.leg);
    }
}
