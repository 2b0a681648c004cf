//! The nitrogen that a line brings, by the names of substances in compositions.
//!
//! `amino_nitrogen` and `ammonium_nitrogen` are the nitrogen itself, as a lot's analysis gives it; a salt named beside
//! them (`diammonium_phosphate`) counts besides. So a product that declares its salt does not declare the salt's
//! nitrogen again.

use crate::units::Dimension;

use super::number::{fixed, real};
use super::situation::{Category, Line};

/// Nitrogen by mass in millionths, and whether it is ammonium.
///
/// Sources: diammonium phosphate 0.212137, ammonium sulfate 0.212012, urea 0.466465, and monoammonium phosphate
/// 14.007 / 115.025 = 0.121773, all derived from the atomic masses N 14.007, H 1.008, O 15.999, P 30.974, S 32.06.
const NITROGEN: [(&str, i128, bool); 6] = [
    ("amino_nitrogen", 1_000_000, false),
    ("ammonium_nitrogen", 1_000_000, true),
    ("diammonium_phosphate", 212_137, true),
    ("monoammonium_phosphate", 121_773, true),
    ("ammonium_sulfate", 212_012, true),
    ("urea", 466_465, false),
];

/// Figures of an analysis rather than materials: no positive list names them.
const MEASURES: [&str; 4] = ["amino_nitrogen", "ammonium_nitrogen", "phosphorus", "water"];

/// One microgram of nitrogen in the sums below: parts per thousand million of millionths.
pub(crate) const PER_MICROGRAM: i128 = 1_000_000_000_000_000;

/// The nitrogen of these lines as ammonium and otherwise, in mg per litre of that much liquid, to a tenth as the
/// account has it; `None` if that of one of them is not known.
pub fn nitrogen_mg_l(lines: &[Line], liquid_ul: i64) -> Option<[String; 2]> {
    let sum = |ammonium: bool| -> Option<i128> {
        lines.iter().map(|line| line.sum_of(|found| found == ammonium)).sum()
    };
    let per_litre = |sum: i128| {
        let mg_l = real(sum) / real(PER_MICROGRAM) / real(i128::from(liquid_ul)) * 1_000.0;
        fixed(mg_l, 1)
    };
    if liquid_ul <= 0 {
        return None;
    }
    Some([per_litre(sum(true)?), per_litre(sum(false)?)])
}

impl Line {
    /// The names a positive list is asked about: those the material is listed as and the nitrogen salts in it, or, if
    /// it is listed as nothing, the substances in it.
    pub(crate) fn names(&self) -> impl Iterator<Item = String> {
        let salt = |name: &str| NITROGEN.iter().any(|(known, ..)| *known == name);
        let stated = self.composition.iter().filter(|(_, parts)| **parts > 0);
        let materials = stated
            .map(|(name, _)| plain(name))
            .filter(|name| !MEASURES.contains(&name.as_str()))
            .filter(|name| self.listed_as.is_empty() || salt(name));
        let mut names: Vec<String> = self.listed_as.iter().map(|name| plain(name)).collect();
        names.extend(materials);
        names.sort();
        names.dedup();
        names.into_iter()
    }

    /// Its nitrogen in micrograms × [`PER_MICROGRAM`]; `None` if it is not known: a nutrient without a stated content,
    /// or one that was not weighed.
    pub(crate) fn nitrogen(&self) -> Option<i128> {
        self.sum_of(|_| true)
    }

    /// Whether it carries ammonium.
    pub(crate) fn has_ammonium(&self) -> bool {
        self.sum_of(|ammonium| ammonium).is_some_and(|sum| sum > 0)
            || NITROGEN.iter().any(|(name, _, ammonium)| {
                *ammonium && self.composition.get(*name).is_some_and(|parts| *parts > 0)
            })
    }

    fn sum_of(&self, wanted: impl Fn(bool) -> bool) -> Option<i128> {
        let mut stated = false;
        let mut parts = 0;
        for (name, millionths, ammonium) in NITROGEN {
            if let Some(content) = self.composition.get(name) {
                stated = true;
                if wanted(ammonium) {
                    parts += i128::from(*content) * millionths;
                }
            }
        }
        if !stated {
            return (self.category != Category::Nutrient).then_some(0);
        }
        match self.amount.dimension() {
            Ok(Dimension::Mass) => Some(i128::from(self.amount.base()) * parts),
            _ if parts == 0 => Some(0),
            _ => None,
        }
    }
}

/// `Thiamine hydrochloride` and `thiamine-hydrochloride` as `thiamine_hydrochloride`.
fn plain(name: &str) -> String {
    name.trim().to_lowercase().replace([' ', '-'], "_")
}
