//! The site: founding, people, settings, rule sets, clock.

use std::collections::BTreeMap;

use serde::{Deserialize, Serialize};

use crate::book::role::Role;
use crate::ids::PersonId;
use crate::stamp::Micros;

/// `site.founded`, entry 0 of every log.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct SiteFounded {
    /// Short human code, unique in the installation.
    pub code: String,
    /// Name as printed.
    pub name: String,
    /// Name of the log and of its key, fixed for ever.
    pub origin: String,
    /// The log's verifier key as a C2SP vkey.
    pub public_key: String,
    /// IANA time zone.
    pub time_zone: String,
    /// Licence or permit number, if any.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub licence: Option<String>,
    /// What may be done where.
    pub premises: Vec<Premises>,
    /// Only a simulated book may run on a driven clock, and everything that leaves it says so.
    pub simulation: bool,
    /// Declared single-handed: one person may give both signatures, and the record says so.
    pub single_handed: bool,
}

/// A part of the site that the law treats as one.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Premises {
    /// Short code, unique in the site.
    pub code: String,
    /// What it is to the law, for example `bonded_wine_premises`.
    pub kind: String,
    /// Name as printed.
    pub name: String,
}

/// `clock.corrected`: the server's clock was found ahead and set back by more than two seconds.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct ClockCorrected {
    /// The last `recorded_at` before.
    pub previous: Micros,
    /// What the clock says now.
    pub clock: Micros,
    /// Why.
    pub reason: String,
}

/// `person.enrolled`: a pseudonym; name and login live in the directory, tied by a salted hash.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct PersonEnrolled {
    /// The pseudonym.
    pub person: PersonId,
    /// SHA-256 of salt and the directory's name and login, hexadecimal.
    pub identity: String,
}

/// `role.granted`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct RoleGranted {
    /// Who.
    pub person: PersonId,
    /// What.
    pub role: Role,
}

/// `role.withdrawn`. A person without a role is disabled.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct RoleWithdrawn {
    /// Who.
    pub person: PersonId,
    /// What.
    pub role: Role,
    /// Why, if told.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub reason: Option<String>,
}

/// `settings.changed`: the named settings from now on; the others stay.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct SettingsChanged {
    /// Setting → decimal text.
    pub settings: BTreeMap<String, String>,
    /// Why.
    pub reason: String,
}

/// `ruleset.adopted`: this version binds from `occurred_at` on, in place of an earlier one of the same standing.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct RulesetAdopted {
    /// The set's id.
    pub set: String,
    /// Its version.
    pub version: String,
    /// SHA-256 of its text, hexadecimal; the text is a blob of that name.
    pub digest: String,
    /// As what it binds.
    pub standing: Standing,
}

/// As what a rule set binds.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Standing {
    /// By where we are: a breach is refused.
    Production,
    /// By where the drink is meant to go: a breach closes that market.
    Market(String),
}

impl std::fmt::Display for Standing {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Production => f.write_str("production"),
            Self::Market(market) => write!(f, "market {market}"),
        }
    }
}
