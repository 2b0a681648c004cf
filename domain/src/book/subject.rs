//! What entries are about. Each subject counts its own entries 1, 2, 3 …, so that a list handed out can be shown to
//! leave none out.

use std::fmt;

use serde::{Deserialize, Serialize};
use uuid::Uuid;

/// The kinds of subject, in the order in which an entry lists them.
#[derive(Clone, Copy, Debug, Deserialize, Eq, Hash, Ord, PartialEq, PartialOrd, Serialize)]
#[serde(rename_all = "snake_case")]
pub enum SubjectKind {
    /// One fermentation.
    Batch,
    /// A deviation.
    Deviation,
    /// One identity in one place.
    Holding,
    /// An instrument.
    Instrument,
    /// A lot.
    Lot,
    /// A material.
    Material,
    /// A supplier or customer.
    Party,
    /// A person's pseudonym.
    Person,
    /// The site itself.
    Site,
    /// A vessel.
    Vessel,
}

impl SubjectKind {
    /// All kinds.
    pub const ALL: [Self; 10] = [
        Self::Batch,
        Self::Deviation,
        Self::Holding,
        Self::Instrument,
        Self::Lot,
        Self::Material,
        Self::Party,
        Self::Person,
        Self::Site,
        Self::Vessel,
    ];

    /// The name in entries, columns and addresses.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Batch => "batch",
            Self::Deviation => "deviation",
            Self::Holding => "holding",
            Self::Instrument => "instrument",
            Self::Lot => "lot",
            Self::Material => "material",
            Self::Party => "party",
            Self::Person => "person",
            Self::Site => "site",
            Self::Vessel => "vessel",
        }
    }

    const fn tag(self) -> u8 {
        match self {
            Self::Batch => b'b',
            Self::Deviation => b'd',
            Self::Holding => b'h',
            Self::Instrument => b'i',
            Self::Lot => b'l',
            Self::Material => b'm',
            Self::Party => b'p',
            Self::Person => b'q',
            Self::Site => b's',
            Self::Vessel => b'v',
        }
    }
}

/// One subject.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct Subject {
    /// What it is.
    pub kind: SubjectKind,
    /// Which one.
    pub id: Uuid,
}

impl Subject {
    /// Names a subject.
    pub fn new(kind: SubjectKind, id: impl Into<Uuid>) -> Self {
        Self { kind, id: id.into() }
    }

    /// Seventeen bytes: a letter for the kind, then the id. The form in which tables hold it.
    pub fn key(&self) -> [u8; 17] {
        let mut key = [self.kind.tag(); 17];
        key[1..].copy_from_slice(self.id.as_bytes());
        key
    }

    /// The subject of such a key.
    pub fn of_key(key: &[u8]) -> Option<Self> {
        let (tag, id) = key.split_first()?;
        let kind = SubjectKind::ALL.into_iter().find(|kind| kind.tag() == *tag)?;
        Some(Self { kind, id: Uuid::from_slice(id).ok()? })
    }
}

impl fmt::Display for Subject {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        write!(f, "{} {}", self.kind.name(), self.id)
    }
}

macro_rules! subject_of {
    ($($id:ident => $kind:ident),* $(,)?) => { $(
        impl From<crate::ids::$id> for Uuid {
            fn from(id: crate::ids::$id) -> Self { id.0 }
        }
        impl From<crate::ids::$id> for Subject {
            fn from(id: crate::ids::$id) -> Self { Self { kind: SubjectKind::$kind, id: id.0 } }
        }
    )* };
}
subject_of! {
    BatchId => Batch, DeviationId => Deviation, HoldingId => Holding, InstrumentId => Instrument, LotId => Lot,
    MaterialId => Material, PartyId => Party, PersonId => Person, SiteId => Site, VesselId => Vessel,
}
