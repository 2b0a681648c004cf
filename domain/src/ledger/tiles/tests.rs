use super::*;
use crate::ledger::tree::tests::AllNodes;
use crate::ledger::tree::{TreeHead, leaf_hash, verify_consistency, verify_inclusion};

/// A log as a store would keep it: leaf hashes and full tiles, beside everything there is to compare with.
#[derive(Default)]
struct Log {
    leaves: Vec<Hash>,
    tiles: Vec<Tile>,
    edge: Edge,
    frontier: Frontier,
    nodes: AllNodes,
}

impl Log {
    fn of(size: u64) -> Self {
        let mut log = Self::default();
        (0..size).for_each(|_| log.push());
        log
    }

    fn push(&mut self) {
        let leaf = leaf_hash(&self.edge.size().to_be_bytes());
        self.leaves.push(leaf);
        self.tiles.extend(self.edge.push(leaf));
        self.frontier.push(leaf);
        self.nodes.push(leaf);
    }

    fn leaves(&self, range: Range<u64>) -> &[Hash] {
        &self.leaves[usize::try_from(range.start).unwrap()..usize::try_from(range.end).unwrap()]
    }

    fn fetch(&self, ids: impl IntoIterator<Item = TileId>) -> Tiles {
        let one = |id: TileId| match id.level {
            0 => Tile::new(id, self.leaves(id.index * 256..(id.index + 1) * 256).to_vec()).unwrap(),
            _ => self.tiles.iter().find(|tile| tile.id == id).unwrap().clone(),
        };
        ids.into_iter().map(one).collect()
    }

    fn heads(&self, sizes: &[u64]) -> Vec<TreeHead> {
        let mut frontier = Frontier::default();
        let mut heads = Vec::new();
        for &leaf in &self.leaves {
            frontier.push(leaf);
            if sizes.contains(&frontier.size()) {
                heads.push(frontier.head());
            }
        }
        heads
    }

    fn prove(&self, plan: &ProofPlan) -> Vec<Hash> {
        let reads = self.edge.reads(plan);
        assert!(reads.len() <= 6, "{reads:?}");
        self.edge.prove(plan, &self.fetch(reads)).unwrap()
    }

    fn check_load(&self) {
        let plan = EdgePlan::new(self.edge.size());
        let loaded = plan.load(self.leaves(plan.leaves()), &self.fetch(plan.tiles())).unwrap();
        assert_eq!(loaded.frontier(), self.frontier);
        for level in 0..8 {
            assert_eq!(loaded.row(level), self.edge.row(level));
        }
    }
}

#[test]
fn the_edge_has_the_frontier_of_the_tree_and_can_be_loaded_anew() {
    let mut log = Log::default();
    for size in 0..=600 {
        assert_eq!(log.edge.frontier(), log.frontier);
        assert_eq!(log.edge.size(), size);
        if size % 37 == 0 || size % 256 < 2 {
            log.check_load();
        }
        log.push();
    }
}

/// Goal: proofs from tiles are those from all nodes, and verify. Method: a log with two full tiles of level 1, asked
/// around every border.
#[test]
fn proofs_from_tiles_are_those_from_all_nodes() {
    let log = Log::of(2 * 65_536 + 3 * 256 + 77);
    log.check_load();
    assert_eq!(log.tiles.len(), 2);
    let size = log.edge.size();
    let borders =
        [1, 2, 255, 256, 257, 4_000, 65_535, 65_536, 65_537, 131_072, 131_073, 131_900, size];
    let heads = log.heads(&borders);
    assert_eq!(heads.len(), borders.len());
    for head in &heads {
        for index in [0, 1, 255, 256, 40_000, 65_535, 65_536, 131_071, 131_072, 131_840, 131_916] {
            let Ok(plan) = ProofPlan::inclusion(index, head.size) else { continue };
            let proof = log.prove(&plan);
            assert_eq!(proof, log.nodes.prove(&plan));
            let leaf = leaf_hash(&index.to_be_bytes());
            assert_eq!(verify_inclusion(&leaf, index, head, &proof), Ok(()));
        }
        for old in heads.iter().filter(|old| old.size <= head.size) {
            let plan = ProofPlan::consistency(old.size, head.size).unwrap();
            let proof = log.prove(&plan);
            assert_eq!(proof, log.nodes.prove(&plan));
            assert_eq!(verify_consistency(old, head, &proof), Ok(()));
        }
    }
}

/// Goal: the third level of tiles works without 16 million leaves. Method: an edge with one hash missing everywhere.
#[test]
fn a_leaf_may_fill_tiles_of_several_levels() {
    let row = |level: u8| (0..255).map(|i| leaf_hash(&[level, i])).collect::<Vec<_>>();
    let start = Edge { size: (1 << 24) - 1, rows: vec![row(0), row(1), row(2)] };
    let mut edge = start.clone();
    let tiles = edge.push(leaf_hash(b"last"));
    let ids: Vec<_> = tiles.iter().map(|tile| (tile.id.level, tile.id.index)).collect();
    assert_eq!(ids, [(1, 255), (2, 0)]);
    assert_eq!(tiles[1].hashes()[255], tiles[0].root());
    assert_eq!(edge.row(3), [tiles[1].root()]);
    assert_eq!(edge.frontier().root(), tiles[1].root());

    let mut frontier = start.frontier();
    frontier.push(leaf_hash(b"last"));
    assert_eq!(edge.frontier(), frontier);
}

#[test]
fn what_an_edge_is_loaded_from_stays_small_and_names_each_level() {
    let size = (3 << 24) + (2 << 16) + (255 << 8) + 9;
    let plan = EdgePlan::new(size);
    assert_eq!(plan.leaves(), size - (255 << 8) - 9..size);
    let tile = |level, index| TileId { level, index };
    let level_1 = [tile(1, 3 * 256), tile(1, 3 * 256 + 1)];
    assert_eq!(plan.tiles(), [&level_1[..], &[tile(2, 0), tile(2, 1), tile(2, 2)]].concat());

    let leaves = vec![leaf_hash(b""); (255 << 8) + 9];
    let fetched: Tiles = plan
        .tiles()
        .into_iter()
        .map(|id| Tile::new(id, vec![leaf_hash(&[id.level]); TILE_WIDTH]).unwrap())
        .collect();
    let edge = plan.load(&leaves, &fetched).unwrap();
    assert_eq!(edge.size(), size);
    assert_eq!([0, 1, 2, 3, 4].map(|level| edge.row(level).len()), [9, 255, 2, 3, 0]);
    assert_eq!(plan.load(&leaves, &Tiles::default()), Err(TileError::Missing(level_1[0])));
    let wanted = u64::try_from(leaves.len()).unwrap();
    assert_eq!(
        plan.load(&leaves[1..], &fetched),
        Err(TileError::MissingLeaves { wanted, found: leaves.len() - 1 })
    );
}

#[test]
fn a_proof_about_what_is_missing_is_refused() {
    let log = Log::of(700);
    let plan = ProofPlan::inclusion(3, 700).unwrap();
    let first = TileId { level: 0, index: 0 };
    assert_eq!(log.edge.prove(&plan, &Tiles::default()), Err(TileError::Missing(first)));
    let longer = ProofPlan::inclusion(3, 769).unwrap();
    let refusal = log.edge.prove(&longer, &log.fetch(log.edge.reads(&longer)));
    assert!(matches!(refusal, Err(TileError::Incomplete { size: 700, .. })), "{refusal:?}");
    let far = ProofPlan::inclusion(u64::MAX - 1, u64::MAX).unwrap();
    let refusal = log.edge.prove(&far, &log.fetch(log.edge.reads(&far)));
    assert!(matches!(refusal, Err(TileError::Incomplete { size: 700, .. })), "{refusal:?}");
}

#[test]
fn a_tile_survives_its_bytes_and_refuses_another_length() {
    let id = TileId { level: 1, index: 4 };
    let hashes: Vec<Hash> = (0..=255).map(|i| leaf_hash(&[i])).collect();
    let tile = Tile::new(id, hashes).unwrap();
    let bytes = tile.to_bytes();
    assert_eq!(bytes.len(), 8_192); // C2SP tlog-tiles: 256 hashes of 32 bytes
    assert_eq!(Tile::from_bytes(id, &bytes), Ok(tile));
    assert_eq!(Tile::from_bytes(id, &bytes[32..]), Err(TileError::NotFull(255)));
    assert_eq!(Tile::from_bytes(id, &bytes[1..]), Err(TileError::Ragged(8_191)));
}

#[test]
fn tile_paths_are_those_of_the_specification() {
    for (level, index, width, path) in [
        (0, 0, 256, "tile/0/000"),
        (0, 1_234_067, 256, "tile/0/x001/x234/067"), // the specification's example
        (63, 999, 1, "tile/63/999.p/1"),
        (2, 1_000, 255, "tile/2/x001/000.p/255"),
        (0, u64::MAX, 256, "tile/0/x018/x446/x744/x073/x709/x551/615"),
    ] {
        let tile = TilePath { id: TileId { level, index }, width };
        assert_eq!(tile.to_string(), path);
        assert_eq!(path.parse(), Ok(tile));
    }
    for path in [
        "",
        "tile",
        "tile/0",
        "tile/0/",
        "tile/0/0",
        "tile/0/0000",
        "tile/00/000",
        "tile/64/000",
        "tile/0/x000/001",
        "tile/0/001/002",
        "tile/0/x001",
        "tile/0/000.p/0",
        "tile/0/000.p/256",
        "tile/0/000.p/01",
        "tile/+1/000",
        "tile/0/-01",
        "tile/0/000/",
        "/tile/0/000",
        "tile/0/0é0",
        "tile/0/x999/x999/x999/x999/x999/x999/x999/999",
    ] {
        assert_eq!(path.parse::<TilePath>(), Err(NotATilePath), "{path}");
    }
}
