//! Balling's relations between extract and alcohol in beer and wash.
//!
//! 2.0665 g of extract give 1 g of ethanol, 0.9565 g of carbon dioxide and 0.11 g of yeast dry matter (Nielsen,
//! Kristiansen, Lassen and Erikstrøm, Brauwelt International 2007). Measured on the means of real beers, the original
//! extract worked back from the beer is off by −0.10 to +0.23 °P (Cutaia, Reid and Speers, J. Inst. Brew. 115 (2009)
//! 318, table III). Everything here is an estimate; distillation is the reference.

/// Extract before fermentation in % mass (degrees Plato).
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct OriginalExtract(pub f64);

/// What the gravity of the fermenting liquid reads as extract, in % mass; negative below SG 1.000.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct ApparentExtract(pub f64);

/// Extract that is really there, in % mass.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct RealExtract(pub f64);

/// Ethanol in % mass.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct AlcoholByMass(pub f64);

/// Grams of extract per gram of ethanol.
const EXTRACT_PER_ETHANOL: f64 = 2.0665;
/// Of these, grams that leave as gas and yeast: 0.9565 + 0.11.
const LOST_PER_ETHANOL: f64 = 1.0665;

/// OE = 100 (2.0665 A + RE)/(100 + 1.0665 A): Balling's great formula.
pub fn original_extract(alcohol: AlcoholByMass, real: RealExtract) -> OriginalExtract {
    let before = EXTRACT_PER_ETHANOL * alcohol.0 + real.0;
    OriginalExtract(100.0 * before / (100.0 + LOST_PER_ETHANOL * alcohol.0))
}

/// A = (OE − RE)/(2.0665 − 0.010665 OE), the exact inverse of [`original_extract`].
pub fn alcohol_by_mass(original: OriginalExtract, real: RealExtract) -> AlcoholByMass {
    AlcoholByMass((original.0 - real.0) / extract_lost_per_alcohol(original))
}

/// RE = OE (100 + 1.0665 A)/100 − 2.0665 A, the same relation once more.
pub fn real_extract_beside(original: OriginalExtract, alcohol: AlcoholByMass) -> RealExtract {
    RealExtract(original.0 - extract_lost_per_alcohol(original) * alcohol.0)
}

/// RE = (q OE + AE)/(1 + q) with the attenuation quotient q = 0.22 + 0.001 OE.
///
/// The quotient is from memory; it is relied on because it reproduces all 31 values of the printed table of Balling
/// alcohol factors, 6 to 30 °P, within 1.1·10⁻⁴.
pub fn real_extract(original: OriginalExtract, apparent: ApparentExtract) -> RealExtract {
    let q = attenuation_quotient(original);
    RealExtract((q * original.0 + apparent.0) / (1.0 + q))
}

/// AE = (1 + q) RE − q OE, the inverse of [`real_extract`].
pub fn apparent_extract(original: OriginalExtract, real: RealExtract) -> ApparentExtract {
    let q = attenuation_quotient(original);
    ApparentExtract((1.0 + q) * real.0 - q * original.0)
}

/// RE = 0.1808 OE + 0.8192 AE, the constant form of many texts: about 0.9 % more alcohol at 12 °P than
/// [`real_extract`], which is preferred.
pub fn real_extract_constant_form(
    original: OriginalExtract,
    apparent: ApparentExtract,
) -> RealExtract {
    RealExtract(0.1808 * original.0 + 0.8192 * apparent.0)
}

/// % mass of alcohol per degree of apparent extract gone, by the quotient form: a function of OE alone.
pub fn alcohol_factor(original: OriginalExtract) -> f64 {
    1.0 / ((1.0 + attenuation_quotient(original)) * extract_lost_per_alcohol(original))
}

/// 100 (OE − AE)/OE.
pub fn apparent_attenuation_percent(original: OriginalExtract, apparent: ApparentExtract) -> f64 {
    100.0 * (original.0 - apparent.0) / original.0
}

/// 100 (OE − RE)/OE/(1 − 0.005161 RE): real degree of fermentation (ASBC Beer-6, as quoted by Cutaia et al. 2009).
pub fn real_attenuation_percent(original: OriginalExtract, real: RealExtract) -> f64 {
    100.0 * (original.0 - real.0) / original.0 / (1.0 - 0.005_161 * real.0)
}

/// 2.0665 − 0.010665 OE: degrees by which the extract falls per % mass of alcohol made.
fn extract_lost_per_alcohol(original: OriginalExtract) -> f64 {
    EXTRACT_PER_ETHANOL - LOST_PER_ETHANOL / 100.0 * original.0
}

fn attenuation_quotient(original: OriginalExtract) -> f64 {
    0.22 + 0.001 * original.0
}
