//! What the house refuses or cannot do, as problems.

use domain::book::command::{Refusal, RefusalKind};
use house::HouseError;
use store::writer::WriteError;

use crate::problem::{Kind, Problem};

impl From<HouseError> for Problem {
    fn from(error: HouseError) -> Self {
        match error {
            HouseError::Refused(refusal) => refusal.into(),
            HouseError::Write(write) => not_written(&write),
            HouseError::Unauthorised => Self::new(Kind::TokenRefused, Kind::TokenRefused.advice()),
            HouseError::WrongSecret => {
                Self::new(Kind::CredentialsRefused, Kind::CredentialsRefused.advice())
            }
            HouseError::Weak(weakness) => {
                Self::at(Kind::Meaningless, "/password", weakness.to_string())
            }
            HouseError::Busy => Self::new(
                Kind::Unavailable,
                "too many people sign in at this moment: try again in a second",
            ),
            HouseError::FoundingClosed => {
                Self::new(Kind::Forbidden, "this founding link is not valid, or not any more")
            }
            HouseError::Clock(error) => Self::at(Kind::Meaningless, "/now", error.to_string()),
            HouseError::Store(ref store) if store.is_unavailable() => {
                Self::new(Kind::Unavailable, "the database cannot be reached at this moment")
            }
            other => Self::internal(&other),
        }
    }
}

impl From<Refusal> for Problem {
    fn from(refusal: Refusal) -> Self {
        let kind = match refusal.kind {
            RefusalKind::Unknown => return Self::new(Kind::NotFound, refusal.detail),
            RefusalKind::Conflict => Kind::Conflict,
            RefusalKind::Meaningless => Kind::Meaningless,
            RefusalKind::Forbidden => Kind::Forbidden,
            RefusalKind::Stale => Kind::Stale,
        };
        match refusal.pointer {
            Some(pointer) => Self::at(kind, pointer, refusal.detail),
            None => Self::new(kind, refusal.detail),
        }
    }
}

fn not_written(error: &WriteError) -> Problem {
    match error {
        WriteError::Refused(refusal) => refusal.clone().into(),
        WriteError::KeyReused => Problem::new(Kind::KeyReused, Kind::KeyReused.advice()),
        WriteError::NoSite => Problem::new(Kind::NotFound, "there is no such site"),
        WriteError::Unsure(_) => Problem::new(Kind::OutcomeUnknown, Kind::OutcomeUnknown.advice()),
        WriteError::ClockBehind { .. } | WriteError::Closing => {
            Problem::new(Kind::Unavailable, error.to_string())
        }
        WriteError::Store(store) if store.is_unavailable() => {
            Problem::new(Kind::Unavailable, "the database cannot be reached at this moment")
        }
        _ => Problem::internal(error),
    }
}
