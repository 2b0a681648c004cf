//! Who is calling.
//!
//! The router's middleware takes the token ([`bearer`]), asks the house whom it belongs to and the permission table
//! whether they may, and puts a [`Caller`] into the request. Handlers take it out again; one that is reached without
//! answers 401, so a forgotten middleware closes a door and opens none.

use axum::extract::FromRequestParts;
use axum::http::request::Parts;
use axum::http::{HeaderMap, header};
use domain::ids::{PersonId, SiteId};
use house::roles::Role;

use crate::problem::{Kind, Problem};

/// The person behind a request, on the one site of their token.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Caller {
    /// Who.
    pub person: PersonId,
    /// Where: every id in the request is looked up within this site.
    pub site: SiteId,
    /// What they are there, as of this request.
    pub roles: Vec<Role>,
}

impl Caller {
    /// Whether the caller holds a role on the site.
    pub fn has(&self, role: Role) -> bool {
        self.roles.contains(&role)
    }
}

impl<S: Send + Sync> FromRequestParts<S> for Caller {
    type Rejection = Problem;

    async fn from_request_parts(parts: &mut Parts, _: &S) -> Result<Self, Problem> {
        parts.extensions.get().cloned().ok_or_else(sign_in)
    }
}

/// The token of `Authorization: Bearer …` (RFC 6750 section 2.1), not yet checked.
///
/// # Errors
/// [`Kind::SignIn`] if there is none; [`Kind::TokenRefused`] if the header is doubled or not of that form.
pub fn bearer(headers: &HeaderMap) -> Result<&str, Problem> {
    let mut values = headers.get_all(header::AUTHORIZATION).iter();
    let value = values.next().ok_or_else(sign_in)?;
    if values.next().is_some() {
        return Err(refused("send one `Authorization`, not several"));
    }
    let token = value.to_str().ok().and_then(|text| text.split_once(' '));
    match token {
        Some((scheme, token)) if scheme.eq_ignore_ascii_case("bearer") && is_token(token) => {
            Ok(token)
        }
        _ => Err(refused("`Authorization` must be `Bearer` and an access token")),
    }
}

fn sign_in() -> Problem {
    Problem::new(Kind::SignIn, Kind::SignIn.advice())
}

fn refused(detail: &str) -> Problem {
    Problem::new(Kind::TokenRefused, detail)
}

/// The characters of a bearer token (RFC 6750 section 2.1, `b64token`).
fn is_token(text: &str) -> bool {
    let allowed = |byte: u8| byte.is_ascii_alphanumeric() || b"-._~+/=".contains(&byte);
    !text.is_empty() && text.bytes().all(allowed)
}

#[cfg(test)]
mod tests {
    use axum::Router;
    use axum::body::Body;
    use axum::extract::Request;
    use axum::http::HeaderValue;
    use axum::routing::get;
    use tower::ServiceExt;
    use uuid::Uuid;

    use super::*;

    fn bearer_of(values: &[&str]) -> Result<String, Kind> {
        let mut headers = HeaderMap::new();
        for value in values {
            headers.append(header::AUTHORIZATION, HeaderValue::from_str(value).unwrap());
        }
        bearer(&headers).map(str::to_owned).map_err(|problem| problem.kind())
    }

    #[test]
    fn a_bearer_token_is_found_whatever_the_schemes_capitals() {
        for scheme in ["Bearer", "bearer", "BEARER"] {
            assert_eq!(bearer_of(&[&format!("{scheme} a.b-c_d.e")]), Ok("a.b-c_d.e".to_owned()));
        }
    }

    #[test]
    fn other_schemes_shapes_and_doubled_headers_are_refused() {
        assert_eq!(bearer_of(&[]), Err(Kind::SignIn));
        for value in [
            "",
            "Bearer",
            "Bearer ",
            "Bearer  a",
            "Bearer a b",
            "Basic YTpi",
            "a.b.c",
            "Bearer a,b",
            "Bearer\ta",
        ] {
            assert_eq!(bearer_of(&[value]), Err(Kind::TokenRefused), "{value:?}");
        }
        assert_eq!(bearer_of(&["Bearer a", "Bearer a"]), Err(Kind::TokenRefused));
    }

    #[tokio::test]
    async fn a_handler_gets_the_caller_from_the_middleware_and_is_closed_without() {
        async fn site(caller: Caller) -> String {
            caller.site.to_string()
        }
        let router: Router = Router::new().route("/", get(site));
        let mut request = Request::get("/").body(Body::empty()).unwrap();
        let without = router.clone().oneshot(request).await.unwrap();
        assert_eq!(without.status(), 401);
        assert!(without.headers().contains_key("www-authenticate"));
        request = Request::get("/").body(Body::empty()).unwrap();
        let (person, site) = (PersonId(Uuid::from_u128(1)), SiteId(Uuid::from_u128(2)));
        request.extensions_mut().insert(Caller { person, site, roles: vec![Role::Lead] });
        assert_eq!(router.oneshot(request).await.unwrap().status(), 200);
    }
}
