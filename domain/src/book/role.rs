//! What a person may be at a site.

use serde::{Deserialize, Serialize};

/// A role at one site. Roles add up; none of them can rewrite an entry.
#[derive(Clone, Copy, Debug, Deserialize, Eq, Hash, Ord, PartialEq, PartialOrd, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Role {
    /// People, keys and settings of the site.
    Admin,
    /// Reads everything, writes nothing.
    Auditor,
    /// Receives lots, takes readings, proposes and records additions.
    Cellar,
    /// Opens batches, plans feeding, signs exceptions.
    Lead,
    /// Holds and releases lots, resolves deviations, issues records.
    Quality,
}

impl Role {
    /// All roles.
    pub const ALL: [Self; 5] =
        [Self::Admin, Self::Auditor, Self::Cellar, Self::Lead, Self::Quality];

    /// The name in entries, columns and addresses.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Admin => "admin",
            Self::Auditor => "auditor",
            Self::Cellar => "cellar",
            Self::Lead => "lead",
            Self::Quality => "quality",
        }
    }

    /// The role of that name.
    pub fn parse(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|role| role.name() == name)
    }
}
