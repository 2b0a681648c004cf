//! Passwords: what is accepted, how it is kept, how it is compared.
//!
//! Kept as Argon2id (RFC 9106) with 19 MiB, two passes, one lane: the least of the equal choices in the OWASP
//! Password Storage Cheat Sheet. A hash takes about 20 ms and 19 MiB, so at most [`AT_ONCE`] run together, a bounded
//! number wait, and the rest are told to come back.
//!
//! A password is compared whole: no trimming, no change of case, no cutting. Its Unicode text is brought to
//! normalisation form C first, since keyboards differ in how they send an accented letter; nothing else is altered.
//!
//! What is accepted as a new one, [`check_policy`] says.

use std::sync::Arc;

use argon2::password_hash::phc::PasswordHash;
use argon2::password_hash::{self, PasswordHasher, PasswordVerifier};
use argon2::{Argon2, Params};
use tokio::sync::{OwnedSemaphorePermit, Semaphore};
use unicode_normalization::UnicodeNormalization;
use zeroize::Zeroizing;

pub use policy::{LONGEST_BYTES, SHORTEST, Weakness, check_policy};

mod policy;

/// How many hashes run at once: 2 × 19 MiB (ours).
pub const AT_ONCE: usize = 2;
/// How many callers may wait for their turn, about a third of a second (ours).
pub const WAITING: usize = 32;

/// Why no answer could be given.
#[derive(Debug, thiserror::Error)]
pub enum PasswordError {
    /// Too many are waiting already; the caller should try again in a second.
    #[error("too many sign-ins at this moment")]
    Busy,
    /// Hashing itself failed, or a stored hash is not one of ours.
    #[error("a password could not be hashed or compared")]
    Hashing(#[from] password_hash::Error),
    /// The thread that hashed was lost.
    #[error("a password could not be hashed or compared")]
    Lost(#[from] tokio::task::JoinError),
}

/// What a comparison found.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Verified {
    /// Wrong password, or nobody of that name.
    No,
    /// The right one.
    Yes {
        /// Whether it was kept with other parameters than today's and should be hashed anew.
        outdated: bool,
    },
}

fn normalised(password: &str) -> Zeroizing<String> {
    Zeroizing::new(password.nfc().collect())
}

/// Hashes and compares passwords, a few at a time.
#[derive(Clone, Debug)]
pub struct Passwords {
    places: Arc<Semaphore>,
    turns: Arc<Semaphore>,
    /// Compared with when there is no such person, so that the answer takes as long.
    nobody: Arc<str>,
}

/// A place in the queue and a turn to hash; given back when the hash is done, even if nobody waits for it any more.
struct Turn {
    _place: OwnedSemaphorePermit,
    _turn: OwnedSemaphorePermit,
}

impl Passwords {
    /// Makes the hash that stands for nobody: about 20 ms.
    ///
    /// # Errors
    /// [`PasswordError::Hashing`] if there is no randomness or memory.
    pub fn new() -> Result<Self, PasswordError> {
        let mut secret = Zeroizing::new([0_u8; 32]);
        getrandom::fill(&mut *secret).map_err(|_| password_hash::Error::RngFailure)?;
        Ok(Self {
            places: Arc::new(Semaphore::new(AT_ONCE + WAITING)),
            turns: Arc::new(Semaphore::new(AT_ONCE)),
            nobody: hash_now(&*secret)?.into(),
        })
    }

    /// Hashes a password into a PHC string with its own random salt. Check the policy before.
    ///
    /// # Errors
    /// [`PasswordError::Busy`] when too many wait; otherwise a fault of ours.
    pub async fn hash(&self, password: &str) -> Result<String, PasswordError> {
        let password = normalised(password);
        let turn = self.turn().await?;
        let work = move || {
            let _turn = turn;
            hash_now(password.as_bytes())
        };
        Ok(tokio::task::spawn_blocking(work).await??)
    }

    /// Compares a password with what is stored; `None` (nobody of that name) takes as long and says no.
    ///
    /// # Errors
    /// [`PasswordError::Busy`] when too many wait; otherwise a fault of ours.
    pub async fn verify(
        &self,
        password: &str,
        stored: Option<&str>,
    ) -> Result<Verified, PasswordError> {
        let known = stored.is_some();
        let stored = stored.unwrap_or(&self.nobody).to_owned();
        // Longer than any accepted password: only the length matters for the time, and it cannot match.
        let fits = password.len() <= 4 * LONGEST_BYTES;
        let password = normalised(if fits { password } else { "" });
        let turn = self.turn().await?;
        let work = move || {
            let _turn = turn;
            verify_now(password.as_bytes(), &stored)
        };
        let found = tokio::task::spawn_blocking(work).await??;
        Ok(if known && fits { found } else { Verified::No })
    }

    async fn turn(&self) -> Result<Turn, PasswordError> {
        let place =
            Arc::clone(&self.places).try_acquire_owned().map_err(|_| PasswordError::Busy)?;
        let turn =
            Arc::clone(&self.turns).acquire_owned().await.map_err(|_| PasswordError::Busy)?;
        Ok(Turn { _place: place, _turn: turn })
    }
}

fn hash_now(password: &[u8]) -> Result<String, password_hash::Error> {
    let hash: PasswordHash = Argon2::default().hash_password(password)?;
    Ok(hash.to_string())
}

fn verify_now(password: &[u8], stored: &str) -> Result<Verified, password_hash::Error> {
    let hash = PasswordHash::new(stored).map_err(|_| password_hash::Error::EncodingInvalid)?;
    match Argon2::default().verify_password(password, &hash) {
        Ok(()) => Ok(Verified::Yes { outdated: is_outdated(&hash) }),
        Err(password_hash::Error::PasswordInvalid) => Ok(Verified::No),
        Err(error) => Err(error),
    }
}

fn is_outdated(hash: &PasswordHash) -> bool {
    let today = Params::default();
    let kept = Params::try_from(hash);
    hash.algorithm != argon2::ARGON2ID_IDENT
        || kept.map_or(true, |kept| {
            (kept.m_cost(), kept.t_cost(), kept.p_cost())
                != (today.m_cost(), today.t_cost(), today.p_cost())
        })
}

#[cfg(test)]
mod tests {
    use std::time::{Duration, Instant};

    use argon2::password_hash::CustomizedPasswordHasher;

    use super::*;

    const GOOD: &str = "quiet lantern over seven hills";

    #[tokio::test]
    async fn the_whole_password_counts_and_nothing_is_trimmed_or_folded() {
        let passwords = Passwords::new().unwrap();
        let long = format!("{}x", "quiet lantern ".repeat(6));
        assert!(long.len() > 73);
        let stored = passwords.hash(&long).await.unwrap();
        assert!(stored.starts_with("$argon2id$v=19$m=19456,t=2,p=1$"), "{stored}");
        let yes = Verified::Yes { outdated: false };
        assert_eq!(passwords.verify(&long, Some(&stored)).await.unwrap(), yes);
        let mut last_changed = long.clone();
        last_changed.replace_range(long.len() - 1.., "y");
        for other in [
            last_changed,
            format!("{long} "),
            format!(" {long}"),
            long.to_uppercase(),
            String::new(),
        ] {
            assert_eq!(
                passwords.verify(&other, Some(&stored)).await.unwrap(),
                Verified::No,
                "{other}"
            );
        }
        assert_ne!(passwords.hash(&long).await.unwrap(), stored, "the salt is not random");
    }

    #[tokio::test]
    async fn composed_and_decomposed_letters_are_the_same_password() {
        let passwords = Passwords::new().unwrap();
        let stored = passwords.hash("cuv\u{e9}e under the old stairs").await.unwrap();
        let found =
            passwords.verify("cuve\u{301}e under the old stairs", Some(&stored)).await.unwrap();
        assert_eq!(found, Verified::Yes { outdated: false });
    }

    /// A stopwatch would fail on a busy machine, so this looks at what the time comes from: the same parameters, and
    /// a hash that is really computed (19 MiB cannot be filled twice within a millisecond).
    #[tokio::test]
    async fn nobody_costs_the_same_hash_as_somebody() {
        let passwords = Passwords::new().unwrap();
        let stored = passwords.hash(GOOD).await.unwrap();
        let parameters = |phc: &str| phc.rsplitn(3, '$').nth(2).unwrap().to_owned();
        assert_eq!(parameters(&passwords.nobody), parameters(&stored));
        let start = Instant::now();
        assert_eq!(passwords.verify(GOOD, None).await.unwrap(), Verified::No);
        assert!(start.elapsed() > Duration::from_millis(1), "{:?}", start.elapsed());
        let guessed = Passwords { nobody: stored.into(), ..passwords };
        assert_eq!(guessed.verify(GOOD, None).await.unwrap(), Verified::No);
    }

    #[tokio::test]
    async fn an_older_hash_is_accepted_and_named_as_outdated_and_a_broken_one_is_an_error() {
        let passwords = Passwords::new().unwrap();
        let weaker = Params::new(8 * 1024, 1, 1, None).unwrap();
        let old: PasswordHash = Argon2::default()
            .hash_password_with_params(GOOD.as_bytes(), b"sixteen byte salt", weaker)
            .unwrap();
        let found = passwords.verify(GOOD, Some(&old.to_string())).await.unwrap();
        assert_eq!(found, Verified::Yes { outdated: true });
        assert!(passwords.verify(GOOD, Some("plain text")).await.is_err());
        assert!(passwords.verify(GOOD, Some("")).await.is_err());
    }

    #[tokio::test]
    async fn the_surplus_of_a_hundred_at_once_is_told_to_come_back() {
        let passwords = Passwords::new().unwrap();
        let mut all = tokio::task::JoinSet::new();
        for _ in 0..100 {
            let passwords = passwords.clone();
            all.spawn(async move { passwords.verify(GOOD, None).await });
        }
        let answers = all.join_all().await;
        let busy = answers.iter().filter(|a| matches!(a, Err(PasswordError::Busy))).count();
        let answered = answers.iter().filter(|a| matches!(a, Ok(Verified::No))).count();
        assert_eq!(busy + answered, 100);
        assert!(answered >= AT_ONCE + WAITING && busy > 0, "{answered} answered, {busy} busy");
        assert!(passwords.verify(GOOD, None).await.is_ok(), "the queue did not empty");
    }
}
