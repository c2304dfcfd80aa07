//! Events and surfaces along a trajectory.

use nalgebra::Vector3;

use super::{Ahead, Course, seen};
use crate::arithmetic::sum::Compensated;
use crate::potential::gradient;
use crate::propagation::request::Contact;
use crate::propagation::watch::{Hit, Stretch};
use crate::propagation::{Occurrence, Outcome};
use crate::quantity::{Distance, Quantity};
use crate::system::Primary;

/// A start this near to a surface is on it: coordinates of the order of 1 are rounded to about this.
const SURFACE: f64 = 8.0 * f64::EPSILON;

/// What is used anew in each step.
#[derive(Default)]
pub(super) struct Scratch {
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

impl Course<'_> {
    /// The outcome of a start inside a primary.
    pub(super) fn inside(&self) -> Option<Outcome> {
        let contact = self.request.parts().contact;
        if contact == Contact::default() {
            return None;
        }
        let primaries = self.request.primaries();
        let velocity =
            Vector3::new(self.motion.state[3].value, self.motion.state[4].value, self.motion.state[5].value);
        let position =
            Vector3::new(self.motion.state[0].value, self.motion.state[1].value, self.motion.state[2].value);
        let coriolis = 2.0 * Vector3::new(velocity.y, -velocity.x, 0.0);
        let acceleration = gradient(self.request.parts().mass_parameter, &position) + coriolis;
        let below = |radius: Option<Distance>, centre: Compensated| {
            let away = Vector3::new(
                self.motion.state[0].minus(centre),
                self.motion.state[1].value,
                self.motion.state[2].value,
            );
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

    /// Records the events of a step; gives where and why the trajectory ends in it, if it does.
    pub(super) fn watch(&mut self, ahead: &dyn Ahead, length: f64, at_end: bool) -> Option<(f64, Outcome)> {
        if self.watches.is_empty() && self.surfaces.is_empty() {
            return None;
        }
        let elapsed = self.motion.elapsed;
        let stretch = Stretch::new(
            self.request.path(),
            ahead.series(),
            &self.motion.state,
            self.start + elapsed.value,
            length,
            elapsed.value,
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
                    let time = self.start + (elapsed.value + (elapsed.rest + hit.at));
                    let (place, change) = ahead.state(&self.motion.state, Compensated::new(hit.at));
                    let state = seen(self.request, &place, time, &change);
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
}
