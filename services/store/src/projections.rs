//! What entries change in the projection tables, a whole group at a time: one statement per table.

use std::collections::BTreeMap;

use domain::book::table::{Cell, CellKind, Change, Column, Row, Table};
use domain::book::tables::tables;

use crate::StoreError;
use crate::db::{Conn, on};
use crate::schema::SITE;
use crate::sites::SiteNumber;
use crate::writes::Writes;

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

    /// Hands everything over to be written.
    pub(crate) fn write<'a>(&'a self, writes: &mut Writes<'a>) {
        for table in tables() {
            let Some(changes) = self.tables.get(table.name) else { continue };
            let put: Vec<&Row> = changes.values().filter_map(row_of).collect();
            writes.put(table, &put);
            let gone = changes.iter().filter(|(_, change)| row_of(change).is_none());
            let gone: Vec<&[Cell]> = gone.map(|(key, _)| key.as_slice()).collect();
            writes.remove(table, &gone);
        }
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
