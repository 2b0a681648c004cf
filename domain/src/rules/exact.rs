//! Limits as exact fractions: 8 lb per 1,000 US gallons is 958.611… mg/L and has no finite decimal.

use std::cmp::Ordering;

use serde::Deserialize;

use crate::units::{Decimal, Dimension, Unit};

/// Parts of a composition are counted per thousand million.
pub const PARTS: i128 = 1_000_000_000;

/// A limit as written in a rule set: so much of one unit per so much of another.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Written {
    amount: String,
    unit: String,
    per: String,
    per_unit: String,
}

/// A mass per volume (µg/µL, which is g/L) or a volume per volume, as an exact fraction in lowest terms.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq)]
#[serde(try_from = "Written")]
pub struct Ratio {
    above: i128,
    below: i128,
    measure: Dimension,
    text: String,
}

impl TryFrom<Written> for Ratio {
    type Error = String;

    fn try_from(written: Written) -> Result<Self, String> {
        let (amount, amount_below, measure) = exact(&written.amount, &written.unit)?;
        let (per, per_below, per_measure) = exact(&written.per, &written.per_unit)?;
        if per_measure != Dimension::Volume {
            return Err(format!("{:?} is not a unit of volume", written.per_unit));
        }
        if !matches!(measure, Dimension::Mass | Dimension::Volume) {
            return Err(format!("{:?} is neither a mass nor a volume", written.unit));
        }
        if amount <= 0 || per <= 0 {
            return Err("a limit is above zero".to_owned());
        }
        let text = format!(
            "{} {} per {} {}",
            written.amount,
            spoken(&written.unit),
            grouped(&written.per),
            spoken(&written.per_unit)
        );
        let too_fine = || format!("{text} is too fine or too large to compute with exactly");
        let above = amount.checked_mul(per_below).ok_or_else(too_fine)?;
        let below = amount_below.checked_mul(per).ok_or_else(too_fine)?;
        let common = greatest_common_divisor(above, below);
        let (above, below) = (above / common, below / common);
        if above > LARGEST_TERM || below > LARGEST_TERM {
            return Err(too_fine());
        }
        Ok(Self { above, below, measure, text })
    }
}

/// A decimal as an exact fraction in lowest terms, and as it was written: a strength, a density, a factor.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq)]
#[serde(try_from = "String")]
pub struct Exact {
    fraction: Fraction,
    text: String,
}

impl TryFrom<String> for Exact {
    type Error = String;

    fn try_from(text: String) -> Result<Self, String> {
        let (above, below) = fraction_of(&text)?;
        if above < 0 {
            return Err(format!("{text:?} is below zero"));
        }
        Ok(Self { fraction: Fraction::new(above, below), text })
    }
}

impl Exact {
    /// Reads a plain decimal.
    ///
    /// # Errors
    /// A sentence, if it is not one or is below zero.
    pub fn parse(text: &str) -> Result<Self, String> {
        Self::try_from(text.to_owned())
    }

    /// As written.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// The number.
    pub const fn fraction(&self) -> Fraction {
        self.fraction
    }

    /// How it compares with another.
    pub fn compare(&self, other: &Self) -> Ordering {
        // 16 digits over at most 10^9, crossed, stay inside 127 bits.
        self.fraction.compare(other.fraction).unwrap_or(Ordering::Greater)
    }
}

/// An exact fraction in lowest terms; `below` is above zero.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Fraction {
    above: i128,
    below: i128,
}

impl Fraction {
    fn new(above: i128, below: i128) -> Self {
        let common = greatest_common_divisor(above, below);
        Self { above: above / common, below: below / common }
    }

    /// A decimal in a unit, in base units.
    pub(super) fn in_unit(decimal: &str, code: &str) -> Result<(Self, Dimension), String> {
        let (above, below, dimension) = exact(decimal, code)?;
        Ok((Self::new(above, below), dimension))
    }

    /// The product; `None` if it is too fine or too large.
    pub fn times(self, other: Self) -> Option<Self> {
        let (left, right) =
            (Self::new(self.above, other.below), Self::new(other.above, self.below));
        let above = left.above.checked_mul(right.above)?;
        Some(Self { above, below: left.below.checked_mul(right.below)? })
    }

    /// The quotient; `None` by zero, or if it is too fine or too large.
    pub fn over(self, other: Self) -> Option<Self> {
        (other.above > 0)
            .then(|| self.times(Self { above: other.below, below: other.above }))
            .flatten()
    }

    /// How it compares with another, by cross-multiplication; `None` if that is too large.
    pub fn compare(self, other: Self) -> Option<Ordering> {
        let left = self.above.checked_mul(other.below)?;
        Some(left.cmp(&other.above.checked_mul(self.below)?))
    }

    /// `amount` times this, rounded up: where it counts towards a limit, nothing is dropped.
    pub(super) fn of_rounded_up(self, amount: i128) -> i128 {
        amount.saturating_mul(self.above).saturating_add(self.below - 1) / self.below
    }

    /// A whole number.
    pub(super) const fn whole(number: i128) -> Self {
        Self { above: number, below: 1 }
    }

    /// As a decimal with at most six digits after the point, cut off or rounded up.
    pub(super) fn shown(self, up: bool) -> String {
        let scaled = self.above.saturating_mul(1_000_000);
        let value = scaled / self.below + i128::from(up && scaled % self.below != 0);
        let text = format!("{}.{:06}", value / 1_000_000, value % 1_000_000);
        text.trim_end_matches('0').trim_end_matches('.').to_owned()
    }
}

/// A plain decimal as digits over a power of ten.
fn fraction_of(decimal: &str) -> Result<(i128, i128), String> {
    Decimal::parse(decimal).map_err(|error| error.to_string())?;
    let places = decimal.split_once('.').map_or(0, |(_, fraction)| fraction.len());
    let digits: i128 =
        decimal.replace('.', "").parse().map_err(|_| format!("{decimal:?} is not a number"))?;
    Ok((digits, (0..places).fold(1_i128, |power, _| power * 10)))
}

/// So that `term × parts × volume` (10^13 × 10^9 × 10^15) stays inside 127 bits.
const LARGEST_TERM: i128 = 10_000_000_000_000;

/// A decimal in a unit as a fraction of base units, unrounded. At most 15 digits × 10^12 over 10^9 × 1,000.
fn exact(decimal: &str, code: &str) -> Result<(i128, i128, Dimension), String> {
    let (digits, tens) = fraction_of(decimal)?;
    let unit = Unit::of(code).map_err(|error| error.to_string())?;
    let (above, below) = (digits * i128::from(unit.numerator), tens * i128::from(unit.denominator));
    let common = greatest_common_divisor(above, below);
    Ok((above / common, below / common, unit.dimension))
}

fn greatest_common_divisor(a: i128, b: i128) -> i128 {
    let (mut a, mut b) = (a.abs(), b.abs());
    while b != 0 {
        (a, b) = (b, a % b);
    }
    a.max(1)
}

impl Ratio {
    /// How `total` (base units × [`PARTS`]) in `volume_ul` of liquid compares with the limit, by
    /// cross-multiplication: nothing is divided, nothing rounded.
    pub fn compare(&self, total: i128, volume_ul: i64) -> Ordering {
        let allowed = self.above * PARTS * i128::from(volume_ul);
        // A product past 127 bits is past every limit that can be written.
        total.checked_mul(self.below).map_or(Ordering::Greater, |used| used.cmp(&allowed))
    }

    /// The most that `volume_ul` may hold (base units × [`PARTS`]), rounded down.
    pub fn most(&self, volume_ul: i64) -> i128 {
        self.above * PARTS * i128::from(volume_ul) / self.below
    }

    /// The number itself, in µg/µL (g/L) or µL/µL.
    pub fn fraction(&self) -> Fraction {
        Fraction::new(self.above, self.below)
    }

    /// Whether it limits a mass or a volume.
    pub const fn measure(&self) -> Dimension {
        self.measure
    }

    /// As the law prints it: `8 lb per 1,000 US gal`.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// In mg/L (or mL/L), cut off after three digits.
    pub fn per_thousand(&self) -> String {
        thousandths(self.above * 1_000_000 / self.below)
    }
}

/// The concentration of `total` (base units × [`PARTS`]) in mg/L (or mL/L) with three digits: rounded up where it is
/// over a limit and down where it is not, so that what is shown never contradicts what was decided.
pub fn concentration(total: i128, volume_ul: i64, over: bool) -> Option<String> {
    let per = i128::from(volume_ul) * (PARTS / 1_000_000);
    if per <= 0 {
        return None;
    }
    let quotient = total / per;
    let up = over && total % per != 0;
    Some(thousandths(quotient + i128::from(up)))
}

fn thousandths(value: i128) -> String {
    format!("{}.{:03}", value / 1_000, value % 1_000)
}

pub(super) fn spoken(code: &str) -> &str {
    match code {
        "[lb_av]" => "lb",
        "[oz_av]" => "oz",
        "[gal_us]" => "US gal",
        other => other,
    }
}

/// A whole number with commas between the thousands; anything else as it is.
pub fn grouped(number: &str) -> String {
    let (whole, rest) = number.find('.').map_or((number, ""), |point| number.split_at(point));
    let mut text = String::new();
    for (index, digit) in whole.chars().enumerate() {
        if index > 0 && (whole.len() - index).is_multiple_of(3) {
            text.push(',');
        }
        text.push(digit);
    }
    text + rest
}

#[cfg(test)]
mod tests {
    use super::*;

    fn ratio(amount: &str, unit: &str, per: &str, per_unit: &str) -> Result<Ratio, String> {
        Ratio::try_from(Written {
            amount: amount.to_owned(),
            unit: unit.to_owned(),
            per: per.to_owned(),
            per_unit: per_unit.to_owned(),
        })
    }

    /// Source: 27 CFR 24.246 limits with the exact pound and gallon; the decimals are the conversions that stand
    /// beside the printed metric figures.
    #[test]
    fn statutory_limits_convert_to_the_published_figures() {
        for (amount, per, shown) in [
            ("8", "1000", "958.611"),
            ("0.005", "1000", "0.599"),
            ("3", "1000", "359.479"),
            ("2", "1000", "239.652"),
            ("0.1", "25000", "0.479"),
        ] {
            let limit = ratio(amount, "[lb_av]", per, "[gal_us]").unwrap();
            assert_eq!(limit.per_thousand(), shown, "{amount} lb per {per} gal");
        }
    }

    #[test]
    fn the_limit_itself_is_not_over_and_one_part_more_is() {
        let limit = ratio("0.005", "[lb_av]", "1000", "[gal_us]").unwrap();
        let volume = 3_785_411_784;
        let exactly = 453_592_370 * 5 * (PARTS / 1_000);
        assert_eq!(limit.compare(exactly, volume), Ordering::Equal);
        assert_eq!(limit.compare(exactly + 1, volume), Ordering::Greater);
        assert_eq!(limit.compare(exactly - 1, volume), Ordering::Less);
        assert_eq!(limit.most(volume), exactly);
    }

    #[test]
    fn the_largest_amounts_do_not_overflow() {
        let limit = ratio("0.1", "[lb_av]", "25000", "[gal_us]").unwrap();
        let most = Dimension::Mass.largest();
        assert_eq!(limit.compare(i128::MAX, most), Ordering::Greater);
        assert_eq!(limit.compare(0, most), Ordering::Less);
        assert!(limit.most(most) > 0);
    }

    #[test]
    fn a_limit_that_is_no_limit_is_refused() {
        assert!(ratio("0", "g", "1", "L").unwrap_err().contains("above zero"));
        assert!(ratio("1", "g", "1", "kg").unwrap_err().contains("not a unit of volume"));
        assert!(ratio("1", "1", "1", "L").unwrap_err().contains("neither a mass nor a volume"));
        assert!(ratio("1e3", "g", "1", "L").is_err());
    }

    #[test]
    fn what_is_shown_never_contradicts_what_was_decided() {
        assert_eq!(concentration(1_000_000, 3, true).unwrap(), "0.334");
        assert_eq!(concentration(1_000_000, 3, false).unwrap(), "0.333");
        assert_eq!(concentration(1_000_000, 0, true), None);
        assert_eq!(grouped("1000"), "1,000");
        assert_eq!(grouped("25000.5"), "25,000.5");
        assert_eq!(grouped("121"), "121");
    }
}
