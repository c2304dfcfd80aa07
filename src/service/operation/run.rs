//! Items under computation: parts of them are taken in ascending order by the compute threads and read in that order.
//!
//! What is written of a stream and not yet read is bounded: a part is begun only if few are ahead of the reader, so that
//! a thread is at the disposal of others while the reader takes its time. Only a part that turns out to be larger than
//! its room waits for the reader, and another thread stands in for its own meanwhile.

use std::collections::VecDeque;
use std::future::poll_fn;
use std::ops::Range;
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::{Arc, Condvar, Mutex, MutexGuard, PoisonError, Weak};
use std::task::{Context, Poll, Waker};
use std::time::{Duration, Instant};

use bytes::Bytes;

use super::items::{Items, Out};
use crate::pool::{Place, Pool, Watch};
use crate::problem::Problem;

/// How long a part should take: that long others wait for a thread. Longer ones would hardly be computed faster.
const PART_TIME: Duration = Duration::from_millis(2);
/// What a part of a stream may hold for its reader, in bytes.
const PART_ROOM: usize = 1 << 20;
/// Parts of a stream that may be held for its reader besides one for each thread.
const PARTS_AHEAD: usize = 2;
/// What the reader gets at a time, in bytes.
const PIECE: usize = 64 << 10;

/// The items of one request while they are computed, for whoever reads them. Dropping it cancels the computation.
pub(super) struct Run(Arc<Shared>);

pub(super) struct Shared {
    items: Arc<dyn Items>,
    streamed: bool,
    watch: Arc<Watch>,
    pool: Pool,
    state: Mutex<State>,
    /// Told when there is more room for what is computed.
    room: Condvar,
}

struct State {
    /// Where it is computed; none once that is over.
    place: Option<Place>,
    /// The first item that nobody has taken.
    next: usize,
    /// Parts that are taken and not yet read; the reader is at the first.
    parts: VecDeque<Part>,
    /// How many parts have been read.
    read: usize,
    /// Threads at work or called to it.
    hands: usize,
    /// Those of them that wait for the reader.
    idle: usize,
    /// What is left on the clock while it stands, because nobody computes.
    clock: Option<Duration>,
    /// How long an item takes.
    pace: Option<Duration>,
    begun: Option<Instant>,
    reader: Reader,
    /// How long the reader let the piece before lie.
    lay: Duration,
}

/// What the reader does.
enum Reader {
    /// Waits for what is computed.
    Waits(Waker),
    /// Was given something, or told that there is something, at that instant, and has not asked since.
    Busy(Instant),
}

impl Reader {
    fn lies_for(&self) -> Duration {
        match self {
            Self::Waits(_) => Duration::ZERO,
            Self::Busy(since) => since.elapsed(),
        }
    }
}

#[derive(Default)]
struct Part {
    chunks: VecDeque<Bytes>,
    size: usize,
    end: Option<Result<(), Problem>>,
}

impl Run {
    /// Items to be computed in this place, within `wall_time` of computing; `streamed` to write lines and to hold back
    /// what the reader has no room for.
    pub(super) fn new(place: Place, items: Arc<dyn Items>, streamed: bool, wall_time: Duration) -> Self {
        let (watch, pool) = (Arc::clone(place.watch()), place.pool().clone());
        let state = State {
            place: Some(place),
            next: 0,
            parts: VecDeque::new(),
            read: 0,
            hands: 0,
            idle: 0,
            clock: Some(wall_time),
            pace: None,
            begun: None,
            reader: Reader::Busy(Instant::now()),
            lay: Duration::ZERO,
        };
        let (state, room) = (Mutex::new(state), Condvar::new());
        Self(Arc::new(Shared { items, streamed, watch, pool, state, room }))
    }

    /// What is written next, once it is; nothing after the last item. A problem is the last that comes.
    pub(super) fn poll_next(&self, context: &Context<'_>) -> Poll<Option<Result<Bytes, Problem>>> {
        let state = &mut *self.0.lock();
        state.lay = state.reader.lies_for();
        state.reader = Reader::Busy(Instant::now());
        loop {
            let Some(part) = state.parts.front_mut() else {
                if state.next == self.0.items.count() {
                    return Poll::Ready(None);
                }
                break;
            };
            if let Some(mut chunk) = part.chunks.pop_front() {
                if self.0.streamed && chunk.len() > PIECE {
                    part.chunks.push_front(chunk.split_off(PIECE));
                }
                part.size -= chunk.len();
                self.0.room.notify_all();
                return Poll::Ready(Some(Ok(chunk)));
            }
            match part.end.take() {
                None => break,
                Some(Err(problem)) => {
                    self.0.abandon(state);
                    return Poll::Ready(Some(Err(problem)));
                }
                Some(Ok(())) => {
                    state.parts.pop_front();
                    state.read += 1;
                    self.call_hands(state);
                }
            }
        }
        if self.0.watch.is_cancelled() {
            return Poll::Ready(Some(Err(stopping())));
        }
        state.reader = Reader::Waits(context.waker().clone());
        self.call_hands(state);
        Poll::Pending
    }

    /// The same as a future.
    pub(super) async fn next(&self) -> Option<Result<Bytes, Problem>> {
        poll_fn(|context| self.poll_next(context)).await
    }

    /// Calls as many threads as find something to do.
    fn call_hands(&self, state: &mut State) {
        let left = (self.0.items.count() - state.next).div_ceil(self.0.items.smallest_part());
        let free = self.0.pool.threads().saturating_sub(state.hands - state.idle);
        for _ in 0..free.min(left).min(self.0.room_for_parts(state)) {
            let (Some(place), shared) = (&state.place, Arc::clone(&self.0)) else { return };
            state.hands += 1;
            place.enlist(move || shared.step());
        }
    }

    /// How long it has been computed.
    pub(super) fn elapsed(&self) -> Duration {
        self.0.lock().begun.map_or(Duration::ZERO, |begun| begun.elapsed())
    }

    /// For whoever watches the reader's patience.
    pub(super) fn shared(&self) -> Weak<Shared> {
        Arc::downgrade(&self.0)
    }

    /// Whether the reader has let what there was for it lie for that long, now or the last time.
    pub(super) fn lay_for(&self, time: Duration) -> bool {
        let state = self.0.lock();
        state.lay.max(state.reader.lies_for()) >= time
    }

    /// Whether the reader was given up.
    pub(super) fn is_given_up(&self) -> bool {
        self.0.lock().place.is_none()
    }

    /// The place, once everything is computed.
    pub(super) fn into_place(self) -> Option<Place> {
        self.0.lock().place.take()
    }
}

impl Drop for Run {
    fn drop(&mut self) {
        self.0.abandon(&mut self.0.lock());
    }
}

fn stopping() -> Problem {
    Problem::overloaded("The server is stopping")
}

impl Shared {
    fn lock(&self) -> MutexGuard<'_, State> {
        self.state.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// How long the reader has let what there is for it lie.
    pub(super) fn lies_for(&self) -> Duration {
        self.lock().reader.lies_for()
    }

    /// Nobody reads any more.
    pub(super) fn give_up(&self) {
        self.abandon(&mut self.lock());
    }

    fn abandon(&self, state: &mut State) {
        state.place = None;
        state.parts.clear();
        self.room.notify_all();
    }

    fn room_for_parts(&self, state: &State) -> usize {
        let most = if self.streamed { self.pool.threads() + PARTS_AHEAD } else { usize::MAX };
        most.saturating_sub(state.parts.len())
    }

    /// Does a part; false if there is none to be done now.
    fn step(&self) -> bool {
        let Some((number, range)) = self.take() else { return false };
        let (begun, count) = (Instant::now(), range.len());
        let computed = catch_unwind(AssertUnwindSafe(|| {
            let mut push = |chunk| self.push(number, chunk);
            let mut out = Out::new(self.streamed, &mut push);
            self.items.compute(range, &mut out, &*self.watch)?;
            out.finish()
        }));
        let end = computed.unwrap_or_else(|payload| Err(Problem::panicked(&*payload)));
        let pace = begun.elapsed() / u32::try_from(count).unwrap_or(u32::MAX);
        let state = &mut *self.lock();
        state.pace = Some(state.pace.map_or(pace, |before| (before + pace) / 2));
        if let Some(part) = state.part(number) {
            part.end = Some(end);
            state.tell_reader(number);
        }
        true
    }

    fn take(&self) -> Option<(usize, Range<usize>)> {
        let state = &mut *self.lock();
        let left = self.items.count() - state.next;
        if self.watch.is_cancelled() || left == 0 || self.room_for_parts(state) == 0 {
            state.hands -= 1;
            self.hold_clock_if_idle(state);
            state.tell_reader(state.read);
            return None;
        }
        let number = state.read + state.parts.len();
        let range = state.next..state.next + self.size(state, left);
        state.next = range.end;
        state.parts.push_back(Part::default());
        state.begun.get_or_insert_with(Instant::now);
        self.let_clock_run(state);
        Some((number, range))
    }

    /// How many of the items left make the next part: what is done in [`PART_TIME`], but not so many that other threads
    /// have nothing to do in the end.
    fn size(&self, state: &State, left: usize) -> usize {
        let timely = state.pace.map_or(0, |pace| PART_TIME.as_nanos() / pace.as_nanos().max(1));
        let timely = usize::try_from(timely).unwrap_or(usize::MAX);
        let share = left.div_ceil(2 * self.pool.threads());
        // How long an item takes is not known before the first part has ended.
        let least =
            if state.pace.is_some() { self.items.fewest_together() } else { self.items.smallest_part() };
        timely.min(share).max(least).min(self.items.largest_part()).clamp(1, left)
    }

    fn push(&self, number: usize, chunk: Bytes) -> Result<(), Problem> {
        let mut state = self.lock();
        if self.is_full(&mut state, number) {
            drop(state);
            state = self.pool.stand_in(|| self.wait_for_room(number));
        }
        let part = state.part(number).ok_or_else(stopping)?;
        part.size += chunk.len();
        part.chunks.push_back(chunk);
        state.tell_reader(number);
        Ok(())
    }

    fn is_full(&self, state: &mut State, number: usize) -> bool {
        self.streamed && state.part(number).is_some_and(|part| part.size >= PART_ROOM)
    }

    fn wait_for_room(&self, number: usize) -> MutexGuard<'_, State> {
        let mut state = self.lock();
        state.idle += 1;
        self.hold_clock_if_idle(&mut state);
        // Not for a single piece, or a thread would come and go for each.
        let waits = |state: &mut State| state.part(number).is_some_and(|part| part.size > PART_ROOM / 2);
        let waiting = self.room.wait_while(state, waits);
        let mut state = waiting.unwrap_or_else(PoisonError::into_inner);
        state.idle -= 1;
        self.let_clock_run(&mut state);
        state
    }

    fn hold_clock_if_idle(&self, state: &mut State) {
        if state.hands == state.idle && state.clock.is_none() {
            state.clock = Some(self.watch.hold());
        }
    }

    fn let_clock_run(&self, state: &mut State) {
        if let Some(left) = state.clock.take() {
            self.watch.run_out_in(left);
        }
    }
}

impl State {
    /// A part at work; none if nobody reads any more.
    fn part(&mut self, number: usize) -> Option<&mut Part> {
        self.parts.get_mut(number.checked_sub(self.read)?)
    }

    /// Wakes the reader if it waits for that part.
    fn tell_reader(&mut self, number: usize) {
        if number == self.read && matches!(self.reader, Reader::Waits(_)) {
            let now = Reader::Busy(Instant::now());
            if let Reader::Waits(waker) = std::mem::replace(&mut self.reader, now) {
                waker.wake();
            }
        }
    }
}
