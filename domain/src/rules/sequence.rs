//! What must have been done before something else: filtered after urease and before packaging, pitched before ammonium.
//!
//! A yeast that starves is fed first: a rule may be waived while the supply is below the floor.

use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::{Finding, Verdict};
use crate::stamp::Micros;

use super::Source;
use super::rows::Rows;

/// An order of steps.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Sequence {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Only once this has been done; otherwise always.
    #[serde(default)]
    pub once: Option<String>,
    /// This comes first …
    pub first: String,
    /// … and then this.
    pub then: String,
    /// It does not hold while the supply of nitrogen is below the floor.
    #[serde(default)]
    pub waived_below_floor: bool,
    /// What a breach means.
    pub verdict: Verdict,
    /// What to do instead.
    pub remedy: String,
    /// Where it comes from.
    pub source: Source,
}

/// A step that was done.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Step {
    /// Its name, as rule sets write it.
    pub name: String,
    /// When.
    pub at: Micros,
}

/// What is about to be done, in the light of what was.
#[derive(Clone, Copy, Debug)]
pub struct Course<'a> {
    /// What was done, in any order.
    pub done: &'a [Step],
    /// What is to be done next.
    pub next: &'a Step,
    /// Whether the supply of nitrogen is below the floor.
    pub below_floor: bool,
}

impl Course<'_> {
    /// When that was last done before the next step.
    fn last(&self, name: &str) -> Option<Micros> {
        let before = |step: &&Step| step.name == name && step.at <= self.next.at;
        self.done.iter().filter(before).map(|step| step.at).max()
    }
}

impl Sequence {
    /// The finding if the next step comes too early.
    pub(crate) fn judge(&self, course: &Course<'_>, mark: &Mark<'_>) -> Option<Finding> {
        if course.next.name != self.then || (self.waived_below_floor && course.below_floor) {
            return None;
        }
        let since = match &self.once {
            Some(once) => course.last(once)?,
            None => Micros(i64::MIN),
        };
        if course.last(&self.first).is_some_and(|at| since <= at) {
            return None;
        }
        let (first, then) = (plain(&self.first), plain(&self.then));
        let once =
            self.once.as_deref().map_or(String::new(), |once| format!("After {}: ", plain(once)));
        let sentence = format!("{once}{first} comes before {then} ({}).", self.source.shown());
        Some(mark.finding(&self.id, &self.source, self.verdict, sentence).cured_by(&self.remedy))
    }
}

fn plain(name: &str) -> String {
    name.replace('_', " ")
}

#[cfg(test)]
mod tests {
    use super::*;

    const FILTERED: &str = r#"
        id = "urease-filtered"
        once = "urease"
        first = "filtration"
        then = "packaging"
        verdict = "refuse"
        remedy = "Filter it first."
        source = { citation = "made up", status = "READ", basis = "law" }
    "#;

    fn early(rule: &str, done: &[(&str, i64)], next: (&str, i64), below_floor: bool) -> bool {
        let rule: Sequence = toml::from_str(rule).unwrap();
        let step = |&(name, at): &(&str, i64)| Step { name: name.to_owned(), at: Micros(at) };
        let done: Vec<Step> = done.iter().map(step).collect();
        let course = Course { done: &done, next: &step(&next), below_floor };
        rule.judge(&course, &Mark::House("test")).is_some()
    }

    #[test]
    fn the_first_step_must_follow_what_calls_for_it() {
        let next = ("packaging", 9);
        assert!(early(FILTERED, &[("urease", 2)], next, false));
        assert!(early(FILTERED, &[("filtration", 1), ("urease", 2)], next, false));
        assert!(!early(FILTERED, &[("filtration", 3), ("urease", 2)], next, false));
        assert!(early(FILTERED, &[("filtration", 10), ("urease", 2)], next, false));
        assert!(!early(FILTERED, &[("filtration", 1)], next, false));
        assert!(!early(FILTERED, &[("urease", 2)], ("racking", 9), false));
    }

    #[test]
    fn below_the_floor_the_first_feeding_is_not_held_back() {
        let rule = FILTERED
            .replace("once = \"urease\"", "waived_below_floor = true")
            .replace("filtration", "amino_nitrogen_taken_up")
            .replace("packaging", "ammonium");
        let next = ("ammonium", 9);
        assert!(early(&rule, &[], next, false));
        assert!(!early(&rule, &[], next, true));
        assert!(!early(&rule, &[("amino_nitrogen_taken_up", 8)], next, false));
    }
}
