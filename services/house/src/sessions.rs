//! Signing in, and asking for the secret again before a signature.

use domain::ids::PersonId;
use domain::stamp::Micros;
use store::directory;
use store::sites;

use crate::caller::Caller;
use crate::clock::Clock;
use crate::error::HouseError;
use crate::house::House;
use crate::passwords::Verified;

/// A session just begun.
#[derive(Clone, Debug)]
pub struct Session {
    /// The access token, a secret.
    pub token: String,
    /// Seconds until it runs out.
    pub expires_in: i64,
    /// Who signed in.
    pub caller: Caller,
}

impl House {
    /// Signs a person in at one site. Unknown site, unknown login, wrong password and a disabled person are one answer
    /// that takes one time.
    ///
    /// # Errors
    /// [`HouseError::Unauthorised`] or [`HouseError::Busy`].
    pub async fn sign_in(
        &self,
        site: &str,
        login: &str,
        password: &str,
    ) -> Result<Session, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let site = sites::by_code(&mut held.conn(), site).await?;
        let person = match &site {
            Some(site) => directory::by_login(&mut held.conn(), site.number, login).await?,
            None => None,
        };
        drop(held);
        let stored = person.as_ref().map(|person| person.password_hash.as_str());
        let verified = self.inner.passwords.verify(password, stored).await?;
        let (Some(site), Some(person), Verified::Yes { .. }) = (site, person, verified) else {
            tracing::info!("a sign-in was refused");
            return Err(HouseError::Unauthorised);
        };
        let caller = self.caller_of(site.id, person.id).await?;
        let issued = self.inner.tokens.issue(person.id, site.id, token_time())?;
        tracing::info!(site = site.code, person = %person.id, "signed in");
        Ok(Session { token: issued.token, expires_in: issued.expires_in, caller })
    }

    /// Asks a signed-in person for the secret again.
    ///
    /// # Errors
    /// [`HouseError::WrongSecret`] or [`HouseError::Busy`].
    pub async fn confirm_secret(&self, caller: &Caller, secret: &str) -> Result<(), HouseError> {
        let site = self.site(caller.site).await?;
        let mut held = self.inner.db.reader().await?;
        let person = directory::by_id(&mut held.conn(), site.number, caller.person).await?;
        drop(held);
        let stored = person.as_ref().map(|person| person.password_hash.as_str());
        match self.inner.passwords.verify(secret, stored).await? {
            Verified::Yes { .. } => Ok(()),
            Verified::No => {
                tracing::warn!(person = %caller.person, "a signature was refused: wrong secret");
                Err(HouseError::WrongSecret)
            }
        }
    }

    /// The printed name of a person; the pseudonym if the directory has erased it.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn printed_name(
        &self,
        site: &sites::Site,
        person: PersonId,
    ) -> Result<String, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let found = directory::by_id(&mut held.conn(), site.number, person).await?;
        Ok(found.map_or_else(|| person.to_string(), |person| person.name))
    }
}

/// Tokens live by the machine's clock, also in a simulation: they guard real doors.
pub(crate) fn token_time() -> Micros {
    Clock::System.now()
}
