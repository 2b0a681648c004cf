//! The book from outside: commands go in, entries and table changes come out, and what comes out is held against
//! the log alone.

mod bench;
mod cellar;
mod decisions;
mod examples;
mod histories;
mod scenario;
