//! Request bodies, read strictly: what we do not understand is refused, never ignored.
//!
//! A member that appears twice, is unknown, or has another type; a number with a fraction or beyond 2⁵³−1; text
//! after the document: 400, with a JSON pointer to the place. Decimals come as text, so that the number in the book is
//! the number that was typed (the ledger's canonical form, RFC 8785 without floating point, knows none either). Text is
//! brought into the ledger's form, Unicode normal form C with newlines alone, before anybody sees it; other control
//! characters are refused, and text of more than 2,000 characters is 422.

use axum::body::Bytes;
use axum::extract::rejection::{BytesRejection, FailedToBufferBody};
use axum::extract::{DefaultBodyLimit, FromRequest, Request};
use axum::http::{HeaderMap, header};
use serde::de::DeserializeOwned;
use serde_json::Value;
use serde_path_to_error::Segment;

use crate::amounts::Faults;
use crate::problem::{Kind, Problem};

mod walk;

/// The largest body, in bytes (ours).
pub const LARGEST_BODY: usize = 1 << 20;
/// The longest echo of what the client sent, in characters.
const LONGEST_ECHO: usize = 200;

/// A body of type `T`, and the JSON it was read from.
///
/// `T` must carry `#[serde(deny_unknown_fields)]` at every level and neither `flatten` nor `untagged`, which would lose
/// the place of a fault.
#[derive(Clone, Debug)]
pub struct Strict<T> {
    /// The body.
    pub value: T,
    /// The same as plain JSON, for the digest that makes repeats recognisable. It holds only text, booleans, integers
    /// up to 2⁵³−1, arrays and objects; members that were `null` are left out, as absent and `null` mean the same.
    pub raw: Value,
}

impl<T: DeserializeOwned, S: Send + Sync> FromRequest<S> for Strict<T> {
    type Rejection = Problem;

    async fn from_request(request: Request, state: &S) -> Result<Self, Problem> {
        parse(&body(request, state).await?)
    }
}

/// A body of plain JSON with numbers as they come, for computations, of which nothing is recorded.
#[derive(Clone, Debug)]
pub struct Plain(pub Value);

impl<S: Send + Sync> FromRequest<S> for Plain {
    type Rejection = Problem;

    async fn from_request(request: Request, state: &S) -> Result<Self, Problem> {
        let bytes = body(request, state).await?;
        let read = serde_json::from_slice(&bytes).map(Self);
        read.map_err(|error| Problem::at(Kind::NotReadable, "", error.to_string()))
    }
}

/// The bytes of a JSON body that is not too large.
async fn body<S: Send + Sync>(mut request: Request, state: &S) -> Result<Bytes, Problem> {
    require_json(request.headers())?;
    refuse_if_announced_too_large(request.headers())?;
    DefaultBodyLimit::max(LARGEST_BODY).apply(&mut request);
    Bytes::from_request(request, state).await.map_err(|error| unread(&error))
}

/// Reads a body that has arrived.
///
/// # Errors
/// [`Kind::NotReadable`] with the place, or [`Kind::Meaningless`] with every text that is too long.
pub fn parse<T: DeserializeOwned>(bytes: &[u8]) -> Result<Strict<T>, Problem> {
    let not_readable = |detail: &str| Problem::at(Kind::NotReadable, "", detail);
    let text = std::str::from_utf8(bytes).map_err(|_| not_readable("the body is not UTF-8"))?;
    if text.starts_with('\u{feff}') {
        return Err(not_readable("the body begins with a byte order mark; leave it out"));
    }
    if text.trim_ascii().is_empty() {
        return Err(not_readable("the body is empty"));
    }
    let walk::Read { value: mut raw, too_long } = walk::read(text).map_err(|fault| {
        Problem::at(Kind::NotReadable, shortened(&fault.pointer), shortened(&fault.detail))
    })?;
    let value = serde_path_to_error::deserialize(&raw).map_err(|error| mistyped(&error))?;
    walk::without_nulls(&mut raw);
    if too_long.is_empty() { Ok(Strict { value, raw }) } else { Err(too_long_at(&too_long)) }
}

fn too_long_at(pointers: &[String]) -> Problem {
    let mut faults = Faults::default();
    for pointer in pointers {
        faults.note(
            &shortened(pointer),
            format_args!("text has at most {} characters", walk::LONGEST_TEXT),
        );
    }
    faults.problem()
}

fn require_json(headers: &HeaderMap) -> Result<(), Problem> {
    let declared = headers.get(header::CONTENT_TYPE).and_then(|value| value.to_str().ok());
    if !declared.is_some_and(is_json) {
        return Err(Problem::new(Kind::NotJson, Kind::NotJson.advice()));
    }
    if headers.get(header::CONTENT_ENCODING).is_some_and(|encoding| encoding != "identity") {
        return Err(Problem::new(Kind::NotJson, "send the body without `Content-Encoding`"));
    }
    Ok(())
}

/// `application/json`, with no parameter but `charset=utf-8`.
fn is_json(declared: &str) -> bool {
    let mut parts = declared.split(';').map(str::trim);
    let media_type = parts.next().unwrap_or_default();
    media_type.eq_ignore_ascii_case("application/json")
        && parts.all(|parameter| {
            let parameter = parameter.to_ascii_lowercase();
            ["", "charset=utf-8", "charset=\"utf-8\""].contains(&parameter.as_str())
        })
}

fn refuse_if_announced_too_large(headers: &HeaderMap) -> Result<(), Problem> {
    let announced = headers.get(header::CONTENT_LENGTH).and_then(|value| value.to_str().ok());
    let announced = announced.and_then(|length| length.parse::<usize>().ok());
    if announced.is_some_and(|length| length > LARGEST_BODY) { Err(too_large()) } else { Ok(()) }
}

fn too_large() -> Problem {
    Problem::new(Kind::TooLarge, Kind::TooLarge.advice())
}

fn unread(rejection: &BytesRejection) -> Problem {
    match rejection {
        BytesRejection::FailedToBufferBody(FailedToBufferBody::LengthLimitError(_)) => too_large(),
        _ => Problem::new(Kind::NotReadable, "the body did not arrive whole"),
    }
}

fn mistyped(error: &serde_path_to_error::Error<serde_json::Error>) -> Problem {
    let mut pointer = String::new();
    for segment in error.path() {
        match segment {
            Segment::Seq { index } => walk::push_step(&mut pointer, &index.to_string()),
            Segment::Map { key } => walk::push_step(&mut pointer, key),
            Segment::Enum { variant } => walk::push_step(&mut pointer, variant),
            Segment::Unknown => {}
        }
    }
    let detail = walk::without_position(error.inner());
    Problem::at(Kind::NotReadable, shortened(&pointer), shortened(&detail))
}

fn shortened(text: &str) -> String {
    match text.char_indices().nth(LONGEST_ECHO) {
        Some((end, _)) => format!("{}…", &text[..end]),
        None => text.to_owned(),
    }
}

#[cfg(test)]
mod tests;
