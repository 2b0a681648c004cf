//! What a group has decided for one site so far, before any of it is written.

use std::collections::{HashMap, HashSet};
use std::sync::Arc;

use domain::book::command::{Act, Blob, Command, DirectoryWrite, Need};
use domain::book::subject::Subject;
use domain::book::table::{Cell, Change};
use domain::book::tables::CODE;
use domain::book::{Appended, Desk, Position, Sealed};
use domain::ids::{CommandId, EntryId};
use domain::ledger::tiles::Edge;
use domain::ledger::tree::{Hash, TreeHead};

use super::{Receipt, Tools, WriteError};
use crate::log::{self, Head, KeptHead};
use crate::projections::Pending;
use crate::sites::Site;
use crate::writes::Writes;
use crate::{Conn, StoreError, blobs, directory, read, tiles};

pub(super) struct Sheet {
    pub(super) position: Position,
    /// Subjects on the desk, all of them held against the locked counters.
    pub(super) subjects: HashSet<Subject>,
    entries: Vec<Sealed>,
    by_id: HashMap<EntryId, usize>,
    answered: HashMap<CommandId, ([u8; 32], Receipt)>,
    pending: Pending,
    blobs: Vec<Blob>,
    directory: Vec<DirectoryWrite>,
    /// Sizes of the log on which records rest that leave the house.
    issued: Vec<u64>,
}

impl Sheet {
    pub(super) fn new(head: Head) -> Self {
        let size = head.frontier.size();
        Self {
            position: Position {
                size,
                frontier: head.frontier,
                last_recorded_at: head.last_recorded_at,
            },
            subjects: HashSet::new(),
            entries: Vec::new(),
            by_id: HashMap::new(),
            answered: HashMap::new(),
            pending: Pending::default(),
            blobs: Vec::new(),
            directory: Vec::new(),
            issued: Vec::new(),
        }
    }

    /// Takes a command's entries and what follows from them.
    pub(super) fn take(
        &mut self,
        command: &Command,
        appended: Appended,
    ) -> Result<Receipt, StoreError> {
        let receipt =
            Receipt { entries: appended.entries.iter().map(|e| Arc::clone(&e.entry)).collect() };
        for sealed in appended.entries {
            self.by_id.insert(sealed.id, self.entries.len());
            self.entries.push(sealed);
        }
        self.pending.add(appended.changes)?;
        self.blobs.extend(appended.blobs);
        self.directory.extend(appended.directory);
        if let Act::Issue(issue) = &command.act {
            self.issued.push(issue.log_size);
        }
        self.answered.insert(command.id, (command.print, receipt.clone()));
        Ok(receipt)
    }

    /// The answer to a command that this group has carried out already.
    pub(super) fn answer_to(&self, command: &Command) -> Option<Result<Receipt, WriteError>> {
        let (print, receipt) = self.answered.get(&command.id)?;
        Some(if *print == command.print { Ok(receipt.clone()) } else { Err(WriteError::KeyReused) })
    }

    /// Lays on the desk what this group itself made, since the tables do not have it yet; `false` if it did not.
    pub(super) fn lay(&self, desk: &mut Desk, need: &Need) -> Result<bool, StoreError> {
        match need {
            Need::Entry(id) => {
                let Some(&index) = self.by_id.get(id) else { return Ok(false) };
                desk.put_entry(*id, Some(self.entries[index].entry.as_ref().clone()));
            }
            Need::Code(kind, code) => {
                let key = [Cell::from(kind.name()), Cell::from(code.as_str())];
                let id = match self.pending.find(CODE.name, &key) {
                    Some(Change::Put(row)) => Some(read::coded_id(row)?),
                    Some(Change::Remove { .. }) => None,
                    None => return Ok(false),
                };
                desk.put_code(*kind, code, id);
            }
            Need::Blob(digest) => {
                let named = |blob: &&Blob| Hash(blob.digest).to_string() == *digest;
                let Some(blob) = self.blobs.iter().find(named) else { return Ok(false) };
                read::lay_rule_set(desk, digest, blob.bytes.clone())?;
            }
            Need::Subject(_) => return Ok(false),
        }
        Ok(true)
    }

    /// Whether this group gives the login to somebody else.
    pub(super) fn has_login(&self, write: &DirectoryWrite) -> bool {
        let DirectoryWrite::Person(new) = write;
        self.directory.iter().any(|DirectoryWrite::Person(other)| {
            other.login == new.login && other.person != new.person
        })
    }

    /// How many entries wait to be written.
    pub(super) const fn len(&self) -> usize {
        self.entries.len()
    }

    /// Writes it all: entries, tables and the new head together, then what a group seldom has.
    pub(super) async fn write(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        edge: &mut Edge,
        tools: &Tools,
    ) -> Result<TreeHead, WriteError> {
        let head = self.position.frontier.head();
        let note =
            (tools.sign)(&site.origin, head.size, &head.root).map_err(WriteError::Unsigned)?;
        let row = Head {
            frontier: self.position.frontier.clone(),
            root: head.root,
            note,
            last_recorded_at: self.position.last_recorded_at,
        };
        let mut writes = Writes::default();
        writes.entries(&self.entries);
        self.pending.write(&mut writes);
        writes.head(&row);
        writes.send(conn, site.number).await?;
        for blob in &self.blobs {
            blobs::put(conn, site.number, blob).await?;
        }
        for write in &self.directory {
            directory::write(conn, site.number, write).await?;
        }
        for tile in self.entries.iter().flat_map(|entry| edge.push(entry.leaf_hash)) {
            tiles::put(conn, site.number, &tile).await?;
        }
        for &size in &self.issued {
            let root = tiles::root_at(conn, site.number, size).await?;
            let note = (tools.sign)(&site.origin, size, &root).map_err(WriteError::Unsigned)?;
            log::keep_head(conn, site.number, &KeptHead { size, root, note }).await?;
        }
        Ok(head)
    }
}
