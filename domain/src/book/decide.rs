//! What may happen: a command, held against what lies on the desk, becomes entries or a refusal.
//!
//! A true event is never refused: what has happened is recorded, and what was wrong with it opens a deviation. Only
//! what has not happened yet can be stopped.

mod additions;
mod batches;
mod lots;
mod oversight;
mod readings;
mod site;

pub use batches::PRODUCT_CLASSES;
pub use oversight::MEANINGS;
pub use site::identity;

use std::collections::BTreeSet;

use uuid::Uuid;

use super::assessing::settings_of;
use super::body::{Body, Late, LateBasis};
use super::command::{Act, AmendTo, Command, Decision, Draft, Refusal, Stop};
use super::desk::Desk;
use super::role::Role;
use super::subject::Subject;
use crate::ids::{EntryId, SiteId};
use crate::ledger::entry::Actor;
use crate::settings::{Setting, Settings};
use crate::stamp::{Micros, Stamp};

/// The engine whose computed figures stand in entries.
pub use crate::checks::ENGINE;

/// Everything a decision leans on.
pub(crate) struct Deciding<'a> {
    pub(crate) desk: &'a Desk,
    pub(crate) command: &'a Command,
    roles: BTreeSet<Role>,
    pub(crate) now: Micros,
    draw: &'a mut dyn FnMut() -> Uuid,
}

impl Deciding<'_> {
    /// A new id.
    pub(crate) fn id<T: From<Uuid>>(&mut self) -> T {
        (self.draw)().into()
    }

    /// A draft about these subjects.
    pub(crate) fn draft(
        &mut self,
        occurred_at: Stamp,
        subjects: impl IntoIterator<Item = Subject>,
        body: impl Into<Body>,
    ) -> Draft {
        Draft {
            id: self.id::<EntryId>(),
            occurred_at,
            captured_at: None,
            subjects: subjects.into_iter().collect(),
            body: body.into(),
        }
    }

    /// Whether something is entered later than the site allows, and on what that is judged.
    pub(crate) fn late(
        &self,
        since: Stamp,
        captured_at: Option<Stamp>,
        reason: Option<&String>,
    ) -> Result<Option<Late>, Stop> {
        let settings = settings_of(&self.desk.site()?.settings)?;
        Ok(late(&settings, since, captured_at, self.now, reason))
    }

    /// Now on the site's wall clock, and not before what was last said about the subject: what holds from now on must
    /// come last in the fold, also after a clock was set back.
    pub(crate) fn now_at_the_end_of(&self, subject: Subject) -> Result<Stamp, Stop> {
        let newest = self.desk.subject(subject)?.entries.last().map(|entry| entry.occurred_at.at);
        let at = newest.map_or(self.now, |newest| newest.max(self.now));
        Ok(Stamp::in_zone(at, &lots::zone(self)?))
    }

    /// Refuses unless the caller has one of these roles now.
    pub(crate) fn needs(&self, roles: &[Role], to: &str) -> Result<(), Refusal> {
        if roles.iter().any(|role| self.roles.contains(role)) {
            return Ok(());
        }
        let names: Vec<_> = roles.iter().map(|role| role.name()).collect();
        Err(Refusal::forbidden(format!("to {to} one needs the role {}", names.join(" or "))))
    }
}

/// What was captured without network counts from then, unless the device's clock is ahead of ours.
pub(crate) fn late(
    settings: &Settings,
    since: Stamp,
    captured_at: Option<Stamp>,
    now: Micros,
    reason: Option<&String>,
) -> Option<Late> {
    let (entered, basis) = match captured_at {
        Some(captured) if captured.at < now => (captured.at, LateBasis::Captured),
        _ => (now, LateBasis::Recorded),
    };
    let limit = Setting::LateEntryHours;
    (entered.0 - since.at.0 > additions::span(settings, limit)).then(|| Late {
        limit_hours: settings.text(limit).to_owned(),
        basis,
        reason: reason.cloned(),
    })
}

/// What the actor may be at this moment, under the lock: of the roles the command came with, those still held.
fn roles_now(desk: &Desk, command: &Command) -> Result<BTreeSet<Role>, Stop> {
    if matches!(command.act, Act::Found(_)) {
        return Ok(BTreeSet::new());
    }
    desk.site()?;
    let Actor::Person(person) = command.actor else { return Ok(BTreeSet::new()) };
    let held = &desk.person(person)?.roles;
    let roles: BTreeSet<Role> = command.roles.intersection(held).copied().collect();
    if roles.is_empty() {
        let what = "your roles at this site were withdrawn: an administrator can grant them again";
        return Err(Refusal::forbidden(what).into());
    }
    Ok(roles)
}

/// Decides.
///
/// # Errors
/// [`Stop`].
pub(crate) fn decide(
    desk: &Desk,
    command: &Command,
    now: Micros,
    draw: &mut dyn FnMut() -> Uuid,
) -> Result<Decision, Stop> {
    let roles = roles_now(desk, command)?;
    let mut deciding = Deciding { desk, command, roles, now, draw };
    let it = &mut deciding;
    match &command.act {
        Act::Found(act) => site::found(it, act),
        Act::CorrectClock(act) => Ok(site::correct_clock(it, act)),
        Act::Enrol(act) => site::enrol(it, act),
        Act::Grant(person, role) => site::grant(it, *person, *role),
        Act::Withdraw(person, role, reason) => site::withdraw(it, *person, *role, reason.clone()),
        Act::ChangeSettings(settings, reason) => site::change_settings(it, settings, reason),
        Act::Adopt(act) => site::adopt(it, act),
        Act::DescribeMaterial(body) => site::describe(it, body.clone()),
        Act::DescribeParty(body) => site::describe(it, body.clone()),
        Act::DescribeVessel(body) => site::describe_vessel(it, body),
        Act::DescribeInstrument(body) => site::describe(it, body.clone()),
        Act::Receive(act) => lots::receive(it, act),
        Act::ChangeLotStatus(lot, status, reason) => lots::change_status(it, *lot, *status, reason),
        Act::OpenBatch(act) => batches::open(it, act),
        Act::TakeReading(act) => readings::take(it, act),
        Act::Propose(act) => additions::propose(it, act),
        Act::Add(act) => additions::add(it, act),
        Act::SignOff(act) => oversight::sign_off(it, act),
        Act::OpenDeviation(act) => oversight::open_deviation(it, act),
        Act::ResolveDeviation(act) => oversight::resolve_deviation(it, act),
        Act::Amend(act) => oversight::amend(it, act),
        Act::Issue(act) => oversight::issue(it, act),
    }
}

/// What a command will surely lean on.
pub(crate) fn subjects_of(site: SiteId, act: &Act) -> Vec<Subject> {
    let mut subjects = BTreeSet::from([Subject::from(site)]);
    let draws = match act {
        Act::TakeReading(act) => {
            subjects.insert(act.batch.into());
            &[][..]
        }
        Act::Propose(act) => {
            subjects.insert(act.batch.into());
            &act.draws[..]
        }
        Act::Add(act) => {
            subjects.insert(act.batch.into());
            &act.draws[..]
        }
        Act::OpenBatch(act) => {
            subjects.insert(act.batch.into());
            subjects.insert(act.vessel.into());
            &act.ingredients[..]
        }
        Act::Receive(act) => {
            subjects.insert(act.lot.into());
            subjects.insert(act.material.into());
            &[][..]
        }
        Act::ChangeLotStatus(lot, ..) => {
            subjects.insert((*lot).into());
            &[][..]
        }
        Act::Grant(person, _) | Act::Withdraw(person, ..) => {
            subjects.insert((*person).into());
            &[][..]
        }
        Act::Issue(act) => {
            subjects.insert(act.batch.into());
            &[][..]
        }
        Act::ResolveDeviation(act) => {
            subjects.insert(act.deviation.into());
            &[][..]
        }
        Act::Amend(act) => match &act.effect {
            AmendTo::Addition(add) => &add.draws[..],
            _ => &[][..],
        },
        _ => &[][..],
    };
    subjects.extend(draws.iter().map(|draw| Subject::from(draw.lot)));
    subjects.into_iter().collect()
}
