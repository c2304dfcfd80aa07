//! Successful responses.

mod document;
mod finite;
pub mod negotiation;

use std::fmt::Write;
use std::time::Duration;

use axum::body::Body;
use axum::response::{IntoResponse, Response};
use bytes::Bytes;
use http::{HeaderName, HeaderValue, header};
use serde::Serialize;
use sha2::{Digest, Sha256};

use crate::problem::Problem;
pub use document::{Document, GZIP_SUFFIX};

/// Media type of most bodies.
pub const JSON: &str = "application/json";

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

/// A complete body with what goes with it.
#[derive(Debug)]
pub struct Answer {
    bytes: Bytes,
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
        let digest = repr_digest(&bytes);
        Self { bytes, media_type, digest, compute: None, effort: Effort::default() }
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
fn written(value: &impl Serialize) -> Result<Vec<u8>, Problem> {
    let mut bytes = Vec::with_capacity(TYPICAL);
    let mut serializer = serde_json::Serializer::new(&mut bytes);
    match value.serialize(finite::Finite(&mut serializer)) {
        Ok(()) => Ok(bytes),
        Err(error) => Err(Problem::internal(&error)),
    }
}

/// Room that most answers fit in without growing.
const TYPICAL: usize = 2048;

fn repr_digest(bytes: &[u8]) -> HeaderValue {
    let mut text = String::with_capacity(64);
    text.push_str("sha-256=:");
    base64::Engine::encode_string(&base64::prelude::BASE64_STANDARD, Sha256::digest(bytes), &mut text);
    text.push(':');
    HeaderValue::from_str(&text).unwrap_or_else(|_| HeaderValue::from_static(""))
}

impl IntoResponse for Answer {
    fn into_response(self) -> Response {
        let mut response = Response::new(Body::from(self.bytes));
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
