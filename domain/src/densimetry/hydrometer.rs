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

use super::solve::rising_root;
use super::water::kell_90;
use super::{Celsius, DensimetryError, MassFraction, SpecificGravity, extract, sucrose};

/// Cubic expansion of soda-lime glass per K (OIML R 22 tables VIII and IX).
const GLASS: f64 = 25e-6;
/// Where the sugar model can be solved, in g/g. Below zero stands for liquids lighter than water.
const SUGAR: (f64, f64) = (-0.15, 0.7);

const METHOD: &str =
    "sucrose densities (ICUMSA SPS-4), soda-lime glass 25e-6/K; extract by the cubic on NBS C440";

const NOT_CORRECTED: &str = "not corrected for temperature: outside what the sugar model covers";
const ESTIMATE: &str =
    "read more than 5 K from 20 °C: the correction is an estimate, the more so with alcohol";
const LIGHTER_THAN_WATER: &str = "below SG 1.000 the apparent extract is negative: alcohol makes the liquid lighter \
     than water, it does not say how much sugar is left";
const PLATO_OVER: &str =
    "above 25 °P the ASBC cubic is not fitted: taken as % mass by the cubic on NBS C440";
const BRIX_OVER: &str = "above 40 Brix the cubic on NBS C440 is extrapolated";

/// The scale engraved on a hydrometer of 20 °C.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Scale {
    /// Specific gravity 20/20 °C.
    Sg20_20,
    /// Degrees Plato, grams per 100 g.
    Plato,
    /// Degrees Brix, grams per 100 g.
    Brix,
}

impl Scale {
    /// Every scale, in the order a list shows them.
    pub const ALL: [Self; 3] = [Self::Sg20_20, Self::Plato, Self::Brix];

    /// The name used in columns, JSON and on the command line.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Sg20_20 => "sg_20_20",
            Self::Plato => "plato",
            Self::Brix => "brix",
        }
    }

    /// The scale of that name.
    ///
    /// # Errors
    /// [`DensimetryError::UnknownScale`] with the names that exist.
    pub fn parse(name: &str) -> Result<Self, DensimetryError> {
        let unknown = || DensimetryError::UnknownScale(name.chars().take(40).collect());
        Self::ALL.into_iter().find(|scale| scale.name() == name).ok_or_else(unknown)
    }
}

/// A reading at its calibration temperature, on both scales the program thinks in.
#[derive(Clone, Debug, PartialEq)]
pub struct Corrected {
    /// What the instrument would show at 20 °C, on its own scale.
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

/// Corrects a hydrometer reading for the temperature of the liquid.
///
/// ```
/// use domain::densimetry::{Scale, correct};
/// let wash = correct(1.0665, Scale::Sg20_20, 27.0)?;
/// assert!((wash.sg_20_20 - 1.0685).abs() < 5e-5);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OutOfRange`] for a temperature outside 0 to 80 °C, a gravity outside 0.7 to 1.6, an extract
/// outside −20 to 70.
pub fn correct(
    reading: f64,
    scale: Scale,
    temperature_c: f64,
) -> Result<Corrected, DensimetryError> {
    let at = Celsius(sucrose::TEMPERATURES.admit(temperature_c)?);
    let at_20 = match scale {
        Scale::Sg20_20 => corrected_gravity(SpecificGravity::new(reading)?, Celsius::TWENTY, at),
        Scale::Plato | Scale::Brix => corrected_extract(extract::EXTRACTS.admit(reading)?, at),
    };
    let corrected = at_20.unwrap_or(reading);
    let gravity = match scale {
        Scale::Sg20_20 => SpecificGravity::new(corrected)?,
        Scale::Plato if corrected <= extract::PLATO_FITTED_TO => {
            extract::gravity_of_plato(corrected)?
        }
        Scale::Plato | Scale::Brix => extract::gravity_of_brix(corrected)?,
    };
    let apparent_extract = extract::brix(gravity);

    let mut notes = Vec::new();
    let mut note_if = |condition: bool, note| {
        if condition {
            notes.push(note);
        }
    };
    note_if(at_20.is_none(), NOT_CORRECTED);
    note_if(at_20.is_some() && (temperature_c - 20.0).abs() > 5.0, ESTIMATE);
    note_if(gravity.get() < 1.0, LIGHTER_THAN_WATER);
    note_if(scale == Scale::Plato && corrected > extract::PLATO_FITTED_TO, PLATO_OVER);
    note_if(apparent_extract > extract::BRIX_FITTED_TO, BRIX_OVER);
    Ok(Corrected {
        corrected,
        sg_20_20: gravity.get(),
        apparent_extract,
        correction: corrected - reading,
        method: METHOD,
        notes,
    })
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
