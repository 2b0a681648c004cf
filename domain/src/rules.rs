//! Where the law and the practice stand as data.
//!
//! A rule set is a TOML text: who it binds, since when, and rules of a few typed forms, one file each below. Each form
//! is a row of data with one pure function; changing the law changes a row, not code. It is not a scripting language.
//! The list of a form's rules carries the form's name (`[[dose_limit]]`), so a slip is reported at its line.
//!
//! What an addition may do is asked by [`crate::checks::assess`]; everything else (release by market, claims, order of
//! steps, gauges, entries in time, keeping) by the functions of [`release`]. [`check`] tells all faults of a site's own
//! set.
//!
//! Each rule says how well it is known: **READ** in the source named, **FROM MEMORY** (works, and says so in its
//! citation), or **unconfirmed** (ships switched off and says why). Local law prevails over anything written here.

pub mod calendar;
pub mod category_claim;
mod check;
pub mod contaminant_limit;
pub mod content;
pub mod dose_limit;
pub mod entry_deadline;
pub mod exact;
pub mod gauge_required;
pub mod held;
pub mod level_band;
pub mod lot_status;
pub mod measurement_age;
pub mod positive_list;
pub mod preparation;
pub mod product;
pub mod release;
pub mod residual_limit;
pub mod retention;
pub mod rows;
pub mod sequence;
pub mod timing_limit;

use std::fmt;

use serde::Deserialize;
use sha2::{Digest, Sha256};

use crate::checks::Basis;
use crate::settings::Setting;
use crate::stamp::Micros;

use self::category_claim::CategoryClaim;
use self::contaminant_limit::ContaminantLimit;
use self::dose_limit::DoseLimit;
use self::entry_deadline::EntryDeadline;
use self::gauge_required::GaugeRequired;
use self::level_band::LevelBand;
use self::lot_status::LotStatusRule;
use self::measurement_age::MeasurementAge;
use self::positive_list::PositiveList;
use self::preparation::PreparationRule;
use self::residual_limit::ResidualLimit;
use self::retention::Retention;
use self::rows::Rows;
use self::sequence::Sequence;
use self::timing_limit::TimingLimit;

pub use self::check::{Located, check};

/// How well a rule is known.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
pub enum Status {
    /// Read in the source named.
    #[serde(rename = "READ")]
    Read,
    /// Remembered, not looked up: it works and is marked.
    #[serde(rename = "FROM MEMORY")]
    FromMemory,
    /// Could not be checked: it is switched off.
    #[serde(rename = "unconfirmed")]
    Unconfirmed,
}

/// Where a rule comes from, and whether it works.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Source {
    /// The instrument and article, or the paper.
    pub citation: String,
    /// The text that was read, with its date.
    #[serde(default)]
    pub as_read: Option<String>,
    /// How well it is known.
    pub status: Status,
    /// What it stands on.
    pub basis: Basis,
    /// Whether it works.
    #[serde(default = "on")]
    pub on: bool,
    /// Why it does not.
    #[serde(default)]
    pub why: Option<String>,
}

const fn on() -> bool {
    true
}

impl Source {
    /// The citation as shown: memory is marked.
    pub fn shown(&self) -> String {
        match self.status {
            Status::Read => self.citation.clone(),
            Status::FromMemory => format!("{} (from memory)", self.citation),
            Status::Unconfirmed => format!("{} (unconfirmed)", self.citation),
        }
    }
}

/// A calendar day, `YYYY-MM-DD`; it begins at midnight UTC, since a rule set knows no site.
#[derive(Clone, Copy, Debug, Deserialize, Eq, Ord, PartialEq, PartialOrd)]
#[serde(try_from = "String")]
pub struct Day(Micros);

impl Day {
    /// Its first instant.
    pub const fn start(self) -> Micros {
        self.0
    }
}

impl TryFrom<String> for Day {
    type Error = String;

    fn try_from(text: String) -> Result<Self, String> {
        let wrong = || format!("{text:?} is not a day such as 2022-08-24");
        if text.len() != 10 {
            return Err(wrong());
        }
        Micros::parse(&format!("{text}T00:00:00Z")).map(Self).map_err(|_| wrong())
    }
}

/// A threshold: the name of one of the site's settings.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(try_from = "String")]
pub struct SettingName(pub Setting);

impl TryFrom<String> for SettingName {
    type Error = String;

    fn try_from(name: String) -> Result<Self, String> {
        Setting::of(&name).map(Self).ok_or_else(|| format!("there is no setting {name:?}"))
    }
}

/// One version of a rule set.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct RuleSet {
    /// Its name over all versions.
    pub id: String,
    /// The version of this file format: 1.
    pub form: u32,
    /// For people.
    pub title: String,
    /// Whose law or practice: `US`, or `any`.
    pub jurisdiction: String,
    /// The kinds of premises it binds, or `any`.
    pub premises_kinds: Vec<String>,
    /// The product classes it binds, or `any`.
    pub product_classes: Vec<String>,
    /// This version.
    pub version: String,
    /// The first day it is in force.
    pub effective_from: Day,
    /// The first day it is no longer in force.
    #[serde(default)]
    pub effective_to: Option<Day>,
    /// The instrument as a whole.
    pub citation: String,
    /// What may be added at all.
    #[serde(default)]
    pub positive_list: Vec<PositiveList>,
    /// How much of a substance.
    #[serde(default)]
    pub dose_limit: Vec<DoseLimit>,
    /// Until when, or how far apart.
    #[serde(default)]
    pub timing_limit: Vec<TimingLimit>,
    /// Bands of a computed level.
    #[serde(default)]
    pub level_band: Vec<LevelBand>,
    /// Which lots.
    #[serde(default)]
    pub lot_status: Vec<LotStatusRule>,
    /// How fresh a measurement must be.
    #[serde(default)]
    pub measurement_age: Vec<MeasurementAge>,
    /// In what state.
    #[serde(default)]
    pub preparation: Vec<PreparationRule>,
    /// What may be left in the product.
    #[serde(default)]
    pub residual_limit: Vec<ResidualLimit>,
    /// What markets let it hold of what nobody put in.
    #[serde(default)]
    pub contaminant_limit: Vec<ContaminantLimit>,
    /// What a name asks of what carries it.
    #[serde(default)]
    pub category_claim: Vec<CategoryClaim>,
    /// What comes before what.
    #[serde(default)]
    pub sequence: Vec<Sequence>,
    /// Until when an event is entered.
    #[serde(default)]
    pub entry_deadline: Vec<EntryDeadline>,
    /// Where a quantity is measured.
    #[serde(default)]
    pub gauge_required: Vec<GaugeRequired>,
    /// How long records are kept.
    #[serde(default)]
    pub retention: Vec<Retention>,
}

/// What all rules have, whatever their form.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct RuleView<'a> {
    /// The form: the name of the list it stands in.
    pub form: &'static str,
    /// Its place in that list.
    pub index: usize,
    /// Its id.
    pub id: &'a str,
    /// The collected rows it stands on.
    pub rows: &'a Rows,
    /// Where it comes from.
    pub source: &'a Source,
}

/// Why a rule set was not understood.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum RuleSetError {
    /// Not TOML, an unknown or missing member, or a value out of its range; with line and column.
    #[error("{0}")]
    Text(String),
    /// Written for another version of this format.
    #[error("form = {0}: this program reads form = 1")]
    Form(u32),
    /// A rule that contradicts itself or another.
    #[error("rule {rule:?}: {reason}")]
    Rule {
        /// Its id.
        rule: String,
        /// What is wrong, and what to do.
        reason: &'static str,
    },
}

/// Where a rule stands: its set's id and its own, as findings name it.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct RuleName<'a> {
    /// The set's id.
    pub set: &'a str,
    /// The rule's id.
    pub rule: &'a str,
}

impl fmt::Display for RuleName<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{}.{}", self.set, self.rule)
    }
}

impl RuleSet {
    /// Reads a rule set.
    ///
    /// ```
    /// use domain::rules::{RuleSet, shipped};
    /// let (id, text) = shipped()[0];
    /// let set = RuleSet::parse(text)?;
    /// assert_eq!(set.id, id);
    /// assert_eq!(set.dose_limit[0].limit.text(), "8 lb per 1,000 US gal");
    /// # Ok::<(), domain::rules::RuleSetError>(())
    /// ```
    ///
    /// # Errors
    /// Any [`RuleSetError`].
    pub fn parse(text: &str) -> Result<Self, RuleSetError> {
        let set: Self =
            toml::from_str(text).map_err(|error| RuleSetError::Text(error.to_string()))?;
        if set.form != 1 {
            return Err(RuleSetError::Form(set.form));
        }
        match check::faults(&set).into_iter().next() {
            Some(fault) => Err(RuleSetError::Rule { rule: fault.rule, reason: fault.reason }),
            None => Ok(set),
        }
    }

    /// Every rule, switched off or not, in the order of the forms.
    pub fn rules(&self) -> impl Iterator<Item = RuleView<'_>> {
        let mut rules = Vec::new();
        macro_rules! list {
            ($($form:ident)*) => { $(
                rules.extend(self.$form.iter().enumerate().map(|(index, rule)| RuleView {
                    form: stringify!($form),
                    index,
                    id: &rule.id,
                    rows: &rule.row,
                    source: &rule.source,
                }));
            )* };
        }
        list!(positive_list dose_limit timing_limit level_band lot_status measurement_age preparation);
        list!(residual_limit contaminant_limit category_claim sequence);
        list!(entry_deadline gauge_required retention);
        rules.into_iter()
    }

    /// A rule's number with its unit, if it is one number.
    pub fn number_of(&self, rule: &RuleView<'_>) -> Option<String> {
        let index = rule.index;
        match rule.form {
            "dose_limit" => Some(self.dose_limit.get(index)?.limit.text().to_owned()),
            "residual_limit" => Some(self.residual_limit.get(index)?.limit.text().to_owned()),
            "contaminant_limit" => Some(self.contaminant_limit.get(index)?.limit.text().to_owned()),
            "entry_deadline" => {
                Some(format!("{} business days", self.entry_deadline.get(index)?.business_days))
            }
            "retention" => Some(format!("{} years", self.retention.get(index)?.years)),
            _ => None,
        }
    }

    /// Whether it is in force at that instant.
    pub fn in_force(&self, at: Micros) -> bool {
        self.effective_from.start() <= at && self.effective_to.is_none_or(|end| at < end.start())
    }

    /// Whether it is about this kind of premises.
    pub fn binds_premises(&self, kind: &str) -> bool {
        names(&self.premises_kinds, kind)
    }

    /// Whether it is about this class of product.
    pub fn binds_class(&self, class: &str) -> bool {
        names(&self.product_classes, class)
    }
}

fn names(list: &[String], wanted: &str) -> bool {
    list.iter().any(|name| name == wanted || name == "any")
}

/// SHA-256 of a rule set's text, hex: the name of exactly this version.
pub fn digest(text: &str) -> String {
    Sha256::digest(text.as_bytes()).iter().fold(String::new(), |mut hex, byte| {
        for half in [byte >> 4, byte & 15] {
            hex.extend(char::from_digit(u32::from(half), 16));
        }
        hex
    })
}

/// The sets that come with the program: id and text. That a set ships means that it can be adopted, not that it binds.
pub fn shipped() -> &'static [(&'static str, &'static str)] {
    &[
        ("us-wine", include_str!("rules/sets/us-wine.toml")),
        ("common-practice", include_str!("rules/sets/common-practice.toml")),
        ("us-distilling-material", include_str!("rules/sets/us-distilling-material.toml")),
        ("us-spirits-plant", include_str!("rules/sets/us-spirits-plant.toml")),
        ("us-beer", include_str!("rules/sets/us-beer.toml")),
        ("eu-wine", include_str!("rules/sets/eu-wine.toml")),
        ("fr-cider", include_str!("rules/sets/fr-cider.toml")),
        ("uk-wine", include_str!("rules/sets/uk-wine.toml")),
        ("ca-wine", include_str!("rules/sets/ca-wine.toml")),
        ("eu-spirits", include_str!("rules/sets/eu-spirits.toml")),
        ("contaminants", include_str!("rules/sets/contaminants.toml")),
    ]
}

#[cfg(test)]
mod tests;
