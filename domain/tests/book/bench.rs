//! A book kept in memory: a desk, the log it appends to, and tables made of nothing but the changes it reports. What
//! the desk asks for is answered from the log and the tables, as a store would.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use domain::book::command::{Act, Command, Need, Refusal, Stop};
use domain::book::role::Role;
use domain::book::subject::{Subject, SubjectKind};
use domain::book::table::{Cell, CellKind, Change, Row};
use domain::book::{Desk, Position, sha256_hex};
use domain::ids::{CommandId, PersonId, SiteId};
use domain::ledger::entry::{Actor, Entry, Via};
use domain::stamp::{Micros, Stamp};
use sha2::{Digest, Sha256};
use uuid::Uuid;

/// A person with the roles that the person has just now.
#[derive(Clone, Debug)]
pub(crate) struct Who {
    pub(crate) person: PersonId,
    pub(crate) roles: BTreeSet<Role>,
}

/// Rows by table name and key, each with all of its cells.
pub(crate) type Tables = BTreeMap<(&'static str, Vec<Cell>), Vec<Cell>>;

/// See the module.
#[derive(Clone, Debug)]
pub(crate) struct Ledger {
    pub(crate) desk: Desk,
    pub(crate) log: Vec<Arc<Entry>>,
    pub(crate) tables: Tables,
    /// Whoever reads the log later must find it readable: the bytes as they were hashed.
    pub(crate) bytes: Vec<Vec<u8>>,
    /// Names rows of subjects by their place in the log.
    by_subject: BTreeMap<Subject, Vec<usize>>,
    texts: BTreeMap<String, String>,
    pub(crate) position: Position,
    pub(crate) clock: Micros,
    drawn: u64,
    /// The running number that the next command expects of a subject.
    pub(crate) expects: Option<(Subject, u64)>,
}

impl Ledger {
    pub(crate) fn new(site: SiteId, clock: Micros) -> Self {
        Self {
            desk: Desk::new(site),
            log: Vec::new(),
            tables: Tables::new(),
            bytes: Vec::new(),
            by_subject: BTreeMap::new(),
            texts: BTreeMap::new(),
            position: Position::start(),
            clock,
            drawn: 0,
            expects: None,
        }
    }

    /// The next id: a version 7 UUID of the clock and a counter, the same in every run.
    pub(crate) fn id<T: From<Uuid>>(&mut self) -> T {
        drawn_id(self.clock, &mut self.drawn).into()
    }

    /// Asks, loads what is missing, asks again, and appends what was decided.
    pub(crate) fn ask(&mut self, who: &Who, act: Act) -> Result<Vec<Arc<Entry>>, Refusal> {
        let command = Command {
            id: self.id::<CommandId>(),
            print: Sha256::digest(format!("{act:?}")).into(),
            actor: Actor::Person(who.person),
            roles: who.roles.clone(),
            via: Via::Api,
            expects: self.expects.take(),
            act,
        };
        let now = self.clock.max(self.position.last_recorded_at);
        let decision = loop {
            let mut drawn = self.drawn;
            let found = self.desk.decide(&command, now, &mut || drawn_id(self.clock, &mut drawn));
            match found {
                Ok(decision) => {
                    self.drawn = drawn;
                    break decision;
                }
                Err(Stop::Refused(refusal)) => {
                    self.desk.end_group();
                    return Err(refusal);
                }
                Err(Stop::Need(needs)) => {
                    for need in needs {
                        self.answer(need);
                    }
                }
            }
        };
        for blob in &decision.blobs {
            let text = String::from_utf8_lossy(&blob.bytes).into_owned();
            assert_eq!(sha256_hex(&blob.bytes), sha256_of(&blob.digest));
            self.texts.insert(sha256_of(&blob.digest), text);
        }
        let appended = self.desk.append(&mut self.position, &command, decision, now).unwrap();
        for sealed in &appended.entries {
            self.note(&sealed.entry);
            self.bytes.push(sealed.bytes.clone());
        }
        apply(&mut self.tables, appended.changes);
        self.desk.end_group();
        Ok(appended.entries.into_iter().map(|sealed| sealed.entry).collect())
    }

    /// Lays on the desk what it asked for.
    fn answer(&mut self, need: Need) {
        match need {
            Need::Subject(subject) => {
                let entries = self.entries_of(subject, usize::MAX);
                self.desk.put(subject, &entries).unwrap();
            }
            Need::Entry(id) => {
                let found = self.log.iter().find(|entry| entry.id == id);
                self.desk.put_entry(id, found.map(|entry| entry.as_ref().clone()));
            }
            Need::Code(kind, code) => {
                let id = self.coded(kind, &code);
                self.desk.put_code(kind, &code, id);
            }
            Need::Blob(digest) => {
                self.desk.put_rule_set(&digest, &self.texts[&digest]).unwrap();
            }
        }
    }

    fn note(&mut self, entry: &Arc<Entry>) {
        let place = self.log.len();
        for numbered in &entry.subjects {
            let places = self.by_subject.entry(numbered.subject()).or_default();
            places.push(place);
            assert_eq!(numbered.n, count(places), "{} skips a number", numbered.subject());
        }
        self.log.push(Arc::clone(entry));
    }

    /// Every subject there are entries about.
    pub(crate) fn subjects(&self) -> impl Iterator<Item = Subject> + '_ {
        self.by_subject.keys().copied()
    }

    /// The entries about a subject below this number of the log, in the log's order.
    pub(crate) fn entries_of(&self, subject: Subject, below: usize) -> Vec<Entry> {
        let places = self.by_subject.get(&subject).map_or(&[][..], Vec::as_slice);
        let seen = places.iter().take_while(|place| **place < below);
        seen.map(|place| self.log[*place].as_ref().clone()).collect()
    }

    /// Which subject a code names.
    pub(crate) fn coded(&self, kind: SubjectKind, code: &str) -> Option<Uuid> {
        let key = ("code", vec![Cell::from(kind.name()), Cell::from(code)]);
        self.tables.get(&key).map(|cells| match &cells[2] {
            Cell::Bytes(id) => Uuid::from_slice(id).unwrap(),
            other => panic!("a code names {other:?}"),
        })
    }

    /// The cells of a row that must be there.
    pub(crate) fn row(&self, table: &'static str, key: Vec<Cell>) -> &[Cell] {
        self.tables.get(&(table, key)).unwrap_or_else(|| panic!("{table} has no such row"))
    }

    /// A desk on which nothing lies, over the same log.
    pub(crate) fn forget_everything(&mut self) {
        self.desk = Desk::new(self.desk.site_id());
    }
}

/// Puts and removes rows, each of which must fit its table.
pub(crate) fn apply(tables: &mut Tables, changes: Vec<Change>) {
    for change in changes {
        match change {
            Change::Put(row) => {
                fits(&row);
                tables.insert((row.table.name, row.key().to_vec()), row.cells);
            }
            Change::Remove { table, key } => {
                let was = tables.remove(&(table.name, key.clone()));
                assert!(was.is_some(), "{} never had {key:?}, which is removed", table.name);
            }
        }
    }
}

fn fits(row: &Row) {
    let table = row.table;
    assert_eq!(row.cells.len(), table.columns.len(), "{}", table.name);
    for (cell, column) in row.cells.iter().zip(table.columns) {
        let fits = match (cell, column.kind) {
            (Cell::Null, _) => column.nullable,
            (Cell::Int(_), CellKind::Int)
            | (Cell::Text(_), CellKind::Text)
            | (Cell::Bytes(_), CellKind::Bytes) => true,
            _ => false,
        };
        assert!(fits, "{}.{} cannot hold {cell:?}", table.name, column.name);
    }
}

fn drawn_id(clock: Micros, drawn: &mut u64) -> Uuid {
    *drawn += 1;
    let digest = Sha256::digest(drawn.to_be_bytes());
    let random: [u8; 10] = digest[..10].try_into().unwrap();
    let millis = u64::try_from(clock.0 / 1_000).unwrap();
    uuid::Builder::from_unix_timestamp_millis(millis, &random).into_uuid()
}

pub(crate) fn count<T>(list: &[T]) -> u64 {
    u64::try_from(list.len()).unwrap()
}

fn sha256_of(digest: &[u8]) -> String {
    use std::fmt::Write as _;
    digest.iter().fold(String::new(), |mut text, byte| {
        write!(text, "{byte:02x}").unwrap();
        text
    })
}

/// A time of the invented autumn of 2025 in California, such as `09-13 11:00`.
pub(crate) fn at(text: &str) -> Stamp {
    let (day, time) = text.split_once(' ').unwrap();
    Stamp::parse(&format!("2025-{day}T{time}:00-07:00")).unwrap()
}
