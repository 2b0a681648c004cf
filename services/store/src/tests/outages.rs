//! Servers that die, stand by and take over.

use std::sync::Arc;
use std::time::Duration;

use domain::book::command::Command;
use tests::postgres::Cluster;

use super::acts::{self, batch, reading};
use super::append_only::run;
use super::book::{Book, Ground};
use crate::writer::Receipt;
use crate::{Db, Place};

/// Sends a command again and again until it is known to be written, as a client does.
async fn send_until_sure(book: &Book, command: Command) -> Receipt {
    loop {
        match book.submit(command.clone()).await {
            Ok(receipt) => return receipt,
            Err(error) => assert!(error.is_passing(), "{error:?}"),
        }
        tokio::time::sleep(Duration::from_millis(20)).await;
    }
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn commands_sent_again_after_a_power_cut_are_written_once() {
    let cluster = Arc::new(Cluster::start());
    let name = cluster.create_database();
    let book = Arc::new(Book::open(Ground::Server(Arc::clone(&cluster), name)).await);
    acts::begin(&book).await;
    acts::furnish(&book).await;
    let size = book.size().await;

    let commands = (0..150).map(|i| book.command(reading(batch(), &format!("3.{i:03}"))));
    let tasks: Vec<_> = commands
        .enumerate()
        .map(|(i, command)| {
            let book = Arc::clone(&book);
            tokio::spawn(async move {
                tokio::time::sleep(Duration::from_millis(i as u64)).await;
                send_until_sure(&book, command).await
            })
        })
        .collect();
    tokio::time::sleep(Duration::from_millis(60)).await;
    let power = Arc::clone(&cluster);
    tokio::task::spawn_blocking(move || {
        power.stop_immediately();
        power.launch();
    })
    .await
    .unwrap();

    let mut seqs = Vec::new();
    for task in tasks {
        seqs.push(task.await.unwrap().entries[0].seq);
    }
    seqs.sort_unstable();
    assert_eq!(seqs, (size..size + 150).collect::<Vec<_>>());
    book.deep_check().await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn connections_that_the_server_ended_are_passed_over() {
    let cluster = Arc::new(Cluster::start());
    let name = cluster.create_database();
    let book = Book::open(Ground::Server(Arc::clone(&cluster), name.clone())).await;
    acts::begin(&book).await;
    acts::furnish(&book).await;
    for _ in 0..3 {
        let mut held = Vec::new();
        for _ in 0..6 {
            held.push(book.db.reader().await.unwrap());
        }
        drop(held);
        // The writer keeps a connection, and the pool has others that were used just now.
        book.act(reading(batch(), "3.5")).await.unwrap();
        let ending = Arc::clone(&cluster);
        let database = name.clone();
        tokio::task::spawn_blocking(move || {
            let others = "select pg_terminate_backend(pid) from pg_stat_activity \
                          where datname = current_database() and pid <> pg_backend_pid()";
            ending.sql(&database, others);
        })
        .await
        .unwrap();
        book.act(reading(batch(), "3.6")).await.unwrap();
    }
    book.deep_check().await;
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn steady_commands_leave_others_their_turn() {
    let book = Arc::new(Book::open(Ground::file()).await);
    acts::begin(&book).await;
    acts::furnish(&book).await;
    let steady = Arc::clone(&book);
    let commands = tokio::spawn(async move {
        loop {
            steady.act(reading(batch(), "3.5")).await.unwrap();
            tokio::time::sleep(Duration::from_millis(20)).await;
        }
    });
    for _ in 0..2 {
        tokio::time::sleep(Duration::from_millis(100)).await;
        let tx = book.db.begin().await.unwrap();
        tx.rollback().await.unwrap();
    }
    commands.abort();
}

#[tokio::test(flavor = "multi_thread", worker_threads = 2)]
async fn the_pool_follows_the_primary() {
    let (first, second) =
        (Cluster::start_with(&["fsync = off"]), Cluster::start_with(&["fsync = off"]));
    for cluster in [&first, &second] {
        cluster.sql("postgres", "create table t (x bigint)");
    }
    second.stand_by();
    let place = Place::Url(format!("{},{}", second.url("postgres"), first.url("postgres")));
    let db = Db::open(&place).await.unwrap();
    run(&db, "insert into t values (1)").await.unwrap();

    first.stop_immediately();
    assert!(db.begin().await.unwrap_err().is_unavailable(), "one is dead, the other stands by");
    second.promote();
    run(&db, "insert into t values (2)").await.unwrap();
    second.sql("postgres", "do $$ begin assert (select sum(x) = 2 from t); end $$");
    db.close().await;
}

#[tokio::test]
async fn a_standby_alone_is_not_served_from() {
    let cluster = Cluster::start_with(&["fsync = off"]);
    cluster.stand_by();
    let opened = Db::open(&Place::Url(cluster.url("postgres"))).await;
    assert!(opened.unwrap_err().is_unavailable());
    cluster.promote();
    Db::open(&Place::Url(cluster.url("postgres"))).await.unwrap();
}
