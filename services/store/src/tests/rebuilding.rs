//! The projections equal a fresh replay, and whoever alters them is found out.

use domain::book::table::{Cell, CellKind, Change, Row, Table};
use domain::book::tables::tables;

use super::acts;
use super::append_only::run;
use super::book::{Book, Ground, on_both};
use crate::projections::Pending;
use crate::rebuild::{self, Difference, How};
use crate::rows::Select;
use crate::writes::Writes;

async fn first_row(book: &Book, table: &'static Table) -> Row {
    let mut held = book.db.reader().await.unwrap();
    let rows = Select::of(table).limit(1).fetch(&mut held.conn(), book.site.number).await.unwrap();
    rows.into_iter().next().unwrap_or_else(|| panic!("the story leaves {} empty", table.name))
}

async fn apply(book: &Book, change: Change) {
    let mut pending = Pending::default();
    pending.add([change]).unwrap();
    let mut tx = book.db.begin().await.unwrap();
    let mut writes = Writes::default();
    pending.write(&mut writes);
    writes.send(&mut tx.conn(), book.site.number).await.unwrap();
    tx.commit().await.unwrap();
}

/// The row with another value in its last column that takes any.
fn altered(row: &Row) -> (Row, &'static str) {
    let columns = row.table.columns.iter().enumerate().skip(row.table.key);
    let free = columns.clone().rfind(|(_, column)| column.check.is_none());
    let (index, column) = free.or_else(|| columns.clone().next_back()).unwrap();
    let mut row = row.clone();
    row.cells[index] = match (&row.cells[index], column.kind) {
        (Cell::Int(value), _) => Cell::Int(value + 1),
        (Cell::Text(text), _) => Cell::Text(format!("{text}!")),
        (Cell::Bytes(bytes), _) => Cell::Bytes(bytes.iter().map(|byte| !byte).collect()),
        (Cell::Null, CellKind::Int) => Cell::Int(5),
        (Cell::Null, CellKind::Text) => Cell::Text("!".to_owned()),
        (Cell::Null, CellKind::Bytes) => Cell::Bytes(vec![0; 16]),
    };
    (row, column.name)
}

#[tokio::test]
async fn an_altered_row_is_named_by_table_and_key() {
    on_both(async |book| {
        acts::live(book).await;
        assert_eq!(rebuild::check(&book.db, &book.site).await.unwrap(), []);
        for table in tables() {
            let row = first_row(book, table).await;
            let named = |what| Difference { table: table.name, key: row.key().to_vec(), what };

            let (other, column) = altered(&row);
            apply(book, Change::Put(other)).await;
            let found = rebuild::check(&book.db, &book.site).await.unwrap();
            assert_eq!(found, [named(How::Differs(vec![column]))]);

            apply(book, Change::Remove { table, key: row.key().to_vec() }).await;
            let found = rebuild::check(&book.db, &book.site).await.unwrap();
            assert_eq!(found, [named(How::Missing)]);

            apply(book, Change::Put(row)).await;
        }
        assert_eq!(rebuild::check(&book.db, &book.site).await.unwrap(), []);
    })
    .await;
}

#[tokio::test]
async fn a_row_that_nothing_made_is_named() {
    on_both(async |book| {
        acts::live(book).await;
        let mut row = first_row(book, &domain::book::tables::SETTING).await;
        row.cells[0] = Cell::from("invented");
        apply(book, Change::Put(row)).await;
        let found = rebuild::check(&book.db, &book.site).await.unwrap();
        let shown: Vec<String> = found.iter().map(ToString::to_string).collect();
        assert_eq!(shown, ["setting (invented): nothing in the log makes this row"]);
    })
    .await;
}

#[tokio::test]
async fn a_rebuild_restores_what_was_lost() {
    on_both(async |book| {
        acts::live(book).await;
        for table in ["batch", "subject", "command"] {
            run(&book.db, &format!("delete from {table}")).await.unwrap();
        }
        assert!(rebuild::check(&book.db, &book.site).await.unwrap().len() > 10);
        rebuild::rebuild(&book.db, &book.site).await.unwrap();
        book.deep_check().await;
    })
    .await;
}

#[tokio::test]
async fn tables_of_another_version_are_made_anew_from_the_log() {
    on_both(async |book| {
        acts::live(book).await;
        let owner = book.ground.owner().await;
        run(&owner, "update projection_version set version = 'create table leg (x)'")
            .await
            .unwrap();
        run(&owner, "drop table leg; create table leg (x integer)").await.unwrap();
        crate::migrate::migrate(&owner).await.unwrap();
        owner.close().await;
        let db = book.ground.serving().await;
        assert_eq!(rebuild::check(&db, &book.site).await.unwrap(), []);
    })
    .await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn several_servers_may_migrate_at_once() {
    let ground = Ground::server();
    let mut tasks = Vec::new();
    for _ in 0..4 {
        let db = ground.owner().await;
        tasks.push(tokio::spawn(async move { crate::migrate::migrate(&db).await }));
    }
    for task in tasks {
        task.await.unwrap().unwrap();
    }
    crate::migrate::check(&ground.owner().await).await.unwrap();
}
