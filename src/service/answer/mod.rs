//! Successful responses.

mod chunks;
mod document;
mod finite;
pub mod negotiation;

use std::fmt::Write;
use std::sync::{Arc, OnceLock};
use std::time::Duration;

use axum::response::{IntoResponse, Response};
use bytes::Bytes;
use http::{HeaderName, HeaderValue, header};
use serde::Serialize;
use sha2::{Digest, Sha256};

use crate::problem::Problem;
pub use document::{Document, GZIP_SUFFIX};

/// Media type of most bodies.
pub const JSON: &str = "application/json";
/// Media type of streams: JSON values, a line each.
pub const NDJSON: &str = "application/x-ndjson";

/// RFC 9530.
pub const REPR_DIGEST: HeaderName = HeaderName::from_static("repr-digest");
/// W3C Server Timing.
pub const SERVER_TIMING: HeaderName = HeaderName::from_static("server-timing");

/// What a computation took and how it ended, for the log.
#[derive(Clone, Copy, Debug, Default)]
pub struct Effort {
    /// Integration steps, iterations or states, whatever the operation counts.
    pub steps: u64,
    /// How it ended, where it can be cut short.
    pub outcome: Option<&'static str>,
}

/// Of a response that is computed while it is sent: its effort, once it has ended.
#[derive(Clone, Debug)]
pub struct Ending(pub Arc<OnceLock<Effort>>);

/// A complete body with what goes with it.
#[derive(Debug)]
pub struct Answer {
    chunks: Vec<Bytes>,
    media_type: &'static str,
    digest: HeaderValue,
    compute: Option<Duration>,
    effort: Effort,
}

impl Answer {
    /// A body of that media type.
    #[must_use]
    pub fn new(media_type: &'static str, bytes: impl Into<Bytes>) -> Self {
        let bytes = bytes.into();
        let digest = Sha256::new_with_prefix(&bytes);
        Self::in_chunks(media_type, vec![bytes], digest)
    }

    /// A body in several pieces, and the digest of them all.
    #[must_use]
    pub fn in_chunks(media_type: &'static str, chunks: Vec<Bytes>, digest: Sha256) -> Self {
        let digest = repr_digest(digest);
        Self { chunks, media_type, digest, compute: None, effort: Effort::default() }
    }

    /// The JSON of `value`.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite: JSON has no way to write it, and `null` would hide it.
    pub fn json(value: &impl Serialize) -> Result<Self, Problem> {
        written(value).map(|bytes| Self::new(JSON, bytes))
    }

    /// The same with the time that computing took and its effort.
    #[must_use]
    pub fn computed(mut self, compute: Duration, effort: Effort) -> Self {
        self.compute = Some(compute);
        self.effort = effort;
        self
    }
}

/// The JSON of `value`, or `internal` if a number in it is not finite.
pub(crate) fn written(value: &impl Serialize) -> Result<Vec<u8>, Problem> {
    let mut bytes = Vec::with_capacity(TYPICAL);
    append(&mut bytes, value).map(|()| bytes)
}

/// Writes the JSON of `value` after what there is, or `internal` if a number in it is not finite.
pub(crate) fn append(bytes: &mut Vec<u8>, value: &impl Serialize) -> Result<(), Problem> {
    let mut serializer = serde_json::Serializer::new(bytes);
    value.serialize(finite::Finite(&mut serializer)).map_err(|error| Problem::internal(&error))
}

/// Room that most answers fit in without growing.
const TYPICAL: usize = 2048;

fn repr_digest(digest: Sha256) -> HeaderValue {
    let mut text = String::with_capacity(64);
    text.push_str("sha-256=:");
    base64::Engine::encode_string(&base64::prelude::BASE64_STANDARD, digest.finalize(), &mut text);
    text.push(':');
    HeaderValue::from_str(&text).unwrap_or_else(|_| HeaderValue::from_static(""))
}

impl IntoResponse for Answer {
    fn into_response(self) -> Response {
        let mut response = Response::new(chunks::body(self.chunks));
        let headers = response.headers_mut();
        headers.insert(header::CONTENT_TYPE, HeaderValue::from_static(self.media_type));
        headers.insert(REPR_DIGEST, self.digest);
        if let Some(compute) = self.compute {
            let mut timing = String::with_capacity(24);
            let _ = write!(timing, "compute;dur={:.3}", compute.as_secs_f64() * 1e3);
            if let Ok(value) = HeaderValue::from_str(&timing) {
                headers.insert(SERVER_TIMING, value);
            }
            response.extensions_mut().insert(self.effort);
        }
        response
    }
}
