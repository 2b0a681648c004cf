//! Entity tags: a batch, lot or material is tagged with its running number n, which every entry about it raises.

use axum::extract::FromRequestParts;
use axum::http::request::Parts;
use axum::http::{HeaderMap, HeaderValue, StatusCode, header};
use axum::response::{IntoResponse, Response};

use crate::problem::{Kind, Problem};

/// The `ETag` of something at its running number n: strong, `"n"`.
pub fn etag(n: u64) -> HeaderValue {
    // Digits and quotes are always a header value.
    HeaderValue::try_from(format!("\"{n}\"")).unwrap_or_else(|_| HeaderValue::from_static("\"\""))
}

/// The client's `If-Match` (RFC 9110 section 13.1.1); missing is 428.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct IfMatch(Wanted);

#[derive(Clone, Debug, Eq, PartialEq)]
enum Wanted {
    /// `*`: whatever it is, as long as it is there.
    Any,
    /// One of these.
    Tags(Vec<Tag>),
}

#[derive(Clone, Debug, Eq, PartialEq)]
struct Tag {
    weak: bool,
    opaque: String,
}

impl IfMatch {
    /// The running number the client saw, if the thing still stands there; otherwise one that nothing ever has, so that
    /// the writer, who alone can tell a repeat from a late change, refuses what is not a repeat.
    pub fn seen(&self, n: u64) -> u64 {
        if self.check(n).is_ok() { n } else { u64::MAX }
    }

    /// Whether the thing still stands at the number the client saw.
    ///
    /// # Errors
    /// [`Kind::Stale`] (412) if not. A weak tag never matches here.
    pub fn check(&self, n: u64) -> Result<(), Problem> {
        let current = n.to_string();
        let matches = match &self.0 {
            Wanted::Any => true,
            Wanted::Tags(tags) => tags.iter().any(|tag| !tag.weak && tag.opaque == current),
        };
        if matches {
            Ok(())
        } else {
            Err(Problem::new(Kind::Stale, format!("it now stands at ETag \"{n}\"")))
        }
    }
}

impl<S: Send + Sync> FromRequestParts<S> for IfMatch {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, _: &S) -> Result<Self, Problem> {
        if !parts.headers.contains_key(header::IF_MATCH) {
            return Err(Problem::new(Kind::ConditionMissing, Kind::ConditionMissing.advice()));
        }
        wanted(&parts.headers, header::IF_MATCH).map(Self).ok_or_else(|| {
            Problem::new(
                Kind::NotReadable,
                "`If-Match` must hold an ETag such as \"58\", with its quotes",
            )
        })
    }
}

/// The 304 for a client that already has the thing at n (`If-None-Match`, RFC 9110 section 13.1.2), if it has. A header
/// that cannot be read asks for nothing.
pub fn unchanged(headers: &HeaderMap, n: u64) -> Option<Response> {
    let known = match wanted(headers, header::IF_NONE_MATCH)? {
        Wanted::Any => true,
        Wanted::Tags(tags) => tags.iter().any(|tag| tag.opaque == n.to_string()),
    };
    known.then(|| (StatusCode::NOT_MODIFIED, [(header::ETAG, etag(n))]).into_response())
}

/// The tags of a header; `None` if it is missing or malformed.
fn wanted(headers: &HeaderMap, name: header::HeaderName) -> Option<Wanted> {
    let mut tags = Vec::new();
    let mut any = false;
    for value in headers.get_all(name) {
        let text = value.to_str().ok()?.trim();
        if text == "*" {
            any = true;
            continue;
        }
        // Our tags are digits, so a comma inside a tag, which the RFC allows, cannot match anyway.
        for part in text.split(',') {
            tags.push(tag(part.trim())?);
        }
    }
    match (any, tags.is_empty()) {
        (true, true) => Some(Wanted::Any),
        (false, false) => Some(Wanted::Tags(tags)),
        _ => None,
    }
}

fn tag(text: &str) -> Option<Tag> {
    let (weak, quoted) = text.strip_prefix("W/").map_or((false, text), |rest| (true, rest));
    let opaque = quoted.strip_prefix('"')?.strip_suffix('"')?;
    (!opaque.contains('"')).then(|| Tag { weak, opaque: opaque.to_owned() })
}

#[cfg(test)]
mod tests {
    use axum::Router;
    use axum::body::Body;
    use axum::extract::Request;
    use axum::routing::{get, put};
    use tower::ServiceExt;

    use super::*;

    const N: u64 = 58;

    async fn answer(method: &str, name: Option<&str>, value: &str) -> Response {
        async fn change(condition: IfMatch) -> Result<StatusCode, Problem> {
            condition.check(N).map(|()| StatusCode::NO_CONTENT)
        }
        async fn show(headers: HeaderMap) -> Response {
            unchanged(&headers, N).unwrap_or_else(|| [(header::ETAG, etag(N))].into_response())
        }
        let router: Router = Router::new().route("/", put(change).merge(get(show)));
        let mut request = Request::builder().method(method).uri("/");
        if let Some(name) = name {
            request = request.header(name, value);
        }
        router.oneshot(request.body(Body::empty()).unwrap()).await.unwrap()
    }

    #[tokio::test]
    async fn a_change_needs_the_tag_that_is_current() {
        assert_eq!(answer("PUT", None, "").await.status(), 428);
        for current in ["\"58\"", "\"57\", \"58\"", "*", " \"58\" "] {
            assert_eq!(answer("PUT", Some("if-match"), current).await.status(), 204, "{current}");
        }
        for stale in ["\"57\"", "W/\"58\"", "\"058\"", "\"\""] {
            assert_eq!(answer("PUT", Some("if-match"), stale).await.status(), 412, "{stale}");
        }
        for malformed in ["58", "\"58", "'58'", "", "\"58\",", "\"5\"8\"", "w/\"58\"", "\"5,8\""] {
            let status = answer("PUT", Some("if-match"), malformed).await.status();
            assert_eq!(status, 400, "{malformed:?}");
        }
    }

    #[tokio::test]
    async fn a_reader_who_has_it_gets_304_and_the_tag() {
        for known in ["\"58\"", "W/\"58\"", "\"1\",\"58\"", "*"] {
            let response = answer("GET", Some("if-none-match"), known).await;
            assert_eq!(response.status(), 304, "{known}");
            assert_eq!(response.headers()["etag"], "\"58\"");
        }
        for other in ["\"57\"", "58", "", "nonsense"] {
            assert_eq!(answer("GET", Some("if-none-match"), other).await.status(), 200, "{other}");
        }
        assert_eq!(answer("GET", None, "").await.headers()["etag"], "\"58\"");
    }
}
