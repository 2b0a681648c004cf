//! Density of air-free water at 101,325 Pa.
//!
//! At 20 °C the two formulas differ by 0.0035 kg/m³; a ratio of two densities must never mix them.

use super::{Celsius, DensimetryError, Limits, polynomial};

const BOILING_LIMITS: Limits = Limits {
    what: "water temperature",
    min: 0.0,
    max: 100.0,
    unit: " °C",
    advice: "liquid water at normal pressure is meant; check the unit of the temperature",
};

/// A density and the formula that gave it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WaterDensity {
    /// Density in kg/m³ (in vacuum).
    pub kg_m3: f64,
    /// Name and source of the formula.
    pub method: &'static str,
}

/// CIPM 2001 from 0 to 40 °C, Kell with ITS-90 coefficients above, to 100 °C.
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside 0 to 100 °C.
pub fn density(at: Celsius) -> Result<WaterDensity, DensimetryError> {
    BOILING_LIMITS.admit(at.0)?;
    Ok(if at.0 <= 40.0 {
        WaterDensity { kg_m3: cipm_2001(at), method: "CIPM 2001 (Metrologia 38 (2001) 301)" }
    } else {
        WaterDensity { kg_m3: kell_90(at), method: "Kell with ITS-90 coefficients" }
    })
}

/// CIPM 2001 in kg/m³, 0 to 40 °C: ρ = a5 [1 − (t + a1)² (t + a2) / (a3 (t + a4))].
///
/// Source: M. Tanaka et al., Metrologia 38 (2001) 301, as repeated in several public programs.
pub fn cipm_2001(at: Celsius) -> f64 {
    let t = at.0;
    999.974_950 * (1.0 - (t - 3.983_035).powi(2) * (t + 301.797) / (522_528.9 * (t + 69.348_81)))
}

/// Kell's quotient with coefficients for ITS-90 in kg/m³, 0 to 100 °C: the water of the sucrose densities.
///
/// Source: G. S. Kell's form (1975) with the ITS-90 coefficients as read in public programs; at most
/// 0.006 kg/m³ below IAPWS-95.
pub fn kell_90(at: Celsius) -> f64 {
    const NUMERATOR: [f64; 6] =
        [999.839_52, 16.952_577, -7.990_512_7e-3, -46.241_757e-6, 105.846_01e-9, -281.030_06e-12];
    polynomial(&NUMERATOR, at.0) / (1.0 + 16.887_236e-3 * at.0)
}
