//! Looking things up: lists by projection, states by fold, the log as stored.

use std::sync::Arc;

use domain::book::assessing::{Question, assess};
use domain::book::command::Refusal;
use domain::book::in_force::InForce;
use domain::book::subject::{Subject, SubjectKind};
use domain::book::table::{Cell, Row, Table};
use domain::book::tables::{BATCH, CODE, DESCRIBED, DEVIATION, LOT};
use domain::checks::Assessment;
use domain::ids::{BatchId, DeviationId, EntryId, LotId};
use domain::ledger::entry::{Actor, Entry};
use domain::ledger::tree::Hash;
use store::log::Stored;
use store::proofs::NoProof;
use store::rows::{Order, Select};
use store::sites::Site;
use uuid::Uuid;

use crate::caller::Caller;
use crate::error::HouseError;
use crate::house::House;

impl House {
    /// Lots, newest first.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn lots(
        &self,
        site: &Site,
        code: Option<&str>,
        status: Option<&str>,
        limit: u16,
    ) -> Result<Vec<LotId>, HouseError> {
        let mut select = Select::of(&LOT).order(Order::Falling("received_at"));
        if let Some(status) = status {
            select = select.equal("status", status);
        }
        self.coded(site, &LOT, select, SubjectKind::Lot, code, limit).await
    }

    /// Batches, newest first.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn batches(
        &self,
        site: &Site,
        code: Option<&str>,
        limit: u16,
    ) -> Result<Vec<BatchId>, HouseError> {
        let select = Select::of(&BATCH).order(Order::Falling("opened_at"));
        self.coded(site, &BATCH, select, SubjectKind::Batch, code, limit).await
    }

    /// Deviations, newest first.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn deviations(
        &self,
        site: &Site,
        limit: u16,
    ) -> Result<Vec<DeviationId>, HouseError> {
        let select = Select::of(&DEVIATION).order(Order::Falling("opened_at"));
        self.coded(site, &DEVIATION, select, SubjectKind::Deviation, None, limit).await
    }

    /// Materials, parties, vessels or instruments, by code.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn described(&self, site: &Site, kind: SubjectKind) -> Result<Vec<Uuid>, HouseError> {
        let select = Select::of(&DESCRIBED).equal("kind", kind.name()).order(Order::Rising("code"));
        let rows = self.rows(site, &select).await?;
        Ok(rows.iter().filter_map(|row| id_in(row, "id")).collect())
    }

    async fn coded<T: From<Uuid>>(
        &self,
        site: &Site,
        table: &'static Table,
        select: Select<'_>,
        kind: SubjectKind,
        code: Option<&str>,
        limit: u16,
    ) -> Result<Vec<T>, HouseError> {
        let key = table.columns.first().map_or("", |column| column.name);
        let Some(code) = code else {
            let rows = self.rows(site, &select.limit(limit.into())).await?;
            return Ok(rows.iter().filter_map(|row| id_in(row, key)).map(T::from).collect());
        };
        let by_code = Select::of(&CODE).equal("kind", kind.name()).equal("code", code);
        let rows = self.rows(site, &by_code).await?;
        Ok(rows.iter().filter_map(|row| id_in(row, "id")).map(T::from).collect())
    }

    async fn rows(&self, site: &Site, select: &Select<'_>) -> Result<Vec<Row>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(select.fetch(&mut held.conn(), site.number).await?)
    }

    /// Every entry about a subject, in the log's order.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn entries_of(
        &self,
        site: &Site,
        subject: Subject,
    ) -> Result<Vec<Entry>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let stored =
            store::log::entries_of(&mut held.conn(), site.number, &subject, 0, i64::MAX).await?;
        Ok(stored.iter().map(Stored::entry).collect::<Result<_, _>>()?)
    }

    /// One entry as it was written, and how it reads now.
    ///
    /// # Errors
    /// [`HouseError::Refused`] as unknown.
    pub async fn entry(
        &self,
        caller: &Caller,
        id: EntryId,
    ) -> Result<(Arc<Entry>, Arc<InForce>), HouseError> {
        let site = self.site(caller.site).await?;
        let mut desk = self.desk(&site, &[]).await?;
        self.ask(&site, &mut desk, |desk| {
            Ok((Arc::clone(desk.entry(id)?), desk.entry_in_force(id)?))
        })
        .await
    }

    /// How a batch stands now: its nitrogen account and how much of its sugar is gone, by the same engine that answers
    /// proposals.
    ///
    /// # Errors
    /// [`HouseError`].
    pub async fn account(&self, caller: &Caller, batch: BatchId) -> Result<Assessment, HouseError> {
        let site = self.site(caller.site).await?;
        let mut desk = self.desk(&site, &[site.id.into(), batch.into()]).await?;
        let now = self.now();
        let question = Question::nothing(batch, now, Actor::Person(caller.person));
        let found = self.ask(&site, &mut desk, |desk| assess(desk, &question, now)).await?;
        Ok(found.assessment)
    }

    /// Entries as stored.
    ///
    /// # Errors
    /// [`HouseError::Store`].
    pub async fn stored_entries(
        &self,
        site: &Site,
        from: u64,
        limit: u16,
    ) -> Result<Vec<Stored>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        Ok(store::log::entries(&mut held.conn(), site.number, from, limit.into()).await?)
    }

    /// That an entry is among the first `size`.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if there is nothing to prove.
    pub async fn inclusion(
        &self,
        site: &Site,
        index: u64,
        size: u64,
    ) -> Result<Vec<Hash>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let proof = self.inner.prover.inclusion(&mut held.conn(), site.number, index, size).await;
        proof.map_err(no_proof)
    }

    /// That the log of `new` entries begins with that of `old`.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if there is nothing to prove.
    pub async fn consistency(
        &self,
        site: &Site,
        old: u64,
        new: u64,
    ) -> Result<Vec<Hash>, HouseError> {
        let mut held = self.inner.db.reader().await?;
        let proof = self.inner.prover.consistency(&mut held.conn(), site.number, old, new).await;
        proof.map_err(no_proof)
    }
}

fn no_proof(error: NoProof) -> HouseError {
    match error {
        NoProof::Question(question) => {
            HouseError::Refused(Refusal::meaningless("", question.to_string()))
        }
        NoProof::Store(store) => store.into(),
    }
}

fn id_in(row: &Row, column: &str) -> Option<Uuid> {
    let place = row.table.columns.iter().position(|known| known.name == column)?;
    match row.cells.get(place)? {
        Cell::Bytes(bytes) => Uuid::from_slice(bytes).ok(),
        _ => None,
    }
}
