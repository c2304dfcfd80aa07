//! Answers that consist of many items, each computed and written by itself.

use std::ops::Range;
use std::sync::{Mutex, PoisonError};

use bytes::Bytes;
use mechanics::interrupt::{Interrupt, Stop};
use serde::Serialize;

use crate::answer::{Effort, append};
use crate::problem::{Problem, Slug};

/// A computation of many items. Threads share it, and each does parts of it; how it is cut changes nothing in the answer.
pub trait Items: Send + Sync + 'static {
    /// How many items there are.
    fn count(&self) -> usize;

    /// The most items of a part, so that what is written of one stays well below a megabyte.
    fn largest_part(&self) -> usize {
        LARGEST_PART
    }

    /// The fewest items of a part but the last, as long as it is not known how long they take.
    fn smallest_part(&self) -> usize {
        SMALLEST_PART
    }

    /// How many are computed together: a part of fewer would take about as long.
    fn fewest_together(&self) -> usize {
        1
    }

    /// Computes a range of the items, writes them to `out` in ascending order, and takes note of what they took and how
    /// good they are.
    ///
    /// # Errors
    /// The problem that the mathematics met, and what `out` answers.
    fn compute(
        &self,
        range: Range<usize>,
        out: &mut Out<'_>,
        interrupt: &dyn Interrupt,
    ) -> Result<(), Problem>;

    /// The whole answer but for the items: a JSON object whose last member is the empty array that they go into. Asked
    /// when all are computed.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite.
    fn envelope(&self) -> Result<Vec<u8>, Problem>;

    /// What they took so far. Asked when all are computed, or when no more will be.
    fn effort(&self) -> Effort;
}

/// Items that can also be sent one by one, as lines.
pub trait Lines: Items {
    /// Writes the members of the first line, which are what the items have in common.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite.
    fn header(&self, out: &mut Out<'_>) -> Result<(), Problem>;

    /// Writes the members of the last line, which are the sum of all items. Asked when all are computed.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite.
    fn summary(&self, out: &mut Out<'_>) -> Result<(), Problem>;
}

/// The most items of a part where nothing makes them large: the grain at which computing them together pays.
pub const LARGEST_PART: usize = 512;

/// The fewest items of a part where an item takes some microseconds.
pub const SMALLEST_PART: usize = 16;

/// Bytes that are handed over at a time.
const CHUNK: usize = 32 << 10;

/// Takes over what has been written.
pub(super) type Taker<'a> = &'a mut dyn FnMut(Bytes) -> Result<(), Problem>;

/// What computing items writes to.
pub struct Out<'a> {
    buffer: Vec<u8>,
    streamed: bool,
    take: Taker<'a>,
}

impl<'a> Out<'a> {
    /// Lines of a stream, or else the items of an array, a comma before each.
    pub fn new(streamed: bool, take: Taker<'a>) -> Self {
        Self { buffer: Vec::with_capacity(CHUNK), streamed, take }
    }

    /// Whether lines are written.
    #[must_use]
    pub fn is_streamed(&self) -> bool {
        self.streamed
    }

    /// Writes one item; `kind` is what its line is called.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite, and what the taker answers.
    pub fn item(&mut self, kind: &str, item: &impl Serialize) -> Result<(), Problem> {
        if self.streamed {
            return self.line(kind, item);
        }
        self.buffer.push(b',');
        append(&mut self.buffer, item)?;
        self.hand_over(CHUNK)
    }

    /// Writes one line of a stream.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite, and what the taker answers.
    pub fn line(&mut self, kind: &str, members: &impl Serialize) -> Result<(), Problem> {
        self.buffer.extend_from_slice(b"{\"kind\":\"");
        self.buffer.extend_from_slice(kind.as_bytes());
        self.buffer.push(b'"');
        let opened = self.buffer.len();
        append(&mut self.buffer, members)?;
        debug_assert_eq!(self.buffer.get(opened), Some(&b'{'), "a line is an object with members");
        // The kind is the object's first member.
        self.buffer[opened] = b',';
        self.buffer.push(b'\n');
        self.hand_over(CHUNK)
    }

    /// Hands over what is left.
    ///
    /// # Errors
    /// What the taker answers.
    pub fn finish(mut self) -> Result<(), Problem> {
        self.hand_over(1)
    }

    fn hand_over(&mut self, enough: usize) -> Result<(), Problem> {
        if self.buffer.len() < enough {
            return Ok(());
        }
        let full = std::mem::replace(&mut self.buffer, Vec::with_capacity(CHUNK));
        (self.take)(full.into())
    }
}

/// Writes `each` of a range of items that take a few microseconds.
///
/// # Errors
/// `wall-time-limit` if the time granted is too short, and what `each` and `out` answer.
pub fn each(
    range: Range<usize>,
    interrupt: &dyn Interrupt,
    mut each: impl FnMut(usize) -> Result<(), Problem>,
) -> Result<(), Problem> {
    /// Items between two looks at the clock.
    const ITEMS_PER_POLL: usize = 64;
    for (number, index) in range.enumerate() {
        if number % ITEMS_PER_POLL == 0 {
            match interrupt.poll() {
                None => {}
                Some(Stop::Cancelled) => return Err(Problem::overloaded("The server is stopping")),
                Some(Stop::WallTime) => {
                    let detail = "The time granted was too short for all items";
                    return Err(Problem::new(Slug::WallTimeLimit, detail));
                }
            }
        }
        each(index)?;
    }
    Ok(())
}

/// What is added up over the items while threads compute them; in an order of no effect on the sum.
#[derive(Debug, Default)]
pub struct Tally<T>(Mutex<T>);

impl<T: Clone> Tally<T> {
    /// Adds a part's.
    pub fn add(&self, add: impl FnOnce(&mut T)) {
        add(&mut self.0.lock().unwrap_or_else(PoisonError::into_inner));
    }

    /// The sum so far.
    #[must_use]
    pub fn sum(&self) -> T {
        self.0.lock().unwrap_or_else(PoisonError::into_inner).clone()
    }
}
