//! What a hydrometer reading says: densities of water, sugar and ethanol solutions, gravity and extract.
//!
//! One file per published body. Every function is a formula of floating-point numbers; the sources and the fitted
//! ranges stand beside the coefficients, the published tables they are held against in `tests/reference/`.
//!
//! None of it replaces a laboratory: a gravity of a fermenting liquid is a mixture of sugar, alcohol, acid and gas,
//! and alcohol worked out from two gravities is an estimate (about ±0.2 % vol), never a strength for a label or duty.

pub mod alcohol;
pub mod balling;
pub mod ethanol_water;
pub mod extract;
pub mod hydrometer;
pub mod refractometer;
pub mod scale;
pub mod sucrose;
pub mod water;

pub(crate) mod solve;

pub use alcohol::{AlcoholEstimate, expected_alcohol, expected_final_gravity};
pub use hydrometer::{Corrected, at_calibration, correct};
pub use scale::Scale;

#[cfg(test)]
mod tests;

/// A temperature in degrees Celsius (ITS-90).
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct Celsius(pub f64);

impl Celsius {
    /// The reference temperature of sugar scales and of OIML strength.
    pub const TWENTY: Self = Self(20.0);
    /// 60 °F, the reference temperature of United States gauging (27 CFR part 30).
    pub const SIXTY_FAHRENHEIT: Self = Self((60.0 - 32.0) / 1.8);
}

/// Grams of a substance per gram of solution, from 0 to 1.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct MassFraction(pub f64);

/// A specific gravity 20/20 °C as a hydrometer shows it: weighed in air, against water of 20 °C.
///
/// ```
/// use domain::densimetry::SpecificGravity;
/// assert_eq!(SpecificGravity::new(1.094)?.get(), 1.094);
/// assert!(SpecificGravity::new(1094.0).is_err());
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct SpecificGravity(f64);

impl SpecificGravity {
    /// The lightest gravity accepted. Lighter than pure ethanol (0.79): only a slip goes below it.
    pub const LIGHTEST: f64 = 0.7;
    /// The heaviest gravity accepted. Heavier than the strongest syrup (70 % sucrose is 1.35): only a slip goes above
    /// it.
    pub const HEAVIEST: f64 = 1.6;

    /// # Errors
    /// [`DensimetryError::OutOfRange`] outside 0.7 to 1.6.
    pub fn new(sg: f64) -> Result<Self, DensimetryError> {
        Limits {
            what: "specific gravity",
            min: Self::LIGHTEST,
            max: Self::HEAVIEST,
            unit: "",
            advice: "check the digits and the scale (1.050 is a gravity, 1050 and 12.4 are other scales)",
        }
        .admit(sg)
        .map(Self)
    }

    /// The plain number.
    pub const fn get(self) -> f64 {
        self.0
    }
}

/// Why a density could not be worked out.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum DensimetryError {
    /// An argument is outside what its formula was fitted for, or not a number.
    #[error("{what} {value}{unit} is outside {min} to {max}{unit}: {advice}")]
    OutOfRange {
        /// What the value is.
        what: &'static str,
        /// The value given.
        value: f64,
        /// The smallest accepted.
        min: f64,
        /// The largest accepted.
        max: f64,
        /// The unit, with its leading blank.
        unit: &'static str,
        /// What to do.
        advice: &'static str,
    },
    /// The present gravity is above the original one.
    #[error(
        "the present gravity {present} is above the original gravity {original}: check whether the two were \
         exchanged, or sugar was added since"
    )]
    HeavierThanAtFirst {
        /// Original specific gravity.
        original: f64,
        /// Present specific gravity.
        present: f64,
    },
    /// More alcohol than the extract could have given.
    #[error(
        "no fermentation of the extract at original gravity {original} ends at {asked}: check both values, or \
         have the alcohol measured"
    )]
    MoreThanTheExtract {
        /// Original specific gravity.
        original: f64,
        /// The gravity or strength asked for, with its unit.
        asked: String,
    },
    /// No such scale name.
    #[error("unknown scale {0:?}: use one of {names}", names = Scale::names())]
    UnknownScale(String),
    /// A number that its scale cannot show.
    #[error(
        "{reading} {name} is outside {min} to {max}: {advice}; the scales are {names}",
        name = scale.name(), min = scale.range().0, max = scale.range().1, advice = scale.advice(),
        names = Scale::names()
    )]
    OffScale {
        /// The scale.
        scale: Scale,
        /// The number given.
        reading: f64,
    },
    /// A reading that cannot be brought to SG 20/20 honestly.
    #[error("{reading} {name} at {celsius:.1} °C is not brought to SG 20/20: {advice}", name = scale.name())]
    NotCovered {
        /// The scale.
        scale: Scale,
        /// The reading.
        reading: f64,
        /// The temperature of the liquid in °C.
        celsius: f64,
        /// Why, and what to do.
        advice: &'static str,
    },
}

/// The accepted range of one argument.
#[derive(Clone, Copy)]
struct Limits {
    what: &'static str,
    min: f64,
    max: f64,
    unit: &'static str,
    advice: &'static str,
}

impl Limits {
    /// The value itself if it is a number within the limits.
    fn admit(self, value: f64) -> Result<f64, DensimetryError> {
        if (self.min..=self.max).contains(&value) {
            return Ok(value);
        }
        let Self { what, min, max, unit, advice } = self;
        Err(DensimetryError::OutOfRange { what, value, min, max, unit, advice })
    }
}

/// Coefficients from the constant upwards, at `x` (Horner's scheme).
fn polynomial(coefficients: &[f64], x: f64) -> f64 {
    coefficients.iter().rev().fold(0.0, |sum, c| sum * x + c)
}
