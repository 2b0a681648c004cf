//! Why a use case did not do what was asked.

use domain::book::command::Refusal;
use store::StoreError;
use store::writer::WriteError;

use crate::clock::ClockError;
use crate::ids::NoRandomness;
use crate::passwords::{PasswordError, Weakness};
use crate::tokens::TokenError;

/// See the module. Each variant is something a caller answers differently.
#[derive(Debug, thiserror::Error)]
pub enum HouseError {
    /// The book refuses, and says why.
    #[error("refused: {}", .0.detail)]
    Refused(Refusal),
    /// The writer could not or would not write.
    #[error("not written")]
    Write(#[source] WriteError),
    /// The store failed.
    #[error("the store failed")]
    Store(#[from] StoreError),
    /// Wrong name, wrong password, disabled, or a token that is not ours: the same to a stranger.
    #[error("not signed in")]
    Unauthorised,
    /// The secret that a signature asks for again is wrong.
    #[error("wrong secret")]
    WrongSecret,
    /// The password is too weak.
    #[error("the password is not accepted: {0}")]
    Weak(#[from] Weakness),
    /// Too many sign-ins at this moment.
    #[error("too many sign-ins at this moment")]
    Busy,
    /// The founding token is wrong, used up, or has run out.
    #[error("the founding link is not valid any more")]
    FoundingClosed,
    /// The clock cannot be set so.
    #[error(transparent)]
    Clock(#[from] ClockError),
    /// Something of the program or the machine failed.
    #[error("the program failed: {0}")]
    Failed(String),
}

impl From<WriteError> for HouseError {
    fn from(error: WriteError) -> Self {
        match error {
            WriteError::Refused(refusal) => Self::Refused(refusal),
            other => Self::Write(other),
        }
    }
}

impl From<PasswordError> for HouseError {
    fn from(error: PasswordError) -> Self {
        match error {
            PasswordError::Busy => Self::Busy,
            other => Self::Failed(other.to_string()),
        }
    }
}

impl From<NoRandomness> for HouseError {
    fn from(error: NoRandomness) -> Self {
        Self::Failed(error.to_string())
    }
}

impl From<TokenError> for HouseError {
    fn from(error: TokenError) -> Self {
        match error {
            TokenError::Unsigned | TokenError::Randomness(_) => Self::Failed(error.to_string()),
            _ => Self::Unauthorised,
        }
    }
}
