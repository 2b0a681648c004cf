//! Proofs that an entry is in the log, and that a log continues an older one.

use std::collections::HashMap;
use std::sync::{Mutex, PoisonError};

use domain::ledger::tiles::Edge;
use domain::ledger::tree::{Hash, ProofError, ProofPlan};

use crate::sites::SiteNumber;
use crate::{Conn, StoreError, log, tiles};

/// Why there is no proof.
#[derive(Debug, thiserror::Error)]
pub enum NoProof {
    /// The log is not that long, or the question proves nothing.
    #[error(transparent)]
    Question(#[from] ProofError),
    /// The store could not answer.
    #[error(transparent)]
    Store(#[from] StoreError),
}

/// Makes proofs; remembers each log's edge, so that a proof reads few rows however long the log is.
#[derive(Debug, Default)]
pub struct Prover {
    edges: Mutex<HashMap<SiteNumber, Edge>>,
}

impl Prover {
    /// That the entry `seq` is among the first `among` (RFC 9162, section 2.1.3).
    ///
    /// # Errors
    /// [`NoProof`].
    pub async fn inclusion(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
        seq: u64,
        among: u64,
    ) -> Result<Vec<Hash>, NoProof> {
        self.prove(conn, site, &ProofPlan::inclusion(seq, among)?, among).await
    }

    /// That the log of the first `new` entries continues that of the first `old` (RFC 9162, section 2.1.4).
    ///
    /// # Errors
    /// [`NoProof`].
    pub async fn consistency(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
        old: u64,
        new: u64,
    ) -> Result<Vec<Hash>, NoProof> {
        self.prove(conn, site, &ProofPlan::consistency(old, new)?, new).await
    }

    async fn prove(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
        plan: &ProofPlan,
        among: u64,
    ) -> Result<Vec<Hash>, NoProof> {
        let edge = self.edge(conn, site, among).await?;
        let tiles = tiles::fetch(conn, site, edge.reads(plan)).await?;
        Ok(edge.prove(plan, &tiles).map_err(tiles::odd)?)
    }

    /// The log's edge, at least at that size.
    async fn edge(
        &self,
        conn: &mut Conn<'_>,
        site: SiteNumber,
        among: u64,
    ) -> Result<Edge, NoProof> {
        let mut edge = self.edges().get(&site).cloned().unwrap_or_default();
        if edge.size() < among {
            let head = log::head(conn, site).await?;
            let there = head.frontier.size();
            if there < among {
                return Err(ProofError::OutsideTree { index: among - 1, size: there }.into());
            }
            tiles::catch_up(conn, site, &mut edge, &head).await?;
            self.edges().insert(site, edge.clone());
        }
        Ok(edge)
    }

    fn edges(&self) -> std::sync::MutexGuard<'_, HashMap<SiteNumber, Edge>> {
        self.edges.lock().unwrap_or_else(PoisonError::into_inner)
    }
}
