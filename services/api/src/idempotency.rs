//! The key under which a request may be repeated without being recorded twice.

use axum::extract::FromRequestParts;
use axum::http::HeaderMap;
use axum::http::request::Parts;
use domain::ids::CommandId;
use uuid::Uuid;

use crate::problem::{Kind, Problem};

/// The header's name.
pub const IDEMPOTENCY_KEY: &str = "idempotency-key";

/// The client's `Idempotency-Key`: a UUID, as it is or in double quotes (a structured field's string).
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct IdempotencyKey(pub CommandId);

impl<S: Send + Sync> FromRequestParts<S> for IdempotencyKey {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, _: &S) -> Result<Self, Problem> {
        read(&parts.headers)
    }
}

fn read(headers: &HeaderMap) -> Result<IdempotencyKey, Problem> {
    let malformed = || Problem::new(Kind::KeyMalformed, Kind::KeyMalformed.advice());
    let mut values = headers.get_all(IDEMPOTENCY_KEY).iter();
    let Some(value) = values.next() else {
        return Err(Problem::new(Kind::KeyMissing, Kind::KeyMissing.advice()));
    };
    if values.next().is_some() {
        return Err(Problem::new(Kind::KeyMalformed, "send one `Idempotency-Key`, not several"));
    }
    let text = value.to_str().map_err(|_| malformed())?;
    let quoted = text.strip_prefix('"').and_then(|rest| rest.strip_suffix('"'));
    key_of(quoted.unwrap_or(text)).ok_or_else(malformed)
}

/// Only the hyphenated form, and not the nil UUID, which is what an unset variable looks like.
fn key_of(text: &str) -> Option<IdempotencyKey> {
    let id = Uuid::try_parse(text).ok()?;
    (text.len() == 36 && !id.is_nil()).then_some(IdempotencyKey(CommandId(id)))
}

#[cfg(test)]
mod tests {
    use axum::http::HeaderValue;

    use super::*;

    const KEY: &str = "0198f2a4-5b1c-7d3e-8f90-a1b2c3d4e5f6";

    fn read_from(values: &[&str]) -> Result<IdempotencyKey, Problem> {
        let mut headers = HeaderMap::new();
        for value in values {
            headers.append(IDEMPOTENCY_KEY, HeaderValue::from_str(value).unwrap());
        }
        read(&headers)
    }

    #[test]
    fn a_uuid_is_accepted_quoted_or_not_and_in_capitals() {
        let wanted = IdempotencyKey(KEY.parse().unwrap());
        assert_eq!(read_from(&[KEY]), Ok(wanted));
        assert_eq!(read_from(&[&format!("\"{KEY}\"")]), Ok(wanted));
        assert_eq!(read_from(&[&KEY.to_uppercase()]), Ok(wanted));
    }

    #[test]
    fn a_missing_key_is_told_what_to_do() {
        let problem = read_from(&[]).unwrap_err();
        assert_eq!(problem.kind(), Kind::KeyMissing);
        assert!(problem.detail().contains("new UUID"), "{}", problem.detail());
    }

    #[test]
    fn anything_else_is_malformed() {
        let nil = Uuid::nil().to_string();
        for value in [
            "",
            "1",
            "order-17",
            &KEY[..35],
            &nil,
            &KEY.replace('-', ""),
            &format!("{{{KEY}}}"),
            &format!("urn:uuid:{KEY}"),
            &format!("\"{KEY}"),
            &format!("'{KEY}'"),
            &format!("{KEY},{KEY}"),
        ] {
            assert_eq!(read_from(&[value]).unwrap_err().kind(), Kind::KeyMalformed, "{value:?}");
        }
        assert_eq!(read_from(&[KEY, KEY]).unwrap_err().kind(), Kind::KeyMalformed);
    }
}
