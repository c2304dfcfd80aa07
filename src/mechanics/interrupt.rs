//! How a computation is told to stop. The computation polls; whoever started it decides.

use std::sync::atomic::{AtomicU64, Ordering};

/// Why a computation should stop.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Stop {
    /// Nobody waits for the answer any more.
    Cancelled,
    /// The time granted is used up: return what there is.
    WallTime,
}

/// Asked by every long loop, a few thousand times a second.
pub trait Interrupt: Sync {
    /// A reason to stop now, if there is one.
    fn poll(&self) -> Option<Stop>;
}

/// Lets a computation run to its end.
#[derive(Clone, Copy, Debug)]
pub struct Never;

impl Interrupt for Never {
    fn poll(&self) -> Option<Stop> {
        None
    }
}

/// Stops at a given poll, so that tests of cancellation count polls instead of milliseconds.
#[derive(Debug)]
pub struct AfterPolls {
    left: AtomicU64,
    stop: Stop,
}

impl AfterPolls {
    /// Lets `polls` polls pass and answers `stop` to every later one.
    #[must_use]
    pub fn new(polls: u64, stop: Stop) -> Self {
        Self { left: AtomicU64::new(polls), stop }
    }
}

impl Interrupt for AfterPolls {
    fn poll(&self) -> Option<Stop> {
        let spent = self.left.fetch_update(Ordering::Relaxed, Ordering::Relaxed, |left| left.checked_sub(1));
        spent.is_err().then_some(self.stop)
    }
}
