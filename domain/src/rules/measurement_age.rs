//! How fresh a measurement must be to lean on it.

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::number::fixed;
use crate::checks::{Finding, Verdict};

use super::rows::Rows;
use super::{SettingName, Source};

/// Which measurement.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Measurement {
    /// Assimilable nitrogen: its age counts from sampling to pitching, and an ingredient added later outdates it.
    Yan,
    /// Gravity, while the ferment is under way.
    Gravity,
}

/// The greatest age of a measurement.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct MeasurementAge {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Which measurement.
    pub measurement: Measurement,
    /// How old it may be.
    pub at_most: SettingName,
    /// What follows if it is older.
    pub verdict: Verdict,
    /// Where it comes from.
    pub source: Source,
}

impl MeasurementAge {
    /// A measurement that is missing altogether is told by `checks::measure`, whatever sets are adopted.
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        if !case.feeds() {
            return Vec::new();
        }
        let found = match self.measurement {
            Measurement::Yan => self.yan(case, mark),
            Measurement::Gravity => self.gravity(case, mark),
        };
        found.into_iter().map(Noticed::from).collect()
    }

    fn yan(&self, case: &Case<'_>, mark: &Mark<'_>) -> Option<Finding> {
        let sampled_at = case.situation.yan?.sampled_at;
        let again = "Take a sample now and have ammonium and primary amino nitrogen measured.";
        if case.situation.last_ingredient_at.is_some_and(|at| sampled_at < at) {
            let sentence =
                "The nitrogen was sampled before the last ingredient went in: what that brought is unknown."
                    .to_owned();
            return Some(
                mark.finding(&self.id, &self.source, self.verdict, sentence).cured_by(again),
            );
        }
        let until = case.situation.pitched_at.unwrap_or(case.judged_at);
        let finding = self.older(case, mark, until.0.saturating_sub(sampled_at.0), |hours, limit| {
            format!("The nitrogen was sampled {hours} h before pitching; the site trusts it for {limit} h.")
        })?;
        Some(finding.cured_by(again))
    }

    fn gravity(&self, case: &Case<'_>, mark: &Mark<'_>) -> Option<Finding> {
        let taken_at = case.situation.last_gravity_at.filter(|_| case.situation.active)?;
        let age = case.judged_at.0.saturating_sub(taken_at.0);
        let finding = self.older(case, mark, age, |hours, limit| {
            format!("The last gravity is {hours} h old; the site trusts it for {limit} h.")
        })?;
        Some(finding.cured_by("Take a gravity first."))
    }

    fn older(
        &self,
        case: &Case<'_>,
        mark: &Mark<'_>,
        age_micros: i64,
        sentence: impl Fn(&str, &str) -> String,
    ) -> Option<Finding> {
        let settings = case.situation.settings;
        if age_micros <= settings.micros(self.at_most.0)? {
            return None;
        }
        let hours = fixed(crate::stamp::Micros(age_micros).hours_since(crate::stamp::Micros(0)), 1);
        let limit = settings.text(self.at_most.0).to_owned();
        let finding = mark
            .finding(&self.id, &self.source, self.verdict, sentence(&hours, &limit))
            .param("age_hours", hours.clone());
        Some(finding.measured(hours, limit, "h"))
    }
}
