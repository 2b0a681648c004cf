//! What a name asks of what carries it: materials, strength at the still, age, container, strength and sweetness at
//! sale.
//!
//! A batch that breaks it may still be made: the claim is given up. What is not known yet is not held against it.

use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::situation::Category;
use crate::checks::{Finding, Verdict};

use super::Source;
use super::exact::Exact;
use super::positive_list::CategoryName;
use super::rows::Rows;

/// What a claim asks.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct CategoryClaim {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// The claim, as batches carry it.
    pub claim: String,
    /// What it is called in a sentence.
    pub name: String,
    /// Categories of material that must not go in before distillation.
    #[serde(default)]
    pub barred: Vec<CategoryName>,
    /// Each distillation runs off below this, % vol.
    #[serde(default)]
    pub still_below: Option<Exact>,
    /// Ways to age it, of which one is enough.
    #[serde(default)]
    pub ageing: Vec<Ageing>,
    /// Strength at sale, at least, % vol.
    #[serde(default)]
    pub sale_at_least: Option<Exact>,
    /// Sweetening at sale, at most, g/L as invert sugar.
    #[serde(default)]
    pub sweetening_at_most: Option<Exact>,
    /// What else the person should know.
    #[serde(default)]
    pub note: Option<String>,
    /// Where it comes from.
    pub source: Source,
}

/// A way to age.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Ageing {
    /// For at least so many whole months.
    pub months: u32,
    /// In wood that holds less than this, L.
    #[serde(default)]
    pub wood_below_l: Option<Exact>,
    /// In wood that holds at most this, L.
    #[serde(default)]
    pub wood_at_most_l: Option<Exact>,
}

/// What is known of a batch that carries claims.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Claimed {
    /// The claims it carries.
    pub claims: Vec<String>,
    /// What went in, or is to go in, before distillation: name and category.
    pub materials: Vec<(String, Category)>,
    /// The strength of each distillate as it ran off, % vol.
    pub stills: Vec<Exact>,
    /// How it was aged: whole months, and what the largest of the woods holds, L. `None` until it leaves the wood.
    pub aged: Option<(u32, Exact)>,
    /// Strength at sale, % vol.
    pub sale: Option<Exact>,
    /// Sweetening at sale, g/L.
    pub sweetening_g_l: Option<Exact>,
}

impl CategoryClaim {
    /// Why the rule could never be judged.
    pub(super) fn fault(&self) -> Option<&'static str> {
        let asks = !self.barred.is_empty()
            || !self.ageing.is_empty()
            || self.still_below.is_some()
            || self.sale_at_least.is_some()
            || self.sweetening_at_most.is_some();
        (!asks).then_some("a claim asks for something: as it stands it says nothing")
    }

    /// Everything that contradicts the claim; nothing if the batch does not carry it.
    pub(crate) fn judge(&self, batch: &Claimed, mark: &Mark<'_>) -> Vec<Finding> {
        if !batch.claims.contains(&self.claim) {
            return Vec::new();
        }
        let barred = batch
            .materials
            .iter()
            .filter(|(_, category)| self.barred.contains(&CategoryName(*category)))
            .map(|(name, _)| self.broken(mark, &format!("{name} must not go in")));
        let stills = batch.stills.iter().filter_map(|strength| self.too_strong(strength, mark));
        let rest = [self.too_young(batch, mark), self.weak(batch, mark), self.sweet(batch, mark)];
        barred.chain(stills).chain(rest.into_iter().flatten()).collect()
    }

    fn too_strong(&self, strength: &Exact, mark: &Mark<'_>) -> Option<Finding> {
        let limit = self.still_below.as_ref()?;
        if strength.compare(limit).is_lt() {
            return None;
        }
        let (found, limit) = (strength.text(), limit.text());
        let reason = format!("it ran off at {found} % vol and must stay below {limit} % vol");
        Some(self.measured(mark, &reason, [found, limit, "% vol"]))
    }

    fn too_young(&self, batch: &Claimed, mark: &Mark<'_>) -> Option<Finding> {
        let (months, wood) = batch.aged.as_ref()?;
        if self.ageing.is_empty() || self.ageing.iter().any(|way| way.met(*months, wood)) {
            return None;
        }
        let ways: Vec<String> = self.ageing.iter().map(Ageing::spoken).collect();
        let reason = format!(
            "it lay for {months} months in wood of {} L, and {} is asked",
            wood.text(),
            ways.join(", or ")
        );
        Some(self.broken(mark, &reason))
    }

    fn weak(&self, batch: &Claimed, mark: &Mark<'_>) -> Option<Finding> {
        let (limit, found) = (self.sale_at_least.as_ref()?, batch.sale.as_ref()?);
        if found.compare(limit).is_ge() {
            return None;
        }
        let (found, limit) = (found.text(), limit.text());
        let reason = format!("it has {found} % vol and needs at least {limit} % vol");
        Some(self.measured(mark, &reason, [found, limit, "% vol"]))
    }

    fn sweet(&self, batch: &Claimed, mark: &Mark<'_>) -> Option<Finding> {
        let (limit, found) = (self.sweetening_at_most.as_ref()?, batch.sweetening_g_l.as_ref()?);
        if found.compare(limit).is_le() {
            return None;
        }
        let (found, limit) = (found.text(), limit.text());
        let reason = format!("it is sweetened by {found} g/L, and at most {limit} g/L is allowed");
        Some(self.measured(mark, &reason, [found, limit, "g/L"]))
    }

    fn measured(&self, mark: &Mark<'_>, reason: &str, numbers: [&str; 3]) -> Finding {
        let [found, limit, unit] = numbers;
        self.broken(mark, reason).measured(found.to_owned(), limit.to_owned(), unit)
    }

    fn broken(&self, mark: &Mark<'_>, reason: &str) -> Finding {
        let sentence = format!(
            "This contradicts the claim {}: {reason} ({}).",
            self.name,
            self.source.shown()
        );
        let parts = [Some(sentence.as_str()), self.note.as_deref()];
        let sentence = parts.into_iter().flatten().collect::<Vec<_>>().join(" ");
        mark.finding(&self.id, &self.source, Verdict::Refuse, sentence)
            .param("claim", &self.claim)
            .cured_by(format!("Leave it, or give up the claim {}.", self.name))
    }
}

impl Ageing {
    fn met(&self, months: u32, wood: &Exact) -> bool {
        months >= self.months
            && self.wood_below_l.as_ref().is_none_or(|bound| wood.compare(bound).is_lt())
            && self.wood_at_most_l.as_ref().is_none_or(|bound| wood.compare(bound).is_le())
    }

    fn spoken(&self) -> String {
        let months = self.months;
        match (&self.wood_below_l, &self.wood_at_most_l) {
            (Some(bound), _) => format!("{months} months in wood under {} L", bound.text()),
            (None, Some(bound)) => format!("{months} months in wood of at most {} L", bound.text()),
            (None, None) => format!("{months} months in wood"),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The numbers are those of Reg. (EU) 2019/787 Annex I: 86 % vol and 37.5 % vol of category 9, the ways to age of
    /// 5.
    const CLAIM: &str = r#"
        id = "fruit-spirit"
        claim = "fruit_spirit"
        name = "fruit spirit"
        barred = ["sugar"]
        still_below = "86"
        sale_at_least = "37.5"
        sweetening_at_most = "18"
        ageing = [{ months = 6, wood_below_l = "1000" }, { months = 12 }]
        source = { citation = "made up", status = "READ", basis = "law" }
    "#;

    fn exact(text: &str) -> Exact {
        Exact::parse(text).unwrap()
    }

    fn sentences(change: impl FnOnce(&mut Claimed)) -> Vec<String> {
        let rule: CategoryClaim = toml::from_str(CLAIM).unwrap();
        let mut batch = Claimed { claims: vec!["fruit_spirit".to_owned()], ..Claimed::default() };
        change(&mut batch);
        let findings = rule.judge(&batch, &Mark::House("test"));
        assert!(findings.iter().all(|finding| finding.verdict == Verdict::Refuse));
        findings.into_iter().map(|finding| finding.sentence).collect()
    }

    #[test]
    fn sugar_closes_the_claim_of_a_fruit_spirit_and_yeast_does_not() {
        let sugar = ("Beet sugar".to_owned(), Category::Sugar);
        let found = sentences(|batch| {
            batch.materials = vec![sugar.clone(), ("Yeast".to_owned(), Category::Yeast)];
        });
        assert_eq!(
            found,
            ["This contradicts the claim fruit spirit: Beet sugar must not go in (made up)."]
        );
        let given_up = sentences(|batch| {
            batch.claims.clear();
            batch.materials = vec![sugar];
        });
        assert!(given_up.is_empty());
    }

    #[test]
    fn the_strength_at_the_still_is_a_bound_that_is_not_reached() {
        let found = sentences(|batch| batch.stills = vec![exact("85.9"), exact("86"), exact("90")]);
        assert_eq!(found.len(), 2);
        assert!(found[0].contains("86 % vol and must stay below 86 % vol"), "{}", found[0]);
    }

    #[test]
    fn one_way_of_ageing_is_enough() {
        let aged = |months, wood: &str| {
            let wood = exact(wood);
            sentences(|batch| batch.aged = Some((months, wood))).len()
        };
        assert_eq!(
            [aged(6, "999"), aged(6, "1000"), aged(12, "5000"), aged(5, "100")],
            [0, 1, 0, 1]
        );
    }

    #[test]
    fn at_sale_the_bounds_themselves_are_allowed() {
        let sold = |strength: &str, sugar: &str| {
            let (strength, sugar) = (exact(strength), exact(sugar));
            sentences(|batch| {
                batch.sale = Some(strength);
                batch.sweetening_g_l = Some(sugar);
            })
            .len()
        };
        assert_eq!([sold("37.5", "18"), sold("37.49", "18"), sold("37.4", "18.1")], [0, 1, 2]);
    }

    #[test]
    fn what_is_not_known_yet_contradicts_nothing() {
        assert!(sentences(|_| {}).is_empty());
    }
}
