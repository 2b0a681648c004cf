//! Persistence on SQLite and PostgreSQL: the log is appended, everything else follows from it.
//!
//! Start at [`writer`]: the only way into the log. [`log`] reads it, [`rows`] reads the projection tables,
//! [`verify`] and [`rebuild`] hold both against each other. Nothing here decides what may happen: the book does.
#![forbid(unsafe_code)]

pub mod blobs;
mod bulk;
pub mod commands;
pub mod db;
pub mod directory;
mod error;
pub mod founding;
pub mod log;
pub mod migrate;
mod projections;
pub mod proofs;
pub mod read;
pub mod rebuild;
pub mod rows;
mod schema;
pub mod sites;
pub mod snapshots;
#[cfg(test)]
mod tests;
pub mod tiles;
pub mod verify;
pub mod writer;
mod writes;

pub use db::{Conn, Db, Held, Place, Tx};
pub use error::StoreError;
