//! What can only be checked about entries in their order.

use std::collections::{BTreeMap, HashMap};

use domain::ids::SiteId;
use domain::ledger::entry::Envelope;
use domain::ledger::note::{Checkpoint, VerifierKey};
use domain::ledger::tiles::{Edge, Tile};
use domain::ledger::tree::Hash;
use domain::stamp::Micros;
use serde_json::Value;
use uuid::Uuid;

use super::Fault;
use super::entries::Checked;
use crate::error::chain;
use crate::log::{Head, KeptHead};

pub(super) struct Walk {
    site: SiteId,
    pub(super) edge: Edge,
    /// Full tiles above the leaves so far.
    pub(super) tiles: u64,
    /// Named by the founding entry.
    pub(super) key: Option<VerifierKey>,
    /// Documents that entries name, and the first entry to do so.
    pub(super) documents: BTreeMap<Hash, u64>,
    counters: HashMap<(String, Uuid), u64>,
    last_recorded_at: Micros,
    kept: BTreeMap<u64, KeptHead>,
}

impl Walk {
    pub(super) fn new(site: SiteId) -> Self {
        Self {
            site,
            edge: Edge::default(),
            tiles: 0,
            key: None,
            documents: BTreeMap::new(),
            counters: HashMap::new(),
            last_recorded_at: Micros(i64::MIN),
            kept: BTreeMap::new(),
        }
    }

    /// Heads that left the house, to be met on the way.
    pub(super) fn expect(&mut self, kept: Vec<KeptHead>) {
        self.kept = kept.into_iter().map(|head| (head.size, head)).collect();
    }

    /// Takes the next entry; gives the tiles it fills.
    pub(super) fn take(&mut self, checked: Checked) -> Result<Vec<Tile>, Fault> {
        let Checked { stored, entry } = checked;
        let seq = self.edge.size();
        if stored.seq != seq {
            return Err(Fault::at(seq, format!("it is missing: entry {} follows", stored.seq)));
        }
        if entry.seq != seq || entry.site != self.site {
            return Err(Fault::at(seq, "it says it is another entry, or of another site"));
        }
        if entry.recorded_at < self.last_recorded_at {
            return Err(Fault::at(seq, "it was recorded before the entry before it"));
        }
        self.last_recorded_at = corrected_clock(&entry)?.unwrap_or(entry.recorded_at);
        self.count(&entry)?;
        self.note_key(&entry)?;
        self.note_documents(&entry)?;
        let tiles = self.edge.push(stored.leaf_hash);
        self.meet_kept_head()?;
        Ok(tiles)
    }

    pub(super) fn compare_tile(
        &mut self,
        computed: &Tile,
        stored: Option<&Tile>,
    ) -> Result<(), Fault> {
        self.tiles += 1;
        if stored == Some(computed) {
            return Ok(());
        }
        let id = computed.id();
        let how = if stored.is_none() { "is missing" } else { "was altered" };
        Err(Fault::of_log(format!("tile {} of level {} {how}", id.index, id.level)))
    }

    /// Compares where the walk has come to with the stored head.
    pub(super) fn finish(&self, head: &Head) -> Result<(), Fault> {
        let ours = self.edge.frontier();
        if ours.size() != head.frontier.size() {
            let what = format!(
                "the head counts {} entries, but there are {}",
                head.frontier.size(),
                ours.size()
            );
            return Err(Fault::of_log(what));
        }
        if ours != head.frontier || ours.root() != head.root {
            return Err(Fault::of_log("the head's tree is not that of the entries"));
        }
        if self.edge.size() > 0 {
            self.check_note(&head.note)?;
            if self.last_recorded_at != head.last_recorded_at {
                return Err(Fault::of_log("the head's time is not that of the last entry"));
            }
        }
        match self.kept.keys().next_back() {
            Some(size) if *size > ours.size() => Err(Fault::of_log(format!(
                "a head of {size} entries left the house, but there are fewer"
            ))),
            _ => Ok(()),
        }
    }

    fn count(&mut self, entry: &Envelope) -> Result<(), Fault> {
        for subject in &entry.subjects {
            let counter = self.counters.entry((subject.kind.clone(), subject.id)).or_default();
            *counter += 1;
            if subject.n != *counter {
                let n = *counter;
                let what = format!(
                    "it is number {} about {} {}, but {n} is due",
                    subject.n, subject.kind, subject.id
                );
                return Err(Fault::at(entry.seq, what));
            }
        }
        Ok(())
    }

    fn note_key(&mut self, entry: &Envelope) -> Result<(), Fault> {
        if entry.seq != 0 {
            return Ok(());
        }
        let body = body_of(entry)?;
        let text = |member: &str| body.get(member).and_then(Value::as_str);
        if entry.kind != "site.founded" {
            return Err(Fault::at(0, "the book does not begin with its founding"));
        }
        let key: VerifierKey = text("public_key")
            .unwrap_or_default()
            .parse()
            .map_err(|error| Fault::at(0, chain(&error)))?;
        if text("origin") != Some(key.name()) {
            return Err(Fault::at(0, "the key is not named after the book's origin"));
        }
        self.key = Some(key);
        Ok(())
    }

    fn note_documents(&mut self, entry: &Envelope) -> Result<(), Fault> {
        let members: &[&str] = match entry.kind.as_str() {
            "ruleset.adopted" => &["digest"],
            "record.issued" => &["pdf", "json"],
            _ => return Ok(()),
        };
        let body = body_of(entry)?;
        for digest in members.iter().filter_map(|m| body.get(*m)?.as_str()?.parse().ok()) {
            self.documents.entry(digest).or_insert(entry.seq);
        }
        Ok(())
    }

    fn meet_kept_head(&self) -> Result<(), Fault> {
        let Some(kept) = self.kept.get(&self.edge.size()) else { return Ok(()) };
        self.check_note(&kept.note)?;
        if kept.root == self.edge.frontier().root() {
            Ok(())
        } else {
            Err(Fault::of_log(format!(
                "the head of {} entries that left the house is another",
                kept.size
            )))
        }
    }

    /// A signed note must be by our key and say where the walk has come to.
    fn check_note(&self, note: &str) -> Result<(), Fault> {
        let Some(key) = &self.key else { return Err(Fault::of_log("no entry names a key")) };
        let signed = Checkpoint::verify(note, key)
            .map_err(|error| Fault::of_log(format!("the head's signature: {}", chain(&error))))?;
        let head = self.edge.frontier().head();
        if (signed.size, signed.root) == (head.size, head.root) {
            Ok(())
        } else {
            Err(Fault::of_log("what was signed is not the tree of the entries"))
        }
    }
}

fn body_of(entry: &Envelope) -> Result<Value, Fault> {
    entry.body().map_err(|error| Fault::at(entry.seq, chain(&error)))
}

/// What a correction of the clock says: later entries may be recorded from then on, earlier than those before.
fn corrected_clock(entry: &Envelope) -> Result<Option<Micros>, Fault> {
    if entry.kind != "clock.corrected" {
        return Ok(None);
    }
    let body = body_of(entry)?;
    let text = body.get("clock").and_then(Value::as_str).unwrap_or_default();
    Micros::parse(text).map(Some).map_err(|error| Fault::at(entry.seq, error))
}
