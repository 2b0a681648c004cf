//! Reference data: materials, parties, vessels, instruments. Describing again replaces the description.

use serde::{Deserialize, Serialize};

use crate::ids::{InstrumentId, MaterialId, PartyId, VesselId};
use crate::units::Quantity;

/// `material.described`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct MaterialDescribed {
    /// Which.
    pub material: MaterialId,
    /// Short human code, unique in the site.
    pub code: String,
    /// Name as printed.
    pub name: String,
    /// What it is for: nutrient, yeast, sulfite, enzyme, sugar, fruit, water, base, other.
    pub category: String,
    /// `mass`, `volume` or `count`: what its lots are counted in.
    pub dimension: String,
    /// The names under which positive lists know it.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub listed_as: Vec<String>,
    /// What it holds, by substance.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub composition: Vec<Component>,
}

/// One substance in a material, as a mass fraction.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Component {
    /// The substance, named as rules name it.
    pub substance: String,
    /// Its mass fraction.
    pub fraction: Quantity,
}

/// `party.described`: a firm; people's names live in the directory.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct PartyDescribed {
    /// Which.
    pub party: PartyId,
    /// Short human code, unique in the site.
    pub code: String,
    /// The firm.
    pub name: String,
    /// Postal address.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub address: Option<String>,
    /// Licence or permit number.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub licence: Option<String>,
}

/// `vessel.described`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct VesselDescribed {
    /// Which.
    pub vessel: VesselId,
    /// Name on its plate, unique in the site.
    pub code: String,
    /// What it is.
    pub name: String,
    /// Working capacity.
    pub capacity: Quantity,
    /// The premises it stands on, by code.
    pub premises: String,
}

/// `instrument.described`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct InstrumentDescribed {
    /// Which.
    pub instrument: InstrumentId,
    /// Short human code, unique in the site.
    pub code: String,
    /// What it is, for example a hydrometer.
    pub name: String,
    /// Date of the last calibration, `YYYY-MM-DD`.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub calibrated_on: Option<String>,
    /// Date by which it is due again, `YYYY-MM-DD`.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub calibration_due: Option<String>,
    /// The certificate's number.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub certificate: Option<String>,
}
