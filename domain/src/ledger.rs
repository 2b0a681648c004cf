//! How the book is written down for ever: canonical bytes, the tree over them, and the signed head of that tree.
//!
//! One log per site. An entry is canonical JSON ([`canonical`]); its bytes are hashed into a leaf of a Merkle tree
//! ([`tree`]), whose upper nodes are kept in tiles of 256 ([`tiles`]); size and root of the tree are signed ([`note`]).
//! Whoever holds an older head can tell whether a newer log still contains it unaltered.
//!
//! What this does not promise: a proof shows that an entry is in the log, not that none was left out of what was
//! handed over, and nothing here keeps the owner of the database from destroying it.
//!
//! Everything in this module is a pure function, and none of it may ever change its answer: old books must verify.

pub mod canonical;
pub mod entry;
pub mod note;
pub mod tiles;
pub mod tree;
