//! The REST interface: JSON over HTTP under `/v1`, problems as RFC 9457 documents.
//!
//! Start at [`router()`]: routes, permissions and the generated description. Handlers parse, ask a use case of
//! `house`, and answer; what they share lives in the modules here.
#![forbid(unsafe_code)]

pub mod amounts;
mod asking;
pub mod caller;
pub mod etag;
pub mod idempotency;
pub mod middleware;
pub mod problem;
mod refusals;
mod resources;
pub mod router;
pub mod strict;
mod views;

pub use middleware::Surroundings;
pub use router::{document, router};

/// Stands beside every answer that states a limit or a risk.
pub(crate) const NOTICE: &str = "Local requirements prevail. A limit shown is not legal advice, and a model is not a \
    laboratory analysis.";
