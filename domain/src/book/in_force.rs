//! Which entries are in force, and how they read: the fold's first half.
//!
//! Amendments do not touch what they amend. The latest replacement or voiding by `seq` counts; a change of one item
//! counts on top of it if it came later. What an entry said before stays with it, to be shown struck through.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::body::{Body, Effect, EntryAmended, UnknownBody};
use super::subject::Subject;
use crate::ids::{CommandId, EntryId};
use crate::ledger::entry::{Actor, Entry, Via};
use crate::stamp::{Micros, Stamp};

/// A log this program cannot fold.
#[derive(Debug, thiserror::Error)]
pub enum FoldError {
    /// An entry it cannot read.
    #[error("entry {seq} cannot be read")]
    Body {
        /// Which.
        seq: u64,
        /// Why.
        source: UnknownBody,
    },
    /// An entry that contradicts the ones before it.
    #[error("entry {seq} contradicts the log before it: {detail}")]
    Inconsistent {
        /// Which.
        seq: u64,
        /// How.
        detail: String,
    },
    /// An entry that cannot be brought into the ledger's form.
    #[error("the entry cannot be written")]
    Form(#[from] crate::ledger::entry::NotAnEntry),
    /// A rule set that cannot be read.
    #[error("rule set {digest} cannot be read: {detail}")]
    RuleSet {
        /// SHA-256 of its text.
        digest: String,
        /// Why.
        detail: String,
    },
}

/// An original entry as it reads now.
#[derive(Clone, Debug, PartialEq)]
pub struct InForce {
    /// Its number in the log.
    pub seq: u64,
    /// Its id.
    pub id: EntryId,
    /// When it happened.
    pub occurred_at: Stamp,
    /// When it was recorded.
    pub recorded_at: Micros,
    /// Who recorded it.
    pub actor: Actor,
    /// Through which door.
    pub via: Via,
    /// The command that wrote it.
    pub command: CommandId,
    /// What it is about, without numbers.
    pub subjects: Vec<Subject>,
    /// What it says.
    pub body: Arc<Body>,
    /// Voided: it did not happen.
    pub void: bool,
    /// How it came to read like this, oldest first.
    pub amendments: Vec<Amendment>,
}

/// One amendment of an entry, with what it made of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Amendment {
    /// The amendment's own number in the log.
    pub seq: u64,
    /// Who amended.
    pub actor: Actor,
    /// When.
    pub at: Stamp,
    /// Why.
    pub reason: String,
    /// What the entry said before: when, and what.
    pub was: (Stamp, Arc<Body>),
}

impl InForce {
    /// An entry nobody has amended yet.
    ///
    /// # Errors
    /// [`FoldError::Body`].
    pub fn original(entry: &Entry) -> Result<Self, FoldError> {
        let body = read(entry)?;
        Ok(Self {
            seq: entry.seq,
            id: entry.id,
            occurred_at: entry.occurred_at,
            recorded_at: entry.recorded_at,
            actor: entry.actor,
            via: entry.via,
            command: entry.cause.command,
            subjects: entry.subjects().collect(),
            body: Arc::new(body),
            void: false,
            amendments: Vec::new(),
        })
    }

    /// The order in which the fold takes entries.
    pub const fn order(&self) -> (Micros, u64) {
        (self.occurred_at.at, self.seq)
    }

    /// This entry after one more amendment.
    ///
    /// # Errors
    /// [`FoldError`] if the replacement cannot be read, or is of another kind.
    pub fn amended(&self, by: &Entry, amendment: &EntryAmended) -> Result<Self, FoldError> {
        let mut next = self.clone();
        next.amendments.push(Amendment {
            seq: by.seq,
            actor: by.actor,
            at: by.occurred_at,
            reason: amendment.reason.clone(),
            was: (self.occurred_at, Arc::clone(&self.body)),
        });
        let inconsistent =
            |detail: &str| FoldError::Inconsistent { seq: by.seq, detail: detail.to_owned() };
        let reread = |kv: u32, value: &serde_json::Value| {
            Body::read(&amendment.target.kind, kv, value)
                .map_err(|source| FoldError::Body { seq: by.seq, source })
        };
        match &amendment.effect {
            Effect::Void(_) => next.void = true,
            Effect::Replace(replacement) => {
                next.void = false;
                next.occurred_at = replacement.occurred_at;
                next.subjects = replacement
                    .subjects
                    .iter()
                    .map(|s| Subject { kind: s.kind, id: s.id })
                    .collect();
                next.body = Arc::new(reread(replacement.kv, &replacement.body)?);
            }
            Effect::Item(change) => {
                let mut value =
                    self.body.write().map_err(|_| inconsistent("its target cannot be written"))?;
                let item = usize::try_from(change.index)
                    .ok()
                    .and_then(|index| value.get_mut("values")?.get_mut(index))
                    .ok_or_else(|| inconsistent("its target has no such value"))?;
                *item = change.value.clone();
                next.body = Arc::new(reread(change.kv, &value)?);
            }
        }
        Ok(next)
    }
}

/// The entries of one subject as they read now, in the fold's order, from its entries in the log's order.
///
/// # Errors
/// [`FoldError`].
pub fn in_force(subject: Subject, entries: &[Entry]) -> Result<Vec<Arc<InForce>>, FoldError> {
    Ok(Known::read(subject, entries)?.here)
}

/// What the entries about a subject tell.
pub(crate) struct Known {
    /// The entries in force about it, in the fold's order.
    pub(crate) here: Vec<Arc<InForce>>,
    /// Those that were about it until an amendment moved them elsewhere, as they read there.
    pub(crate) departed: Vec<Arc<InForce>>,
}

impl Known {
    /// Reads the entries of a subject, given in the log's order.
    pub(crate) fn read(subject: Subject, entries: &[Entry]) -> Result<Self, FoldError> {
        let (mut here, departed): (Vec<_>, Vec<_>) = as_they_read(entries)?
            .into_values()
            .map(Arc::new)
            .partition(|entry| entry.subjects.contains(&subject));
        here.sort_by_key(|entry| entry.order());
        Ok(Self { here, departed })
    }
}

/// Originals by their number in the log, each with all of its amendments.
fn as_they_read(entries: &[Entry]) -> Result<BTreeMap<u64, InForce>, FoldError> {
    let mut originals: BTreeMap<u64, InForce> = BTreeMap::new();
    for entry in entries {
        let read = InForce::original(entry)?;
        let Body::EntryAmended(amendment) = read.body.as_ref() else {
            originals.insert(entry.seq, read);
            continue;
        };
        let seq = amendment.target.seq;
        let before = match originals.remove(&seq) {
            Some(before) => before,
            None => moved_in(entry, amendment)?,
        };
        let after = before.amended(entry, amendment)?;
        originals.insert(seq, after);
    }
    Ok(originals)
}

/// An entry that an amendment moved to this subject from another: what it said before is not told here.
fn moved_in(by: &Entry, amendment: &EntryAmended) -> Result<InForce, FoldError> {
    let Effect::Replace(replacement) = &amendment.effect else {
        return Err(FoldError::Inconsistent {
            seq: by.seq,
            detail: "it amends an entry that is not about this subject".to_owned(),
        });
    };
    let target = &amendment.target;
    let body = Body::read(&target.kind, replacement.kv, &replacement.body)
        .map_err(|source| FoldError::Body { seq: by.seq, source })?;
    Ok(InForce {
        seq: target.seq,
        id: target.id,
        occurred_at: replacement.occurred_at,
        recorded_at: target.recorded_at,
        actor: target.actor,
        via: target.via,
        command: target.command,
        subjects: Vec::new(),
        body: Arc::new(body),
        void: false,
        amendments: Vec::new(),
    })
}

fn read(entry: &Entry) -> Result<Body, FoldError> {
    Body::read(&entry.kind, entry.kv, &entry.body)
        .map_err(|source| FoldError::Body { seq: entry.seq, source })
}
