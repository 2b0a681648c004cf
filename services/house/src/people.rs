//! People of a site: the directory's names beside the book's roles.

use domain::book::command::{Act, Enrol, Refusal};
use domain::book::role::Role;
use domain::ids::{CommandId, PersonId};
use store::directory;
use store::writer::Receipt;

use crate::caller::Caller;
use crate::error::HouseError;
use crate::founding::NewPerson;
use crate::house::{Asked, House};
use crate::passwords::check_policy;

/// A person as the site's people see them.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct PersonView {
    /// The pseudonym.
    pub person: PersonId,
    /// What they sign in with.
    pub login: String,
    /// Printed name.
    pub name: String,
    /// What they may be here; none: disabled.
    pub roles: Vec<Role>,
    /// Running number.
    pub n: u64,
}

impl House {
    /// Everybody the directory knows at the caller's site, by login.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn people(&self, caller: &Caller) -> Result<Vec<PersonView>, HouseError> {
        let site = self.site(caller.site).await?;
        let mut held = self.inner.db.reader().await?;
        let known = directory::all(&mut held.conn(), site.number).await?;
        drop(held);
        let subjects: Vec<_> = known.iter().map(|person| person.id.into()).collect();
        let desk = self.desk(&site, &subjects).await?;
        Ok(known
            .into_iter()
            .map(|person| {
                let state = desk.person(person.id).ok();
                PersonView {
                    person: person.id,
                    n: desk.cached_n(&person.id.into()).unwrap_or(0),
                    roles: state.map(|s| s.roles.iter().copied().collect()).unwrap_or_default(),
                    login: person.login,
                    name: person.name,
                }
            })
            .collect())
    }

    /// Enrols a person.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn enrol(
        &self,
        caller: Caller,
        key: CommandId,
        print: [u8; 32],
        new: NewPerson,
        roles: Vec<Role>,
    ) -> Result<(PersonId, Receipt), HouseError> {
        check_policy(&new.password, &[&new.login, &new.name])?;
        let site = self.site(caller.site).await?;
        let mut held = self.inner.db.reader().await?;
        let taken = directory::by_login(&mut held.conn(), site.number, &new.login).await?;
        drop(held);
        if let Some(taken) = taken {
            return self.enrolled_before(caller, key, print, new, roles, taken.id).await;
        }
        let person = self.directory_person(&new).await?;
        let id = person.person;
        let act = Act::Enrol(Enrol { person, roles });
        let receipt = self.submit(Asked { caller, key, print, expects: None, act }).await?;
        Ok((first_person(&receipt).unwrap_or(id), receipt))
    }

    /// The login exists: either this very command was sent before, or it is somebody else's.
    async fn enrolled_before(
        &self,
        caller: Caller,
        key: CommandId,
        print: [u8; 32],
        new: NewPerson,
        roles: Vec<Role>,
        taken: PersonId,
    ) -> Result<(PersonId, Receipt), HouseError> {
        let mut person = self.directory_person(&new).await?;
        person.person = taken;
        let act = Act::Enrol(Enrol { person, roles });
        match self.submit(Asked { caller, key, print, expects: None, act }).await {
            Ok(receipt) => Ok((first_person(&receipt).unwrap_or(taken), receipt)),
            Err(HouseError::Refused(_)) => Err(HouseError::Refused(Refusal::meaningless(
                "/login",
                "somebody signs in with this name already: choose another",
            ))),
            Err(other) => Err(other),
        }
    }
}

fn first_person(receipt: &Receipt) -> Option<PersonId> {
    let entry = receipt.entries.first()?;
    entry.subjects.first().map(|subject| subject.id.into())
}
