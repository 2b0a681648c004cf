//! Oversight: signatures, deviations, amendments, issued records.

use serde::{Deserialize, Serialize};
use serde_json::Value;

use crate::book::subject::SubjectKind;
use crate::checks::Finding;
use crate::ids::{BatchId, CommandId, DeviationId, EntryId, ProposalId};
use crate::ledger::entry::{Actor, Via};
use crate::stamp::{Micros, Stamp};

/// `signoff.given`.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct SignoffGiven {
    /// The entry it is about.
    pub target: EntryId,
    /// Its number in the log.
    pub target_seq: u64,
    /// The proposal, if it is one.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub proposal: Option<ProposalId>,
    /// `performed`, `reviewed`, `approved the exception`, `released`.
    pub meaning: String,
    /// SHA-256 of the canonical {what was shown}, hexadecimal.
    pub binds: String,
    /// Why.
    pub reason: String,
    /// Until when it holds.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub valid_until: Option<Stamp>,
    /// The site is single-handed and the signer's own proposal was signed.
    #[serde(skip_serializing_if = "std::ops::Not::not", default)]
    pub single_person: bool,
}

/// `deviation.opened`.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct DeviationOpened {
    /// Which.
    pub deviation: DeviationId,
    /// Our code, unique in the site.
    pub code: String,
    /// What happened, in a line.
    pub title: String,
    /// The batch, if it concerns one.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub batch: Option<BatchId>,
    /// The entry that opened it, if one did.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub entry: Option<EntryId>,
    /// What was found.
    #[serde(skip_serializing_if = "Vec::is_empty", default)]
    pub findings: Vec<Finding>,
}

/// `deviation.resolved`: signed by whoever resolves it.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct DeviationResolved {
    /// Which.
    pub deviation: DeviationId,
    /// Why it happened.
    pub cause: String,
    /// What was done about it.
    pub action: String,
    /// What it means for the batch.
    pub conclusion: String,
    /// SHA-256 of the canonical deviation as shown, hexadecimal.
    pub binds: String,
}

/// The original entry an amendment is about.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Target {
    /// Its id.
    pub id: EntryId,
    /// Its number in the log.
    pub seq: u64,
    /// Its kind.
    pub kind: String,
    /// Version of its body.
    pub kv: u32,
    /// Who wrote it.
    pub actor: Actor,
    /// Through which door.
    pub via: Via,
    /// The command that wrote it.
    pub command: CommandId,
    /// When.
    pub recorded_at: Micros,
}

/// `entry.amended`.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct EntryAmended {
    /// Always an original entry.
    pub target: Target,
    /// What the amendment does to it.
    pub effect: Effect,
    /// Why.
    pub reason: String,
}

/// What an amendment does.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(rename_all = "snake_case", deny_unknown_fields)]
pub enum Effect {
    /// One value of a reading or series reads like this.
    Item(ItemChange),
    /// The whole entry reads like this.
    Replace(Replacement),
    /// It did not happen.
    Void(VoidMark),
}

/// One value of several.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct ItemChange {
    /// Which, from 0.
    pub index: u32,
    /// Version of the body that the value is written in.
    pub kv: u32,
    /// How it reads.
    pub value: Value,
}

/// An empty object.
#[derive(Clone, Copy, Debug, Default, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct VoidMark {}

/// How an amended entry reads.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Replacement {
    /// When it happened.
    pub occurred_at: Stamp,
    /// What it is about.
    pub subjects: Vec<About>,
    /// Version of the body.
    pub kv: u32,
    /// The body, of the same kind.
    pub body: Value,
}

/// A subject of an amended entry; its number stays the amendment's own.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct About {
    /// What it is.
    pub kind: SubjectKind,
    /// Which one.
    pub id: uuid::Uuid,
}

/// `record.issued`: with the batch's running number it shows which entries precede it.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct RecordIssued {
    /// Of which batch.
    pub batch: BatchId,
    /// The batch's running number that the record reaches up to.
    pub batch_n: u64,
    /// The log's size it was made from.
    pub log_size: u64,
    /// SHA-256 of the PDF, hexadecimal.
    pub pdf: String,
    /// SHA-256 of the JSON record, hexadecimal.
    pub json: String,
    /// SHA-256 over the list of the entries' leaf hashes, hexadecimal.
    pub entries: String,
    /// To whom.
    pub to: String,
}
