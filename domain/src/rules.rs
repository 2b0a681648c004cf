//! Where the law and the practice stand as data.
//!
//! A rule set is a TOML text: who it binds, since when, and rules of a few typed forms, one file each below. Each form
//! is a row of data with one pure function; changing the law changes a row, not code. It is not a scripting language.
//! The list of a form's rules carries the form's name (`[[dose_limit]]`), so a slip is reported at its line.
//!
//! Each rule says how well it is known: **READ** in the source named, **FROM MEMORY** (works, and says so in its
//! citation), or **unconfirmed** (ships switched off and says why). Local law prevails over anything written here.

pub mod dose_limit;
pub mod exact;
pub mod level_band;
pub mod lot_status;
pub mod measurement_age;
pub mod positive_list;
pub mod preparation;
pub mod timing_limit;

use std::collections::BTreeSet;
use std::fmt;

use serde::Deserialize;
use sha2::{Digest, Sha256};

use crate::checks::Basis;
use crate::settings::Setting;
use crate::stamp::Micros;

use self::dose_limit::DoseLimit;
use self::level_band::LevelBand;
use self::lot_status::LotStatusRule;
use self::measurement_age::MeasurementAge;
use self::positive_list::PositiveList;
use self::preparation::PreparationRule;
use self::timing_limit::TimingLimit;

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
        set.coherent()?;
        Ok(set)
    }

    fn coherent(&self) -> Result<(), RuleSetError> {
        let wrong = |rule: &str, reason| Err(RuleSetError::Rule { rule: rule.to_owned(), reason });
        let plain = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-';
        if self.id.is_empty() || !self.id.chars().all(plain) {
            return wrong(&self.id, "the set's id is made of small letters, digits and hyphens");
        }
        if self.effective_to.is_some_and(|end| end <= self.effective_from) {
            return wrong(&self.id, "effective_to must be later than effective_from");
        }
        let mut seen = BTreeSet::new();
        for (id, source) in self.rules() {
            if id.is_empty() || !id.chars().all(plain) {
                return wrong(id, "an id is made of small letters, digits and hyphens");
            }
            if !seen.insert(id) {
                return wrong(id, "this id is used twice in the set");
            }
            if source.status == Status::Unconfirmed && source.on {
                return wrong(id, "an unconfirmed rule ships switched off: set on = false");
            }
            if !source.on && source.why.as_deref().is_none_or(str::is_empty) {
                return wrong(id, "a rule that is switched off says why");
            }
        }
        self.faults().next().map_or(Ok(()), |(id, reason)| wrong(id, reason))
    }

    /// Rules that could never speak, or that would compare unlike things.
    fn faults(&self) -> impl Iterator<Item = (&str, &'static str)> {
        let doses =
            self.dose_limit.iter().filter_map(|rule| Some((rule.id.as_str(), rule.fault()?)));
        let silent = "give it sugar_used or since_last_dose: as it stands it says nothing";
        let times = self
            .timing_limit
            .iter()
            .filter(|rule| rule.sugar_used.is_empty() && rule.since_last_dose.is_none())
            .map(move |rule| (rule.id.as_str(), silent));
        let levels = self
            .level_band
            .iter()
            .filter(|rule| {
                rule.bands.iter().any(|band| band.above.is_none() && band.below.is_none())
            })
            .map(|rule| (rule.id.as_str(), "each band has a bound above or below"));
        doses.chain(times).chain(levels)
    }

    /// Every rule's id and source, switched off or not, in the order of the forms.
    pub fn rules(&self) -> impl Iterator<Item = (&str, &Source)> {
        let lists = self.positive_list.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let doses = self.dose_limit.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let times = self.timing_limit.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let levels = self.level_band.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let lots = self.lot_status.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let ages = self.measurement_age.iter().map(|rule| (rule.id.as_str(), &rule.source));
        let states = self.preparation.iter().map(|rule| (rule.id.as_str(), &rule.source));
        lists.chain(doses).chain(times).chain(levels).chain(lots).chain(ages).chain(states)
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

/// The sets that come with the program: id and text.
pub fn shipped() -> &'static [(&'static str, &'static str)] {
    &[
        ("us-wine", include_str!("rules/sets/us-wine.toml")),
        ("common-practice", include_str!("rules/sets/common-practice.toml")),
    ]
}

#[cfg(test)]
mod tests;
