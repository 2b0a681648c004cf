//! A deviation, from opening to resolution.

use crate::book::body::{Body, DeviationOpened, DeviationResolved};
use crate::book::in_force::InForce;
use crate::book::subject::SubjectKind;
use crate::book::table::{Cell, Row};
use crate::book::tables::{CODE, DEVIATION};
use crate::ids::DeviationId;
use crate::ledger::entry::Actor;
use crate::stamp::Stamp;

/// A deviation as its entries say.
#[derive(Clone, Debug)]
pub struct DeviationState {
    /// Which.
    pub deviation: DeviationId,
    /// How it began: when, by whom, what.
    pub opened: Option<(Stamp, Actor, DeviationOpened)>,
    /// How it ended.
    pub resolved: Option<(Stamp, Actor, DeviationResolved)>,
}

impl DeviationState {
    pub(crate) const fn new(deviation: DeviationId) -> Self {
        Self { deviation, opened: None, resolved: None }
    }

    pub(crate) fn apply(&mut self, entry: &InForce) {
        match entry.body.as_ref() {
            Body::DeviationOpened(body) if body.deviation == self.deviation => {
                self.opened = Some((entry.occurred_at, entry.actor, body.clone()));
            }
            Body::DeviationResolved(body) if body.deviation == self.deviation => {
                self.resolved = Some((entry.occurred_at, entry.actor, body.clone()));
            }
            _ => {}
        }
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some((at, _, body)) = &self.opened else { return Vec::new() };
        vec![
            Row {
                table: &DEVIATION,
                cells: vec![
                    self.deviation.0.into(),
                    body.code.as_str().into(),
                    body.title.as_str().into(),
                    Cell::from(body.batch.map(|batch| batch.0)),
                    at.at.0.into(),
                    Cell::from(self.resolved.as_ref().map(|(at, ..)| at.at.0)),
                ],
            },
            Row {
                table: &CODE,
                cells: vec![
                    SubjectKind::Deviation.name().into(),
                    body.code.as_str().into(),
                    self.deviation.0.into(),
                ],
            },
        ]
    }
}
