//! A subject as it lies on a desk: its entries in force and what they add up to, and how one more entry changes both.

use std::sync::Arc;

use super::body::Body;
use super::in_force::{FoldError, InForce, Known};
use super::state::State;
use super::subject::Subject;
use crate::ledger::entry::Entry;

/// A subject as loaded: how many entries there are about it, those in force, and what they add up to.
#[derive(Clone, Debug)]
pub struct Loaded {
    /// Its running number: how many entries there are about it.
    pub n: u64,
    /// Its entries in force, in the order in which things happened.
    pub entries: Vec<Arc<InForce>>,
    /// Entries that were about it until an amendment moved them elsewhere, as they read there: they can be amended
    /// again, and only what they were first about is sure to know them.
    departed: Vec<Arc<InForce>>,
    /// What they add up to.
    pub state: State,
}

impl Loaded {
    /// A subject from all of its entries, in the log's order. None of them: it does not exist.
    ///
    /// # Errors
    /// [`FoldError`] if the log holds what this program cannot read.
    pub fn read(subject: Subject, entries: &[Entry]) -> Result<Self, FoldError> {
        let n = entries.len() as u64;
        let Known { here: entries, departed } = Known::read(subject, entries)?;
        let state = State::fold(subject, &entries);
        Ok(Self { n, entries, departed, state })
    }

    /// The subject after further entries of its own, in the log's order; `None` if an amendment is among them, for
    /// which all of its entries are needed.
    ///
    /// # Errors
    /// [`FoldError`] if the log holds what this program cannot read.
    pub fn after(&self, subject: Subject, further: &[Entry]) -> Result<Option<Self>, FoldError> {
        let mut next = self.clone();
        for entry in further {
            let read = Arc::new(InForce::original(entry)?);
            if matches!(*read.body, Body::EntryAmended(_)) {
                return Ok(None);
            }
            next.n += 1;
            next.insert(subject, &read);
        }
        Ok(Some(next))
    }

    /// Takes one more entry in its place; the state is folded anew if it does not take a late one as it is.
    pub(super) fn insert(&mut self, subject: Subject, entry: &Arc<InForce>) {
        let place = self.entries.partition_point(|other| other.order() < entry.order());
        let is_latest = place == self.entries.len();
        self.entries.insert(place, Arc::clone(entry));
        if is_latest || State::keeps_by_time(&entry.body) {
            self.state.apply(entry);
        } else {
            self.state = State::fold(subject, &self.entries);
        }
    }

    /// Puts an amended entry in place of what it was, if it still is about this subject.
    pub(super) fn replace(&mut self, subject: Subject, entry: &Arc<InForce>) {
        self.remove(entry.seq);
        if entry.subjects.contains(&subject) {
            let place = self.entries.partition_point(|other| other.order() < entry.order());
            self.entries.insert(place, Arc::clone(entry));
        } else {
            self.departed.push(Arc::clone(entry));
        }
        self.state = State::fold(subject, &self.entries);
    }

    pub(super) fn remove(&mut self, seq: u64) {
        self.entries.retain(|other| other.seq != seq);
        self.departed.retain(|other| other.seq != seq);
    }

    pub(super) fn known(&self, seq: u64) -> Option<&Arc<InForce>> {
        self.entries.iter().chain(&self.departed).find(|entry| entry.seq == seq)
    }
}
