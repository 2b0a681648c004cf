//! What every request passes through, whatever it asks for.
//!
//! From outside to inside: a number of our own for the request (one that the client sends is not believed), a line in
//! the log (method, matched path, status, time; never a body, a query or a token), the safety headers, the catching of
//! panics, a deadline, and the arrival of a small body. Answers that other code made in plain text become problems
//! here.

use std::any::Any;
use std::time::{Duration, Instant};

use axum::Router;
use axum::body::{Body, to_bytes};
use axum::extract::{MatchedPath, Request, State};
use axum::http::{HeaderMap, HeaderName, HeaderValue, header};
use axum::middleware::{Next, from_fn, from_fn_with_state};
use axum::response::{IntoResponse, Response};
use house::clock::Clock;
use house::ids::Ids;
use tower_http::catch_panic::CatchPanicLayer;
use tracing::Instrument;
use uuid::Uuid;

use crate::problem::{Kind, Problem};

/// The header that carries the request's id in every answer.
pub const REQUEST_ID: HeaderName = HeaderName::from_static("x-request-id");
/// The longest a request may take until its answer begins (ours).
pub const DEADLINE: Duration = Duration::from_secs(30);
/// A body of at most so many bytes is read before the request is judged (ours).
const SMALL_BODY: usize = 64 * 1024;
/// The longest plain text that becomes a problem's detail.
const LONGEST_TEXT: usize = 2048;

/// Safety headers of every answer (OWASP REST Security Cheat Sheet; ASVS 5.0.0 chapter 3.4). A handler's own stand.
const SAFETY: [(HeaderName, HeaderValue); 5] = [
    (header::CACHE_CONTROL, HeaderValue::from_static("no-store")),
    (
        header::CONTENT_SECURITY_POLICY,
        HeaderValue::from_static("default-src 'none'; frame-ancestors 'none'"),
    ),
    (header::X_CONTENT_TYPE_OPTIONS, HeaderValue::from_static("nosniff")),
    (header::X_FRAME_OPTIONS, HeaderValue::from_static("DENY")),
    (header::REFERRER_POLICY, HeaderValue::from_static("no-referrer")),
];

/// Only behind TLS: a plain connection must not send it (RFC 6797 section 7.2).
const TLS_ONLY: HeaderValue = HeaderValue::from_static("max-age=31536000; includeSubDomains");

/// A request's id: drawn here, logged, and given back in `X-Request-Id` and in a problem's `instance`.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct RequestId(pub Uuid);

/// How the interface is run.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Surroundings {
    /// The longest a request may take.
    pub deadline: Duration,
    /// Whether clients reach us over TLS, ended here or by a proxy before us.
    pub behind_tls: bool,
}

impl Default for Surroundings {
    fn default() -> Self {
        Self { deadline: DEADLINE, behind_tls: false }
    }
}

/// Puts all of it around a router whose routes are complete: those added later would go without.
pub fn surround<S>(router: Router<S>, surroundings: Surroundings) -> Router<S>
where
    S: Clone + Send + Sync + 'static,
{
    router
        .fallback(no_such_address)
        .method_not_allowed_fallback(no_such_method)
        .layer(from_fn(received))
        .layer(from_fn_with_state(surroundings.deadline, in_time))
        .layer(CatchPanicLayer::custom(panicked))
        .layer(from_fn_with_state(surroundings.behind_tls, safely))
        .layer(from_fn(logged))
        .layer(from_fn(numbered))
}

/// Has a small body arrive before anything is decided: one that lies unread when the answer goes out costs the client
/// its connection, and perhaps the answer.
async fn received(request: Request, next: Next) -> Response {
    let announced = request.headers().get(header::CONTENT_LENGTH);
    let announced = announced.and_then(|length| length.to_str().ok()?.parse::<usize>().ok());
    if announced.is_none_or(|length| length == 0 || length > SMALL_BODY) {
        return next.run(request).await;
    }
    let (parts, body) = request.into_parts();
    match to_bytes(body, SMALL_BODY).await {
        Ok(bytes) => next.run(Request::from_parts(parts, Body::from(bytes))).await,
        Err(_) => Problem::new(Kind::NotReadable, "the body did not arrive whole").into_response(),
    }
}

async fn no_such_address() -> Problem {
    Problem::new(Kind::NotFound, Kind::NotFound.advice())
}

async fn no_such_method() -> Problem {
    Problem::new(Kind::MethodNotAllowed, Kind::MethodNotAllowed.advice())
}

async fn numbered(mut request: Request, next: Next) -> Response {
    // Without randomness nothing else works either, and the request is refused where it draws its first id.
    let id: Uuid = Ids.draw(Clock::System.now()).unwrap_or_default();
    request.headers_mut().remove(REQUEST_ID);
    request.extensions_mut().insert(RequestId(id));
    let mut response = as_problem(next.run(request).await, id).await;
    if let Ok(value) = HeaderValue::try_from(id.to_string()) {
        response.headers_mut().insert(REQUEST_ID, value);
    }
    response
}

/// Gives a problem its request's id, and makes one of a refusal in plain text.
async fn as_problem(mut response: Response, id: Uuid) -> Response {
    let problem = match response.extensions_mut().remove::<Problem>() {
        Some(problem) => problem,
        None if is_plain_text(response.headers()) => match Kind::of_status(response.status()) {
            Some(kind) => return keep_headers(response, |text| reworded(kind, text), id).await,
            None => return response,
        },
        None => return response,
    };
    keep_headers(response, |_| problem, id).await
}

fn is_plain_text(headers: &HeaderMap) -> bool {
    let media_type = headers.get(header::CONTENT_TYPE).map(HeaderValue::as_bytes);
    media_type.is_none_or(|value| value.starts_with(b"text/plain"))
}

/// What went wrong within is not for the client.
fn reworded(kind: Kind, text: String) -> Problem {
    let ours = kind.status().is_server_error() || text.is_empty();
    Problem::new(kind, if ours { kind.advice().to_owned() } else { text })
}

/// The problem's answer, with the headers that the first answer had beside its body.
async fn keep_headers(
    response: Response,
    problem: impl FnOnce(String) -> Problem,
    id: Uuid,
) -> Response {
    let (parts, body) = response.into_parts();
    let text = to_bytes(body, LONGEST_TEXT).await.unwrap_or_default();
    let mut answer = problem(String::from_utf8_lossy(&text).into_owned()).answer(Some(id));
    for (name, value) in &parts.headers {
        if !answer.headers().contains_key(name) && name != header::CONTENT_LENGTH {
            answer.headers_mut().append(name, value.clone());
        }
    }
    answer
}

async fn logged(request: Request, next: Next) -> Response {
    let matched = request.extensions().get::<MatchedPath>();
    let path = matched.map_or("unmatched", MatchedPath::as_str);
    let id = request.extensions().get::<RequestId>().map(|id| id.0).unwrap_or_default();
    let span = tracing::info_span!("request", method = %request.method(), path, %id);
    let start = Instant::now();
    async {
        let response = next.run(request).await;
        let status = response.status().as_u16();
        let micros = u64::try_from(start.elapsed().as_micros()).unwrap_or(u64::MAX);
        tracing::info!(status, micros, "answered");
        response
    }
    .instrument(span)
    .await
}

async fn safely(State(behind_tls): State<bool>, request: Request, next: Next) -> Response {
    let mut response = next.run(request).await;
    let headers = response.headers_mut();
    for (name, value) in SAFETY {
        headers.entry(name).or_insert(value);
    }
    if behind_tls {
        headers.insert(header::STRICT_TRANSPORT_SECURITY, TLS_ONLY);
    }
    response
}

#[expect(clippy::needless_pass_by_value, reason = "the layer hands the panic over")]
fn panicked(panic: Box<dyn Any + Send>) -> Response {
    let text = panic.downcast_ref::<String>().map(String::as_str);
    let text = text.or_else(|| panic.downcast_ref::<&str>().copied()).unwrap_or("no text");
    tracing::error!(panic = text, "a handler panicked");
    Problem::new(Kind::Internal, Kind::Internal.advice()).into_response()
}

async fn in_time(State(deadline): State<Duration>, request: Request, next: Next) -> Response {
    let answered = tokio::time::timeout(deadline, next.run(request)).await;
    answered.unwrap_or_else(|_| {
        tracing::warn!(deadline_ms = deadline.as_millis(), "gave up on a request");
        Problem::new(Kind::OutcomeUnknown, Kind::OutcomeUnknown.advice()).into_response()
    })
}

#[cfg(test)]
mod tests;
