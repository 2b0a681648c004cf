//! A PostgreSQL server, or several of which one at a time is the primary.
//!
//! The driver knows neither several hosts nor which of them may write. So each connection is asked when it is made and
//! after it lay idle, and when none can be had, the hosts are asked in turn and the pool is pointed at the primary. A
//! primary that becomes a standby restarts, so a connection to a primary stays one.

use std::str::FromStr;
use std::sync::Arc;
use std::sync::atomic::{AtomicU64, Ordering};
use std::time::Duration;

use sqlx::pool::PoolConnection;
use sqlx::postgres::{PgConnectOptions, PgPoolOptions};
use sqlx::{Connection as _, PgConnection, PgPool, Postgres, Transaction};
use tokio::sync::Mutex;

use super::{PATIENCE, STATEMENTS};
use crate::StoreError;

/// Connections at most.
const CONNECTIONS: u32 = 16;

/// How long a connection may lie before it is asked again.
const UNASKED: Duration = Duration::from_secs(1);

/// How long one host is given to answer.
const HOST_PATIENCE: Duration = Duration::from_secs(2);

/// Everything the service asks for is found by a key or in the order of an index. A plan made while a table was empty
/// would read all of it, and is kept until the table is analysed.
const BY_INDEX: &str = "set enable_seqscan = off";

const IS_PRIMARY: &str = "select not pg_is_in_recovery()";

#[cfg(test)]
pub(crate) const TEXTS: &[&str] = &[BY_INDEX, IS_PRIMARY];

/// A pool of connections to whichever host is the primary.
#[derive(Clone, Debug)]
pub struct Server {
    pool: PgPool,
    hosts: Arc<Hosts>,
}

#[derive(Debug)]
struct Hosts {
    all: Vec<PgConnectOptions>,
    /// How often the pool was pointed at a primary.
    turns: AtomicU64,
    seeking: Mutex<()>,
}

impl Server {
    /// Connects; several addresses stand with commas between them.
    pub(super) async fn open(addresses: &str) -> Result<Self, StoreError> {
        let all = addresses
            .split(',')
            .map(|url| Ok(PgConnectOptions::from_str(url)?.statement_cache_capacity(STATEMENTS)))
            .collect::<Result<Vec<_>, sqlx::Error>>()?;
        let primary = find_primary(&all).await?;
        let patience = if all.len() == 1 { PATIENCE } else { HOST_PATIENCE };
        let pool = PgPoolOptions::new()
            .max_connections(CONNECTIONS)
            .acquire_timeout(patience)
            .test_before_acquire(false)
            .before_acquire(|conn, standing| {
                let asked = standing.idle_for >= UNASKED;
                Box::pin(async move { Ok(!asked || is_primary(conn).await?) })
            })
            .after_connect(|conn, _| {
                Box::pin(async move {
                    if !is_primary(conn).await? {
                        return Err(standby());
                    }
                    sqlx::query(BY_INDEX).execute(conn).await.map(drop)
                })
            })
            .connect_lazy_with(primary);
        let hosts = Hosts { all, turns: AtomicU64::new(0), seeking: Mutex::new(()) };
        Ok(Self { pool, hosts: Arc::new(hosts) })
    }

    pub(super) async fn acquire(&self) -> Result<PoolConnection<Postgres>, StoreError> {
        let turn = self.turn();
        match self.pool.acquire().await.map_err(StoreError::from) {
            Err(error) if error.is_unavailable() => {
                self.seek_primary(turn).await?;
                Ok(self.pool.acquire().await?)
            }
            outcome => outcome,
        }
    }

    /// A connection that has just been asked, whatever it was before: the dead ones of a server that was restarted are
    /// passed over.
    pub(super) async fn acquire_primary(&self) -> Result<PoolConnection<Postgres>, StoreError> {
        for _ in 0..=CONNECTIONS {
            let turn = self.turn();
            let mut held = self.acquire().await?;
            let answer = is_primary(&mut held).await;
            if matches!(answer, Ok(true)) {
                return Ok(held);
            }
            // Whether it could still say goodbye does not matter.
            let _ = held.close().await;
            if answer.is_ok() {
                self.seek_primary(turn).await?;
            }
        }
        Err(sqlx::Error::PoolTimedOut.into())
    }

    pub(super) async fn begin(
        &self,
        text: &'static str,
    ) -> Result<Transaction<'static, Postgres>, StoreError> {
        for _ in 0..CONNECTIONS {
            let turn = self.turn();
            match self.pool.begin_with(text).await.map_err(StoreError::from) {
                Err(error) if error.is_unavailable() => self.seek_primary(turn).await?,
                outcome => return outcome,
            }
        }
        Ok(self.pool.begin_with(text).await?)
    }

    /// The connections, for what this crate does not offer.
    pub const fn pool(&self) -> &PgPool {
        &self.pool
    }

    fn turn(&self) -> u64 {
        self.hosts.turns.load(Ordering::Acquire)
    }

    /// Points the pool at the primary, unless somebody did so since `turn`.
    async fn seek_primary(&self, turn: u64) -> Result<(), StoreError> {
        let _only_one = self.hosts.seeking.lock().await;
        if self.turn() == turn {
            let primary = find_primary(&self.hosts.all).await?;
            self.pool.set_connect_options(primary);
            self.hosts.turns.fetch_add(1, Ordering::Release);
        }
        Ok(())
    }
}

/// The first host that answers and may write.
async fn find_primary(hosts: &[PgConnectOptions]) -> Result<PgConnectOptions, StoreError> {
    let mut last = sqlx::Error::PoolTimedOut;
    for host in hosts {
        match tokio::time::timeout(HOST_PATIENCE, ask(host)).await {
            Ok(Ok(true)) => return Ok(host.clone()),
            Ok(Ok(false)) => last = standby(),
            Ok(Err(error)) => last = error,
            Err(_) => last = sqlx::Error::PoolTimedOut,
        }
    }
    Err(last.into())
}

async fn ask(host: &PgConnectOptions) -> Result<bool, sqlx::Error> {
    let mut conn = PgConnection::connect_with(host).await?;
    let answer = is_primary(&mut conn).await?;
    conn.close().await?;
    Ok(answer)
}

fn standby() -> sqlx::Error {
    std::io::Error::other("the server is a standby").into()
}

async fn is_primary(conn: &mut PgConnection) -> Result<bool, sqlx::Error> {
    sqlx::query_scalar(IS_PRIMARY).fetch_one(conn).await
}
