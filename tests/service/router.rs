//! The router in this process, without a network.

use axum::Router;
use axum::body::Body;
use http::{HeaderMap, Method, Request, StatusCode, header};
use http_body_util::BodyExt;
use serde_json::{Value, json};
use synodia::config::Config;
use tower::ServiceExt;

use super::support::config;

/// A service that answers from this process.
pub(crate) struct Local(Router);

/// An answer.
#[derive(Debug)]
pub(crate) struct Reply {
    pub(crate) status: StatusCode,
    pub(crate) headers: HeaderMap,
    pub(crate) body: Vec<u8>,
}

impl Local {
    /// The service with its defaults.
    pub(crate) fn start() -> Self {
        Self::with(|_| ())
    }

    /// The service with something configured otherwise.
    pub(crate) fn with(change: impl FnOnce(&mut Config)) -> Self {
        let mut config = config();
        change(&mut config);
        Self(synodia::api::start(config).unwrap().1)
    }

    pub(crate) fn get(&self, path: &str) -> Reply {
        self.send(Request::get(path).body(Body::empty()).unwrap())
    }

    pub(crate) fn post(&self, path: &str, body: &Value) -> Reply {
        self.post_text(path, body.to_string())
    }

    pub(crate) fn post_text(&self, path: &str, body: impl Into<Body>) -> Reply {
        let request = Request::builder().method(Method::POST).uri(path);
        self.send(request.header(header::CONTENT_TYPE, "application/json").body(body.into()).unwrap())
    }

    /// The body of an answer that must be a success.
    pub(crate) fn answer(&self, path: &str, body: &Value) -> Value {
        self.post(path, body).success()
    }

    pub(crate) fn send(&self, request: Request<Body>) -> Reply {
        let runtime = tokio::runtime::Builder::new_current_thread().enable_all().build().unwrap();
        runtime.block_on(async {
            let (parts, body) = self.0.clone().oneshot(request).await.unwrap().into_parts();
            let body = body.collect().await.unwrap().to_bytes().to_vec();
            Reply { status: parts.status, headers: parts.headers, body }
        })
    }

    /// Checks that each body is refused as `invalid-request` with a fault at that pointer that has those words.
    pub(crate) fn refuses(&self, path: &str, cases: &[(Value, &str, &str)]) {
        for (body, pointer, words) in cases {
            let reply = self.post(path, body);
            reply.has_fault("invalid-request", "pointer", pointer, words);
        }
    }
}

impl Reply {
    pub(crate) fn json(&self) -> Value {
        serde_json::from_slice(&self.body).unwrap()
    }

    pub(crate) fn success(&self) -> Value {
        let body = self.json();
        assert_eq!(self.status, StatusCode::OK, "{body:#}");
        body
    }

    pub(crate) fn header(&self, name: &str) -> &str {
        self.headers.get(name).map_or("", |value| value.to_str().unwrap())
    }

    /// Checks that it is a problem of that kind with a fault at that place that has those words.
    pub(crate) fn has_fault(&self, slug: &str, kind: &str, place: &str, words: &str) {
        let body = self.json();
        assert_eq!(body["type"], json!(format!("/problems/{slug}")), "{body:#}");
        let faults = body["errors"].as_array().unwrap();
        let found = faults
            .iter()
            .any(|fault| fault[kind] == place && fault["detail"].as_str().unwrap().contains(words));
        assert!(found, "no fault at {place:?} with {words:?} in {body:#}");
    }
}

/// Checks a number against a value of elsewhere.
pub(crate) fn close(got: &Value, expected: f64, tolerance: f64) {
    let got = got.as_f64().unwrap_or_else(|| panic!("{got} is no number"));
    assert!((got - expected).abs() <= tolerance, "{got:?} is not {expected:?} to {tolerance:e}");
}
