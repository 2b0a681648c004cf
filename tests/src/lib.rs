//! What the end-to-end tests stand on: the real program on a port of its own, a database of its own, clients for the
//! people of an invented cellar, and a deep check that reads the whole book at the end.
//!
//! Nothing here knows the inside of the program: it is started as its users start it and spoken to over HTTP. A test
//! whose tools are missing (PostgreSQL, Python) fails; a skipped test proves nothing.
#![forbid(unsafe_code)]

pub mod cellar;
pub mod client;
pub mod postgres;
pub mod program;

pub use cellar::Cellar;
pub use client::{Answer, Client};
pub use program::{Engine, Home, Program};

/// A new random UUID, for idempotency keys and for ids that name nothing.
///
/// # Panics
/// If the system gives no randomness.
pub fn random_id() -> String {
    let mut bytes = [0_u8; 16];
    getrandom::fill(&mut bytes).expect("randomness");
    uuid::Builder::from_random_bytes(bytes).into_uuid().to_string()
}

/// Runs each function, which takes an [`Engine`], as two tests: on SQLite and on PostgreSQL.
///
/// ```
/// tests::on_both_engines! {
///     fn a_book_opens(engine) {
///         let _ = engine;
///     }
/// }
/// ```
#[macro_export]
macro_rules! on_both_engines {
    ($($(#[$attribute:meta])* fn $name:ident($engine:ident) $body:block)+) => {
        $(
            $(#[$attribute])*
            mod $name {
                use super::*;

                fn on($engine: $crate::Engine) $body

                #[test]
                fn sqlite() {
                    on($crate::Engine::Sqlite);
                }

                #[test]
                fn postgres() {
                    on($crate::Engine::Postgres);
                }
            }
        )+
    };
}
