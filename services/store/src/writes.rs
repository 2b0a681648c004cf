//! Writes that go to the engine in one message: most of a small group's time is waiting for answers, not writing.
//!
//! SQLite runs the statements of one text in turn. PostgreSQL takes only one statement that has values, so all but the
//! last stand in its `with` list; there no row may be written twice, which the writes of a group never do.

use domain::book::Sealed;
use domain::book::table::{Cell, CellKind, Row, Table};
use sqlx::QueryBuilder;

use crate::StoreError;
use crate::bulk::pieces;
use crate::db::{Conn, on};
use crate::log::Head;
use crate::schema::SITE;
use crate::sites::SiteNumber;

/// Values in one message at most: a PostgreSQL statement takes 65,535, and one of SQLite 32,766.
const MOST: usize = 30_000;

/// The text of a message with at most so many values is kept prepared: small groups are alike, and large ones hardly
/// ever have the same numbers of rows.
const KEPT: usize = 1_000;

/// Binds a value with the type of its column, so that an empty one has a type too.
macro_rules! push_cell {
    ($values:expr, $kind:expr, $cell:expr) => {
        match ($kind, $cell) {
            (_, Cell::Int(value)) => $values.push_bind(*value),
            (_, Cell::Text(value)) => $values.push_bind(value.as_str()),
            (_, Cell::Bytes(value)) => $values.push_bind(value.as_slice()),
            (CellKind::Int, Cell::Null) => $values.push_bind(None::<i64>),
            (CellKind::Text, Cell::Null) => $values.push_bind(None::<&str>),
            (CellKind::Bytes, Cell::Null) => $values.push_bind(None::<&[u8]>),
        }
    };
}
pub(crate) use push_cell;

/// One statement.
#[derive(Clone, Debug)]
enum Write<'a> {
    /// New entries.
    Entries(&'a [Sealed]),
    /// Rows that are there afterwards.
    Put(&'static Table, Vec<&'a Row>),
    /// Keys of rows that are not.
    Remove(&'static Table, Vec<&'a [Cell]>),
    /// The log's head, which must be there already.
    Head(&'a Head),
}

/// Statements in order, to be sent together.
#[derive(Debug, Default)]
pub(crate) struct Writes<'a>(Vec<Write<'a>>);

impl<'a> Writes<'a> {
    /// New entries of the log.
    pub(crate) fn entries(&mut self, entries: &'a [Sealed]) {
        self.0.extend(pieces(entries).map(Write::Entries));
    }

    /// Rows that are there afterwards, whatever was there before.
    pub(crate) fn put(&mut self, table: &'static Table, rows: &[&'a Row]) {
        self.0.extend(pieces(rows).map(|piece| Write::Put(table, piece.to_vec())));
    }

    /// Rows that are not there any more, by their whole keys.
    pub(crate) fn remove(&mut self, table: &'static Table, keys: &[&'a [Cell]]) {
        self.0.extend(pieces(keys).map(|piece| Write::Remove(table, piece.to_vec())));
    }

    /// How far the log has come, for a head that is held under the lock.
    pub(crate) fn head(&mut self, head: &'a Head) {
        self.0.push(Write::Head(head));
    }

    /// Sends everything, in as few messages as the engines take.
    ///
    /// # Errors
    /// [`StoreError::Database`].
    pub(crate) async fn send(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
    ) -> Result<(), StoreError> {
        let mut rest = self.0.as_slice();
        while !rest.is_empty() {
            let mut values = 0;
            let fits = |write: &&Write<'_>| {
                values += write.values();
                values <= MOST
            };
            let (together, later) = rest.split_at(rest.iter().take_while(fits).count().max(1));
            send(conn, site, together).await?;
            rest = later;
        }
        Ok(())
    }
}

impl Write<'_> {
    /// How many values it has.
    const fn values(&self) -> usize {
        match self {
            Self::Entries(entries) => entries.len() * 4,
            Self::Put(table, rows) => rows.len() * (table.columns.len() + 1),
            Self::Remove(table, keys) => keys.len() * table.key + 1,
            Self::Head(_) => 6,
        }
    }
}

/// Puts a write's text and values into a statement; the body is compiled once per engine.
macro_rules! push_write {
    ($query:expr, $site:expr, $write:expr) => {
        match $write {
            Write::Entries(entries) => {
                $query.push("insert into entry (site, seq, bytes, leaf_hash) ");
                $query.push_values(*entries, |mut values, entry| {
                    values
                        .push_bind($site.0)
                        .push_bind(entry.seq.cast_signed())
                        .push_bind(entry.bytes.as_slice())
                        .push_bind(entry.leaf_hash.as_bytes().as_slice());
                });
            }
            Write::Put(table, rows) => {
                $query.push(insertion(table));
                $query.push_values(rows, |mut values, row| {
                    values.push_bind($site.0);
                    for (column, cell) in table.columns.iter().zip(&row.cells) {
                        push_cell!(values, column.kind, cell);
                    }
                });
                $query.push(on_conflict(table));
            }
            Write::Remove(table, keys) => {
                let columns = &table.columns[..table.key];
                $query.push(format!("delete from {} where {SITE} = ", table.name));
                $query.push_bind($site.0).push(format!(" and ({}) in (", names(columns)));
                $query.push_values(keys, |mut values, key| {
                    for (column, cell) in columns.iter().zip(*key) {
                        push_cell!(values, column.kind, cell);
                    }
                });
                $query.push(")");
            }
            Write::Head(head) => {
                $query.push("update log_head set size = ");
                $query.push_bind(head.frontier.size().cast_signed()).push(", frontier = ");
                $query.push_bind(head.frontier.to_bytes()).push(", root = ");
                $query.push_bind(head.root.as_bytes().as_slice()).push(", note = ");
                $query.push_bind(head.note.as_str()).push(", last_recorded_at = ");
                $query.push_bind(head.last_recorded_at.0).push(" where site = ");
                $query.push_bind($site.0);
            }
        }
    };
}

async fn send(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    writes: &[Write<'_>],
) -> Result<(), StoreError> {
    let one_statement = matches!(conn, Conn::Postgres(_));
    let last = writes.len().saturating_sub(1);
    let values: usize = writes.iter().map(Write::values).sum();
    on!(conn, |c| {
        let mut query = QueryBuilder::new("");
        for (index, write) in writes.iter().enumerate() {
            if one_statement && index < last {
                query.push(if index == 0 { "with " } else { ", " });
                query.push(format!("w{index} as ("));
                push_write!(query, site, write);
                query.push(")");
            } else {
                query.push(if index == 0 {
                    ""
                } else if one_statement {
                    " "
                } else {
                    "; "
                });
                push_write!(query, site, write);
            }
        }
        query.build().persistent(values <= KEPT).execute(c).await?;
    });
    Ok(())
}

fn names(columns: &[domain::book::table::Column]) -> String {
    columns.iter().map(|column| column.name).collect::<Vec<_>>().join(", ")
}

fn insertion(table: &Table) -> String {
    format!("insert into {} ({SITE}, {}) ", table.name, names(table.columns))
}

fn on_conflict(table: &Table) -> String {
    let (key, rest) = table.columns.split_at(table.key);
    let sets: Vec<String> =
        rest.iter().map(|c| format!("{name} = excluded.{name}", name = c.name)).collect();
    let action = if sets.is_empty() {
        "do nothing".to_owned()
    } else {
        format!("do update set {}", sets.join(", "))
    };
    format!(" on conflict ({SITE}, {}) {action}", names(key))
}
