//! What each kind of entry says. A pair of kind and version here is a promise: old books are read with it for ever.
//!
//! To add a kind: a struct in the file it belongs to, a line in [`bodies!`](self), a committed example with a digest
//! made in another language, and its line in the fold.

pub mod additions;
pub mod batches;
pub mod lots;
pub mod oversight;
pub mod readings;
pub mod site;
pub mod things;

use serde_json::Value;

pub use additions::{AdditionRecorded, Line, Preparation, ProposalAssessed};
pub use batches::{BatchOpened, ExpectedFinal, FermentableSugar, Ingredient};
pub use lots::{Direction, Leg, LotReceived, LotStatus, LotStatusChanged};
pub use oversight::{
    DeviationOpened, DeviationResolved, Effect, EntryAmended, RecordIssued, Replacement,
    SignoffGiven, Target,
};
pub use readings::{Nitrogen, Reading, ReadingTaken};
pub use site::{
    ClockCorrected, PersonEnrolled, Premises, RoleGranted, RoleWithdrawn, RulesetAdopted,
    SettingsChanged, SiteFounded, Standing,
};
pub use things::{
    Component, InstrumentDescribed, MaterialDescribed, PartyDescribed, VesselDescribed,
};

/// A body this program cannot read.
#[derive(Debug, thiserror::Error)]
pub enum UnknownBody {
    /// The kind or its version is not known here: a newer program wrote it.
    #[error("entries of kind {kind} version {kv} are not known to this program: use a newer one")]
    Kind {
        /// The kind.
        kind: String,
        /// Its version.
        kv: u32,
    },
    /// Known, but of another shape.
    #[error("a {kind} entry of another shape than promised: {detail}")]
    Shape {
        /// The kind.
        kind: String,
        /// What is wrong.
        detail: String,
    },
}

macro_rules! bodies {
    ($($(#[$doc:meta])* $kind:literal $kv:literal => $name:ident),* $(,)?) => {
        /// The body of an entry, lifted to the newest version of its kind.
        #[derive(Clone, Debug, PartialEq)]
        pub enum Body { $($(#[$doc])* $name($name),)* }

        impl Body {
            /// Every kind with its newest version.
            pub const KINDS: &'static [(&'static str, u32)] = &[$(($kind, $kv)),*];

            /// Reads the body of an entry.
            ///
            /// # Errors
            /// [`UnknownBody`]: an unknown kind or version is refused, never skipped.
            pub fn read(kind: &str, kv: u32, value: &Value) -> Result<Self, UnknownBody> {
                match (kind, kv) {
                    $(($kind, $kv) => serde::Deserialize::deserialize(value)
                        .map(Self::$name)
                        .map_err(|e: serde_json::Error| UnknownBody::Shape { kind: kind.to_owned(), detail: e.to_string() }),)*
                    _ => Err(UnknownBody::Kind { kind: kind.to_owned(), kv }),
                }
            }

            /// The kind and the version it is written in.
            pub const fn kind(&self) -> (&'static str, u32) {
                match self { $(Self::$name(_) => ($kind, $kv),)* }
            }

            /// The body as JSON.
            ///
            /// # Errors
            /// Only if a map had keys that are no texts, which no body has.
            pub fn write(&self) -> Result<Value, serde_json::Error> {
                match self { $(Self::$name(body) => serde_json::to_value(body),)* }
            }
        }

        $(impl From<$name> for Body {
            fn from(body: $name) -> Self { Self::$name(body) }
        })*
    };
}

bodies! {
    /// Something was added.
    "addition.recorded" 1 => AdditionRecorded,
    /// A fermentation began.
    "batch.opened" 1 => BatchOpened,
    /// The server's clock was set back for good.
    "clock.corrected" 1 => ClockCorrected,
    /// A deviation began.
    "deviation.opened" 1 => DeviationOpened,
    /// A deviation ended.
    "deviation.resolved" 1 => DeviationResolved,
    /// An earlier entry was corrected or voided.
    "entry.amended" 1 => EntryAmended,
    /// An instrument, as it is now.
    "instrument.described" 1 => InstrumentDescribed,
    /// A lot came in.
    "lot.received" 1 => LotReceived,
    /// A lot was held, released or rejected.
    "lot.status-changed" 1 => LotStatusChanged,
    /// A material, as it is now.
    "material.described" 1 => MaterialDescribed,
    /// A supplier or customer, as it is now.
    "party.described" 1 => PartyDescribed,
    /// A person came.
    "person.enrolled" 1 => PersonEnrolled,
    /// Somebody asked whether something may be added.
    "proposal.assessed" 1 => ProposalAssessed,
    /// Something was measured.
    "reading.taken" 1 => ReadingTaken,
    /// A record was handed out.
    "record.issued" 1 => RecordIssued,
    /// A person got a role.
    "role.granted" 1 => RoleGranted,
    /// A person lost a role.
    "role.withdrawn" 1 => RoleWithdrawn,
    /// A rule set binds from now on.
    "ruleset.adopted" 1 => RulesetAdopted,
    /// Settings of the site.
    "settings.changed" 1 => SettingsChanged,
    /// Somebody signed.
    "signoff.given" 1 => SignoffGiven,
    /// The book began.
    "site.founded" 1 => SiteFounded,
    /// A vessel, as it is now.
    "vessel.described" 1 => VesselDescribed,
}

/// Entered later than the site allows, with what that was judged on.
#[derive(Clone, Debug, serde::Deserialize, Eq, PartialEq, serde::Serialize)]
#[serde(deny_unknown_fields)]
pub struct Late {
    /// The site's limit then, decimal text.
    pub limit_hours: String,
    /// Judged against when it was typed without network, or when it was recorded.
    pub basis: LateBasis,
    /// Why, as told.
    #[serde(skip_serializing_if = "Option::is_none", default)]
    pub reason: Option<String>,
}

/// On which time lateness was judged.
#[derive(Clone, Copy, Debug, serde::Deserialize, Eq, PartialEq, serde::Serialize)]
#[serde(rename_all = "snake_case")]
pub enum LateBasis {
    /// The device's clock, when it was typed.
    Captured,
    /// The server's clock.
    Recorded,
}

impl Body {
    /// The kind of readings, and the version they are written in.
    pub const READING_TAKEN: (&'static str, u32) = ("reading.taken", 1);

    /// Whether an amendment may replace or void it: founding, keys, assessments, sign-offs, amendments and issued
    /// records stand as they are; people and roles are set right by their opposite.
    pub const fn is_amendable(&self) -> bool {
        !matches!(
            self,
            Self::SiteFounded(_)
                | Self::PersonEnrolled(_)
                | Self::RoleGranted(_)
                | Self::RoleWithdrawn(_)
                | Self::ClockCorrected(_)
                | Self::ProposalAssessed(_)
                | Self::SignoffGiven(_)
                | Self::EntryAmended(_)
                | Self::RecordIssued(_)
        )
    }

    /// The movements of matter it carries.
    pub fn legs(&self) -> &[Leg] {
        match self {
            Self::LotReceived(body) => &body.legs,
            Self::BatchOpened(body) => &body.legs,
            Self::AdditionRecorded(body) => &body.legs,
            _ => &[],
        }
    }
}
