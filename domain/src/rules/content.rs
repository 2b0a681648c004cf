//! How much of something is in a product, in whatever way a law or a laboratory writes it, and the exact way from one
//! to the other: mg/L of product, µg/kg of product, g/hL of pure alcohol, a share of the volume, or a bare number (pH).
//!
//! With `s` the strength in % vol and `ρ` the density in kg/L (µg/µL = g/L; 1 kg/L = 1,000 g/L):
//!
//! ```text
//! mass per volume of product = mass per mass of product × ρ
//! mass per volume of product = mass per volume of pure alcohol × s / 100
//! ```
//!
//! Both are definitions. Every step is a fraction of integers; nothing is rounded before the comparison.

use std::cmp::Ordering;

use serde::Deserialize;

use crate::units::Dimension;

use super::exact::{Exact, Fraction, Ratio, grouped, spoken};

/// Of what the denominator is.
#[derive(Clone, Copy, Debug, Default, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Of {
    /// The product as it is.
    #[default]
    Product,
    /// The pure alcohol in it.
    PureAlcohol,
}

/// As written in a rule set; without a unit it is a bare number, such as a pH.
#[derive(Debug, Deserialize)]
#[serde(deny_unknown_fields)]
struct Written {
    amount: String,
    #[serde(default)]
    unit: Option<String>,
    #[serde(default = "one")]
    per: String,
    #[serde(default)]
    per_unit: Option<String>,
    #[serde(default)]
    of: Of,
}

fn one() -> String {
    "1".to_owned()
}

/// What kind of figure it is.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
enum Kind {
    /// µg/µL of product.
    PerVolume,
    /// µg/µL of pure alcohol.
    PerAlcohol,
    /// µg/µg of product.
    PerMass,
    /// µL/µL of product.
    VolumeShare,
    /// A number without a unit.
    Bare,
}

/// A content: exact, and as it was written.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq)]
#[serde(try_from = "Written")]
pub struct Content {
    value: Fraction,
    kind: Kind,
    text: String,
}

impl TryFrom<Written> for Content {
    type Error = String;

    fn try_from(written: Written) -> Result<Self, String> {
        let (unit, per_unit) = match (&written.unit, &written.per_unit) {
            (Some(unit), Some(per_unit)) => (unit, per_unit),
            (None, None) => return Self::bare(&written.amount),
            _ => return Err("give both unit and per_unit, or neither".to_owned()),
        };
        Self::new([&written.amount, unit, &written.per, per_unit], written.of)
    }
}

impl Content {
    /// So much of one unit per so much of another: `["1000", "g", "1", "hL"]` of pure alcohol.
    ///
    /// # Errors
    /// A sentence, if a unit is unknown or the two cannot stand together.
    pub fn new([amount, unit, per, per_unit]: [&str; 4], of: Of) -> Result<Self, String> {
        let (above, measure) = Fraction::in_unit(amount, unit)?;
        let (below, per_measure) = Fraction::in_unit(per, per_unit)?;
        let kind = match (measure, per_measure, of) {
            (Dimension::Mass, Dimension::Volume, Of::Product) => Kind::PerVolume,
            (Dimension::Mass, Dimension::Volume, Of::PureAlcohol) => Kind::PerAlcohol,
            (Dimension::Mass, Dimension::Mass, Of::Product) => Kind::PerMass,
            (Dimension::Volume, Dimension::Volume, Of::Product) => Kind::VolumeShare,
            _ => return Err(format!("{unit} per {per_unit} is no content that can be judged")),
        };
        let value = above.over(below).ok_or_else(|| format!("{amount} per {per} is no number"))?;
        let of = if of == Of::PureAlcohol { " of pure alcohol" } else { "" };
        let slash = if per == "1" { "/".to_owned() } else { format!(" per {} ", grouped(per)) };
        let text = format!("{amount} {}{slash}{}{of}", spoken(unit), spoken(per_unit));
        Ok(Self { value, kind, text })
    }

    /// A number without a unit.
    ///
    /// # Errors
    /// A sentence, if it is not a plain decimal.
    pub fn bare(amount: &str) -> Result<Self, String> {
        let value = Exact::parse(amount)?.fraction();
        Ok(Self { value, kind: Kind::Bare, text: amount.to_owned() })
    }

    /// As it was written.
    pub fn text(&self) -> &str {
        &self.text
    }

    /// Whether it is the same number of the same kind, however written.
    pub fn is_same(&self, other: &Self) -> bool {
        self.kind == other.kind && self.value == other.value
    }

    /// How this content of the product compares with a limit.
    ///
    /// # Errors
    /// [`Missing`]: what must be known first.
    pub fn compare(&self, limit: &Self, liquid: &Liquid) -> Result<Ordering, Missing> {
        let (found, limit) = if self.kind == limit.kind {
            (self.value, limit.value)
        } else {
            (self.per_volume(liquid)?, limit.per_volume(liquid)?)
        };
        found.compare(limit).ok_or(Missing::TooFine)
    }

    /// As mass per volume of product.
    fn per_volume(&self, liquid: &Liquid) -> Result<Fraction, Missing> {
        let thousand = Fraction::whole(1_000);
        let by = match self.kind {
            Kind::PerVolume => return Ok(self.value),
            Kind::PerMass => {
                let density = liquid.density_kg_l.as_ref().ok_or(Missing::Density)?;
                density.fraction().times(thousand)
            }
            Kind::PerAlcohol => {
                let strength = liquid.strength.as_ref().ok_or(Missing::Strength)?;
                strength.fraction().over(Fraction::whole(100))
            }
            Kind::VolumeShare | Kind::Bare => return Err(Missing::OtherKind),
        };
        // A strength of nil leaves no alcohol to hold anything.
        by.and_then(|by| self.value.times(by)).ok_or(Missing::TooFine)
    }

    /// In mg per litre of product with six digits; `None` where it cannot be brought to that.
    pub fn mg_l(&self, liquid: &Liquid) -> Option<String> {
        let grams = self.per_volume(liquid).ok()?;
        Some(grams.times(Fraction::whole(1_000))?.shown(false))
    }
}

impl From<&Ratio> for Content {
    /// A dose limit as a content of the liquid.
    fn from(limit: &Ratio) -> Self {
        let kind = match limit.measure() {
            Dimension::Volume => Kind::VolumeShare,
            _ => Kind::PerVolume,
        };
        Self { value: limit.fraction(), kind, text: limit.text().to_owned() }
    }
}

/// What the way from one kind of content to another goes through.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Liquid {
    /// Strength, % vol.
    pub strength: Option<Exact>,
    /// Density, kg/L at the temperature of the analysis.
    pub density_kg_l: Option<Exact>,
}

/// Why two contents could not be compared.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Missing {
    /// The strength is not known.
    Strength,
    /// The density is not known.
    Density,
    /// One is a share of the volume or a bare number, the other is not.
    OtherKind,
    /// The numbers have too many digits to compare exactly.
    TooFine,
}

impl Missing {
    /// What to do about it.
    pub const fn remedy(self) -> &'static str {
        match self {
            Self::Strength => "Measure the strength first.",
            Self::Density => "Measure the density first.",
            Self::OtherKind => "Have it measured in the unit of the limit.",
            Self::TooFine => "Enter the result with fewer digits.",
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn content(parts: [&str; 4], of: Of) -> Content {
        Content::new(parts, of).unwrap()
    }

    fn liquid(strength: &str, density: &str) -> Liquid {
        Liquid {
            strength: Some(Exact::parse(strength).unwrap()),
            density_kg_l: Some(Exact::parse(density).unwrap()),
        }
    }

    /// Source: Recommendation (EU) 2016/22 as tabled in J. Food Prot. 84(12) 2021, 2195-2212, table 1: the target of
    /// 1 mg/L stands there as 1,055 µg/kg at 40 % vol, so with a density of 1/1.055 kg/L.
    #[test]
    fn a_litre_and_a_kilogram_differ_by_the_density() {
        let target = content(["1", "mg", "1", "L"], Of::Product);
        let found = |micrograms: &str| content([micrograms, "ug", "1", "kg"], Of::Product);
        let spirit = liquid("40", "0.948");
        assert_eq!(found("1054").compare(&target, &spirit), Ok(Ordering::Less));
        assert_eq!(found("1055").compare(&target, &spirit), Ok(Ordering::Greater));
        let exactly = liquid("40", "0.8");
        assert_eq!(found("1250").compare(&target, &exactly), Ok(Ordering::Equal));
    }

    /// Source: Reg. (EU) 2019/787 Annex I cat. 9: 7 g/hL of pure alcohol is 28 mg/L at 40 % vol, as collected.
    #[test]
    fn a_limit_on_pure_alcohol_shrinks_with_the_strength() {
        let limit = content(["7", "g", "1", "hL"], Of::PureAlcohol);
        let spirit = liquid("40", "0.948");
        assert_eq!(limit.mg_l(&spirit).unwrap(), "28");
        let found = |milligrams: &str| content([milligrams, "mg", "1", "L"], Of::Product);
        assert_eq!(found("28").compare(&limit, &spirit), Ok(Ordering::Equal));
        assert_eq!(found("28.000001").compare(&limit, &spirit), Ok(Ordering::Greater));
        assert_eq!(found("28").compare(&limit, &liquid("39.9", "1")), Ok(Ordering::Greater));
        assert_eq!(limit.text(), "7 g/hL of pure alcohol");
    }

    #[test]
    fn what_is_not_known_is_said() {
        let limit = content(["7", "g", "1", "hL"], Of::PureAlcohol);
        let found = content(["5", "mg", "1", "kg"], Of::Product);
        let no_density = Liquid { strength: Some(Exact::parse("40").unwrap()), density_kg_l: None };
        assert_eq!(found.compare(&limit, &no_density), Err(Missing::Density));
        let no_strength = Liquid { density_kg_l: Some(Exact::parse("1").unwrap()), strength: None };
        assert_eq!(found.compare(&limit, &no_strength), Err(Missing::Strength));
        let share = content(["0.35", "L", "100", "L"], Of::Product);
        assert_eq!(share.compare(&limit, &liquid("40", "1")), Err(Missing::OtherKind));
    }

    #[test]
    fn the_same_kind_needs_neither_strength_nor_density() {
        let grams = content(["1", "g", "1", "hL"], Of::Product);
        let milligrams = content(["10", "mg", "1", "L"], Of::Product);
        assert!(grams.is_same(&milligrams));
        assert!(!grams.is_same(&content(["1", "g", "1", "hL"], Of::PureAlcohol)));
        assert_eq!(milligrams.compare(&grams, &Liquid::default()), Ok(Ordering::Equal));
        let acid = Content::bare("2.4").unwrap();
        let floor = Content::bare("2.5").unwrap();
        assert_eq!(acid.compare(&floor, &Liquid::default()), Ok(Ordering::Less));
    }

    #[test]
    fn what_is_no_content_is_refused() {
        assert!(Content::new(["1", "g", "1", "1"], Of::Product).is_err());
        assert!(Content::new(["1", "g", "0", "L"], Of::Product).is_err());
        assert!(Content::new(["1", "L", "1", "L"], Of::PureAlcohol).is_err());
        assert!(Content::bare("-1").is_err());
    }
}
