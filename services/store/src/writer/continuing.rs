//! Whether the log that lies here continues the one this instance signed before.
//!
//! A database put back from an old copy, a standby that lost commits, or a fork by somebody with another memory would
//! otherwise be signed on, and contradict heads that have left the house. What this does not promise: anything about a
//! log of which nothing is remembered beside the key.

use domain::ledger::tree::TreeHead;

use super::{Tools, WriteError};
use crate::sites::Site;
use crate::{Conn, StoreError, tiles};

/// What is remembered of a site's log. A reader asks before it reads the head, which may only have grown since.
///
/// # Errors
/// [`WriteError::Unsigned`] if the memory cannot be read.
pub(super) fn remembered(tools: &Tools, site: &Site) -> Result<Option<TreeHead>, WriteError> {
    (tools.remembered)(&site.origin).map_err(WriteError::Unsigned)
}

/// Compares a head with what is remembered.
///
/// # Errors
/// [`WriteError::Unsigned`] if the log is shorter than what was signed, or has another beginning.
pub(super) async fn check(
    conn: &mut Conn<'_>,
    site: &Site,
    remembered: Option<TreeHead>,
    head: &TreeHead,
) -> Result<(), WriteError> {
    let Some(signed) = remembered else { return Ok(()) };
    if head.size < signed.size {
        return Err(WriteError::Unsigned(format!(
            "{} entries were signed before, but the database holds {}: it was put back from an older state; bring \
             back the newer one",
            signed.size, head.size
        )));
    }
    if root_of_first(conn, site, signed.size, head).await? == signed.root {
        return Ok(());
    }
    Err(WriteError::Unsigned(format!(
        "the log does not continue the {} entries that were signed before: it was altered or forked; compare it with \
         the last head that left the house",
        signed.size
    )))
}

async fn root_of_first(
    conn: &mut Conn<'_>,
    site: &Site,
    length: u64,
    head: &TreeHead,
) -> Result<domain::ledger::tree::Hash, StoreError> {
    if length == head.size {
        return Ok(head.root);
    }
    tiles::root_at(conn, site.number, length).await
}
