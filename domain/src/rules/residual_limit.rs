//! What may be left in the product when it is released: copper, sulphur dioxide, acidity.

use serde::Deserialize;

use crate::checks::Verdict;
use crate::checks::case::Mark;

use super::Source;
use super::content::Content;
use super::held::{Bound, Bounded, Held, breach};
use super::product::{Product, Scope};
use super::rows::Rows;

/// A bound on what the product holds.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct ResidualLimit {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// What it is called in a sentence.
    pub name: String,
    /// What was measured, as named in analyses.
    pub substance: String,
    /// On which side it must lie.
    #[serde(default)]
    pub bound: Bound,
    /// The bound, exact.
    pub limit: Content,
    /// Which products, of those that the set binds.
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

impl ResidualLimit {
    /// `None` where the rule is not about the product.
    pub(crate) fn judge(&self, product: &Product, mark: &Mark<'_>) -> Option<Held> {
        let bounded = Bounded {
            id: &self.id,
            name: &self.name,
            substance: &self.substance,
            bound: self.bound,
            limit: &self.limit,
            scope: &self.when,
            breach: breach(self.breach, &self.source),
            note: self.note.as_deref(),
            source: &self.source,
        };
        bounded.held(product, mark)
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::rules::content::Of;
    use crate::rules::exact::Exact;
    use crate::rules::held::Outcome;
    use crate::rules::product::Colour;

    /// Made up for the test.
    const ACID: &str = r#"
        id = "fixed-acid"
        name = "Fixed acid"
        substance = "fixed_acid"
        bound = "at_least"
        limit = { amount = "5", unit = "g", per_unit = "L" }
        when = { colours = ["white"] }
        source = { citation = "made up", status = "READ", basis = "law" }
    "#;

    fn judged(colour: Option<Colour>, grams: Option<&str>) -> Option<(Outcome, Verdict)> {
        let rule: ResidualLimit = toml::from_str(ACID).unwrap();
        let found = |grams| Content::new([grams, "g", "1", "L"], Of::Product).unwrap();
        let analyses = grams.map(|grams| ("fixed_acid".to_owned(), found(grams)));
        let product =
            Product { colour, analyses: analyses.into_iter().collect(), ..Product::default() };
        let held = rule.judge(&product, &Mark::House("test"))?;
        Some((held.outcome, held.finding.verdict))
    }

    #[test]
    fn the_limit_itself_is_allowed_and_less_than_a_floor_is_not() {
        let white = Some(Colour::White);
        assert_eq!(judged(white, Some("5")), Some((Outcome::Kept, Verdict::Clear)));
        assert_eq!(judged(white, Some("4.999")), Some((Outcome::Broken, Verdict::Refuse)));
        assert_eq!(judged(white, None), Some((Outcome::Measure, Verdict::Advise)));
        assert_eq!(judged(None, Some("4")), Some((Outcome::Measure, Verdict::Advise)));
        assert_eq!(judged(Some(Colour::Red), Some("4")), None);
    }

    #[test]
    fn a_finding_carries_both_numbers_and_its_source() {
        let rule: ResidualLimit = toml::from_str(&ACID.replace("at_least", "at_most")).unwrap();
        let product = Product {
            colour: Some(Colour::White),
            liquid: crate::rules::content::Liquid {
                density_kg_l: Some(Exact::parse("1.25").unwrap()),
                strength: None,
            },
            analyses: [(
                "fixed_acid".to_owned(),
                Content::new(["4.1", "g", "1", "kg"], Of::Product).unwrap(),
            )]
            .into(),
            ..Product::default()
        };
        let held = rule.judge(&product, &Mark::House("test")).unwrap();
        assert_eq!(held.outcome, Outcome::Broken);
        assert_eq!(
            held.finding.sentence,
            "Fixed acid is 4.1 g/kg; at most 5 g/L is allowed (made up)."
        );
        assert_eq!(held.finding.params["found_mg_l"], "5125");
        assert_eq!(held.finding.params["limit_mg_l"], "5000");
    }
}
