//! What a market lets a product hold of what nobody put in: ethyl carbamate, methanol, hydrocyanic acid, lead.
//!
//! A level that is law closes the market; a target, recommended or agreed, is advice.

use serde::Deserialize;

use crate::checks::Verdict;
use crate::checks::case::Mark;

use super::Source;
use super::content::Content;
use super::held::{Bound, Bounded, Held, Outcome, breach};
use super::product::{Product, Scope};
use super::rows::Rows;

/// A market's level.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct ContaminantLimit {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// The markets: `CA`, `CA-ON` for a part of one, `EU` for all its members.
    pub markets: Vec<String>,
    /// What it is called in a sentence.
    pub name: String,
    /// What was measured, as named in analyses.
    pub substance: String,
    /// The level, exact.
    pub limit: Content,
    /// Which products.
    #[serde(default)]
    pub when: Scope,
    /// What a breach means; otherwise as the basis says.
    #[serde(default)]
    pub breach: Option<Verdict>,
    /// What else the person should know.
    #[serde(default)]
    pub note: Option<String>,
    /// Where it comes from.
    pub source: Source,
}

impl ContaminantLimit {
    /// `None` where the rule is not about the market or not about the product.
    pub(crate) fn judge(&self, market: &str, product: &Product, mark: &Mark<'_>) -> Option<Held> {
        if !self.markets.iter().any(|here| covers(here, market)) {
            return None;
        }
        // Elsewhere the product may still be sold: no more than a market is closed.
        let breach = breach(self.breach, &self.source).min(Verdict::Refer);
        let bounded = Bounded {
            id: &self.id,
            name: &self.name,
            substance: &self.substance,
            bound: Bound::AtMost,
            limit: &self.limit,
            scope: &self.when,
            breach,
            note: self.note.as_deref(),
            source: &self.source,
        };
        let mut held = bounded.held(product, mark)?;
        if held.outcome == Outcome::Broken && breach == Verdict::Refer {
            held.finding.sentence =
                format!("This closes the market {market}. {}", held.finding.sentence);
        }
        held.finding = held.finding.param("market", market);
        Some(held)
    }
}

/// The member states of the European Union (ISO 3166-1 codes; from memory, as of 2020-02-01).
const UNION: [&str; 27] = [
    "AT", "BE", "BG", "CY", "CZ", "DE", "DK", "EE", "ES", "FI", "FR", "GR", "HR", "HU", "IE", "IT",
    "LT", "LU", "LV", "MT", "NL", "PL", "PT", "RO", "SE", "SI", "SK",
];

/// Whether what holds in `here` holds in `market`: the same, a part of it, or a member of it.
pub(crate) fn covers(here: &str, market: &str) -> bool {
    let country = market.split_once('-').map_or(market, |(country, _)| country);
    here == market || here == country || (here == "EU" && UNION.contains(&country))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::rules::content::{Liquid, Of};
    use crate::rules::exact::Exact;

    /// Source of the level: Health Canada as tabled in J. Food Prot. 84(12) 2021, 2195-2212, table 1.
    const CANADA: &str = r#"
        id = "ec-ca-spirits"
        markets = ["CA"]
        name = "Ethyl carbamate"
        substance = "ethyl_carbamate"
        limit = { amount = "150", unit = "ug", per_unit = "kg" }
        when = { products = ["distilled_spirits"] }
        source = { citation = "List of Maximum Levels", status = "READ", basis = "law" }
    "#;

    fn spirit(micrograms_per_litre: &str, density: Option<&str>) -> Product {
        let found = Content::new([micrograms_per_litre, "ug", "1", "L"], Of::Product).unwrap();
        Product {
            names: vec!["distilled_spirits".to_owned()],
            liquid: Liquid {
                strength: None,
                density_kg_l: density.map(|text| Exact::parse(text).unwrap()),
            },
            analyses: [("ethyl_carbamate".to_owned(), found)].into(),
            ..Product::default()
        }
    }

    fn judged(rule: &str, market: &str, product: &Product) -> Option<(Outcome, Verdict, String)> {
        let rule: ContaminantLimit = toml::from_str(rule).unwrap();
        let held = rule.judge(market, product, &Mark::House("test"))?;
        Some((held.outcome, held.finding.verdict, held.finding.sentence))
    }

    /// 150 µg/kg at 0.94 kg/L is exactly 141 µg/L.
    #[test]
    fn a_law_closes_its_market_and_no_other() {
        let (outcome, verdict, _) = judged(CANADA, "CA", &spirit("141", Some("0.94"))).unwrap();
        assert_eq!((outcome, verdict), (Outcome::Kept, Verdict::Clear));
        let over = spirit("141.001", Some("0.94"));
        let (outcome, verdict, sentence) = judged(CANADA, "CA", &over).unwrap();
        assert_eq!((outcome, verdict), (Outcome::Broken, Verdict::Refer));
        assert!(sentence.starts_with("This closes the market CA. "), "{sentence}");
        assert_eq!(judged(CANADA, "US", &over), None);
    }

    #[test]
    fn without_the_density_it_is_a_matter_of_measuring() {
        let (outcome, verdict, _) = judged(CANADA, "CA", &spirit("1000", None)).unwrap();
        assert_eq!((outcome, verdict), (Outcome::Measure, Verdict::Advise));
    }

    #[test]
    fn a_target_is_advice() {
        let target = CANADA.replace("basis = \"law\"", "basis = \"voluntary\"");
        let (outcome, verdict, sentence) =
            judged(&target, "CA", &spirit("150", Some("0.94"))).unwrap();
        assert_eq!((outcome, verdict), (Outcome::Broken, Verdict::Advise));
        assert!(!sentence.contains("closes"), "{sentence}");
    }

    #[test]
    fn a_part_of_a_market_obeys_the_whole_and_not_the_other_way_round() {
        assert!(covers("CA", "CA-ON") && !covers("CA-ON", "CA") && !covers("CA-ON", "CA-QC"));
        assert!(covers("EU", "FR") && covers("EU", "EU") && !covers("EU", "CH"));
        assert!(!covers("FR", "EU"));
    }
}
