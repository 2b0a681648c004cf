//! What answers have in common: entries as people and programs read them.

use std::sync::Arc;

use domain::ledger::entry::Entry;
use serde::Serialize;
use serde_json::Value;
use store::writer::Receipt;
use utoipa::ToSchema;
use uuid::Uuid;

/// An entry of the log, as it was written. Its exact bytes are at `/v1/sites/{site}/ledger/entries`.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct EntryView {
    /// Its id.
    pub(crate) id: Uuid,
    /// Its number in the log, from 0.
    pub(crate) seq: u64,
    /// What happened, noun.past-participle.
    #[schema(example = "reading.taken")]
    pub(crate) kind: String,
    /// Version of the body.
    pub(crate) kv: u32,
    /// When it happened, with the wall clock's offset.
    #[schema(format = DateTime)]
    pub(crate) occurred_at: String,
    /// When it was recorded, by the server's clock.
    #[schema(format = DateTime)]
    pub(crate) recorded_at: String,
    /// Who: a person's pseudonym, or `system`.
    pub(crate) actor: String,
    /// What it is about, each with its own running number n.
    pub(crate) subjects: Vec<SubjectView>,
    /// What it says, by kind.
    #[schema(value_type = Object)]
    pub(crate) body: Value,
}

/// A subject of an entry.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct SubjectView {
    /// What it is.
    #[schema(example = "batch")]
    pub(crate) kind: &'static str,
    /// Which one.
    pub(crate) id: Uuid,
    /// The how-manieth entry about it.
    pub(crate) n: u64,
}

impl From<&Entry> for EntryView {
    fn from(entry: &Entry) -> Self {
        Self {
            id: entry.id.0,
            seq: entry.seq,
            kind: entry.kind.clone(),
            kv: entry.kv,
            occurred_at: entry.occurred_at.to_string(),
            recorded_at: entry.recorded_at.to_string(),
            actor: entry.actor.to_string(),
            subjects: entry
                .subjects
                .iter()
                .map(|subject| SubjectView {
                    kind: subject.kind.name(),
                    id: subject.id,
                    n: subject.n,
                })
                .collect(),
            body: entry.body.clone(),
        }
    }
}

/// What a command wrote. A repeat with the same key gives the same answer for ever.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct Recorded {
    /// The id of what was made or changed: a batch, a lot, a deviation …
    pub(crate) id: Uuid,
    /// The entries, in order; none if everything was so already.
    pub(crate) entries: Vec<EntryView>,
}

impl Recorded {
    /// The answer for a receipt; the id is a member of the first entry's body, or else the one asked about.
    pub(crate) fn of(receipt: &Receipt, member: &str, otherwise: Uuid) -> Self {
        let id = receipt.entries.first().and_then(|entry| id_in(entry, member));
        Self { id: id.unwrap_or(otherwise), entries: entries(receipt) }
    }

    /// The answer for something that is its own first entry.
    pub(crate) fn entry(receipt: &Receipt) -> Self {
        let id = receipt.entries.first().map(|entry| entry.id.0).unwrap_or_default();
        Self { id, entries: entries(receipt) }
    }
}

fn entries(receipt: &Receipt) -> Vec<EntryView> {
    receipt.entries.iter().map(|entry| EntryView::from(entry.as_ref())).collect()
}

/// An id that a body names.
pub(crate) fn id_in(entry: &Arc<Entry>, member: &str) -> Option<Uuid> {
    entry.body.get(member)?.as_str()?.parse().ok()
}

/// A list, newest first.
#[derive(Clone, Debug, Serialize, ToSchema)]
pub(crate) struct Listed<T> {
    /// Its items.
    pub(crate) items: Vec<T>,
}
