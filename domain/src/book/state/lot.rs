//! A lot: what came in, whether it may be used, what is left of it.

use std::collections::BTreeMap;

use crate::book::body::{Body, LotReceived, LotStatus};
use crate::book::in_force::InForce;
use crate::book::subject::SubjectKind;
use crate::book::table::{Cell, Row};
use crate::book::tables::{CODE, LOT};
use crate::ids::{HoldingId, LotId};
use crate::stamp::{Micros, Stamp};

/// A lot as its entries say.
#[derive(Clone, Debug)]
pub struct LotState {
    /// Which.
    pub lot: LotId,
    /// The receipt; absent before it.
    pub received: Option<(Stamp, LotReceived)>,
    /// Whether it may be used.
    pub status: LotStatus,
    /// Why it stands so.
    pub status_reason: Option<String>,
    /// What the entries about this lot book into and out of each holding, in base units. Kept whole, so that a draw
    /// that happened before its receipt was recorded counts as soon as the receipt is known.
    booked: BTreeMap<HoldingId, i64>,
}

impl LotState {
    pub(crate) fn new(lot: LotId) -> Self {
        Self {
            lot,
            received: None,
            status: LotStatus::Held,
            status_reason: None,
            booked: BTreeMap::new(),
        }
    }

    pub(crate) fn apply(&mut self, entry: &InForce) {
        match entry.body.as_ref() {
            Body::LotReceived(body) if body.lot == self.lot => {
                // Whoever changed the status since knew more than the receipt did.
                if self.status_reason.is_none() {
                    self.status = body.status;
                }
                self.received = Some((entry.occurred_at, body.clone()));
                self.book(entry);
            }
            Body::LotStatusChanged(body) if body.lot == self.lot => {
                self.status = body.status;
                self.status_reason = Some(body.reason.clone());
            }
            Body::BatchOpened(_) | Body::AdditionRecorded(_) => self.book(entry),
            _ => {}
        }
    }

    fn book(&mut self, entry: &InForce) {
        for leg in entry.body.legs() {
            *self.booked.entry(leg.holding).or_default() +=
                leg.direction.sign() * leg.amount.base();
        }
    }

    /// Stock in base units: receipts less the draws the book could cover.
    pub fn remaining_base(&self) -> i64 {
        let own = self.received.as_ref().map(|(_, body)| body.holding);
        own.and_then(|holding| self.booked.get(&holding)).copied().unwrap_or(0)
    }

    /// Whether it is past its date.
    pub fn is_expired(&self, at: Micros) -> bool {
        self.expires_at().is_some_and(|expires| at >= expires)
    }

    /// The date after which it may not be used.
    pub fn expires_at(&self) -> Option<Micros> {
        self.received.as_ref().and_then(|(_, body)| body.expires_at).map(|stamp| stamp.at)
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some((at, body)) = &self.received else { return Vec::new() };
        let dimension = body.amount.dimension().map_or("", |d| d.name());
        vec![
            Row {
                table: &LOT,
                cells: vec![
                    self.lot.0.into(),
                    body.code.as_str().into(),
                    body.material.0.into(),
                    Cell::from(body.supplier.map(|party| party.0)),
                    Cell::from(body.supplier_lot.as_deref()),
                    body.holding.0.into(),
                    self.status.name().into(),
                    at.at.0.into(),
                    Cell::from(self.expires_at().map(|micros| micros.0)),
                    dimension.into(),
                    body.amount.base().into(),
                    self.remaining_base().into(),
                ],
            },
            Row {
                table: &CODE,
                cells: vec![
                    SubjectKind::Lot.name().into(),
                    body.code.as_str().into(),
                    self.lot.0.into(),
                ],
            },
        ]
    }
}
