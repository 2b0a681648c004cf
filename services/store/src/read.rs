//! Lays on a desk what a decision asks for, from the tables.

use std::sync::Arc;

use domain::book::command::Need;
use domain::book::subject::Subject;
use domain::book::table::{Cell, Row};
use domain::book::tables::CODE;
use domain::book::{Desk, Loaded};
use domain::ledger::entry::Entry;
use domain::ledger::tree::Hash;
use uuid::Uuid;

use crate::error::chain;
use crate::rows::Select;
use crate::sites::Site;
use crate::{Conn, StoreError, blobs, log};

/// Lays one thing on a desk.
///
/// # Errors
/// [`StoreError`].
pub async fn lay(
    conn: &mut Conn<'_>,
    site: &Site,
    desk: &mut Desk,
    need: &Need,
) -> Result<(), StoreError> {
    match need {
        Need::Subject(subject) => {
            let n = log::count_of(conn, site.number, subject).await?;
            desk.lend(*subject, load(conn, site, *subject, n, None).await?);
        }
        Need::Entry(id) => {
            let stored = log::entry_by_id(conn, site.number, *id).await?;
            desk.put_entry(*id, stored.map(|stored| stored.entry()).transpose()?);
        }
        Need::Code(kind, code) => {
            let rows = Select::of(&CODE)
                .equal("kind", kind.name())
                .equal("code", code.as_str())
                .fetch(conn, site.number)
                .await?;
            desk.put_code(*kind, code, rows.first().map(coded_id).transpose()?);
        }
        Need::Blob(digest) => {
            let missing = || StoreError::inconsistent(format!("there is no blob {digest}"));
            let hash: Hash = digest.parse().map_err(|_| missing())?;
            let found = blobs::find(conn, site.number, &hash).await?;
            lay_rule_set(desk, digest, found.ok_or_else(missing)?.1)?;
        }
    }
    Ok(())
}

/// A subject of `n` entries, from an older state of it if there is one and from the log.
pub(crate) async fn load(
    conn: &mut Conn<'_>,
    site: &Site,
    subject: Subject,
    n: u64,
    older: Option<Arc<Loaded>>,
) -> Result<Arc<Loaded>, StoreError> {
    let odd = |error| StoreError::inconsistent(chain(&error));
    if let Some(older) = older {
        if older.n == n {
            return Ok(older);
        }
        if older.n < n {
            let further = entries(conn, site, &subject, older.n, n).await?;
            if let Some(newer) = older.after(subject, &further).map_err(odd)? {
                return Ok(Arc::new(newer));
            }
        }
    }
    let entries = entries(conn, site, &subject, 0, n).await?;
    Ok(Arc::new(Loaded::read(subject, &entries).map_err(odd)?))
}

/// The entries of a subject after its number `after`, up to `n`.
async fn entries(
    conn: &mut Conn<'_>,
    site: &Site,
    subject: &Subject,
    after: u64,
    n: u64,
) -> Result<Vec<Entry>, StoreError> {
    let length = n.saturating_sub(after);
    if length == 0 {
        return Ok(Vec::new());
    }
    let stored = log::entries_of(conn, site.number, subject, after, log::signed(length)?).await?;
    if stored.len() as u64 != length {
        return Err(StoreError::inconsistent(format!("{subject} has not {n} entries")));
    }
    stored.iter().map(log::Stored::entry).collect()
}

pub(crate) fn lay_rule_set(
    desk: &mut Desk,
    digest: &str,
    bytes: Vec<u8>,
) -> Result<(), StoreError> {
    let text = String::from_utf8(bytes)
        .map_err(|_| StoreError::inconsistent(format!("rule set {digest} is no text")))?;
    desk.put_rule_set(digest, &text).map_err(|error| StoreError::inconsistent(chain(&error)))
}

/// The id in a row of codes.
pub(crate) fn coded_id(row: &Row) -> Result<Uuid, StoreError> {
    let id = match row.cells.last() {
        Some(Cell::Bytes(bytes)) => Uuid::from_slice(bytes).ok(),
        _ => None,
    };
    id.ok_or_else(|| StoreError::inconsistent("a code names no id"))
}
