//! Where complete nodes come from: tiles of 256 hashes, in the numbering of C2SP tlog-tiles.
//!
//! The hash number n of tile level L is the root of the leaves from n·256^L on, 256^L of them. Tile i of a level holds
//! its hashes from i·256 on. A full tile never changes. The store keeps the full tiles of levels 1 and up; level 0 is
//! the leaf hashes that stand beside the entries anyway. The tiles not yet full, at most 255 hashes a level, are the
//! [`Edge`]: small enough to stay in memory, and loaded anew from what is stored whenever it is not there.
//!
//! How a store uses it:
//! - to append: [`Edge::push`] each leaf hash, keep the [`Tile`]s it returns;
//! - to open: [`EdgePlan::new`], fetch, [`EdgePlan::load`]; then compare [`Edge::frontier`] with the head's;
//! - to catch up with another writer: fetch the leaf hashes from [`Edge::size`] on and push them, dropping the tiles;
//! - to prove: a [`ProofPlan`], fetch [`Edge::reads`], [`Edge::prove`]. That reads at most two tiles a level, however
//!   long the log is.

use std::collections::{BTreeMap, BTreeSet};
use std::fmt;
use std::ops::Range;
use std::str::FromStr;

use super::tree::{Frontier, Hash, Node, ProofPlan};

/// Hashes in a full tile (C2SP tlog-tiles, "Merkle Tree").
pub const TILE_WIDTH: usize = 256;

/// The logarithm of [`TILE_WIDTH`]: a level of tiles is that many levels of the tree.
const LOG_WIDTH: u32 = 8;

/// Levels of tiles that 2^64 leaves could have.
const LEVELS: u8 = 8;

/// A tile by its place.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct TileId {
    /// Level of tiles, from 0 for the leaf hashes.
    pub level: u8,
    /// Place in its level, from 0.
    pub index: u64,
}

/// What is not in order with tiles.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
pub enum TileError {
    /// A full tile holds 256 hashes.
    #[error("a full tile holds {TILE_WIDTH} hashes, but {0} were given")]
    NotFull(usize),
    /// Bytes that are no whole number of hashes.
    #[error("{0} bytes are no row of hashes")]
    Ragged(usize),
    /// A tile that was asked for was not handed over.
    #[error("tile {} of level {} is missing", .0.index, .0.level)]
    Missing(TileId),
    /// Leaf hashes that were asked for were not handed over.
    #[error("{wanted} leaf hashes were asked for, but {found} handed over")]
    MissingLeaves {
        /// How many were asked for.
        wanted: u64,
        /// How many came.
        found: usize,
    },
    /// A proof about entries that this edge does not know yet.
    #[error("node {} of level {} is not complete in a log of {size} entries", .node.index, .node.level)]
    Incomplete {
        /// The node.
        node: Node,
        /// The edge's size.
        size: u64,
    },
}

/// A full tile.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Tile {
    id: TileId,
    hashes: Vec<Hash>,
}

impl Tile {
    /// A tile from its hashes.
    ///
    /// # Errors
    /// [`TileError::NotFull`].
    pub fn new(id: TileId, hashes: Vec<Hash>) -> Result<Self, TileError> {
        if hashes.len() == TILE_WIDTH {
            Ok(Self { id, hashes })
        } else {
            Err(TileError::NotFull(hashes.len()))
        }
    }

    /// Reads what [`Tile::to_bytes`] wrote.
    ///
    /// # Errors
    /// [`TileError::Ragged`] or [`TileError::NotFull`].
    pub fn from_bytes(id: TileId, bytes: &[u8]) -> Result<Self, TileError> {
        Self::new(id, hashes_from_bytes(bytes)?)
    }

    /// The tile's 8,192 bytes, as C2SP tlog-tiles serves them.
    pub fn to_bytes(&self) -> Vec<u8> {
        hashes_to_bytes(&self.hashes)
    }

    /// Its place.
    pub const fn id(&self) -> TileId {
        self.id
    }

    /// Its hashes, always 256.
    pub fn hashes(&self) -> &[Hash] {
        &self.hashes
    }

    /// The root of all its hashes: one hash of the level above.
    pub fn root(&self) -> Hash {
        root_of(&self.hashes)
    }
}

/// Hashes in one row of bytes.
pub fn hashes_to_bytes(hashes: &[Hash]) -> Vec<u8> {
    hashes.iter().flat_map(|hash| hash.0).collect()
}

/// Reads what [`hashes_to_bytes`] wrote.
///
/// # Errors
/// [`TileError::Ragged`].
pub fn hashes_from_bytes(bytes: &[u8]) -> Result<Vec<Hash>, TileError> {
    let (hashes, rest) = bytes.as_chunks::<32>();
    if rest.is_empty() {
        Ok(hashes.iter().copied().map(Hash).collect())
    } else {
        Err(TileError::Ragged(bytes.len()))
    }
}

/// Full tiles that were fetched, of level 0 too.
#[derive(Clone, Debug, Default)]
pub struct Tiles(BTreeMap<TileId, Tile>);

impl Tiles {
    fn find(&self, id: TileId) -> Result<&Tile, TileError> {
        self.0.get(&id).ok_or(TileError::Missing(id))
    }
}

impl FromIterator<Tile> for Tiles {
    fn from_iter<I: IntoIterator<Item = Tile>>(tiles: I) -> Self {
        Self(tiles.into_iter().map(|tile| (tile.id, tile)).collect())
    }
}

/// The tiles that are not full yet: everything about a log's tree that its full tiles do not say.
///
/// ```
/// use domain::ledger::tiles::Edge;
/// use domain::ledger::tree::leaf_hash;
/// let mut edge = Edge::default();
/// let mut tiles = Vec::new();
/// for seq in 0..65_536_u32 {
///     tiles.extend(edge.push(leaf_hash(&seq.to_be_bytes())));
/// }
/// assert_eq!(tiles.len(), 1); // 256 tiles of level 0 filled, and with them the first of level 1
/// assert_eq!(edge.frontier().root(), tiles[0].root());
/// ```
#[derive(Clone, Debug, Default, Eq, PartialEq)]
pub struct Edge {
    size: u64,
    /// One row a level, each of at most 255 hashes.
    rows: Vec<Vec<Hash>>,
}

impl Edge {
    /// Number of leaves in the tree.
    pub const fn size(&self) -> u64 {
        self.size
    }

    /// The hashes of the tile of this level that is not full yet.
    pub fn row(&self, level: u8) -> &[Hash] {
        self.rows.get(usize::from(level)).map_or(&[], Vec::as_slice)
    }

    /// Appends a leaf and returns the tiles of level 1 and up that became full by it: none but for each 65,536th leaf.
    pub fn push(&mut self, leaf: Hash) -> Vec<Tile> {
        self.size += 1;
        let mut full = Vec::new();
        let mut hash = leaf;
        for level in 0.. {
            let row = self.row_mut(level);
            row.push(hash);
            if row.len() < TILE_WIDTH {
                break;
            }
            let hashes = std::mem::take(row);
            hash = root_of(&hashes);
            if level > 0 {
                let id = TileId { level, index: full_tiles(self.size, level) - 1 };
                full.push(Tile { id, hashes });
            }
        }
        full
    }

    fn row_mut(&mut self, level: u8) -> &mut Vec<Hash> {
        let level = usize::from(level);
        if self.rows.len() <= level {
            self.rows.resize(level + 1, Vec::new());
        }
        &mut self.rows[level]
    }

    /// The frontier of the same tree.
    pub fn frontier(&self) -> Frontier {
        let peaks = self.rows.iter().rev().flat_map(|row| peaks_of(row)).collect();
        Frontier::from_peaks(self.size, peaks)
    }

    /// The full tiles that a proof must read; those of level 0 are the leaf hashes of 256 entries from index·256 on.
    ///
    /// Nothing is to be read for what stands in the edge itself.
    pub fn reads(&self, plan: &ProofPlan) -> BTreeSet<TileId> {
        plan.nodes().map(Place::of).filter(|p| self.is_full(p.tile)).map(|p| p.tile).collect()
    }

    /// The hashes of a proof, given the tiles from [`Edge::reads`].
    ///
    /// # Errors
    /// [`TileError::Missing`] for a tile not handed over, [`TileError::Incomplete`] if the proof is about entries that
    /// this edge does not have yet.
    pub fn prove(&self, plan: &ProofPlan, tiles: &Tiles) -> Result<Vec<Hash>, TileError> {
        plan.prove(|node| self.node(node, tiles))
    }

    fn node(&self, node: Node, tiles: &Tiles) -> Result<Hash, TileError> {
        let place = Place::of(node);
        let row = if self.is_full(place.tile) {
            tiles.find(place.tile)?.hashes()
        } else if place.tile.index == full_tiles(self.size, place.tile.level) {
            self.row(place.tile.level)
        } else {
            &[]
        };
        let hashes =
            row.get(place.hashes).ok_or(TileError::Incomplete { node, size: self.size })?;
        Ok(root_of(hashes))
    }

    fn is_full(&self, tile: TileId) -> bool {
        tile.index < full_tiles(self.size, tile.level)
    }
}

/// What to fetch in order to have the [`Edge`] of a log that is already written.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct EdgePlan {
    size: u64,
}

impl EdgePlan {
    /// For a log of this size.
    pub const fn new(size: u64) -> Self {
        Self { size }
    }

    /// The entries whose leaf hashes are needed: the last ones, at most 65,535.
    pub fn leaves(&self) -> Range<u64> {
        full_tiles(self.size, 1) << (2 * LOG_WIDTH)..self.size
    }

    /// The full tiles needed, at most 255 a level.
    pub fn tiles(&self) -> Vec<TileId> {
        (1..LEVELS).flat_map(|level| self.row(level)).collect()
    }

    /// The full tiles of a level that no full tile of the next level sums up yet.
    fn row(&self, level: u8) -> impl Iterator<Item = TileId> + use<> {
        let start = full_tiles(self.size, level + 1) << LOG_WIDTH;
        (start..full_tiles(self.size, level)).map(move |index| TileId { level, index })
    }

    /// The edge, given what was asked for.
    ///
    /// # Errors
    /// [`TileError::Missing`] or [`TileError::MissingLeaves`].
    pub fn load(&self, leaves: &[Hash], tiles: &Tiles) -> Result<Edge, TileError> {
        let Range { start, end } = self.leaves();
        if u64::try_from(leaves.len()) != Ok(end - start) {
            return Err(TileError::MissingLeaves { wanted: end - start, found: leaves.len() });
        }
        let mut edge = Edge { size: start, rows: Vec::new() };
        for id in self.tiles() {
            let root = tiles.find(id)?.root();
            edge.row_mut(id.level + 1).push(root);
        }
        for leaf in leaves {
            edge.push(*leaf);
        }
        Ok(edge)
    }
}

/// Where a complete node is to be found: the hashes of one tile whose root it is.
struct Place {
    tile: TileId,
    hashes: Range<usize>,
}

impl Place {
    fn of(node: Node) -> Self {
        let depth = u32::from(node.level) % LOG_WIDTH;
        let width = TILE_WIDTH >> depth;
        let (tiles, nodes) = (node.index >> (LOG_WIDTH - depth), node.index % width as u64);
        #[expect(clippy::cast_possible_truncation, reason = "a remainder of at most 255")]
        let start = (nodes as usize) << depth;
        let level = node.level / 8;
        Self { tile: TileId { level, index: tiles }, hashes: start..start + (1 << depth) }
    }
}

/// How many tiles of a level are full in a log of that size.
fn full_tiles(size: u64, level: u8) -> u64 {
    size.checked_shr(LOG_WIDTH * (u32::from(level) + 1)).unwrap_or(0)
}

/// The root of 2^k neighbouring complete nodes.
fn root_of(hashes: &[Hash]) -> Hash {
    let mut frontier = Frontier::default();
    for hash in hashes {
        frontier.push(*hash);
    }
    frontier.root()
}

/// The roots of the complete subtrees over a row, the largest and leftmost first.
fn peaks_of(mut row: &[Hash]) -> Vec<Hash> {
    let mut peaks = Vec::new();
    while let Some(height) = row.len().checked_ilog2() {
        let (peak, rest) = row.split_at(1 << height);
        peaks.push(root_of(peak));
        row = rest;
    }
    peaks
}

/// A tile's path under a log's address, with how many of its hashes are meant: `tile/1/x001/x234/067.p/12`.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct TilePath {
    /// The tile.
    pub id: TileId,
    /// Hashes in it, 1 to 256; 256 is a full tile.
    pub width: usize,
}

/// Something else than a tile's path.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
#[error("not a tile's path such as tile/0/x001/x234/067 or tile/1/000.p/12")]
pub struct NotATilePath;

impl fmt::Display for TilePath {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "tile/{}", self.id.level)?;
        let digits = self.id.index.to_string();
        let digits = format!("{digits:0>width$}", width = digits.len().next_multiple_of(3));
        for start in (0..digits.len()).step_by(3) {
            let mark = if start + 3 < digits.len() { "x" } else { "" };
            write!(f, "/{mark}{}", &digits[start..start + 3])?;
        }
        if self.width == TILE_WIDTH { Ok(()) } else { write!(f, ".p/{}", self.width) }
    }
}

impl FromStr for TilePath {
    type Err = NotATilePath;

    /// Reads leniently, then takes only what would be written the same way.
    fn from_str(text: &str) -> Result<Self, NotATilePath> {
        let rest = text.strip_prefix("tile/").ok_or(NotATilePath)?;
        let (level, rest) = rest.split_once('/').ok_or(NotATilePath)?;
        let (index, width) = match rest.split_once(".p/") {
            Some((index, width)) => (index, width.parse().map_err(|_| NotATilePath)?),
            None => (rest, TILE_WIDTH),
        };
        let level = level.parse().map_err(|_| NotATilePath)?;
        let index = index.replace(['/', 'x'], "").parse().map_err(|_| NotATilePath)?;
        let path = Self { id: TileId { level, index }, width };
        let exact = level < 64 && (1..=TILE_WIDTH).contains(&width) && path.to_string() == text;
        if exact { Ok(path) } else { Err(NotATilePath) }
    }
}

#[cfg(test)]
mod tests;
