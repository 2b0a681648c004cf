//! In what state a material meets the liquid.

use serde::Deserialize;

use crate::checks::Verdict;
use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::situation::Preparation;

use super::Source;
use super::rows::Rows;

/// What dry powder into an active ferment means.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct PreparationRule {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// Powder goes straight into a ferment full of gas.
    pub powder_into_active: Verdict,
    /// Where it comes from.
    pub source: Source,
}

impl PreparationRule {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        let powder = case.proposed.preparation == Preparation::Powder;
        if !powder || !case.situation.active || case.proposed.lines.is_empty() {
            return Vec::new();
        }
        let sentence =
            "Powder into an active ferment sets the gas free at once: it can foam over.".to_owned();
        let finding = mark
            .finding(&self.id, &self.source, self.powder_into_active, sentence)
            .cured_by("Stir it into a slurry first, add it slowly, and leave headspace.");
        vec![finding.into()]
    }
}
