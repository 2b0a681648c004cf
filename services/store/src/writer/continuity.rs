//! One key signs one history: a log is not signed on if it does not continue the head that was signed last.
//!
//! A database put back from a backup, a standby that had not received the last commits, or an edit behind our back
//! would otherwise lead to two signed heads of which neither contains the other.

use domain::ledger::tiles::Edge;
use domain::ledger::tree::TreeHead;

use super::{Tools, WriteError};
use crate::log::Head;
use crate::sites::Site;
use crate::{Conn, tiles};

/// Brings the edge to the locked head, and refuses a log that does not continue what was signed last.
///
/// If the edge stood at that very head, following the log from there proves it; what only a file remembers, or another
/// instance left far behind, is looked up in the tiles.
pub(super) async fn follow(
    conn: &mut Conn<'_>,
    site: &Site,
    edge: &mut Edge,
    locked: &Head,
    tools: &Tools,
) -> Result<(), WriteError> {
    let signed = (tools.signed_last)(&site.origin).map_err(WriteError::Unsigned)?;
    let (stood_at, now) = (edge.frontier().head(), locked.frontier.head());
    if let Some(signed) = signed {
        compare(&signed, &now).map_err(|what| refusal(site, what))?;
    }
    let followed = tiles::catch_up(conn, site.number, edge, locked).await?;
    match signed {
        Some(signed) if signed.size < now.size && !(followed && stood_at == signed) => {
            let root = tiles::root_at(conn, site.number, signed.size).await?;
            if root == signed.root { Ok(()) } else { Err(refusal(site, FORKED)) }
        }
        _ => Ok(()),
    }
}

const SHORTER: &str =
    "was longer when it was signed last: the database was put back from an older state";
const FORKED: &str = "does not continue what was signed last: it was changed or forked";

/// What two heads tell by themselves.
fn compare(signed: &TreeHead, now: &TreeHead) -> Result<(), &'static str> {
    if now.size < signed.size {
        return Err(SHORTER);
    }
    if now.size == signed.size && now.root != signed.root {
        return Err(FORKED);
    }
    Ok(())
}

fn refusal(site: &Site, what: &str) -> WriteError {
    WriteError::Unsigned(format!("{} {what}", site.origin))
}
