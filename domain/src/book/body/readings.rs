//! Readings: what was measured, as it was read, and what it comes to.

use serde::{Deserialize, Serialize};

use super::Late;
use crate::checks::Finding;
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
    /// What was odd about it when it was entered, with the likely cause, as it was shown.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub findings: Vec<Finding>,
    /// Entered later than the site allows; a laboratory result counts from when it was reported.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub late: Option<Late>,
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
    /// The sample's temperature as entered, for what depends on it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub sample_temperature: Option<Temperature>,
    /// How it was measured.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub method: Option<String>,
    /// With what.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub instrument: Option<InstrumentId>,
    /// A gravity's value at 20 °C.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub corrected: Option<CorrectedGravity>,
    /// Why a gravity has none and is no point of the curve, and what to do about it.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub left_as_read: Option<String>,
}

/// A temperature as entered.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Temperature {
    /// Decimal text.
    pub value: String,
    /// `Cel` or `[degF]`.
    pub unit: String,
}

impl Temperature {
    /// In °C; `None` if the number or the unit is none.
    pub fn celsius(&self) -> Option<f64> {
        let number = crate::units::Decimal::parse(&self.value).ok()?.to_f64();
        match self.unit.as_str() {
            "Cel" => Some(number),
            "[degF]" => Some((number - 32.0) / 1.8),
            _ => None,
        }
    }
}

/// A gravity brought to the common scale, computed once and kept with its method.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct CorrectedGravity {
    /// Specific gravity 20/20 °C.
    pub sg_20_20: String,
    /// Apparent extract, % by mass; below zero in dry wine.
    pub apparent_extract_percent: String,
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
    pub ammonium_mg_l: String,
    /// As primary amino nitrogen.
    pub amino_mg_l: String,
    /// Both.
    pub total_mg_l: String,
    /// The formula and its source.
    pub method: String,
    /// The engine that computed it.
    pub engine: String,
}
