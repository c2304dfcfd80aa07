//! Trajectories one after the other.

use std::ops::{ControlFlow, Range};

use nalgebra::Matrix6;

use super::course::{Ahead, Course, Outlet, Step, not_started};
use super::{Failure, Outcome, Request, SampleBudget, Sink, Trajectory};
use crate::arithmetic::sum::Compensated;
use crate::interrupt::{Interrupt, Stop};
use crate::taylor::{self, Columns, Halt, Path, Series, Stride};

/// Steps between two polls: a tenth of a millisecond with a matrix, less without.
pub(super) const STEPS_PER_POLL: u64 = 64;

/// Room for the series of one trajectory, used for one after the other.
pub(super) struct Workspace {
    series: Series,
    columns: Option<Box<Columns>>,
}

impl Workspace {
    pub(super) fn new(with_columns: bool) -> Self {
        Self { series: Series::new(), columns: with_columns.then(Box::default) }
    }
}

/// A step in double precision.
pub(super) struct DoubleStep<'a> {
    pub path: Path,
    pub series: &'a Series,
    pub columns: Option<&'a Columns>,
}

impl Ahead for DoubleStep<'_> {
    fn series(&self) -> &Series {
        self.series
    }

    fn state(&self, place: &[Compensated; 6], at: Compensated) -> ([Compensated; 6], [f64; 6]) {
        (*place, taylor::flow(self.path, self.series, at.value))
    }

    fn matrix(&self, course: &Course, at: Compensated) -> Option<Matrix6<f64>> {
        Some(course.transition.as_ref()?.at(self.path, self.columns?, at.value))
    }
}

pub(super) fn propagate(
    request: &Request,
    range: Range<usize>,
    budget: &SampleBudget,
    sink: &mut dyn Sink,
    interrupt: &dyn Interrupt,
) -> Result<(), Failure> {
    let mut workspace = Workspace::new(request.with_matrix());
    one_by_one(request, range, budget, sink, interrupt, |course, outlet| run(course, &mut workspace, outlet))
}

/// Opens and closes one trajectory after the other, which `run` takes to its end in between.
pub(super) fn one_by_one(
    request: &Request,
    range: Range<usize>,
    budget: &SampleBudget,
    sink: &mut dyn Sink,
    interrupt: &dyn Interrupt,
    mut run: impl FnMut(&mut Course, &mut Outlet) -> Result<Outcome, Failure>,
) -> Result<(), Failure> {
    for index in range {
        let trajectory = match interrupt.poll() {
            Some(Stop::Cancelled) => return Err(Failure::Cancelled),
            Some(Stop::WallTime) => not_started(request, index),
            None => {
                let mut course = Course::new(request, index, budget, interrupt);
                let mut outlet = Outlet(Some(&mut *sink));
                let outcome = match course.open(&mut outlet)? {
                    ControlFlow::Break(outcome) => outcome,
                    ControlFlow::Continue(()) => run(&mut course, &mut outlet)?,
                };
                course.close(outcome)?
            }
        };
        sink.trajectory(trajectory)?;
    }
    Ok(())
}

/// A trajectory that has been opened, from where it is to its end.
pub(super) fn finish(mut course: Course, workspace: &mut Workspace) -> Result<Trajectory, Failure> {
    let outcome = run(&mut course, workspace, &mut Outlet(None))?;
    course.close(outcome)
}

fn run(course: &mut Course, workspace: &mut Workspace, outlet: &mut Outlet) -> Result<Outcome, Failure> {
    let request = course.request;
    let path = request.path();
    let limit = request.limits().steps;
    let watched = course.is_watched() || course.transition.is_some();
    let Workspace { series, columns } = workspace;
    let mut before_poll = STEPS_PER_POLL;
    loop {
        if before_poll == 0 {
            if let ControlFlow::Break(outcome) = course.poll()? {
                return Ok(outcome);
            }
            before_poll = STEPS_PER_POLL;
        }
        let (taken, before) = (course.motion.steps, (course.motion.reference, course.motion.drift));
        if taken == limit {
            return Ok(Outcome::StepLimit);
        }
        let stride = Stride {
            target: course.target,
            direction: course.direction,
            most: before_poll.min(limit - taken),
            watched,
        };
        let halt =
            taylor::run(path, request.primaries(), request.step_size(), &mut course.motion, series, &stride);
        before_poll -= course.motion.steps - taken;
        let step = match halt {
            Halt::Steps => continue,
            Halt::Floor => return Ok(Outcome::StepFloor),
            Halt::Step { length, last } => Step { length, last },
        };
        if let (Some(transition), Some(columns)) = (&course.transition, columns.as_deref_mut()) {
            transition.expand(path, series, columns);
            if !columns.is_finite() {
                // No step for the matrix is no step at all.
                course.motion.steps = taken;
                (course.motion.reference, course.motion.drift) = before;
                return Ok(Outcome::StepFloor);
            }
        }
        let ahead = DoubleStep { path, series, columns: columns.as_deref() };
        let (end, stop) = course.observe(&ahead, step, outlet)?;
        taylor::advance(path, &mut course.motion, series, end);
        if let (Some(transition), Some(columns)) = (&mut course.transition, columns.as_deref()) {
            transition.advance(path, columns, end);
        }
        if let Some(outcome) = stop {
            return Ok(outcome);
        }
        if let ControlFlow::Break(outcome) = course.arrive(step.last, outlet)? {
            return Ok(outcome);
        }
    }
}
