//! Lots: what came in, and whether it may be used. Every kind that moves matter carries legs.

use serde::{Deserialize, Serialize};

use super::Late;
use super::things::Component;
use crate::ids::{HoldingId, LotId, MaterialId, PartyId};
use crate::stamp::Stamp;
use crate::units::Quantity;

/// One movement of matter into or out of a holding.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Leg {
    /// The holding.
    pub holding: HoldingId,
    /// Into it or out of it.
    pub direction: Direction,
    /// How much.
    pub amount: Quantity,
}

/// Which way a leg goes.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Direction {
    /// Into the holding.
    In,
    /// Out of the holding.
    Out,
}

impl Direction {
    /// +1 in, −1 out.
    pub const fn sign(self) -> i64 {
        match self {
            Self::In => 1,
            Self::Out => -1,
        }
    }
}

/// `lot.received`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct LotReceived {
    /// Which.
    pub lot: LotId,
    /// Our code, unique in the site.
    pub code: String,
    /// What it is.
    pub material: MaterialId,
    /// Where its stock is booked.
    pub holding: HoldingId,
    /// From whom; absent for what we made ourselves.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub supplier: Option<PartyId>,
    /// The supplier's own lot code.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub supplier_lot: Option<String>,
    /// How much.
    pub amount: Quantity,
    /// Not to be used from then on.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub expires_at: Option<Stamp>,
    /// Delivery note or invoice.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub document: Option<String>,
    /// What this lot holds by its own analysis; where given it stands in place of the material's.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub composition: Vec<Component>,
    /// Where it may be used from the start.
    pub status: LotStatus,
    /// Entered later than the site allows.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub late: Option<Late>,
    /// Movements.
    pub legs: Vec<Leg>,
}

/// Whether a lot may be used.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum LotStatus {
    /// Not until released.
    Held,
    /// Not at all.
    Rejected,
    /// It may.
    Released,
}

impl LotStatus {
    /// The name in entries, columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Held => "held",
            Self::Rejected => "rejected",
            Self::Released => "released",
        }
    }
}

/// `lot.status-changed`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct LotStatusChanged {
    /// Which.
    pub lot: LotId,
    /// From now on.
    pub status: LotStatus,
    /// Why.
    pub reason: String,
}
