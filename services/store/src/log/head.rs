//! How far a log has come: its head as it is now, and the heads that left the house.

use domain::ledger::tree::{Frontier, Hash, TreeHead};
use domain::stamp::Micros;

use super::{hash, signed, unsigned};
use crate::StoreError;
use crate::db::{Conn, on};
use crate::sites::SiteNumber;

/// How far a log has come, as stored.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Head {
    /// The tree's right edge, which knows the size and the root.
    pub frontier: Frontier,
    /// The root as stored.
    pub root: Hash,
    /// Size and root, signed; empty before the first entry.
    pub note: String,
    /// When the last entry was recorded; after a correction of the clock, what the clock said then.
    pub last_recorded_at: Micros,
}

impl Head {
    /// Size and root as stored.
    pub fn tree_head(&self) -> TreeHead {
        TreeHead { size: self.frontier.size(), root: self.root }
    }
}

/// A head that left the house.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct KeptHead {
    /// The log's size then.
    pub size: u64,
    /// Its root then.
    pub root: Hash,
    /// Both, signed.
    pub note: String,
}

type HeadRow = (i64, Vec<u8>, Vec<u8>, String, i64);

const START: &str = "insert into log_head (site, size, frontier, root, note, last_recorded_at) \
    values ($1, 0, $2, $3, '', 0)";
const HEAD: &str = "select size, frontier, root, note, last_recorded_at \
    from log_head where site = $1";
/// Changes nothing, but holds the row until the transaction ends: PostgreSQL's other writers wait here.
const LOCK_HEAD: &str = "update log_head set size = size where site = $1 \
    returning size, frontier, root, note, last_recorded_at";
const KEEP_HEAD: &str = "insert into signed_head (site, size, root, note) values ($1, $2, $3, $4) \
    on conflict (site, size) do nothing";
const KEPT: &str = "select size, root, note from signed_head where site = $1 order by size";
const IS_KEPT: &str = "select count(*) from signed_head where site = $1 and size = $2";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[START, HEAD, LOCK_HEAD, KEEP_HEAD, KEPT, IS_KEPT];

/// An empty log.
pub(crate) async fn start(conn: &mut Conn<'_>, site: SiteNumber) -> Result<(), StoreError> {
    let empty = Frontier::default();
    on!(conn, |c| sqlx::query(START)
        .bind(site.0)
        .bind(empty.to_bytes())
        .bind(empty.root().as_bytes().as_slice())
        .execute(c)
        .await
        .map(drop))?;
    Ok(())
}

/// How far the log has come.
///
/// # Errors
/// [`StoreError::Inconsistent`] if the site has no head, or [`StoreError::Database`].
pub async fn head(conn: &mut Conn<'_>, site: SiteNumber) -> Result<Head, StoreError> {
    let row: Option<HeadRow> =
        on!(conn, |c| sqlx::query_as(HEAD).bind(site.0).fetch_optional(c).await)?;
    head_of(site, row)
}

/// The same, and nobody else writes to this log until the transaction ends.
pub(crate) async fn lock_head(conn: &mut Conn<'_>, site: SiteNumber) -> Result<Head, StoreError> {
    let row: Option<HeadRow> =
        on!(conn, |c| sqlx::query_as(LOCK_HEAD).bind(site.0).fetch_optional(c).await)?;
    head_of(site, row)
}

/// Keeps a head that leaves the house.
///
/// # Errors
/// [`StoreError::Database`].
pub async fn keep_head(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    head: &KeptHead,
) -> Result<(), StoreError> {
    let length = signed(head.size)?;
    let kept: i64 =
        on!(conn, |c| sqlx::query_scalar(IS_KEPT).bind(site.0).bind(length).fetch_one(c).await)?;
    if kept == 0 {
        on!(conn, |c| sqlx::query(KEEP_HEAD)
            .bind(site.0)
            .bind(length)
            .bind(head.root.as_bytes().as_slice())
            .bind(head.note.as_str())
            .execute(c)
            .await
            .map(drop))?;
    }
    Ok(())
}

/// Every head that left the house, the oldest first.
///
/// # Errors
/// [`StoreError`].
pub async fn kept_heads(
    conn: &mut Conn<'_>,
    site: SiteNumber,
) -> Result<Vec<KeptHead>, StoreError> {
    let rows: Vec<(i64, Vec<u8>, String)> =
        on!(conn, |c| sqlx::query_as(KEPT).bind(site.0).fetch_all(c).await)?;
    let kept = |(size, root, note): (i64, Vec<u8>, String)| {
        Ok(KeptHead { size: unsigned(size)?, root: hash(&root)?, note })
    };
    rows.into_iter().map(kept).collect()
}

fn head_of(site: SiteNumber, row: Option<HeadRow>) -> Result<Head, StoreError> {
    let (length, frontier, root, note, last_recorded_at) =
        row.ok_or_else(|| StoreError::inconsistent(format!("site {} has no head", site.0)))?;
    let frontier = Frontier::from_bytes(unsigned(length)?, &frontier)
        .map_err(|e| StoreError::inconsistent(e.to_string()))?;
    Ok(Head { frontier, root: hash(&root)?, note, last_recorded_at: Micros(last_recorded_at) })
}
