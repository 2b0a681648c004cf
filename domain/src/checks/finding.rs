//! What an assessment says: these types are written into ledger entries, so they hold no floating point.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::units::Quantity;

/// What follows from a finding, or from a whole assessment: the worst finding's.
#[derive(Clone, Copy, Debug, Deserialize, Eq, Hash, Ord, PartialEq, PartialOrd, Serialize)]
#[serde(rename_all = "lowercase")]
pub enum Verdict {
    /// Nothing above information: may be done.
    Clear,
    /// May be done, but there is something to read.
    Advise,
    /// A second, authorised person signs with a reason before it is done.
    Refer,
    /// Cannot be done as proposed; if it has happened, it is recorded and a deviation opens.
    Refuse,
}

impl Verdict {
    /// The word used in columns, JSON and rule sets.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Clear => "clear",
            Self::Advise => "advise",
            Self::Refer => "refer",
            Self::Refuse => "refuse",
        }
    }
}

/// What a rule stands on.
#[derive(Clone, Copy, Debug, Deserialize, Eq, Hash, Ord, PartialEq, PartialOrd, Serialize)]
pub enum Basis {
    /// Binding law.
    #[serde(rename = "law")]
    Law,
    /// An authority's guidance or published recommendation.
    #[serde(rename = "guidance")]
    Guidance,
    /// A voluntary target.
    #[serde(rename = "voluntary")]
    Voluntary,
    /// What careful cellars do; no number of it is published as a limit.
    #[serde(rename = "common practice")]
    CommonPractice,
    /// A threshold chosen by the site.
    #[serde(rename = "site setting")]
    SiteSetting,
    /// A computed estimate, never a laboratory analysis.
    #[serde(rename = "model")]
    Model,
}

impl Basis {
    /// The words used in JSON and rule sets.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Law => "law",
            Self::Guidance => "guidance",
            Self::Voluntary => "voluntary",
            Self::CommonPractice => "common practice",
            Self::SiteSetting => "site setting",
            Self::Model => "model",
        }
    }
}

/// What would remove a finding.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Remedy {
    /// For the person with the scoop.
    pub sentence: String,
    /// The amount to use instead: of the one lot, or of all lots of this kind in the proposal together.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub lot_amount: Option<Quantity>,
}

/// One thing noticed.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Finding {
    /// A stable dotted name such as `us-wine.ammonium-phosphate`.
    pub rule: String,
    /// How grave it is; information is `clear`.
    pub verdict: Verdict,
    /// The numbers behind the sentence: plain decimals, the unit at the end of the name.
    pub params: BTreeMap<String, String>,
    /// The sentence as shown.
    pub sentence: String,
    /// The language of the sentence.
    pub language: String,
    /// The number judged.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub value: Option<String>,
    /// What it was held against.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub limit: Option<String>,
    /// The unit of both.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub unit: Option<String>,
    /// What the rule stands on.
    pub basis: Basis,
    /// Where it is written.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub citation: Option<String>,
    /// The digest (SHA-256, hex) of the rule set that holds the rule; none for what every cellar is told.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub rule_set: Option<String>,
    /// What would remove the finding.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub remedy: Option<Remedy>,
}

impl Finding {
    /// A finding with a sentence and nothing else yet.
    pub fn new(rule: &str, verdict: Verdict, basis: Basis, sentence: String) -> Self {
        Self {
            rule: rule.to_owned(),
            verdict,
            params: BTreeMap::new(),
            sentence,
            language: "en".to_owned(),
            value: None,
            limit: None,
            unit: None,
            basis,
            citation: None,
            rule_set: None,
            remedy: None,
        }
    }

    /// With one more number.
    #[must_use]
    pub fn param(mut self, name: &str, value: impl Into<String>) -> Self {
        self.params.insert(name.to_owned(), value.into());
        self
    }

    /// With the number judged and what it was held against.
    #[must_use]
    pub fn measured(mut self, value: String, limit: String, unit: &str) -> Self {
        self.value = Some(value);
        self.limit = Some(limit);
        self.unit = Some(unit.to_owned());
        self
    }

    /// With what would remove it.
    #[must_use]
    pub fn cured_by(mut self, sentence: impl Into<String>) -> Self {
        self.remedy = Some(Remedy { sentence: sentence.into(), lot_amount: None });
        self
    }
}

/// The nitrogen account at one moment, in mg N per litre of liquid; plain decimals with one digit after the point.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Account {
    /// Measured nitrogen and what was added since the sample; absent while nothing was measured.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub supply_mg_l: Option<String>,
    /// What was added since the sample.
    pub added_mg_l: String,
    /// The larger of floor and factor × sugar.
    pub need_mg_l: String,
    /// The least that finishes a ferment: 140 mg N/L (Brice et al. 2014).
    pub floor_mg_l: String,
    /// The demand factor, mg N per g sugar.
    pub factor_mg_g: String,
    /// The published line 200 + 25 (Brix − 21), for must of 21 to 27 Brix (Bisson & Butzke 2000).
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub line_mg_l: Option<String>,
    /// What may still go in: the larger of need and line, less the supply.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub room_mg_l: Option<String>,
    /// What is missing to the need.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub shortage_mg_l: Option<String>,
    /// What is over the larger of need and line.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub excess_mg_l: Option<String>,
    /// The sugar that the need was computed from, g/L.
    pub sugar_g_l: String,
    /// Where that sugar figure comes from.
    pub sugar_basis: String,
    /// Another sugar figure of the same batch, g/L.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub other_sugar_g_l: Option<String>,
    /// Where the other figure comes from.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub other_sugar_basis: Option<String>,
    /// The need by the other figure, mg N/L.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub other_need_mg_l: Option<String>,
}

/// The fraction of the fermentable sugar used at the planned time, as plain decimals from 0 to 1.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct FractionUsed {
    /// The low end of the band.
    pub low: String,
    /// The middle.
    pub mid: String,
    /// The high end.
    pub high: String,
}

/// A rule set that bound this assessment.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct SetUsed {
    /// Its id.
    pub id: String,
    /// Its version.
    pub version: String,
    /// SHA-256 of its text, hex.
    pub digest: String,
    /// `production`, or `market:` and the market.
    pub standing: String,
}

/// A safety caution that goes with what is proposed.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Caution {
    /// A stable name such as `carbon-dioxide`.
    pub topic: String,
    /// What to mind.
    pub text: String,
    /// Where it comes from.
    pub source: String,
}

/// The whole answer to "may I add this now?".
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Assessment {
    /// The worst finding's.
    pub verdict: Verdict,
    /// Everything noticed, worst first.
    pub findings: Vec<Finding>,
    /// The nitrogen account without the proposal.
    pub account_before: Account,
    /// The nitrogen account with it.
    pub account_after: Account,
    /// How far the ferment is at the planned time; absent before it starts or without a gravity.
    #[serde(default, skip_serializing_if = "Option::is_none")]
    pub fraction_used: Option<FractionUsed>,
    /// The version of the crate and of the way it assesses.
    pub engine: String,
    /// The adopted sets that bind this batch at the planned time; sets that do not bind it are left out.
    pub rule_sets: Vec<SetUsed>,
    /// What to mind for safety.
    pub cautions: Vec<Caution>,
}
