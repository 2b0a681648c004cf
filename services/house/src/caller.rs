//! Who asks: a person at one site, with what they may be there now.

use std::collections::BTreeSet;
use std::time::Duration;

use domain::book::Desk;
use domain::book::role::Role;
use domain::ids::{PersonId, SiteId};

use crate::error::HouseError;
use crate::house::House;

/// For how long a person's roles are believed without asking the database: what this instance changes is known at once,
/// what another changes after this time at the latest. The writer asks again, under its lock.
const UNASKED: Duration = Duration::from_millis(500);

/// A signed-in person at one site.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Caller {
    /// The pseudonym.
    pub person: PersonId,
    /// The one site the token is for.
    pub site: SiteId,
    /// Roles as the book has them now, not as they were when the token was made.
    pub roles: BTreeSet<Role>,
}

impl House {
    /// The person behind an access token, with the roles they have now. Without any they are disabled.
    ///
    /// # Errors
    /// [`HouseError::Unauthorised`].
    pub async fn caller(&self, token: &str) -> Result<Caller, HouseError> {
        let access = self.inner.tokens.check(token, crate::sessions::token_time())?;
        self.caller_of(access.site, access.person).await
    }

    pub(crate) async fn caller_of(
        &self,
        site: SiteId,
        person: PersonId,
    ) -> Result<Caller, HouseError> {
        let known = self.site(site).await.map_err(|error| match error {
            HouseError::Refused(_) => HouseError::Unauthorised,
            other => other,
        })?;
        let recent = self.inner.writers.published().recent(&known, person.into(), UNASKED);
        let desk = match recent {
            Some(loaded) => {
                let mut desk = Desk::new(site);
                desk.lend(person.into(), loaded);
                desk
            }
            None => self.desk(&known, &[person.into()]).await?,
        };
        let roles = desk.person(person).map(|state| state.roles.clone()).unwrap_or_default();
        if roles.is_empty() {
            return Err(HouseError::Unauthorised);
        }
        Ok(Caller { person, site, roles })
    }
}
