//! Batches: what was filled where, and what is expected of it.

use serde::{Deserialize, Serialize};

use super::Late;
use super::additions::Shortfall;
use super::lots::Leg;
use crate::ids::{BatchId, HoldingId, LotId, VesselId};
use crate::units::Quantity;

/// `batch.opened`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct BatchOpened {
    /// Which.
    pub batch: BatchId,
    /// Our code, unique in the site.
    pub code: String,
    /// Name as printed, if it has one.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub name: Option<String>,
    /// What the law takes it for: `grape_wine`, `cider`, `wash` …
    pub product_class: String,
    /// The premises it is made on, by code.
    pub premises: String,
    /// Markets it is meant for.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub destinations: Vec<String>,
    /// Claims it carries, for example a category.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub claims: Vec<String>,
    /// Where it stands.
    pub vessel: VesselId,
    /// Its holding there.
    pub holding: HoldingId,
    /// What was filled, measured as stated in `volume_basis`.
    pub volume: Quantity,
    /// How the volume was measured.
    pub volume_basis: String,
    /// The liquid in it: what every dose is judged on.
    pub liquid: Quantity,
    /// The liquid when filling is over, if it goes on.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub liquid_planned: Option<Quantity>,
    /// The gravity at which the fermentation is expected to end.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub expected_final: Option<ExpectedFinal>,
    /// The sugar that yeast can take, where it is not what the gravity says.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub fermentable_sugar: Option<FermentableSugar>,
    /// How hungry the yeast is: `low`, `medium`, `high`.
    pub demand: String,
    /// What went in.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub ingredients: Vec<Ingredient>,
    /// What the book could not cover, by lot.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub shortfalls: Vec<Shortfall>,
    /// Entered later than the site allows.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub late: Option<Late>,
    /// Movements.
    pub legs: Vec<Leg>,
}

/// Where a fermentation is expected to end.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct ExpectedFinal {
    /// As entered.
    pub value: String,
    /// Its scale.
    pub scale: String,
    /// Apparent extract at that gravity, % by mass.
    pub apparent_extract_percent: String,
    /// From what it follows: composition, laboratory, earlier batches.
    pub basis: String,
    /// The formula behind the extract and its source.
    pub method: String,
    /// The engine that computed it.
    pub engine: String,
}

/// Sugar that yeast can take.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct FermentableSugar {
    /// g/L, decimal.
    pub g_per_l: String,
    /// From what it follows.
    pub basis: String,
}

/// One lot that went into the first fill.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Ingredient {
    /// Which lot.
    pub lot: LotId,
    /// Its code.
    pub lot_code: String,
    /// Its material's name.
    pub material: String,
    /// How much.
    pub amount: Quantity,
}
