use std::convert::Infallible;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use ct_merkle::mem_backed_tree::MemoryBackedTree;
use serde_json::Value;

use super::*;

/// Source and licence of both files stand in their headers.
const ROOTS: &str = include_str!(concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/../tests/reference/vectors/merkle_roots.json"
));
const PROOFS: &str = include_str!(concat!(
    env!("CARGO_MANIFEST_DIR"),
    "/../tests/reference/vectors/merkle_proofs.json"
));

/// Every complete node of a tree, level by level.
#[derive(Default)]
pub(crate) struct AllNodes(Vec<Vec<Hash>>);

impl AllNodes {
    pub(crate) fn push(&mut self, leaf: Hash) {
        let mut hash = leaf;
        for level in 0.. {
            if self.0.len() == level {
                self.0.push(Vec::new());
            }
            let row = &mut self.0[level];
            row.push(hash);
            if row.len() % 2 == 1 {
                return;
            }
            hash = node_hash(&row[row.len() - 2], &row[row.len() - 1]);
        }
    }

    pub(crate) fn prove(&self, plan: &ProofPlan) -> Vec<Hash> {
        let node = |n: Node| {
            Ok::<_, Infallible>(self.0[usize::from(n.level)][usize::try_from(n.index).unwrap()])
        };
        plan.prove(node).unwrap()
    }
}

fn hash(text: &Value) -> Hash {
    text.as_str().unwrap().parse().unwrap()
}

#[test]
fn hashes_and_roots_are_the_published_ones() {
    let file: Value = serde_json::from_str(ROOTS).unwrap();
    for case in file["leaf_hash"].as_array().unwrap() {
        assert_eq!(leaf_hash(case["leaf_ascii"].as_str().unwrap().as_bytes()), hash(&case["hash"]));
    }
    let case = &file["node_hash"][0];
    // The sample joins two short texts, so that it pins the prefix and the order rather than `node_hash` itself.
    let text = format!(
        "\u{1}{}{}",
        case["left_ascii"].as_str().unwrap(),
        case["right_ascii"].as_str().unwrap()
    );
    assert_eq!(Hash::of(text.as_bytes()), hash(&case["hash"]));

    let roots = file["roots_by_size"].as_array().unwrap();
    let mut frontier = Frontier::default();
    assert_eq!(frontier.root(), hash(&roots[0]));
    assert_eq!(empty_root(), hash(&roots[0]));
    let leaves = file["leaves"].as_array().unwrap();
    assert_eq!(leaves.len(), 8);
    for (leaf, root) in leaves.iter().zip(&roots[1..]) {
        let digits = leaf.as_str().unwrap();
        let bytes: Vec<u8> = (0..digits.len())
            .step_by(2)
            .map(|i| u8::from_str_radix(&digits[i..i + 2], 16).unwrap())
            .collect();
        frontier.push(leaf_hash(&bytes));
        assert_eq!(frontier.root(), hash(root));
    }
}

fn bytes_of(text: &Value) -> Vec<u8> {
    STANDARD.decode(text.as_str().unwrap_or_default()).unwrap()
}

/// `None` for what is no hash, which our types refuse before any check.
fn hash_of(text: &Value) -> Option<Hash> {
    bytes_of(text).as_slice().try_into().ok()
}

fn proof_of(hashes: &Value) -> Option<Vec<Hash>> {
    let Some(hashes) = hashes.as_array() else { return Some(Vec::new()) };
    hashes.iter().map(hash_of).collect()
}

#[test]
fn published_inclusion_proofs_are_all_judged_right() {
    let file: Value = serde_json::from_str(PROOFS).unwrap();
    let cases = file["inclusion"].as_array().unwrap();
    assert_eq!(cases.len(), 98);
    let accepts = |case: &Value| {
        let head = TreeHead { size: case["treeSize"].as_u64()?, root: hash_of(&case["root"])? };
        let (leaf, index) = (hash_of(&case["leafHash"])?, case["leafIdx"].as_u64()?);
        verify_inclusion(&leaf, index, &head, &proof_of(&case["proof"])?).ok()
    };
    for case in cases {
        assert_eq!(accepts(case).is_none(), case["wantErr"].as_bool().unwrap(), "{}", case["id"]);
    }
}

/// Some consistency cases, one of them good, have roots of 12 bytes: a hash of them stands in, so that equal roots
/// stay equal.
fn root_of(text: &Value) -> Hash {
    hash_of(text).unwrap_or_else(|| Hash::of(&[b"stand-in", bytes_of(text).as_slice()].concat()))
}

#[test]
fn published_consistency_proofs_are_all_judged_right() {
    let file: Value = serde_json::from_str(PROOFS).unwrap();
    let cases = file["consistency"].as_array().unwrap();
    assert_eq!(cases.len(), 98);
    for case in cases {
        let head = |size: &str, root: &str| TreeHead {
            size: case[size].as_u64().unwrap(),
            root: root_of(&case[root]),
        };
        let (old, new) = (head("size1", "root1"), head("size2", "root2"));
        let accepted =
            proof_of(&case["proof"]).is_some_and(|p| verify_consistency(&old, &new, &p).is_ok());
        assert_eq!(accepted, !case["wantErr"].as_bool().unwrap(), "{}", case["id"]);
    }
}

/// Goal: every root and every proof up to 300 leaves is, byte for byte, that of another implementation, and verifies.
#[test]
fn another_implementation_gives_the_same_roots_and_proofs() {
    let mut other = MemoryBackedTree::<Sha256, Vec<u8>>::new();
    let (mut nodes, mut frontier) = (AllNodes::default(), Frontier::default());
    let mut heads = vec![frontier.head()];
    for size in 1..=300_u64 {
        let entry = size.to_be_bytes().to_vec();
        nodes.push(leaf_hash(&entry));
        frontier.push(leaf_hash(&entry));
        other.push(entry);
        let head = frontier.head();
        assert_eq!(head.root.as_bytes().as_slice(), other.root().as_bytes().as_slice());
        heads.push(head);
        for index in 0..size {
            let ours = nodes.prove(&ProofPlan::inclusion(index, size).unwrap());
            let theirs = other.prove_inclusion(usize::try_from(index).unwrap());
            assert_eq!(flat(&ours), theirs.as_bytes());
            let leaf = leaf_hash(&(index + 1).to_be_bytes());
            assert_eq!(verify_inclusion(&leaf, index, &head, &ours), Ok(()));
        }
        for old in 1..size {
            let ours = nodes.prove(&ProofPlan::consistency(old, size).unwrap());
            let theirs = other.prove_consistency(usize::try_from(size - old).unwrap());
            assert_eq!(flat(&ours), theirs.as_bytes());
            let old = &heads[usize::try_from(old).unwrap()];
            assert_eq!(verify_consistency(old, &head, &ours), Ok(()));
        }
    }
}

fn flat(hashes: &[Hash]) -> Vec<u8> {
    hashes.iter().flat_map(|h| h.0).collect()
}

/// A log of `size` entries with its nodes and the head after each entry.
fn log(size: u64) -> (AllNodes, Vec<TreeHead>) {
    let (mut nodes, mut frontier) = (AllNodes::default(), Frontier::default());
    let mut heads = vec![frontier.head()];
    for index in 0..size {
        let leaf = leaf_hash(&index.to_be_bytes());
        nodes.push(leaf);
        frontier.push(leaf);
        heads.push(frontier.head());
    }
    (nodes, heads)
}

#[test]
fn no_altered_proof_is_accepted() {
    let (nodes, heads) = log(40);
    for size in 2..=40_u64 {
        let head = heads[usize::try_from(size).unwrap()];
        for index in 0..size {
            let leaf = leaf_hash(&index.to_be_bytes());
            let proof = nodes.prove(&ProofPlan::inclusion(index, size).unwrap());
            for altered in altered(&proof) {
                assert!(verify_inclusion(&leaf, index, &head, &altered).is_err());
            }
            assert!(verify_inclusion(&leaf_hash(b"other"), index, &head, &proof).is_err());
            assert!(verify_inclusion(&leaf, index ^ 1, &head, &proof).is_err());
        }
        for old in 1..size {
            let old = heads[usize::try_from(old).unwrap()];
            let proof = nodes.prove(&ProofPlan::consistency(old.size, size).unwrap());
            for altered in altered(&proof) {
                assert!(verify_consistency(&old, &head, &altered).is_err());
            }
            let forged = TreeHead { root: leaf_hash(b"other"), ..old };
            assert!(verify_consistency(&forged, &head, &proof).is_err());
        }
    }
}

/// Each hash with a bit changed, each left out, and one to spare at both ends and inside.
fn altered(proof: &[Hash]) -> Vec<Vec<Hash>> {
    let mut all = Vec::new();
    for i in 0..proof.len() {
        let mut changed = proof.to_vec();
        changed[i].0[i % 32] ^= 1;
        let mut shorter = proof.to_vec();
        shorter.remove(i);
        let mut longer = proof.to_vec();
        longer.insert(i, proof[i]);
        all.extend([changed, shorter, longer]);
    }
    all.push([proof, &[empty_root()]].concat());
    all.push([&[empty_root()], proof].concat());
    all
}

#[test]
fn questions_beyond_the_log_are_refused() {
    assert_eq!(ProofPlan::inclusion(7, 7), Err(ProofError::OutsideTree { index: 7, size: 7 }));
    assert_eq!(ProofPlan::consistency(0, 7), Err(ProofError::FromNothing));
    assert_eq!(ProofPlan::consistency(8, 7), Err(ProofError::Shrunk { old: 8, new: 7 }));
    assert_eq!(ProofPlan::consistency(7, 7).unwrap().nodes().count(), 0);
    let (_, heads) = log(7);
    assert_eq!(verify_consistency(&heads[0], &heads[7], &[]), Err(ProofError::FromNothing));
    assert_eq!(verify_consistency(&heads[0], &heads[0], &[]), Err(ProofError::FromNothing));
}

#[test]
fn the_largest_sizes_do_not_overflow() {
    let plan = ProofPlan::inclusion(u64::MAX - 1, u64::MAX).unwrap();
    assert_eq!(plan.nodes().count(), 63);
    assert_eq!(ProofPlan::inclusion(0, u64::MAX).unwrap().parts.len(), 64);
    ProofPlan::consistency(u64::MAX - 1, u64::MAX).unwrap();
    let head = TreeHead { size: u64::MAX, root: empty_root() };
    let proof = vec![empty_root(); 64];
    assert_eq!(verify_inclusion(&empty_root(), 0, &head, &proof), Err(ProofError::OtherRoot));
    assert_eq!(
        verify_inclusion(&empty_root(), 0, &head, &proof[1..]),
        Err(ProofError::WrongLength)
    );
}

#[test]
fn a_frontier_survives_its_row_of_bytes_and_refuses_another_length() {
    let mut frontier = Frontier::default();
    for index in 0..70_u64 {
        let bytes = frontier.to_bytes();
        assert_eq!(Frontier::from_bytes(index, &bytes).unwrap(), frontier);
        let longer = [bytes.as_slice(), &[0; 32]].concat();
        let ragged = [bytes.as_slice(), &[0]].concat();
        for wrong in [longer, ragged] {
            let refusal = Frontier::from_bytes(index, &wrong).unwrap_err();
            assert_eq!(refusal, NotAFrontier { size: index, bytes: wrong.len() });
        }
        frontier.push(leaf_hash(&index.to_be_bytes()));
    }
}

#[test]
fn a_hash_has_one_spelling() {
    let text = "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855";
    assert_eq!(text.parse::<Hash>().unwrap(), empty_root());
    assert_eq!(empty_root().to_string(), text);
    for other in
        [&text.to_uppercase(), &text[1..], "", &format!("{text} "), &text.replace('e', "é")]
    {
        assert_eq!(other.parse::<Hash>(), Err(NotAHash));
    }
}
