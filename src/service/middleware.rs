//! What happens around every request, in one function: its id, the body of its problem, the headers that all
//! responses have, and its line in the log.

use std::convert::Infallible;
use std::panic::AssertUnwindSafe;
use std::pin::Pin;
use std::sync::Arc;
use std::task::{Context, Poll, ready};
use std::time::Instant;

use axum::body::Body;
use axum::extract::{MatchedPath, Request, State};
use axum::middleware::Next;
use axum::response::Response;
use bytes::Bytes;
use futures_util::FutureExt;
use http::{HeaderMap, HeaderName, HeaderValue, Method, StatusCode, Uri, header};
use http_body::{Body as _, Frame};
use tower::{ServiceExt, service_fn};
use tower_http::CompressionLevel;
use tower_http::compression::Compression;

use crate::answer::{Effort, Ending, GZIP_SUFFIX, REPR_DIGEST};
use crate::extract::RequestId;
use crate::problem::{self, Problem, Slug};
use crate::state::App;

/// Name of the request id's field.
pub const X_REQUEST_ID: HeaderName = HeaderName::from_static("x-request-id");
const TRACEPARENT: HeaderName = HeaderName::from_static("traceparent");
/// Longest request id that is taken over.
const LONGEST_ID: usize = 128;
/// Shorter bodies gain nothing from a content coding.
const WORTH_CODING: u64 = 1024;

/// Wraps the handling of every request.
pub async fn observe(State(_app): State<App>, mut request: Request, next: Next) -> Response {
    let mut line = Line::new(&request);
    request.extensions_mut().insert(RequestId(line.id.clone()));
    let accept_encoding = request.headers().get(header::ACCEPT_ENCODING).cloned();
    let mut response = match AssertUnwindSafe(next.run(request)).catch_unwind().await {
        Ok(response) => response,
        Err(payload) => axum::response::IntoResponse::into_response(Problem::panicked(&*payload)),
    };
    if response.status().is_client_error() || response.status().is_server_error() {
        response = explain(response, &line);
    }
    line.effort = response.extensions().get::<Effort>().copied().unwrap_or_default();
    if let Some(accepted) = accept_encoding
        && response.body().size_hint().lower() >= WORTH_CODING
    {
        response = encode(response, accepted).await;
    }
    let headers = response.headers_mut();
    headers.append(header::VARY, HeaderValue::from_static("accept, accept-encoding"));
    headers.insert(X_REQUEST_ID, line.id.clone());
    headers.insert(header::X_CONTENT_TYPE_OPTIONS, HeaderValue::from_static("nosniff"));
    line.status = response.status().as_u16();
    line.ending = response.extensions().get().cloned();
    if line.ending.is_some() {
        return response.map(|body| Body::new(Streaming { body, line }));
    }
    line.write();
    response
}

/// A body that is computed while it is sent. Its line in the log is written at its end.
struct Streaming {
    body: Body,
    line: Line,
}

impl http_body::Body for Streaming {
    type Data = Bytes;
    type Error = axum::Error;

    fn poll_frame(
        mut self: Pin<&mut Self>,
        context: &mut Context<'_>,
    ) -> Poll<Option<Result<Frame<Bytes>, axum::Error>>> {
        let frame = ready!(Pin::new(&mut self.body).poll_frame(context));
        if frame.is_none() {
            self.line.write();
        }
        Poll::Ready(frame)
    }
}

/// Gives a failure its body. Failures of the framework itself come without a problem: the status tells which.
fn explain(response: Response, line: &Line) -> Response {
    let (mut parts, _) = response.into_parts();
    let problem = parts
        .extensions
        .remove::<Arc<Problem>>()
        .unwrap_or_else(|| Arc::new(foreign(&line.method, parts.status)));
    problem.log(line.id.to_str().unwrap_or_default());
    parts.status = problem.slug().status();
    let body = problem.body(line.uri.path(), line.id.to_str().unwrap_or_default());
    parts.headers.insert(header::CONTENT_TYPE, HeaderValue::from_static(problem::MEDIA_TYPE));
    parts.headers.insert(header::CONTENT_LENGTH, HeaderValue::from(body.len()));
    let body = if line.method == Method::HEAD { Body::empty() } else { Body::from(body) };
    Response::from_parts(parts, body)
}

fn foreign(method: &Method, status: StatusCode) -> Problem {
    match status {
        StatusCode::NOT_FOUND => Problem::new(Slug::NotFound, "There is nothing at this path"),
        StatusCode::METHOD_NOT_ALLOWED => {
            let detail = format!("This path does not take {method}; `allow` lists what it takes");
            Problem::new(Slug::MethodNotAllowed, detail)
        }
        _ => Problem::internal(&format_args!("the framework answered {status} by itself")),
    }
}

/// The response in the content coding that the client prefers, if it is one of ours.
async fn encode(response: Response, accepted: HeaderValue) -> Response {
    let mut request = http::Request::new(());
    request.headers_mut().insert(header::ACCEPT_ENCODING, accepted);
    let mut plain = Some(response);
    let service = service_fn(move |_: http::Request<()>| {
        let response = plain.take().unwrap_or_default();
        std::future::ready(Ok::<_, Infallible>(response.map(in_slices)))
    });
    let coded = Compression::new(service).quality(CompressionLevel::Fastest).oneshot(request).await;
    let mut response = match coded {
        Ok(response) => response.map(Body::new),
        Err(never) => match never {},
    };
    if response.headers().contains_key(header::CONTENT_ENCODING) {
        let headers = response.headers_mut();
        headers.remove(REPR_DIGEST);
        let tag =
            headers.get(header::ETAG).and_then(|tag| tag.to_str().ok()).and_then(|tag| tag.strip_suffix('"'));
        if let Some(tag) = tag.and_then(|tag| HeaderValue::from_str(&format!("{tag}{GZIP_SUFFIX}\"")).ok()) {
            headers.insert(header::ETAG, tag);
        }
    }
    response.headers_mut().remove(header::VARY);
    response
}

/// Cuts a body into slices, so that coding a long one does not hold the thread for long.
fn in_slices(body: Body) -> Body {
    const SLICE: usize = 64 << 10;
    if body.size_hint().exact().is_none_or(|size| size <= SLICE as u64) {
        return body;
    }
    let slices = body.into_data_stream();
    let slices = futures_util::StreamExt::flat_map(slices, |chunk| {
        let mut rest = chunk.unwrap_or_default();
        futures_util::stream::iter(std::iter::from_fn(move || {
            let slice: Bytes = rest.split_to(rest.len().min(SLICE));
            (!slice.is_empty()).then_some(Ok::<_, Infallible>(slice))
        }))
    });
    Body::from_stream(slices)
}

/// A request's line in the log, written once: at its end, or when its client has gone.
struct Line {
    begun: Instant,
    id: HeaderValue,
    method: Method,
    uri: Uri,
    path: Option<MatchedPath>,
    trace: Option<HeaderValue>,
    effort: Effort,
    ending: Option<Ending>,
    status: u16,
    written: bool,
}

impl Line {
    fn new(request: &Request) -> Self {
        Self {
            begun: Instant::now(),
            id: request_id(request.headers()),
            method: request.method().clone(),
            uri: request.uri().clone(),
            path: request.extensions().get().cloned(),
            trace: request.headers().get(TRACEPARENT).filter(|value| is_traceparent(value)).cloned(),
            effort: Effort::default(),
            ending: None,
            status: CLIENT_GONE,
            written: false,
        }
    }

    fn write(&mut self) {
        self.written = true;
        self.log("answered");
    }

    /// The outcome is that of the computation if it has one.
    fn log(&self, outcome: &str) {
        let ended = self.ending.as_ref().and_then(|Ending(ending)| ending.get().copied());
        let Effort { steps, outcome: told } = ended.unwrap_or(self.effort);
        let outcome = told.unwrap_or(outcome);
        let trace = self.trace.as_ref().and_then(|value| value.to_str().ok());
        tracing::info!(
            method = self.method.as_str(),
            path = self.path.as_ref().map_or("", MatchedPath::as_str),
            status = self.status,
            duration_us = u64::try_from(self.begun.elapsed().as_micros()).unwrap_or(u64::MAX),
            steps,
            outcome,
            request_id = self.id.to_str().unwrap_or_default(),
            trace_id = trace.and_then(|trace| trace.get(3..35)),
            parent_id = trace.and_then(|trace| trace.get(36..52)),
            "request"
        );
    }
}

/// The status that the log gives to a request whose client went away before the answer.
const CLIENT_GONE: u16 = 499;

impl Drop for Line {
    fn drop(&mut self) {
        if !self.written {
            self.log("client_gone");
        }
    }
}

/// The client's id if it is short and plain, else a random one.
fn request_id(headers: &HeaderMap) -> HeaderValue {
    let sane = |byte: &u8| byte.is_ascii_alphanumeric() || b"-_.:/+=".contains(byte);
    match headers.get(X_REQUEST_ID) {
        Some(id) if (1..=LONGEST_ID).contains(&id.len()) && id.as_bytes().iter().all(sane) => id.clone(),
        _ => {
            let id = format!("{:032x}", fastrand::u128(..));
            HeaderValue::from_str(&id).unwrap_or_else(|_| HeaderValue::from_static("none"))
        }
    }
}

/// `00-<32 hex>-<16 hex>-<2 hex>`, neither id all zeros (W3C Trace Context).
fn is_traceparent(value: &HeaderValue) -> bool {
    let Ok(text) = value.to_str() else { return false };
    let mut parts = text.split('-');
    let mut hex = |length: usize| {
        let part = parts.next().filter(|part| part.len() == length);
        part.filter(|part| part.bytes().all(|byte| matches!(byte, b'0'..=b'9' | b'a'..=b'f')))
    };
    let (version, trace, parent, flags) = (hex(2), hex(32), hex(16), hex(2));
    let nonzero = |part: Option<&str>| part.is_some_and(|part| part.bytes().any(|byte| byte != b'0'));
    version.is_some_and(|version| version != "ff") && nonzero(trace) && nonzero(parent) && flags.is_some()
}
