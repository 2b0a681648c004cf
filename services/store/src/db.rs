//! One database on either engine: two native pools behind an enum, one SQL text for both.

pub(crate) mod server;

use std::fmt;
use std::path::{Path, PathBuf};
use std::time::Duration;

use sqlx::pool::PoolConnection;
use sqlx::sqlite::{SqliteConnectOptions, SqliteJournalMode, SqlitePoolOptions, SqliteSynchronous};
use sqlx::{
    Connection as _, PgConnection, Postgres, Sqlite, SqliteConnection, SqlitePool, Transaction,
};

pub use self::server::Server;
use crate::StoreError;

/// How many statement texts a connection keeps prepared.
const STATEMENTS: usize = 512;

/// How long one waits for a free connection before the answer is "try later".
const PATIENCE: Duration = Duration::from_secs(5);

/// A file is locked from the start: a transaction that came to write late would be refused.
const WRITING: &str = "begin immediate";

/// The file of a book on SQLite within its data directory.
const FILE: &str = "book.db";

/// Where a book is kept.
#[derive(Clone, Eq, PartialEq)]
pub enum Place {
    /// A file in this directory.
    Directory(PathBuf),
    /// A PostgreSQL server by its address, or several with commas between them, one of which is the primary.
    Url(String),
}

/// An address may hold a password.
impl fmt::Debug for Place {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Directory(directory) => f.debug_tuple("Directory").field(directory).finish(),
            Self::Url(_) => f.debug_tuple("Url").finish_non_exhaustive(),
        }
    }
}

/// An open database.
#[derive(Clone, Debug)]
pub enum Db {
    /// A file has one writer and many readers.
    Sqlite {
        /// The single writing connection.
        write: SqlitePool,
        /// Connections that cannot write.
        read: SqlitePool,
    },
    /// A server.
    Postgres(Server),
}

/// A connection held for a while.
#[derive(Debug)]
pub enum Held {
    /// Of a file.
    Sqlite(PoolConnection<Sqlite>),
    /// Of a server.
    Postgres(PoolConnection<Postgres>),
}

/// A writing transaction; dropped without [`Tx::commit`] it is rolled back.
pub enum Tx<'a> {
    /// Of a file.
    Sqlite(Transaction<'a, Sqlite>),
    /// Of a server.
    Postgres(Transaction<'a, Postgres>),
}

impl fmt::Debug for Tx<'_> {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("Tx")
    }
}

/// What statements run on: a held connection or a transaction.
#[derive(Debug)]
pub enum Conn<'a> {
    /// Of a file.
    Sqlite(&'a mut SqliteConnection),
    /// Of a server.
    Postgres(&'a mut PgConnection),
}

/// Runs one expression on whichever connection it is; the body is compiled once per engine.
macro_rules! on {
    ($conn:expr, |$c:ident| $body:expr) => {
        match $conn {
            $crate::db::Conn::Sqlite(c) => {
                let $c = &mut **c;
                $body
            }
            $crate::db::Conn::Postgres(c) => {
                let $c = &mut **c;
                $body
            }
        }
    };
}
pub(crate) use on;

impl Db {
    /// Opens a database without touching its tables; a missing file is made.
    ///
    /// # Errors
    /// [`StoreError::Database`].
    pub async fn open(place: &Place) -> Result<Self, StoreError> {
        match place {
            Place::Directory(directory) => open_file(&directory.join(FILE)).await,
            Place::Url(addresses) => Server::open(addresses).await.map(Self::Postgres),
        }
    }

    /// A connection for reading.
    ///
    /// # Errors
    /// [`StoreError::Database`] if none becomes free in time.
    pub async fn reader(&self) -> Result<Held, StoreError> {
        Ok(match self {
            Self::Sqlite { read, .. } => Held::Sqlite(read.acquire().await?),
            Self::Postgres(server) => Held::Postgres(server.acquire().await?),
        })
    }

    /// A connection for writing, to be used for several transactions.
    ///
    /// # Errors
    /// [`StoreError::Database`] if none becomes free in time.
    pub(crate) async fn writer(&self) -> Result<Held, StoreError> {
        Ok(match self {
            Self::Sqlite { write, .. } => Held::Sqlite(write.acquire().await?),
            Self::Postgres(server) => Held::Postgres(server.acquire_primary().await?),
        })
    }

    /// A transaction that may write.
    ///
    /// # Errors
    /// [`StoreError::Database`].
    pub async fn begin(&self) -> Result<Tx<'static>, StoreError> {
        Ok(match self {
            Self::Sqlite { write, .. } => Tx::Sqlite(write.begin_with(WRITING).await?),
            Self::Postgres(server) => Tx::Postgres(server.begin("begin").await?),
        })
    }

    /// A transaction that only reads, and sees the book as it is now however long it takes.
    ///
    /// # Errors
    /// [`StoreError::Database`].
    pub async fn snapshot(&self) -> Result<Tx<'static>, StoreError> {
        const STILL: &str = "begin isolation level repeatable read, read only";
        Ok(match self {
            Self::Sqlite { read, .. } => Tx::Sqlite(read.begin().await?),
            Self::Postgres(server) => Tx::Postgres(server.begin(STILL).await?),
        })
    }

    /// Whether all sites share one writer.
    pub const fn has_one_writer(&self) -> bool {
        matches!(self, Self::Sqlite { .. })
    }

    /// The engine's name, for logs and the about page.
    pub const fn engine(&self) -> &'static str {
        match self {
            Self::Sqlite { .. } => "SQLite",
            Self::Postgres(_) => "PostgreSQL",
        }
    }

    /// Waits until every connection is closed.
    pub async fn close(&self) {
        match self {
            Self::Sqlite { write, read } => {
                read.close().await;
                write.close().await;
            }
            Self::Postgres(server) => server.pool().close().await,
        }
    }
}

impl Held {
    /// To run statements on.
    pub fn conn(&mut self) -> Conn<'_> {
        match self {
            Self::Sqlite(held) => Conn::Sqlite(held),
            Self::Postgres(held) => Conn::Postgres(held),
        }
    }

    /// A transaction that may write, on this connection.
    pub(crate) async fn begin(&mut self) -> Result<Tx<'_>, StoreError> {
        Ok(match self {
            Self::Sqlite(held) => Tx::Sqlite(held.begin_with(WRITING).await?),
            Self::Postgres(held) => Tx::Postgres(held.begin().await?),
        })
    }
}

impl Tx<'_> {
    /// To run statements on.
    pub fn conn(&mut self) -> Conn<'_> {
        match self {
            Self::Sqlite(tx) => Conn::Sqlite(tx),
            Self::Postgres(tx) => Conn::Postgres(tx),
        }
    }

    /// Makes everything durable.
    ///
    /// # Errors
    /// [`StoreError::Database`]; whether the server committed is then not known.
    pub async fn commit(self) -> Result<(), StoreError> {
        match self {
            Self::Sqlite(tx) => tx.commit().await?,
            Self::Postgres(tx) => tx.commit().await?,
        }
        Ok(())
    }

    /// Undoes everything.
    ///
    /// # Errors
    /// [`StoreError::Database`]; nothing was written in any case.
    pub async fn rollback(self) -> Result<(), StoreError> {
        match self {
            Self::Sqlite(tx) => tx.rollback().await?,
            Self::Postgres(tx) => tx.rollback().await?,
        }
        Ok(())
    }
}

async fn open_file(file: &Path) -> Result<Db, StoreError> {
    let options = SqliteConnectOptions::new()
        .filename(file)
        .create_if_missing(true)
        .journal_mode(SqliteJournalMode::Wal)
        .synchronous(SqliteSynchronous::Full)
        .foreign_keys(true)
        .busy_timeout(PATIENCE)
        .statement_cache_capacity(STATEMENTS);
    let pool = || SqlitePoolOptions::new().acquire_timeout(PATIENCE);
    let write = pool().max_connections(1).connect_with(options.clone()).await?;
    let read = pool().max_connections(8).connect_with(options.read_only(true)).await?;
    Ok(Db::Sqlite { write, read })
}
