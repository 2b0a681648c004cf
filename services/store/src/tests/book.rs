//! A book on either engine, served as in production: on PostgreSQL under the serving role.

use std::sync::atomic::{AtomicI64, AtomicU64, Ordering};
use std::sync::{Arc, Mutex};

use domain::book::command::{Act, Command};
use domain::book::role::Role;
use domain::ids::{CommandId, PersonId, SiteId};
use domain::ledger::entry::{Actor, Via};
use domain::ledger::note::{Checkpoint, VerifierKey};
use domain::ledger::tree::{Hash, TreeHead};
use domain::stamp::Micros;
use ed25519_dalek::SigningKey;
use tempfile::TempDir;
use tests::postgres::Cluster;
use uuid::Uuid;

use crate::migrate::{SERVING_ROLE, migrate};
use crate::sites::{self, Site};
use crate::writer::{Receipt, Tools, WriteError, Writers};
use crate::{Db, Place, rebuild, verify};

/// The name of the log and its key.
pub(super) const ORIGIN: &str = "ledger.example/cellar";

/// 2025-09-11T17:00:00Z.
pub(super) const START: i64 = 1_757_610_000_000_000;

/// Where a database is, kept as long as the test runs.
pub(super) enum Ground {
    File(TempDir),
    Server(Arc<Cluster>, String),
}

impl Ground {
    pub(super) fn file() -> Self {
        Self::File(tempfile::tempdir().unwrap())
    }

    pub(super) fn server() -> Self {
        let cluster = Cluster::shared();
        let name = cluster.create_database();
        Self::Server(cluster, name)
    }

    /// As the owner.
    pub(super) async fn owner(&self) -> Db {
        let place = match self {
            Self::File(directory) => Place::Directory(directory.path().to_owned()),
            Self::Server(cluster, name) => Place::Url(cluster.url(name)),
        };
        Db::open(&place).await.unwrap()
    }

    /// As the program serves.
    pub(super) async fn serving(&self) -> Db {
        let Self::Server(cluster, name) = self else { return self.owner().await };
        cluster.let_in(name, SERVING_ROLE);
        Db::open(&Place::Url(cluster.url_as(SERVING_ROLE, name))).await.unwrap()
    }
}

pub(super) struct Book {
    pub(super) ground: Ground,
    pub(super) db: Db,
    pub(super) site: Site,
    pub(super) writers: Writers,
    pub(super) clock: Arc<AtomicI64>,
    pub(super) committed: Arc<Mutex<Vec<u64>>>,
    /// How many ids to draw until one draw fails with a panic; negative: never.
    pub(super) fuse: Arc<AtomicI64>,
    next: AtomicU64,
}

/// Runs a test on a fresh, founded book of each engine.
pub(super) async fn on_both(test: impl AsyncFn(&Book)) {
    for ground in [Ground::file(), Ground::server()] {
        let book = Book::open(ground).await;
        eprintln!("on {}", book.db.engine());
        super::acts::begin(&book).await;
        test(&book).await;
        book.writers.close().await;
        book.db.close().await;
    }
}

impl Book {
    pub(super) async fn open(ground: Ground) -> Self {
        let owner = ground.owner().await;
        migrate(&owner).await.unwrap();
        owner.close().await;
        let db = ground.serving().await;
        let mut tx = db.begin().await.unwrap();
        let site = sites::register(&mut tx.conn(), site_id(1), "cellar", ORIGIN).await.unwrap();
        tx.commit().await.unwrap();
        let (clock, committed) = (Arc::new(AtomicI64::new(START)), Arc::default());
        let fuse = Arc::new(AtomicI64::new(-1));
        let writers = Writers::new(db.clone(), tools(0, &clock, &committed, &fuse));
        Self { ground, db, site, writers, clock, committed, fuse, next: AtomicU64::new(1) }
    }

    pub(super) fn command(&self, act: Act) -> Command {
        let number = self.next.fetch_add(1, Ordering::Relaxed);
        Command {
            id: CommandId(Uuid::from_u128(0xc0 << 120 | u128::from(number))),
            print: Hash::of(format!("{act:?}").as_bytes()).0,
            actor: Actor::Person(person()),
            roles: Role::ALL.into(),
            via: Via::Api,
            expects: None,
            act,
        }
    }

    pub(super) async fn act(&self, act: Act) -> Result<Receipt, WriteError> {
        self.submit(self.command(act)).await
    }

    pub(super) async fn submit(&self, command: Command) -> Result<Receipt, WriteError> {
        self.writers.submit(self.site.id, command).await
    }

    /// All of them at once, so that they fall into few groups.
    pub(super) async fn together(
        &self,
        commands: Vec<Command>,
    ) -> Vec<Result<Receipt, WriteError>> {
        let tasks: Vec<_> = commands
            .into_iter()
            .map(|command| {
                let (writers, site) = (self.writers.clone(), self.site.id);
                tokio::spawn(async move { writers.submit(site, command).await })
            })
            .collect();
        let mut answers = Vec::new();
        for task in tasks {
            answers.push(task.await.unwrap());
        }
        answers
    }

    pub(super) async fn size(&self) -> u64 {
        self.head().await.size
    }

    pub(super) async fn head(&self) -> TreeHead {
        let mut held = self.db.reader().await.unwrap();
        crate::log::head(&mut held.conn(), self.site.number).await.unwrap().tree_head()
    }

    /// The whole log verifies and every table equals a fresh replay.
    pub(super) async fn deep_check(&self) -> verify::Report {
        let report = verify::verify(&self.db, &self.site).await.unwrap();
        assert_eq!(report.fault, None);
        assert_eq!(rebuild::check(&self.db, &self.site).await.unwrap(), []);
        report
    }
}

pub(super) fn site_id(number: u128) -> SiteId {
    SiteId(Uuid::from_u128(0x51 << 120 | number))
}

pub(super) fn person() -> PersonId {
    PersonId(Uuid::from_u128(0xbe << 120))
}

pub(super) fn key() -> SigningKey {
    SigningKey::from_bytes(&[7; 32])
}

pub(super) fn public_key() -> String {
    VerifierKey::new(ORIGIN, key().verifying_key()).unwrap().to_string()
}

pub(super) fn tools(
    series: u64,
    clock: &Arc<AtomicI64>,
    committed: &Arc<Mutex<Vec<u64>>>,
    fuse: &Arc<AtomicI64>,
) -> Tools {
    let (clock, committed, fuse) = (Arc::clone(clock), Arc::clone(committed), Arc::clone(fuse));
    let drawn = AtomicU64::new(series << 32);
    Tools {
        clock: Arc::new(move || Micros(clock.load(Ordering::Relaxed))),
        draw: Arc::new(move || {
            assert_ne!(fuse.fetch_sub(1, Ordering::Relaxed), 0, "no more ids");
            let number = drawn.fetch_add(1, Ordering::Relaxed);
            Uuid::from_slice(&Hash::of(&number.to_be_bytes()).0[..16]).unwrap()
        }),
        sign: Arc::new(|origin, size, root| {
            let checkpoint = Checkpoint { origin: origin.to_owned(), size, root: *root };
            checkpoint.sign(&key()).map_err(|error| error.to_string())
        }),
        committed: Arc::new(move |_, head| committed.lock().unwrap().push(head.size)),
        remembered: Arc::new(|_| Ok(None)),
    }
}
