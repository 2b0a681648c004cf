//! The REST interface: JSON over HTTP under `/v1`, problems as RFC 9457 documents.
//!
//! Handlers parse, ask a use case of `house`, and answer; what they share lives in the modules here.
#![forbid(unsafe_code)]

pub mod amounts;
pub mod caller;
pub mod etag;
pub mod idempotency;
pub mod middleware;
pub mod problem;
pub mod strict;
