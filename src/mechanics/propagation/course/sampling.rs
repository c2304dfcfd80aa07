//! The samples of a trajectory under way.

use super::{Ahead, Course, Outlet, in_frame, seen};
use crate::arithmetic::sum::Compensated;
use crate::interrupt::Stop;
use crate::propagation::Failure;
use crate::propagation::request::{MatrixOutput, Sampling};

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
        ahead: &dyn Ahead,
        end: f64,
        leg_ends: bool,
        outlet: &mut Outlet,
    ) -> Result<(), Failure> {
        let mut since_poll = 0;
        while let Some((since, time)) = self.planned(self.next_sample) {
            let at = since.difference(self.motion.elapsed);
            let beyond = (at.value - end) * self.direction;
            if beyond > 0.0 || (leg_ends && beyond == 0.0) {
                break;
            }
            self.push_sample(Some((ahead, at)), Some(time), outlet)?;
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
            return self.push_sample(None, None, outlet);
        }
        while let Some((since, time)) = self.planned(self.next_sample) {
            if !finished && since.minus(self.motion.elapsed) * self.direction > 0.0 {
                break;
            }
            self.push_sample(None, Some(time), outlet)?;
            self.next_sample += 1;
        }
        Ok(())
    }

    /// The state a time after the start of the step ahead, or the place reached.
    pub(super) fn push_sample(
        &mut self,
        within: Option<(&dyn Ahead, Compensated)>,
        time: Option<f64>,
        outlet: &mut Outlet,
    ) -> Result<(), Failure> {
        self.budget.take(self.request.values_per_sample())?;
        if let Some(sink) = &mut outlet.0
            && sink.samples_at_once() == Some(self.samples.times.len())
        {
            sink.samples(self.index, std::mem::take(&mut self.samples))?;
        }
        let within = within.filter(|(_, at)| at.value != 0.0);
        let time = time.unwrap_or(self.time_here());
        let seen = match within {
            Some((ahead, at)) => {
                let (place, change) = ahead.state(&self.motion.state, at);
                seen(self.request, &place, time, &change)
            }
            None => self.seen(time),
        };
        self.samples.times.push(time);
        self.samples.positions.push(seen.position);
        self.samples.velocities.push(seen.velocity);
        if self.request.parts().matrix == MatrixOutput::Samples {
            let matrix = match within {
                Some((ahead, at)) => ahead.matrix(self, at),
                None => self.legs().map(|legs| legs.here()),
            };
            let matrix = matrix.map(|matrix| in_frame(self.request, &matrix, self.start, time));
            self.samples.matrices.extend(matrix);
        }
        Ok(())
    }
}
