//! Tests on both engines, with commands of the real book.

mod acts;
mod append_only;
mod book;
mod outages;
mod proving;
mod rebuilding;
mod texts;
mod verifying;
mod writing;
