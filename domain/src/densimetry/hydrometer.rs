//! What a hydrometer read off its calibration temperature would have read at it.
//!
//! A floating body shows the density of the liquid around it, and its own glass grows with warmth. So
//! `ρ_scale(reading, t_cal) × (1 − g (t − t_cal)) = ρ_liquid(w, t)`, solved for the sugar w, which is then shown at
//! `t_cal`. g = 25·10⁻⁶ per K is the cubic expansion of soda-lime glass; the same model with OIML R 22 reproduces the
//! printed hydrometer values of 27 CFR part 30 within 0.05 proof, and misses by 0.2 without g. No published table for
//! Brix hydrometers could be read; all cells of NBS Circular C440 that are known from memory agree within 0.031 Brix.
//!
//! A fermenting liquid holds ethanol, which expands more than sugar water: what is corrected by more than five
//! kelvin is an estimate, and says so.

use super::scale::{Formula, Scale, Shows};
use super::solve::rising_root;
use super::water::kell_90;
use super::{
    Celsius, DensimetryError, MassFraction, SpecificGravity, extract, refractometer, sucrose,
};

/// Cubic expansion of soda-lime glass per K (OIML R 22 tables VIII and IX).
const GLASS: f64 = 25e-6;
/// Where the sugar model can be solved, in g/g. Below zero stands for liquids lighter than water.
const SUGAR: (f64, f64) = (-0.15, 0.7);

const METHOD: &str =
    "sucrose densities (ICUMSA SPS-4), soda-lime glass 25e-6/K; extract by the cubic on NBS C440";

const NOT_CORRECTED: &str = "not corrected for temperature: outside what the sugar model covers";
const NOT_COVERED: &str = "outside what the sugar model covers; read it on sg_20_20 at 20 °C, or have its density measured";
const LIGHTER_THAN_WATER: &str = "below SG 1.000 the apparent extract is negative: alcohol makes the liquid lighter \
     than water, it does not say how much sugar is left";
const PLATO_OVER: &str =
    "above 25 °P the ASBC cubic is not fitted: taken as % mass by the cubic on NBS C440";
const BRIX_OVER: &str = "above 40 Brix the cubic on NBS C440 is extrapolated";

/// A reading at its calibration temperature, on both scales the program thinks in.
#[derive(Clone, Debug, PartialEq)]
pub struct Corrected {
    /// What the instrument would show at its calibration temperature, on its own scale.
    pub corrected: f64,
    /// Specific gravity 20/20 °C, in air.
    pub sg_20_20: f64,
    /// Apparent extract in % mass: the NBS cubic at that gravity, negative below 1.000.
    pub apparent_extract: f64,
    /// `corrected` − reading, on the instrument's scale.
    pub correction: f64,
    /// Name and source of the formulas.
    pub method: &'static str,
    /// What a reader must know: estimates, ranges left.
    pub notes: Vec<&'static str>,
}

/// A reading taken at the temperature its scale is made for, or said to be.
///
/// # Errors
/// As [`correct`].
pub fn at_calibration(reading: f64, scale: Scale) -> Result<Corrected, DensimetryError> {
    correct(reading, scale, scale.calibration().0)
}

/// Corrects a reading for the temperature of the liquid, and brings it to SG 20/20.
///
/// ```
/// use domain::densimetry::{Scale, correct};
/// let wash = correct(1.0665, Scale::Sg20_20, 27.0)?;
/// assert!((wash.sg_20_20 - 1.0685).abs() < 5e-5);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OffScale`] for a number the scale cannot show, [`DensimetryError::OutOfRange`] for a temperature
/// outside 0 to 80 °C, [`DensimetryError::NotCovered`] where neither the sugar model nor a published table reaches.
pub fn correct(
    reading: f64,
    scale: Scale,
    temperature_c: f64,
) -> Result<Corrected, DensimetryError> {
    scale.admit(reading)?;
    let at = Celsius(temperature_c);
    let found = match scale.shows() {
        Shows::Gravity(gravity, degrees) => by_gravity(reading, scale, at, (gravity, degrees))?,
        Shows::Extract => by_extract(reading, scale, at)?,
        Shows::Refraction => refractometer::by_refraction(reading, scale, at)?,
    };
    let apparent_extract = extract::brix(found.gravity);

    let mut notes = Vec::new();
    let mut note_if = |condition: bool, note| {
        if condition {
            notes.push(note);
        }
    };
    let far_off = (temperature_c - scale.calibration().0).abs() > 5.0;
    note_if(!found.covered, NOT_CORRECTED);
    note_if(found.covered && far_off, scale.far_off());
    note_if(found.gravity.get() < 1.0, LIGHTER_THAN_WATER);
    note_if(scale == Scale::Plato && found.corrected > extract::PLATO_FITTED_TO, PLATO_OVER);
    note_if(apparent_extract > extract::BRIX_FITTED_TO, BRIX_OVER);
    notes.extend(scale.remarks());
    Ok(Corrected {
        corrected: found.corrected,
        sg_20_20: found.gravity.get(),
        apparent_extract,
        correction: found.corrected - reading,
        method: found.method,
        notes,
    })
}

/// What a reading comes to: on its own scale at its calibration, and as a gravity.
pub(super) struct Found {
    pub(super) corrected: f64,
    pub(super) gravity: SpecificGravity,
    pub(super) covered: bool,
    pub(super) method: &'static str,
}

/// A float whose number stands for a gravity. Outside the sugar model a scale of 20 °C is left as it was read; one of
/// another temperature cannot be, because its number is not yet a gravity 20/20.
fn by_gravity(
    reading: f64,
    scale: Scale,
    at: Celsius,
    (gravity, degrees): (Formula, Formula),
) -> Result<Found, DensimetryError> {
    sucrose::TEMPERATURES.admit(at.0)?;
    let (calibration, shown) = (scale.calibration(), gravity(reading));
    let Some(sugar) = sugar_in(shown * kell_90(calibration), calibration, at) else {
        if calibration != Celsius::TWENTY {
            let (celsius, advice) = (at.0, NOT_COVERED);
            return Err(DensimetryError::NotCovered { scale, reading, celsius, advice });
        }
        let gravity = SpecificGravity::new(shown)?;
        return Ok(Found { corrected: reading, gravity, covered: false, method: METHOD });
    };
    let against_water = |at| sucrose::formula(sugar, at) / kell_90(at);
    Ok(Found {
        corrected: degrees(against_water(calibration)),
        gravity: SpecificGravity::new(against_water(Celsius::TWENTY))?,
        covered: true,
        method: METHOD,
    })
}

/// A float graduated in grams of sucrose per 100 g.
fn by_extract(reading: f64, scale: Scale, at: Celsius) -> Result<Found, DensimetryError> {
    sucrose::TEMPERATURES.admit(at.0)?;
    let at_20 = corrected_extract(reading, at);
    let corrected = at_20.unwrap_or(reading);
    let gravity = if scale == Scale::Plato && corrected <= extract::PLATO_FITTED_TO {
        extract::gravity_of_plato(corrected)?
    } else {
        extract::gravity_of_brix(corrected)?
    };
    Ok(Found { corrected, gravity, covered: at_20.is_some(), method: METHOD })
}

/// A gravity read at `at` on a scale of `calibration` (20 °C or 60 °F, against water of the same temperature), as it
/// would read at `calibration`; `None` where the sugar model has no such liquid.
pub fn corrected_gravity(
    reading: SpecificGravity,
    calibration: Celsius,
    at: Celsius,
) -> Option<f64> {
    let water = kell_90(calibration);
    let sugar = sugar_in(reading.get() * water, calibration, at)?;
    Some(sucrose::formula(sugar, calibration) / water)
}

/// Degrees Brix or Plato read at `at` on a scale of 20 °C; `None` where the sugar model has no such liquid.
fn corrected_extract(reading: f64, at: Celsius) -> Option<f64> {
    let engraved = MassFraction(reading / 100.0);
    let density = sucrose::formula(engraved, Celsius::TWENTY);
    sugar_in(density, Celsius::TWENTY, at).map(|sugar| sugar.0 * 100.0)
}

/// The sugar of the liquid in which the float shows `density` (kg/m³) on a scale made for `calibration`.
fn sugar_in(density: f64, calibration: Celsius, at: Celsius) -> Option<MassFraction> {
    let around_the_float = density * (1.0 - GLASS * (at.0 - calibration.0));
    let excess = |w: f64| sucrose::formula(MassFraction(w), at) - around_the_float;
    let (least, most) = SUGAR;
    let covered = excess(least) < 0.0 && 0.0 < excess(most);
    covered.then(|| MassFraction(rising_root(least, most, excess)))
}
