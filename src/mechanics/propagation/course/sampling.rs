//! The samples of a trajectory under way.

use super::{Course, Outlet, in_frame};
use crate::arithmetic::sum::Compensated;
use crate::interrupt::Stop;
use crate::propagation::Failure;
use crate::propagation::request::{MatrixOutput, Sampling};
use crate::taylor::{self, Columns, Series};

/// Samples between two polls, where one step holds many.
const SAMPLES_PER_POLL: usize = 1024;

impl Course<'_> {
    /// Signed time since the start and instant of a planned sample; none after the last, or where none is planned.
    fn planned(&self, number: u64) -> Option<(Compensated, f64)> {
        let count = self.request.planned_samples(self.index)?;
        if number >= count {
            return None;
        }
        #[expect(clippy::cast_precision_loss, reason = "the sample limit is far below 2^53")]
        let (step, steps) = (number as f64, (count - 1) as f64);
        let since = match &self.request.parts().sampling {
            Sampling::Count(_) if number == count - 1 => self.duration,
            Sampling::Count(_) => self.duration * (step / steps),
            Sampling::Interval(interval) => (interval * step).min(self.duration.abs()) * self.direction,
            Sampling::Times(times) => {
                let time = *times.get(usize::try_from(number).ok()?)?;
                return Some((self.request.since_start(self.index, time), time));
            }
            Sampling::None | Sampling::EveryStep => return None,
        };
        let time = self.start + since;
        // Between the ends the instant is the one that the answer tells, so that it compares with manoeuvres' times.
        let inside = since.abs() < self.duration.abs();
        let since = if inside { self.request.since_start(self.index, time) } else { Compensated::new(since) };
        Some((since, time))
    }

    /// The planned samples up to `end` of the step under way, without those of its very end if a leg ends there.
    pub(super) fn sample_within(
        &mut self,
        series: &Series,
        columns: Option<&Columns>,
        end: f64,
        leg_ends: bool,
        outlet: &mut Outlet,
    ) -> Result<(), Failure> {
        let mut since_poll = 0;
        while let Some((since, time)) = self.planned(self.next_sample) {
            let at = since.minus(self.motion.elapsed);
            let ahead = (at - end) * self.direction;
            if ahead > 0.0 || (leg_ends && ahead == 0.0) {
                break;
            }
            self.push_sample(Some(series), columns, at, Some(time), outlet)?;
            self.next_sample += 1;
            since_poll += 1;
            if since_poll % SAMPLES_PER_POLL == 0 && self.interrupt.poll() == Some(Stop::Cancelled) {
                return Err(Failure::Cancelled);
            }
        }
        Ok(())
    }

    /// The samples of the very instant reached, or all that rounding has left over once `finished`.
    pub(super) fn sample_here(&mut self, finished: bool, outlet: &mut Outlet) -> Result<(), Failure> {
        if self.request.parts().sampling == Sampling::EveryStep {
            return self.push_sample(None, None, 0.0, None, outlet);
        }
        while let Some((since, time)) = self.planned(self.next_sample) {
            if !finished && since.minus(self.motion.elapsed) * self.direction > 0.0 {
                break;
            }
            self.push_sample(None, None, 0.0, Some(time), outlet)?;
            self.next_sample += 1;
        }
        Ok(())
    }

    /// The state `at` a time after the start of the step along `series`, or the place reached.
    pub(super) fn push_sample(
        &mut self,
        series: Option<&Series>,
        columns: Option<&Columns>,
        at: f64,
        time: Option<f64>,
        outlet: &mut Outlet,
    ) -> Result<(), Failure> {
        self.budget.take(self.request.values_per_sample())?;
        if let Some(sink) = &mut outlet.0
            && sink.samples_at_once() == Some(self.samples.times.len())
        {
            sink.samples(self.index, std::mem::take(&mut self.samples))?;
        }
        let path = self.request.path();
        let time = time.unwrap_or(self.time_here());
        let change = series.filter(|_| at != 0.0).map_or([0.0; 6], |series| taylor::flow(path, series, at));
        let seen = self.seen(time, &change);
        self.samples.times.push(time);
        self.samples.positions.push(seen.position);
        self.samples.velocities.push(seen.velocity);
        if self.request.parts().matrix == MatrixOutput::Samples
            && let Some(transition) = &self.transition
        {
            let matrix = match columns.filter(|_| at != 0.0) {
                Some(columns) => transition.at(path, columns, at),
                None => transition.here(),
            };
            self.samples.matrices.push(in_frame(self.request, &matrix, self.start, time));
        }
        Ok(())
    }
}
