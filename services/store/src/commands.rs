//! Which commands were carried out: the memory behind idempotency, itself a projection of the log.

use std::collections::HashMap;

use domain::ids::CommandId;
use uuid::Uuid;

use crate::bulk::padded;
use crate::db::{Conn, on};
use crate::log::unsigned;
use crate::sites::SiteNumber;
use crate::writer::{Receipt, WriteError};
use crate::{StoreError, log};

/// Goes on with the site.
const FIRST_OF_EACH: &str = "select first_seq from command where command = column1 and site = ";
const COMMAND: &str = "select entries, print from command where site = $1 and command = $2";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[COMMAND];

/// A command carried out earlier.
#[derive(Clone, Debug, Eq, PartialEq)]
pub(crate) struct Earlier {
    pub(crate) first_seq: u64,
    pub(crate) entries: i64,
    pub(crate) print: Vec<u8>,
}

/// The answer to a command that was carried out, the same as the first time; `None` if it never was.
///
/// # Errors
/// [`StoreError`].
pub async fn answer(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    id: CommandId,
    print: &[u8; 32],
) -> Result<Option<Result<Receipt, WriteError>>, StoreError> {
    match find(conn, site, &[id]).await?.get(&id) {
        Some(earlier) => repeat(conn, site, print, earlier).await.map(Some),
        None => Ok(None),
    }
}

/// The answer to a command that was carried out, from the log.
pub(crate) async fn repeat(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    print: &[u8; 32],
    earlier: &Earlier,
) -> Result<Result<Receipt, WriteError>, StoreError> {
    if earlier.print != print {
        return Ok(Err(WriteError::KeyReused));
    }
    let stored = log::entries(conn, site, earlier.first_seq, earlier.entries).await?;
    let entries =
        stored.iter().map(|s| s.entry().map(Into::into)).collect::<Result<_, StoreError>>()?;
    Ok(Ok(Receipt { entries }))
}

/// Those of the given commands that were carried out: of a group usually none, which one statement tells.
pub(crate) async fn find(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    ids: &[CommandId],
) -> Result<HashMap<CommandId, Earlier>, StoreError> {
    let mut found = HashMap::new();
    for list in padded(ids) {
        let keys = list.iter().map(|id| id.0.as_bytes().to_vec());
        for (key, first_seq) in log::each(conn, site, FIRST_OF_EACH, keys).await? {
            let id = Uuid::from_slice(&key)
                .map_err(|_| StoreError::inconsistent("a command's key is not an id"))?;
            let (entries, print) =
                on!(conn, |c| sqlx::query_as(COMMAND).bind(site.0).bind(&key).fetch_one(c).await?);
            let earlier = Earlier { first_seq: unsigned(first_seq)?, entries, print };
            found.insert(CommandId(id), earlier);
        }
    }
    Ok(found)
}
