//! Which commands were carried out: the memory behind idempotency, itself a projection of the log.

use std::collections::HashMap;

use domain::ids::CommandId;
use sqlx::QueryBuilder;
use uuid::Uuid;

use crate::bulk::padded;
use crate::db::{Conn, on};
use crate::log::unsigned;
use crate::sites::SiteNumber;
use crate::writer::{Receipt, WriteError};
use crate::{StoreError, log};

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

/// Those of the given commands that were carried out, in one statement for a group.
pub(crate) async fn find(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    ids: &[CommandId],
) -> Result<HashMap<CommandId, Earlier>, StoreError> {
    let mut found = HashMap::new();
    for list in padded(ids) {
        let rows: Vec<(Vec<u8>, i64, i64, Vec<u8>)> = on!(conn, |c| {
            let mut query = QueryBuilder::new(
                "select command, first_seq, entries, print from command where site = ",
            );
            query.push_bind(site.0).push(" and command in (");
            let mut places = query.separated(", ");
            for id in &list {
                places.push_bind(id.0.as_bytes().as_slice());
            }
            query.push(")").build_query_as().fetch_all(c).await?
        });
        for (id, first_seq, entries, print) in rows {
            let id = Uuid::from_slice(&id)
                .map_err(|_| StoreError::inconsistent("a command's key is not an id"))?;
            let earlier = Earlier { first_seq: unsigned(first_seq)?, entries, print };
            found.insert(CommandId(id), earlier);
        }
    }
    Ok(found)
}
