//! Until when, and how far apart, yeast is fed.
//!
//! "Late" is a probability against a setting, since the sugar used at a planned time is a forecast.

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::number::{chance, fixed, percent};
use crate::checks::{Finding, Verdict};

use super::dose_limit::Counts;
use super::exact::grouped;
use super::rows::Rows;
use super::{SettingName, Source};

/// A part of the sugar.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum SugarMark {
    /// A third of the fermentable sugar is used.
    Third,
    /// Half of it is used.
    Half,
}

/// What the proposal carries for a step to count.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Carries {
    /// Any assimilable nitrogen.
    Nitrogen,
    /// Ammonium.
    Ammonium,
}

/// One step: the first one that holds is the finding.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Step {
    /// More than this is used …
    pub more_than: SugarMark,
    /// … with at least this probability …
    pub probability: SettingName,
    /// … and the proposal carries this.
    pub carries: Carries,
    /// What follows.
    pub verdict: Verdict,
    /// What to do instead.
    pub remedy: String,
}

/// The least time since the last dose of nitrogen.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Gap {
    /// How long.
    pub at_least: SettingName,
    /// What follows if it is shorter.
    pub verdict: Verdict,
    /// What to do instead.
    pub remedy: String,
}

/// When yeast is fed: by the sugar used, or by the time since the last dose.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct TimingLimit {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Steps by the sugar used, gravest first.
    #[serde(default)]
    pub sugar_used: Vec<Step>,
    /// The gap between two doses.
    #[serde(default)]
    pub since_last_dose: Option<Gap>,
    /// Where it comes from.
    pub source: Source,
}

impl TimingLimit {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        let by_sugar = self.by_sugar(case, mark);
        let by_gap = self.since_last_dose.as_ref().and_then(|gap| self.by_gap(case, mark, gap));
        by_sugar.into_iter().chain(by_gap).map(Noticed::from).collect()
    }

    fn by_sugar(&self, case: &Case<'_>, mark: &Mark<'_>) -> Option<Finding> {
        let fraction = case.situation.fraction.as_ref()?;
        let probability = |step: &Step| match step.more_than {
            SugarMark::Third => fraction.p_third,
            SugarMark::Half => fraction.p_half,
        };
        let step = self.sugar_used.iter().find(|step| {
            case.carries(step.carries)
                && probability(step) >= case.situation.settings.number(step.probability.0)
        })?;
        let (part, limit) = match step.more_than {
            SugarMark::Third => ("a third", "0.333"),
            SugarMark::Half => ("half", "0.500"),
        };
        let threshold = case.situation.settings.text(step.probability.0);
        let sentence = format!(
            "About {} % of the sugar is used at that time ({} to {} %); the chance that it is more than {part} is {} %.",
            percent(fraction.mid),
            percent(fraction.low),
            percent(fraction.high),
            chance(probability(step)),
        );
        let finding = mark
            .finding(&self.id, &self.source, step.verdict, sentence)
            .measured(fixed(fraction.mid, 3), limit.to_owned(), "1")
            .param("fraction_low", fixed(fraction.low, 3))
            .param("fraction_mid", fixed(fraction.mid, 3))
            .param("fraction_high", fixed(fraction.high, 3))
            .param("probability", fixed(probability(step), 3))
            .param("probability_threshold", threshold);
        Some(finding.cured_by(Self::instead(case, step)))
    }

    /// Late nitrogen has an alternative that carries none, as far as the law leaves room for it.
    fn instead(case: &Case<'_>, step: &Step) -> String {
        let walls = "yeast_cell_walls".to_owned();
        if step.more_than != SugarMark::Half {
            return step.remedy.clone();
        }
        let law = case.binding.iter().flat_map(|adopted| &adopted.set.dose_limit).find(|rule| {
            rule.source.on
                && rule.counts == Counts::Substance
                && rule.is_about(&case.situation.product_class)
                && rule.substances.contains(&walls)
        });
        let Some((rule, rest)) = law.and_then(|rule| Some((rule, rule.rest(case)?))) else {
            return step.remedy.clone();
        };
        let grams = grouped(&(rest / 1_000_000).to_string());
        format!(
            "{} Yeast cell walls carry no ammonium: up to {grams} g may go in here ({}, {}).",
            step.remedy,
            rule.limit.text(),
            rule.source.citation
        )
    }

    fn by_gap(&self, case: &Case<'_>, mark: &Mark<'_>, gap: &Gap) -> Option<Finding> {
        if !case.carries(Carries::Nitrogen) {
            return None;
        }
        let last_at = case.last_dose_at()?;
        let least = case.situation.settings.micros(gap.at_least.0)?;
        if case.proposed.planned_at.0.saturating_sub(last_at.0) >= least {
            return None;
        }
        let hours = fixed(case.proposed.planned_at.hours_since(last_at), 1);
        let limit = case.situation.settings.text(gap.at_least.0).to_owned();
        let sentence =
            format!("The last nitrogen went in {hours} h before; the site keeps {limit} h apart.");
        let finding = mark
            .finding(&self.id, &self.source, gap.verdict, sentence)
            .param("hours_since_last_dose", hours.clone())
            .measured(hours, limit, "h");
        Some(finding.cured_by(gap.remedy.as_str()))
    }
}
