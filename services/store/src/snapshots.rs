//! States of subjects for readers, who stand outside the writer's lock.
//!
//! What was folded once is kept, and is valid only as long as its number equals the subject's counter in the
//! database: so several programs on one database and failed commits cannot show a stale state. What has been written
//! since is taken on top of it. A failover that lost acknowledged entries shows when this instance next writes: the log
//! does not continue what it signed, and all states are forgotten. Rule sets are kept by the digest of their text, and
//! never change.

use std::collections::HashMap;
use std::collections::hash_map::Entry;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};
use std::time::{Duration, Instant};

use domain::book::command::Need;
use domain::book::subject::{Subject, SubjectKind};
use domain::book::{Desk, Loaded};
use domain::rules::RuleSet;

use crate::sites::{Site, SiteNumber};
use crate::{Conn, StoreError, log, read};

/// How many states are kept before all are dropped.
const ROOM: usize = 10_000;

type States = HashMap<(SiteNumber, Subject), Kept>;

/// A state, and when it was last known to be the newest.
#[derive(Clone, Debug)]
struct Kept {
    loaded: Arc<Loaded>,
    known_at: Instant,
}

/// States that somebody has read.
#[derive(Debug, Default)]
pub struct Published {
    states: Mutex<States>,
    rule_sets: Mutex<HashMap<String, Arc<RuleSet>>>,
}

impl Published {
    /// Lays on a desk what a question needs.
    ///
    /// # Errors
    /// [`StoreError`].
    pub async fn lay(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        desk: &mut Desk,
        needs: &[Need],
    ) -> Result<(), StoreError> {
        let mut subjects = Vec::new();
        for need in needs {
            match need {
                Need::Subject(subject) => subjects.push(*subject),
                Need::Blob(digest) => self.lay_rule_set(conn, site, desk, digest, need).await?,
                Need::Code(..) | Need::Entry(_) => read::lay(conn, site, desk, need).await?,
            }
        }
        self.lay_subjects(conn, site, desk, &subjects).await
    }

    /// Lays subjects on a desk as they stand now. One that does not exist has no entries.
    ///
    /// # Errors
    /// [`StoreError`].
    pub async fn lay_subjects(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        desk: &mut Desk,
        subjects: &[Subject],
    ) -> Result<(), StoreError> {
        let asked_at = Instant::now();
        let counters = log::counts(conn, site.number, subjects).await?;
        for subject in subjects {
            let n = counters.get(subject).copied().unwrap_or_default();
            let place = (site.number, *subject);
            let older = self.states().get(&place).map(|kept| Arc::clone(&kept.loaded));
            let loaded = read::load(conn, site, *subject, n, older).await?;
            self.keep(place, &loaded, asked_at);
            desk.lend(*subject, loaded);
        }
        Ok(())
    }

    /// Lays on a desk what is at hand of what a question needs, however old; gives back the rest. An answer found on
    /// it must be held against the counters before it counts.
    pub fn lay_known(&self, site: &Site, desk: &mut Desk, needs: Vec<Need>) -> Vec<Need> {
        let (states, rule_sets) = (self.states(), self.rule_sets());
        let mut lay = |need: &Need| match need {
            Need::Subject(subject) => states
                .get(&(site.number, *subject))
                .map(|kept| desk.lend(*subject, Arc::clone(&kept.loaded))),
            Need::Blob(digest) => {
                rule_sets.get(digest).map(|set| desk.lend_rule_set(digest, Arc::clone(set)))
            }
            Need::Code(..) | Need::Entry(_) => None,
        };
        needs.into_iter().filter(|need| lay(need).is_none()).collect()
    }

    /// A subject as it stood at most so long ago, if it was read or written since.
    pub fn recent(&self, site: &Site, subject: Subject, within: Duration) -> Option<Arc<Loaded>> {
        let states = self.states();
        let kept = states.get(&(site.number, subject))?;
        (kept.known_at.elapsed() < within).then(|| Arc::clone(&kept.loaded))
    }

    async fn lay_rule_set(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        desk: &mut Desk,
        digest: &str,
        need: &Need,
    ) -> Result<(), StoreError> {
        let kept = self.rule_sets().get(digest).cloned();
        if let Some(set) = kept {
            desk.lend_rule_set(digest, set);
            return Ok(());
        }
        read::lay(conn, site, desk, need).await?;
        if let Some(set) = desk.rule_set(digest) {
            self.rule_sets().insert(digest.to_owned(), Arc::clone(set));
        }
        Ok(())
    }

    /// Takes the writer's newer state of a subject that somebody reads, and of every person: what they may do must be
    /// known here at once.
    pub(crate) fn renew(
        &self,
        site: SiteNumber,
        subject: Subject,
        loaded: &Arc<Loaded>,
        locked: Instant,
    ) {
        let place = (site, subject);
        if subject.kind == SubjectKind::Person || self.states().contains_key(&place) {
            self.keep(place, loaded, locked);
        }
    }

    /// Forgets every state: the log turned out not to be the one that they were folded from.
    pub(crate) fn clear(&self) {
        self.states().clear();
    }

    /// Keeps a state unless one was kept that the database was asked for later.
    fn keep(&self, place: (SiteNumber, Subject), loaded: &Arc<Loaded>, known_at: Instant) {
        let mut states = self.states();
        if states.len() >= ROOM {
            states.clear();
        }
        let newer = Kept { loaded: Arc::clone(loaded), known_at };
        match states.entry(place) {
            Entry::Occupied(kept) if known_at < kept.get().known_at => {}
            Entry::Occupied(mut kept) => {
                kept.insert(newer);
            }
            Entry::Vacant(free) => {
                free.insert(newer);
            }
        }
    }

    fn states(&self) -> MutexGuard<'_, States> {
        self.states.lock().unwrap_or_else(PoisonError::into_inner)
    }

    fn rule_sets(&self) -> MutexGuard<'_, HashMap<String, Arc<RuleSet>>> {
        self.rule_sets.lock().unwrap_or_else(PoisonError::into_inner)
    }
}
