//! Which commands were carried out: the memory behind idempotency, itself a projection of the log.

use std::collections::HashMap;

use domain::ids::CommandId;
use sqlx::QueryBuilder;
use uuid::Uuid;

use crate::StoreError;
use crate::bulk::padded;
use crate::db::{Conn, on};
use crate::log::unsigned;
use crate::sites::SiteNumber;

/// A command carried out earlier.
#[derive(Clone, Debug, Eq, PartialEq)]
pub(crate) struct Earlier {
    pub(crate) first_seq: u64,
    pub(crate) entries: i64,
    pub(crate) print: Vec<u8>,
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
