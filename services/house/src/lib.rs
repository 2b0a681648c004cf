//! Use cases: what one can do, who may do it, and the doors it is done through.
//!
//! Pages and REST call the same functions here; nothing else calls the store or the records.
#![forbid(unsafe_code)]

pub mod assessing;
pub mod caller;
pub mod clock;
pub mod correction;
pub mod error;
pub mod founding;
pub mod house;
pub mod ids;
pub mod passwords;
pub mod people;
pub mod permissions;
pub mod reading;
pub mod record;
pub mod roles;
pub mod secrets;
pub mod sessions;
pub mod tokens;

pub use caller::Caller;
pub use error::HouseError;
pub use house::{Asked, House};
