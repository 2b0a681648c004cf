//! What the end-to-end tests stand on: a database server of their own.
#![forbid(unsafe_code)]

pub mod postgres;
