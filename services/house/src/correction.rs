//! When the server's clock was found ahead and set back: an operator says so in the book, and writing goes on.

use std::collections::BTreeSet;

use domain::book::command::{Act, Command, CorrectClock, Refusal};
use domain::ids::CommandId;
use domain::ledger::canonical::digest;
use domain::ledger::entry::{Actor, Via};
use domain::stamp::Micros;
use store::sites;

use crate::error::HouseError;
use crate::house::House;

impl House {
    /// Writes `clock.corrected` into a site's log: from now on the clock counts again, although it shows less than the
    /// last entry. Gives when the log ended and what the clock shows.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if there is no such site, or its log is not ahead of the clock.
    pub async fn correct_clock(
        &self,
        site: &str,
        reason: String,
    ) -> Result<(Micros, Micros), HouseError> {
        let mut held = self.inner.db.reader().await?;
        let found = sites::by_code(&mut held.conn(), site).await?;
        let site = found.ok_or_else(|| HouseError::Refused(Refusal::unknown("site")))?;
        let last = store::log::head(&mut held.conn(), site.number).await?.last_recorded_at;
        drop(held);
        let now = self.now();
        if now >= last {
            return Err(HouseError::Refused(Refusal::conflict(format!(
                "the clock shows {now} and the last entry {last}: there is nothing to correct"
            ))));
        }
        let at = self.local_now(&site).await?;
        let asked = serde_json::json!({"correct_clock": reason});
        let print = digest(&asked)
            .map_err(|error| HouseError::Refused(Refusal::meaningless("", error.to_string())))?;
        let command = Command {
            id: self.draw::<CommandId>()?,
            print: *print.as_bytes(),
            actor: Actor::System,
            roles: BTreeSet::new(),
            via: Via::System,
            expects: None,
            act: Act::CorrectClock(CorrectClock { reason, at }),
        };
        self.inner.writers.submit(site.id, command).await?;
        Ok((last, now))
    }
}
