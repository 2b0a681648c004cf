//! Writes what entries change in the projection tables: a whole group at a time, one statement per table.

use std::collections::BTreeMap;

use domain::book::table::{Cell, CellKind, Change, Column, Row, Table};
use domain::book::tables::tables;
use sqlx::QueryBuilder;

use crate::StoreError;
use crate::bulk::pieces;
use crate::db::{Conn, on};
use crate::schema::SITE;
use crate::sites::SiteNumber;

/// The changes of a group: of several to one row, the last counts.
#[derive(Debug, Default)]
pub(crate) struct Pending {
    tables: BTreeMap<&'static str, BTreeMap<Vec<Cell>, Change>>,
}

impl Pending {
    /// Adds changes after those already there.
    ///
    /// # Errors
    /// [`StoreError::Inconsistent`] if a row does not fit its table, or the table is none of the book's.
    pub(crate) fn add(
        &mut self,
        changes: impl IntoIterator<Item = Change>,
    ) -> Result<(), StoreError> {
        for change in changes {
            let (table, key) = match &change {
                Change::Put(row) => (row.table, checked_key(row)?),
                Change::Remove { table, key } => (*table, key.clone()),
            };
            if !self.tables.contains_key(table.name) && !tables().contains(&table) {
                return Err(StoreError::inconsistent(format!("no table {} is kept", table.name)));
            }
            self.tables.entry(table.name).or_default().insert(key, change);
        }
        Ok(())
    }

    /// What the group did to one row, if anything.
    pub(crate) fn find(&self, table: &str, key: &[Cell]) -> Option<&Change> {
        self.tables.get(table)?.get(key)
    }

    /// The rows that are there afterwards.
    pub(crate) fn rows(&self, table: &str) -> impl Iterator<Item = &Row> {
        self.tables.get(table).into_iter().flat_map(BTreeMap::values).filter_map(row_of)
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
        for table in tables() {
            let Some(changes) = self.tables.get(table.name) else { continue };
            let put: Vec<&Row> = changes.values().filter_map(row_of).collect();
            for piece in pieces(&put) {
                upsert(conn, site, table, piece).await?;
            }
            let gone = changes.iter().filter(|(_, change)| row_of(change).is_none());
            let gone: Vec<&[Cell]> = gone.map(|(key, _)| key.as_slice()).collect();
            for piece in pieces(&gone) {
                remove(conn, site, table, piece).await?;
            }
        }
        Ok(())
    }
}

const fn row_of(change: &Change) -> Option<&Row> {
    match change {
        Change::Put(row) => Some(row),
        Change::Remove { .. } => None,
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
    let fits = |(cell, column): (&Cell, &Column)| match (cell, column.kind) {
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

#[cfg(test)]
mod tests {
    use domain::book::tables::SETTING;

    use super::*;

    static STRAY: Table = Table { name: "stray", columns: SETTING.columns, key: 1, indexes: &[] };

    fn put(table: &'static Table, cells: Vec<Cell>) -> Change {
        Change::Put(Row { table, cells })
    }

    #[test]
    fn of_several_changes_to_a_row_the_last_counts() {
        let mut pending = Pending::default();
        let key = || vec![Cell::from("a")];
        pending.add([put(&SETTING, vec!["a".into(), "1".into()])]).unwrap();
        pending.add([Change::Remove { table: &SETTING, key: key() }]).unwrap();
        assert_eq!(pending.rows("setting").count(), 0);
        let last = put(&SETTING, vec!["a".into(), "2".into()]);
        pending.add([last.clone()]).unwrap();
        assert_eq!(pending.find("setting", &key()), Some(&last));
    }

    #[test]
    fn what_fits_no_table_is_refused() {
        let mut pending = Pending::default();
        let mut add = |change| pending.add([change]).is_err();
        assert!(add(put(&STRAY, vec!["a".into(), "1".into()])), "no such table");
        assert!(add(put(&SETTING, vec!["a".into()])), "too few cells");
        assert!(add(put(&SETTING, vec!["a".into(), Cell::Null])), "an empty cell");
        assert!(add(put(&SETTING, vec!["a".into(), Cell::Int(1)])), "another kind");
    }
}
