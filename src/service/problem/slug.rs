//! The kinds of problem: one table for status, title and the page that explains it.

use http::StatusCode;

macro_rules! slugs {
    ($($(#[doc = $doc:literal])* $variant:ident $name:literal $status:ident $title:literal $page:literal;)*) => {
        /// A kind of problem.
        #[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
        pub enum Slug {
            $($(#[doc = $doc])* $variant,)*
        }

        impl Slug {
            /// Every kind there is.
            pub const ALL: &'static [Self] = &[$(Self::$variant),*];

            /// Last segment of its `type`.
            #[must_use]
            pub fn name(self) -> &'static str {
                match self { $(Self::$variant => $name,)* }
            }

            /// The kind in words.
            #[must_use]
            pub fn title(self) -> &'static str {
                match self { $(Self::$variant => $title,)* }
            }

            /// The HTTP status that goes with it.
            #[must_use]
            pub fn status(self) -> StatusCode {
                match self { $(Self::$variant => StatusCode::$status,)* }
            }

            /// What it means and what to do, for a person.
            #[must_use]
            pub fn explanation(self) -> &'static str {
                match self { $(Self::$variant => $page,)* }
            }
        }
    };
}

slugs! {
    /// The body is no JSON.
    MalformedJson "malformed-json" BAD_REQUEST "The body is not JSON"
        "The body could not be read as one JSON value in UTF-8 (RFC 8259). The detail names the line and the column. \
         Frequent causes: a trailing comma, a member given twice, NaN or Infinity, a byte order mark, text after the \
         value, an empty body.";
    /// No token or a wrong one.
    Unauthorized "unauthorized" UNAUTHORIZED "A token is needed"
        "This server is configured to answer only requests that carry one of its tokens, as \
         `Authorization: Bearer <token>`. None came, or one that it does not know.";
    /// No such path or item.
    NotFound "not-found" NOT_FOUND "There is nothing at this path"
        "The path, or the item that it names, does not exist. /openapi.json lists the paths.";
    /// The path exists, the method does not.
    MethodNotAllowed "method-not-allowed" METHOD_NOT_ALLOWED "The method is not allowed here"
        "The path exists but does not take this method. The `Allow` field of the response lists those it takes.";
    /// None of the accepted media types is offered.
    NotAcceptable "not-acceptable" NOT_ACCEPTABLE "No acceptable representation"
        "The request's `Accept` field excludes every representation that this resource has. The problem lists them.";
    /// The body is not of a media type or content coding understood.
    UnsupportedMediaType "unsupported-media-type" UNSUPPORTED_MEDIA_TYPE "The body's media type is not supported"
        "Bodies are sent as `Content-Type: application/json`, in UTF-8 and without a content coding.";
    /// The body did not arrive in time.
    RequestTimeout "request-timeout" REQUEST_TIMEOUT "The body did not arrive in time"
        "The server waits a limited time for a request's body, see /v1/limits. Send it again, or in smaller parts \
         over a slow line.";
    /// The body is too large.
    ContentTooLarge "content-too-large" PAYLOAD_TOO_LARGE "The body is too large"
        "The body is larger than the server takes; the problem gives the limit. Split the request: each state is \
         computed independently of the others.";
    /// A member is missing, unknown or out of range.
    InvalidRequest "invalid-request" UNPROCESSABLE_ENTITY "The request is not valid"
        "The body is JSON but not a request that can be computed: a member is missing, unknown or out of range, or \
         needs a scale that the system lacks. `errors` lists everything that is wrong at once, each fault with its \
         place and with what would be right.";
    /// More is asked than the server's limits allow.
    WorkLimit "work-limit" UNPROCESSABLE_ENTITY "The request asks for more than the server's limits"
        "The request is valid but asks for more work than this server does at once; nothing was computed. `errors` \
         gives each limit and the value asked. Ask for less, or split the request. /v1/limits lists the limits.";
    /// A correction ran out of its time.
    WallTimeLimit "wall-time-limit" UNPROCESSABLE_ENTITY "The computation ran out of its time"
        "The computation was stopped at its wall-time limit before it had an answer. Ask for more time with \
         `limits.wall_time_ms`, up to the server's maximum, or start from a better guess.";
    /// A corrector did not converge.
    NoConvergence "no-convergence" UNPROCESSABLE_ENTITY "The iteration did not converge"
        "The corrector found no solution near the guess. The problem carries the history of the residual and the \
         last iterate. A better guess, or another quantity held fixed, usually helps.";
    /// The family has no member with the property.
    NoSuchMember "no-such-member" UNPROCESSABLE_ENTITY "The family has no such member"
        "The family was followed, and no member of it has the wanted property. The problem gives the range that \
         the property takes.";
    /// The family does not exist here.
    NoSuchFamily "no-such-family" UNPROCESSABLE_ENTITY "The family does not exist at this mass parameter"
        "Some families exist only for a range of mass parameters: short and long period orbits need a mass \
         parameter below Routh's critical value, for instance.";
    /// The orbit has no manifold.
    NoManifold "no-manifold" UNPROCESSABLE_ENTITY "The orbit has no such manifold"
        "Stable and unstable manifolds belong to real multipliers off the unit circle, and the orbit has none. The \
         problem lists its multipliers.";
    /// A client's quota is used up.
    RateLimited "rate-limited" TOO_MANY_REQUESTS "The client's quota is used up"
        "This server limits how much each client may ask in a time. Wait for as long as `Retry-After` says.";
    /// A defect of this server.
    Internal "internal" INTERNAL_SERVER_ERROR "A defect of the server"
        "The request met a defect of the server, which has been logged under the request id. Sending the same \
         request again will most likely meet it again; please report it with that id.";
    /// No place for the work now.
    Overloaded "overloaded" SERVICE_UNAVAILABLE "No place for the work now"
        "As many computations as the server takes are under way, waiting for a thread or for their readers, or the \
         server is about to stop. The request was not begun; send it again after the time in `Retry-After`.";
}
