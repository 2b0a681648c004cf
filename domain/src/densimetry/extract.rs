//! Specific gravity 20/20 (in air) to extract and back.
//!
//! Two published cubics: ASBC for degrees Plato, fitted to 25 °P, and one on the table of NBS Circular C440 for
//! degrees Brix, fitted from 0 to 40 with a stated scatter of 0.0009. Both are read in an encyclopedia article and
//! held against the Plato table in `tests/reference/plato_sg.csv`. Below SG 1.000 both go negative: the apparent
//! extract of dry wine and sugar wash, where alcohol makes the liquid lighter than water. It is a number of the
//! scale, not of the sugar. Apparent extract is the NBS cubic everywhere in this program.

use super::solve::rising_root;
use super::water::cipm_2001;
use super::{Celsius, DensimetryError, Limits, SpecificGravity, polynomial};

/// Above this the ASBC cubic reads low (−0.03 at 31 °P, −0.07 at 37 °P).
pub const PLATO_FITTED_TO: f64 = 25.0;
/// Above this the NBS cubic is extrapolated.
pub const BRIX_FITTED_TO: f64 = 40.0;

/// Density of air in kg/m³ by the convention of OIML R 22 tables XI and XII.
pub const AIR_KG_M3: f64 = 1.2;

/// The two published cubics. Both rise over the whole range of gravities, so each has one inverse.
#[derive(Clone, Copy, Debug)]
pub(super) enum Cubic {
    /// P = −616.868 + 1111.14 S − 630.272 S² + 135.997 S³.
    Asbc,
    /// Bx = −669.5622 + 1262.7794 S − 775.6821 S² + 182.4601 S³.
    Nbs,
}

impl Cubic {
    /// ASBC as far as it is fitted, NBS above.
    pub(super) fn fitted_at(gravity: SpecificGravity) -> Self {
        if plato(gravity) <= PLATO_FITTED_TO { Self::Asbc } else { Self::Nbs }
    }

    const fn coefficients(self) -> [f64; 4] {
        match self {
            Self::Asbc => [-616.868, 1111.14, -630.272, 135.997],
            Self::Nbs => [-669.5622, 1262.7794, -775.6821, 182.4601],
        }
    }

    pub(super) fn degrees(self, gravity: SpecificGravity) -> f64 {
        polynomial(&self.coefficients(), gravity.get())
    }

    /// The gravity of so many degrees, by halving.
    pub(super) fn gravity(self, degrees: f64) -> SpecificGravity {
        let (from, to) = (SpecificGravity::LIGHTEST, SpecificGravity::HEAVIEST);
        let excess = |sg| self.degrees(SpecificGravity(sg)) - degrees;
        SpecificGravity(rising_root(from, to, excess))
    }
}

/// What an extract may be: −20 is lighter than any wine, 70 the end of the sugar densities.
pub(super) const EXTRACTS: Limits = Limits {
    what: "extract",
    min: -20.0,
    max: 70.0,
    unit: " %",
    advice: "check the scale (12.4 is degrees Plato or Brix, 1.050 a gravity); dilute by weight what is stronger",
};

/// Degrees Plato by the ASBC cubic; meant up to [`PLATO_FITTED_TO`].
pub fn plato(gravity: SpecificGravity) -> f64 {
    Cubic::Asbc.degrees(gravity)
}

/// Degrees Brix by the NBS cubic, the apparent extract AE; meant up to [`BRIX_FITTED_TO`].
///
/// ```
/// use domain::densimetry::{SpecificGravity, extract};
/// let must = extract::brix(SpecificGravity::new(1.094)?);
/// assert!((must - 22.456).abs() < 0.001);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
pub fn brix(gravity: SpecificGravity) -> f64 {
    Cubic::Nbs.degrees(gravity)
}

/// The gravity whose ASBC cubic is `plato`.
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside −20 to 70.
pub fn gravity_of_plato(plato: f64) -> Result<SpecificGravity, DensimetryError> {
    EXTRACTS.admit(plato).map(|degrees| Cubic::Asbc.gravity(degrees))
}

/// The gravity whose NBS cubic is `brix`.
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside −20 to 70.
pub fn gravity_of_brix(brix: f64) -> Result<SpecificGravity, DensimetryError> {
    EXTRACTS.admit(brix).map(|degrees| Cubic::Nbs.gravity(degrees))
}

/// Density at 20 °C in kg/m³ (in vacuum): S (W − air) + air, W the CIPM water of 20 °C.
pub fn density_20c(gravity: SpecificGravity) -> f64 {
    gravity.get() * (cipm_2001(Celsius::TWENTY) - AIR_KG_M3) + AIR_KG_M3
}

/// Grams of extract in a litre at 20 °C: Brix/100 × density.
pub fn extract_g_l(gravity: SpecificGravity) -> f64 {
    brix(gravity) / 100.0 * density_20c(gravity)
}

/// Degrees Oechsle, 1000 (S − 1) on the gravity 20/20.
pub fn oechsle(gravity: SpecificGravity) -> f64 {
    oechsle_at(gravity.get())
}

/// Degrees KMW of a gravity 20/20: the inverse of Oe = KMW (0.022 KMW + 4.54).
///
/// Read at an encyclopedia of food citing H. Ambrosi (1994) and in two wine glossaries; the table that Austrian law
/// rounds to could not be read.
pub fn kmw(gravity: SpecificGravity) -> f64 {
    kmw_at(gravity.get())
}

/// Degrees Baumé of liquids heavier than water with the modulus 145 (NBS, from memory): 145 − 145/S.
pub fn baume_145(gravity: SpecificGravity) -> f64 {
    baume_at(gravity.get())
}

pub(super) fn oechsle_at(gravity: f64) -> f64 {
    1_000.0 * (gravity - 1.0)
}

pub(super) fn gravity_at_oechsle(degrees: f64) -> f64 {
    1.0 + degrees / 1_000.0
}

/// Oe = 0.022 K² + 4.54 K.
const KMW: (f64, f64) = (0.022, 4.54);

pub(super) fn kmw_at(gravity: f64) -> f64 {
    let (square, linear) = KMW;
    let root = (linear * linear + 4.0 * square * oechsle_at(gravity)).sqrt();
    (root - linear) / (2.0 * square)
}

pub(super) fn gravity_at_kmw(degrees: f64) -> f64 {
    let (square, linear) = KMW;
    gravity_at_oechsle(degrees * (square * degrees + linear))
}

/// Modulus of the Baumé scale of liquids heavier than water (NBS, from memory).
const MODULUS: f64 = 145.0;

pub(super) fn baume_at(gravity: f64) -> f64 {
    MODULUS - MODULUS / gravity
}

pub(super) fn gravity_at_baume(degrees: f64) -> f64 {
    MODULUS / (MODULUS - degrees)
}

/// The gravity in air of a liquid against water, from their densities in vacuum at one temperature.
pub(super) fn gravity_in_air(liquid_kg_m3: f64, water_kg_m3: f64) -> f64 {
    (liquid_kg_m3 - AIR_KG_M3) / (water_kg_m3 - AIR_KG_M3)
}
