//! Reference data: the newest description counts.

use std::fmt::Debug;

use crate::book::body::{
    Body, InstrumentDescribed, MaterialDescribed, PartyDescribed, VesselDescribed,
};
use crate::book::in_force::InForce;
use crate::book::subject::SubjectKind;
use crate::book::table::Row;
use crate::book::tables::{CODE, DESCRIBED};
use crate::stamp::Stamp;
use uuid::Uuid;

/// A thing as it was last described.
#[derive(Clone, Debug)]
pub struct Described<T> {
    /// The description and since when; absent before the first entry.
    pub current: Option<(Stamp, T)>,
}

impl<T> Default for Described<T> {
    fn default() -> Self {
        Self { current: None }
    }
}

/// What the four kinds of description have in common.
pub trait Description: Clone + Debug {
    /// Takes its own kind of body.
    fn of(body: &Body) -> Option<&Self>;
    /// The kind of subject.
    const KIND: SubjectKind;
    /// Its id.
    fn id(&self) -> Uuid;
    /// Its code.
    fn code(&self) -> &str;
    /// Its name.
    fn name(&self) -> &str;
}

macro_rules! description {
    ($body:ident, $kind:ident, $id:ident) => {
        impl Description for $body {
            fn of(body: &Body) -> Option<&Self> {
                match body {
                    Body::$body(body) => Some(body),
                    _ => None,
                }
            }
            const KIND: SubjectKind = SubjectKind::$kind;
            fn id(&self) -> Uuid {
                self.$id.0
            }
            fn code(&self) -> &str {
                &self.code
            }
            fn name(&self) -> &str {
                &self.name
            }
        }
    };
}
description!(MaterialDescribed, Material, material);
description!(PartyDescribed, Party, party);
description!(VesselDescribed, Vessel, vessel);
description!(InstrumentDescribed, Instrument, instrument);

impl<T: Description> Described<T> {
    pub(crate) fn apply(&mut self, entry: &InForce) {
        if let Some(body) = T::of(&entry.body) {
            self.current = Some((entry.occurred_at, body.clone()));
        }
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some((since, body)) = &self.current else { return Vec::new() };
        let kind = T::KIND.name();
        vec![
            Row {
                table: &DESCRIBED,
                cells: vec![
                    kind.into(),
                    body.id().into(),
                    body.code().into(),
                    body.name().into(),
                    since.at.0.into(),
                ],
            },
            Row { table: &CODE, cells: vec![kind.into(), body.code().into(), body.id().into()] },
        ]
    }
}
