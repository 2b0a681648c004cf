//! A measured content held against a bound: what `residual_limit` and `contaminant_limit` share.

use std::cmp::Ordering;

use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::{Basis, Finding, Verdict};

use super::Source;
use super::content::Content;
use super::product::{Fit, Product, Scope};

/// On which side of the limit it must lie; the limit itself is allowed.
#[derive(Clone, Copy, Debug, Default, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Bound {
    /// Not above.
    #[default]
    AtMost,
    /// Not below.
    AtLeast,
}

/// What came out.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Outcome {
    /// It keeps the limit.
    Kept,
    /// It does not.
    Broken,
    /// That cannot be said before something is measured.
    Measure,
}

/// What came out, and the finding that says so.
#[derive(Clone, Debug, PartialEq)]
pub struct Held {
    /// What came out.
    pub outcome: Outcome,
    /// With the numbers.
    pub finding: Finding,
}

/// A bound as a rule gives it.
pub(super) struct Bounded<'a> {
    pub(super) id: &'a str,
    pub(super) name: &'a str,
    pub(super) substance: &'a str,
    pub(super) bound: Bound,
    pub(super) limit: &'a Content,
    pub(super) scope: &'a Scope,
    pub(super) breach: Verdict,
    pub(super) note: Option<&'a str>,
    pub(super) source: &'a Source,
}

/// What a breach means where a rule does not say: law is law, everything else is advice.
pub(super) fn breach(said: Option<Verdict>, source: &Source) -> Verdict {
    let by_basis = if source.basis == Basis::Law { Verdict::Refuse } else { Verdict::Advise };
    said.unwrap_or(by_basis)
}

impl Bounded<'_> {
    /// `None` where the rule is not about the product.
    pub(super) fn held(&self, product: &Product, mark: &Mark<'_>) -> Option<Held> {
        match self.scope.fit(product) {
            Fit::No => return None,
            Fit::Unknown(what) => return Some(self.unknown(what, mark)),
            Fit::Yes => {}
        }
        let Some(found) = product.analyses.get(self.substance) else {
            let remedy = format!("Have it measured: {}.", self.name.to_lowercase());
            return Some(self.measure("nobody has measured it yet", &remedy, mark));
        };
        let order = match found.compare(self.limit, &product.liquid) {
            Ok(order) => order,
            Err(missing) => {
                let why = format!("{} cannot be held against it yet", found.text());
                return Some(self.measure(&why, missing.remedy(), mark));
            }
        };
        Some(self.judged(order, found, product, mark))
    }

    fn judged(&self, order: Ordering, found: &Content, product: &Product, mark: &Mark<'_>) -> Held {
        let broken = match self.bound {
            Bound::AtMost => order == Ordering::Greater,
            Bound::AtLeast => order == Ordering::Less,
        };
        let (outcome, verdict, word) = if broken {
            (Outcome::Broken, self.breach, "is")
        } else {
            (Outcome::Kept, Verdict::Clear, "is within the limit at")
        };
        let sentence = format!("{} {word} {}; {}.", self.name, found.text(), self.limits());
        let mut finding = self.finding(mark, verdict, &sentence);
        finding.value = Some(found.text().to_owned());
        finding.limit = Some(self.limit.text().to_owned());
        for (name, content) in [("found_mg_l", found), ("limit_mg_l", self.limit)] {
            if let Some(mg_l) = content.mg_l(&product.liquid) {
                finding = finding.param(name, mg_l);
            }
        }
        Held { outcome, finding }
    }

    fn unknown(&self, what: &str, mark: &Mark<'_>) -> Held {
        let why = format!("whether that is asked here turns on {what}, which is not known");
        self.measure(&why, &format!("Record {what}."), mark)
    }

    fn measure(&self, why: &str, remedy: &str, mark: &Mark<'_>) -> Held {
        let sentence = format!("{}: {}, and {why}.", self.name, self.limits());
        let finding = self.finding(mark, Verdict::Advise.min(self.breach), &sentence);
        Held { outcome: Outcome::Measure, finding: finding.cured_by(remedy) }
    }

    fn limits(&self) -> String {
        let side = match self.bound {
            Bound::AtMost => "at most",
            Bound::AtLeast => "at least",
        };
        format!("{side} {} is allowed ({})", self.limit.text(), self.source.shown())
    }

    fn finding(&self, mark: &Mark<'_>, verdict: Verdict, sentence: &str) -> Finding {
        let sentence = [Some(sentence), self.note].into_iter().flatten().collect::<Vec<_>>();
        mark.finding(self.id, self.source, verdict, sentence.join(" "))
    }
}
