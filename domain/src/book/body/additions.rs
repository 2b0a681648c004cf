//! Proposals and additions: what somebody wanted to add, what the checks answered, and what was done.

use serde::{Deserialize, Serialize};

use super::Late;
use super::lots::Leg;
use super::things::Component;
use crate::checks::Assessment;
use crate::ids::{BatchId, HoldingId, LotId, MaterialId, ProposalId};
use crate::stamp::Stamp;
use crate::units::Quantity;

/// One lot of an addition, with what its nitrogen and limits are judged by, as it was known then.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Line {
    /// Which lot.
    pub lot: LotId,
    /// Its code.
    pub lot_code: String,
    /// Its material.
    pub material: MaterialId,
    /// The material's name.
    pub material_name: String,
    /// The material's category.
    pub category: String,
    /// The names under which positive lists know it.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub listed_as: Vec<String>,
    /// What it holds.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub composition: Vec<Component>,
    /// How much.
    pub amount: Quantity,
}

/// The form in which it goes in.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Preparation {
    /// As it was delivered, a liquid for instance.
    AsDelivered,
    /// Dry.
    Powder,
    /// Stirred into water or must first.
    Slurry,
    /// Dissolved.
    Solution,
}

/// `proposal.assessed`: asked before the fact, whatever the answer was. `occurred_at` is when it was asked.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct ProposalAssessed {
    /// Which.
    pub proposal: ProposalId,
    /// Into which batch.
    pub batch: BatchId,
    /// Into which holding of it.
    pub holding: HoldingId,
    /// When it is meant to be done.
    pub planned_at: Stamp,
    /// After that the proposal has lapsed.
    pub lapses_at: Stamp,
    /// What.
    pub lines: Vec<Line>,
    /// Water that carries it in.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub carrier_water: Option<Quantity>,
    /// In which form.
    pub preparation: Preparation,
    /// What for.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub purpose: Option<String>,
    /// The answer.
    pub assessment: Assessment,
    /// SHA-256 of the canonical {what was shown}: what a signature binds.
    pub shown: String,
}

/// `addition.recorded`: done.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct AdditionRecorded {
    /// Into which batch.
    pub batch: BatchId,
    /// Into which holding of it.
    pub holding: HoldingId,
    /// The proposal it carries out.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub proposal: Option<ProposalId>,
    /// What.
    pub lines: Vec<Line>,
    /// Water that carried it in.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub carrier_water: Option<Quantity>,
    /// In which form.
    pub preparation: Preparation,
    /// Done before anybody asked: why.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub already_done: Option<String>,
    /// Entered later than the site allows.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub late: Option<Late>,
    /// The answer for what was done, as of when it was done.
    pub assessment: Assessment,
    /// What the book could not cover, by lot.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub shortfalls: Vec<Shortfall>,
    /// Movements.
    pub legs: Vec<Leg>,
}

/// More was taken from a lot than the book had of it.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Shortfall {
    /// The lot.
    pub lot: LotId,
    /// The holding the missing part is booked against, until a count or a receipt clears it.
    pub unexplained: HoldingId,
    /// The missing part.
    pub amount: Quantity,
}
