//! Density of sucrose in water: ICUMSA SPS-4 (Emmerich and Bettin), on the Kell-90 water.
//!
//! `ρ(w, t) = ρ_water(t) + Σⱼ xʲ Σᵢ bᵢⱼ wⁱ` with w the mass fraction, x = (t − 20 °C)/100, i from 1. Two public texts
//! differ in one coefficient, −3.9646 or −3.9643, worth less than 5·10⁻⁵ kg/m³; the second is used. The range 0 to
//! 70 % and 0 to 80 °C is from memory. Against the Plato table of 15 and 20 °C it stays within 0.09 kg/m³.

use super::water::kell_90;
use super::{Celsius, DensimetryError, Limits, MassFraction, polynomial};

/// What a liquid may be for a sugar model: 0 to 80 °C.
pub(super) const TEMPERATURES: Limits = Limits {
    what: "liquid temperature",
    min: 0.0,
    max: 80.0,
    unit: " °C",
    advice: "cool or warm the sample, ideally to 20 °C, and read again",
};

const FRACTIONS: Limits = Limits {
    what: "sucrose mass fraction",
    min: 0.0,
    max: 0.7,
    unit: "",
    advice: "give grams per gram (12 % is 0.12); dilute by weight what is stronger",
};

/// bᵢⱼ: one row per power of x, from x⁰; in it one coefficient per power of w, from w¹.
const COEFFICIENTS: [&[f64]; 5] = [
    &[385.1761, 135.3705, 40.9299, -3.9643, 13.4853, -17.2890],
    &[-46.2720, -7.1720, 1.1597, 5.1126, 17.5254],
    &[59.7712, 7.2491, 12.3630, -35.4791],
    &[-47.2207, -21.6977, 27.6301],
    &[18.3184, 12.3081],
];

/// Density in kg/m³ (in vacuum) of a sucrose solution.
///
/// ```
/// use domain::densimetry::{Celsius, MassFraction, sucrose};
/// let syrup = sucrose::density(MassFraction(0.2), Celsius::TWENTY)?;
/// assert!((syrup - 1080.9775).abs() < 1e-4);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside 0 to 0.7 g/g or 0 to 80 °C.
pub fn density(sucrose: MassFraction, at: Celsius) -> Result<f64, DensimetryError> {
    FRACTIONS.admit(sucrose.0)?;
    TEMPERATURES.admit(at.0)?;
    Ok(formula(sucrose, at))
}

/// The bare polynomial. Slightly below w = 0 it goes on smoothly, which the hydrometer model uses for liquids
/// lighter than water.
pub(super) fn formula(sucrose: MassFraction, at: Celsius) -> f64 {
    let x = (at.0 - 20.0) / 100.0;
    let by_fraction = COEFFICIENTS.map(|row| polynomial(row, sucrose.0) * sucrose.0);
    kell_90(at) + polynomial(&by_fraction, x)
}
