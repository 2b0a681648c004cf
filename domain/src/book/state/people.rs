//! A person's roles.

use std::collections::BTreeSet;

use crate::book::body::Body;
use crate::book::in_force::InForce;
use crate::book::role::Role;
use crate::book::table::Row;
use crate::book::tables::PERSON;
use crate::ids::PersonId;
use crate::stamp::Stamp;

/// A pseudonym with its roles. Without a role it is disabled.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct PersonState {
    /// Which.
    pub person: PersonId,
    /// Since when; absent before the first entry.
    pub enrolled_at: Option<Stamp>,
    /// The salted hash of the directory's record.
    pub identity: String,
    /// What the person may be here.
    pub roles: BTreeSet<Role>,
}

impl PersonState {
    pub(crate) fn new(person: PersonId) -> Self {
        Self { person, enrolled_at: None, identity: String::new(), roles: BTreeSet::new() }
    }

    pub(crate) fn apply(&mut self, entry: &InForce) {
        match entry.body.as_ref() {
            Body::PersonEnrolled(body) if body.person == self.person => {
                self.enrolled_at = Some(entry.occurred_at);
                self.identity.clone_from(&body.identity);
            }
            Body::RoleGranted(body) if body.person == self.person => {
                self.roles.insert(body.role);
            }
            Body::RoleWithdrawn(body) if body.person == self.person => {
                self.roles.remove(&body.role);
            }
            _ => {}
        }
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some(enrolled_at) = self.enrolled_at else { return Vec::new() };
        let roles = self.roles.iter().map(|role| role.name()).collect::<Vec<_>>().join(",");
        vec![Row {
            table: &PERSON,
            cells: vec![self.person.0.into(), enrolled_at.at.0.into(), roles.into()],
        }]
    }
}
