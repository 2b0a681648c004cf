//! The catalogue of problem types.

use axum::http::StatusCode;

/// A kind of problem: what stands behind its `type`.
#[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
pub enum Kind {
    /// The body is not JSON as described.
    NotReadable,
    /// A POST that records something came without an `Idempotency-Key`.
    KeyMissing,
    /// The `Idempotency-Key` is not a UUID.
    KeyMalformed,
    /// No token.
    SignIn,
    /// A token that is not (or no longer) good.
    TokenRefused,
    /// Name, password or code do not fit.
    CredentialsRefused,
    /// Signed in, but without the role.
    Forbidden,
    /// No such thing, or not the caller's.
    NotFound,
    /// The path is right, the method is not.
    MethodNotAllowed,
    /// No representation the client accepts.
    NotAcceptable,
    /// A rule refuses it.
    Refused,
    /// The state of the thing refuses it.
    Conflict,
    /// A repeat of a request whose answer was a secret.
    AnsweredOnce,
    /// The thing changed since the client read it.
    Stale,
    /// The body is too large.
    TooLarge,
    /// The body is not declared as JSON.
    NotJson,
    /// Readable, but some of it has no meaning.
    Meaningless,
    /// The `Idempotency-Key` was used with another body.
    KeyReused,
    /// `If-Match` is missing.
    ConditionMissing,
    /// Too many requests.
    TooMany,
    /// A fault of ours.
    Internal,
    /// Not possible at this moment.
    Unavailable,
    /// The request took too long, or the connection was lost during a commit.
    OutcomeUnknown,
}

/// What the catalogue says of one kind.
struct Entry {
    slug: &'static str,
    title: &'static str,
    status: StatusCode,
    advice: &'static str,
}

impl Kind {
    /// Every kind, for the page and the interface's description.
    pub const ALL: [Self; 23] = [
        Self::NotReadable,
        Self::KeyMissing,
        Self::KeyMalformed,
        Self::SignIn,
        Self::TokenRefused,
        Self::CredentialsRefused,
        Self::Forbidden,
        Self::NotFound,
        Self::MethodNotAllowed,
        Self::NotAcceptable,
        Self::Refused,
        Self::Conflict,
        Self::AnsweredOnce,
        Self::Stale,
        Self::TooLarge,
        Self::NotJson,
        Self::Meaningless,
        Self::KeyReused,
        Self::ConditionMissing,
        Self::TooMany,
        Self::Internal,
        Self::Unavailable,
        Self::OutcomeUnknown,
    ];

    /// The last part of its address.
    pub const fn slug(self) -> &'static str {
        self.entry().slug
    }

    /// Its address, the `type` of the document.
    pub fn address(self) -> String {
        format!("/problems/{}", self.slug())
    }

    /// It in words.
    pub const fn title(self) -> &'static str {
        self.entry().title
    }

    /// The HTTP status it is answered with.
    pub const fn status(self) -> StatusCode {
        self.entry().status
    }

    /// What the client's author or user can do about it.
    pub const fn advice(self) -> &'static str {
        self.entry().advice
    }

    /// The `WWW-Authenticate` of a 401 (RFC 6750 section 3).
    pub(super) fn challenge(self) -> Option<&'static str> {
        match self {
            Self::TokenRefused => Some("Bearer realm=\"tallystave\", error=\"invalid_token\""),
            _ if self.status() == StatusCode::UNAUTHORIZED => Some("Bearer realm=\"tallystave\""),
            _ => None,
        }
    }

    /// The kind for an answer that somebody else's code made, known by its status alone.
    pub(crate) fn of_status(status: StatusCode) -> Option<Self> {
        Some(match status {
            StatusCode::BAD_REQUEST => Self::NotReadable,
            StatusCode::UNAUTHORIZED => Self::SignIn,
            StatusCode::FORBIDDEN => Self::Forbidden,
            StatusCode::NOT_FOUND => Self::NotFound,
            StatusCode::METHOD_NOT_ALLOWED => Self::MethodNotAllowed,
            StatusCode::NOT_ACCEPTABLE => Self::NotAcceptable,
            StatusCode::PAYLOAD_TOO_LARGE => Self::TooLarge,
            StatusCode::UNSUPPORTED_MEDIA_TYPE => Self::NotJson,
            StatusCode::UNPROCESSABLE_ENTITY => Self::Meaningless,
            StatusCode::INTERNAL_SERVER_ERROR => Self::Internal,
            StatusCode::SERVICE_UNAVAILABLE => Self::Unavailable,
            _ => return None,
        })
    }

    #[expect(clippy::too_many_lines, reason = "a table, one row per kind")]
    const fn entry(self) -> Entry {
        match self {
            Self::NotReadable => Entry {
                slug: "not-readable",
                title: "The request cannot be read",
                status: StatusCode::BAD_REQUEST,
                advice: "Send what the interface's description asks for: every member of the right type, none \
                         twice, none unknown. `errors` points at the place.",
            },
            Self::KeyMissing => Entry {
                slug: "idempotency-key-missing",
                title: "Idempotency-Key is missing",
                status: StatusCode::BAD_REQUEST,
                advice: "Send a new UUID in the header `Idempotency-Key`, and the same one again if you repeat \
                         the request because no answer arrived: nothing is then recorded twice.",
            },
            Self::KeyMalformed => Entry {
                slug: "idempotency-key-malformed",
                title: "Idempotency-Key is not a UUID",
                status: StatusCode::BAD_REQUEST,
                advice: "Send one UUID with hyphens, with or without double quotes.",
            },
            Self::SignIn => Entry {
                slug: "sign-in",
                title: "Sign in first",
                status: StatusCode::UNAUTHORIZED,
                advice: "Get an access token from `POST /v1/sessions` and send it as `Authorization: Bearer …`.",
            },
            Self::TokenRefused => Entry {
                slug: "token-refused",
                title: "The access token is not accepted",
                status: StatusCode::UNAUTHORIZED,
                advice: "Tokens last 15 minutes, for one site, and end when the person is disabled. Sign in again.",
            },
            Self::CredentialsRefused => Entry {
                slug: "credentials-refused",
                title: "Name or password is wrong",
                status: StatusCode::UNAUTHORIZED,
                advice: "Check both; after several failures the next try has to wait.",
            },
            Self::Forbidden => Entry {
                slug: "forbidden",
                title: "None of your roles allows this",
                status: StatusCode::FORBIDDEN,
                advice: "Ask an administrator of the site for the role, or somebody who has it to do it.",
            },
            Self::NotFound => Entry {
                slug: "not-found",
                title: "There is no such thing here",
                status: StatusCode::NOT_FOUND,
                advice: "Check the address, and that you are signed in to the site it belongs to.",
            },
            Self::MethodNotAllowed => Entry {
                slug: "method-not-allowed",
                title: "This address does not take that method",
                status: StatusCode::METHOD_NOT_ALLOWED,
                advice: "Use one of the methods in the header `Allow`.",
            },
            Self::NotAcceptable => Entry {
                slug: "not-acceptable",
                title: "Not available in a form you accept",
                status: StatusCode::NOT_ACCEPTABLE,
                advice: "Name one of the offered media types in `Accept`, or leave the header out.",
            },
            Self::Refused => Entry {
                slug: "refused",
                title: "A rule refuses this",
                status: StatusCode::CONFLICT,
                advice: "Nothing was recorded. Read the findings: they name the rule, its source and what would \
                         be allowed. What has already been done is recorded with `already_done` and a reason.",
            },
            Self::Conflict => Entry {
                slug: "conflict",
                title: "Not possible in this state",
                status: StatusCode::CONFLICT,
                advice: "Nothing was recorded. Read the thing again; its state has to change first.",
            },
            Self::AnsweredOnce => Entry {
                slug: "answered-once",
                title: "Already done, and its answer is not repeated",
                status: StatusCode::CONFLICT,
                advice: "The answer held a secret that is not kept. If it was lost, revoke it and ask for a new \
                         one with a new `Idempotency-Key`.",
            },
            Self::Stale => Entry {
                slug: "stale",
                title: "It changed since you read it",
                status: StatusCode::PRECONDITION_FAILED,
                advice: "Read it again, look at what changed, and repeat with the new `ETag` in `If-Match`.",
            },
            Self::TooLarge => Entry {
                slug: "too-large",
                title: "The body is too large",
                status: StatusCode::PAYLOAD_TOO_LARGE,
                advice: "Send at most 1 MiB of JSON; split long lists over several requests.",
            },
            Self::NotJson => Entry {
                slug: "not-json",
                title: "The body is not declared as JSON",
                status: StatusCode::UNSUPPORTED_MEDIA_TYPE,
                advice: "Send `Content-Type: application/json`, in UTF-8 and not compressed.",
            },
            Self::Meaningless => Entry {
                slug: "meaningless",
                title: "Readable, but it cannot be meant so",
                status: StatusCode::UNPROCESSABLE_ENTITY,
                advice: "Nothing was recorded. Correct every place that `errors` points at.",
            },
            Self::KeyReused => Entry {
                slug: "idempotency-key-reused",
                title: "This Idempotency-Key belongs to another request",
                status: StatusCode::UNPROCESSABLE_ENTITY,
                advice: "Use a new UUID for each new request; repeat a request with exactly its first body.",
            },
            Self::ConditionMissing => Entry {
                slug: "if-match-missing",
                title: "If-Match is missing",
                status: StatusCode::PRECONDITION_REQUIRED,
                advice: "Read the thing first and send its `ETag` in `If-Match`, so that nobody's change is lost.",
            },
            Self::TooMany => Entry {
                slug: "too-many",
                title: "Too many requests",
                status: StatusCode::TOO_MANY_REQUESTS,
                advice: "Wait as many seconds as `Retry-After` says.",
            },
            Self::Internal => Entry {
                slug: "internal",
                title: "A fault of ours",
                status: StatusCode::INTERNAL_SERVER_ERROR,
                advice: "Tell the operator the `instance`: the log has the cause under that id. Repeat with the \
                         same `Idempotency-Key`: what was recorded is not recorded again.",
            },
            Self::Unavailable => Entry {
                slug: "unavailable",
                title: "Not possible at this moment",
                status: StatusCode::SERVICE_UNAVAILABLE,
                advice: "Try again after `Retry-After` seconds.",
            },
            Self::OutcomeUnknown => Entry {
                slug: "outcome-unknown",
                title: "No answer in time",
                status: StatusCode::SERVICE_UNAVAILABLE,
                advice: "It may or may not have been recorded. Send it again with the same `Idempotency-Key`.",
            },
        }
    }
}

#[cfg(test)]
mod tests {
    use std::collections::HashSet;

    use super::*;

    #[test]
    fn every_kind_has_its_own_address_and_says_what_to_do() {
        let slugs: HashSet<_> = Kind::ALL.iter().map(|kind| kind.slug()).collect();
        assert_eq!(slugs.len(), Kind::ALL.len());
        for kind in Kind::ALL {
            assert!(kind.slug().bytes().all(|b| b.is_ascii_lowercase() || b == b'-'), "{kind:?}");
            assert!(kind.status().is_client_error() || kind.status().is_server_error());
            assert!(kind.advice().ends_with('.') && !kind.title().ends_with('.'), "{kind:?}");
        }
    }

    #[test]
    fn a_status_leads_to_a_kind_of_that_status() {
        for kind in Kind::ALL {
            if let Some(other) = Kind::of_status(kind.status()) {
                assert_eq!(other.status(), kind.status());
            }
        }
        assert_eq!(Kind::of_status(StatusCode::IM_A_TEAPOT), None);
    }
}
