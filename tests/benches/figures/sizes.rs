//! What a book takes, asked of the engine itself.

use sqlx::sqlite::SqliteConnectOptions;
use sqlx::{ConnectOptions as _, Connection as _, PgConnection};
use tests::{Engine, Home};

const ENTRIES: &str = "select count(*), cast(sum(length(bytes)) as bigint) from entry";
const DATABASE: &str = "select pg_database_size(current_database())";

/// A book's size.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Sizes {
    /// Entries of all sites.
    pub(crate) entries: u64,
    /// Their canonical bytes.
    pub(crate) canonical: u64,
    /// Bytes on disk: the file, or all of the database.
    pub(crate) stored: u64,
}

/// The size of a book that nobody writes to.
pub(crate) async fn measure(home: &Home) -> Sizes {
    let (entries, canonical, stored) = match home.engine() {
        Engine::Postgres => of_server(home).await,
        Engine::Sqlite => of_file(home).await,
    };
    let unsigned = |number: i64| u64::try_from(number).expect("a size");
    Sizes { entries: unsigned(entries), canonical: unsigned(canonical), stored }
}

async fn of_server(home: &Home) -> (i64, i64, u64) {
    let (cluster, name) = home.server();
    let mut conn = PgConnection::connect(&cluster.url(name)).await.expect("a connection");
    let (entries, canonical) = sqlx::query_as(ENTRIES).fetch_one(&mut conn).await.expect("sizes");
    let stored: i64 = sqlx::query_scalar(DATABASE).fetch_one(&mut conn).await.expect("a size");
    (entries, canonical, u64::try_from(stored).expect("a size"))
}

async fn of_file(home: &Home) -> (i64, i64, u64) {
    let options = SqliteConnectOptions::new().filename(home.file()).read_only(true);
    let mut conn = options.connect().await.expect("the file");
    let (entries, canonical) = sqlx::query_as(ENTRIES).fetch_one(&mut conn).await.expect("sizes");
    (entries, canonical, std::fs::metadata(home.file()).expect("the file").len())
}
