//! The Merkle tree over a log's entries, as RFC 9162 section 2.1 has it.
//!
//! A leaf is SHA-256 of `0x00` and the entry's bytes, an inner node SHA-256 of `0x01` and its two children; a tree of
//! n leaves is split at the largest power of two below n. Appending needs only the [`Frontier`]; proofs need
//! [complete nodes](Node), which never change once they exist. Where these come from is not this module's concern: a
//! [`ProofPlan`] says which it needs.

use std::fmt;
use std::str::FromStr;

use sha2::{Digest as _, Sha256};

/// A SHA-256 value; written as 64 lower-case hexadecimal digits.
#[derive(Clone, Copy, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct Hash(pub [u8; 32]);

/// Something else stands where a hash should.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
#[error("not a SHA-256 value: 32 bytes, or 64 lower-case hexadecimal digits")]
pub struct NotAHash;

impl Hash {
    /// SHA-256 of these bytes as they are: no leaf, no node.
    pub fn of(bytes: &[u8]) -> Self {
        Self(Sha256::digest(bytes).into())
    }

    /// The 32 bytes.
    pub const fn as_bytes(&self) -> &[u8; 32] {
        &self.0
    }
}

impl TryFrom<&[u8]> for Hash {
    type Error = NotAHash;

    fn try_from(bytes: &[u8]) -> Result<Self, NotAHash> {
        bytes.try_into().map(Self).map_err(|_| NotAHash)
    }
}

impl FromStr for Hash {
    type Err = NotAHash;

    fn from_str(text: &str) -> Result<Self, NotAHash> {
        let digits = text.as_bytes();
        if digits.len() != 64 {
            return Err(NotAHash);
        }
        let mut hash = [0; 32];
        for (byte, pair) in hash.iter_mut().zip(digits.chunks_exact(2)) {
            *byte = nibble(pair[0])? << 4 | nibble(pair[1])?;
        }
        Ok(Self(hash))
    }
}

fn nibble(digit: u8) -> Result<u8, NotAHash> {
    match digit {
        b'0'..=b'9' => Ok(digit - b'0'),
        b'a'..=b'f' => Ok(digit - b'a' + 10),
        _ => Err(NotAHash),
    }
}

impl fmt::Display for Hash {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        self.0.iter().try_for_each(|byte| write!(f, "{byte:02x}"))
    }
}

impl fmt::Debug for Hash {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        fmt::Display::fmt(self, f)
    }
}

/// The hash of one entry: SHA-256(`0x00` ‖ entry).
pub fn leaf_hash(entry: &[u8]) -> Hash {
    Hash(Sha256::new().chain_update([0]).chain_update(entry).finalize().into())
}

/// The hash of two children: SHA-256(`0x01` ‖ left ‖ right).
pub fn node_hash(left: &Hash, right: &Hash) -> Hash {
    let mut bytes = [1; 65];
    bytes[1..33].copy_from_slice(&left.0);
    bytes[33..].copy_from_slice(&right.0);
    Hash::of(&bytes)
}

/// The root of a tree without leaves: SHA-256 of nothing.
pub fn empty_root() -> Hash {
    Hash::of(&[])
}

/// Joins the roots of neighbouring complete subtrees, the largest and leftmost first; the empty tree's root if none.
fn join(peaks: &[Hash]) -> Hash {
    let Some((last, larger)) = peaks.split_last() else { return empty_root() };
    larger.iter().rev().fold(*last, |right, left| node_hash(left, &right))
}

/// How large a tree is and what its root is.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct TreeHead {
    /// Number of leaves.
    pub size: u64,
    /// Root over them.
    pub root: Hash,
}

/// The right edge of a tree: enough to append and to give the root, one hash for each bit set in the size.
///
/// ```
/// use domain::ledger::tree::{Frontier, leaf_hash};
/// let mut log = Frontier::default();
/// log.push(leaf_hash(b"first entry"));
/// assert_eq!(log.root(), leaf_hash(b"first entry"));
/// assert_eq!(Frontier::from_bytes(1, &log.to_bytes())?, log);
/// # Ok::<(), domain::ledger::tree::NotAFrontier>(())
/// ```
#[derive(Clone, Debug, Default, Eq, PartialEq)]
pub struct Frontier {
    size: u64,
    /// Roots of the complete subtrees, the largest and leftmost first.
    peaks: Vec<Hash>,
}

/// Bytes that are no frontier of that size.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
#[error("a tree of {size} leaves has {} hashes of 32 bytes at its edge, but {bytes} bytes were given", .size.count_ones())]
pub struct NotAFrontier {
    /// The size asked for.
    pub size: u64,
    /// The length found.
    pub bytes: usize,
}

impl Frontier {
    /// Appends a leaf.
    pub fn push(&mut self, leaf: Hash) {
        let merged = self.peaks.len() - self.size.trailing_ones() as usize;
        let peak =
            self.peaks.drain(merged..).rev().fold(leaf, |right, left| node_hash(&left, &right));
        self.peaks.push(peak);
        self.size += 1;
    }

    /// Number of leaves.
    pub const fn size(&self) -> u64 {
        self.size
    }

    /// The root of all leaves appended so far.
    pub fn root(&self) -> Hash {
        join(&self.peaks)
    }

    /// Size and root.
    pub fn head(&self) -> TreeHead {
        TreeHead { size: self.size, root: self.root() }
    }

    /// The peaks in one row of bytes, for the head's row in the database.
    pub fn to_bytes(&self) -> Vec<u8> {
        self.peaks.iter().flat_map(|peak| peak.0).collect()
    }

    /// Reads what [`Frontier::to_bytes`] wrote.
    ///
    /// # Errors
    /// [`NotAFrontier`] if the number of bytes does not fit the size.
    pub fn from_bytes(size: u64, bytes: &[u8]) -> Result<Self, NotAFrontier> {
        let (peaks, rest) = bytes.as_chunks::<32>();
        if !rest.is_empty() || peaks.len() != size.count_ones() as usize {
            return Err(NotAFrontier { size, bytes: bytes.len() });
        }
        Ok(Self { size, peaks: peaks.iter().copied().map(Hash).collect() })
    }

    /// From the peaks, the largest and leftmost first; their number is that of the bits set in `size`.
    pub(super) fn from_peaks(size: u64, peaks: Vec<Hash>) -> Self {
        debug_assert_eq!(peaks.len(), size.count_ones() as usize);
        Self { size, peaks }
    }
}

/// A complete node: the root of the leaves from `index`·2^`level` up to (`index` + 1)·2^`level`, all of them present.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct Node {
    /// Height above the leaves.
    pub level: u8,
    /// Position in its level, from 0.
    pub index: u64,
}

/// Why there is no such proof, or why it proves nothing.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
pub enum ProofError {
    /// The leaf asked about lies beyond the tree.
    #[error("entry {index} is not in a log of {size} entries")]
    OutsideTree {
        /// The leaf.
        index: u64,
        /// The tree's size.
        size: u64,
    },
    /// Anything continues an empty log, so that nothing would be shown.
    #[error("that a log continues an empty one proves nothing")]
    FromNothing,
    /// The later log is the shorter one.
    #[error("a log of {new} entries cannot continue one of {old}")]
    Shrunk {
        /// Size of the older tree.
        old: u64,
        /// Size of the newer tree.
        new: u64,
    },
    /// Too few or too many hashes.
    #[error("the proof has hashes missing or to spare")]
    WrongLength,
    /// The hashes lead to another root.
    #[error("the proof leads to another root")]
    OtherRoot,
}

/// What a proof is made of: for each of its hashes, the complete nodes it is joined from.
///
/// A plan is made without touching the log; the caller fetches [`ProofPlan::nodes`] and then [proves](ProofPlan::prove).
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct ProofPlan {
    parts: Vec<Vec<Node>>,
}

impl ProofPlan {
    /// The proof that the leaf `index` is in the tree of the first `size` leaves (RFC 9162, section 2.1.3.1).
    ///
    /// # Errors
    /// [`ProofError::OutsideTree`].
    pub fn inclusion(index: u64, size: u64) -> Result<Self, ProofError> {
        if index >= size {
            return Err(ProofError::OutsideTree { index, size });
        }
        let (mut start, mut end) = (0, size);
        let mut parts = Vec::new();
        while end - start > 1 {
            let middle = start + split(end - start);
            if index < middle {
                parts.push(cover(middle, end));
                end = middle;
            } else {
                parts.push(cover(start, middle));
                start = middle;
            }
        }
        parts.reverse();
        Ok(Self { parts })
    }

    /// The proof that the tree of the first `new` leaves continues that of the first `old` (RFC 9162, section 2.1.4.1).
    ///
    /// # Errors
    /// [`ProofError::FromNothing`] if `old` is 0, [`ProofError::Shrunk`] if `new` is smaller.
    pub fn consistency(old: u64, new: u64) -> Result<Self, ProofError> {
        check_sizes(old, new)?;
        let (mut start, mut end) = (0, new);
        let mut parts = Vec::new();
        while end != old {
            let middle = start + split(end - start);
            if old <= middle {
                parts.push(cover(middle, end));
                end = middle;
            } else {
                parts.push(cover(start, middle));
                start = middle;
            }
        }
        if start > 0 {
            parts.push(cover(start, end));
        }
        parts.reverse();
        Ok(Self { parts })
    }

    /// Every complete node that the proof is joined from.
    pub fn nodes(&self) -> impl Iterator<Item = Node> + '_ {
        self.parts.iter().flatten().copied()
    }

    /// The proof's hashes, given the complete nodes.
    ///
    /// # Errors
    /// Those of `node`.
    pub fn prove<E>(&self, mut node: impl FnMut(Node) -> Result<Hash, E>) -> Result<Vec<Hash>, E> {
        let hash_of = |part: &Vec<Node>| {
            let peaks: Vec<Hash> = part.iter().map(|&n| node(n)).collect::<Result<_, E>>()?;
            Ok(join(&peaks))
        };
        self.parts.iter().map(hash_of).collect()
    }
}

/// The largest power of two below `count`, which is at least 2.
const fn split(count: u64) -> u64 {
    1 << (count - 1).ilog2()
}

/// The complete nodes over a range of leaves which begins where a subtree of the range's size may begin.
fn cover(mut start: u64, end: u64) -> Vec<Node> {
    let mut nodes = Vec::new();
    while start < end {
        let level = (end - start).ilog2();
        #[expect(clippy::cast_possible_truncation, reason = "a logarithm of 64 bits is below 64")]
        nodes.push(Node { level: level as u8, index: start >> level });
        start += 1 << level;
    }
    nodes
}

const fn check_sizes(old: u64, new: u64) -> Result<(), ProofError> {
    if old == 0 {
        Err(ProofError::FromNothing)
    } else if old > new {
        Err(ProofError::Shrunk { old, new })
    } else {
        Ok(())
    }
}

/// Checks that the leaf `index` is in the tree (RFC 9162, section 2.1.3.2).
///
/// # Errors
/// [`ProofError`] if the proof does not show it.
pub fn verify_inclusion(
    leaf: &Hash,
    index: u64,
    head: &TreeHead,
    proof: &[Hash],
) -> Result<(), ProofError> {
    if index >= head.size {
        return Err(ProofError::OutsideTree { index, size: head.size });
    }
    let mut climb = Climb { node: index, last: head.size - 1 };
    let mut root = *leaf;
    for sibling in proof {
        root = match climb.step()? {
            Side::Left => node_hash(sibling, &root),
            Side::Right => node_hash(&root, sibling),
        };
    }
    climb.arrive()?;
    if root == head.root { Ok(()) } else { Err(ProofError::OtherRoot) }
}

/// Checks that the tree `new` continues the tree `old` (RFC 9162, section 2.1.4.2).
///
/// # Errors
/// [`ProofError`] if the proof does not show it; always if `old` is empty.
pub fn verify_consistency(
    old: &TreeHead,
    new: &TreeHead,
    proof: &[Hash],
) -> Result<(), ProofError> {
    check_sizes(old.size, new.size)?;
    if old.size == new.size {
        return match (proof.is_empty(), old.root == new.root) {
            (true, true) => Ok(()),
            (true, false) => Err(ProofError::OtherRoot),
            (false, _) => Err(ProofError::WrongLength),
        };
    }
    let (seed, rest) = if old.size.is_power_of_two() {
        (&old.root, proof)
    } else {
        proof.split_first().ok_or(ProofError::WrongLength)?
    };
    let mut climb = Climb { node: old.size - 1, last: new.size - 1 };
    climb.skip_complete();
    let (mut old_root, mut new_root) = (*seed, *seed);
    for sibling in rest {
        match climb.step()? {
            Side::Left => {
                old_root = node_hash(sibling, &old_root);
                new_root = node_hash(sibling, &new_root);
            }
            Side::Right => new_root = node_hash(&new_root, sibling),
        }
    }
    climb.arrive()?;
    if old_root == old.root && new_root == new.root { Ok(()) } else { Err(ProofError::OtherRoot) }
}

/// On which side of the node the next hash of a proof stands.
enum Side {
    Left,
    Right,
}

/// The way from a node up to the root: RFC 9162 calls these two numbers `fn` and `sn`.
struct Climb {
    node: u64,
    last: u64,
}

impl Climb {
    /// Starts at the root of the largest complete subtree that ends with the node.
    fn skip_complete(&mut self) {
        while self.node & 1 == 1 {
            self.up();
        }
    }

    fn step(&mut self) -> Result<Side, ProofError> {
        if self.last == 0 {
            return Err(ProofError::WrongLength);
        }
        let side = if self.node & 1 == 1 || self.node == self.last {
            while self.node & 1 == 0 && self.node != 0 {
                self.up();
            }
            Side::Left
        } else {
            Side::Right
        };
        self.up();
        Ok(side)
    }

    const fn up(&mut self) {
        self.node >>= 1;
        self.last >>= 1;
    }

    const fn arrive(&self) -> Result<(), ProofError> {
        if self.last == 0 { Ok(()) } else { Err(ProofError::WrongLength) }
    }
}

#[cfg(test)]
pub(super) mod tests;
