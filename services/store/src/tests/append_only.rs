//! What raw statements may do to the log.

use sqlx::AssertSqlSafe;

use super::acts;
use super::book::{Book, Ground, on_both};
use crate::db::on;
use crate::migrate::SERVING_ROLE;
use crate::{Db, Place};

/// The tables of the log, with their keys.
const LOG: &[(&str, &str)] = &[
    ("entry", "site, seq"),
    ("tile", "site, level, idx"),
    ("blob", "site, digest"),
    ("signed_head", "site, size"),
];

pub(super) async fn run(db: &Db, text: &str) -> Result<(), sqlx::Error> {
    let mut tx = db.begin().await.unwrap();
    on!(&mut tx.conn(), |c| sqlx::raw_sql(AssertSqlSafe(text)).execute(c).await.map(drop))?;
    tx.commit().await.unwrap();
    Ok(())
}

/// A row in each table of the log.
async fn fill(book: &Book) {
    acts::live(book).await;
    let zeros = |bytes: usize| match book.db {
        Db::Sqlite { .. } => format!("zeroblob({bytes})"),
        Db::Postgres(_) => format!("decode(repeat('00', {bytes}), 'hex')"),
    };
    let tile =
        format!("insert into tile (site, level, idx, hashes) values (1, 1, 0, {})", zeros(8192));
    let head = format!(
        "insert into signed_head (site, size, root, note) values (1, 1, {}, 'n')",
        zeros(32)
    );
    for text in [tile, head] {
        run(&book.db, &text).await.unwrap();
    }
}

async fn refused(db: &Db, text: &str) -> String {
    run(db, text).await.expect_err(text).to_string()
}

#[tokio::test]
async fn the_log_takes_no_change_and_no_removal() {
    on_both(async |book| {
        fill(book).await;
        let owner = book.ground.owner().await;
        for (table, key) in LOG {
            let rewrite = match owner {
                Db::Sqlite { .. } => {
                    format!("insert or replace into {table} select * from {table}")
                }
                Db::Postgres(_) => format!(
                    "insert into {table} select * from {table} where true \
                     on conflict ({key}) do update set site = excluded.site"
                ),
            };
            for text in
                [format!("update {table} set site = site"), format!("delete from {table}"), rewrite]
            {
                let why = refused(&owner, &text).await;
                assert!(why.contains(&format!("{table} is append-only")), "{text}: {why}");
                refused(&book.db, &text).await;
            }
        }
        owner.close().await;
    })
    .await;
}

#[tokio::test]
async fn the_serving_role_can_neither_empty_the_log_nor_disarm_its_triggers() {
    let book = Book::open(Ground::server()).await;
    for (table, _) in LOG {
        for text in [
            format!("truncate {table}"),
            format!("drop trigger {table}_no_change on {table}"),
            format!("alter table {table} disable trigger all"),
            format!("drop table {table}"),
        ] {
            let why = refused(&book.db, &text).await;
            let is_denied = why.contains("permission denied") || why.contains("must be owner");
            assert!(is_denied, "{text}: {why}");
        }
    }
    // PostgreSQL only warns that nothing was granted.
    run(&book.db, &format!("grant update on entry to {SERVING_ROLE}")).await.unwrap();
    let why = refused(&book.db, "update entry set seq = 1").await;
    assert!(why.contains("permission denied"), "{why}");
    let why = refused(&book.db, "set session_replication_role = replica").await;
    assert!(why.contains("permission denied"), "{why}");
    let why = refused(&book.db, "delete from log_head").await;
    assert!(why.contains("permission denied"), "{why}");
}

#[tokio::test]
async fn nobody_can_truncate_the_log_by_the_way() {
    let ground = Ground::server();
    let book = Book::open(ground).await;
    let owner = book.ground.owner().await;
    for (table, _) in LOG {
        let why = refused(&owner, &format!("truncate {table}")).await;
        assert!(why.contains("is append-only"), "{why}");
    }
}

#[tokio::test]
async fn a_reading_connection_cannot_write() {
    let book = Book::open(Ground::file()).await;
    let Db::Sqlite { read, .. } = &book.db else { panic!("a file is SQLite") };
    let written = sqlx::query("insert into founding_token values (1, x'00')").execute(read).await;
    assert!(written.unwrap_err().to_string().contains("readonly"));
}

#[tokio::test]
async fn a_database_that_nobody_migrated_is_not_served() {
    for ground in [Ground::file(), Ground::server()] {
        let db = ground.owner().await;
        assert!(matches!(crate::migrate::check(&db).await, Err(crate::StoreError::WrongVersion)));
        crate::migrate::migrate(&db).await.unwrap();
        crate::migrate::check(&db).await.unwrap();
        crate::migrate::check(&ground.serving().await).await.unwrap();
        run(&db, "update projection_version set version = 'another'").await.unwrap();
        assert!(matches!(crate::migrate::check(&db).await, Err(crate::StoreError::WrongVersion)));
    }
}

#[tokio::test]
async fn an_address_without_a_server_is_an_error_that_passes() {
    let nowhere = Place::Url("postgres://nobody@127.0.0.1:1/none".to_owned());
    assert!(Db::open(&nowhere).await.unwrap_err().is_unavailable());
}
