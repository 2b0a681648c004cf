//! States of subjects for readers, who stand outside the writer's lock.
//!
//! What was folded once is kept, and is valid only as long as its number equals the subject's counter in the
//! database: so several programs on one database, failed commits and a failover cannot show a stale state.

use std::collections::HashMap;
use std::sync::{Arc, Mutex, MutexGuard, PoisonError};

use domain::book::subject::Subject;
use domain::book::{Desk, Loaded};

use crate::sites::{Site, SiteNumber};
use crate::{Conn, StoreError, log, read};

/// How many states are kept before all are dropped.
const ROOM: usize = 10_000;

type States = HashMap<(SiteNumber, Subject), Arc<Loaded>>;

/// States that somebody has read.
#[derive(Debug, Default)]
pub struct Published {
    states: Mutex<States>,
}

impl Published {
    /// A subject as it stands now. One that does not exist has no entries.
    ///
    /// # Errors
    /// [`StoreError`].
    pub async fn load(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        subject: Subject,
    ) -> Result<Arc<Loaded>, StoreError> {
        let n = log::count_of(conn, site.number, &subject).await?;
        let place = (site.number, subject);
        if let Some(loaded) = self.states().get(&place).filter(|loaded| loaded.n == n) {
            return Ok(Arc::clone(loaded));
        }
        let mut desk = Desk::new(site.id);
        read::lay_subject(conn, site, &mut desk, subject, n).await?;
        let loaded = desk
            .loaded(&subject)
            .cloned()
            .ok_or_else(|| StoreError::inconsistent(format!("{subject} cannot be loaded")))?;
        self.keep(place, Arc::clone(&loaded));
        Ok(loaded)
    }

    /// Takes the writer's newer state of a subject that somebody reads.
    pub(crate) fn renew(&self, site: SiteNumber, subject: Subject, loaded: &Arc<Loaded>) {
        if let Some(kept) = self.states().get_mut(&(site, subject)) {
            *kept = Arc::clone(loaded);
        }
    }

    fn keep(&self, place: (SiteNumber, Subject), loaded: Arc<Loaded>) {
        let mut states = self.states();
        if states.len() >= ROOM {
            states.clear();
        }
        states.insert(place, loaded);
    }

    fn states(&self) -> MutexGuard<'_, States> {
        self.states.lock().unwrap_or_else(PoisonError::into_inner)
    }
}
