//! Projections against the log: makes them anew, or says where they differ from a fresh replay.
//!
//! The replay holds the whole book in memory, once as states and once as rows.

use std::collections::BTreeMap;
use std::fmt::{self, Write as _};

use domain::book::Desk;
use domain::book::table::{Cell, Change, Row, Table};
use domain::book::tables::COMMAND;
use domain::book::tables::tables;
use domain::ledger::entry::Entry;
use domain::ledger::tree::Hash;

use crate::error::chain;
use crate::projections::{Pending, clear};
use crate::rows::Select;
use crate::sites::Site;
use crate::writes::Writes;
use crate::{Conn, Db, StoreError, log};

/// Entries fetched at a time.
const PAGE: i64 = 2_000;

/// One row that is not what a replay makes of it.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Difference {
    /// The table.
    pub table: &'static str,
    /// The row's key within the site.
    pub key: Vec<Cell>,
    /// How it differs.
    pub what: How,
}

/// How a row differs.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum How {
    /// The replay makes it, but the table does not have it.
    Missing,
    /// The table has it, but the replay does not make it.
    Extra,
    /// These columns hold something else.
    Differs(Vec<&'static str>),
}

impl fmt::Display for Difference {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let key: Vec<String> = self.key.iter().map(shown).collect();
        write!(f, "{} ({}): ", self.table, key.join(", "))?;
        match &self.what {
            How::Missing => f.write_str("missing"),
            How::Extra => f.write_str("nothing in the log makes this row"),
            How::Differs(columns) => write!(f, "{} differs", columns.join(", ")),
        }
    }
}

/// A cell for people; ids as such.
fn shown(cell: &Cell) -> String {
    match cell {
        Cell::Null => "-".to_owned(),
        Cell::Int(value) => value.to_string(),
        Cell::Text(text) => text.clone(),
        Cell::Bytes(bytes) => match uuid::Uuid::from_slice(bytes) {
            Ok(id) => id.to_string(),
            Err(_) => hexadecimal(bytes),
        },
    }
}

fn hexadecimal(bytes: &[u8]) -> String {
    bytes.iter().fold(String::new(), |mut text, byte| {
        let _ = write!(text, "{byte:02x}");
        text
    })
}

/// Every row that differs from a fresh replay of a site's log; none if all is well.
///
/// # Errors
/// [`StoreError`], also if the log cannot be folded.
pub async fn check(db: &Db, site: &Site) -> Result<Vec<Difference>, StoreError> {
    let mut snapshot = db.snapshot().await?;
    let mut conn = snapshot.conn();
    let replayed = replay(&mut conn, site).await?;
    let mut differences = Vec::new();
    for table in tables() {
        let stored = Select::of(table).fetch(&mut conn, site.number).await?;
        compare(table, replayed.rows(table.name), &stored, &mut differences);
    }
    snapshot.rollback().await?;
    Ok(differences)
}

/// Empties a site's projections and fills them from its log, while nobody else writes to it.
///
/// # Errors
/// [`StoreError`]; then nothing has changed.
pub async fn rebuild(db: &Db, site: &Site) -> Result<(), StoreError> {
    let mut tx = db.begin().await?;
    log::lock_head(&mut tx.conn(), site.number).await?;
    rewrite(&mut tx.conn(), site).await?;
    tx.commit().await
}

pub(crate) async fn rewrite(conn: &mut Conn<'_>, site: &Site) -> Result<(), StoreError> {
    for table in tables() {
        clear(conn, site.number, table).await?;
    }
    let made = replay(conn, site).await?;
    let mut writes = Writes::default();
    made.write(&mut writes);
    writes.send(conn, site.number).await
}

/// What the whole log makes of empty tables.
async fn replay(conn: &mut Conn<'_>, site: &Site) -> Result<Pending, StoreError> {
    let mut desk = Desk::new(site.id);
    let mut made = Pending::default();
    let mut next = 0;
    loop {
        let page = log::entries(conn, site.number, next, PAGE).await?;
        let Some(last) = page.last() else { break };
        next = last.seq + 1;
        for stored in &page {
            made.add(take(&mut desk, &stored.entry()?)?)?;
        }
    }
    Ok(made)
}

fn take(desk: &mut Desk, entry: &Entry) -> Result<Vec<Change>, StoreError> {
    let odd = |error| StoreError::inconsistent(chain(&error));
    for subject in entry.subjects() {
        if desk.loaded(&subject).is_none() {
            desk.put(subject, &[]).map_err(odd)?;
        }
    }
    let mut changes = desk.take(entry).map_err(odd)?;
    if entry.cause.part == 1 {
        changes.push(Change::Put(command_row(entry)?));
    }
    Ok(changes)
}

/// The row of a command, from the first of its entries.
fn command_row(entry: &Entry) -> Result<Row, StoreError> {
    let print: Hash = entry
        .cause
        .print
        .parse()
        .map_err(|_| StoreError::inconsistent(format!("entry {} has no print", entry.seq)))?;
    let cells = vec![
        entry.cause.command.0.into(),
        log::signed(entry.seq)?.into(),
        i64::from(entry.cause.of).into(),
        print.as_bytes().as_slice().into(),
    ];
    Ok(Row { table: &COMMAND, cells })
}

fn compare<'a>(
    table: &'static Table,
    made: impl Iterator<Item = &'a Row>,
    stored: &[Row],
    differences: &mut Vec<Difference>,
) {
    let mut stored: BTreeMap<&[Cell], &Row> = stored.iter().map(|row| (row.key(), row)).collect();
    let mut differs = |key: &[Cell], what| {
        differences.push(Difference { table: table.name, key: key.to_vec(), what });
    };
    for row in made {
        match stored.remove(row.key()) {
            None => differs(row.key(), How::Missing),
            Some(found) if found != row => differs(row.key(), How::Differs(columns(row, found))),
            Some(_) => {}
        }
    }
    for key in stored.keys() {
        differs(key, How::Extra);
    }
}

fn columns(made: &Row, found: &Row) -> Vec<&'static str> {
    let pairs = made.cells.iter().zip(&found.cells).zip(made.table.columns);
    pairs.filter(|((a, b), _)| a != b).map(|(_, column)| column.name).collect()
}
