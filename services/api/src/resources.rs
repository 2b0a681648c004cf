//! One file a resource: parse, ask the house, answer.

pub(crate) mod additions;
#[expect(
    unused_qualifications,
    reason = "the macro that describes query parameters names them by path"
)]
pub(crate) mod batches;
pub(crate) mod calculations;
pub(crate) mod deviations;
pub(crate) mod doors;
pub(crate) mod entries;
#[expect(
    unused_qualifications,
    reason = "the macro that describes query parameters names them by path"
)]
pub(crate) mod ledger;
#[expect(
    unused_qualifications,
    reason = "the macro that describes query parameters names them by path"
)]
pub(crate) mod lots;
pub(crate) mod people;
pub(crate) mod proposals;
pub(crate) mod readings;
#[expect(
    unused_qualifications,
    reason = "the macro that describes query parameters names them by path"
)]
pub(crate) mod records;
pub(crate) mod rule_sets;
pub(crate) mod settings;
pub(crate) mod things;
