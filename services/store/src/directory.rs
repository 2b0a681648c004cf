//! Names and secrets of persons: outside the log, so that a person can be forgotten and every proof still holds.

use domain::book::command::{DirectoryPerson, DirectoryWrite};
use domain::ids::PersonId;
use uuid::Uuid;

use crate::StoreError;
use crate::db::{Conn, on};
use crate::sites::SiteNumber;

/// A person as the directory knows them.
#[derive(Clone, Eq, PartialEq)]
pub struct Person {
    /// Their pseudonym in the log.
    pub id: PersonId,
    /// What they log in with.
    pub login: String,
    /// Their name, as records print it.
    pub name: String,
    /// Their password, hashed.
    pub password_hash: String,
    /// What the log's hash of their name was salted with.
    pub salt: Vec<u8>,
}

impl std::fmt::Debug for Person {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.debug_struct("Person").field("id", &self.id).finish_non_exhaustive()
    }
}

type PersonRow = (Vec<u8>, String, String, String, Vec<u8>);

const BY_LOGIN: &str = "select person, login, name, password_hash, salt from directory_person \
    where site = $1 and login = $2";
const BY_ID: &str = "select person, login, name, password_hash, salt from directory_person \
    where site = $1 and person = $2";
const ALL: &str = "select person, login, name, password_hash, salt from directory_person \
    where site = $1 order by login";
const PUT: &str = "insert into directory_person (site, person, login, name, password_hash, salt) \
    values ($1, $2, $3, $4, $5, $6) on conflict (site, person) do update set login = excluded.login, \
    name = excluded.name, password_hash = excluded.password_hash, salt = excluded.salt";
const SET_PASSWORD: &str =
    "update directory_person set password_hash = $3 where site = $1 and person = $2";
const ERASE: &str = "delete from directory_person where site = $1 and person = $2";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[BY_LOGIN, BY_ID, ALL, PUT, SET_PASSWORD, ERASE];

/// The person with this login.
///
/// # Errors
/// [`StoreError`].
pub async fn by_login(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    login: &str,
) -> Result<Option<Person>, StoreError> {
    let row: Option<PersonRow> =
        on!(conn, |c| sqlx::query_as(BY_LOGIN).bind(site.0).bind(login).fetch_optional(c).await)?;
    row.map(person_of).transpose()
}

/// The person of this pseudonym; `None` also if they were erased.
///
/// # Errors
/// [`StoreError`].
pub async fn by_id(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    person: PersonId,
) -> Result<Option<Person>, StoreError> {
    let row: Option<PersonRow> = on!(conn, |c| sqlx::query_as(BY_ID)
        .bind(site.0)
        .bind(person.0.as_bytes().as_slice())
        .fetch_optional(c)
        .await)?;
    row.map(person_of).transpose()
}

/// Everybody of a site, by login.
///
/// # Errors
/// [`StoreError`].
pub async fn all(conn: &mut Conn<'_>, site: SiteNumber) -> Result<Vec<Person>, StoreError> {
    let rows: Vec<PersonRow> = on!(conn, |c| sqlx::query_as(ALL).bind(site.0).fetch_all(c).await)?;
    rows.into_iter().map(person_of).collect()
}

/// Gives a person another password; `false` if there is no such person.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn set_password(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    person: PersonId,
    password_hash: &str,
) -> Result<bool, StoreError> {
    let changed = on!(conn, |c| sqlx::query(SET_PASSWORD)
        .bind(site.0)
        .bind(person.0.as_bytes().as_slice())
        .bind(password_hash)
        .execute(c)
        .await?
        .rows_affected());
    Ok(changed == 1)
}

/// Erases a person's record and salt; `false` if there is no such person.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn erase(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    person: PersonId,
) -> Result<bool, StoreError> {
    let erased = on!(conn, |c| sqlx::query(ERASE)
        .bind(site.0)
        .bind(person.0.as_bytes().as_slice())
        .execute(c)
        .await?
        .rows_affected());
    Ok(erased == 1)
}

/// Whether somebody else has the login that would be written.
pub(crate) async fn is_taken(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    write: &DirectoryWrite,
) -> Result<bool, StoreError> {
    let DirectoryWrite::Person(person) = write;
    let holder = by_login(conn, site, &person.login).await?;
    Ok(holder.is_some_and(|holder| holder.id != person.person))
}

/// Writes what a command decided about persons, in the command's own transaction.
pub(crate) async fn write(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    write: &DirectoryWrite,
) -> Result<(), StoreError> {
    let DirectoryWrite::Person(DirectoryPerson { person, login, name, password_hash, salt }) =
        write;
    on!(conn, |c| sqlx::query(PUT)
        .bind(site.0)
        .bind(person.0.as_bytes().as_slice())
        .bind(login.as_str())
        .bind(name.as_str())
        .bind(password_hash.as_str())
        .bind(salt.as_slice())
        .execute(c)
        .await
        .map(drop))?;
    Ok(())
}

fn person_of((id, login, name, password_hash, salt): PersonRow) -> Result<Person, StoreError> {
    let id = Uuid::from_slice(&id)
        .map_err(|_| StoreError::inconsistent("a person's pseudonym is not an id"))?;
    Ok(Person { id: PersonId(id), login, name, password_hash, salt })
}
