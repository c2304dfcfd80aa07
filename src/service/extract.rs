//! What handlers take: a complete body, or query parameters. Each refusal is a [`Problem`].

use axum::body::Body;
use axum::extract::{FromRequest, FromRequestParts, Request};
use bytes::{Bytes, BytesMut};
use http::request::Parts;
use http::{HeaderMap, HeaderValue, Uri, header};
use http_body::Body as _;
use http_body_util::BodyExt;
use tokio::sync::OwnedSemaphorePermit;
use tokio::time::{Instant, timeout_at};
use utoipa::openapi::{RefOr, Schema};

use crate::answer::{JSON, negotiation::negotiate};
use crate::decode::{ClosedObject, Decode, Errors, Members, Node, Path, Schemas, parse_query};

use crate::problem::{Fault, Place, Problem, Slug};
use crate::state::App;

/// A POST's body, complete and of the right media type, and the representation its client wants.
#[derive(Debug)]
pub struct Submission {
    body: Bytes,
    headers: HeaderMap,
    origin: Origin,
    _memory: Vec<OwnedSemaphorePermit>,
}

/// The request that a problem arose with, where the problem is told within an answer.
#[derive(Clone, Debug)]
pub struct Origin {
    /// Its path.
    pub path: String,
    /// Its id.
    pub request_id: String,
}

/// The id of a request, given to it by the middleware.
#[derive(Clone, Debug)]
pub struct RequestId(pub HeaderValue);

impl Submission {
    /// The bytes.
    #[must_use]
    pub fn body(&self) -> &[u8] {
        &self.body
    }

    /// The representation to send.
    ///
    /// # Errors
    /// `not-acceptable` if the client wants none of `offered`.
    pub fn negotiate(&self, offered: &[&'static str]) -> Result<&'static str, Problem> {
        negotiate(&self.headers, offered)
    }

    /// Lets go of the body.
    #[must_use]
    pub fn into_origin(self) -> Origin {
        self.origin
    }
}

impl FromRequest<App> for Submission {
    type Rejection = Problem;

    async fn from_request(request: Request, app: &App) -> Result<Self, Problem> {
        let (parts, body) = request.into_parts();
        no_query(&parts.uri)?;
        media_type(&parts.headers)?;
        let (body, memory) = receive(app, body).await?;
        let id = parts.extensions.get().and_then(|RequestId(id)| id.to_str().ok()).unwrap_or_default();
        let origin = Origin { path: parts.uri.path().to_owned(), request_id: id.to_owned() };
        Ok(Self { body, headers: parts.headers, origin, _memory: memory })
    }
}

fn no_query(uri: &Uri) -> Result<(), Problem> {
    match uri.query() {
        None | Some("") => Ok(()),
        Some(_) => Query::<Nothing>::of(uri).map(drop),
    }
}

fn media_type(headers: &HeaderMap) -> Result<(), Problem> {
    let mut codings = headers.get_all(header::CONTENT_ENCODING).iter();
    if codings.any(|coding| !coding.as_bytes().eq_ignore_ascii_case(b"identity")) {
        let problem =
            unsupported("content-encoding", "must be absent or identity: bodies are taken uncompressed");
        return Err(problem.with_header(header::ACCEPT_ENCODING, HeaderValue::from_static("identity")));
    }
    let Some(given) = headers.get(header::CONTENT_TYPE) else {
        return Err(unsupported("content-type", "is required: application/json"));
    };
    if headers.get_all(header::CONTENT_TYPE).iter().count() > 1 {
        return Err(unsupported("content-type", "must be given once"));
    }
    if given == JSON {
        return Ok(());
    }
    let media_type = given.to_str().ok().and_then(|text| text.parse::<mime::Mime>().ok());
    let good = media_type.is_some_and(|media_type| {
        media_type.essence_str().eq_ignore_ascii_case(JSON)
            && media_type.params().all(|(name, value)| name == mime::CHARSET && value == mime::UTF_8)
    });
    if good { Ok(()) } else { Err(unsupported("content-type", "must be application/json, in UTF-8")) }
}

fn unsupported(header: &'static str, detail: &str) -> Problem {
    let fault = Fault { place: Place::Header(header), detail: detail.to_owned(), beyond: None };
    Problem::new(Slug::UnsupportedMediaType, format!("{header} {detail}"))
        .with("supported", &[JSON][..])
        .with_errors(vec![fault])
        .with_header(header::ACCEPT, HeaderValue::from_static(JSON))
}

/// Memory is asked for in advance by what a body declares, and as it grows where it declares nothing.
const GROWTH: usize = 1 << 20;

async fn receive(app: &App, mut body: Body) -> Result<(Bytes, Vec<OwnedSemaphorePermit>), Problem> {
    let limit = app.config.limits.body_bytes;
    let declared = usize::try_from(body.size_hint().lower()).unwrap_or(usize::MAX);
    if declared > limit {
        return Err(too_large(app, body));
    }
    let mut memory: Vec<_> = app.body_memory(declared)?.into_iter().collect();
    let mut room = declared.max(GROWTH);
    let patience = app.config.times.request;
    let deadline = Instant::now() + patience;
    let mut first = Bytes::new();
    let mut all = BytesMut::new();
    while !body.is_end_stream() {
        let frame = match timeout_at(deadline, body.frame()).await {
            Ok(Some(Ok(frame))) => frame,
            Ok(None) => break,
            Ok(Some(Err(error))) => {
                return Err(Problem::new(
                    Slug::MalformedJson,
                    format!("The body ended before its end: {error}"),
                ));
            }
            Err(_) => {
                let detail = format!("The body did not arrive within {} ms", patience.as_millis());
                return Err(Problem::new(Slug::RequestTimeout, detail)
                    .with_header(header::CONNECTION, HeaderValue::from_static("close")));
            }
        };
        let Ok(data) = frame.into_data() else { continue };
        let size = first.len() + all.len() + data.len();
        if size > limit {
            return Err(too_large(app, body));
        }
        if size > room {
            memory.extend(app.body_memory(GROWTH)?);
            room += GROWTH.max(size - room);
        }
        if first.is_empty() && all.is_empty() {
            first = data;
        } else {
            all.reserve(declared.max(first.len()).saturating_sub(all.len()));
            all.extend_from_slice(&std::mem::take(&mut first));
            all.extend_from_slice(&data);
        }
    }
    Ok((if all.is_empty() { first } else { all.freeze() }, memory))
}

/// The refusal of a body. What a well-meaning client is still sending is read and thrown away for a while, since a
/// connection closed under its hands would lose it the answer.
fn too_large(app: &App, mut body: Body) -> Problem {
    let limit = app.config.limits.body_bytes;
    let deadline = Instant::now() + app.config.times.request;
    tokio::spawn(async move {
        let mut thrown_away = 0_usize;
        while let Ok(Some(Ok(frame))) = timeout_at(deadline, body.frame()).await {
            thrown_away += frame.data_ref().map_or(0, Bytes::len);
            if thrown_away > limit.saturating_mul(DRAINED_LIMITS) {
                break;
            }
        }
    });
    Problem::new(Slug::ContentTooLarge, format!("A body may have {limit} bytes")).with("limit", limit)
}

/// A body this many times too large is no slip: its connection is closed.
const DRAINED_LIMITS: usize = 8;

/// No parameters.
#[derive(Debug)]
pub struct Nothing;

impl Decode for Nothing {
    fn decode(node: &Node<'_>, at: Path<'_>, errors: &mut Errors) -> Option<Self> {
        Members::open(node, at, &[], errors)?.finish(errors);
        Some(Self)
    }

    fn describe(_: &mut Schemas) -> RefOr<Schema> {
        ClosedObject::new("No parameters.").build()
    }
}

/// The query parameters, as a request object of strings.
#[derive(Debug)]
pub struct Query<T>(pub T);

impl<T: Decode> Query<T> {
    fn of(uri: &Uri) -> Result<Self, Problem> {
        let mut errors = Errors::in_query();
        let pairs: Vec<(String, String)> =
            form_urlencoded::parse(uri.query().unwrap_or_default().as_bytes()).into_owned().collect();
        let node = parse_query(&pairs, &mut errors);
        let value = T::decode(&node, Path::ROOT, &mut errors);
        errors.finish(value).map(Self)
    }
}

impl<T: Decode, S: Sync> FromRequestParts<S> for Query<T> {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, _: &S) -> Result<Self, Problem> {
        Self::of(&parts.uri)
    }
}

/// A request that takes neither parameters nor a body, and accepts JSON.
#[derive(Debug)]
pub struct Plain(pub HeaderMap);

impl<S: Sync> FromRequestParts<S> for Plain {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, _: &S) -> Result<Self, Problem> {
        no_query(&parts.uri)?;
        negotiate(&parts.headers, &[JSON])?;
        Ok(Self(std::mem::take(&mut parts.headers)))
    }
}

/// The one variable segment of a path.
#[derive(Debug)]
pub struct Segment(pub String);

impl<S: Send + Sync> FromRequestParts<S> for Segment {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, state: &S) -> Result<Self, Problem> {
        match axum::extract::Path::<String>::from_request_parts(parts, state).await {
            Ok(axum::extract::Path(segment)) => Ok(Self(segment)),
            Err(_) => Err(Problem::new(Slug::NotFound, "The path is not UTF-8")),
        }
    }
}
