//! Alcohol from two gravities: Balling with Tabarié, solved.
//!
//! Tabarié: the gravity of a beer is that of its alcohol in water plus that of its real extract in water, less one
//! (read at mebak.org). The alcohol part is OIML R 22, the extract part the ASBC cubic (above 25 °P, where it
//! is not fitted, the cubic on NBS C440), both as gravities 20/20 in air; Balling ties extract to alcohol. From measured alcohol and real extract it predicts the measured apparent
//! extract within 0.04 to 0.08 °P on the five data sets of Cutaia, Reid and Speers (2009). The combination is our own.
//!
//! Made for beer and wash. On grape must it takes all extract for sugar and reads about half a per cent high.

use super::balling::{
    AlcoholByMass, ApparentExtract, OriginalExtract, RealExtract, alcohol_by_mass,
    apparent_attenuation_percent, real_attenuation_percent, real_extract_beside,
};
use super::ethanol_water::{formula as ethanol_water, pure_ethanol_20c};
use super::extract::Cubic;
use super::solve::rising_root;
use super::{Celsius, DensimetryError, Limits, MassFraction, SpecificGravity, extract};

const METHOD: &str = "Balling with Tabarié, solved on OIML R 22 and the ASBC cubic (above 25 °P the cubic on NBS C440)";
const NOTES: &[&str] = &[
    "an estimate of about ±0.2 % vol, never a strength for a label or for duty: distillation is the reference",
    "made for beer and wash: for grape must use its sugar",
];

/// From one degree of gravity, under which nothing is fermented, to where the extract cubic has long been extrapolated.
const FERMENTABLE: Limits = Limits {
    what: "original gravity",
    min: 1.001,
    max: 1.3,
    unit: "",
    advice: "the gravity before fermentation is meant, such as 1.048",
};

/// Gravity 20/20 before fermentation.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct OriginalGravity(pub SpecificGravity);

/// Gravity 20/20 now, or at the end.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct PresentGravity(pub SpecificGravity);

/// Alcohol and extract between two gravities.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct AlcoholEstimate {
    /// Ethanol in % mass.
    pub abw: f64,
    /// Ethanol in % by volume at 20 °C.
    pub abv_20c: f64,
    /// Real extract in % mass.
    pub real_extract: f64,
    /// 100 (OE − AE)/OE.
    pub apparent_attenuation_percent: f64,
    /// Real degree of fermentation by the ASBC form.
    pub real_attenuation_percent: f64,
    /// Name and source of the formulas.
    pub method: &'static str,
    /// What a reader must know.
    pub notes: &'static [&'static str],
}

/// The alcohol in a liquid that came from one gravity down to another.
///
/// ```
/// use domain::densimetry::alcohol::{OriginalGravity, PresentGravity, expected_alcohol};
/// use domain::densimetry::SpecificGravity;
/// let original = OriginalGravity(SpecificGravity::new(1.048)?);
/// let last = PresentGravity(SpecificGravity::new(1.012)?);
/// assert!((expected_alcohol(original, last)?.abv_20c - 4.73).abs() < 0.005);
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OutOfRange`] for an original gravity outside 1.001 to 1.3,
/// [`DensimetryError::HeavierThanAtFirst`], [`DensimetryError::MoreThanTheExtract`].
pub fn expected_alcohol(
    original: OriginalGravity,
    present: PresentGravity,
) -> Result<AlcoholEstimate, DensimetryError> {
    let (before, now) = (original.0.get(), present.0.get());
    if now > before {
        return Err(DensimetryError::HeavierThanAtFirst { original: before, present: now });
    }
    let wort = Wort::of(original)?;
    let fallen = |abw: f64| now - wort.gravity_with(AlcoholByMass(abw));
    if fallen(wort.most_alcohol) < 0.0 {
        let asked = format!("gravity {now}");
        return Err(DensimetryError::MoreThanTheExtract { original: before, asked });
    }
    let alcohol = AlcoholByMass(rising_root(0.0, wort.most_alcohol, fallen));
    let real = wort.real_extract(alcohol);
    let apparent = ApparentExtract(wort.cubic.degrees(present.0));
    Ok(AlcoholEstimate {
        abw: alcohol.0,
        abv_20c: by_volume(alcohol, now),
        real_extract: real.0,
        apparent_attenuation_percent: apparent_attenuation_percent(wort.extract, apparent),
        real_attenuation_percent: real_attenuation_percent(wort.extract, real),
        method: METHOD,
        notes: NOTES,
    })
}

/// Where the gravity ends when so much alcohol (% vol at 20 °C) is made: the expected final gravity from composition.
///
/// # Errors
/// [`DensimetryError::OutOfRange`] as above, [`DensimetryError::MoreThanTheExtract`] for a negative strength or more than the extract can give.
pub fn expected_final_gravity(
    original: OriginalGravity,
    abv_20c: f64,
) -> Result<SpecificGravity, DensimetryError> {
    let wort = Wort::of(original)?;
    let made = |abw: f64| {
        let alcohol = AlcoholByMass(abw);
        by_volume(alcohol, wort.gravity_with(alcohol)) - abv_20c
    };
    if !(0.0..=made(wort.most_alcohol) + abv_20c).contains(&abv_20c) {
        let asked = format!("{abv_20c} % vol");
        return Err(DensimetryError::MoreThanTheExtract { original: original.0.get(), asked });
    }
    let alcohol = AlcoholByMass(rising_root(0.0, wort.most_alcohol, made));
    SpecificGravity::new(wort.gravity_with(alcohol))
}

/// What was there before fermentation.
struct Wort {
    cubic: Cubic,
    extract: OriginalExtract,
    /// % mass of alcohol when no extract is left.
    most_alcohol: f64,
}

impl Wort {
    fn of(original: OriginalGravity) -> Result<Self, DensimetryError> {
        FERMENTABLE.admit(original.0.get())?;
        let cubic = Cubic::fitted_at(original.0);
        let extract = OriginalExtract(cubic.degrees(original.0));
        let most_alcohol = alcohol_by_mass(extract, RealExtract(0.0)).0;
        Ok(Self { cubic, extract, most_alcohol })
    }

    fn real_extract(&self, alcohol: AlcoholByMass) -> RealExtract {
        real_extract_beside(self.extract, alcohol)
    }

    /// Tabarié's sum; falls as alcohol is made.
    fn gravity_with(&self, alcohol: AlcoholByMass) -> f64 {
        let in_water = ethanol_water(MassFraction(alcohol.0 / 100.0), Celsius::TWENTY);
        let water = ethanol_water(MassFraction(0.0), Celsius::TWENTY);
        let of_alcohol = extract::gravity_in_air(in_water, water);
        of_alcohol + self.cubic.gravity(self.real_extract(alcohol).0).get() - 1.0
    }
}

/// % mass × density / density of ethanol, at 20 °C.
fn by_volume(alcohol: AlcoholByMass, gravity: f64) -> f64 {
    alcohol.0 * extract::density_20c(SpecificGravity(gravity)) / pure_ethanol_20c()
}
