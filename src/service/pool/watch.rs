//! What a computation is told while it runs: whether its client still waits, and whether its time is up. A piece of work
//! that takes long gives way to others while it asks.

use std::sync::LazyLock;
use std::sync::atomic::{AtomicBool, AtomicU64, Ordering};
use std::time::{Duration, Instant};

use mechanics::interrupt::{Interrupt, Stop};

use super::Pool;

/// What a computation polls: its time and its client's presence.
#[derive(Debug)]
pub struct Watch {
    cancelled: AtomicBool,
    pool: Pool,
    /// Nanoseconds since [`ORIGIN`] at which the time is up; [`NEVER`] while no clock runs.
    deadline: AtomicU64,
    polls: AtomicU64,
}

/// Where the clock of all computations begins.
static ORIGIN: LazyLock<Instant> = LazyLock::new(Instant::now);
/// No deadline.
const NEVER: u64 = u64::MAX;

fn now() -> u64 {
    u64::try_from(ORIGIN.elapsed().as_nanos()).unwrap_or(NEVER)
}

impl Watch {
    pub(super) fn new(pool: &Pool) -> Self {
        Self {
            cancelled: AtomicBool::new(false),
            pool: pool.clone(),
            deadline: AtomicU64::new(NEVER),
            polls: AtomicU64::new(0),
        }
    }

    /// Lets the clock run, if it does not yet: `left` from now on, polling says [`Stop::WallTime`].
    pub fn run_out_in(&self, left: Duration) {
        let left = u64::try_from(left.as_nanos()).unwrap_or(NEVER);
        let deadline = now().saturating_add(left);
        let _ = self.deadline.compare_exchange(NEVER, deadline, Ordering::Relaxed, Ordering::Relaxed);
    }

    /// Stops the clock and tells how much is left on it.
    pub fn hold(&self) -> Duration {
        let deadline = self.deadline.swap(NEVER, Ordering::Relaxed);
        Duration::from_nanos(deadline.saturating_sub(now()))
    }

    /// Nobody waits for the answer any more.
    pub fn cancel(&self) {
        self.cancelled.store(true, Ordering::Relaxed);
    }

    /// Whether the answer is of no use any more, or the server stops.
    #[must_use]
    pub fn is_cancelled(&self) -> bool {
        self.cancelled.load(Ordering::Relaxed) || self.pool.is_closing()
    }

    /// How often it has been asked.
    #[must_use]
    pub fn polls(&self) -> u64 {
        self.polls.load(Ordering::Relaxed)
    }
}

impl Interrupt for Watch {
    fn poll(&self) -> Option<Stop> {
        self.polls.fetch_add(1, Ordering::Relaxed);
        self.pool.give_way();
        if self.is_cancelled() {
            return Some(Stop::Cancelled);
        }
        let deadline = self.deadline.load(Ordering::Relaxed);
        (deadline != NEVER && now() >= deadline).then_some(Stop::WallTime)
    }
}
