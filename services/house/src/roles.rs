//! What a person may be on a site.

use std::fmt;

/// A role on one site. A person may hold several; none of them includes another.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Role {
    /// Receives lots, takes readings, proposes and makes additions.
    Cellar,
    /// Opens batches, plans, signs exceptions of production.
    Lead,
    /// Holds and releases lots, adopts rule sets, resolves deviations.
    Quality,
    /// Enrols people and grants roles.
    Admin,
    /// Reads everything, writes nothing.
    Auditor,
}

impl Role {
    /// Every role, in the order they are shown.
    pub const ALL: [Self; 5] =
        [Self::Cellar, Self::Lead, Self::Quality, Self::Admin, Self::Auditor];

    /// The word for it in paths, JSON and columns.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Cellar => "cellar",
            Self::Lead => "lead",
            Self::Quality => "quality",
            Self::Admin => "admin",
            Self::Auditor => "auditor",
        }
    }

    /// The role of that name, spelled exactly so.
    pub fn parse(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|role| role.name() == name)
    }
}

impl fmt::Display for Role {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str(self.name())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_and_roles_go_both_ways_and_nothing_else_is_a_role() {
        for role in Role::ALL {
            assert_eq!(Role::parse(role.name()), Some(role));
        }
        for foreign in ["", "Admin", "admin ", "operator", "root"] {
            assert_eq!(Role::parse(foreign), None, "{foreign:?}");
        }
    }
}
