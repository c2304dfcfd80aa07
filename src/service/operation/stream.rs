//! Answers sent while they are computed: a line for what all items have in common, a line for each item, and a line for
//! their sum (newline-delimited JSON). A failure on the way is a line too, and then the last.

use std::io;
use std::pin::Pin;
use std::sync::{Arc, OnceLock, Weak};
use std::task::{Context, Poll};
use std::time::Duration;

use axum::body::Body;
use axum::response::Response;
use bytes::Bytes;
use futures_util::Stream;
use http::{HeaderValue, header};

use super::items::{Lines, Out};
use super::run::{Run, Shared};
use crate::answer::{Effort, Ending, NDJSON};
use crate::extract::Origin;
use crate::pool::Place;
use crate::problem::Problem;

const PROBLEM: &str = "problem";

/// What the log says of a stream whose client stopped reading.
const NOT_READ: &str = "send_timeout";

/// The answer of `lines`, computed in `place` while it is sent.
///
/// # Errors
/// The problem with the first line; later ones are sent as lines.
pub(super) fn response(
    lines: Arc<dyn Lines>,
    place: Place,
    wall_time: Duration,
    patience: Duration,
    origin: Origin,
) -> Result<Response, Problem> {
    let first = line(|out| lines.header(out))?;
    let run = Run::new(place, Arc::clone(&lines) as _, true, wall_time);
    tokio::spawn(watch_reader(run.shared(), patience));
    let ending = Arc::new(OnceLock::new());
    let body = LineStream {
        first: Some(first),
        run: Some(run),
        lines,
        patience,
        origin,
        ending: Arc::clone(&ending),
    };
    let mut response = Response::new(Body::from_stream(body));
    response.headers_mut().insert(header::CONTENT_TYPE, HeaderValue::from_static(NDJSON));
    response.extensions_mut().insert(Ending(ending));
    Ok(response)
}

/// Ends the computation of a stream whose reader has not taken the next piece for as long as `patience`. On connections
/// of many streams that is all that can be done; a connection that takes nothing at all is closed by the server.
async fn watch_reader(stream: Weak<Shared>, patience: Duration) {
    while let Some(shared) = stream.upgrade() {
        let lies_for = shared.lies_for();
        if lies_for >= patience {
            shared.give_up();
            tracing::info!(patience_ms = patience.as_millis(), "stream given up: its client does not read");
            return;
        }
        drop(shared);
        tokio::time::sleep(patience.saturating_sub(lies_for).max(Duration::from_millis(1))).await;
    }
}

/// The text of one line, written by `write`.
fn line(write: impl FnOnce(&mut Out<'_>) -> Result<(), Problem>) -> Result<Bytes, Problem> {
    let mut written = Vec::new();
    let mut take = |chunk: Bytes| {
        written.extend_from_slice(&chunk);
        Ok(())
    };
    let mut out = Out::new(true, &mut take);
    write(&mut out)?;
    out.finish()?;
    Ok(written.into())
}

struct LineStream {
    first: Option<Bytes>,
    /// None once everything is computed, or something went wrong.
    run: Option<Run>,
    lines: Arc<dyn Lines>,
    patience: Duration,
    origin: Origin,
    ending: Arc<OnceLock<Effort>>,
}

impl LineStream {
    /// Tells the log how it ended before its end, and what it took so far; without an outcome its client has gone.
    fn end(&self, outcome: Option<&'static str>) {
        let _ = self.ending.set(Effort { outcome, ..self.lines.effort() });
    }

    /// The last line: the summary, or what went wrong.
    fn last(&mut self, end: Result<(), Problem>) -> Bytes {
        if let Some(place) = self.run.take().and_then(Run::into_place) {
            place.finish();
        }
        match end.and_then(|()| line(|out| self.lines.summary(out))) {
            Ok(summary) => {
                let _ = self.ending.set(self.lines.effort());
                summary
            }
            Err(problem) => {
                let Origin { path, request_id } = &self.origin;
                problem.log(request_id);
                self.end(Some(problem.slug().name()));
                line(|out| out.line(PROBLEM, &problem.members(path, request_id))).unwrap_or_default()
            }
        }
    }
}

impl Stream for LineStream {
    type Item = io::Result<Bytes>;

    fn poll_next(mut self: Pin<&mut Self>, context: &mut Context<'_>) -> Poll<Option<io::Result<Bytes>>> {
        if let Some(first) = self.first.take() {
            return Poll::Ready(Some(Ok(first)));
        }
        let Some(run) = &self.run else { return Poll::Ready(None) };
        if run.is_given_up() {
            self.end(Some(NOT_READ));
            self.run = None;
            return Poll::Ready(Some(Err(io::ErrorKind::TimedOut.into())));
        }
        run.poll_next(context).map(|next| match next {
            Some(Ok(chunk)) => Some(Ok(chunk)),
            Some(Err(problem)) => Some(Ok(self.last(Err(problem)))),
            None => Some(Ok(self.last(Ok(())))),
        })
    }
}

impl Drop for LineStream {
    fn drop(&mut self) {
        let Some(run) = &self.run else { return };
        // The connection may have given up first, and have asked for more on the way.
        let not_read = run.is_given_up() || run.lay_for(self.patience / 2);
        self.end(not_read.then_some(NOT_READ));
    }
}
