//! The book from outside: commands go in, entries and table changes come out, and what comes out is held against
//! the log alone.

#![expect(clippy::unwrap_used, reason = "what cannot go on fails the test")]

mod bench;
mod cellar;
mod corrections;
mod decisions;
mod examples;
mod histories;
mod scales;
mod scenario;
