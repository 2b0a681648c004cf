//! The house: one database, its books, and whoever may open them.

use std::collections::HashMap;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use domain::book::Desk;
use domain::book::command::{Act, Command, Refusal, Stop};
use domain::book::subject::Subject;
use domain::ids::{CommandId, SiteId};
use domain::ledger::entry::{Actor, Via};
use domain::ledger::note::Checkpoint;
use domain::ledger::tree::{Hash, TreeHead};
use domain::stamp::{Micros, Stamp};
use store::Db;
use store::proofs::Prover;
use store::sites::{self, Site};
use store::writer::{Receipt, Tools, Writers};
use uuid::Uuid;

use crate::caller::Caller;
use crate::clock::Clock;
use crate::error::HouseError;
use crate::ids::Ids;
use crate::passwords::Passwords;
use crate::secrets::Secrets;
use crate::tokens::Tokens;

/// Everything the use cases share. Clones are the same house.
#[derive(Clone, Debug)]
pub struct House {
    pub(crate) inner: Arc<Inner>,
}

#[derive(Debug)]
pub(crate) struct Inner {
    pub(crate) db: Db,
    pub(crate) writers: Writers,
    pub(crate) prover: Prover,
    pub(crate) clock: Clock,
    pub(crate) secrets: Arc<Secrets>,
    pub(crate) passwords: Passwords,
    pub(crate) tokens: Tokens,
    /// Sites asked for before; what is said of a site here never changes.
    sites: Mutex<HashMap<SiteId, Site>>,
}

impl House {
    /// Opens the house on a migrated database.
    ///
    /// # Errors
    /// [`HouseError`] if the secrets cannot serve, or a simulated clock meets a real book.
    pub async fn open(db: Db, secrets: Secrets, clock: Clock) -> Result<Self, HouseError> {
        let secrets = Arc::new(secrets);
        let tokens = Tokens::new(secrets.token_key(), "tallystave")?;
        let writers = Writers::new(db.clone(), tools(&secrets, &clock)?);
        let inner = Inner {
            db,
            writers,
            prover: Prover::default(),
            clock,
            secrets,
            passwords: Passwords::new()?,
            tokens,
            sites: Mutex::default(),
        };
        let house = Self { inner: Arc::new(inner) };
        house.only_simulations_on_a_driven_clock().await?;
        house.continues_what_was_signed().await?;
        Ok(house)
    }

    /// A book put back from an older state, or changed behind our back, is not signed again under the same key.
    async fn continues_what_was_signed(&self) -> Result<(), HouseError> {
        for site in self.sites().await? {
            self.inner.writers.check_continues(&site).await?;
        }
        Ok(())
    }

    /// A driven clock opens only books that were founded as simulations, and goes on from their last entry.
    async fn only_simulations_on_a_driven_clock(&self) -> Result<(), HouseError> {
        if !self.inner.clock.is_simulated() {
            return Ok(());
        }
        for site in self.sites().await? {
            if !self.is_simulation(&site).await? {
                return Err(HouseError::Failed(format!(
                    "site {} is a real book: start without a simulated clock",
                    site.code
                )));
            }
            let mut held = self.inner.db.reader().await?;
            let last = store::log::head(&mut held.conn(), site.number).await?.last_recorded_at;
            if last > self.now() {
                self.inner.clock.set(last)?;
            }
        }
        Ok(())
    }

    async fn is_simulation(&self, site: &Site) -> Result<bool, HouseError> {
        let desk = self.desk(site, &[site.id.into()]).await?;
        let founded = desk.site().ok().and_then(|state| state.founded.clone());
        Ok(founded.is_none_or(|founded| founded.simulation))
    }

    /// The time, by this house's clock.
    pub fn now(&self) -> Micros {
        self.inner.clock.now()
    }

    /// Whether the clock is driven by hand.
    pub fn is_simulated(&self) -> bool {
        self.inner.clock.is_simulated()
    }

    /// Drives a simulated clock forward.
    ///
    /// # Errors
    /// [`HouseError::Clock`].
    pub fn set_clock(&self, to: Micros) -> Result<(), HouseError> {
        Ok(self.inner.clock.set(to)?)
    }

    /// A new id.
    ///
    /// # Errors
    /// [`HouseError::Failed`] without randomness.
    pub fn draw<T: From<Uuid>>(&self) -> Result<T, HouseError> {
        Ok(Ids.draw(self.now())?)
    }

    /// Now, on the wall clock of a site.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn local_now(&self, site: &Site) -> Result<Stamp, HouseError> {
        // A book's time zone is that of its founding, which is not amended: any state of the site knows it.
        let zone = |desk: &Desk| {
            desk.subject(site.id.into())?;
            let founded = desk.site().ok().and_then(|site| site.founded.as_ref());
            Ok(founded.map(|founded| founded.time_zone.clone()))
        };
        let zone = self.ask_at_hand(site, zone).await?;
        Ok(Stamp::in_zone(self.now(), zone.as_deref().unwrap_or("UTC")))
    }

    /// Every site of this house.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn sites(&self) -> Result<Vec<Site>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(sites::all(&mut held.conn()).await?)
    }

    /// The site of that id.
    ///
    /// # Errors
    /// [`HouseError::Refused`] as unknown.
    pub async fn site(&self, id: SiteId) -> Result<Site, HouseError> {
        if let Some(known) = self.known_sites().get(&id) {
            return Ok(known.clone());
        }
        let mut held = self.inner.db.reader().await?;
        let found = sites::by_id(&mut held.conn(), id).await?;
        let site = found.ok_or_else(|| HouseError::Refused(Refusal::unknown("site")))?;
        self.known_sites().insert(id, site.clone());
        Ok(site)
    }

    fn known_sites(&self) -> MutexGuard<'_, HashMap<SiteId, Site>> {
        self.inner.sites.lock().unwrap_or_else(PoisonError::into_inner)
    }

    /// Carries out what somebody asks, once.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn submit(&self, asked: Asked) -> Result<Receipt, HouseError> {
        let Asked { caller, key, print, expects, act } = asked;
        let command = Command {
            id: key,
            print,
            actor: Actor::Person(caller.person),
            roles: caller.roles.iter().copied().collect(),
            via: Via::Api,
            expects,
            act,
        };
        Ok(self.inner.writers.submit(caller.site, command).await?)
    }

    /// A desk with these subjects as they stand now.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn desk(&self, site: &Site, subjects: &[Subject]) -> Result<Desk, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let mut desk = Desk::new(site.id);
        let published = self.inner.writers.published();
        published.lay_subjects(&mut held.conn(), site, &mut desk, subjects).await?;
        Ok(desk)
    }

    /// Asks something of a desk, laying on it what is needed, as it stands now, until the answer comes.
    ///
    /// # Errors
    /// [`HouseError::Refused`], or the store's.
    pub async fn ask<T>(
        &self,
        site: &Site,
        desk: &mut Desk,
        question: impl Fn(&Desk) -> Result<T, Stop>,
    ) -> Result<T, HouseError> {
        self.answer(site, desk, Age::Now, question).await
    }

    /// Asks something that does not turn on the newest state, or that the writer asks again under its lock.
    pub(crate) async fn ask_at_hand<T>(
        &self,
        site: &Site,
        question: impl Fn(&Desk) -> Result<T, Stop>,
    ) -> Result<T, HouseError> {
        self.answer(site, &mut Desk::new(site.id), Age::AtHand, question).await
    }

    async fn answer<T>(
        &self,
        site: &Site,
        desk: &mut Desk,
        age: Age,
        question: impl Fn(&Desk) -> Result<T, Stop>,
    ) -> Result<T, HouseError> {
        let published = self.inner.writers.published();
        let mut reader = None;
        loop {
            let needs = match question(desk) {
                Ok(answer) => return Ok(answer),
                Err(Stop::Refused(refusal)) => return Err(HouseError::Refused(refusal)),
                Err(Stop::Need(needs)) => needs,
            };
            let needs = match age {
                Age::Now => needs,
                Age::AtHand => published.lay_known(site, desk, needs),
            };
            if needs.is_empty() {
                continue;
            }
            let held = match &mut reader {
                Some(held) => held,
                none => none.insert(self.inner.db.reader().await?),
            };
            published.lay(&mut held.conn(), site, desk, &needs).await?;
        }
    }

    /// What the writers have done.
    pub fn counters(&self) -> &store::writer::Counters {
        self.inner.writers.counters()
    }

    /// Whether the database answers and every log's head is signed as it should be.
    ///
    /// # Errors
    /// [`HouseError`] with what is not ready.
    pub async fn ready(&self) -> Result<(), HouseError> {
        store::migrate::check(&self.inner.db).await?;
        for site in self.sites().await? {
            self.head(&site).await?;
        }
        self.continues_what_was_signed().await
    }

    /// The newest head of a site's log, its signature checked.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn head(&self, site: &Site) -> Result<store::log::Head, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let head = store::log::head(&mut held.conn(), site.number).await?;
        if head.frontier.size() > 0 {
            let key = self.verifier(&site.origin)?;
            Checkpoint::verify(&head.note, &key)
                .map_err(|e| HouseError::Failed(format!("the head's signature: {e}")))?;
        }
        Ok(head)
    }

    /// The public half of the log's key under a site's origin.
    ///
    /// # Errors
    /// [`HouseError::Failed`] if the origin cannot name a key.
    pub fn verifier(&self, origin: &str) -> Result<domain::ledger::note::VerifierKey, HouseError> {
        let key = self.inner.secrets.log_key().verifying_key();
        domain::ledger::note::VerifierKey::new(origin, key)
            .map_err(|e| HouseError::Failed(e.to_string()))
    }

    /// Takes no more commands, answers those that wait, closes the database.
    pub async fn close(&self) {
        self.inner.writers.close().await;
        self.inner.db.close().await;
    }
}

/// How old a state may be that an answer is found on.
#[derive(Clone, Copy)]
enum Age {
    /// As the database has it now.
    Now,
    /// As it was last read or written here, however long ago.
    AtHand,
}

/// One thing asked, ready to be written.
#[derive(Debug)]
pub struct Asked {
    /// Who asks.
    pub caller: Caller,
    /// The idempotency key.
    pub key: CommandId,
    /// SHA-256 of the parsed request.
    pub print: [u8; 32],
    /// The running number the caller last saw.
    pub expects: Option<(Subject, u64)>,
    /// What.
    pub act: Act,
}

/// Clock, ids and signatures for the writer.
fn tools(secrets: &Arc<Secrets>, clock: &Clock) -> Result<Tools, HouseError> {
    let last = Arc::new(secrets.last_signed().map_err(|e| HouseError::Failed(e.to_string()))?);
    let memory = Arc::clone(&last);
    let (time, id_time, key) = (clock.clone(), clock.clone(), Arc::clone(secrets));
    Ok(Tools {
        clock: Arc::new(move || time.now()),
        // Without randomness the command fails, and only it: the writer catches the panic.
        draw: Arc::new(move || Ids.draw(id_time.now()).unwrap_or_else(|error| panic!("{error}"))),
        sign: Arc::new(move |origin: &str, size: u64, root: &Hash| {
            let checkpoint = Checkpoint { origin: origin.to_owned(), size, root: *root };
            checkpoint.sign(key.log_key()).map_err(|e| e.to_string())
        }),
        committed: Arc::new(move |origin: &str, head: &TreeHead| {
            if let Err(error) = last.store(origin, *head) {
                tracing::error!(%error, origin, "the head could not be remembered beside the key");
            }
        }),
        remembered: Arc::new(move |origin: &str| {
            memory.last(origin).map_err(|error| error.to_string())
        }),
    })
}
