//! What a record rests on: the log up to a size, and nothing after it.
//!
//! Everything is loaded from the entries themselves and folded anew, so that the record of a batch's first n entries
//! is the same today and in ten years. Only the names of persons come from outside the log.

use std::collections::{BTreeMap, BTreeSet};
use std::sync::Arc;

use domain::book::Desk;
use domain::book::body::{BatchOpened, Body, Effect, SiteFounded};
use domain::book::command::Refusal;
use domain::book::in_force::{Amendment, InForce};
use domain::book::state::State;
use domain::book::subject::{Subject, SubjectKind};
use domain::checks::Assessment;
use domain::ids::{BatchId, PersonId};
use domain::ledger::entry::{Actor, Entry};
use domain::ledger::note::Checkpoint;
use domain::ledger::tree::Hash;
use domain::rules::RuleSet;
use domain::stamp::{Micros, Stamp};
use store::log::Stored;
use store::sites::Site;
use store::{Conn, StoreError, blobs, directory, log, tiles};
use unicode_normalization::UnicodeNormalization as _;

use super::words;
use crate::error::HouseError;
use crate::house::House;

/// Entries of a subject read at a time.
const PAGE: i64 = 500;

/// A head that fixes what a record rests on.
#[derive(Clone, Debug)]
pub(crate) struct Head {
    pub(crate) origin: String,
    pub(crate) size: u64,
    pub(crate) root: Hash,
    pub(crate) note: String,
    pub(crate) key: String,
    pub(crate) fingerprint: String,
}

/// An entry of the batch as it stands in the log.
#[derive(Clone, Debug)]
pub(crate) struct Original {
    pub(crate) n: u64,
    pub(crate) leaf_hash: Hash,
    pub(crate) entry: Entry,
}

/// An entry of the batch as it reads in the end, also if it was voided or moved to another batch.
#[derive(Clone, Debug)]
pub(crate) struct Told {
    pub(crate) n: u64,
    pub(crate) read: Arc<InForce>,
    pub(crate) captured_at: Option<Stamp>,
    /// An amendment moved it to another batch.
    pub(crate) moved: bool,
}

impl Told {
    /// Whether the batch's state counts it.
    pub(crate) fn is_in_force(&self) -> bool {
        !self.read.void && !self.moved
    }

    /// Where its batch state stands now, if that is not "in force".
    pub(crate) fn fate(&self) -> Option<&'static str> {
        match (self.read.void, self.moved) {
            (true, _) => Some("voided: did not happen"),
            (_, true) => Some("moved to another batch"),
            _ => None,
        }
    }
}

/// See the module.
#[derive(Debug)]
pub(crate) struct Evidence {
    pub(crate) founded: SiteFounded,
    pub(crate) batch: BatchId,
    pub(crate) n: u64,
    pub(crate) log_size: u64,
    /// When the newest entry covered was recorded.
    pub(crate) drawn_up: Micros,
    pub(crate) originals: Vec<Original>,
    /// In the order in which things happened.
    pub(crate) told: Vec<Told>,
    pub(crate) desk: Desk,
    pub(crate) names: BTreeMap<PersonId, String>,
    pub(crate) rule_sets: BTreeMap<String, RuleSet>,
    pub(crate) head: Head,
    /// Numbers in the log of the amendments that void what they amend.
    voiding: BTreeSet<u64>,
}

impl House {
    /// Loads what a batch's record rests on.
    ///
    /// # Errors
    /// [`HouseError::Refused`] if there is no such batch, or it has no such entry.
    pub(crate) async fn evidence(
        &self,
        site: Site,
        batch: BatchId,
        as_of_n: Option<u64>,
    ) -> Result<Evidence, HouseError> {
        let mut reader = self.inner.db.reader().await?;
        let conn = &mut reader.conn();
        let count = log::count_of(conn, site.number, &batch.into()).await?;
        let n = as_of_n.unwrap_or(count);
        if count == 0 {
            return Err(HouseError::Refused(Refusal::unknown("batch")));
        }
        if n == 0 || n > count {
            return Err(HouseError::Refused(Refusal::meaningless(
                "/as_of_n",
                format!("the batch has entries 1 to {count}: give one of these numbers"),
            )));
        }
        let stored = first_entries(conn, &site, batch.into(), n).await?;
        let log_size = stored.last().map_or(0, |last| last.seq + 1);
        let head = self.head_at(conn, &site, log_size).await?;
        let mut loader = Loader::new(&site, log_size);
        let originals = loader.batch(batch, stored)?;
        loader.around(conn, &originals).await?;
        let names = loader.names(conn).await?;
        let told = loader.told(batch, &originals)?;
        let Loader { desk, voiding, .. } = loader;
        let founded = desk.site().ok().and_then(|state| state.founded.clone());
        let founded = founded.ok_or_else(|| HouseError::Refused(Refusal::unknown("site")))?;
        let rule_sets = rule_sets(conn, &site, &desk, &told).await?;
        let drawn_up = originals.last().map_or(Micros(0), |last| last.entry.recorded_at);
        Ok(Evidence {
            founded,
            batch,
            n,
            log_size,
            drawn_up,
            originals,
            told,
            desk,
            names,
            rule_sets,
            head,
            voiding,
        })
    }

    /// The head of a site's log at a size it has reached, signed. Ed25519 signs the same text the same way for ever.
    ///
    /// # Errors
    /// [`HouseError`].
    pub(crate) async fn head_at(
        &self,
        conn: &mut Conn<'_>,
        site: &Site,
        log_size: u64,
    ) -> Result<Head, HouseError> {
        let root = tiles::root_at(conn, site.number, log_size).await?;
        let checkpoint = Checkpoint { origin: site.origin.clone(), size: log_size, root };
        let note = checkpoint.sign(self.inner.secrets.log_key());
        let verifier = self.verifier(&site.origin)?;
        Ok(Head {
            origin: checkpoint.origin,
            size: log_size,
            root,
            note: note.map_err(|e| HouseError::Failed(e.to_string()))?,
            key: verifier.to_string(),
            fingerprint: verifier.fingerprint().to_string(),
        })
    }
}

impl Evidence {
    /// The site's time zone.
    pub(crate) fn zone(&self) -> &str {
        &self.founded.time_zone
    }

    /// A time as the record prints it.
    pub(crate) fn clock(&self, at: Micros) -> String {
        words::clock(at, self.zone())
    }

    /// Who acted, by printed name.
    pub(crate) fn name(&self, actor: Actor) -> String {
        match actor {
            Actor::System => "the program".to_owned(),
            Actor::Person(person) => {
                self.names.get(&person).cloned().unwrap_or_else(|| person.to_string())
            }
        }
    }

    /// The roles somebody had when the entry of that number was written.
    pub(crate) fn roles(&self, actor: Actor, before_seq: u64) -> String {
        let Actor::Person(person) = actor else { return String::new() };
        let subject = Subject::from(person);
        let Some(loaded) = self.desk.loaded(&subject) else { return String::new() };
        let until = loaded.entries.iter().filter(|entry| entry.seq < before_seq);
        let State::Person(state) = State::fold(subject, until) else { return String::new() };
        state.roles.iter().map(|role| role.name()).collect::<Vec<_>>().join(", ")
    }

    /// Whether an amendment voided what it amends.
    pub(crate) fn voids(&self, amendment: &Amendment) -> bool {
        self.voiding.contains(&amendment.seq)
    }

    /// The batch's opening, even if it was voided.
    pub(crate) fn opening(&self) -> Option<(&Told, &BatchOpened)> {
        self.told.iter().find_map(|told| match told.read.body.as_ref() {
            Body::BatchOpened(body) if body.batch == self.batch => Some((told, body)),
            _ => None,
        })
    }

    /// Every assessment of this batch, by the number of its entry in the log.
    pub(crate) fn assessments(&self) -> Vec<(u64, &Assessment)> {
        let mut all: Vec<_> = self
            .told
            .iter()
            .filter_map(|told| Some((told.read.seq, assessment(&told.read.body)?)))
            .collect();
        all.sort_by_key(|(seq, _)| *seq);
        all
    }

    /// SHA-256 over the leaf hashes of the batch's entries, in the order of their numbers.
    pub(crate) fn entries_digest(&self) -> Hash {
        let hashes: Vec<u8> = self.originals.iter().flat_map(|o| o.leaf_hash.0).collect();
        Hash::of(&hashes)
    }
}

/// The assessment in an entry, if it holds one.
fn assessment(body: &Body) -> Option<&Assessment> {
    match body {
        Body::ProposalAssessed(body) => Some(&body.assessment),
        Body::AdditionRecorded(body) => Some(&body.assessment),
        _ => None,
    }
}

/// Lays subjects on a desk as they stood when the log had a certain size.
struct Loader<'a> {
    site: &'a Site,
    log_size: u64,
    desk: Desk,
    actors: BTreeSet<PersonId>,
    voiding: BTreeSet<u64>,
}

impl<'a> Loader<'a> {
    fn new(site: &'a Site, log_size: u64) -> Self {
        Self {
            site,
            log_size,
            desk: Desk::new(site.id),
            actors: BTreeSet::new(),
            voiding: BTreeSet::new(),
        }
    }

    fn batch(&mut self, batch: BatchId, stored: Vec<Stored>) -> Result<Vec<Original>, HouseError> {
        let subject = Subject::from(batch);
        let entries = self.lay(subject, &stored)?;
        let numbered = |(stored, entry): (Stored, Entry)| {
            let n = entry.subjects.iter().find(|s| s.subject() == subject).map_or(0, |s| s.n);
            Original { n, leaf_hash: stored.leaf_hash, entry }
        };
        Ok(stored.into_iter().zip(entries).map(numbered).collect())
    }

    /// Everything the batch's entries speak of, then what that leans on, then everybody who acted.
    async fn around(
        &mut self,
        conn: &mut Conn<'_>,
        originals: &[Original],
    ) -> Result<(), HouseError> {
        self.load(conn, self.site.id.into()).await?;
        for original in originals {
            for subject in spoken_of(&original.entry)? {
                self.load(conn, subject).await?;
            }
        }
        let lots: Vec<Subject> = self.lots_lean_on(originals);
        for subject in lots {
            self.load(conn, subject).await?;
        }
        for person in self.actors.clone() {
            self.load(conn, person.into()).await?;
        }
        Ok(())
    }

    fn lots_lean_on(&self, originals: &[Original]) -> Vec<Subject> {
        let subjects = originals.iter().flat_map(|original| original.entry.subjects());
        let lots: BTreeSet<Subject> = subjects.filter(|s| s.kind == SubjectKind::Lot).collect();
        lots.into_iter()
            .filter_map(|lot| self.desk.lot(lot.id.into()).ok()?.received.as_ref())
            .flat_map(|(_, body)| {
                let supplier = body.supplier.map(Subject::from);
                [Some(Subject::from(body.material)), supplier].into_iter().flatten()
            })
            .collect()
    }

    async fn load(&mut self, conn: &mut Conn<'_>, subject: Subject) -> Result<(), HouseError> {
        if self.desk.loaded(&subject).is_some() {
            return Ok(());
        }
        let mut stored = Vec::new();
        loop {
            let after = stored.len() as u64;
            let page = log::entries_of(conn, self.site.number, &subject, after, PAGE).await?;
            let is_last = (page.len() as u64) < PAGE.unsigned_abs();
            let known = page.len();
            stored.extend(page.into_iter().filter(|entry| entry.seq < self.log_size));
            if is_last || stored.len() as u64 != after + known as u64 {
                break;
            }
        }
        self.lay(subject, &stored).map(drop)
    }

    fn lay(&mut self, subject: Subject, stored: &[Stored]) -> Result<Vec<Entry>, HouseError> {
        let entries: Vec<Entry> = stored.iter().map(Stored::entry).collect::<Result<_, _>>()?;
        for entry in &entries {
            self.note(entry)?;
        }
        self.desk.put(subject, &entries).map_err(|e| inconsistent(&e))?;
        Ok(entries)
    }

    /// Remembers who acts in the batch, its lots and its deviations, and which amendments void.
    fn note(&mut self, entry: &Entry) -> Result<(), HouseError> {
        let is_told = |s: Subject| matches!(s.kind, SubjectKind::Batch | SubjectKind::Deviation);
        let is_amendment = entry.kind == "entry.amended";
        if let Actor::Person(person) = entry.actor
            && (is_amendment || entry.subjects().any(is_told))
        {
            self.actors.insert(person);
        }
        if is_amendment
            && let Body::EntryAmended(body) =
                Body::read(&entry.kind, entry.kv, &entry.body).map_err(|e| inconsistent(&e))?
            && matches!(body.effect, Effect::Void(_))
        {
            self.voiding.insert(entry.seq);
        }
        Ok(())
    }

    /// The batch's entries as they read in the end; those that an amendment moved away are kept.
    fn told(&self, batch: BatchId, originals: &[Original]) -> Result<Vec<Told>, HouseError> {
        let subject = Subject::from(batch);
        let in_force = self.desk.loaded(&subject).map(|loaded| loaded.entries.clone());
        let mut told = Vec::new();
        for read in in_force.unwrap_or_default() {
            let by_seq = |seq: u64| originals.iter().find(move |o| o.entry.seq == seq);
            let moved_here = || read.amendments.iter().find_map(|a| by_seq(a.seq));
            let original = by_seq(read.seq).or_else(moved_here);
            let n = original.map_or(0, |original| original.n);
            let captured_at = by_seq(read.seq).and_then(|original| original.entry.captured_at);
            told.push(Told { n, read, captured_at, moved: false });
        }
        told.extend(moved_away(originals, &told)?);
        told.sort_by_key(|told| told.read.order());
        Ok(told)
    }

    /// The printed names of everybody who acted, as the directory has them today.
    async fn names(&self, conn: &mut Conn<'_>) -> Result<BTreeMap<PersonId, String>, HouseError> {
        let mut names = BTreeMap::new();
        for person in &self.actors {
            let known = directory::by_id(conn, self.site.number, *person).await?;
            let name = known.map_or_else(|| person.to_string(), |known| tidy(&known.name));
            names.insert(*person, name);
        }
        Ok(names)
    }
}

/// The first `n` entries of a subject.
async fn first_entries(
    conn: &mut Conn<'_>,
    site: &Site,
    subject: Subject,
    n: u64,
) -> Result<Vec<Stored>, HouseError> {
    let limit = i64::try_from(n).map_err(|_| HouseError::Failed("too many entries".to_owned()))?;
    let stored = log::entries_of(conn, site.number, &subject, 0, limit).await?;
    if stored.len() as u64 == n {
        Ok(stored)
    } else {
        let told = format!("{subject} has not {n} entries");
        Err(StoreError::Inconsistent(told).into())
    }
}

/// The subjects a record of this entry has to know: not holdings, which are told by what lies in them.
fn spoken_of(entry: &Entry) -> Result<Vec<Subject>, HouseError> {
    let mut subjects: Vec<Subject> = entry
        .subjects()
        .filter(|s| !matches!(s.kind, SubjectKind::Holding | SubjectKind::Batch))
        .collect();
    let body = Body::read(&entry.kind, entry.kv, &entry.body).map_err(|e| inconsistent(&e))?;
    match &body {
        Body::ReadingTaken(body) => subjects
            .extend(body.values.iter().filter_map(|value| value.instrument).map(Subject::from)),
        Body::EntryAmended(amendment) => {
            if let Effect::Item(item) = &amendment.effect
                && let Some(instrument) = item.value.get("instrument").and_then(|id| id.as_str())
                && let Ok(instrument) = instrument.parse::<domain::ids::InstrumentId>()
            {
                subjects.push(instrument.into());
            }
            if let Effect::Replace(replacement) = &amendment.effect
                && let Ok(Body::ReadingTaken(body)) =
                    Body::read(&amendment.target.kind, amendment.target.kv, &replacement.body)
            {
                subjects.extend(body.values.iter().filter_map(|v| v.instrument).map(Subject::from));
            }
        }
        _ => {}
    }
    Ok(subjects)
}

/// Entries that began as this batch's and are not any more, with how that came.
fn moved_away(originals: &[Original], told: &[Told]) -> Result<Vec<Told>, HouseError> {
    let mut away: BTreeMap<u64, Told> = BTreeMap::new();
    for original in originals {
        let entry = &original.entry;
        let read = InForce::original(entry).map_err(|e| inconsistent(&e))?;
        if let Body::EntryAmended(amendment) = read.body.as_ref() {
            if let Some(before) = away.get_mut(&amendment.target.seq) {
                let after = before.read.amended(entry, amendment).map_err(|e| inconsistent(&e))?;
                before.read = Arc::new(after);
            }
        } else if !told.iter().any(|told| told.read.seq == entry.seq) {
            let captured_at = entry.captured_at;
            let told = Told { n: original.n, read: Arc::new(read), captured_at, moved: true };
            away.insert(entry.seq, told);
        }
    }
    Ok(away.into_values().collect())
}

/// The texts of the rule sets that were adopted, or that judged this batch.
async fn rule_sets(
    conn: &mut Conn<'_>,
    site: &Site,
    desk: &Desk,
    told: &[Told],
) -> Result<BTreeMap<String, RuleSet>, HouseError> {
    let adopted = desk.site().map(|state| &state.adopted).ok();
    let adopted = adopted.into_iter().flatten().map(|(_, (_, body))| body.digest.clone());
    let used = told.iter().filter_map(|told| assessment(&told.read.body));
    let used = used.flat_map(|found| found.rule_sets.iter().map(|set| set.digest.clone()));
    let mut sets = BTreeMap::new();
    for digest in adopted.chain(used).collect::<BTreeSet<_>>() {
        let missing = || StoreError::Inconsistent(format!("there is no rule set {digest}"));
        let hash: Hash = digest.parse().map_err(|_| missing())?;
        let (_, bytes) = blobs::find(conn, site.number, &hash).await?.ok_or_else(missing)?;
        let text = String::from_utf8(bytes).map_err(|_| missing())?;
        let set = RuleSet::parse(&text).map_err(|e| inconsistent(&e))?;
        sets.insert(digest, set);
    }
    Ok(sets)
}

/// Text from outside the log in the log's own form: normal form C, no control characters.
pub(crate) fn tidy(text: &str) -> String {
    text.nfc().map(|c| if c.is_control() { ' ' } else { c }).collect()
}

fn inconsistent(error: &dyn std::error::Error) -> HouseError {
    StoreError::Inconsistent(error.to_string()).into()
}
