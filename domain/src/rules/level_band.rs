//! Bands of a computed level: what a supply over the need, or far under it, means.

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::number::{fixed, settled};
use crate::checks::remedy::Cap;
use crate::checks::{Finding, Verdict};
use crate::settings::{Setting, Settings};
use crate::units::Decimal;

use super::Source;
use super::rows::Rows;

/// Which level.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Level {
    /// Nitrogen over the larger of need and line, once the proposal is in; judged where the proposal adds nitrogen.
    Excess,
    /// Nitrogen in all once the proposal is in.
    Supply,
}

/// A bound of a band: a plain decimal, or the name of a setting.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(try_from = "String")]
pub enum Bound {
    /// As written.
    Fixed(String),
    /// What the site has set.
    Setting(Setting),
}

impl TryFrom<String> for Bound {
    type Error = String;

    fn try_from(text: String) -> Result<Self, String> {
        if Decimal::parse(&text).is_ok() {
            return Ok(Self::Fixed(text));
        }
        Setting::of(&text)
            .map(Self::Setting)
            .ok_or_else(|| format!("{text:?} is neither a plain decimal nor the name of a setting"))
    }
}

impl Bound {
    fn text<'a>(&'a self, settings: &'a Settings) -> &'a str {
        match self {
            Self::Fixed(text) => text,
            Self::Setting(setting) => settings.text(*setting),
        }
    }

    fn number(&self, settings: &Settings) -> f64 {
        Decimal::parse(self.text(settings)).map_or(f64::NAN, Decimal::to_f64)
    }
}

/// One band; of those that hold, the gravest is the finding.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Band {
    /// The level is above this, in mg N/L.
    #[serde(default)]
    pub above: Option<Bound>,
    /// The level is below this, in mg N/L.
    #[serde(default)]
    pub below: Option<Bound>,
    /// What follows.
    pub verdict: Verdict,
}

impl Band {
    fn holds(&self, level: f64, settings: &Settings) -> bool {
        let above = self.above.as_ref().is_none_or(|bound| level > bound.number(settings));
        let below = self.below.as_ref().is_none_or(|bound| level < bound.number(settings));
        above && below
    }
}

/// Bands of one level.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct LevelBand {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Which level.
    pub level: Level,
    /// The bands.
    pub bands: Vec<Band>,
    /// Where it comes from.
    pub source: Source,
}

impl LevelBand {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        let level = match self.level {
            Level::Excess if !case.adds_nitrogen() => None,
            Level::Excess => case.after.excess(),
            Level::Supply => case.after.supply.map(settled),
        };
        let Some(level) = level else { return Vec::new() };
        let settings = case.situation.settings;
        let gravest = self
            .bands
            .iter()
            .filter(|band| band.holds(level, settings))
            .max_by_key(|band| band.verdict);
        match (gravest, self.level) {
            (None, _) => Vec::new(),
            (Some(band), Level::Excess) => vec![self.excess(case, mark, band, level)],
            (Some(band), Level::Supply) => vec![self.low(case, mark, band, level).into()],
        }
    }

    fn excess(&self, case: &Case<'_>, mark: &Mark<'_>, band: &Band, level: f64) -> Noticed {
        let supply = fixed(case.after.supply.unwrap_or_default(), 1);
        let target = fixed(case.after.target(), 1);
        let sentence = format!(
            "Supply comes to {supply} mg N/L with this, {} over the {target} that this batch needs.",
            fixed(level, 1)
        );
        let mut finding = mark
            .finding(&self.id, &self.source, band.verdict, sentence)
            .measured(supply.clone(), target.clone(), "mg N/L")
            .param("supply_mg_l", supply)
            .param("target_mg_l", target)
            .param("excess_mg_l", fixed(level, 1))
            .param("sugar_g_l", fixed(case.situation.sugar_g_l, 1));
        if let Some(bound) = &band.above {
            finding = finding.param("threshold_mg_l", bound.text(case.situation.settings));
        }
        Noticed { finding, cap: Cap::to_need(case) }
    }

    /// Feeding or pitching a starving must is referred; what has nothing to do with feeding is only told.
    fn low(&self, case: &Case<'_>, mark: &Mark<'_>, band: &Band, level: f64) -> Finding {
        let verdict = if case.feeds() { band.verdict } else { band.verdict.min(Verdict::Advise) };
        let limit = band
            .below
            .as_ref()
            .or(band.above.as_ref())
            .map_or("0", |bound| bound.text(case.situation.settings))
            .to_owned();
        let supply = fixed(level, 1);
        let sentence = format!(
            "Supply is only {supply} mg N/L with this: below {limit} expect the ferment to stick."
        );
        mark.finding(&self.id, &self.source, verdict, sentence)
            .param("supply_mg_l", supply.clone())
            .measured(supply, limit, "mg N/L")
            .cured_by(format!(
                "Feed more at once, towards the need of {} mg N/L.",
                fixed(case.after.need, 1)
            ))
    }
}
