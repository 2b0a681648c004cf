//! The entry: what the log holds, and the exact bytes that are stored and hashed.
//!
//! The envelope is version 1. A pair of kind and body version never changes its meaning or its required members.

use serde::{Deserialize, Serialize};
use serde_json::Value;
use serde_json::value::RawValue;
use uuid::Uuid;

use super::canonical::{MAX_ENTRY_BYTES, NotCanonical, canonical, is_canonical, verify};
use crate::book::subject::{Subject, SubjectKind};
use crate::ids::{CommandId, EntryId, PersonId, SiteId};
use crate::stamp::{Micros, Stamp};

/// The envelope's version.
pub const ENVELOPE: u32 = 1;
/// The most subjects one entry may name.
pub const MAX_SUBJECTS: usize = 400;

/// One entry of a site's log.
#[derive(Clone, Debug, Deserialize, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Entry {
    /// Version of the envelope.
    pub v: u32,
    /// The log.
    pub site: SiteId,
    /// The leaf index in it: 0, 1, 2 … without gaps.
    pub seq: u64,
    /// Its own id, with all free bits random.
    pub id: EntryId,
    /// What happened: noun.past-participle.
    pub kind: String,
    /// Version of this kind's body.
    pub kv: u32,
    /// When it happened, as stated. For a laboratory result: when its sample was taken.
    pub occurred_at: Stamp,
    /// The device's clock, if typed without network.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub captured_at: Option<Stamp>,
    /// The server's clock, never earlier than the entry before.
    pub recorded_at: Micros,
    /// The command that wrote it.
    pub cause: Cause,
    /// Who.
    pub actor: Actor,
    /// Through which door.
    pub via: Via,
    /// What it is about, by kind then id.
    pub subjects: Vec<Numbered>,
    /// By kind and version.
    pub body: Value,
}

/// The command behind an entry.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Cause {
    /// The command's id: the client's idempotency key, or ours.
    pub command: CommandId,
    /// How many entries it wrote.
    pub of: u32,
    /// Which of them this is, from 1.
    pub part: u32,
    /// SHA-256 of the parsed command in canonical form, secrets left out; hexadecimal.
    pub print: String,
}

/// Who acted: written `person:` and the pseudonym, or `system`. Keys of sensors will be written `key:`.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Actor {
    /// A person.
    Person(PersonId),
    /// The program itself.
    System,
}

impl std::fmt::Display for Actor {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Person(person) => write!(f, "person:{person}"),
            Self::System => f.write_str("system"),
        }
    }
}

impl Serialize for Actor {
    fn serialize<S: serde::Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
        serializer.collect_str(self)
    }
}

impl<'de> Deserialize<'de> for Actor {
    fn deserialize<D: serde::Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
        let text = std::borrow::Cow::<'_, str>::deserialize(deserializer)?;
        match text.split_once(':') {
            None if text == "system" => Ok(Self::System),
            Some(("person", id)) => id.parse().map(Self::Person).map_err(serde::de::Error::custom),
            _ => Err(serde::de::Error::custom("an actor is `system` or `person:` and an id")),
        }
    }
}

/// Through which door an entry came.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum Via {
    /// The REST interface.
    Api,
    /// An import of older records.
    Import,
    /// A page.
    Page,
    /// A sensor.
    Sensor,
    /// The program itself.
    System,
}

/// A subject with its running number.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq, Serialize)]
#[serde(deny_unknown_fields)]
pub struct Numbered {
    /// What it is.
    pub kind: SubjectKind,
    /// Which one.
    pub id: Uuid,
    /// The how-manieth entry about it this is, from 1.
    pub n: u64,
}

impl Numbered {
    /// The subject without its number.
    pub const fn subject(&self) -> Subject {
        Subject { kind: self.kind, id: self.id }
    }
}

/// An entry as a verifier reads it: whatever newer program wrote it, with kinds, subjects and doors of its own, its
/// bytes, order, numbers and hashes can be checked.
#[derive(Clone, Debug, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Envelope {
    /// Version of the envelope.
    pub v: u32,
    /// The log.
    pub site: SiteId,
    /// The leaf index in it.
    pub seq: u64,
    /// Its own id.
    pub id: EntryId,
    /// What happened.
    pub kind: String,
    /// Version of the body.
    pub kv: u32,
    /// When it happened.
    pub occurred_at: Stamp,
    /// The device's clock.
    #[serde(default)]
    pub captured_at: Option<Stamp>,
    /// The server's clock.
    pub recorded_at: Micros,
    /// The command that wrote it.
    pub cause: Cause,
    /// Who.
    pub actor: String,
    /// Through which door.
    pub via: String,
    /// What it is about.
    pub subjects: Vec<AnySubject>,
    /// What it says, as it is written.
    pub body: Box<RawValue>,
}

/// A subject of whatever kind, with its running number.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct AnySubject {
    /// What it is.
    pub kind: String,
    /// Which one.
    pub id: Uuid,
    /// The how-manieth entry about it.
    pub n: u64,
}

impl Envelope {
    /// Reads an entry and proves that its bytes are the canonical ones.
    ///
    /// # Errors
    /// [`NotAnEntry`].
    pub fn verify_bytes(bytes: &[u8]) -> Result<Self, NotAnEntry> {
        verify(bytes)?;
        serde_json::from_slice(bytes).map_err(|e| NotAnEntry::Shape(e.to_string()))
    }

    /// What it says, read.
    ///
    /// # Errors
    /// [`NotAnEntry::Shape`], though not for bytes that were verified.
    pub fn body(&self) -> Result<Value, NotAnEntry> {
        serde_json::from_str(self.body.get()).map_err(|e| NotAnEntry::Shape(e.to_string()))
    }
}

/// Bytes that are not an entry of this log.
#[derive(Debug, thiserror::Error)]
pub enum NotAnEntry {
    /// Not in canonical form.
    #[error("the bytes are not in canonical form")]
    Form(#[from] NotCanonical),
    /// Not of the shape of an entry.
    #[error("the bytes are canonical but not an entry: {0}")]
    Shape(String),
}

impl Entry {
    /// The canonical bytes.
    ///
    /// # Errors
    /// [`NotAnEntry`] if the body holds what the ledger's form forbids, or is too long.
    pub fn to_bytes(&self) -> Result<Vec<u8>, NotAnEntry> {
        let value = serde_json::to_value(self).map_err(|e| NotAnEntry::Shape(e.to_string()))?;
        let bytes = canonical(&value)?;
        if bytes.len() > MAX_ENTRY_BYTES {
            return Err(NotAnEntry::Shape(format!(
                "{} bytes long, but an entry holds at most {MAX_ENTRY_BYTES}: put long documents beside it",
                bytes.len()
            )));
        }
        Ok(bytes)
    }

    /// Reads an entry our own store wrote.
    ///
    /// # Errors
    /// [`NotAnEntry`].
    pub fn of_bytes(bytes: &[u8]) -> Result<Self, NotAnEntry> {
        serde_json::from_slice(bytes).map_err(|e| NotAnEntry::Shape(e.to_string()))
    }

    /// Reads an entry and proves that its bytes are the canonical ones.
    ///
    /// # Errors
    /// [`NotAnEntry`].
    pub fn verify_bytes(bytes: &[u8]) -> Result<Self, NotAnEntry> {
        let value = is_canonical(bytes)?;
        serde_json::from_value(value).map_err(|e| NotAnEntry::Shape(e.to_string()))
    }

    /// The subjects without their numbers.
    pub fn subjects(&self) -> impl Iterator<Item = Subject> + '_ {
        self.subjects.iter().map(Numbered::subject)
    }
}
