//! The batch record: what an inspector reads about one batch, as ready-to-print text.
//!
//! Everything here is already decided, converted and worded by the caller; this crate only sets
//! it on pages. It makes no check and promises no completeness beyond what it was given. Identical
//! input gives identical bytes, whatever the machine, its zone or its language.

mod additions;
mod assurance;
mod front;
mod readings;
#[cfg(test)]
mod tests;

use crate::RecordError;
use crate::finish::{self, Meta};
use crate::sheet::{Furniture, Sheet};

/// Stands on every page, and in everything else that says what a record says.
pub const DEFERRAL: &str = "Local requirements prevail over anything printed here; this record replaces no \
    prescribed form, return or permit. A limit shown is not legal advice. A model is not a laboratory analysis.";

/// A batch's record. Times are printed as given; use the site's own zone.
#[derive(Clone, Debug, Default)]
pub struct BatchRecord {
    /// The site whose book this is.
    pub site: Site,
    /// The book runs on a driven clock and describes no real production.
    pub simulation: bool,
    /// When this record was drawn up, RFC 3339 with offset; the only date in the file's metadata.
    pub drawn_up: String,
    /// To whom it was handed; `None` is a preview and says so on every page.
    pub issued: Option<Issued>,
    /// The batch itself.
    pub batch: Batch,
    /// Running number of the batch's newest entry: entries 1 to n are covered.
    pub entries_n: u64,
    /// Material lots that went in.
    pub materials: Vec<MaterialLot>,
    /// Readings and laboratory results, oldest first.
    pub readings: Vec<Reading>,
    /// Readings in force, drawn.
    pub chart: Chart,
    /// Additions that were made.
    pub additions: Vec<Addition>,
    /// Proposals that were not carried out.
    pub proposals: Vec<Addition>,
    /// Deviations, open and resolved.
    pub deviations: Vec<Deviation>,
    /// Nitrogen account, oldest first.
    pub account: Vec<AccountRow>,
    /// Rule sets that judged this batch.
    pub rule_sets: Vec<RuleSet>,
    /// The ledger head this record rests on.
    pub head: Head,
    /// Persons named in this record.
    pub people: Vec<Person>,
    /// Version of the engine that assessed.
    pub engine: String,
    /// Cautions that apply to this batch.
    pub cautions: Vec<Caution>,
    /// What a reader may miss here, and why it is not here.
    pub absent: Vec<Absent>,
}

/// The site whose book this is.
#[derive(Clone, Debug, Default)]
pub struct Site {
    /// Printed name.
    pub name: String,
    /// Short code.
    pub code: String,
    /// Licence or permit number.
    pub licence: String,
    /// Kind of premises.
    pub premises: String,
    /// IANA time zone of all times printed.
    pub time_zone: String,
}

/// The act of handing out the record.
#[derive(Clone, Debug, Default)]
pub struct Issued {
    /// When.
    pub at: String,
    /// To whom.
    pub to: String,
    /// Size of the log at that time.
    pub log_size: u64,
    /// Running number of the batch at that time.
    pub entries_n: u64,
}

/// What the batch is.
#[derive(Clone, Debug, Default)]
pub struct Batch {
    /// Batch code.
    pub code: String,
    /// Product class.
    pub product_class: String,
    /// Claims it carries.
    pub claims: String,
    /// Markets it is meant for, each with its state ("EU: open").
    pub destinations: Vec<String>,
    /// Vessel.
    pub vessel: String,
    /// Volume now.
    pub volume: String,
    /// The liquid that doses are judged on, and why.
    pub liquid_basis: String,
    /// When it was opened.
    pub opened_at: String,
    /// Expected final gravity with its basis.
    pub expected_final_gravity: String,
    /// Fermentable sugar with its basis.
    pub fermentable_sugar: String,
    /// Nitrogen need with its basis.
    pub demand: String,
}

/// A lot that went into the batch.
#[derive(Clone, Debug, Default)]
pub struct MaterialLot {
    /// Material.
    pub material: String,
    /// Lot code of the site.
    pub lot: String,
    /// Supplier.
    pub supplier: String,
    /// The supplier's own lot code.
    pub supplier_lot: String,
    /// Date received.
    pub received: String,
    /// Date of expiry.
    pub expiry: String,
    /// Amount used in this batch.
    pub used: String,
    /// Running number of the first entry in the batch that uses it.
    pub n: u64,
    /// What its receipt said before it was amended, oldest first.
    pub struck: Vec<Struck>,
}

/// A reading or laboratory result.
#[derive(Clone, Debug, Default)]
pub struct Reading {
    /// Running number in the batch.
    pub n: u64,
    /// When it was taken.
    pub at: String,
    /// What was measured.
    pub kind: String,
    /// The value in force as entered, with unit and qualifier.
    pub entered: String,
    /// The corrected value, if one was computed.
    pub corrected: String,
    /// Method of reading and of correction.
    pub method: String,
    /// Instrument or laboratory.
    pub instrument: String,
    /// Who took it.
    pub by: String,
    /// How late it was entered, if later than the site allows.
    pub late: String,
    /// A remark made with it.
    pub note: String,
    /// The values it replaces, oldest first.
    pub struck: Vec<Struck>,
}

/// A value no longer in force.
#[derive(Clone, Debug, Default)]
pub struct Struck {
    /// The old value.
    pub was: String,
    /// What stands in its place.
    pub now: String,
    /// Who amended it.
    pub by: String,
    /// When.
    pub at: String,
    /// The reason given.
    pub why: String,
}

/// The answer of an assessment or of one finding.
#[derive(Clone, Copy, Debug, Default, Eq, PartialEq)]
pub enum Verdict {
    /// No finding above information.
    #[default]
    Clear,
    /// Within limits, with something to read.
    Advise,
    /// Needed a second person's sign-off.
    Refer,
    /// Could not be done as proposed.
    Refuse,
}

impl Verdict {
    /// The verdict's word.
    pub fn word(self) -> &'static str {
        match self {
            Self::Clear => "clear",
            Self::Advise => "advise",
            Self::Refer => "refer",
            Self::Refuse => "refuse",
        }
    }
}

/// An addition made, or a proposal that was not carried out.
#[derive(Clone, Debug, Default)]
pub struct Addition {
    /// Running number in the batch.
    pub n: u64,
    /// When it was done, or for when it was planned.
    pub at: String,
    /// What went in.
    pub lines: Vec<DoseLine>,
    /// How it was prepared.
    pub preparation: String,
    /// Water that carried it.
    pub carrier_water: String,
    /// What for.
    pub purpose: String,
    /// Who did it.
    pub by: String,
    /// The worst verdict of its findings.
    pub verdict: Verdict,
    /// What the assessment found.
    pub findings: Vec<Finding>,
    /// Signatures on it.
    pub signatures: Vec<Signature>,
    /// It had already been done when it was entered: the reason given.
    pub already_done: Option<String>,
    /// How late it was entered, if later than the site allows.
    pub late: String,
    /// The proposal behind it and how the amounts compare.
    pub proposal: Option<ProposalRef>,
    /// What became of a proposal that was not carried out ("withdrawn", "lapsed").
    pub outcome: String,
    /// What it said before it was amended, oldest first.
    pub struck: Vec<Struck>,
}

/// One lot of an addition.
#[derive(Clone, Debug, Default)]
pub struct DoseLine {
    /// Lot code.
    pub lot: String,
    /// Material.
    pub material: String,
    /// Amount with unit.
    pub amount: String,
}

/// The proposal behind an addition.
#[derive(Clone, Debug, Default)]
pub struct ProposalRef {
    /// Running number of the proposal in the batch.
    pub n: u64,
    /// Amount proposed.
    pub proposed: String,
    /// Amount done.
    pub done: String,
}

/// One thing an assessment found.
#[derive(Clone, Debug, Default)]
pub struct Finding {
    /// Its own verdict.
    pub verdict: Verdict,
    /// The sentence as it was shown.
    pub sentence: String,
    /// Law, guidance, common practice, site setting or model.
    pub basis: String,
    /// Instrument and article, or publication.
    pub citation: String,
    /// What would remove it.
    pub remedy: String,
}

/// A signature.
#[derive(Clone, Debug, Default)]
pub struct Signature {
    /// Printed name.
    pub name: String,
    /// Role when signing.
    pub role: String,
    /// When.
    pub at: String,
    /// Performed, reviewed, approved the exception, released.
    pub meaning: String,
    /// The reason given.
    pub reason: String,
    /// Digest of what was shown and signed.
    pub binds: String,
}

/// A deviation.
#[derive(Clone, Debug, Default)]
pub struct Deviation {
    /// Its code.
    pub code: String,
    /// When it was opened.
    pub opened: String,
    /// By whom, or by what rule.
    pub by: String,
    /// What it was opened for.
    pub findings: Vec<String>,
    /// Cause found.
    pub cause: String,
    /// What was done.
    pub action: String,
    /// What it means for the batch.
    pub conclusion: String,
    /// When it was resolved; empty while open.
    pub resolved_at: String,
    /// Who resolved it.
    pub resolved_by: String,
    /// The signature that closed it.
    pub signature: Option<Signature>,
}

/// A line of the nitrogen account, per litre of liquid.
#[derive(Clone, Debug, Default)]
pub struct AccountRow {
    /// When.
    pub at: String,
    /// What changed it.
    pub what: String,
    /// Ammonium nitrogen.
    pub ammonium_n: String,
    /// Amino nitrogen.
    pub amino_n: String,
    /// Supply so far.
    pub supply: String,
    /// Need at this point.
    pub need: String,
}

/// A rule set in force.
#[derive(Clone, Debug, Default)]
pub struct RuleSet {
    /// Its identifier.
    pub id: String,
    /// Its version.
    pub version: String,
    /// Dates in force.
    pub effective: String,
    /// Digest of its text.
    pub digest: String,
    /// As production or market law, or for information.
    pub standing: String,
}

/// The signed ledger head.
#[derive(Clone, Debug, Default)]
pub struct Head {
    /// Name of the log.
    pub origin: String,
    /// Number of entries.
    pub size: u64,
    /// Root hash.
    pub root: String,
    /// The lines of the signed note.
    pub note: Vec<String>,
    /// Fingerprint of the signing key.
    pub key_fingerprint: String,
}

/// A person named in the record.
#[derive(Clone, Debug, Default)]
pub struct Person {
    /// Printed name.
    pub name: String,
    /// Role.
    pub role: String,
}

/// A caution that applies.
#[derive(Clone, Debug, Default)]
pub struct Caution {
    /// What it is about.
    pub topic: String,
    /// The caution.
    pub text: String,
    /// Where it comes from.
    pub source: String,
}

/// Something that is not in this record.
#[derive(Clone, Debug, Default)]
pub struct Absent {
    /// What.
    pub what: String,
    /// Why not.
    pub why: String,
}

/// The drawing of a batch's run.
#[derive(Clone, Debug, Default)]
pub struct Chart {
    /// Readings in force, oldest first.
    pub points: Vec<ChartPoint>,
    /// Doses, oldest first.
    pub doses: Vec<ChartDose>,
    /// Expected final gravity.
    pub expected_final: Option<f32>,
}

/// One reading on the chart.
#[derive(Clone, Debug, Default)]
pub struct ChartPoint {
    /// Hours since the batch was pitched or opened.
    pub hours: f32,
    /// Specific gravity.
    pub gravity: f32,
    /// Temperature in degrees Celsius.
    pub temperature: Option<f32>,
}

/// One dose on the chart.
#[derive(Clone, Debug, Default)]
pub struct ChartDose {
    /// Hours since the batch was pitched or opened.
    pub hours: f32,
    /// A few words.
    pub label: String,
    /// Its verdict.
    pub verdict: Verdict,
}

/// The record as an A4 PDF.
///
/// A character that the record's typeface lacks is printed as `□` ([`crate::legible`]), and the
/// record says that this was done: what truly happened must always be printable.
///
/// # Errors
/// [`RecordError::Stamp`] if `drawn_up` is not an RFC 3339 time; the other variants only if the
/// program itself is damaged.
pub fn batch_record(record: &BatchRecord) -> Result<Vec<u8>, RecordError> {
    let sheet = draw(record)?;
    finish::finish(sheet, &meta(record))
}

/// The record as an A4 PDF, or an error that names the first character the typeface lacks.
///
/// # Errors
/// [`RecordError::MissingGlyph`] before any page is put together; otherwise as [`batch_record`].
pub fn batch_record_exact(record: &BatchRecord) -> Result<Vec<u8>, RecordError> {
    let sheet = draw(record)?;
    match sheet.canvas.missing() {
        Some(character) => Err(RecordError::MissingGlyph { character }),
        None => finish::finish(sheet, &meta(record)),
    }
}

fn draw(record: &BatchRecord) -> Result<Sheet, RecordError> {
    let mut sheet = Sheet::new()?;
    front::draw(&mut sheet, record);
    additions::draw(&mut sheet, record);
    readings::draw(&mut sheet, record);
    assurance::draw(&mut sheet, record);
    sheet.furnish(&furniture(record));
    Ok(sheet)
}

/// Whether and to whom the record was handed out.
fn standing(record: &BatchRecord) -> String {
    record.issued.as_ref().map_or_else(
        || "preview, not issued".to_owned(),
        |issued| format!("issued {} to {}", issued.at, issued.to),
    )
}

fn furniture(record: &BatchRecord) -> Furniture {
    let mut warnings = Vec::new();
    if record.simulation {
        warnings.push(
            "SIMULATION: this book runs on a driven clock; nothing in it describes real production.",
        );
    }
    if record.issued.is_none() {
        warnings.push("NOT ISSUED: a preview; the ledger holds no entry that this was handed out.");
    }
    let root: String = record.head.root.chars().take(24).collect();
    Furniture {
        head: (
            format!("Batch record {} · {}", record.batch.code, record.site.name),
            standing(record),
        ),
        foot: format!(
            "{} · entries 1 to {} · ledger head {} at {} · {root}…",
            record.batch.code, record.entries_n, record.head.origin, record.head.size
        ),
        warnings,
        deferral: DEFERRAL,
    }
}

fn meta(record: &BatchRecord) -> Meta {
    Meta {
        title: format!("Batch record {}", record.batch.code),
        author: record.site.name.clone(),
        subject: format!(
            "{}; entries 1 to {}; {}",
            record.batch.product_class,
            record.entries_n,
            standing(record)
        ),
        drawn_up: record.drawn_up.clone(),
    }
}
