//! A task that commits whatever waits together, and falls back to one command a commit when a group fails.

use std::collections::hash_map::Entry;
use std::collections::{BTreeMap, HashMap};
use std::sync::Arc;
use std::sync::atomic::Ordering;
use std::time::{Duration, Instant};

use domain::book::command::Command;
use domain::ids::SiteId;
use domain::ledger::tree::TreeHead;
use tokio::sync::{OwnedSemaphorePermit, mpsc};
use tokio::time::timeout;

use super::bench::Bench;
use super::{Answer, GROUP, Job, Shared, WriteError};
use crate::error::chain;
use crate::{Conn, Held, StoreError, Tx, sites};

/// How long a connection is kept for commands that may come: it need not be fetched anew for each of a row of them.
const KEPT: Duration = Duration::from_millis(50);

/// How long a connection is kept at most while commands keep coming: then others who wait for it have their turn.
const TURN: Duration = Duration::from_secs(1);

/// Serves until nobody can send any more.
pub(super) async fn run(shared: Arc<Shared>, mut jobs: mpsc::Receiver<Job>) {
    let mut room = Room { shared, benches: HashMap::new(), kept: None };
    let mut group = Vec::with_capacity(GROUP);
    loop {
        if room.kept.is_some() && timeout(KEPT, jobs.recv_many(&mut group, GROUP)).await.is_err() {
            room.kept = None;
        }
        if group.is_empty() && jobs.recv_many(&mut group, GROUP).await == 0 {
            break;
        }
        room.serve(std::mem::take(&mut group)).await;
    }
}

struct Room {
    shared: Arc<Shared>,
    benches: HashMap<SiteId, Bench>,
    kept: Option<Connection>,
}

/// A connection, to be kept after a group if there is a seat for it.
struct Connection {
    held: Held,
    since: Instant,
    /// A group was committed on it.
    proven: bool,
    /// Few writers may keep a connection, so that there are always some for readers.
    seat: Option<OwnedSemaphorePermit>,
}

impl Room {
    async fn serve(&mut self, jobs: Vec<Job>) {
        match self.attempt(&jobs).await {
            Ok(answers) => {
                for (job, answer) in jobs.into_iter().zip(answers) {
                    reply(job, answer);
                }
            }
            Err(error) if jobs.len() == 1 || error.concerns_everyone() => {
                tracing::error!(
                    error = chain(&error),
                    commands = jobs.len(),
                    "nothing was written"
                );
                for job in jobs {
                    reply(job, Err(error.clone()));
                }
            }
            Err(error) => {
                tracing::warn!(error = chain(&error), "a group failed and is done one by one");
                self.shared.counters.retries.fetch_add(1, Ordering::Relaxed);
                self.serve_singly(jobs).await;
            }
        }
    }

    async fn serve_singly(&mut self, jobs: Vec<Job>) {
        for job in jobs {
            let answer = match self.attempt(std::slice::from_ref(&job)).await {
                Ok(mut answers) => answers.pop().unwrap_or(Err(WriteError::Closing)),
                Err(error) => {
                    tracing::error!(error = chain(&error), "nothing was written");
                    Err(error)
                }
            };
            reply(job, answer);
        }
    }

    /// One transaction. After a failure nothing that memory holds is believed.
    async fn attempt(&mut self, jobs: &[Job]) -> Result<Vec<Answer>, WriteError> {
        let outcome = self.commit(jobs).await;
        if let Err(error) = &outcome {
            self.benches.clear();
            if matches!(error, WriteError::Unsigned(_)) {
                self.shared.published.clear();
            }
        }
        outcome
    }

    async fn commit(&mut self, jobs: &[Job]) -> Result<Vec<Answer>, WriteError> {
        let mut connection = match self.kept.take() {
            Some(connection) => connection,
            None => self.connection().await?,
        };
        let answers = match self.commit_on(&mut connection, jobs).await {
            // Lost since the last group; nothing was written on it yet.
            Err(error) if connection.proven && error.is_unavailable() => {
                drop(connection);
                connection = self.connection().await?;
                self.commit_on(&mut connection, jobs).await?
            }
            outcome => outcome?,
        }?;
        connection.proven = true;
        if connection.seat.is_some() && connection.since.elapsed() < TURN {
            self.kept = Some(connection);
        }
        Ok(answers)
    }

    async fn connection(&self) -> Result<Connection, StoreError> {
        let seat = Arc::clone(&self.shared.seats).try_acquire_owned().ok();
        let held = self.shared.db.writer().await?;
        Ok(Connection { held, since: Instant::now(), proven: false, seat })
    }

    /// One transaction on a connection. The outer error is that it could not be begun.
    async fn commit_on(
        &mut self,
        connection: &mut Connection,
        jobs: &[Job],
    ) -> Result<Result<Vec<Answer>, WriteError>, StoreError> {
        let tx = connection.held.begin().await?;
        Ok(self.commit_in(tx, jobs).await)
    }

    async fn commit_in(&mut self, mut tx: Tx<'_>, jobs: &[Job]) -> Result<Vec<Answer>, WriteError> {
        let mut answers = BTreeMap::new();
        let mut heads = Vec::new();
        let mut entries = 0;
        for (site, places) in by_site(jobs) {
            let Some(bench) = bench(&mut self.benches, &mut tx.conn(), site).await? else {
                answers.extend(places.into_iter().map(|place| (place, Err(WriteError::NoSite))));
                continue;
            };
            let commands: Vec<&Command> = places.iter().map(|&p| &jobs[p].command).collect();
            let done = bench.carry_out(&mut tx.conn(), &self.shared.tools, &commands).await?;
            answers.extend(places.into_iter().zip(done.answers));
            heads.extend(done.head.map(|head| (site, head)));
            entries += done.entries;
        }
        if heads.is_empty() {
            tx.rollback().await?;
        } else {
            let locked = Instant::now();
            tx.commit().await.map_err(|error| WriteError::Unsure(Arc::new(error)))?;
            self.announce(&heads, entries, locked);
        }
        Ok(answers.into_values().collect())
    }

    /// Says what is durable now, and was the newest while the head was locked.
    fn announce(&self, heads: &[(SiteId, TreeHead)], entries: usize, locked: Instant) {
        let counters = &self.shared.counters;
        counters.commits.fetch_add(1, Ordering::Relaxed);
        counters.entries.fetch_add(entries as u64, Ordering::Relaxed);
        for (site, head) in heads {
            if let Some(bench) = self.benches.get(site) {
                bench.publish(&self.shared.published, locked);
                (self.shared.tools.committed)(&bench.site.origin, head);
            }
        }
    }
}

async fn bench<'a>(
    benches: &'a mut HashMap<SiteId, Bench>,
    conn: &mut Conn<'_>,
    site: SiteId,
) -> Result<Option<&'a mut Bench>, StoreError> {
    match benches.entry(site) {
        Entry::Occupied(bench) => Ok(Some(bench.into_mut())),
        Entry::Vacant(place) => {
            let found = sites::by_id(conn, site).await?;
            Ok(found.map(|site| place.insert(Bench::new(site))))
        }
    }
}

/// Which places of the group are whose.
fn by_site(jobs: &[Job]) -> BTreeMap<SiteId, Vec<usize>> {
    let mut places: BTreeMap<SiteId, Vec<usize>> = BTreeMap::new();
    for (place, job) in jobs.iter().enumerate() {
        places.entry(job.site).or_default().push(place);
    }
    places
}

/// Whoever asked may have hung up; what is done stays done.
fn reply(job: Job, answer: Answer) {
    let _ = job.answer.send(answer);
}

impl WriteError {
    /// Whether trying one by one is useless.
    fn concerns_everyone(&self) -> bool {
        match self {
            Self::Unsure(_) | Self::Unsigned(_) => true,
            Self::Store(error) => error.is_unavailable(),
            _ => false,
        }
    }
}
