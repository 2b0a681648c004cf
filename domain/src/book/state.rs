//! The state of a subject: the fold of its entries in force, in the order in which things happened.

pub mod batch;
pub mod deviation;
pub mod holding;
pub mod lot;
pub mod people;
pub mod site;
pub mod things;

use std::sync::Arc;

pub use batch::{BatchState, ProposalState};
pub use deviation::DeviationState;
pub use holding::HoldingState;
pub use lot::LotState;
pub use people::PersonState;
pub use site::SiteState;
pub use things::Described;

use super::body::{Body, InstrumentDescribed, MaterialDescribed, PartyDescribed, VesselDescribed};
use super::in_force::InForce;
use super::subject::{Subject, SubjectKind};
use super::table::Row;

/// What a subject's entries in force add up to.
#[derive(Clone, Debug)]
pub enum State {
    /// A batch.
    Batch(Box<BatchState>),
    /// A deviation.
    Deviation(Box<DeviationState>),
    /// A holding.
    Holding(HoldingState),
    /// An instrument.
    Instrument(Described<InstrumentDescribed>),
    /// A lot.
    Lot(Box<LotState>),
    /// A material.
    Material(Described<MaterialDescribed>),
    /// A party.
    Party(Described<PartyDescribed>),
    /// A person.
    Person(PersonState),
    /// The site.
    Site(Box<SiteState>),
    /// A vessel.
    Vessel(Described<VesselDescribed>),
}

impl State {
    /// Before its first entry.
    pub fn empty(subject: Subject) -> Self {
        match subject.kind {
            SubjectKind::Batch => Self::Batch(Box::new(BatchState::new(subject.id.into()))),
            SubjectKind::Deviation => {
                Self::Deviation(Box::new(DeviationState::new(subject.id.into())))
            }
            SubjectKind::Holding => Self::Holding(HoldingState::new(subject.id.into())),
            SubjectKind::Instrument => Self::Instrument(Described::default()),
            SubjectKind::Lot => Self::Lot(Box::new(LotState::new(subject.id.into()))),
            SubjectKind::Material => Self::Material(Described::default()),
            SubjectKind::Party => Self::Party(Described::default()),
            SubjectKind::Person => Self::Person(PersonState::new(subject.id.into())),
            SubjectKind::Site => Self::Site(Box::default()),
            SubjectKind::Vessel => Self::Vessel(Described::default()),
        }
    }

    /// Takes the next entry in the fold's order. Entries that do not bear on this subject's state leave it as it is.
    pub fn apply(&mut self, entry: &Arc<InForce>) {
        if entry.void {
            return;
        }
        match self {
            Self::Batch(state) => state.apply(entry),
            Self::Deviation(state) => state.apply(entry),
            Self::Holding(state) => state.apply(entry),
            Self::Instrument(state) => state.apply(entry),
            Self::Lot(state) => state.apply(entry),
            Self::Material(state) => state.apply(entry),
            Self::Party(state) => state.apply(entry),
            Self::Person(state) => state.apply(entry),
            Self::Site(state) => state.apply(entry),
            Self::Vessel(state) => state.apply(entry),
        }
    }

    /// Whether every state keeps such an entry by its time, so that a late one may be taken after newer ones.
    pub(crate) const fn keeps_by_time(body: &Body) -> bool {
        matches!(body, Body::ReadingTaken(_))
    }

    /// The state after these entries.
    pub fn fold<'a>(subject: Subject, entries: impl IntoIterator<Item = &'a Arc<InForce>>) -> Self {
        let mut state = Self::empty(subject);
        for entry in entries {
            state.apply(entry);
        }
        state
    }

    /// Its rows in the projection tables.
    pub fn rows(&self) -> Vec<Row> {
        match self {
            Self::Batch(state) => state.rows(),
            Self::Deviation(state) => state.rows(),
            Self::Holding(state) => state.rows(),
            Self::Instrument(state) => state.rows(),
            Self::Lot(state) => state.rows(),
            Self::Material(state) => state.rows(),
            Self::Party(state) => state.rows(),
            Self::Person(state) => state.rows(),
            Self::Site(state) => state.rows(),
            Self::Vessel(state) => state.rows(),
        }
    }
}
