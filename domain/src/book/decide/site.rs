//! Founding, people, settings, rule sets, reference data, and a clock that was set back.

use std::collections::BTreeMap;

use sha2::{Digest, Sha256};

use super::Deciding;
use crate::book::body::{
    Body, ClockCorrected, PersonEnrolled, RoleGranted, RoleWithdrawn, RulesetAdopted,
    SettingsChanged, SiteFounded, VesselDescribed,
};
use crate::book::command::{
    Adopt, Blob, CorrectClock, Decision, DirectoryPerson, DirectoryWrite, Enrol, Found, Refusal,
    Stop,
};
use crate::book::desk::{hex, sha256_hex};
use crate::book::role::Role;
use crate::book::state::State;
use crate::book::state::things::Description;
use crate::book::subject::Subject;
use crate::ids::PersonId;
use crate::rules::RuleSet;
use crate::stamp::Stamp;

pub(super) fn found(it: &mut Deciding<'_>, act: &Found) -> Result<Decision, Stop> {
    let site = it.desk.site_id();
    if it.desk.subject(site.into())?.n > 0 {
        return Err(Refusal::conflict("this book has been founded already").into());
    }
    let mut codes: Vec<_> = act.premises.iter().map(|premises| &premises.code).collect();
    codes.sort();
    codes.dedup();
    if codes.len() != act.premises.len() || codes.is_empty() {
        return Err(Refusal::meaningless(
            "/premises",
            "name at least one premises, each with a code of its own",
        )
        .into());
    }
    let at = Stamp::new(it.now, act.offset_minutes);
    let founded = SiteFounded {
        code: act.code.clone(),
        name: act.name.clone(),
        origin: act.origin.clone(),
        public_key: act.public_key.clone(),
        time_zone: act.time_zone.clone(),
        licence: act.licence.clone(),
        premises: act.premises.clone(),
        simulation: act.simulation,
        single_handed: act.single_handed,
    };
    let founding = it.draft(at, [site.into()], founded);
    let mut decision = enrolment(it, at, &act.admin, &[Role::Admin]);
    decision.drafts.insert(0, founding);
    Ok(decision)
}

/// Enrols a person with first roles, and puts the directory's record beside the log.
fn enrolment(
    it: &mut Deciding<'_>,
    at: Stamp,
    person: &DirectoryPerson,
    roles: &[Role],
) -> Decision {
    let subject = Subject::from(person.person);
    let enrolled = PersonEnrolled { person: person.person, identity: identity(person) };
    let mut drafts = vec![it.draft(at, [subject], enrolled)];
    for role in roles {
        drafts.push(it.draft(at, [subject], RoleGranted { person: person.person, role: *role }));
    }
    Decision {
        drafts,
        directory: vec![DirectoryWrite::Person(person.clone())],
        ..Decision::default()
    }
}

/// SHA-256 over the salt, then name and login each with its length before it.
pub fn identity(person: &DirectoryPerson) -> String {
    let mut hash = Sha256::new();
    hash.update(&person.salt);
    for text in [&person.name, &person.login] {
        hash.update(u64::try_from(text.len()).unwrap_or(u64::MAX).to_be_bytes());
        hash.update(text.as_bytes());
    }
    hex(&hash.finalize())
}

pub(super) fn correct_clock(it: &mut Deciding<'_>, act: &CorrectClock) -> Decision {
    let body = ClockCorrected { previous: it.now, clock: act.at.at, reason: act.reason.clone() };
    let site = it.desk.site_id();
    let draft = it.draft(act.at, [site.into()], body);
    Decision { drafts: vec![draft], ..Decision::default() }
}

pub(super) fn enrol(it: &mut Deciding<'_>, act: &Enrol) -> Result<Decision, Stop> {
    if it.desk.subject(act.person.person.into())?.n > 0 {
        return Err(Refusal::conflict("this person is enrolled already").into());
    }
    let at = local(it)?;
    Ok(enrolment(it, at, &act.person, &act.roles))
}

/// Now, on the wall clock the site was founded with.
fn local(it: &Deciding<'_>) -> Result<Stamp, Stop> {
    let site = it.desk.site()?;
    let zone = site.founded.as_ref().map_or("UTC", |founded| founded.time_zone.as_str());
    Ok(Stamp::in_zone(it.now, zone))
}

pub(super) fn grant(it: &mut Deciding<'_>, person: PersonId, role: Role) -> Result<Decision, Stop> {
    it.needs(&[Role::Admin], "grant a role")?;
    if it.desk.person(person)?.roles.contains(&role) {
        let what = format!("the person has the role {} already", role.name());
        return Err(Refusal::conflict(what).into());
    }
    let at = it.now_at_the_end_of(person.into())?;
    let draft = it.draft(at, [person.into()], RoleGranted { person, role });
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn withdraw(
    it: &mut Deciding<'_>,
    person: PersonId,
    role: Role,
    reason: Option<String>,
) -> Result<Decision, Stop> {
    it.needs(&[Role::Admin], "withdraw a role")?;
    if !it.desk.person(person)?.roles.contains(&role) {
        let what = format!("the person has not the role {}", role.name());
        return Err(Refusal::conflict(what).into());
    }
    if role == Role::Admin && it.command.actor == crate::ledger::entry::Actor::Person(person) {
        return Err(Refusal::conflict(
            "nobody takes the role admin from themselves: let another admin do it, so that one remains",
        )
        .into());
    }
    let at = it.now_at_the_end_of(person.into())?;
    let draft = it.draft(at, [person.into()], RoleWithdrawn { person, role, reason });
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn change_settings(
    it: &mut Deciding<'_>,
    settings: &BTreeMap<String, String>,
    reason: &str,
) -> Result<Decision, Stop> {
    let mut all = it.desk.site()?.settings.clone();
    all.extend(settings.iter().map(|(name, value)| (name.clone(), value.clone())));
    crate::book::assessing::settings_of(&all)?;
    let site = it.desk.site_id();
    let at = it.now_at_the_end_of(site.into())?;
    let body = SettingsChanged { settings: settings.clone(), reason: reason.to_owned() };
    let draft = it.draft(at, [site.into()], body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn adopt(it: &mut Deciding<'_>, act: &Adopt) -> Result<Decision, Stop> {
    let set =
        RuleSet::parse(&act.text).map_err(|e| Refusal::meaningless("/text", e.to_string()))?;
    let site = it.desk.site_id();
    let body = RulesetAdopted {
        set: set.id.clone(),
        version: set.version.clone(),
        digest: sha256_hex(act.text.as_bytes()),
        standing: act.standing.clone(),
    };
    let draft = it.draft(act.from, [site.into()], body);
    let blob = Blob {
        digest: Sha256::digest(act.text.as_bytes()).into(),
        media_type: "application/toml".to_owned(),
        bytes: act.text.clone().into_bytes(),
    };
    Ok(Decision { drafts: vec![draft], blobs: vec![blob], ..Decision::default() })
}

pub(super) fn describe<T>(it: &mut Deciding<'_>, body: T) -> Result<Decision, Stop>
where
    T: Description + Into<Body>,
{
    it.desk.code_is_free(T::KIND, body.code(), body.id())?;
    let subject = Subject { kind: T::KIND, id: body.id() };
    let at = it.now_at_the_end_of(subject)?;
    let draft = it.draft(at, [subject], body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn describe_vessel(
    it: &mut Deciding<'_>,
    body: &VesselDescribed,
) -> Result<Decision, Stop> {
    let site = it.desk.site()?;
    let premises = site.founded.iter().flat_map(|founded| &founded.premises);
    let codes: Vec<_> = premises.map(|premises| premises.code.as_str()).collect();
    if !codes.contains(&body.premises.as_str()) {
        return Err(Refusal::meaningless(
            "/premises",
            format!("there are no premises {:?}: use one of {}", body.premises, codes.join(", ")),
        )
        .into());
    }
    if let State::Vessel(current) = &it.desk.subject(body.vessel.into())?.state
        && let Some((_, current)) = &current.current
        && current.premises != body.premises
    {
        return Err(Refusal::meaningless(
            "/premises",
            "a vessel stays on its premises in the book: describe it anew under another id when it is moved",
        )
        .into());
    }
    describe(it, body.clone())
}
