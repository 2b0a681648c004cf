//! Every SQL text is prepared on both engines: a typo or a slip of dialect fails here.

use sqlx::{Executor as _, SqlSafeStr as _};

use super::book::{Book, Ground};
use crate::Conn;
use crate::rows::{Order, Select};

const TEXTS: &[(&str, &[&str])] = &[
    ("blobs", crate::blobs::TEXTS),
    ("commands", crate::commands::TEXTS),
    ("directory", crate::directory::TEXTS),
    ("founding", crate::founding::TEXTS),
    ("log", crate::log::TEXTS),
    ("log/head", crate::log::head::TEXTS),
    ("migrate", crate::migrate::TEXTS),
    ("schema", crate::schema::TEXTS),
    ("sites", crate::sites::TEXTS),
    ("tiles", crate::tiles::TEXTS),
];

/// Texts that only PostgreSQL is asked.
const POSTGRES_TEXTS: &[(&str, &[&str])] = &[("db/server", crate::db::server::TEXTS)];

async fn check(ground: Ground) {
    let book = Book::open(ground).await;
    let mut held = book.db.reader().await.unwrap();
    let of_engine = if book.db.has_one_writer() { &[] } else { POSTGRES_TEXTS };
    for (file, texts) in TEXTS.iter().chain(of_engine) {
        for text in *texts {
            let prepared = match held.conn() {
                Conn::Sqlite(c) => c.prepare(text.into_sql_str()).await.map(drop),
                Conn::Postgres(c) => c.prepare(text.into_sql_str()).await.map(drop),
            };
            assert!(prepared.is_ok(), "{file}: {text}: {prepared:?}");
        }
    }
}

#[tokio::test]
async fn every_text_is_understood_by_sqlite() {
    check(Ground::file()).await;
}

#[tokio::test]
async fn every_text_is_understood_by_postgres() {
    check(Ground::server()).await;
}

#[tokio::test]
async fn every_table_can_be_asked_in_every_way() {
    super::book::on_both(async |book| {
        let mut held = book.db.reader().await.unwrap();
        for table in domain::book::tables::tables() {
            for column in table.columns {
                let select = Select::of(table).order(Order::Falling(column.name)).limit(5);
                select.fetch(&mut held.conn(), book.site.number).await.unwrap();
            }
        }
        let wrong = Select::of(&domain::book::tables::LOT).equal("lot; drop table entry", 1);
        assert!(wrong.fetch(&mut held.conn(), book.site.number).await.is_err());
    })
    .await;
}
