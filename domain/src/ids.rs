//! Identifiers as types: a batch's id cannot be handed to something that wants a lot's.

use std::fmt;

use serde::{Deserialize, Serialize};
use uuid::Uuid;

macro_rules! ids {
    ($($(#[$doc:meta])* $name:ident;)*) => { $(
        $(#[$doc])*
        #[derive(Clone, Copy, Debug, Deserialize, Eq, Hash, Ord, PartialEq, PartialOrd, Serialize)]
        #[serde(transparent)]
        pub struct $name(pub Uuid);

        impl fmt::Display for $name {
            fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
                self.0.fmt(f)
            }
        }

        impl std::str::FromStr for $name {
            type Err = uuid::Error;
            fn from_str(text: &str) -> Result<Self, uuid::Error> {
                Uuid::parse_str(text).map(Self)
            }
        }

        impl From<Uuid> for $name {
            fn from(id: Uuid) -> Self {
                Self(id)
            }
        }
    )* };
}

ids! {
    /// One site: one log.
    SiteId;
    /// One entry of a log.
    EntryId;
    /// One command: the client's idempotency key, or ours.
    CommandId;
    /// A person's pseudonym.
    PersonId;
    /// A material: what a supplier sells under one name.
    MaterialId;
    /// A supplier or customer.
    PartyId;
    /// A tank, cask, still, store.
    VesselId;
    /// A hydrometer, balance, thermometer.
    InstrumentId;
    /// What a supplier delivered, or we packed.
    LotId;
    /// One fermentation.
    BatchId;
    /// One identity in one place over a time.
    HoldingId;
    /// A proposal to add something.
    ProposalId;
    /// A deviation from what was allowed or intended.
    DeviationId;
}
