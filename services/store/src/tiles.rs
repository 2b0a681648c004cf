//! The tree above the entries: full tiles as stored, and the edge where the next entry goes.

use domain::ledger::tiles::{Edge, EdgePlan, Tile, TileError, TileId, Tiles};
use domain::ledger::tree::Hash;

use crate::StoreError;
use crate::db::{Conn, on};
use crate::log::{Head, leaf_hashes, signed};
use crate::sites::SiteNumber;

const PUT: &str = "insert into tile (site, level, idx, hashes) values ($1, $2, $3, $4)";
const GET: &str = "select hashes from tile where site = $1 and level = $2 and idx = $3";
const COUNT: &str = "select count(*) from tile where site = $1";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[PUT, GET, COUNT];

/// A full tile, of level 0 from the leaf hashes; `None` if the log is not that long.
///
/// # Errors
/// [`StoreError`].
pub async fn find(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    id: TileId,
) -> Result<Option<Tile>, StoreError> {
    if id.level == 0 {
        let start = id.index.saturating_mul(256);
        let hashes = leaf_hashes(conn, site, start..start.saturating_add(256)).await?;
        return Tile::new(id, hashes).map(Some).map_err(odd);
    }
    let index = signed(id.index)?;
    let row: Option<Vec<u8>> = on!(conn, |c| sqlx::query_scalar(GET)
        .bind(site.0)
        .bind(i64::from(id.level))
        .bind(index)
        .fetch_optional(c)
        .await)?;
    row.map(|bytes| Tile::from_bytes(id, &bytes).map_err(odd)).transpose()
}

/// The root over the first `length` entries.
///
/// # Errors
/// [`StoreError::Inconsistent`] if the log is not that long, or its tiles do not fit.
pub async fn root_at(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    length: u64,
) -> Result<Hash, StoreError> {
    let plan = EdgePlan::new(length);
    let tiles = fetch(conn, site, plan.tiles()).await?;
    let leaves = leaf_hashes(conn, site, plan.leaves()).await?;
    Ok(plan.load(&leaves, &tiles).map_err(odd)?.frontier().root())
}

/// How many tiles are stored.
pub(crate) async fn count(conn: &mut Conn<'_>, site: SiteNumber) -> Result<i64, StoreError> {
    Ok(on!(conn, |c| sqlx::query_scalar(COUNT).bind(site.0).fetch_one(c).await)?)
}

pub(crate) async fn put(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    tile: &Tile,
) -> Result<(), StoreError> {
    let TileId { level, index } = tile.id();
    let index = signed(index)?;
    on!(conn, |c| sqlx::query(PUT)
        .bind(site.0)
        .bind(i64::from(level))
        .bind(index)
        .bind(tile.to_bytes())
        .execute(c)
        .await
        .map(drop))?;
    Ok(())
}

/// Brings an edge to where the log's head is: by what was written since, or from the stored tiles.
///
/// # Errors
/// [`StoreError::Inconsistent`] if the stored tiles and leaf hashes do not lead to the head.
pub(crate) async fn catch_up(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    edge: &mut Edge,
    head: &Head,
) -> Result<(), StoreError> {
    let end = head.frontier.size();
    let plan = EdgePlan::new(end);
    if edge.size() < plan.leaves().start || edge.size() > end {
        let tiles = fetch(conn, site, plan.tiles()).await?;
        let leaves = leaf_hashes(conn, site, plan.leaves()).await?;
        *edge = plan.load(&leaves, &tiles).map_err(odd)?;
    } else if edge.size() < end {
        for leaf in leaf_hashes(conn, site, edge.size()..end).await? {
            edge.push(leaf);
        }
    } else {
        return Ok(());
    }
    if edge.frontier() == head.frontier {
        Ok(())
    } else {
        Err(StoreError::inconsistent("the tree over the entries is not that of the head"))
    }
}

/// The full tiles of these places, which must be there.
pub(crate) async fn fetch(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    ids: impl IntoIterator<Item = TileId>,
) -> Result<Tiles, StoreError> {
    let mut tiles = Vec::new();
    for id in ids {
        tiles.push(find(conn, site, id).await?.ok_or_else(|| odd(TileError::Missing(id)))?);
    }
    Ok(tiles.into_iter().collect())
}

pub(crate) fn odd(error: TileError) -> StoreError {
    StoreError::inconsistent(error.to_string())
}
