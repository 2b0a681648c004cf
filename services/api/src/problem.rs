//! Everything that can go wrong over HTTP, as RFC 9457 problem documents.
//!
//! [`Kind`] is the catalogue: each kind has an address, a title, a status and what to do about it. A problem never
//! carries a cause from within: no SQL, no path, no stack; those are logged beside the request's id.

use axum::body::Body;
use axum::http::{HeaderValue, StatusCode, header};
use axum::response::{IntoResponse, Response};
use serde::Serialize;
use utoipa::ToSchema;
use uuid::Uuid;

mod kind;

pub use kind::Kind;

/// The media type of a problem (RFC 9457 section 3).
pub const PROBLEM_JSON: &str = "application/problem+json";
/// Seconds after which to try again, where nothing better is known (ours).
const TRY_AGAIN_AFTER: u32 = 1;

/// One thing that is wrong with a request body.
#[derive(Clone, Debug, Eq, PartialEq, Serialize, ToSchema)]
pub struct FieldError {
    /// Where: a JSON pointer (RFC 6901) into the body; empty for the body as a whole.
    #[schema(example = "/amount/unit")]
    pub pointer: String,
    /// What is wrong there.
    pub detail: String,
}

/// A refusal on its way to the client.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Problem {
    kind: Kind,
    detail: String,
    errors: Vec<FieldError>,
    retry_after: Option<u32>,
}

/// The document a client reads.
#[derive(Clone, Debug, Eq, PartialEq, Serialize, ToSchema)]
#[schema(as = Problem)]
pub struct ProblemDocument {
    /// Which kind of problem; the page at this address says what to do.
    #[serde(rename = "type")]
    #[schema(example = "/problems/not-readable")]
    pub kind: String,
    /// The kind in words.
    pub title: &'static str,
    /// The HTTP status.
    pub status: u16,
    /// What happened this time.
    #[serde(skip_serializing_if = "String::is_empty")]
    pub detail: String,
    /// The request's id, as a `urn:uuid:`; the service's log has the same.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub instance: Option<String>,
    /// Every wrong place in the body.
    #[serde(skip_serializing_if = "Vec::is_empty")]
    pub errors: Vec<FieldError>,
}

impl Problem {
    /// A problem of a kind, with what happened this time in a sentence.
    pub fn new(kind: Kind, detail: impl Into<String>) -> Self {
        Self { kind, detail: detail.into(), errors: Vec::new(), retry_after: None }
    }

    /// A problem at one place of the body.
    pub fn at(kind: Kind, pointer: impl Into<String>, detail: impl Into<String>) -> Self {
        let (pointer, detail) = (pointer.into(), detail.into());
        Self::new(kind, detail.clone()).with_errors(vec![FieldError { pointer, detail }])
    }

    /// A fault of ours: the whole chain of causes goes to the log, none of it to the client.
    pub fn internal(error: &(dyn std::error::Error + 'static)) -> Self {
        let causes = std::iter::successors(Some(error), |error| error.source());
        let chain: Vec<String> = causes.map(ToString::to_string).collect();
        tracing::error!(error = chain.join(": "), "a request failed by our fault");
        Self::new(Kind::Internal, Kind::Internal.advice())
    }

    /// The same with the wrong places named.
    #[must_use]
    pub fn with_errors(self, errors: Vec<FieldError>) -> Self {
        Self { errors, ..self }
    }

    /// The same with the seconds after which to try again.
    #[must_use]
    pub fn with_retry_after(self, seconds: u32) -> Self {
        Self { retry_after: Some(seconds), ..self }
    }

    /// Which kind it is.
    pub const fn kind(&self) -> Kind {
        self.kind
    }

    /// What happened, in words.
    pub fn detail(&self) -> &str {
        &self.detail
    }

    /// The wrong places.
    pub fn errors(&self) -> &[FieldError] {
        &self.errors
    }

    /// The document, with the request's id if it is known.
    pub fn document(&self, request: Option<Uuid>) -> ProblemDocument {
        ProblemDocument {
            kind: self.kind.address(),
            title: self.kind.title(),
            status: self.kind.status().as_u16(),
            detail: self.detail.clone(),
            instance: request.map(|id| id.urn().to_string()),
            errors: self.errors.clone(),
        }
    }

    /// The answer, with the request's id if it is known.
    pub fn answer(&self, request: Option<Uuid>) -> Response {
        let body = serde_json::to_vec(&self.document(request)).unwrap_or_default();
        let mut response = Response::new(Body::from(body));
        *response.status_mut() = self.kind.status();
        let headers = response.headers_mut();
        headers.insert(header::CONTENT_TYPE, HeaderValue::from_static(PROBLEM_JSON));
        if let Some(challenge) = self.kind.challenge() {
            headers.insert(header::WWW_AUTHENTICATE, HeaderValue::from_static(challenge));
        }
        let status = self.kind.status();
        if [StatusCode::TOO_MANY_REQUESTS, StatusCode::SERVICE_UNAVAILABLE].contains(&status) {
            let seconds = self.retry_after.unwrap_or(TRY_AGAIN_AFTER);
            headers.insert(header::RETRY_AFTER, HeaderValue::from(seconds));
        }
        response
    }
}

/// The problem also travels beside its answer, so that the middleware can add the request's id.
impl IntoResponse for Problem {
    fn into_response(self) -> Response {
        let mut response = self.answer(None);
        response.extensions_mut().insert(self);
        response
    }
}

#[cfg(test)]
mod tests {
    use axum::body::to_bytes;
    use serde_json::{Value, json};

    use super::*;

    async fn body(response: Response) -> Value {
        serde_json::from_slice(&to_bytes(response.into_body(), 10_000).await.unwrap()).unwrap()
    }

    #[tokio::test]
    async fn a_problem_is_answered_as_rfc_9457_wants_it() {
        let problem = Problem::at(Kind::Meaningless, "/amount/unit", "unknown unit");
        let id = Uuid::from_u128(5);
        let response = problem.answer(Some(id));
        assert_eq!(response.status(), 422);
        assert_eq!(response.headers()["content-type"], "application/problem+json");
        assert_eq!(
            body(response).await,
            json!({
                "type": "/problems/meaningless",
                "title": Kind::Meaningless.title(),
                "status": 422,
                "detail": "unknown unit",
                "instance": "urn:uuid:00000000-0000-0000-0000-000000000005",
                "errors": [{"pointer": "/amount/unit", "detail": "unknown unit"}],
            })
        );
    }

    #[tokio::test]
    async fn what_is_not_known_is_left_out() {
        let response = Problem::new(Kind::NotFound, "").into_response();
        assert!(response.extensions().get::<Problem>().is_some());
        let body = body(response).await;
        assert_eq!(
            body.as_object().unwrap().keys().collect::<Vec<_>>(),
            ["status", "title", "type"]
        );
    }

    #[test]
    fn a_401_says_how_to_sign_in_and_a_503_or_429_when_to_return() {
        let challenge =
            |kind| Problem::new(kind, "").answer(None).headers()["www-authenticate"].clone();
        assert_eq!(challenge(Kind::SignIn), "Bearer realm=\"tallystave\"");
        let invalid = challenge(Kind::TokenRefused);
        assert_eq!(invalid, "Bearer realm=\"tallystave\", error=\"invalid_token\"");
        let after = |problem: Problem| problem.answer(None).headers().get("retry-after").cloned();
        assert_eq!(after(Problem::new(Kind::Unavailable, "")).unwrap(), "1");
        assert_eq!(after(Problem::new(Kind::TooMany, "").with_retry_after(30)).unwrap(), "30");
        assert_eq!(after(Problem::new(Kind::NotFound, "").with_retry_after(30)), None);
    }

    #[tokio::test]
    async fn the_cause_of_a_fault_of_ours_is_not_shown() {
        let cause = std::io::Error::other("select * from person at /var/lib/tallystave");
        let response = Problem::internal(&cause).into_response();
        assert_eq!(response.status(), 500);
        let text = body(response).await.to_string();
        assert!(!text.contains("select") && !text.contains("/var"), "{text}");
    }
}
