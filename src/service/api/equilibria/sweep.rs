//! Equilibria of many systems, one after the other.

use std::ops::Range;

use mechanics::frame::Frame;
use mechanics::interrupt::Interrupt;
use mechanics::units::Units;

use super::response::{EquilibriaOfSystem, EquilibriaSweep, Solution, SweepHeader, SweepSummary};
use crate::answer::{Effort, written};
use crate::operation::{Items, Lines, Out, Tally, each};
use crate::problem::Problem;
use crate::wire::{Conventions, JacobiForm};

/// The systems whose equilibria are to be computed.
pub(super) struct Sweep {
    systems: Vec<Conventions>,
    units: Units,
    frame: Frame,
    form: JacobiForm,
    largest_residual: Tally<f64>,
}

impl Sweep {
    pub(super) fn new(systems: Vec<Conventions>, units: Units, frame: Frame, form: JacobiForm) -> Self {
        Self { systems, units, frame, form, largest_residual: Tally::default() }
    }
}

impl Items for Sweep {
    fn count(&self) -> usize {
        self.systems.len()
    }

    fn compute(
        &self,
        range: Range<usize>,
        out: &mut Out<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<(), Problem> {
        let mut largest = 0.0_f64;
        each(range, interrupt, |index| {
            let conventions = &self.systems[index];
            let solution = Solution::of(conventions, self.form);
            largest = largest.max(solution.largest_residual());
            out.item("points", &EquilibriaOfSystem::new(index, &conventions.system, solution))
        })?;
        self.largest_residual.add(|all| *all = all.max(largest));
        Ok(())
    }

    fn envelope(&self) -> Result<Vec<u8>, Problem> {
        written(&EquilibriaSweep::new(self.units, self.frame, self.form, self.largest_residual.sum()))
    }

    fn effort(&self) -> Effort {
        Effort { steps: u64::try_from(self.count()).unwrap_or(u64::MAX), outcome: None }
    }
}

impl Lines for Sweep {
    fn header(&self, out: &mut Out<'_>) -> Result<(), Problem> {
        out.line("header", &SweepHeader::new(self.units, self.frame, self.form))
    }

    fn summary(&self, out: &mut Out<'_>) -> Result<(), Problem> {
        out.line("summary", &SweepSummary::new(self.count(), self.largest_residual.sum()))
    }
}
