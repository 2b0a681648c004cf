//! A holding: what is booked in one place, by dimension.

use crate::book::body::Body;
use crate::book::body::additions::Shortfall;
use crate::book::in_force::InForce;
use crate::book::table::{Cell, Row};
use crate::book::tables::HOLDING;
use crate::ids::HoldingId;
use crate::units::Dimension;
use uuid::Uuid;

/// A holding as its entries say.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct HoldingState {
    /// Which.
    pub holding: HoldingId,
    /// Whose identity stands here: a lot's or a batch's, or what the book cannot explain of a lot.
    pub of: Option<(&'static str, Uuid)>,
    /// The vessel, if it stands in one.
    pub vessel: Option<Uuid>,
    /// Booked mass, µg.
    pub mass_ug: i64,
    /// Booked volume, µL.
    pub volume_ul: i64,
    /// Booked pieces.
    pub pieces: i64,
}

impl HoldingState {
    pub(crate) const fn new(holding: HoldingId) -> Self {
        Self { holding, of: None, vessel: None, mass_ug: 0, volume_ul: 0, pieces: 0 }
    }

    pub(crate) fn apply(&mut self, entry: &InForce) {
        match entry.body.as_ref() {
            Body::LotReceived(body) if body.holding == self.holding => {
                self.of = Some(("lot", body.lot.0));
            }
            Body::BatchOpened(body) if body.holding == self.holding => {
                self.of = Some(("batch", body.batch.0));
                self.vessel = Some(body.vessel.0);
            }
            Body::BatchOpened(body) => self.explain(&body.shortfalls),
            Body::AdditionRecorded(body) => self.explain(&body.shortfalls),
            _ => {}
        }
        for leg in entry.body.legs().iter().filter(|leg| leg.holding == self.holding) {
            let amount = leg.direction.sign() * leg.amount.base();
            match leg.amount.dimension() {
                Ok(Dimension::Mass) => self.mass_ug += amount,
                Ok(Dimension::Volume) => self.volume_ul += amount,
                Ok(Dimension::Count) => self.pieces += amount,
                Ok(Dimension::Fraction) | Err(_) => {}
            }
        }
    }

    fn explain(&mut self, shortfalls: &[Shortfall]) {
        if let Some(short) = shortfalls.iter().find(|short| short.unexplained == self.holding) {
            self.of = Some(("unexplained", short.lot.0));
        }
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some((kind, of)) = self.of else { return Vec::new() };
        vec![Row {
            table: &HOLDING,
            cells: vec![
                self.holding.0.into(),
                kind.into(),
                of.into(),
                Cell::from(self.vessel),
                self.mass_ug.into(),
                self.volume_ul.into(),
                self.pieces.into(),
            ],
        }]
    }
}
