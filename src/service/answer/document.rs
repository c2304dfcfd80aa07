//! Answers that depend on the build alone.

use axum::body::Body;
use axum::response::{IntoResponse, Response};
use bytes::Bytes;
use http::{HeaderMap, HeaderValue, StatusCode, header};
use serde::Serialize;
use sha2::{Digest, Sha256};

use super::{JSON, REPR_DIGEST, repr_digest, written};
use crate::problem::Problem;

/// A body that stays the same while the server runs, with its strong entity tag.
#[derive(Clone, Debug)]
pub struct Document {
    bytes: Bytes,
    media_type: &'static str,
    tag: HeaderValue,
    digest: HeaderValue,
}

/// Added to an entity tag when the body is sent gzipped: the tag is strong, so the two must differ.
pub const GZIP_SUFFIX: &str = "-gzip";

impl Document {
    /// A document of that media type.
    #[must_use]
    pub fn new(media_type: &'static str, bytes: impl Into<Bytes>) -> Self {
        let bytes = bytes.into();
        let hash = base64::Engine::encode(&base64::prelude::BASE64_URL_SAFE_NO_PAD, Sha256::digest(&bytes));
        let tag =
            HeaderValue::from_str(&format!("\"{hash}\"")).unwrap_or_else(|_| HeaderValue::from_static("*"));
        let digest = repr_digest(Sha256::new_with_prefix(&bytes));
        Self { bytes, media_type, tag, digest }
    }

    /// The JSON of `value`.
    ///
    /// # Errors
    /// `internal` if a number in it is not finite.
    pub fn json(value: &impl Serialize) -> Result<Self, Problem> {
        written(value).map(|bytes| Self::new(JSON, bytes))
    }

    /// The document, or 304 to a client that has it already.
    #[must_use]
    pub fn respond(&self, request: &HeaderMap) -> Response {
        let held = request.get_all(header::IF_NONE_MATCH).iter().any(|value| self.is_among(value));
        let mut response = if held {
            StatusCode::NOT_MODIFIED.into_response()
        } else {
            let mut response = Response::new(Body::from(self.bytes.clone()));
            response.headers_mut().insert(header::CONTENT_TYPE, HeaderValue::from_static(self.media_type));
            response.headers_mut().insert(REPR_DIGEST, self.digest.clone());
            response
        };
        let headers = response.headers_mut();
        headers.insert(header::ETAG, self.tag.clone());
        headers.insert(header::CACHE_CONTROL, HeaderValue::from_static("no-cache"));
        response
    }

    /// Weak comparison with a list of entity tags (RFC 9110, section 13.1.2).
    fn is_among(&self, tags: &HeaderValue) -> bool {
        let own = self.tag.to_str().unwrap_or_default().trim_matches('"');
        tags.to_str().unwrap_or_default().split(',').map(str::trim).any(|tag| {
            let opaque = tag.strip_prefix("W/").unwrap_or(tag).trim_matches('"');
            tag == "*" || opaque.strip_suffix(GZIP_SUFFIX).unwrap_or(opaque) == own
        })
    }
}
