//! Asking the checks on a snapshot, outside the writer.

use domain::book::Desk;
use domain::book::assessing::{Prepared, Question, assess};
use domain::book::command::{Propose, Stop};
use store::writer::Receipt;

use crate::caller::Caller;
use crate::error::HouseError;
use crate::house::{Asked, House};

impl House {
    /// What the checks say to a question now; nothing is recorded.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn assess(
        &self,
        caller: &Caller,
        question: &Question,
    ) -> Result<Prepared, HouseError> {
        let site = self.site(caller.site).await?;
        let mut desk = self.desk(&site, &[site.id.into(), question.batch.into()]).await?;
        let now = self.now();
        self.ask(&site, &mut desk, |desk| assess(desk, question, now)).await
    }

    /// Assesses a proposal on a snapshot and has it recorded; the writer takes the answer if nothing has moved.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn propose(
        &self,
        caller: Caller,
        asked: impl FnOnce(Propose) -> Asked,
        mut propose: Propose,
    ) -> Result<Receipt, HouseError> {
        let question = Question {
            batch: propose.batch,
            at: propose.planned_at.at,
            draws: propose.draws.clone(),
            carrier_water: propose.carrier_water.clone(),
            preparation: propose.preparation,
            already_done: false,
            actor: domain::ledger::entry::Actor::Person(caller.person),
        };
        // If this fails the writer finds the same fault, under the lock, and says so.
        propose.prepared = self.prepare(&caller, &question).await.ok().map(Box::new);
        self.submit(asked(propose)).await
    }

    /// The same on what is at hand: the writer asks anew if anything has moved.
    async fn prepare(&self, caller: &Caller, question: &Question) -> Result<Prepared, HouseError> {
        let site = self.site(caller.site).await?;
        let published = self.inner.writers.published();
        let (mut desk, now) = (Desk::new(site.id), self.now());
        loop {
            match assess(&desk, question, now) {
                Ok(prepared) => return Ok(prepared),
                Err(Stop::Refused(refusal)) => return Err(HouseError::Refused(refusal)),
                Err(Stop::Need(needs)) => {
                    let unknown = published.lay_known(&site, &mut desk, needs);
                    if !unknown.is_empty() {
                        let mut held = self.inner.db.reader().await?;
                        published.lay(&mut held.conn(), &site, &mut desk, &unknown).await?;
                    }
                }
            }
        }
    }
}
