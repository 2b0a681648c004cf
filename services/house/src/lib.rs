//! Use cases: what one can do, who may do it, and the doors it is done through.
//!
//! Pages and REST call the same functions here; nothing else calls the store or the records.
#![forbid(unsafe_code)]

pub mod clock;
pub mod ids;
pub mod passwords;
pub mod permissions;
pub mod roles;
pub mod secrets;
pub mod tokens;
