//! What the writer of one site holds in memory: the subjects it needs, folded, and how an entry changes them.
//!
//! The desk reads nothing by itself. What it lacks it names ([`Stop::Need`]), the store lays it on the desk, and the
//! same question is asked again. What it appends it returns as bytes and as changes of projection tables.

use std::collections::{BTreeMap, HashMap};
use std::sync::Arc;

use sha2::{Digest, Sha256};
use uuid::Uuid;

use super::body::{Body, EntryAmended};
use super::command::{Blob, Command, Decision, DirectoryWrite, Draft, Need, Refusal, Stop};
use super::entry_rows::{entry_rows, seq_cell};
use super::in_force::{FoldError, InForce};
use super::loaded::Loaded;
use super::state::{
    BatchState, Described, DeviationState, HoldingState, LotState, PersonState, SiteState, State,
};
use super::subject::{Subject, SubjectKind};
use super::table::{Change, Row};
use super::tables::{COMMAND, SUBJECT, SUBJECT_ENTRY};
use super::{body, decide};
use crate::checks::AdoptedSet;
use crate::ids::{
    BatchId, DeviationId, EntryId, HoldingId, InstrumentId, LotId, MaterialId, PartyId, PersonId,
    SiteId, VesselId,
};
use crate::ledger::canonical::MAX_ENTRY_BYTES;
use crate::ledger::entry::{Actor, Cause, ENVELOPE, Entry, MAX_SUBJECTS, Numbered};
use crate::ledger::tree::{Frontier, Hash, leaf_hash};
use crate::rules::RuleSet;
use crate::stamp::Micros;

/// Where the log stands.
#[derive(Clone, Debug)]
pub struct Position {
    /// How many entries it has.
    pub size: u64,
    /// The right edge of its tree.
    pub frontier: Frontier,
    /// When the last entry was recorded.
    pub last_recorded_at: Micros,
}

impl Position {
    /// An empty log.
    pub fn start() -> Self {
        Self { size: 0, frontier: Frontier::default(), last_recorded_at: Micros(0) }
    }
}

/// One entry with its bytes.
#[derive(Clone, Debug)]
pub struct Sealed {
    /// Its number.
    pub seq: u64,
    /// Its id.
    pub id: EntryId,
    /// Its canonical bytes.
    pub bytes: Vec<u8>,
    /// Its leaf hash.
    pub leaf_hash: Hash,
    /// The entry itself.
    pub entry: Arc<Entry>,
}

/// What one command added.
#[derive(Clone, Debug, Default)]
pub struct Appended {
    /// Entries in order.
    pub entries: Vec<Sealed>,
    /// Changes of projection tables, in order.
    pub changes: Vec<Change>,
    /// Documents to be kept.
    pub blobs: Vec<Blob>,
    /// Directory records to be kept.
    pub directory: Vec<DirectoryWrite>,
}

/// See the module.
#[derive(Clone, Debug)]
pub struct Desk {
    site: SiteId,
    subjects: HashMap<Subject, Arc<Loaded>>,
    entries: HashMap<EntryId, Option<Arc<Entry>>>,
    codes: HashMap<(SubjectKind, String), Option<Uuid>>,
    rule_sets: HashMap<String, Arc<RuleSet>>,
}

impl Desk {
    /// An empty desk.
    pub fn new(site: SiteId) -> Self {
        Self {
            site,
            subjects: HashMap::new(),
            entries: HashMap::new(),
            codes: HashMap::new(),
            rule_sets: HashMap::new(),
        }
    }

    /// Which site.
    pub const fn site_id(&self) -> SiteId {
        self.site
    }

    /// The running number of a subject as it lies here, if it does.
    pub fn cached_n(&self, subject: &Subject) -> Option<u64> {
        self.subjects.get(subject).map(|loaded| loaded.n)
    }

    /// Lays a subject on the desk, from its entries in the log's order. None of them: it does not exist.
    ///
    /// # Errors
    /// [`FoldError`] if the log holds what this program cannot read.
    pub fn put(&mut self, subject: Subject, entries: &[Entry]) -> Result<(), FoldError> {
        self.subjects.insert(subject, Arc::new(Loaded::read(subject, entries)?));
        Ok(())
    }

    /// Lays a rule set on the desk that another desk has read.
    pub fn lend_rule_set(&mut self, digest: &str, set: Arc<RuleSet>) {
        self.rule_sets.insert(digest.to_owned(), set);
    }

    /// A rule set that lies here, by the digest of its text.
    pub fn rule_set(&self, digest: &str) -> Option<&Arc<RuleSet>> {
        self.rule_sets.get(digest)
    }

    /// Lays a subject on the desk that another desk has folded.
    pub fn lend(&mut self, subject: Subject, loaded: Arc<Loaded>) {
        self.subjects.insert(subject, loaded);
    }

    /// The subject as it lies here.
    pub fn loaded(&self, subject: &Subject) -> Option<&Arc<Loaded>> {
        self.subjects.get(subject)
    }

    /// Answers [`Need::Entry`].
    pub fn put_entry(&mut self, id: EntryId, entry: Option<Entry>) {
        self.entries.insert(id, entry.map(Arc::new));
    }

    /// Answers [`Need::Code`].
    pub fn put_code(&mut self, kind: SubjectKind, code: &str, id: Option<Uuid>) {
        self.codes.insert((kind, code.to_owned()), id);
    }

    /// Answers [`Need::Blob`] with the text of a rule set.
    ///
    /// # Errors
    /// [`FoldError::RuleSet`] if the text is none.
    pub fn put_rule_set(&mut self, digest: &str, text: &str) -> Result<(), FoldError> {
        let set = RuleSet::parse(text)
            .map_err(|e| FoldError::RuleSet { digest: digest.to_owned(), detail: e.to_string() })?;
        self.rule_sets.insert(digest.to_owned(), Arc::new(set));
        Ok(())
    }

    /// Takes a subject off the desk: what lies here may not be what the log says.
    pub fn forget(&mut self, subject: &Subject) {
        self.subjects.remove(subject);
    }

    /// Ends a group of commands: what is only true under the lock is forgotten.
    pub fn end_group(&mut self) {
        self.codes.clear();
        self.entries.clear();
    }

    /// What a command will surely touch, so that counters can be read in one statement.
    pub fn subjects_of(&self, command: &Command) -> Vec<Subject> {
        let mut subjects = decide::subjects_of(self.site, &command.act);
        if let Actor::Person(person) = command.actor {
            subjects.push(person.into());
        }
        subjects
    }

    /// Decides a command on what lies here.
    ///
    /// # Errors
    /// [`Stop`]: something has to be laid here first, or the command is refused and nothing is written.
    pub fn decide(
        &self,
        command: &Command,
        now: Micros,
        draw: &mut dyn FnMut() -> Uuid,
    ) -> Result<Decision, Stop> {
        if let Some((subject, n)) = command.expects {
            let current = self.subject(subject)?.n;
            if current == 0 {
                return Err(Refusal::unknown(subject.kind.name()).into());
            }
            if current != n {
                return Err(Refusal {
                    kind: super::command::RefusalKind::Stale,
                    pointer: None,
                    detail: format!(
                        "the {} now stands at ETag \"{current}\": look at it again, then repeat with that",
                        subject.kind.name()
                    ),
                }
                .into());
            }
        }
        let decision = decide::decide(self, command, now, draw)?;
        self.all_loaded(&decision)?;
        decision.drafts.iter().try_for_each(fits_one_entry)?;
        Ok(decision)
    }

    /// Everything the drafts are about must lie here before they can be appended.
    fn all_loaded(&self, decision: &Decision) -> Result<(), Stop> {
        let missing: Vec<Need> = decision
            .drafts
            .iter()
            .flat_map(|draft| &draft.subjects)
            .filter(|subject| !self.subjects.contains_key(subject))
            .map(|subject| Need::Subject(*subject))
            .collect();
        if missing.is_empty() { Ok(()) } else { Err(Stop::Need(missing)) }
    }

    /// Appends what was decided: numbers, bytes, tables. `now` must not be before the last entry.
    ///
    /// # Errors
    /// [`FoldError`]; the desk must then be thrown away.
    pub fn append(
        &mut self,
        position: &mut Position,
        command: &Command,
        decision: Decision,
        now: Micros,
    ) -> Result<Appended, FoldError> {
        let first = position.size;
        let of = u32::try_from(decision.drafts.len()).unwrap_or(u32::MAX);
        let mut appended = Appended {
            blobs: decision.blobs,
            directory: decision.directory,
            ..Appended::default()
        };
        for (part, draft) in (1..).zip(decision.drafts) {
            let entry = self.number(position, command, &draft, (part, of), now)?;
            let bytes = entry.to_bytes()?;
            let leaf_hash = leaf_hash(&bytes);
            position.frontier.push(leaf_hash);
            position.size += 1;
            position.last_recorded_at = corrected_clock(&draft).unwrap_or(now);
            appended.changes.extend(self.take(&entry)?);
            appended.entries.push(Sealed {
                seq: entry.seq,
                id: entry.id,
                bytes,
                leaf_hash,
                entry: Arc::new(entry),
            });
        }
        if of > 0 {
            appended.changes.push(command_row(command, first, of));
        }
        Ok(appended)
    }

    fn number(
        &self,
        position: &Position,
        command: &Command,
        draft: &Draft,
        (part, of): (u32, u32),
        now: Micros,
    ) -> Result<Entry, FoldError> {
        let seq = position.size;
        let inconsistent = |detail: String| FoldError::Inconsistent { seq, detail };
        if draft.subjects.is_empty() || draft.subjects.len() > MAX_SUBJECTS {
            return Err(inconsistent(format!("it has {} subjects", draft.subjects.len())));
        }
        let subjects = draft
            .subjects
            .iter()
            .map(|subject| {
                let n = self
                    .cached_n(subject)
                    .ok_or_else(|| inconsistent(format!("{subject} is not loaded")))?;
                Ok(Numbered { kind: subject.kind, id: subject.id, n: n + 1 })
            })
            .collect::<Result<_, FoldError>>()?;
        let (kind, kv) = draft.body.kind();
        Ok(Entry {
            v: ENVELOPE,
            site: self.site,
            seq,
            id: draft.id,
            kind: kind.to_owned(),
            kv,
            occurred_at: draft.occurred_at,
            captured_at: draft.captured_at,
            recorded_at: now,
            cause: Cause { command: command.id, of, part, print: hex(&command.print) },
            actor: command.actor,
            via: command.via,
            subjects,
            body: draft.body.write().map_err(|e| inconsistent(e.to_string()))?,
        })
    }

    /// Takes an entry from the log into the subjects it is about, all of which must lie here.
    ///
    /// # Errors
    /// [`FoldError`].
    pub fn take(&mut self, entry: &Entry) -> Result<Vec<Change>, FoldError> {
        let read = Arc::new(InForce::original(entry)?);
        let mut changes: Vec<Change> = entry_rows(&read).into_iter().map(Change::Put).collect();
        match read.body.as_ref() {
            Body::EntryAmended(amendment) => self.amend(entry, &read, amendment, &mut changes)?,
            _ => {
                for numbered in &entry.subjects {
                    self.change(entry, numbered, &mut changes, |loaded, subject| {
                        loaded.insert(subject, &read);
                    })?;
                }
            }
        }
        Ok(changes)
    }

    fn amend(
        &mut self,
        entry: &Entry,
        read: &Arc<InForce>,
        amendment: &EntryAmended,
        changes: &mut Vec<Change>,
    ) -> Result<(), FoldError> {
        let before = self.original(entry, amendment)?;
        let after = Arc::new(before.amended(entry, amendment)?);
        difference(entry_rows(&before), entry_rows(&after), changes);
        for numbered in &entry.subjects {
            self.change(entry, numbered, changes, |loaded, subject| {
                loaded.replace(subject, &after);
                debug_assert!(read.subjects.contains(&subject));
            })?;
        }
        Ok(())
    }

    /// The amended entry as it reads so far, from the subject that knows most of how it came to read so: one that it
    /// was moved to knows nothing of before.
    fn original(&self, entry: &Entry, amendment: &EntryAmended) -> Result<Arc<InForce>, FoldError> {
        entry
            .subjects()
            .filter_map(|subject| self.subjects.get(&subject)?.known(amendment.target.seq))
            .max_by_key(|candidate| candidate.amendments.len())
            .cloned()
            .ok_or_else(|| FoldError::Inconsistent {
                seq: entry.seq,
                detail: format!(
                    "it amends entry {}, which none of its subjects has",
                    amendment.target.seq
                ),
            })
    }

    fn change(
        &mut self,
        entry: &Entry,
        numbered: &Numbered,
        changes: &mut Vec<Change>,
        with: impl FnOnce(&mut Loaded, Subject),
    ) -> Result<(), FoldError> {
        let subject = numbered.subject();
        let inconsistent = |detail: String| FoldError::Inconsistent { seq: entry.seq, detail };
        let loaded = self
            .subjects
            .get_mut(&subject)
            .ok_or_else(|| inconsistent(format!("{subject} is not loaded")))?;
        let loaded = Arc::make_mut(loaded);
        if numbered.n != loaded.n + 1 {
            return Err(inconsistent(format!(
                "it is number {} about {subject}, which has {} so far",
                numbered.n, loaded.n
            )));
        }
        let before = loaded.state.rows();
        loaded.n += 1;
        with(loaded, subject);
        let after = loaded.state.rows();
        self.note_codes(&after);
        difference(before, after, changes);
        let key = || subject.key().as_slice().into();
        changes
            .push(Change::Put(Row { table: &SUBJECT, cells: vec![key(), seq_cell(numbered.n)] }));
        changes.push(Change::Put(Row {
            table: &SUBJECT_ENTRY,
            cells: vec![key(), seq_cell(numbered.n), seq_cell(entry.seq)],
        }));
        Ok(())
    }

    /// Codes given within a group are taken for the commands after it.
    fn note_codes(&mut self, rows: &[Row]) {
        use super::table::Cell;
        for row in rows.iter().filter(|row| row.table.name == super::tables::CODE.name) {
            if let [Cell::Text(kind), Cell::Text(code), Cell::Bytes(id)] = row.cells.as_slice()
                && let Some(kind) = SubjectKind::ALL.into_iter().find(|k| k.name() == kind)
                && let Ok(id) = Uuid::from_slice(id)
            {
                self.codes.insert((kind, code.clone()), Some(id));
            }
        }
    }
}

/// What a decision may ask of the desk.
impl Desk {
    /// The desk as if that entry had never been written: what is to stand in its place is judged without it.
    pub(crate) fn without(&self, entry: &InForce) -> Self {
        let mut desk = self.clone();
        for subject in &entry.subjects {
            if let Some(loaded) = desk.subjects.get_mut(subject) {
                let loaded = Arc::make_mut(loaded);
                loaded.remove(entry.seq);
                loaded.state = State::fold(*subject, &loaded.entries);
            }
        }
        desk
    }

    /// A subject, whether or not there are entries about it.
    ///
    /// # Errors
    /// [`Stop::Need`].
    pub fn subject(&self, subject: Subject) -> Result<&Loaded, Stop> {
        self.subjects
            .get(&subject)
            .map(AsRef::as_ref)
            .ok_or_else(|| Stop::Need(vec![Need::Subject(subject)]))
    }

    /// The site, which must have been founded.
    ///
    /// # Errors
    /// [`Stop`].
    pub fn site(&self) -> Result<&SiteState, Stop> {
        match &self.subject(self.site.into())?.state {
            State::Site(state) if state.founded.is_some() => Ok(state),
            _ => Err(Refusal::unknown("site").into()),
        }
    }

    /// The rule sets that bind at that moment, with their texts.
    ///
    /// # Errors
    /// [`Stop`].
    pub fn adopted(&self, at: Micros) -> Result<Vec<AdoptedSet>, Stop> {
        let site = self.site()?;
        let mut sets = Vec::new();
        let mut missing = Vec::new();
        for adopted in site.binding_at(at) {
            match self.rule_sets.get(&adopted.digest) {
                Some(set) => sets.push(AdoptedSet {
                    set: Arc::clone(set),
                    digest: adopted.digest.clone(),
                    standing: match &adopted.standing {
                        body::Standing::Production => crate::checks::Standing::Production,
                        body::Standing::Market(market) => {
                            crate::checks::Standing::Market { market: market.clone() }
                        }
                    },
                }),
                None => missing.push(Need::Blob(adopted.digest.clone())),
            }
        }
        if missing.is_empty() { Ok(sets) } else { Err(Stop::Need(missing)) }
    }

    /// The entry of that id.
    ///
    /// # Errors
    /// [`Stop`].
    pub fn entry(&self, id: EntryId) -> Result<&Arc<Entry>, Stop> {
        match self.entries.get(&id) {
            Some(Some(entry)) => Ok(entry),
            Some(None) => Err(Refusal::unknown("entry").into()),
            None => Err(Stop::Need(vec![Need::Entry(id)])),
        }
    }

    /// That entry as it reads now.
    ///
    /// # Errors
    /// [`Stop`].
    pub fn entry_in_force(&self, id: EntryId) -> Result<Arc<InForce>, Stop> {
        let entry = self.entry(id)?;
        for subject in entry.subjects() {
            if let Some(found) = self.subject(subject)?.known(entry.seq) {
                return Ok(Arc::clone(found));
            }
        }
        Err(Refusal::conflict("an amendment stands as it is: amend the entry that it is about")
            .into())
    }

    /// Whether a code is free, or already names this very subject.
    ///
    /// # Errors
    /// [`Stop`].
    pub fn code_is_free(&self, kind: SubjectKind, code: &str, id: Uuid) -> Result<(), Stop> {
        match self.codes.get(&(kind, code.to_owned())) {
            Some(Some(taken)) if *taken != id => Err(Refusal::conflict(format!(
                "the code {code:?} already names another {} at this site: choose another",
                kind.name()
            ))
            .into()),
            Some(_) => Ok(()),
            None => Err(Stop::Need(vec![Need::Code(kind, code.to_owned())])),
        }
    }
}

macro_rules! known {
    ($($(#[$doc:meta])* $name:ident($id:ident) -> $state:ty, $variant:ident, $present:expr;)*) => {
        /// Subjects that must exist.
        impl Desk { $(
            $(#[$doc])*
            ///
            /// # Errors
            /// [`Stop`].
            pub fn $name(&self, id: $id) -> Result<&$state, Stop> {
                match &self.subject(id.into())?.state {
                    State::$variant(state) if $present(state) => Ok(state),
                    _ => Err(Refusal::unknown(SubjectKind::$variant.name()).into()),
                }
            }
        )* }
    };
}
known! {
    /// A batch that was opened.
    batch(BatchId) -> BatchState, Batch, |s: &BatchState| s.opened.is_some();
    /// A deviation that was opened.
    deviation(DeviationId) -> DeviationState, Deviation, |s: &DeviationState| s.opened.is_some();
    /// A holding somebody booked into.
    holding(HoldingId) -> HoldingState, Holding, |s: &HoldingState| s.of.is_some();
    /// A lot that was received.
    lot(LotId) -> LotState, Lot, |s: &LotState| s.received.is_some();
    /// A person who was enrolled.
    person(PersonId) -> PersonState, Person, |s: &PersonState| s.enrolled_at.is_some();
    /// A material that was described.
    material(MaterialId) -> Described<body::MaterialDescribed>, Material, |s: &Described<_>| s.current.is_some();
    /// A party that was described.
    party(PartyId) -> Described<body::PartyDescribed>, Party, |s: &Described<_>| s.current.is_some();
    /// A vessel that was described.
    vessel(VesselId) -> Described<body::VesselDescribed>, Vessel, |s: &Described<_>| s.current.is_some();
    /// An instrument that was described.
    instrument(InstrumentId) -> Described<body::InstrumentDescribed>, Instrument, |s: &Described<_>| s.current.is_some();
}

/// Rows that are there now, and removals of those that are no more.
fn difference(before: Vec<Row>, after: Vec<Row>, changes: &mut Vec<Change>) {
    let mut left: BTreeMap<(&str, Vec<super::table::Cell>), Row> =
        before.into_iter().map(|row| ((row.table.name, row.key().to_vec()), row)).collect();
    for row in after {
        let was = left.remove(&(row.table.name, row.key().to_vec()));
        if was.as_ref() != Some(&row) {
            changes.push(Change::Put(row));
        }
    }
    changes
        .extend(left.into_iter().map(|((_, key), row)| Change::Remove { table: row.table, key }));
}

/// What is too long for one entry is refused here, before anything is numbered.
fn fits_one_entry(draft: &Draft) -> Result<(), Refusal> {
    /// Bytes that envelope and one subject take at most.
    const ENVELOPE_BYTES: usize = 1_500;
    const SUBJECT_BYTES: usize = 100;
    let subjects = draft.subjects.len();
    let body = draft.body.write().map_or(usize::MAX, |value| value.to_string().len());
    let bytes = body.saturating_add(ENVELOPE_BYTES + subjects * SUBJECT_BYTES);
    if subjects <= MAX_SUBJECTS && bytes <= MAX_ENTRY_BYTES {
        return Ok(());
    }
    Err(Refusal::meaningless(
        "",
        format!(
            "this is too much for one entry ({subjects} things, {bytes} bytes; at most {MAX_SUBJECTS} and \
             {MAX_ENTRY_BYTES}): record it in several parts, or shorten the texts"
        ),
    ))
}

/// After a correction the log goes on from what the clock says now.
const fn corrected_clock(draft: &Draft) -> Option<Micros> {
    match &draft.body {
        Body::ClockCorrected(body) => Some(body.clock),
        _ => None,
    }
}

fn command_row(command: &Command, first: u64, entries: u32) -> Change {
    Change::Put(Row {
        table: &COMMAND,
        cells: vec![
            command.id.0.into(),
            seq_cell(first),
            i64::from(entries).into(),
            command.print.as_slice().into(),
        ],
    })
}

/// Lower-case hexadecimal.
pub(crate) fn hex(bytes: &[u8]) -> String {
    use std::fmt::Write as _;
    bytes.iter().fold(String::with_capacity(bytes.len() * 2), |mut text, byte| {
        let _ = write!(text, "{byte:02x}");
        text
    })
}

/// SHA-256 as lower-case hexadecimal.
pub fn sha256_hex(bytes: &[u8]) -> String {
    hex(&Sha256::digest(bytes))
}
