//! One site's place in the writer: its desk, and what has to be laid on it before a command can be decided.

use std::collections::{HashMap, HashSet};
use std::panic::{AssertUnwindSafe, catch_unwind};
use std::sync::Arc;
use std::time::Instant;

use domain::book::command::{Act, Command, Decision, Need, Refusal, Stop};
use domain::book::subject::Subject;
use domain::book::{Desk, Loaded};
use domain::ledger::tiles::Edge;
use domain::ledger::tree::TreeHead;
use domain::stamp::Micros;

use super::drawn::Drawn;
use super::sheet::Sheet;
use super::{Answer, Receipt, Tools, WriteError, clock, continuing};
use crate::error::chain;
use crate::read;
use crate::sites::Site;
use crate::snapshots::Published;
use crate::{Conn, StoreError, commands, directory, log, tiles};

/// How often one command may ask for more before its decision counts as failed.
const ROUNDS: usize = 64;

/// How many subjects lie on a desk before the ones not used lately are taken off.
const ROOM: usize = 20_000;

pub(super) struct Bench {
    pub(super) site: Site,
    /// Between groups nothing lies here but rule sets, which never change.
    desk: Desk,
    edge: Edge,
    /// The head that the latest group left: a log that still stands there needs no comparing with what was signed.
    left: Option<TreeHead>,
    /// Subjects of earlier groups, and in which they were last needed. Good only if nobody else has written
    /// since, or if the locked counter agrees.
    shelf: HashMap<Subject, (Arc<Loaded>, u64)>,
    /// The first of the latest groups between which nobody else has written.
    unbroken_since: u64,
    /// What the latest group had on the desk.
    touched: HashSet<Subject>,
    group: u64,
}

/// What a group came to for one site.
pub(super) struct Done {
    pub(super) answers: Vec<Answer>,
    /// The new head, if anything was written.
    pub(super) head: Option<TreeHead>,
    pub(super) entries: usize,
}

impl Bench {
    pub(super) fn new(site: Site) -> Self {
        let desk = Desk::new(site.id);
        Self {
            site,
            desk,
            edge: Edge::default(),
            left: None,
            shelf: HashMap::new(),
            touched: HashSet::new(),
            unbroken_since: 0,
            group: 0,
        }
    }

    /// Decides the commands in turn and writes what they come to. After an error this bench must be thrown away.
    pub(super) async fn carry_out(
        &mut self,
        conn: &mut Conn<'_>,
        tools: &Tools,
        commands: &[&Command],
    ) -> Result<Done, WriteError> {
        self.group += 1;
        let head = log::lock_head(conn, self.site.number).await?;
        let stands = head.tree_head();
        if self.left != Some(stands) {
            self.unbroken_since = self.group;
            let remembered = continuing::remembered(tools, &self.site)?;
            continuing::check(conn, &self.site, remembered, &stands).await?;
        }
        tiles::catch_up(conn, self.site.number, &mut self.edge, &head).await?;
        let mut sheet = Sheet::new(head);
        let ids: Vec<_> = commands.iter().map(|command| command.id).collect();
        let earlier = commands::find(conn, self.site.number, &ids).await?;
        self.prepare(conn, &mut sheet, commands).await?;

        let mut answers = Vec::with_capacity(commands.len());
        for command in commands {
            let answer = match earlier.get(&command.id) {
                Some(earlier) => {
                    commands::repeat(conn, self.site.number, &command.print, earlier).await?
                }
                None => self.decide(conn, tools, &mut sheet, command).await?,
            };
            answers.push(answer);
        }
        let head = match sheet.len() {
            0 => None,
            _ => Some(sheet.write(conn, &self.site, &mut self.edge, tools).await?),
        };
        self.left = Some(head.unwrap_or(stands));
        let entries = sheet.len();
        self.tidy(sheet.subjects);
        Ok(Done { answers, head, entries })
    }

    /// Hands the states of subjects that somebody reads to the readers. Called after the commit.
    pub(super) fn publish(&self, published: &Published, locked: Instant) {
        for subject in &self.touched {
            if let Some((loaded, _)) = self.shelf.get(subject) {
                published.renew(self.site.number, *subject, loaded, locked);
            }
        }
    }

    async fn decide(
        &mut self,
        conn: &mut Conn<'_>,
        tools: &Tools,
        sheet: &mut Sheet,
        command: &Command,
    ) -> Result<Answer, WriteError> {
        if let Some(answer) = sheet.answer_to(command) {
            return Ok(answer);
        }
        let is_correction = matches!(command.act, Act::CorrectClock(_));
        let last = sheet.position.last_recorded_at;
        let recorded = match clock::next(last, (tools.clock)(), is_correction) {
            Ok(recorded) => recorded,
            Err(behind) => return Ok(Err(behind)),
        };
        let mut drawn = Drawn::new(&*tools.draw);
        for _ in 0..ROUNDS {
            let mut draw = drawn.anew();
            let desk = &self.desk;
            let outcome =
                catch_unwind(AssertUnwindSafe(|| desk.decide(command, recorded, &mut draw)));
            match outcome {
                Ok(Ok(decision)) => {
                    if self.is_login_taken(conn, sheet, &decision).await? {
                        let refusal = Refusal::conflict("somebody else signs in with this login");
                        return Ok(Err(WriteError::Refused(refusal)));
                    }
                    return Ok(Ok(self.append(sheet, command, decision, recorded)?));
                }
                Ok(Err(Stop::Refused(refusal))) => return Ok(Err(WriteError::Refused(refusal))),
                Ok(Err(Stop::Need(needs))) => {
                    self.lay(conn, sheet, needs).await?;
                }
                Err(panic) => return Ok(Err(WriteError::Failed(told(&*panic)))),
            }
        }
        Ok(Err(WriteError::Failed("its decision does not come to an end".to_owned())))
    }

    /// The book does not know the directory's logins, so they are looked up here.
    async fn is_login_taken(
        &self,
        conn: &mut Conn<'_>,
        sheet: &Sheet,
        decision: &Decision,
    ) -> Result<bool, StoreError> {
        for write in &decision.directory {
            if sheet.has_login(write) || directory::is_taken(conn, self.site.number, write).await? {
                return Ok(true);
            }
        }
        Ok(false)
    }

    /// Appends a decision. After an error the desk is in disorder, and the group must be given up.
    fn append(
        &mut self,
        sheet: &mut Sheet,
        command: &Command,
        decision: Decision,
        recorded: Micros,
    ) -> Result<Receipt, WriteError> {
        let (desk, position) = (&mut self.desk, &mut sheet.position);
        let appended =
            catch_unwind(AssertUnwindSafe(|| desk.append(position, command, decision, recorded)))
                .map_err(|panic| WriteError::Failed(told(&*panic)))?
                .map_err(|error| WriteError::Failed(chain(&error)))?;
        Ok(sheet.take(command, appended)?)
    }

    /// Lays on the desk everything the commands will surely touch.
    async fn prepare(
        &mut self,
        conn: &mut Conn<'_>,
        sheet: &mut Sheet,
        commands: &[&Command],
    ) -> Result<(), StoreError> {
        let mut subjects: Vec<Subject> =
            commands.iter().flat_map(|command| self.desk.subjects_of(command)).collect();
        subjects.sort_unstable();
        subjects.dedup();
        self.lay_subjects(conn, sheet, &subjects).await
    }

    /// Lays subjects on the desk, from the shelf as far as it goes. What nobody else can have written to stands as it
    /// lies there; for the rest the locked counters say what is to be read from the log.
    async fn lay_subjects(
        &mut self,
        conn: &mut Conn<'_>,
        sheet: &mut Sheet,
        subjects: &[Subject],
    ) -> Result<(), StoreError> {
        let stands = |(_, group): &(Arc<Loaded>, u64)| self.unbroken_since <= *group;
        let asked: Vec<Subject> =
            subjects.iter().filter(|s| !self.shelf.get(s).is_some_and(stands)).copied().collect();
        let counters = log::counts(conn, self.site.number, &asked).await?;
        for subject in subjects {
            let shelved = self.shelf.remove(subject);
            let n = match &shelved {
                Some((loaded, group)) if self.unbroken_since <= *group => loaded.n,
                _ => counters.get(subject).copied().unwrap_or_default(),
            };
            let shelved = shelved.map(|(loaded, _)| loaded);
            let loaded = read::load(conn, &self.site, *subject, n, shelved).await?;
            self.desk.lend(*subject, loaded);
            sheet.subjects.insert(*subject);
        }
        Ok(())
    }

    /// Lays on the desk what a decision asks for, from this group or from the transaction's own view of the tables.
    async fn lay(
        &mut self,
        conn: &mut Conn<'_>,
        sheet: &mut Sheet,
        needs: Vec<Need>,
    ) -> Result<(), StoreError> {
        let mut subjects = Vec::new();
        for need in needs {
            match need {
                Need::Subject(subject) => subjects.push(subject),
                other => {
                    if !sheet.lay(&mut self.desk, &other)? {
                        read::lay(conn, &self.site, &mut self.desk, &other).await?;
                    }
                }
            }
        }
        subjects.sort_unstable();
        subjects.dedup();
        self.lay_subjects(conn, sheet, &subjects).await
    }

    /// Ends the group: moves its subjects to the shelf, and clears that if it is crowded.
    fn tidy(&mut self, subjects: HashSet<Subject>) {
        self.touched = subjects;
        for subject in &self.touched {
            if let Some(loaded) = self.desk.loaded(subject).cloned() {
                self.desk.forget(subject);
                self.shelf.insert(*subject, (loaded, self.group));
            }
        }
        self.desk.end_group();
        if self.shelf.len() > ROOM {
            let latest = self.group;
            self.shelf.retain(|_, (_, group)| *group == latest);
        }
    }
}

/// What a panic said.
fn told(panic: &(dyn std::any::Any + Send)) -> String {
    let text = panic.downcast_ref::<&str>().map(|text| (*text).to_owned());
    text.or_else(|| panic.downcast_ref::<String>().cloned())
        .unwrap_or_else(|| "it gave up without saying why".to_owned())
}
