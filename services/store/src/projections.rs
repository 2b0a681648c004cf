//! Writes what entries change in the projection tables: a whole group at a time, one statement per table.

use std::collections::BTreeMap;

use sqlx::QueryBuilder;

use crate::StoreError;
use crate::bulk::pieces;
use crate::contract::table::{Cell, CellKind, Change, Row, Table};
use crate::db::{Conn, on};
use crate::schema::SITE;
use crate::sites::SiteNumber;

/// The changes of a group: of several to one row, the last counts.
#[derive(Debug, Default)]
pub(crate) struct Pending {
    tables: BTreeMap<&'static str, (&'static Table, BTreeMap<Vec<Cell>, Option<Row>>)>,
}

impl Pending {
    /// Adds changes after those already there.
    ///
    /// # Errors
    /// [`StoreError::Inconsistent`] if a row does not fit its table.
    pub(crate) fn add(
        &mut self,
        changes: impl IntoIterator<Item = Change>,
    ) -> Result<(), StoreError> {
        for change in changes {
            let (table, key, row) = match change {
                Change::Put(row) => (row.table, checked_key(&row)?, Some(row)),
                Change::Remove { table, key } => (table, key, None),
            };
            self.tables
                .entry(table.name)
                .or_insert_with(|| (table, BTreeMap::new()))
                .1
                .insert(key, row);
        }
        Ok(())
    }

    /// What the group made of one row: `None` if it did not touch it, `Some(None)` if it removed it.
    pub(crate) fn find(&self, table: &str, key: &[Cell]) -> Option<Option<&Row>> {
        self.tables.get(table)?.1.get(key).map(Option::as_ref)
    }

    /// Every row there is, by table and key: what a replay from an empty book leaves.
    pub(crate) fn rows(&self, table: &str) -> impl Iterator<Item = &Row> {
        self.tables.get(table).into_iter().flat_map(|(_, rows)| rows.values().flatten())
    }

    /// Writes everything.
    ///
    /// # Errors
    /// [`StoreError::Database`].
    pub(crate) async fn write(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
    ) -> Result<(), StoreError> {
        for (table, rows) in self.tables.values() {
            let put: Vec<&Row> = rows.values().flatten().collect();
            for piece in pieces(&put) {
                upsert(conn, site, table, piece).await?;
            }
            let removed: Vec<&[Cell]> = rows
                .iter()
                .filter(|(_, row)| row.is_none())
                .map(|(key, _)| key.as_slice())
                .collect();
            for piece in pieces(&removed) {
                remove(conn, site, table, piece).await?;
            }
        }
        Ok(())
    }
}

/// Empties one table for a site.
pub(crate) async fn clear(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    table: &Table,
) -> Result<(), StoreError> {
    let text = format!("delete from {} where {SITE} = $1", table.name);
    on!(conn, |c| sqlx::query(sqlx::AssertSqlSafe(text)).bind(site.0).execute(c).await.map(drop))?;
    Ok(())
}

fn checked_key(row: &Row) -> Result<Vec<Cell>, StoreError> {
    let fits = |(cell, column): (&Cell, &crate::contract::table::Column)| match (cell, column.kind)
    {
        (Cell::Null, _) => column.nullable,
        (Cell::Int(_), CellKind::Int)
        | (Cell::Text(_), CellKind::Text)
        | (Cell::Bytes(_), CellKind::Bytes) => true,
        _ => false,
    };
    let columns = row.table.columns;
    if row.cells.len() != columns.len() || !row.cells.iter().zip(columns).all(fits) {
        return Err(StoreError::inconsistent(format!(
            "a row of {} does not fit: {row:?}",
            row.table.name
        )));
    }
    Ok(row.key().to_vec())
}

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

async fn upsert(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    table: &Table,
    rows: &[&Row],
) -> Result<(), StoreError> {
    let names: Vec<&str> = table.columns.iter().map(|c| c.name).collect();
    on!(conn, |c| {
        let mut query = QueryBuilder::new(format!(
            "insert into {} ({SITE}, {}) ",
            table.name,
            names.join(", ")
        ));
        query.push_values(rows, |mut values, row| {
            values.push_bind(site.0);
            for (column, cell) in table.columns.iter().zip(&row.cells) {
                push_cell!(values, column.kind, cell);
            }
        });
        query.push(on_conflict(table)).build().execute(c).await?;
    });
    Ok(())
}

fn on_conflict(table: &Table) -> String {
    let (key, rest) = table.columns.split_at(table.key);
    let key: Vec<&str> = key.iter().map(|c| c.name).collect();
    let sets: Vec<String> =
        rest.iter().map(|c| format!("{name} = excluded.{name}", name = c.name)).collect();
    let action = if sets.is_empty() {
        "do nothing".to_owned()
    } else {
        format!("do update set {}", sets.join(", "))
    };
    format!(" on conflict ({SITE}, {}) {action}", key.join(", "))
}

async fn remove(
    conn: &mut Conn<'_>,
    site: SiteNumber,
    table: &Table,
    keys: &[&[Cell]],
) -> Result<(), StoreError> {
    let columns = &table.columns[..table.key];
    let names: Vec<&str> = columns.iter().map(|c| c.name).collect();
    on!(conn, |c| {
        let mut query = QueryBuilder::new(format!("delete from {} where {SITE} = ", table.name));
        query.push_bind(site.0).push(format!(" and ({}) in (", names.join(", ")));
        query.push_values(keys, |mut values, key| {
            for (column, cell) in columns.iter().zip(*key) {
                push_cell!(values, column.kind, cell);
            }
        });
        query.push(")").build().execute(c).await?;
    });
    Ok(())
}
