//! Whoever alters the log is found out, even with all the rights of the owner.

use super::acts;
use super::append_only::run;
use super::book::{Book, on_both};
use crate::{Db, verify};

/// What the owner of the database can do, and a thief with the owner's password.
async fn disarm(owner: &Db) {
    for table in ["entry", "blob"] {
        let text = match owner {
            Db::Sqlite { .. } => format!(
                "drop trigger {table}_no_update; drop trigger {table}_no_delete; drop trigger {table}_no_replace"
            ),
            Db::Postgres(_) => format!("alter table {table} disable trigger all"),
        };
        run(owner, &text).await.unwrap();
    }
}

async fn fault(book: &Book) -> String {
    let report = verify::verify(&book.db, &book.site).await.unwrap();
    report.fault.expect("a fault").to_string()
}

/// Alters, looks, and puts it back.
async fn check(book: &Book, owner: &Db, alter: &str, told: &str) {
    run(owner, "create table kept_entry as select * from entry").await.unwrap();
    run(owner, "create table kept_blob as select * from blob").await.unwrap();
    run(owner, "create table kept_head as select * from log_head").await.unwrap();
    run(owner, alter).await.unwrap();
    let found = fault(book).await;
    assert!(found.contains(told), "{alter}: {found}");
    for (table, kept) in [("entry", "kept_entry"), ("blob", "kept_blob"), ("log_head", "kept_head")]
    {
        let text = format!(
            "delete from {table}; insert into {table} select * from {kept}; drop table {kept}"
        );
        run(owner, &text).await.unwrap();
    }
}

#[tokio::test]
async fn every_alteration_of_the_log_is_found() {
    on_both(async |book| {
        acts::live(book).await;
        let report = book.deep_check().await;
        assert_eq!(report.entries, book.size().await);
        assert_eq!(report.blobs, 3);
        assert!(report.key.is_some());

        let owner = book.ground.owner().await;
        disarm(&owner).await;
        let (zeros, brace) = match owner {
            Db::Sqlite { .. } => (
                "zeroblob(32)",
                "cast(replace(cast(bytes as text), 'dipstick', 'diqstick') as blob)",
            ),
            Db::Postgres(_) => (
                "decode(repeat('00', 32), 'hex')",
                "convert_to(replace(convert_from(bytes, 'UTF8'), 'dipstick', 'diqstick'), 'UTF8')",
            ),
        };
        for (alter, told) in [
            (format!("update entry set bytes = {brace} where seq = 8"), "entry 8: its leaf hash"),
            (
                format!("update entry set leaf_hash = {zeros} where seq = 5"),
                "entry 5: its leaf hash",
            ),
            ("delete from entry where seq = 6".to_owned(), "entry 6: it is missing"),
            (
                "delete from entry where seq = (select max(seq) from entry)".to_owned(),
                "the head counts",
            ),
            ("update entry set seq = seq + 100 where seq = 7".to_owned(), "entry 7: it is missing"),
            (format!("update log_head set root = {zeros}"), "the head's tree"),
            ("update log_head set note = ''".to_owned(), "the head's signature"),
            ("update log_head set last_recorded_at = 0".to_owned(), "the head's time"),
            ("update blob set bytes = substr(bytes, 2)".to_owned(), "was altered"),
            ("delete from blob where media_type = 'application/toml'".to_owned(), "is missing"),
        ] {
            check(book, &owner, &alter, told).await;
        }
        book.deep_check().await;
        owner.close().await;
    })
    .await;
}

#[tokio::test]
async fn a_head_that_left_the_house_betrays_a_shortened_log() {
    on_both(async |book| {
        acts::furnish(book).await;
        let mut tx = book.db.begin().await.unwrap();
        let head = crate::log::head(&mut tx.conn(), book.site.number).await.unwrap();
        let kept = crate::log::KeptHead {
            size: head.frontier.size() + 1,
            root: head.root,
            note: head.note.clone(),
        };
        crate::log::keep_head(&mut tx.conn(), book.site.number, &kept).await.unwrap();
        crate::log::keep_head(&mut tx.conn(), book.site.number, &kept).await.unwrap();
        tx.commit().await.unwrap();
        assert!(fault(book).await.contains("left the house, but there are fewer"));
    })
    .await;
}

#[tokio::test]
async fn a_record_and_the_head_it_rests_on_leave_the_house_together() {
    on_both(async |book| {
        acts::live(book).await;
        let mut held = book.db.reader().await.unwrap();
        let kept = crate::log::kept_heads(&mut held.conn(), book.site.number).await.unwrap();
        let size = book.size().await - 1;
        let [head] = kept.as_slice() else { panic!("{kept:?}") };
        assert_eq!(head.size, size, "the log before the entry that says so");
        let root = crate::tiles::root_at(&mut held.conn(), book.site.number, size).await.unwrap();
        assert_eq!(head.root, root);
        assert!(head.note.contains(&format!("\n{size}\n")), "{}", head.note);
        book.deep_check().await;
    })
    .await;
}
