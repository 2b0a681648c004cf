//! What a batch ledger decides, as pure functions: no input, no output, no clock, no chance.
//!
//! Start at [`book`]: it says what may happen. [`ledger`] says how it is written down for ever, [`checks`] what a
//! proposal is held against, [`rules`] where the law and the practice stand as data.
#![forbid(unsafe_code)]

pub mod book;
pub mod checks;
pub mod compute;
pub mod densimetry;
pub mod forecast;
pub mod ids;
pub mod ledger;
pub mod nitrogen;
pub mod rules;
pub mod settings;
pub mod stamp;
pub mod units;
