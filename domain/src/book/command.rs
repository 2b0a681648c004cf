//! What somebody may ask of the book. Everything here is already parsed; whether it may happen is decided next.

use std::collections::{BTreeMap, BTreeSet};

use super::body::{
    Component, Ingredient, InstrumentDescribed, LotStatus, MaterialDescribed, PartyDescribed,
    Premises, Preparation, Reading, Standing, VesselDescribed,
};
use super::role::Role;
use super::subject::Subject;
use crate::ids::{
    BatchId, CommandId, DeviationId, EntryId, LotId, MaterialId, PartyId, PersonId, ProposalId,
    VesselId,
};
use crate::ledger::entry::{Actor, Via};
use crate::stamp::{Micros, Stamp};
use crate::units::Quantity;

/// One command, from one person, to be done once.
#[derive(Clone, Debug)]
pub struct Command {
    /// The idempotency key.
    pub id: CommandId,
    /// SHA-256 of the parsed command in canonical form, secrets left out.
    pub print: [u8; 32],
    /// Who asks.
    pub actor: Actor,
    /// What the person may be at this site, as of now.
    pub roles: BTreeSet<Role>,
    /// Through which door.
    pub via: Via,
    /// The running number the caller last saw of a subject: if it has moved on, nothing is done.
    pub expects: Option<(Subject, u64)>,
    /// What is asked.
    pub act: Act,
}

/// What is asked.
#[derive(Clone, Debug)]
pub enum Act {
    /// Begin the book, with its first administrator.
    Found(Box<Found>),
    /// Go on after the clock was set back.
    CorrectClock(CorrectClock),
    /// Take in a person.
    Enrol(Enrol),
    /// Give a role.
    Grant(PersonId, Role),
    /// Take a role.
    Withdraw(PersonId, Role, Option<String>),
    /// Change settings.
    ChangeSettings(BTreeMap<String, String>, String),
    /// Let a rule set bind.
    Adopt(Adopt),
    /// Describe a material.
    DescribeMaterial(MaterialDescribed),
    /// Describe a supplier or customer.
    DescribeParty(PartyDescribed),
    /// Describe a vessel.
    DescribeVessel(VesselDescribed),
    /// Describe an instrument.
    DescribeInstrument(InstrumentDescribed),
    /// Take in a lot.
    Receive(Box<Receive>),
    /// Hold, release or reject a lot.
    ChangeLotStatus(LotId, LotStatus, String),
    /// Begin a fermentation.
    OpenBatch(Box<OpenBatch>),
    /// Record what was measured.
    TakeReading(Box<TakeReading>),
    /// Ask whether something may be added.
    Propose(Box<Propose>),
    /// Record what was added.
    Add(Box<Add>),
    /// Sign.
    SignOff(SignOff),
    /// Open a deviation by hand.
    OpenDeviation(OpenDeviation),
    /// Close a deviation.
    ResolveDeviation(ResolveDeviation),
    /// Correct an entry.
    Amend(Box<Amend>),
    /// Hand out a record.
    Issue(Issue),
}

/// A person as the directory keeps it, outside the log.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct DirectoryPerson {
    /// The pseudonym.
    pub person: PersonId,
    /// What the person signs in with, unique in the site.
    pub login: String,
    /// Printed name.
    pub name: String,
    /// Argon2id hash as a PHC string.
    pub password_hash: String,
    /// The salt that ties name and login to the log.
    pub salt: Vec<u8>,
}

/// See [`Act::Found`].
#[derive(Clone, Debug)]
pub struct Found {
    /// Short human code.
    pub code: String,
    /// Name as printed.
    pub name: String,
    /// Name of the log and its key.
    pub origin: String,
    /// Verifier key.
    pub public_key: String,
    /// IANA time zone.
    pub time_zone: String,
    /// Minutes east of Greenwich now, for the founding entries.
    pub offset_minutes: i16,
    /// Licence number.
    pub licence: Option<String>,
    /// What may be done where.
    pub premises: Vec<Premises>,
    /// A book that may run on a driven clock.
    pub simulation: bool,
    /// One person may give both signatures.
    pub single_handed: bool,
    /// The first administrator.
    pub admin: DirectoryPerson,
}

/// See [`Act::CorrectClock`].
#[derive(Clone, Debug)]
pub struct CorrectClock {
    /// Why.
    pub reason: String,
    /// What the clock says, with the wall clock's offset.
    pub at: Stamp,
}

/// See [`Act::Enrol`].
#[derive(Clone, Debug)]
pub struct Enrol {
    /// The directory's record.
    pub person: DirectoryPerson,
    /// Roles from the start.
    pub roles: Vec<Role>,
}

/// See [`Act::Adopt`].
#[derive(Clone, Debug)]
pub struct Adopt {
    /// The set's text.
    pub text: String,
    /// As what it binds.
    pub standing: Standing,
    /// From when on.
    pub from: Stamp,
}

/// See [`Act::Receive`].
#[derive(Clone, Debug)]
pub struct Receive {
    /// Which.
    pub lot: LotId,
    /// Our code.
    pub code: String,
    /// What it is.
    pub material: MaterialId,
    /// From whom.
    pub supplier: Option<PartyId>,
    /// Their lot code.
    pub supplier_lot: Option<String>,
    /// How much.
    pub amount: Quantity,
    /// When.
    pub received_at: Stamp,
    /// Not to be used from then on.
    pub expires_at: Option<Stamp>,
    /// Delivery note.
    pub document: Option<String>,
    /// Its own analysis.
    pub composition: Vec<Component>,
    /// Whether it may be used at once.
    pub status: LotStatus,
}

/// One lot and how much of it.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Draw {
    /// Which.
    pub lot: LotId,
    /// How much.
    pub amount: Quantity,
}

/// See [`Act::OpenBatch`].
#[derive(Clone, Debug)]
pub struct OpenBatch {
    /// Which.
    pub batch: BatchId,
    /// Our code.
    pub code: String,
    /// Name as printed.
    pub name: Option<String>,
    /// What the law takes it for.
    pub product_class: String,
    /// Where, by premises code.
    pub premises: String,
    /// Markets it is meant for.
    pub destinations: Vec<String>,
    /// Claims it carries.
    pub claims: Vec<String>,
    /// The vessel.
    pub vessel: VesselId,
    /// When.
    pub opened_at: Stamp,
    /// What was filled.
    pub volume: Quantity,
    /// How it was measured.
    pub volume_basis: String,
    /// Liquid in it.
    pub liquid: Quantity,
    /// Liquid when filling is over.
    pub liquid_planned: Option<Quantity>,
    /// Expected end: value, scale, basis.
    pub expected_final: Option<(String, String, String)>,
    /// Fermentable sugar in g/L, and its basis.
    pub fermentable_sugar: Option<(String, String)>,
    /// How hungry the yeast is.
    pub demand: String,
    /// What goes in.
    pub ingredients: Vec<Draw>,
}

/// See [`Act::TakeReading`].
#[derive(Clone, Debug)]
pub struct TakeReading {
    /// Of which batch.
    pub batch: BatchId,
    /// When read, or when the sample was taken.
    pub taken_at: Stamp,
    /// The device's clock, if typed without network.
    pub captured_at: Option<Stamp>,
    /// When the answer came.
    pub reported_at: Option<Stamp>,
    /// Sample number.
    pub sample: Option<String>,
    /// Laboratory.
    pub laboratory: Option<String>,
    /// Values; their corrections are computed by the book.
    pub values: Vec<Reading>,
    /// A remark.
    pub note: Option<String>,
}

/// See [`Act::Propose`].
#[derive(Clone, Debug)]
pub struct Propose {
    /// Which.
    pub proposal: ProposalId,
    /// Into which batch.
    pub batch: BatchId,
    /// When it is asked, on the site's wall clock.
    pub asked_at: Stamp,
    /// When it is to be done.
    pub planned_at: Stamp,
    /// What.
    pub draws: Vec<Draw>,
    /// Water that carries it in.
    pub carrier_water: Option<Quantity>,
    /// In which form.
    pub preparation: Preparation,
    /// What for.
    pub purpose: Option<String>,
    /// The answer found on a snapshot: it stands if nothing has moved since.
    pub prepared: Option<Box<super::assessing::Prepared>>,
}

/// See [`Act::Add`].
#[derive(Clone, Debug)]
pub struct Add {
    /// Into which batch.
    pub batch: BatchId,
    /// The proposal it carries out.
    pub proposal: Option<ProposalId>,
    /// When it was done.
    pub done_at: Stamp,
    /// The device's clock, if typed without network.
    pub captured_at: Option<Stamp>,
    /// What.
    pub draws: Vec<Draw>,
    /// Water that carried it in.
    pub carrier_water: Option<Quantity>,
    /// In which form.
    pub preparation: Preparation,
    /// Done before anybody asked: why.
    pub already_done: Option<String>,
}

/// See [`Act::SignOff`]. The secret was asked for and found right before the command was made.
#[derive(Clone, Debug)]
pub struct SignOff {
    /// What is signed.
    pub target: EntryId,
    /// What it means.
    pub meaning: String,
    /// What the signer saw, as the interface showed it: 64 hexadecimal digits.
    pub binds: String,
    /// Why.
    pub reason: String,
    /// When, on the site's wall clock.
    pub signed_at: Stamp,
}

/// See [`Act::OpenDeviation`].
#[derive(Clone, Debug)]
pub struct OpenDeviation {
    /// Which.
    pub deviation: DeviationId,
    /// Our code.
    pub code: String,
    /// What happened.
    pub title: String,
    /// The batch it concerns.
    pub batch: Option<BatchId>,
    /// When it was noticed.
    pub opened_at: Stamp,
}

/// See [`Act::ResolveDeviation`]. The secret was found right before.
#[derive(Clone, Debug)]
pub struct ResolveDeviation {
    /// Which.
    pub deviation: DeviationId,
    /// Why it happened.
    pub cause: String,
    /// What was done.
    pub action: String,
    /// What it means for the batch.
    pub conclusion: String,
    /// When, on the site's wall clock.
    pub resolved_at: Stamp,
}

/// See [`Act::Amend`].
#[derive(Clone, Debug)]
pub struct Amend {
    /// Which entry.
    pub target: EntryId,
    /// What to do to it.
    pub effect: AmendTo,
    /// Why.
    pub reason: String,
    /// When, on the site's wall clock.
    pub amended_at: Stamp,
}

/// What an amendment makes of its target, parsed.
#[derive(Clone, Debug)]
pub enum AmendTo {
    /// It did not happen.
    Void,
    /// One value of a reading.
    Value(u32, Box<Reading>),
    /// The reading as it should have been.
    Reading(Box<TakeReading>),
    /// The addition as it was done.
    Addition(Box<Add>),
    /// The receipt as it was.
    Receipt(Box<Receive>),
    /// The opening of a batch as it was.
    Opening(Box<OpenBatch>),
}

/// See [`Act::Issue`].
#[derive(Clone, Debug)]
pub struct Issue {
    /// Of which batch.
    pub batch: BatchId,
    /// The batch's running number the record was made up to.
    pub batch_n: u64,
    /// The log's size it was made from.
    pub log_size: u64,
    /// SHA-256 of the PDF.
    pub pdf: String,
    /// SHA-256 of the JSON record.
    pub json: String,
    /// SHA-256 over the entries' leaf hashes.
    pub entries: String,
    /// To whom.
    pub to: String,
    /// When, on the site's wall clock.
    pub issued_at: Stamp,
    /// The documents themselves.
    pub documents: Vec<Blob>,
}

/// A document kept beside the log, named by its SHA-256.
#[derive(Clone, Debug, Eq, PartialEq)]
pub struct Blob {
    /// SHA-256 of the bytes.
    pub digest: [u8; 32],
    /// Its media type.
    pub media_type: String,
    /// The bytes.
    pub bytes: Vec<u8>,
}

/// What the directory has to keep together with the entries.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum DirectoryWrite {
    /// A person.
    Person(DirectoryPerson),
}

/// Why a command is not done. Nothing was written.
#[derive(Clone, Debug, PartialEq)]
pub struct Refusal {
    /// What sort of refusal.
    pub kind: RefusalKind,
    /// Where in the request the trouble is, as a JSON pointer.
    pub pointer: Option<String>,
    /// What to do.
    pub detail: String,
}

/// The sorts of refusal.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum RefusalKind {
    /// There is no such thing at this site.
    Unknown,
    /// The thing's state, or a rule, stands against it.
    Conflict,
    /// Readable, but it cannot be.
    Meaningless,
    /// The person may not.
    Forbidden,
    /// The subject has moved on since the caller looked.
    Stale,
}

impl Refusal {
    /// There is no such thing.
    pub fn unknown(what: &str) -> Self {
        Self {
            kind: RefusalKind::Unknown,
            pointer: None,
            detail: format!("there is no such {what} at this site"),
        }
    }

    /// The state stands against it.
    pub fn conflict(detail: impl Into<String>) -> Self {
        Self { kind: RefusalKind::Conflict, pointer: None, detail: detail.into() }
    }

    /// It cannot be.
    pub fn meaningless(pointer: &str, detail: impl Into<String>) -> Self {
        Self {
            kind: RefusalKind::Meaningless,
            pointer: Some(pointer.to_owned()),
            detail: detail.into(),
        }
    }

    /// The person may not.
    pub fn forbidden(detail: impl Into<String>) -> Self {
        Self { kind: RefusalKind::Forbidden, pointer: None, detail: detail.into() }
    }
}

/// What has to be loaded before the command can be decided.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum Need {
    /// The entries of a subject.
    Subject(Subject),
    /// One entry by its id.
    Entry(EntryId),
    /// Which subject a code names.
    Code(super::subject::SubjectKind, String),
    /// The text of a rule set, by the digest of it.
    Blob(String),
}

/// Why a command is not decided.
#[derive(Clone, Debug, PartialEq)]
pub enum Stop {
    /// Load these, then decide again.
    Need(Vec<Need>),
    /// It is not done.
    Refused(Refusal),
}

impl From<Refusal> for Stop {
    fn from(refusal: Refusal) -> Self {
        Self::Refused(refusal)
    }
}

/// One entry to be written, before its numbers.
#[derive(Clone, Debug)]
pub struct Draft {
    /// Its id.
    pub id: EntryId,
    /// When it happened.
    pub occurred_at: Stamp,
    /// The device's clock.
    pub captured_at: Option<Stamp>,
    /// What it is about.
    pub subjects: BTreeSet<Subject>,
    /// What it says.
    pub body: super::body::Body,
}

/// What a command comes to.
#[derive(Clone, Debug, Default)]
pub struct Decision {
    /// Entries, in this order.
    pub drafts: Vec<Draft>,
    /// Documents.
    pub blobs: Vec<Blob>,
    /// Directory records.
    pub directory: Vec<DirectoryWrite>,
}

/// Helps to say when something may not lie in the future.
pub(crate) fn not_ahead(pointer: &str, at: Stamp, now: Micros) -> Result<(), Refusal> {
    if at.at.0 > now.0.saturating_add(FIVE_MINUTES) {
        return Err(Refusal::meaningless(
            pointer,
            format!(
                "{at} is more than 5 minutes ahead of the server's clock ({now}): check the date and the offset"
            ),
        ));
    }
    Ok(())
}

const FIVE_MINUTES: i64 = 5 * 60 * 1_000_000;

/// For one line of an opening: what its lot is called.
pub(crate) fn ingredient(draw: &Draw, lot_code: &str, material: &str) -> Ingredient {
    Ingredient {
        lot: draw.lot,
        lot_code: lot_code.to_owned(),
        material: material.to_owned(),
        amount: draw.amount.clone(),
    }
}
