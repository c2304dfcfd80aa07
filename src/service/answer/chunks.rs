//! A complete body in several pieces, sent without being put together first.

use std::collections::VecDeque;
use std::convert::Infallible;
use std::pin::Pin;
use std::task::{Context, Poll};

use axum::body::Body;
use bytes::Bytes;
use http_body::{Frame, SizeHint};

/// The body that these pieces make.
pub(super) fn body(mut chunks: Vec<Bytes>) -> Body {
    if chunks.len() <= 1 {
        return chunks.pop().unwrap_or_default().into();
    }
    Body::new(Chunks(chunks.into()))
}

struct Chunks(VecDeque<Bytes>);

impl http_body::Body for Chunks {
    type Data = Bytes;
    type Error = Infallible;

    fn poll_frame(
        mut self: Pin<&mut Self>,
        _: &mut Context<'_>,
    ) -> Poll<Option<Result<Frame<Bytes>, Infallible>>> {
        Poll::Ready(self.0.pop_front().map(|chunk| Ok(Frame::data(chunk))))
    }

    fn is_end_stream(&self) -> bool {
        self.0.is_empty()
    }

    fn size_hint(&self) -> SizeHint {
        SizeHint::with_exact(self.0.iter().map(|chunk| chunk.len() as u64).sum())
    }
}
