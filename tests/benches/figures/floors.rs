//! The floor that appends are held against: the same disk and engine, four bare statements a transaction, one client.

use std::time::{Duration, Instant};

use sqlx::sqlite::{SqliteConnectOptions, SqliteJournalMode, SqliteSynchronous};
use sqlx::{ConnectOptions as _, Connection as _};
use tests::{Engine, Home};

use crate::load::Times;
use crate::place;
use crate::table;

/// About as many bytes as a reading has.
const BYTES: usize = 1_000;
const MEASURED: Duration = Duration::from_secs(3);

const HEAD: &str = "create table head (size bigint not null)";
const START: &str = "insert into head values (0)";
const ENTRY_SQLITE: &str = "create table entry (seq integer primary key, bytes blob not null)";
const ENTRY_POSTGRES: &str = "create table entry (seq bigint primary key, bytes bytea not null)";
const NEXT: &str = "update head set size = size + 1 returning size";
const APPEND: &str = "insert into entry (seq, bytes) values ($1, $2)";

/// The loop's body on either kind of connection.
macro_rules! transactions {
    ($conn:expr, $begin:literal) => {{
        let bytes = vec![7_u8; BYTES];
        let mut calls = Vec::new();
        let begin = Instant::now();
        while begin.elapsed() < MEASURED {
            let start = Instant::now();
            let mut tx = $conn.begin_with($begin).await.expect("begin");
            let seq: i64 = sqlx::query_scalar(NEXT).fetch_one(&mut *tx).await.expect("update");
            sqlx::query(APPEND).bind(seq).bind(&bytes).execute(&mut *tx).await.expect("insert");
            tx.commit().await.expect("commit");
            calls.push(start.elapsed());
        }
        Times::new(calls, MEASURED)
    }};
}

/// Measures and prints the floor.
pub(crate) fn print(engine: Engine) {
    let home = place::home(engine);
    println!("{engine:?}: {}", measure(&home));
}

/// Transactions a second of one client that does nothing else.
pub(crate) fn measure(home: &Home) -> Times {
    let runtime = place::runtime();
    let times = match home.engine() {
        Engine::Sqlite => runtime.block_on(on_sqlite()),
        Engine::Postgres => {
            let (cluster, _) = home.server();
            let database = cluster.create_database();
            runtime.block_on(on_postgres(&cluster.url(&database)))
        }
    };
    table::line("  bare loop of 4 statements, 1 client", &times.to_string());
    times
}

async fn on_sqlite() -> Times {
    let directory = tempfile::tempdir().expect("a temporary directory");
    let mut conn = SqliteConnectOptions::new()
        .filename(directory.path().join("floor.db"))
        .create_if_missing(true)
        .journal_mode(SqliteJournalMode::Wal)
        .synchronous(SqliteSynchronous::Full)
        .connect()
        .await
        .expect("a file");
    for text in [HEAD, START, ENTRY_SQLITE] {
        sqlx::query(text).execute(&mut conn).await.expect("a table");
    }
    transactions!(conn, "begin immediate")
}

async fn on_postgres(url: &str) -> Times {
    let mut conn = sqlx::PgConnection::connect(url).await.expect("a connection");
    for text in [HEAD, START, ENTRY_POSTGRES] {
        sqlx::query(text).execute(&mut conn).await.expect("a table");
    }
    transactions!(conn, "begin")
}
