//! What a refractometer says of an unfermented liquid: % mass sucrose, its temperature, the sugar of a must.
//!
//! Alcohol bends light too. **No correction for it is solid**, so none is here: the two-equation form on Barth's
//! constants returned 2.3 for a beer of 4.0 % mass, industrial regressions differ by up to 0.49 % vol between
//! instruments, and an evaluation of the form on first and last Brix found a standard deviation of 0.4 % vol. OIV
//! uses refractometry on the distillate alone (MA-AS312-01, method D). Whoever knows that yeast has been at work does
//! not make a gravity of a refractometer's number ([`FERMENTED`] says what to do instead).

use super::hydrometer::Found;
use super::scale::Scale;
use super::{Celsius, DensimetryError, Limits, extract, polynomial};

/// Why a reading in a liquid that holds alcohol is no gravity, and what to do.
pub const FERMENTED: &str = "kept as read, not as a gravity: a refractometer sees alcohol as well as sugar, and no \
     correction for it is solid (an alcohol worked out this way is an estimate of ±0.5 % vol, never for duty); read a \
     hydrometer or a density meter, or have alcohol or real extract measured";

const METHOD: &str = "refractometer: temperature by OIV-MA-AS2-02 table I, 10 to 20 °C; as sucrose by the cubic on NBS C440";

const NOT_COVERED: &str = "the table of temperature corrections (OIV-MA-AS2-02 table I, as far as it could be read) \
     reaches from 10 to 20 °C and from 10 to 75 %; bring the sample to 20 °C and read again, or leave the temperature \
     out if the instrument compensates for it itself";

/// % mass read, then (°C, what to add): OIV-MA-AS2-02 table I, read in a public copy of the compendium, 10 to 16 °C;
/// cells that could not be read are left out. At 20 °C nothing is added by definition.
const TABLE: [(f64, &[(f64, f64)]); 14] = [
    (10.0, &[(10.0, -0.59), (11.0, -0.54), (13.0, -0.43), (14.0, -0.38), (16.0, -0.26)]),
    (15.0, &[(11.0, -0.57), (12.0, -0.51), (14.0, -0.39), (15.0, -0.33)]),
    (20.0, &[(10.0, -0.65), (12.0, -0.53), (13.0, -0.47), (15.0, -0.34), (16.0, -0.28)]),
    (25.0, &[(10.0, -0.67), (11.0, -0.61), (13.0, -0.48), (14.0, -0.42), (16.0, -0.28)]),
    (30.0, &[(11.0, -0.63), (12.0, -0.56), (14.0, -0.43), (15.0, -0.36)]),
    (35.0, &[(10.0, -0.71), (12.0, -0.57), (13.0, -0.51), (15.0, -0.37), (16.0, -0.30)]),
    (40.0, &[(10.0, -0.72), (11.0, -0.65), (13.0, -0.52), (14.0, -0.44), (16.0, -0.30)]),
    (45.0, &[(11.0, -0.66), (12.0, -0.59), (14.0, -0.45), (15.0, -0.38)]),
    (50.0, &[(10.0, -0.74), (12.0, -0.60), (13.0, -0.53), (15.0, -0.38), (16.0, -0.31)]),
    (55.0, &[(10.0, -0.75), (11.0, -0.68), (13.0, -0.53), (14.0, -0.46), (16.0, -0.31)]),
    (60.0, &[(11.0, -0.68), (12.0, -0.61), (14.0, -0.46), (15.0, -0.38)]),
    (65.0, &[(10.0, -0.75), (12.0, -0.61), (13.0, -0.53), (15.0, -0.38), (16.0, -0.31)]),
    (70.0, &[(10.0, -0.75), (11.0, -0.68), (13.0, -0.53), (14.0, -0.46), (16.0, -0.31)]),
    (75.0, &[(11.0, -0.67), (12.0, -0.60), (14.0, -0.45), (15.0, -0.38)]),
];
const AT_20: (f64, f64) = (20.0, 0.0);

/// What to add to a reading in % mass sucrose taken at `at`; `None` where the table does not reach.
///
/// Straight lines between the cells, first along the temperature, then along the reading.
pub fn temperature_correction(percent: f64, at: Celsius) -> Option<f64> {
    if at == Celsius::TWENTY {
        return Some(0.0);
    }
    let columns = TABLE.iter().filter_map(|(column, cells)| {
        let cells = cells.iter().copied().chain([AT_20]);
        Some((*column, between(cells, at.0)?))
    });
    between(columns, percent)
}

/// The value at `x` on straight lines through points that rise in x; `None` outside them.
fn between(points: impl Iterator<Item = (f64, f64)>, x: f64) -> Option<f64> {
    let mut left: Option<(f64, f64)> = None;
    for (right_x, right) in points {
        match left {
            None if x < right_x => return None,
            Some((left_x, left)) if x <= right_x => {
                return Some(left + (right - left) * (x - left_x) / (right_x - left_x));
            }
            _ => left = Some((right_x, right)),
        }
    }
    None
}

/// A reading of an unfermented liquid as a gravity.
pub(super) fn by_refraction(
    reading: f64,
    scale: Scale,
    at: Celsius,
) -> Result<Found, DensimetryError> {
    let Some(correction) = temperature_correction(reading, at) else {
        let (celsius, advice) = (at.0, NOT_COVERED);
        return Err(DensimetryError::NotCovered { scale, reading, celsius, advice });
    };
    let corrected = reading + correction;
    let gravity = extract::gravity_of_brix(corrected)?;
    Ok(Found { corrected, gravity, covered: true, method: METHOD })
}

const INDEX: Limits = Limits {
    what: "refractive index",
    min: 1.333,
    max: 1.5,
    unit: "",
    advice: "the index at 20 °C for sodium light is meant, such as 1.36384; water has 1.3330",
};

/// A content of sucrose and the formula that gave it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sucrose {
    /// % mass.
    pub percent: f64,
    /// Name and source of the formula.
    pub method: &'static str,
    /// What a reader must know.
    pub note: Option<&'static str>,
}

/// % mass sucrose from the refractive index at 20 °C, sodium D.
///
/// From 10 to 30 % a cubic of our own, within 0.0034 % of OIV-MA-AS2-02 table II; outside the polynomial of the
/// fifth degree read in an encyclopedia article, which runs 0.015 to 0.021 % below that table.
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside 1.333 to 1.5.
pub fn sucrose_percent(n_d20: f64) -> Result<Sucrose, DensimetryError> {
    let n = INDEX.admit(n_d20)?;
    Ok(if OIV_FROM_10_TO_30_PERCENT.contains(&n) {
        let percent = polynomial(&OIV_CUBIC, n - 1.36);
        Sucrose { percent, method: "own cubic on OIV-MA-AS2-02 table II", note: None }
    } else {
        Sucrose {
            percent: by_fifth_degree(n),
            method: "polynomial of the fifth degree",
            note: Some("outside 10 to 30 % by a polynomial that runs 0.02 % below the OIV table"),
        }
    })
}

const OIV_FROM_10_TO_30_PERCENT: std::ops::RangeInclusive<f64> = 1.347_82..=1.381_15;
const OIV_CUBIC: [f64; 4] = [17.670_464_6, 611.781_298, -1_442.563_33, 3_669.208_85];

pub(super) fn by_fifth_degree(n: f64) -> f64 {
    const COEFFICIENTS: [f64; 6] =
        [-99_127.453_6, 318_417.95, -413_145.80, 270_177.93, -88_885.21, 11_758.74];
    polynomial(&COEFFICIENTS, n)
}

const MUST: Limits = Limits {
    what: "refractometer reading of a must",
    min: 10.0,
    max: 30.0,
    unit: " %",
    advice: "the table (OIV-MA-AS2-02 table II) ends there: have the sugar measured",
};

/// What a grape must of one refractometer reading holds.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct MustSugar {
    /// Density at 20 °C in kg/L.
    pub density_kg_l: f64,
    /// Sugar in g/L.
    pub sugar_g_l: f64,
    /// Sugar in g/kg.
    pub sugar_g_kg: f64,
    /// % vol if 16.83 g/L give one.
    pub potential_abv_1683: f64,
    /// Name and source of the formulas.
    pub method: &'static str,
}

/// The sugar of grape must by refractometer at 20 °C: own quadratics on OIV-MA-AS2-02 table II, 10 to 30 %.
///
/// ```
/// let must = domain::densimetry::refractometer::must_sugar(20.0)?;
/// assert!((must.sugar_g_l - 191.9).abs() < 0.06);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside 10 to 30 %.
pub fn must_sugar(sucrose_percent: f64) -> Result<MustSugar, DensimetryError> {
    const SUGAR: [f64; 3] = [-20.267_443, 9.879_539_4, 0.036_413_955];
    const DENSITY: [f64; 3] = [1.000_668_39, 3.622_350_44e-3, 2.159_015_24e-5];
    let percent = MUST.admit(sucrose_percent)?;
    let (sugar_g_l, density_kg_l) = (polynomial(&SUGAR, percent), polynomial(&DENSITY, percent));
    Ok(MustSugar {
        density_kg_l,
        sugar_g_l,
        sugar_g_kg: sugar_g_l / density_kg_l,
        potential_abv_1683: sugar_g_l / 16.83,
        method: "own quadratics on OIV-MA-AS2-02 table II",
    })
}
