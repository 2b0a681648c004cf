//! Where a quantity must be measured before the next step: production, removal, transfer.

use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::{Finding, Verdict};
use crate::stamp::Micros;

use super::Source;
use super::rows::Rows;
use super::sequence::Step;

/// A gauge that is asked for.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct GaugeRequired {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// The steps that ask for it.
    pub steps: Vec<String>,
    /// What is measured: `volume`, `strength`, `mass`.
    pub measures: Vec<String>,
    /// What a missing gauge means.
    pub verdict: Verdict,
    /// Where it comes from.
    pub source: Source,
}

/// A gauge that was taken.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Gauge {
    /// What was measured.
    pub measures: Vec<String>,
    /// When.
    pub at: Micros,
}

impl GaugeRequired {
    /// The finding if something was not measured since `changed_at`, when the quantity last changed, before the step.
    pub(crate) fn judge(
        &self,
        next: &Step,
        gauges: &[Gauge],
        changed_at: Micros,
        mark: &Mark<'_>,
    ) -> Option<Finding> {
        if !self.steps.contains(&next.name) {
            return None;
        }
        let taken = |measure: &String| {
            gauges.iter().any(|gauge| {
                changed_at <= gauge.at && gauge.at <= next.at && gauge.measures.contains(measure)
            })
        };
        let missing: Vec<&str> =
            self.measures.iter().filter(|&measure| !taken(measure)).map(String::as_str).collect();
        if missing.is_empty() {
            return None;
        }
        let missing = missing.join(" and ");
        let step = next.name.replace('_', " ");
        let sentence = format!(
            "Before {step} the {missing} must be measured ({}): since the quantity last changed that was not done.",
            self.source.shown()
        );
        let finding = mark.finding(&self.id, &self.source, self.verdict, sentence);
        Some(finding.cured_by(format!("Gauge the {missing} first.")))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const REMOVAL: &str = r#"
        id = "gauge"
        steps = ["removal"]
        measures = ["volume", "strength"]
        verdict = "refer"
        source = { citation = "made up", status = "READ", basis = "law" }
    "#;

    fn remedy(step: &str, gauges: &[(&[&str], i64)]) -> Option<String> {
        let rule: GaugeRequired = toml::from_str(REMOVAL).unwrap();
        let gauges: Vec<Gauge> = gauges
            .iter()
            .map(|(measures, at)| Gauge {
                measures: measures.iter().map(|&one| one.to_owned()).collect(),
                at: Micros(*at),
            })
            .collect();
        let next = Step { name: step.to_owned(), at: Micros(9) };
        let finding = rule.judge(&next, &gauges, Micros(5), &Mark::House("test"))?;
        Some(finding.remedy.unwrap().sentence)
    }

    #[test]
    fn every_measure_is_taken_after_the_last_change_and_before_the_step() {
        let both: &[&str] = &["volume", "strength"];
        assert_eq!(remedy("removal", &[(both, 5)]), None);
        assert_eq!(remedy("removal", &[(&["volume"], 6), (&["strength"], 9)]), None);
        let gauge = |what: &str| Some(format!("Gauge the {what} first."));
        assert_eq!(remedy("removal", &[]), gauge("volume and strength"));
        assert_eq!(remedy("removal", &[(both, 4)]), gauge("volume and strength"));
        assert_eq!(remedy("removal", &[(both, 10)]), gauge("volume and strength"));
        assert_eq!(remedy("removal", &[(&["volume"], 6)]), gauge("strength"));
        assert_eq!(remedy("racking", &[]), None);
    }
}
