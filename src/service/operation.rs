//! The way from a body to an answer, the same for every computation: decode, check, solve, write. Where each part
//! runs is decided here.

use std::time::{Duration, Instant};

use mechanics::interrupt::Stop;
use serde::Serialize;

use crate::answer::{Answer, Effort, JSON};
use crate::config::Limits;
use crate::decode::{Decode, Errors, Node, Path, parse};
use crate::extract::Submission;
use crate::pool::Context;
use crate::problem::{Problem, Slug};
use crate::state::App;

/// A computation that can be asked for.
pub trait Operation: Decode + 'static {
    /// The checked request: everything in it can be computed.
    type Task: Send + 'static;
    /// The answer's body.
    type Output: Serialize;
    /// The representations there are, the default first.
    const OFFERED: &'static [&'static str] = &[JSON];

    /// Checks what the members' own types could not, and reports every fault.
    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Self::Task>;

    /// About how long `solve` will take. What takes longer than [`IN_PLACE`] goes to the compute threads.
    fn cost(task: &Self::Task) -> Duration;

    /// The time that the request asks for; the server's own if it asks for none.
    fn wall_time(_task: &Self::Task) -> Option<Duration> {
        None
    }

    /// Computes.
    ///
    /// # Errors
    /// The problem that the mathematics met.
    fn solve(task: Self::Task, context: &Context) -> Result<Solved<Self::Output>, Problem>;
}

/// An answer's body, and its effort for the log.
#[derive(Debug)]
pub struct Solved<T> {
    /// The body.
    pub output: T,
    /// What it took.
    pub effort: Effort,
}

impl<T> From<T> for Solved<T> {
    fn from(output: T) -> Self {
        Self { output, effort: Effort::default() }
    }
}

/// A computation no longer than this is done on the thread that serves HTTP.
pub const IN_PLACE: Duration = Duration::from_micros(20);
/// A body no longer than this is decoded on the thread that serves HTTP.
pub const SMALL_BODY: usize = 64 << 10;
/// Memory granted to the tree of a body, in bytes per byte of the largest body. Numbers take 4 at most.
const TREE_FACTOR: usize = 8;

/// Answers a submission of the operation `O`.
///
/// # Errors
/// The problem with the request, or that the mathematics met.
pub async fn answer<O: Operation>(app: App, submission: Submission) -> Result<Answer, Problem> {
    submission.negotiate(O::OFFERED)?;
    let limits = app.config.limits;
    if submission.body().len() > SMALL_BODY {
        return app
            .pool
            .run(move |context| {
                let task = prepare::<O>(submission.body(), &limits)?;
                drop(submission);
                finish::<O>(task, &limits, context)
            })
            .await?;
    }
    let task = prepare::<O>(submission.body(), &limits)?;
    if O::cost(&task) <= IN_PLACE {
        finish::<O>(task, &limits, &Context::in_place(&app.pool))
    } else {
        app.pool.run(move |context| finish::<O>(task, &limits, context)).await?
    }
}

/// Items that are computed between two looks at the clock, a few microseconds each.
const PART: usize = 64;

/// Computes `each` of `0..total` on this and the idle compute threads, in order.
///
/// # Errors
/// `wall-time-limit` if the time granted is too short for all of them.
pub fn batch<R: Send + 'static>(
    context: &Context,
    total: usize,
    each: impl Fn(usize) -> R + Send + Sync + 'static,
) -> Result<Vec<R>, Problem> {
    let parts = context.parts(total, PART, move |part, interrupt| match interrupt.poll() {
        None => Ok(part.map(&each).collect::<Vec<R>>()),
        Some(stop) => Err(stop),
    });
    let mut all = Vec::with_capacity(total);
    for part in parts {
        match part {
            Ok(part) => all.extend(part),
            Err(Stop::Cancelled) => return Err(Problem::overloaded("The server is stopping")),
            Err(Stop::WallTime) => {
                let detail =
                    format!("The time granted was too short for all {total} items; none is returned");
                return Err(Problem::new(Slug::WallTimeLimit, detail));
            }
        }
    }
    Ok(all)
}

fn prepare<O: Operation>(body: &[u8], limits: &Limits) -> Result<O::Task, Problem> {
    let node: Node<'_> = parse(body, limits.body_bytes.saturating_mul(TREE_FACTOR))?;
    let mut errors = Errors::default();
    let task =
        O::decode(&node, Path::ROOT, &mut errors).and_then(|request| request.check(limits, &mut errors));
    errors.finish(task)
}

fn finish<O: Operation>(task: O::Task, limits: &Limits, context: &Context) -> Result<Answer, Problem> {
    let begun = Instant::now();
    context.grant(O::wall_time(&task).unwrap_or(limits.wall_time));
    let Solved { output, effort } = O::solve(task, context)?;
    if context.is_cancelled() {
        return Err(Problem::overloaded("The server is stopping"));
    }
    let compute = begun.elapsed();
    Ok(Answer::json(&output)?.computed(compute, effort))
}
