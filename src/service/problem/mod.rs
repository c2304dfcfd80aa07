//! Failures as `application/problem+json` (RFC 9457). A [`Problem`] is made where the failure is known; the
//! middleware, which knows the request's path and id, writes its body.

mod slug;

use std::any::Any;
use std::borrow::Cow;
use std::sync::Arc;

use axum::response::{IntoResponse, Response};
use http::{HeaderName, HeaderValue, header};
use serde::{Serialize, Serializer};
use serde_json::{Map, Value};
use utoipa::ToSchema;

pub use slug::Slug;

/// Media type of every failure's body.
pub const MEDIA_TYPE: &str = "application/problem+json";

/// Where in a request a fault lies.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum Place {
    /// JSON pointer (RFC 6901) into the body.
    Pointer(String),
    /// Name of a query parameter.
    Parameter(String),
    /// Name of a header field.
    Header(&'static str),
}

/// One thing that is wrong with a request.
#[derive(Clone, Debug, PartialEq)]
pub struct Fault {
    /// Where it lies.
    pub place: Place,
    /// A sentence that tells what would be right.
    pub detail: String,
    /// The server's limit and the value asked, where the fault is to ask too much.
    pub beyond: Option<(u64, u64)>,
}

impl Serialize for Fault {
    fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        use serde::ser::SerializeMap;
        let mut map = serializer.serialize_map(None)?;
        match &self.place {
            Place::Pointer(pointer) => map.serialize_entry("pointer", pointer)?,
            Place::Parameter(name) => map.serialize_entry("parameter", name)?,
            Place::Header(name) => map.serialize_entry("header", name)?,
        }
        map.serialize_entry("detail", &self.detail)?;
        if let Some((limit, asked)) = self.beyond {
            map.serialize_entry("limit", &limit)?;
            map.serialize_entry("asked", &asked)?;
        }
        map.end()
    }
}

/// A failure on its way to the client.
#[derive(Clone, Debug)]
pub struct Problem(Box<Parts>);

#[derive(Clone, Debug)]
struct Parts {
    slug: Slug,
    detail: Cow<'static, str>,
    errors: Vec<Fault>,
    members: Map<String, Value>,
    headers: Vec<(HeaderName, HeaderValue)>,
    cause: Option<String>,
}

impl Problem {
    /// A problem of the kind `slug`; `detail` is a sentence about this occurrence.
    #[must_use]
    pub fn new(slug: Slug, detail: impl Into<Cow<'static, str>>) -> Self {
        Self(Box::new(Parts {
            slug,
            detail: detail.into(),
            errors: Vec::new(),
            members: Map::new(),
            headers: Vec::new(),
            cause: None,
        }))
    }

    /// The same with its faults listed.
    #[must_use]
    pub fn with_errors(mut self, errors: Vec<Fault>) -> Self {
        self.0.errors = errors;
        self
    }

    /// The same with a member of its own, diagnostics for instance.
    #[must_use]
    pub fn with(mut self, member: &str, value: impl Into<Value>) -> Self {
        self.0.members.insert(member.to_owned(), value.into());
        self
    }

    /// The same with a header field.
    #[must_use]
    pub fn with_header(mut self, name: HeaderName, value: HeaderValue) -> Self {
        self.0.headers.push((name, value));
        self
    }

    /// A defect of this server: `cause` goes to the log, not to the client.
    #[must_use]
    pub fn internal(cause: &dyn std::fmt::Display) -> Self {
        let mut problem =
            Self::new(Slug::Internal, "A defect of the server; its log has the cause under the request id");
        problem.0.cause = Some(cause.to_string());
        problem
    }

    /// No place for the work now.
    #[must_use]
    pub fn overloaded(detail: &'static str) -> Self {
        Self::new(Slug::Overloaded, detail)
            .with_header(header::RETRY_AFTER, HeaderValue::from_static(RETRY_AFTER_SECONDS))
    }

    /// The representations that could have been had.
    #[must_use]
    pub fn not_acceptable(offered: &[&'static str]) -> Self {
        Self::new(Slug::NotAcceptable, format!("This resource is offered as {}", offered.join(", ")))
            .with("offered", offered)
            .with_errors(vec![Fault {
                place: Place::Header("accept"),
                detail: format!("must accept one of {}", offered.join(", ")),
                beyond: None,
            }])
    }

    /// What kind of failure it is.
    #[must_use]
    pub fn slug(&self) -> Slug {
        self.0.slug
    }

    /// A panic of our own code.
    #[must_use]
    pub fn panicked(payload: &(dyn Any + Send)) -> Self {
        let text = payload.downcast_ref::<&str>().copied();
        let text = text.or_else(|| payload.downcast_ref::<String>().map(String::as_str));
        Self::internal(&format_args!("panic: {}", text.unwrap_or("unknown")))
    }

    /// Writes the defect behind an `internal` to the log.
    pub fn log(&self, request_id: &str) {
        if let Some(cause) = &self.0.cause {
            tracing::error!(request_id, cause, "defect");
        }
    }

    /// Writes the body for the request `instance` with the id `request_id`.
    #[must_use]
    pub fn body(&self, instance: &str, request_id: &str) -> Vec<u8> {
        serde_json::to_vec(&self.members(instance, request_id)).unwrap_or_default()
    }

    /// The members of that body.
    #[must_use]
    pub fn members<'a>(&'a self, instance: &'a str, request_id: &'a str) -> ProblemBody<'a> {
        let parts = &*self.0;
        ProblemBody {
            kind: format!("/problems/{}", parts.slug.name()),
            title: parts.slug.title(),
            status: parts.slug.status().as_u16(),
            detail: &parts.detail,
            instance,
            request_id,
            errors: &parts.errors,
            members: &parts.members,
        }
    }
}

/// Seconds a client is told to stay away when there is no place: long enough for most computations to end.
const RETRY_AFTER_SECONDS: &str = "1";

/// Body of every failure (RFC 9457).
#[derive(Serialize, ToSchema)]
#[schema(as = Problem)]
pub struct ProblemBody<'a> {
    /// Relative reference to the page that explains this kind of problem.
    #[serde(rename = "type")]
    kind: String,
    /// The kind of problem, in words.
    title: &'a str,
    /// The HTTP status.
    status: u16,
    /// What is the matter with this very request.
    detail: &'a str,
    /// Path of the request.
    instance: &'a str,
    /// Id of the request, also in `x-request-id` and in the server's log.
    request_id: &'a str,
    /// Every fault of the request, each with its place.
    #[serde(skip_serializing_if = "<[Fault]>::is_empty")]
    #[schema(value_type = Vec<FaultBody>, required = false)]
    errors: &'a [Fault],
    #[serde(flatten)]
    #[schema(ignore)]
    members: &'a Map<String, Value>,
}

/// One fault of a request: where it lies and what would be right.
#[derive(ToSchema)]
#[schema(as = Fault)]
#[expect(dead_code, reason = "describes what `Fault` writes")]
struct FaultBody {
    /// JSON pointer (RFC 6901) into the body.
    #[schema(required = false)]
    pointer: String,
    /// Name of a query parameter.
    #[schema(required = false)]
    parameter: String,
    /// Name of a header field.
    #[schema(required = false)]
    header: String,
    /// What would be right.
    detail: String,
    /// The server's limit, where more was asked.
    #[schema(required = false)]
    limit: u64,
    /// What was asked, where it is more than the limit.
    #[schema(required = false)]
    asked: u64,
}

impl IntoResponse for Problem {
    fn into_response(mut self) -> Response {
        let mut response = self.0.slug.status().into_response();
        for (name, value) in std::mem::take(&mut self.0.headers) {
            response.headers_mut().insert(name, value);
        }
        response.extensions_mut().insert(Arc::new(self));
        response
    }
}
