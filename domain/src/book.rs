//! The book: what may happen, what it says when written down, and what all of it adds up to.
//!
//! A [`command::Command`] is decided on a [`desk::Desk`] and becomes entries. Entries become table changes. Nothing
//! is stored that was not decided here.

pub mod assessing;
pub mod body;
pub mod command;
mod decide;
pub mod desk;
mod entry_rows;
pub mod in_force;
mod loaded;
pub mod readings;
pub mod role;
pub mod state;
pub mod subject;
pub mod table;
pub mod tables;

pub use decide::{ENGINE, MEANINGS, PRODUCT_CLASSES, identity};
pub use desk::{Appended, Desk, Position, Sealed, sha256_hex};
pub use loaded::Loaded;
