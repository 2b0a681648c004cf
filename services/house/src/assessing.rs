//! Asking the checks on a snapshot, outside the writer.

use domain::book::assessing::{Prepared, Question, assess};
use domain::book::command::Propose;
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

    /// Assesses a proposal on the states at hand and has it recorded; the writer takes the answer if nothing has moved.
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
        let site = self.site(caller.site).await?;
        let now = self.now();
        // The writer asks anew if anything has moved; if this fails it finds the same fault, under the lock, and says
        // so.
        let prepared = self.ask_at_hand(&site, |desk| assess(desk, &question, now)).await;
        propose.prepared = prepared.ok().map(Box::new);
        self.submit(asked(propose)).await
    }
}
