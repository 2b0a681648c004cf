//! The only way into the log: one task a site, which commits whatever waits together.
//!
//! In one transaction the task locks the head, decides each command on the state after the ones before it, and writes
//! entries, projections and the signed head in one message. A refusal is decided, not
//! suffered: it leaves the other commands of the group untouched. Only after the commit does anyone get an answer, and
//! nobody's hanging up stops a commit. A file has one writer for all sites, a server one for each.

mod bench;
mod clock;
mod continuing;
mod drawn;
mod group;
mod sheet;

use std::collections::HashMap;
use std::fmt;
use std::sync::atomic::{AtomicU64, Ordering};
use std::sync::{Arc, Mutex, PoisonError};

use domain::book::command::{Command, Refusal};
use domain::ids::SiteId;
use domain::ledger::entry::Entry;
use domain::ledger::tree::{Hash, TreeHead};
use domain::stamp::Micros;
use tokio::sync::{Semaphore, mpsc, oneshot};
use tokio::task::JoinHandle;
use uuid::Uuid;

use crate::sites::Site;
use crate::snapshots::Published;
use crate::{Db, StoreError, log};

/// Commands in one commit at most.
pub const GROUP: usize = 256;

/// Writers that may keep their connection from one group to the next; there are twice as many connections.
const SEATS: usize = 8;

/// Signs a log's size and root under its origin, and gives the signed note.
pub type Sign = dyn Fn(&str, u64, &Hash) -> Result<String, String> + Send + Sync;

/// Hears which head of which origin is durable now.
pub type Committed = dyn Fn(&str, &TreeHead) + Send + Sync;

/// Tells which head of an origin was heard of as durable last, if one was.
pub type Remembered = dyn Fn(&str) -> Result<Option<TreeHead>, String> + Send + Sync;

/// What the writer cannot have from its arguments.
#[derive(Clone)]
pub struct Tools {
    /// The time.
    pub clock: Arc<dyn Fn() -> Micros + Send + Sync>,
    /// New ids, unguessable ones.
    pub draw: Arc<dyn Fn() -> Uuid + Send + Sync>,
    /// Signs the head of a group before it is committed.
    pub sign: Arc<Sign>,
    /// Told after the commit which head of which origin is now durable, to be remembered beside the key.
    pub committed: Arc<Committed>,
    /// What is remembered beside the key: a log that does not continue it is not written on.
    pub remembered: Arc<Remembered>,
}

impl fmt::Debug for Tools {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("Tools")
    }
}

/// The answer to a command that was carried out: its entries, which are durable. The same for ever.
#[derive(Clone, Debug)]
pub struct Receipt {
    /// What it wrote, in order.
    pub entries: Vec<Arc<Entry>>,
}

/// Why a command was not carried out.
#[derive(Clone, Debug, thiserror::Error)]
pub enum WriteError {
    /// The book refuses it, and says why.
    #[error("refused")]
    Refused(Refusal),
    /// Another command was sent with this key before.
    #[error("another command was sent with this key before")]
    KeyReused,
    /// The clock stands before the last entry; an operator has to correct it and say so in the book.
    #[error("the clock is {seconds} s behind the last entry: an operator must set it right")]
    ClockBehind {
        /// How far.
        seconds: i64,
    },
    /// No such site.
    #[error("no such site")]
    NoSite,
    /// The connection was lost while committing: the command may be written or not.
    #[error("it is not known whether this was written: send it again with the same key")]
    Unsure(#[source] Arc<StoreError>),
    /// The key refuses to sign this head, which does not continue the one it signed before.
    #[error("the head of the log was not signed: {0}")]
    Unsigned(String),
    /// The program failed while deciding this command; nothing was written.
    #[error("the program failed while deciding this: {0}")]
    Failed(String),
    /// The database failed; nothing was written.
    #[error("nothing was written")]
    Store(#[source] Arc<StoreError>),
    /// The program is ending.
    #[error("the program is ending: send it again with the same key")]
    Closing,
}

impl From<StoreError> for WriteError {
    fn from(error: StoreError) -> Self {
        Self::Store(Arc::new(error))
    }
}

impl WriteError {
    /// Whether the same command may succeed a little later, unchanged.
    pub fn is_passing(&self) -> bool {
        match self {
            Self::Unsure(_) | Self::ClockBehind { .. } | Self::Closing => true,
            Self::Store(error) => error.is_unavailable(),
            _ => false,
        }
    }
}

/// What the writers have done since they started.
#[derive(Debug, Default)]
pub struct Counters {
    commits: AtomicU64,
    entries: AtomicU64,
    retries: AtomicU64,
}

impl Counters {
    /// Transactions committed.
    pub fn commits(&self) -> u64 {
        self.commits.load(Ordering::Relaxed)
    }

    /// Entries in them.
    pub fn entries(&self) -> u64 {
        self.entries.load(Ordering::Relaxed)
    }

    /// Groups that failed and were carried out one by one.
    pub fn retries(&self) -> u64 {
        self.retries.load(Ordering::Relaxed)
    }
}

type Answer = Result<Receipt, WriteError>;

struct Job {
    site: SiteId,
    command: Command,
    answer: oneshot::Sender<Answer>,
}

/// Every site's writer.
#[derive(Clone)]
pub struct Writers {
    shared: Arc<Shared>,
}

struct Shared {
    db: Db,
    tools: Tools,
    counters: Arc<Counters>,
    published: Arc<Published>,
    desks: Mutex<Desks>,
    seats: Arc<Semaphore>,
}

#[derive(Default)]
struct Desks {
    senders: HashMap<Option<SiteId>, mpsc::Sender<Job>>,
    tasks: Vec<JoinHandle<()>>,
    closing: bool,
}

impl fmt::Debug for Writers {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.debug_struct("Writers").field("counters", &self.shared.counters).finish_non_exhaustive()
    }
}

impl Writers {
    /// Writers for a migrated database; each starts with its first command.
    pub fn new(db: Db, tools: Tools) -> Self {
        let (counters, published, desks) = Default::default();
        let seats = Arc::new(Semaphore::new(SEATS));
        Self { shared: Arc::new(Shared { db, tools, counters, published, desks, seats }) }
    }

    /// Carries a command out, or reports what it did when it was sent before. Dropping the future does not undo it.
    ///
    /// # Errors
    /// [`WriteError`]; if it [is passing](WriteError::is_passing), send the same command again.
    pub async fn submit(&self, site: SiteId, command: Command) -> Result<Receipt, WriteError> {
        let (answer, answered) = oneshot::channel();
        let sender = self.sender(site)?;
        sender.send(Job { site, command, answer }).await.map_err(|_| WriteError::Closing)?;
        answered.await.map_err(|_| WriteError::Closing)?
    }

    /// Whether a site's log continues what is remembered beside the key; otherwise nothing will be written to it.
    ///
    /// # Errors
    /// [`WriteError::Unsigned`], or that it cannot be read.
    pub async fn check_continues(&self, site: &Site) -> Result<(), WriteError> {
        let remembered = continuing::remembered(&self.shared.tools, site)?;
        let mut held = self.shared.db.reader().await?;
        let mut conn = held.conn();
        let head = log::head(&mut conn, site.number).await?;
        continuing::check(&mut conn, site, remembered, &head.tree_head()).await
    }

    /// What was done so far.
    pub fn counters(&self) -> &Counters {
        &self.shared.counters
    }

    /// What readers and writers share.
    pub fn published(&self) -> &Arc<Published> {
        &self.shared.published
    }

    /// Takes no more commands, and returns when those that wait are answered.
    pub async fn close(&self) {
        let tasks = {
            let mut desks = self.desks();
            desks.closing = true;
            desks.senders.clear();
            std::mem::take(&mut desks.tasks)
        };
        for task in tasks {
            if let Err(error) = task.await {
                tracing::error!(%error, "a writer did not end well");
            }
        }
    }

    fn sender(&self, site: SiteId) -> Result<mpsc::Sender<Job>, WriteError> {
        let shared = &self.shared;
        let place = (!shared.db.has_one_writer()).then_some(site);
        let mut desks = self.desks();
        if desks.closing {
            return Err(WriteError::Closing);
        }
        if let Some(sender) = desks.senders.get(&place).filter(|sender| !sender.is_closed()) {
            return Ok(sender.clone());
        }
        let (sender, jobs) = mpsc::channel(4 * GROUP);
        desks.tasks.push(tokio::spawn(group::run(Arc::clone(shared), jobs)));
        desks.senders.insert(place, sender.clone());
        Ok(sender)
    }

    fn desks(&self) -> std::sync::MutexGuard<'_, Desks> {
        self.shared.desks.lock().unwrap_or_else(PoisonError::into_inner)
    }
}
