//! The compute threads: niced, so that answers that need no computing stay quick; fed from a queue whose length is
//! bounded by places; and told to stop when nobody waits for the answer any more.
//!
//! Work is done in pieces of a few milliseconds. Between two of them a computation goes to the end of the queue, and a piece
//! that takes longer gives way when it polls, so that a huge one keeps no other waiting, however few threads there are.

mod watch;

use std::any::Any;
use std::cell::Cell;
use std::panic::{AssertUnwindSafe, catch_unwind, resume_unwind};
use std::sync::atomic::{AtomicBool, AtomicUsize, Ordering};
use std::sync::{Arc, Mutex, PoisonError};
use std::time::{Duration, Instant};

use crossbeam_channel::{Receiver, Sender};
use mechanics::interrupt::Interrupt;
use tokio::sync::{OwnedSemaphorePermit, Semaphore, oneshot};

use crate::config::Compute;
use crate::problem::Problem;
pub use watch::Watch;

/// The niceness of compute threads: the lowest priority.
const NICENESS: i32 = 19;

/// A piece of work that has taken so long gives way to others: longer than a piece is meant to take.
const TURN_TIME: Duration = Duration::from_millis(4);

thread_local! {
    /// When the piece of work under way on this compute thread had its turn.
    static TURN: Cell<Option<Instant>> = const { Cell::new(None) };
}

/// Does the next piece of some work and tells whether there is more to do. It catches its own panics.
type Job = Box<dyn FnMut() -> bool + Send>;
type Outcome<T> = Result<T, Box<dyn Any + Send>>;

/// The compute threads and their queue.
#[derive(Clone, Debug)]
pub struct Pool(Arc<Shared>);

#[derive(Debug)]
struct Shared {
    jobs: Sender<Job>,
    waiting: Receiver<Job>,
    places: Arc<Semaphore>,
    closing: Arc<AtomicBool>,
    threads: usize,
    /// Threads that are to end because one that they stood in for is back.
    surplus: AtomicUsize,
}

impl Pool {
    /// Starts the threads.
    ///
    /// # Errors
    /// The operating system's, if it grants no thread.
    pub fn start(config: Compute) -> std::io::Result<Self> {
        let (jobs, waiting) = crossbeam_channel::unbounded();
        let pool = Self(Arc::new(Shared {
            jobs,
            waiting,
            places: Arc::new(Semaphore::new(config.threads + config.queue)),
            closing: Arc::default(),
            threads: config.threads,
            surplus: AtomicUsize::new(0),
        }));
        for index in 0..config.threads {
            pool.spawn(format!("compute-{index}"))?;
        }
        Ok(pool)
    }

    fn spawn(&self, name: String) -> std::io::Result<()> {
        let shared = Arc::clone(&self.0);
        std::thread::Builder::new().name(name).spawn(move || compute(&shared)).map(drop)
    }

    /// A place for one computation.
    ///
    /// # Errors
    /// `overloaded` at once if every place is taken.
    pub fn place(&self) -> Result<Place, Problem> {
        let Ok(permit) = Arc::clone(&self.0.places).try_acquire_owned() else {
            return Err(Problem::overloaded(
                "As many computations as the server takes are under way or wait for a thread or for their readers",
            ));
        };
        let held = Held {
            watch: Arc::new(Watch::new(self)),
            permit: Mutex::new(Some(permit)),
            begun: AtomicBool::new(false),
            busy: AtomicBool::new(false),
        };
        Ok(Place { pool: self.clone(), held: Arc::new(held) })
    }

    /// Runs `work` on a compute thread. Dropping the future cancels it at its next poll.
    ///
    /// # Errors
    /// `overloaded` at once if every place is taken.
    pub async fn run<T: Send + 'static>(
        &self,
        work: impl FnOnce(&Context) -> T + Send + 'static,
    ) -> Result<T, Problem> {
        self.place()?.run(work).await
    }

    /// How many computations would be taken now.
    #[must_use]
    pub fn free_places(&self) -> usize {
        self.0.places.available_permits()
    }

    /// How many threads compute.
    #[must_use]
    pub fn threads(&self) -> usize {
        self.0.threads
    }

    /// Cancels every computation that runs or waits, and those to come.
    pub fn close(&self) {
        self.0.closing.store(true, Ordering::Relaxed);
    }

    /// Lets another thread take this one's place while it waits for something, or does what cannot be done in pieces.
    pub fn stand_in<T>(&self, work: impl FnOnce() -> T) -> T {
        let replaced = self.spawn("compute-stand-in".to_owned());
        if let Err(error) = &replaced {
            tracing::warn!(%error, "no thread stands in for another");
        }
        // One thread is too many from then on, even if the work panics.
        let _back = replaced.is_ok().then_some(Back(&self.0.surplus));
        work()
    }

    fn is_closing(&self) -> bool {
        self.0.closing.load(Ordering::Relaxed)
    }

    /// On a compute thread whose piece of work has taken its turn while others wait: lets each of these have its turn
    /// before it goes on.
    fn give_way(&self) {
        if self.0.waiting.is_empty() {
            return;
        }
        let had_its_turn = TURN.get().is_some_and(|begun| begun.elapsed() >= TURN_TIME);
        // Without a thread to take this one's place it cannot wait: it may be the only one.
        if !had_its_turn || self.spawn("compute-stand-in".to_owned()).is_err() {
            return;
        }
        let (done, back) = crossbeam_channel::bounded(1);
        let shared = Arc::clone(&self.0);
        // At the end of the queue. The thread that comes to it ends, and this one goes on.
        self.send(Box::new(move || {
            shared.surplus.fetch_add(1, Ordering::Relaxed);
            let _ = done.send(());
            false
        }));
        let _ = back.recv();
        TURN.set(Some(Instant::now()));
    }

    fn send(&self, job: Job) {
        // The queue cannot be closed: both of its ends live as long as the pool.
        let _ = self.0.jobs.send(job);
    }
}

/// Says, when dropped, that a thread is back that another one stood in for.
struct Back<'a>(&'a AtomicUsize);

impl Drop for Back<'_> {
    fn drop(&mut self) {
        self.0.fetch_add(1, Ordering::Relaxed);
    }
}

/// The thread's own life: pieces of jobs, and those of others in between.
fn compute(shared: &Shared) {
    let thread = rustix::thread::gettid();
    if let Err(error) = rustix::process::setpriority_process(Some(thread), NICENESS) {
        tracing::warn!(%error, "compute threads run at normal priority");
    }
    while let Ok(mut job) = shared.waiting.recv() {
        loop {
            TURN.set(Some(Instant::now()));
            let more = job();
            TURN.set(None);
            if !more {
                break;
            }
            if !shared.waiting.is_empty() || shared.surplus.load(Ordering::Relaxed) > 0 {
                let _ = shared.jobs.send(job);
                break;
            }
        }
        let one_less = |surplus: usize| surplus.checked_sub(1);
        if shared.surplus.fetch_update(Ordering::Relaxed, Ordering::Relaxed, one_less).is_ok() {
            return;
        }
    }
}

/// One of the computations that the pool has room for. Dropping it cancels the computation at its next poll.
#[derive(Debug)]
pub struct Place {
    pool: Pool,
    held: Arc<Held>,
}

/// What is given back when the last thread has left a computation: it lives as long as that, not as long as the
/// client's interest in it.
#[derive(Debug)]
struct Held {
    watch: Arc<Watch>,
    permit: Mutex<Option<OwnedSemaphorePermit>>,
    begun: AtomicBool,
    /// Whether a thread is at work in it or called to it.
    busy: AtomicBool,
}

impl Held {
    fn begin(&self) {
        if !self.begun.swap(true, Ordering::Relaxed) {
            tracing::debug!("computation begun");
        }
    }

    /// Gives the place back, if that has not been done before.
    fn release(&self) -> bool {
        self.permit.lock().unwrap_or_else(PoisonError::into_inner).take().is_some()
    }
}

impl Drop for Held {
    fn drop(&mut self) {
        let unfinished = self.release();
        if unfinished && self.begun.load(Ordering::Relaxed) {
            tracing::debug!(polls = self.watch.polls(), "computation cancelled");
        }
    }
}

impl Place {
    /// What the computation polls.
    #[must_use]
    pub fn watch(&self) -> &Arc<Watch> {
        &self.held.watch
    }

    /// The pool that it is a place in.
    #[must_use]
    pub fn pool(&self) -> &Pool {
        &self.pool
    }

    /// Runs `work` on a compute thread, in one piece. It is not run if it is cancelled before it begins.
    ///
    /// # Errors
    /// `overloaded` if the server stops.
    pub async fn run<T: Send + 'static>(
        &self,
        work: impl FnOnce(&Context) -> T + Send + 'static,
    ) -> Result<T, Problem> {
        let (answer, answered) = oneshot::channel::<Outcome<T>>();
        let context = Context { watch: Arc::clone(&self.held.watch) };
        let mut work = Some((work, answer));
        self.enlist(move || {
            if let Some((work, answer)) = work.take().filter(|_| !context.is_cancelled()) {
                let _ = answer.send(catch_unwind(AssertUnwindSafe(|| work(&context))));
            }
            false
        });
        let answered = answered.await;
        self.held.busy.store(false, Ordering::Relaxed);
        match answered {
            Ok(Ok(value)) => Ok(value),
            Ok(Err(panic)) => resume_unwind(panic),
            Err(_) => Err(Problem::overloaded("The server is stopping")),
        }
    }

    /// Has a compute thread do `piece` after `piece` as long as it says that there is more; cancelled or not.
    pub fn enlist(&self, mut piece: impl FnMut() -> bool + Send + 'static) {
        let held = Arc::clone(&self.held);
        held.busy.store(true, Ordering::Relaxed);
        self.pool.send(Box::new(move || {
            if !held.watch.is_cancelled() {
                held.begin();
            }
            piece()
        }));
    }

    /// Gives the place back at once: nothing is left to compute.
    pub fn finish(&self) {
        self.held.release();
    }
}

impl Drop for Place {
    fn drop(&mut self) {
        self.held.watch.cancel();
        if !self.held.busy.load(Ordering::Relaxed) {
            self.held.release();
        }
    }
}

/// What a computation gets from the service: its interrupt.
#[derive(Clone, Debug)]
pub struct Context {
    watch: Arc<Watch>,
}

impl Context {
    /// For a computation on the thread that asks, of a few microseconds.
    #[must_use]
    pub fn in_place(pool: &Pool) -> Self {
        Self { watch: Arc::new(Watch::new(pool)) }
    }

    /// Starts the clock: `wall_time` from now on, polling says that the time is up. Only the first call counts.
    pub fn grant(&self, wall_time: Duration) {
        self.watch.run_out_in(wall_time);
    }

    /// What the computation polls.
    #[must_use]
    pub fn interrupt(&self) -> &dyn Interrupt {
        &*self.watch
    }

    /// Whether the answer is of no use any more.
    #[must_use]
    pub fn is_cancelled(&self) -> bool {
        self.watch.is_cancelled()
    }
}
