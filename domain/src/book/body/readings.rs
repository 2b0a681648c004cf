//! Readings: what was measured, as it was read, and what it comes to.

use serde::{Deserialize, Serialize};

use crate::ids::{BatchId, HoldingId, InstrumentId};
use crate::stamp::Stamp;

/// `reading.taken`: values read at one moment, or found in one sample. `occurred_at` is when the sample was taken.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct ReadingTaken {
    /// The batch it describes.
    pub batch: BatchId,
    /// The holding it was taken from.
    pub holding: HoldingId,
    /// When the answer came, for a laboratory result.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub reported_at: Option<Stamp>,
    /// The sample's own number.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub sample: Option<String>,
    /// Who analysed it, if not we.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub laboratory: Option<String>,
    /// The values.
    pub values: Vec<Reading>,
    /// Assimilable nitrogen, if the values give it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub nitrogen: Option<Nitrogen>,
    /// A remark.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub note: Option<String>,
}

/// One value.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Reading {
    /// What was measured.
    pub quantity: String,
    /// The number as entered.
    pub value: String,
    /// `<`, `>` or `about`.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub qualifier: Option<String>,
    /// Unit or scale.
    pub unit: String,
    /// For ions and acids: as what it is counted.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub expressed_as: Option<String>,
    /// The sample's temperature in °C, for what depends on it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub sample_temperature: Option<String>,
    /// How it was measured.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub method: Option<String>,
    /// With what.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub instrument: Option<InstrumentId>,
    /// A gravity's value at 20 °C.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub corrected: Option<CorrectedGravity>,
}

/// A gravity brought to the common scale, computed once and kept with its method.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct CorrectedGravity {
    /// Specific gravity 20/20 °C.
    pub sg_20_20: String,
    /// Apparent extract, % by mass; below zero in dry wine.
    pub extract: String,
    /// What was added to the reading, in its own scale.
    pub correction: String,
    /// The formula and its source.
    pub method: String,
    /// The engine that computed it.
    pub engine: String,
}

/// Assimilable nitrogen of one sample, mg N/L.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Nitrogen {
    /// As ammonium.
    pub ammonium: String,
    /// As primary amino nitrogen.
    pub amino: String,
    /// Both.
    pub total: String,
    /// The formula and its source.
    pub method: String,
    /// The engine that computed it.
    pub engine: String,
}
