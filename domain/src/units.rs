//! Exact quantities.
//!
//! What is counted, weighed or compared with a limit is an integer of a small base unit. A quantity keeps what the
//! person typed beside it, so that the number on the page is the number that was meant. Conversion is by an exact
//! rational factor and rounds half to even, once.
//!
//! Units are named by their UCUM codes (<https://ucum.org>). Sources of the factors: the US gallon is 231 cubic
//! inches and the avoirdupois pound 0.45359237 kg, both exact (NIST Handbook 44, appendix C).

use std::fmt;

use serde::{Deserialize, Serialize};

/// What a quantity measures.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Dimension {
    /// Base unit: microgram.
    Mass,
    /// Base unit: microlitre.
    Volume,
    /// Base unit: piece.
    Count,
    /// A mass fraction of a material. Base unit: part per thousand million.
    Fraction,
}

impl Dimension {
    /// The largest amount one quantity may hold, so that sums stay far from overflow: 1,000 t, 1,000,000 m³, 10⁹ pieces.
    pub const fn largest(self) -> i64 {
        match self {
            Self::Mass | Self::Volume => 1_000_000_000_000_000,
            Self::Count | Self::Fraction => 1_000_000_000,
        }
    }

    /// The name used in columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Mass => "mass",
            Self::Volume => "volume",
            Self::Count => "count",
            Self::Fraction => "mass fraction",
        }
    }
}

/// One accepted unit: its UCUM code, what it measures, and base units per unit as an exact fraction.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Unit {
    /// UCUM code.
    pub code: &'static str,
    /// What it measures.
    pub dimension: Dimension,
    /// Base units = value × `numerator` / `denominator`.
    pub numerator: i64,
    /// See `numerator`.
    pub denominator: i64,
}

/// Every accepted unit, the one table behind REST, ledger and paper.
pub const UNITS: &[Unit] = &[
    unit("ug", Dimension::Mass, 1, 1),
    unit("mg", Dimension::Mass, 1_000, 1),
    unit("g", Dimension::Mass, 1_000_000, 1),
    unit("kg", Dimension::Mass, 1_000_000_000, 1),
    unit("t", Dimension::Mass, 1_000_000_000_000, 1),
    unit("[lb_av]", Dimension::Mass, 453_592_370, 1),
    unit("[oz_av]", Dimension::Mass, 453_592_370, 16),
    unit("uL", Dimension::Volume, 1, 1),
    unit("mL", Dimension::Volume, 1_000, 1),
    unit("cL", Dimension::Volume, 10_000, 1),
    unit("L", Dimension::Volume, 1_000_000, 1),
    unit("hL", Dimension::Volume, 100_000_000, 1),
    unit("m3", Dimension::Volume, 1_000_000_000, 1),
    unit("[gal_us]", Dimension::Volume, 3_785_411_784, 1_000),
    unit("1", Dimension::Count, 1, 1),
    unit("g/g", Dimension::Fraction, 1_000_000_000, 1),
    unit("%", Dimension::Fraction, 10_000_000, 1),
    unit("g/kg", Dimension::Fraction, 1_000_000, 1),
    unit("mg/kg", Dimension::Fraction, 1_000, 1),
];

const fn unit(code: &'static str, dimension: Dimension, numerator: i64, denominator: i64) -> Unit {
    Unit { code, dimension, numerator, denominator }
}

impl Unit {
    /// Looks a unit up by its UCUM code, capitals as written there.
    ///
    /// # Errors
    /// [`UnitError::Unknown`] with the codes that exist.
    pub fn of(code: &str) -> Result<&'static Self, UnitError> {
        UNITS.iter().find(|u| u.code == code).ok_or_else(|| UnitError::Unknown(code.to_owned()))
    }
}

/// Why a quantity was not understood.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum UnitError {
    /// No such code in [`UNITS`].
    #[error("unknown unit {0:?}: use one of {known}", known = known_codes())]
    Unknown(String),
    /// The unit measures something else.
    #[error("{code} is a unit of {found}, but a {wanted} is asked for here", wanted = .wanted.name(), found = .found.name())]
    WrongDimension {
        /// The code given.
        code: &'static str,
        /// What is needed.
        wanted: Dimension,
        /// What the code measures.
        found: Dimension,
    },
    /// Not a plain decimal number.
    #[error(
        "{0:?} is not a plain decimal number such as 2.5 (no exponent, no thousands mark, a point before the decimals)"
    )]
    NotDecimal(String),
    /// Larger than one entry may carry, or negative.
    #[error("{entered} {unit} is outside what one entry may carry: from 0 to {largest} {unit}")]
    OutOfRange {
        /// The number given.
        entered: String,
        /// Its unit.
        unit: &'static str,
        /// The largest number in that unit.
        largest: i64,
    },
}

fn known_codes() -> String {
    UNITS.iter().map(|u| u.code).collect::<Vec<_>>().join(", ")
}

/// An amount: what was entered, and the integer of base units that everything computes with.
///
/// ```
/// use domain::units::{Dimension, Quantity};
/// let dose = Quantity::parse("8", "[lb_av]", Dimension::Mass)?;
/// assert_eq!(dose.base(), 3_628_738_960); // µg
/// # Ok::<(), domain::units::UnitError>(())
/// ```
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Quantity {
    entered: String,
    unit: String,
    base: i64,
}

impl Quantity {
    /// Reads a decimal text in a unit of the wanted dimension; zero is allowed, negative is not.
    ///
    /// # Errors
    /// Any [`UnitError`].
    pub fn parse(entered: &str, code: &str, wanted: Dimension) -> Result<Self, UnitError> {
        let unit = Unit::of(code)?;
        if unit.dimension != wanted {
            return Err(UnitError::WrongDimension {
                code: unit.code,
                wanted,
                found: unit.dimension,
            });
        }
        let decimal = Decimal::parse(entered)?;
        let out_of_range = || UnitError::OutOfRange {
            entered: entered.to_owned(),
            unit: unit.code,
            largest: scale(wanted.largest(), unit.denominator, unit.numerator),
        };
        let base = decimal.scaled_by(unit.numerator, unit.denominator).ok_or_else(out_of_range)?;
        if decimal.is_negative() || base < 0 || base > wanted.largest() {
            return Err(out_of_range());
        }
        Ok(Self { entered: entered.to_owned(), unit: unit.code.to_owned(), base })
    }

    /// Reads a quantity whatever it measures.
    ///
    /// # Errors
    /// Any [`UnitError`].
    pub fn parse_any(entered: &str, code: &str) -> Result<Self, UnitError> {
        Self::parse(entered, code, Unit::of(code)?.dimension)
    }

    /// An amount that was computed rather than typed, shown in the base unit.
    pub fn computed(base: i64, dimension: Dimension) -> Self {
        let unit = match dimension {
            Dimension::Mass => "ug",
            Dimension::Volume => "uL",
            Dimension::Count => "1",
            Dimension::Fraction => "g/g",
        };
        let entered = match dimension {
            Dimension::Fraction => format!("{}.{:09}", base / 1_000_000_000, base % 1_000_000_000),
            _ => base.to_string(),
        };
        Self { entered, unit: unit.to_owned(), base }
    }

    /// Whether `base` is what `entered` and `unit` say: what `verify` recomputes.
    pub fn is_consistent(&self) -> bool {
        Self::parse_any(&self.entered, &self.unit).is_ok_and(|again| again.base == self.base)
    }

    /// The number as typed.
    pub fn entered(&self) -> &str {
        &self.entered
    }

    /// The UCUM code as typed.
    pub fn unit(&self) -> &str {
        &self.unit
    }

    /// Base units: µg, µL or pieces.
    pub const fn base(&self) -> i64 {
        self.base
    }

    /// What it measures.
    ///
    /// # Errors
    /// [`UnitError::Unknown`] if the unit is not of this table, which only a foreign entry can cause.
    pub fn dimension(&self) -> Result<Dimension, UnitError> {
        Unit::of(&self.unit).map(|u| u.dimension)
    }
}

impl fmt::Display for Quantity {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self.unit.as_str() {
            "1" => write!(f, "{}", self.entered),
            "[lb_av]" => write!(f, "{} lb", self.entered),
            "[oz_av]" => write!(f, "{} oz", self.entered),
            "[gal_us]" => write!(f, "{} US gal", self.entered),
            unit => write!(f, "{} {unit}", self.entered),
        }
    }
}

/// A decimal number as typed: digits × 10^-places, at most 16 digits and 9 places.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Decimal {
    digits: i64,
    places: u32,
}

impl Decimal {
    /// Reads digits with at most one point, both sides filled; a leading minus is allowed; no exponent, no blanks.
    ///
    /// # Errors
    /// [`UnitError::NotDecimal`].
    pub fn parse(text: &str) -> Result<Self, UnitError> {
        let not_decimal = || UnitError::NotDecimal(text.chars().take(40).collect());
        let (sign, unsigned) = text.strip_prefix('-').map_or((1, text), |rest| (-1, rest));
        let (whole, fraction) = match unsigned.split_once('.') {
            Some((_, "")) => return Err(not_decimal()),
            Some(parts) => parts,
            None => (unsigned, ""),
        };
        let all_digits = |s: &str| s.bytes().all(|b| b.is_ascii_digit());
        if whole.is_empty() || !all_digits(whole) || !all_digits(fraction) {
            return Err(not_decimal());
        }
        if whole.len() + fraction.len() > 16 || fraction.len() > 9 {
            return Err(not_decimal());
        }
        let digits: i64 = format!("{whole}{fraction}").parse().map_err(|_| not_decimal())?;
        let places = u32::try_from(fraction.len()).map_err(|_| not_decimal())?;
        Ok(Self { digits: sign * digits, places })
    }

    /// Whether it is below zero.
    pub const fn is_negative(self) -> bool {
        self.digits < 0
    }

    /// value × numerator / denominator, half to even; `None` on overflow of `i64`.
    pub fn scaled_by(self, numerator: i64, denominator: i64) -> Option<i64> {
        let above = i128::from(self.digits).checked_mul(i128::from(numerator))?;
        let below = i128::from(denominator) * 10_i128.pow(self.places);
        i64::try_from(div_half_even(above, below)).ok()
    }

    /// The nearest double, for formulas.
    pub fn to_f64(self) -> f64 {
        #[expect(
            clippy::cast_precision_loss,
            reason = "at most 16 digits, of which a double keeps all but the last bit"
        )]
        let digits = self.digits as f64;
        digits / 10_f64.powi(self.places.cast_signed())
    }
}

fn scale(value: i64, numerator: i64, denominator: i64) -> i64 {
    i64::try_from(i128::from(value) * i128::from(numerator) / i128::from(denominator))
        .unwrap_or(i64::MAX)
}

/// above / below rounded half to even; `below` > 0.
pub fn div_half_even(above: i128, below: i128) -> i128 {
    let quotient = above.div_euclid(below);
    let twice = 2 * above.rem_euclid(below);
    match twice.cmp(&below) {
        std::cmp::Ordering::Less => quotient,
        std::cmp::Ordering::Greater => quotient + 1,
        std::cmp::Ordering::Equal => quotient + (quotient & 1),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn statutory_pounds_and_gallons_are_exact() {
        assert_eq!(Quantity::parse("8", "[lb_av]", Dimension::Mass).unwrap().base(), 3_628_738_960);
        assert_eq!(
            Quantity::parse("1000", "[gal_us]", Dimension::Volume).unwrap().base(),
            3_785_411_784
        );
        assert_eq!(Quantity::parse("1", "[oz_av]", Dimension::Mass).unwrap().base(), 28_349_523);
    }

    #[test]
    fn rounding_is_half_to_even() {
        assert_eq!(Quantity::parse("0.0000005", "g", Dimension::Mass).unwrap().base(), 0);
        assert_eq!(Quantity::parse("0.0000015", "g", Dimension::Mass).unwrap().base(), 2);
        assert_eq!(Quantity::parse("0.0000025", "g", Dimension::Mass).unwrap().base(), 2);
    }

    #[test]
    fn what_is_not_a_plain_decimal_is_refused() {
        for text in ["", "1e3", "1,5", ".5", "5.", " 5", "+5", "1_000", "٣", "NaN", "0x10", "1.2.3"]
        {
            assert!(Quantity::parse(text, "kg", Dimension::Mass).is_err(), "{text:?}");
        }
    }

    #[test]
    fn negative_absurd_and_foreign_units_are_refused_with_what_to_do() {
        let negative = Quantity::parse("-1", "g", Dimension::Mass).unwrap_err();
        assert_eq!(
            negative.to_string(),
            "-1 g is outside what one entry may carry: from 0 to 1000000000 g"
        );
        assert!(Quantity::parse("1001", "t", Dimension::Mass).is_err());
        assert!(Quantity::parse("1000", "t", Dimension::Mass).is_ok());
        let unknown = Quantity::parse("1", "lbs", Dimension::Mass).unwrap_err().to_string();
        assert!(unknown.contains("[lb_av]"), "{unknown}");
        let wrong = Quantity::parse("1", "L", Dimension::Mass).unwrap_err().to_string();
        assert_eq!(wrong, "L is a unit of volume, but a mass is asked for here");
    }

    #[test]
    fn a_computed_amount_is_what_it_says_up_to_the_largest() {
        for dimension in [Dimension::Mass, Dimension::Volume, Dimension::Count, Dimension::Fraction]
        {
            for base in [0, 1, 212_137_000, dimension.largest()] {
                assert!(
                    Quantity::computed(base, dimension).is_consistent(),
                    "{base} {dimension:?}"
                );
            }
        }
    }

    #[test]
    fn a_tampered_base_is_noticed() {
        let mut quantity = Quantity::parse("2.5", "kg", Dimension::Mass).unwrap();
        assert!(quantity.is_consistent());
        quantity.base += 1;
        assert!(!quantity.is_consistent());
    }
}
