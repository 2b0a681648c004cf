#![expect(missing_docs, missing_debug_implementations, unused_variables, clippy::pedantic, reason = "temporary")]
pub mod subject;
pub mod table;
pub mod tables;
use std::sync::Arc;
use domain::{ids::*, ledger::tree::{Frontier, Hash}, stamp::Micros};
use uuid::Uuid;
use self::{subject::*, table::Change};
pub use self::tables::{PROJECTION_VERSION, tables};
#[derive(Debug, Clone, PartialEq)]
pub struct Entry { pub seq: u64, pub id: EntryId }
impl Entry { pub fn of_bytes(bytes: &[u8]) -> Result<Entry, NotAnEntry> { Err(NotAnEntry) } }
#[derive(Debug, thiserror::Error)]
#[error("entry")]
pub struct NotAnEntry;
#[derive(Debug, Clone)]
pub struct Loaded { pub n: u64 }
#[derive(Debug, thiserror::Error)]
#[error("fold")]
pub struct FoldError;
#[derive(Debug, Clone)]
pub struct Refusal;
pub enum Stop { Need(Vec<Need>), Refused(Refusal) }
#[derive(Clone, Debug, PartialEq, Eq, Hash)]
pub enum Need { Subject(Subject), Entry(EntryId), Code(SubjectKind, String), Blob(String) }
#[derive(Clone, Debug)]
pub struct Position { pub size: u64, pub frontier: Frontier, pub last_recorded_at: Micros }
pub struct Blob { pub digest: [u8; 32], pub media_type: String, pub bytes: Vec<u8> }
pub struct DirectoryPerson { pub person: PersonId, pub login: String, pub name: String, pub password_hash: String, pub salt: Vec<u8> }
pub enum DirectoryWrite { Person(DirectoryPerson) }
pub struct Draft;
pub struct Decision { pub drafts: Vec<Draft>, pub blobs: Vec<Blob>, pub directory: Vec<DirectoryWrite> }
pub struct Sealed { pub seq: u64, pub id: EntryId, pub bytes: Vec<u8>, pub leaf_hash: Hash, pub entry: Arc<Entry> }
pub struct Appended { pub entries: Vec<Sealed>, pub changes: Vec<Change>, pub blobs: Vec<Blob>, pub directory: Vec<DirectoryWrite> }
#[derive(Debug)]
pub struct Command { pub id: CommandId, pub print: [u8; 32], pub act: Act }
#[derive(Debug)]
pub enum Act { CorrectClock(()), Other }
pub struct Desk;
impl Desk {
    pub fn new(site: SiteId) -> Self { Desk }
    pub fn put(&mut self, subject: Subject, n: u64, entries: &[Entry]) -> Result<(), FoldError> { Ok(()) }
    pub fn put_entry(&mut self, id: EntryId, entry: Option<Entry>) {}
    pub fn loaded(&self, subject: &Subject) -> Option<&Arc<Loaded>> { None }
    pub fn take(&mut self, entry: &Entry) -> Result<Vec<Change>, FoldError> { Err(FoldError) }
    pub fn lend(&mut self, subject: Subject, loaded: Arc<Loaded>) {}
    pub fn put_code(&mut self, kind: SubjectKind, code: &str, id: Option<Uuid>) {}
    pub fn put_rule_set(&mut self, digest: &str, text: &str) -> Result<(), FoldError> { Ok(()) }
    pub fn forget(&mut self, subject: &Subject) {}
    pub fn end_group(&mut self) {}
    pub fn subjects_of(&self, command: &Command) -> Vec<Subject> { vec![] }
    pub fn decide(&self, command: &Command, now: Micros, draw: &mut dyn FnMut() -> Uuid) -> Result<Decision, Stop> { Err(Stop::Refused(Refusal)) }
    pub fn append(&mut self, position: &mut Position, command: &Command, decision: Decision, now: Micros) -> Result<Appended, FoldError> { Err(FoldError) }
}
