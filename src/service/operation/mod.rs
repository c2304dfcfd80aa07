//! The way from a body to an answer, the same for every computation: decode, check, compute, write. Where each part
//! runs is decided here.

mod items;
mod run;
mod stream;

use std::sync::Arc;
use std::time::{Duration, Instant};

use axum::response::{IntoResponse, Response};
use bytes::Bytes;
use serde::Serialize;
use sha2::{Digest, Sha256};

use crate::answer::{Answer, Effort, JSON, NDJSON};
use crate::config::Limits;
use crate::decode::{Decode, Errors, Node, Path, parse};
use crate::extract::{Origin, Submission};
use crate::pool::{Context, Place};
use crate::problem::Problem;
use crate::state::App;

pub use items::{Items, LARGEST_PART, Lines, Out, SMALLEST_PART, Tally, each};
use run::Run;

/// A computation that can be asked for.
pub trait Operation: Decode + 'static {
    /// The checked request: everything in it can be computed.
    type Task: Send + 'static;
    /// The representations there are, the default first.
    const OFFERED: &'static [&'static str] = &[JSON];

    /// Checks what the members' own types could not, and reports every fault. Where the answer is streamed, `limits` has
    /// no bound on the numbers in it.
    fn check(self, limits: &Limits, errors: &mut Errors) -> Option<Self::Task>;

    /// About how long it will take. What takes longer than [`IN_PLACE`] goes to the compute threads.
    fn cost(task: &Self::Task) -> Duration;

    /// The time that the request asks for; the server's own if it asks for none.
    fn wall_time(_task: &Self::Task) -> Option<Duration> {
        None
    }

    /// The computation; one that gives [`Work::Lines`] where `streamed`.
    fn work(task: Self::Task, streamed: bool) -> Work;
}

/// A computation in one piece.
pub type Solve = Box<dyn FnOnce(&Context) -> Result<Answer, Problem> + Send>;

/// A computation that is ready to begin.
pub enum Work {
    /// In one piece.
    Whole(Solve),
    /// Item by item, in parts that compute threads share, for an answer that is sent when it is complete.
    Items(Arc<dyn Items>),
    /// The same for an answer that is sent while it is computed.
    Lines(Arc<dyn Lines>),
}

impl Work {
    /// The computation of an answer's body and of its effort, in one piece.
    pub fn whole<T: Serialize>(
        solve: impl FnOnce(&Context) -> Result<(T, Effort), Problem> + Send + 'static,
    ) -> Self {
        Self::Whole(Box::new(move |context| {
            let begun = Instant::now();
            let (output, effort) = solve(context)?;
            let compute = begun.elapsed();
            Ok(Answer::json(&output)?.computed(compute, effort))
        }))
    }
}

/// A computation no longer than this is done on the thread that serves HTTP.
pub const IN_PLACE: Duration = Duration::from_micros(20);
/// A body no longer than this is decoded, or its digest worked out, on the thread that serves HTTP.
pub const SMALL_BODY: usize = 64 << 10;
/// A body longer than this takes some tens of milliseconds to decode, which cannot be done in parts: another thread
/// computes meanwhile.
const LARGE_BODY: usize = 4 << 20;
/// Memory granted to the tree of a body, in bytes per byte of the largest body. Numbers take 4 at most.
const TREE_FACTOR: usize = 8;
/// Bytes of an answer whose digest is worked out in one piece, some tenths of a millisecond.
const DIGESTED: usize = 1 << 20;

/// Answers a submission of the operation `O`.
///
/// # Errors
/// The problem with the request, or that the mathematics met.
pub async fn answer<O: Operation>(app: App, submission: Submission) -> Result<Response, Problem> {
    let streamed = submission.negotiate(O::OFFERED)? == NDJSON;
    let mut limits = app.config.limits;
    if streamed {
        limits.sample_values = u64::MAX;
    }
    let (task, place, origin) = if submission.body().len() > SMALL_BODY {
        let place = app.pool.place()?;
        let pool = app.pool.clone();
        let prepare = move |_: &Context| match submission.body().len() {
            0..=LARGE_BODY => prepare::<O>(submission, &limits),
            _ => pool.stand_in(|| prepare::<O>(submission, &limits)),
        };
        let (task, origin) = place.run(prepare).await??;
        (task, Some(place), origin)
    } else {
        let (task, origin) = prepare::<O>(submission, &limits)?;
        (task, None, origin)
    };
    let wall_time = O::wall_time(&task).unwrap_or(limits.wall_time);
    let in_place = place.is_none() && O::cost(&task) <= IN_PLACE;
    let place = || place.map_or_else(|| app.pool.place(), Ok);
    let answer = match O::work(task, streamed) {
        Work::Lines(lines) => {
            return stream::response(lines, place()?, wall_time, app.config.times.send, origin);
        }
        Work::Whole(solve) if in_place => solve(&granted(&Context::in_place(&app.pool), wall_time)),
        Work::Whole(solve) => place()?.run(move |context| solve(&granted(context, wall_time))).await?,
        Work::Items(items) if in_place => {
            at_once(&*items, &granted(&Context::in_place(&app.pool), wall_time))
        }
        Work::Items(items) => collected(items, place()?, wall_time).await,
    };
    answer.map(IntoResponse::into_response)
}

fn granted(context: &Context, wall_time: Duration) -> Context {
    context.grant(wall_time);
    context.clone()
}

/// Decodes and checks. The body and its tree, which may be large, are gone before the checked request is put together.
fn prepare<O: Operation>(submission: Submission, limits: &Limits) -> Result<(O::Task, Origin), Problem> {
    let mut errors = Errors::default();
    let request = {
        let node: Node<'_> = parse(submission.body(), limits.body_bytes.saturating_mul(TREE_FACTOR))?;
        O::decode(&node, Path::ROOT, &mut errors)
    };
    let origin = submission.into_origin();
    let task = request.and_then(|request| request.check(limits, &mut errors));
    errors.finish(task).map(|task| (task, origin))
}

/// The answer of a few items, on this thread.
fn at_once(items: &dyn Items, context: &Context) -> Result<Answer, Problem> {
    let begun = Instant::now();
    let mut chunks = Vec::new();
    let mut take = |chunk: Bytes| {
        chunks.push(chunk);
        Ok(())
    };
    let mut out = Out::new(false, &mut take);
    items.compute(0..items.count(), &mut out, context.interrupt())?;
    out.finish()?;
    let compute = begun.elapsed();
    let chunks = enveloped(items, chunks)?;
    let mut digest = Sha256::new();
    update(&mut digest, &chunks);
    Ok(Answer::in_chunks(JSON, chunks, digest).computed(compute, items.effort()))
}

/// The answer of many items, each part of them computed and written by a compute thread.
async fn collected(items: Arc<dyn Items>, place: Place, wall_time: Duration) -> Result<Answer, Problem> {
    let run = Run::new(place, Arc::clone(&items), false, wall_time);
    let mut chunks = Vec::new();
    while let Some(chunk) = run.next().await {
        chunks.push(chunk?);
    }
    let compute = run.elapsed();
    let chunks = enveloped(&*items, chunks)?;
    let mut digest = Sha256::new();
    if let Some(place) = run.into_place() {
        digest = digested(&chunks, &place).await?;
        place.finish();
    }
    Ok(Answer::in_chunks(JSON, chunks, digest).computed(compute, items.effort()))
}

/// The digest of a body; that of a long one is worked out by compute threads, piece by piece.
async fn digested(mut rest: &[Bytes], place: &Place) -> Result<Sha256, Problem> {
    let mut digest = Sha256::new();
    if rest.iter().map(Bytes::len).sum::<usize>() <= SMALL_BODY {
        update(&mut digest, rest);
        return Ok(digest);
    }
    while !rest.is_empty() {
        let mut size = 0;
        let fits = |chunk: &&Bytes| {
            size += chunk.len();
            size <= DIGESTED
        };
        let (piece, others) = rest.split_at(rest.iter().take_while(fits).count().max(1));
        let piece = piece.to_vec();
        let hash = move |_: &Context| {
            update(&mut digest, &piece);
            digest
        };
        digest = place.run(hash).await?;
        rest = others;
    }
    Ok(digest)
}

fn update(digest: &mut Sha256, chunks: &[Bytes]) {
    for chunk in chunks {
        digest.update(chunk);
    }
}

/// The items, each after a comma, in the array that the envelope ends with.
fn enveloped(items: &dyn Items, mut chunks: Vec<Bytes>) -> Result<Vec<Bytes>, Problem> {
    const END: &[u8] = b"]}";
    let mut envelope = items.envelope()?;
    debug_assert!(envelope.ends_with(b"[]}"), "the items go into the last member");
    envelope.truncate(envelope.len() - END.len());
    if let [first, ..] = &mut *chunks {
        let comma = first.split_to(1);
        debug_assert_eq!(&*comma, b",");
    }
    // A short answer is one piece, as its client gets it.
    if let [only] = &*chunks
        && only.len() <= SMALL_BODY
    {
        envelope.extend_from_slice(only);
        envelope.extend_from_slice(END);
        return Ok(vec![envelope.into()]);
    }
    chunks.insert(0, envelope.into());
    chunks.push(Bytes::from_static(END));
    Ok(chunks)
}
