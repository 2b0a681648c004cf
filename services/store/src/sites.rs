//! Sites, and the small number under which every table keeps them.

use domain::ids::SiteId;
use uuid::Uuid;

use crate::StoreError;
use crate::db::{Conn, on};

/// The small number of a site in this database. It has no meaning elsewhere and never leaves the house.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd, sqlx::Type)]
#[sqlx(transparent)]
pub struct SiteNumber(pub(crate) i64);

/// A site of this database.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Site {
    /// Its number here.
    pub number: SiteNumber,
    /// Its id everywhere.
    pub id: SiteId,
    /// The short name in addresses.
    pub code: String,
    /// The name under which its heads are signed.
    pub origin: String,
}

#[derive(sqlx::FromRow)]
struct SiteRow {
    number: i64,
    id: Vec<u8>,
    code: String,
    origin: String,
}

const BY_ID: &str = "select number, id, code, origin from site where id = $1";
const BY_CODE: &str = "select number, id, code, origin from site where code = $1";
const BY_ORIGIN: &str = "select number, id, code, origin from site where origin = $1";
const ALL: &str = "select number, id, code, origin from site order by number";
const REGISTER: &str = "insert into site (number, id, code, origin) \
    select coalesce(max(number), 0) + 1, $1, $2, $3 from site returning number";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[BY_ID, BY_CODE, BY_ORIGIN, ALL, REGISTER];

/// The site of this id.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn by_id(conn: &mut Conn<'_>, id: SiteId) -> Result<Option<Site>, StoreError> {
    let row: Option<SiteRow> = on!(conn, |c| sqlx::query_as(BY_ID)
        .bind(id.0.as_bytes().as_slice())
        .fetch_optional(c)
        .await)?;
    row.map(site_of).transpose()
}

/// The site of this short name.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn by_code(conn: &mut Conn<'_>, code: &str) -> Result<Option<Site>, StoreError> {
    let row: Option<SiteRow> =
        on!(conn, |c| sqlx::query_as(BY_CODE).bind(code).fetch_optional(c).await)?;
    row.map(site_of).transpose()
}

/// The site whose log has this name.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn by_origin(conn: &mut Conn<'_>, origin: &str) -> Result<Option<Site>, StoreError> {
    let row: Option<SiteRow> =
        on!(conn, |c| sqlx::query_as(BY_ORIGIN).bind(origin).fetch_optional(c).await)?;
    row.map(site_of).transpose()
}

/// Every site.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn all(conn: &mut Conn<'_>) -> Result<Vec<Site>, StoreError> {
    let rows: Vec<SiteRow> = on!(conn, |c| sqlx::query_as(ALL).fetch_all(c).await)?;
    rows.into_iter().map(site_of).collect()
}

/// Gives a site its number, so that its founding can be written as the first entry of its log.
///
/// # Errors
/// [`StoreError::Database`], also if the id, the code or the origin is taken.
pub async fn register(
    conn: &mut Conn<'_>,
    id: SiteId,
    code: &str,
    origin: &str,
) -> Result<Site, StoreError> {
    let number: i64 = on!(conn, |c| sqlx::query_scalar(REGISTER)
        .bind(id.0.as_bytes().as_slice())
        .bind(code)
        .bind(origin)
        .fetch_one(c)
        .await)?;
    let number = SiteNumber(number);
    crate::log::start(conn, number).await?;
    Ok(Site { number, id, code: code.to_owned(), origin: origin.to_owned() })
}

fn site_of(row: SiteRow) -> Result<Site, StoreError> {
    let id = Uuid::from_slice(&row.id)
        .map_err(|_| StoreError::inconsistent(format!("site {} has no id", row.number)))?;
    Ok(Site { number: SiteNumber(row.number), id: SiteId(id), code: row.code, origin: row.origin })
}
