//! The compute threads: niced, so that answers that need no computing stay quick; fed from a bounded queue; and
//! told to stop when nobody waits for the answer any more.
//!
//! A work-stealing pool would be no help here: a thread that waits for its own parts could pick up a foreign
//! computation and keep its own client waiting until that one ends.

use std::any::Any;
use std::ops::Range;
use std::panic::{AssertUnwindSafe, catch_unwind, resume_unwind};
use std::sync::atomic::{AtomicBool, AtomicU64, AtomicUsize, Ordering};
use std::sync::{Arc, Condvar, Mutex, OnceLock, PoisonError};
use std::time::{Duration, Instant};

use crossbeam_channel::{Receiver, Sender};
use mechanics::interrupt::{Interrupt, Stop};
use tokio::sync::{OwnedSemaphorePermit, Semaphore, oneshot};

use crate::config::Compute;
use crate::problem::Problem;

/// The niceness of compute threads: the lowest priority.
const NICENESS: i32 = 19;

type Job = Box<dyn FnOnce() + Send>;
type Outcome<T> = Result<T, Box<dyn Any + Send>>;

/// The compute threads and their queue.
#[derive(Clone, Debug)]
pub struct Pool {
    jobs: Sender<Job>,
    places: Arc<Semaphore>,
    closing: Arc<AtomicBool>,
    threads: usize,
}

impl Pool {
    /// Starts the threads.
    ///
    /// # Errors
    /// The operating system's, if it grants no thread.
    pub fn start(config: Compute) -> std::io::Result<Self> {
        let (jobs, waiting) = crossbeam_channel::unbounded::<Job>();
        for index in 0..config.threads {
            let waiting = waiting.clone();
            std::thread::Builder::new().name(format!("compute-{index}")).spawn(move || compute(&waiting))?;
        }
        let places = Arc::new(Semaphore::new(config.threads + config.queue));
        Ok(Self { jobs, places, closing: Arc::default(), threads: config.threads })
    }

    /// Runs `work` on a compute thread. Dropping the future cancels it at its next poll.
    ///
    /// # Errors
    /// `overloaded` at once if every place is taken.
    pub async fn run<T: Send + 'static>(
        &self,
        work: impl FnOnce(&Context) -> T + Send + 'static,
    ) -> Result<T, Problem> {
        let Ok(permit) = Arc::clone(&self.places).try_acquire_owned() else {
            return Err(Problem::overloaded("Every compute thread is busy and the queue is full"));
        };
        let context = Context { watch: Arc::new(Watch::new(&self.closing)), pool: Some(self.clone()) };
        let _guard = CancelOnDrop(Arc::clone(&context.watch));
        let (answer, answered) = oneshot::channel();
        let job: Job = Box::new(move || run(permit, &context, work, answer));
        if self.jobs.send(job).is_err() {
            return Err(Problem::overloaded("The server is stopping"));
        }
        match answered.await {
            Ok(Ok(value)) => Ok(value),
            Ok(Err(panic)) => resume_unwind(panic),
            Err(_) => Err(Problem::overloaded("The server is stopping")),
        }
    }

    /// How many computations would be taken now.
    #[must_use]
    pub fn free_places(&self) -> usize {
        self.places.available_permits()
    }

    /// Cancels every computation that runs or waits, and those to come.
    pub fn close(&self) {
        self.closing.store(true, Ordering::Relaxed);
    }
}

/// The thread's own life: jobs until there can be no more. A job catches its own panics.
fn compute(waiting: &Receiver<Job>) {
    let thread = rustix::thread::gettid();
    if let Err(error) = rustix::process::setpriority_process(Some(thread), NICENESS) {
        tracing::warn!(%error, "compute threads run at normal priority");
    }
    while let Ok(job) = waiting.recv() {
        job();
    }
}

/// The permit lives as long as the computation, not as long as the client's interest in it.
fn run<T>(
    permit: OwnedSemaphorePermit,
    context: &Context,
    work: impl FnOnce(&Context) -> T,
    answer: oneshot::Sender<Outcome<T>>,
) {
    if context.watch.poll() == Some(Stop::Cancelled) {
        return;
    }
    tracing::debug!("computation begun");
    let outcome = catch_unwind(AssertUnwindSafe(|| work(context)));
    drop(permit);
    if context.watch.is_cancelled() {
        tracing::debug!(polls = context.watch.polls(), "computation cancelled");
    }
    let _ = answer.send(outcome);
}

/// What a computation polls: its time and its client's presence.
#[derive(Debug)]
pub struct Watch {
    cancelled: AtomicBool,
    closing: Arc<AtomicBool>,
    deadline: OnceLock<Instant>,
    polls: AtomicU64,
}

impl Watch {
    fn new(closing: &Arc<AtomicBool>) -> Self {
        Self {
            cancelled: AtomicBool::new(false),
            closing: Arc::clone(closing),
            deadline: OnceLock::new(),
            polls: AtomicU64::new(0),
        }
    }

    fn is_cancelled(&self) -> bool {
        self.cancelled.load(Ordering::Relaxed) || self.closing.load(Ordering::Relaxed)
    }

    fn polls(&self) -> u64 {
        self.polls.load(Ordering::Relaxed)
    }
}

impl Interrupt for Watch {
    fn poll(&self) -> Option<Stop> {
        self.polls.fetch_add(1, Ordering::Relaxed);
        if self.is_cancelled() {
            return Some(Stop::Cancelled);
        }
        let late = self.deadline.get().is_some_and(|deadline| Instant::now() >= *deadline);
        late.then_some(Stop::WallTime)
    }
}

struct CancelOnDrop(Arc<Watch>);

impl Drop for CancelOnDrop {
    fn drop(&mut self) {
        self.0.cancelled.store(true, Ordering::Relaxed);
    }
}

/// What a computation gets from the service: its interrupt and the other compute threads.
#[derive(Clone, Debug)]
pub struct Context {
    watch: Arc<Watch>,
    pool: Option<Pool>,
}

impl Context {
    /// For a computation on the thread that asks, of a few microseconds.
    #[must_use]
    pub fn in_place(pool: &Pool) -> Self {
        Self { watch: Arc::new(Watch::new(&pool.closing)), pool: None }
    }

    /// Starts the clock: `wall_time` from now on, polling says [`Stop::WallTime`]. Only the first call counts.
    pub fn grant(&self, wall_time: Duration) {
        self.watch.deadline.get_or_init(|| Instant::now() + wall_time);
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

    /// Computes `each` of the parts of `0..total`, `size` items a part, on this and the idle compute threads, and
    /// returns the results in order. The split does not depend on the number of threads.
    pub fn parts<R: Send + 'static>(
        &self,
        total: usize,
        size: usize,
        each: impl Fn(Range<usize>, &dyn Interrupt) -> R + Send + Sync + 'static,
    ) -> Vec<R> {
        let size = size.max(1);
        let count = total.div_ceil(size);
        let part = move |index: usize| index * size..total.min((index + 1) * size);
        let Some(pool) = self.pool.as_ref().filter(|pool| pool.threads > 1 && count > 1) else {
            return (0..count).map(|index| each(part(index), self.interrupt())).collect();
        };
        let watch = Arc::clone(&self.watch);
        let batch = Arc::new(Batch {
            each: move |index| each(part(index), &*watch),
            count,
            next: AtomicUsize::new(0),
            results: Mutex::new((0..count).map(|_| None).collect()),
            done: Condvar::new(),
        });
        for _ in 1..pool.threads.min(count) {
            let (helped, jobs) = (Arc::clone(&batch), pool.jobs.clone());
            // A queue that takes no more is one of a server that stops: this thread then does it all.
            let _ = pool.jobs.send(Box::new(move || help(helped, &jobs)));
        }
        while batch.step() {}
        batch.collect()
    }
}

/// Parts of one computation, taken by whichever thread is free.
struct Batch<R, F> {
    each: F,
    count: usize,
    next: AtomicUsize,
    results: Mutex<Vec<Option<Outcome<R>>>>,
    done: Condvar,
}

impl<R, F: Fn(usize) -> R> Batch<R, F> {
    /// Does one part, if there is one that nobody has taken.
    fn step(&self) -> bool {
        let index = self.next.fetch_add(1, Ordering::Relaxed);
        if index >= self.count {
            return false;
        }
        let outcome = catch_unwind(AssertUnwindSafe(|| (self.each)(index)));
        self.results.lock().unwrap_or_else(PoisonError::into_inner)[index] = Some(outcome);
        self.done.notify_one();
        true
    }

    /// Waits for the parts that other threads are at; each of them is running.
    fn collect(&self) -> Vec<R> {
        let results = self.results.lock().unwrap_or_else(PoisonError::into_inner);
        let unfinished = |results: &mut Vec<Option<Outcome<R>>>| results.iter().any(Option::is_none);
        let mut results = self.done.wait_while(results, unfinished).unwrap_or_else(PoisonError::into_inner);
        let outcomes = std::mem::take(&mut *results);
        outcomes
            .into_iter()
            .flatten()
            .map(|outcome| outcome.unwrap_or_else(|panic| resume_unwind(panic)))
            .collect()
    }
}

/// Does parts of a foreign computation, and goes to the end of the queue between them if others wait.
fn help<R, F>(batch: Arc<Batch<R, F>>, jobs: &Sender<Job>)
where
    R: Send + 'static,
    F: Fn(usize) -> R + Send + Sync + 'static,
{
    while batch.step() {
        if !jobs.is_empty() {
            let again = jobs.clone();
            let _ = jobs.send(Box::new(move || help(batch, &again)));
            return;
        }
    }
}
