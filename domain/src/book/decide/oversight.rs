//! Signatures, deviations, amendments, issued records.

use std::collections::BTreeSet;

use super::Deciding;
use super::additions::{breach as breach_of, corrected, is_worse, span, subjects_of};
use super::batches::{opening, opening_subjects};
use super::lots::receipt;
use super::readings::{Sampled, checked, reading};
use crate::book::assessing::settings_of;
use crate::book::body::oversight::{About, ItemChange, VoidMark};
use crate::book::body::{
    AdditionRecorded, Body, DeviationOpened, DeviationResolved, Effect, EntryAmended, RecordIssued,
    Replacement, SignoffGiven, Target,
};
use crate::book::command::{
    Amend, AmendTo, Decision, Issue, OpenDeviation, Refusal, ResolveDeviation, SignOff, Stop,
    not_ahead,
};
use crate::book::in_force::InForce;
use crate::book::role::Role;
use crate::book::subject::{Subject, SubjectKind};
use crate::checks::Verdict;
use crate::settings::Setting;
use crate::stamp::{Micros, Stamp};

/// What a signature may mean.
pub const MEANINGS: &[&str] = &["performed", "reviewed", "approved the exception", "released"];

pub(super) fn sign_off(it: &mut Deciding<'_>, act: &SignOff) -> Result<Decision, Stop> {
    it.needs(&[Role::Lead, Role::Quality], "sign")?;
    if !MEANINGS.contains(&act.meaning.as_str()) {
        return Err(Refusal::meaningless(
            "/meaning",
            format!("use one of {}", MEANINGS.join(", ")),
        )
        .into());
    }
    let target = it.desk.entry_in_force(act.target)?;
    let Body::ProposalAssessed(proposal) = target.body.as_ref() else {
        return Err(Refusal::conflict("only a proposal can be signed here").into());
    };
    let state = it.desk.batch(proposal.batch)?;
    let signed = state.proposals.get(&proposal.proposal);
    if signed.is_some_and(|state| state.done_by.is_some()) {
        return Err(Refusal::conflict("this proposal has been carried out already").into());
    }
    if proposal.assessment.verdict == Verdict::Refuse {
        return Err(
            Refusal::conflict("what was refused cannot be signed: propose something else").into()
        );
    }
    let site = it.desk.site()?;
    let single_handed = site.founded.as_ref().is_some_and(|founded| founded.single_handed);
    let is_own = target.actor == it.command.actor;
    if is_own && !single_handed {
        return Err(Refusal::forbidden(
            "the person who proposed cannot approve the exception: a second person signs",
        )
        .into());
    }
    if it.now > proposal.lapses_at.at {
        return Err(Refusal::conflict(format!(
            "this proposal lapsed at {}: propose again",
            proposal.lapses_at
        ))
        .into());
    }
    if act.binds != proposal.shown {
        return Err(Refusal::conflict(
            "what you were shown is not what this proposal says: look at it again before you sign",
        )
        .into());
    }
    let settings = settings_of(&site.settings)?;
    let valid_until = Stamp::new(
        Micros(act.signed_at.at.0 + span(&settings, Setting::SignoffValidHours)),
        act.signed_at.offset_minutes,
    );
    let body = SignoffGiven {
        target: target.id,
        target_seq: target.seq,
        proposal: Some(proposal.proposal),
        meaning: act.meaning.clone(),
        binds: act.binds.clone(),
        reason: act.reason.clone(),
        valid_until: Some(valid_until),
        single_person: is_own,
    };
    let draft = it.draft(act.signed_at, target.subjects.iter().copied(), body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn open_deviation(it: &mut Deciding<'_>, act: &OpenDeviation) -> Result<Decision, Stop> {
    not_ahead("/opened_at", act.opened_at, it.now)?;
    if it.desk.subject(act.deviation.into())?.n > 0 {
        return Err(Refusal::conflict("this deviation has been opened already").into());
    }
    it.desk.code_is_free(SubjectKind::Deviation, &act.code, act.deviation.0)?;
    let mut subjects: Vec<Subject> = vec![act.deviation.into()];
    if let Some(batch) = act.batch {
        it.desk.batch(batch)?;
        subjects.push(batch.into());
    }
    let body = DeviationOpened {
        deviation: act.deviation,
        code: act.code.clone(),
        title: act.title.clone(),
        batch: act.batch,
        entry: None,
        findings: Vec::new(),
    };
    let draft = it.draft(act.opened_at, subjects, body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn resolve_deviation(
    it: &mut Deciding<'_>,
    act: &ResolveDeviation,
) -> Result<Decision, Stop> {
    it.needs(&[Role::Quality], "resolve a deviation")?;
    let state = it.desk.deviation(act.deviation)?;
    if state.resolved.is_some() {
        return Err(Refusal::conflict("this deviation has been resolved already").into());
    }
    let Some((_, _, opened)) = &state.opened else {
        return Err(Refusal::unknown("deviation").into());
    };
    let shown = serde_json::json!({
        "deviation": opened,
        "cause": act.cause,
        "action": act.action,
        "conclusion": act.conclusion,
    });
    let binds = crate::ledger::canonical::digest(&shown)
        .map_err(|e| Refusal::meaningless("", e.to_string()))?
        .to_string();
    let mut subjects: Vec<Subject> = vec![act.deviation.into()];
    subjects.extend(opened.batch.map(Subject::from));
    let body = DeviationResolved {
        deviation: act.deviation,
        cause: act.cause.clone(),
        action: act.action.clone(),
        conclusion: act.conclusion.clone(),
        binds,
    };
    let draft = it.draft(act.resolved_at, subjects, body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

pub(super) fn amend(it: &mut Deciding<'_>, act: &Amend) -> Result<Decision, Stop> {
    let entry = it.desk.entry(act.target)?;
    let target = it.desk.entry_in_force(act.target)?;
    if !target.body.is_amendable() {
        return Err(Refusal::conflict(format!(
            "a {} entry stands as it is: founding, people, assessments, signatures, amendments and issued records are not amended",
            target.body.kind().0
        ))
        .into());
    }
    may_amend(it, &target)?;
    let (effect, subjects) = effect(it, &target, &act.effect)?;
    let breach = corrected_breach(it, &target, &act.effect, &effect)?;
    let all: BTreeSet<Subject> =
        entry.subjects().chain(target.subjects.iter().copied()).chain(subjects).collect();
    let body = EntryAmended {
        target: Target {
            id: entry.id,
            seq: entry.seq,
            kind: entry.kind.clone(),
            kv: entry.kv,
            actor: entry.actor,
            via: entry.via,
            command: entry.cause.command,
            recorded_at: entry.recorded_at,
        },
        effect,
        reason: act.reason.clone(),
    };
    let mut drafts = vec![it.draft(act.amended_at, all, body)];
    if let Some(body) = breach {
        drafts.push(breach_of(it, &body, act.target, "added, as a correction says")?);
    }
    Ok(Decision { drafts, ..Decision::default() })
}

/// The corrected addition, if it tells of a breach that the entry did not tell of.
fn corrected_breach(
    it: &Deciding<'_>,
    target: &InForce,
    to: &AmendTo,
    effect: &Effect,
) -> Result<Option<AdditionRecorded>, Stop> {
    let (AmendTo::Addition(act), Body::AdditionRecorded(old), Effect::Replace(replacement)) =
        (to, target.body.as_ref(), effect)
    else {
        return Ok(None);
    };
    let (kind, kv) = target.body.kind();
    let Ok(Body::AdditionRecorded(new)) = Body::read(kind, kv, &replacement.body) else {
        return Ok(None);
    };
    Ok(is_worse(it, act, old, &new)?.then_some(new))
}

/// Who answers for what the entry says: settings and rule sets are the admin's, whether a lot may be used and
/// what became of a deviation are quality's. Everything else: the author within the shift; otherwise a lead or quality.
fn may_amend(it: &Deciding<'_>, target: &InForce) -> Result<(), Stop> {
    match target.body.as_ref() {
        Body::SettingsChanged(_) | Body::RulesetAdopted(_) => {
            return Ok(it.needs(&[Role::Admin], "amend settings or rule sets")?);
        }
        Body::LotStatusChanged(_) | Body::DeviationOpened(_) | Body::DeviationResolved(_) => {
            return Ok(it.needs(&[Role::Quality], "amend a lot's status or a deviation")?);
        }
        _ => {}
    }
    let settings = settings_of(&it.desk.site()?.settings)?;
    let shift_ends = target.recorded_at.0 + span(&settings, Setting::ShiftHours);
    if target.actor == it.command.actor && it.now.0 <= shift_ends {
        return Ok(());
    }
    it.needs(
        &[Role::Lead, Role::Quality],
        "amend an entry of somebody else or of an earlier shift",
    )?;
    Ok(())
}

/// The effect as the entry says it, and the subjects that it newly concerns.
fn effect(
    it: &Deciding<'_>,
    target: &InForce,
    to: &AmendTo,
) -> Result<(Effect, Vec<Subject>), Stop> {
    let other_kind = || {
        Refusal::meaningless(
            "/effect",
            format!("the entry is a {}: give a replacement of that kind", target.body.kind().0),
        )
    };
    let (occurred_at, subjects, body): (Stamp, Vec<Subject>, Body) =
        match (to, target.body.as_ref()) {
            (AmendTo::Void, _) => {
                nothing_leans_on(it, target)?;
                return Ok((Effect::Void(VoidMark {}), Vec::new()));
            }
            (AmendTo::Opening(act), Body::BatchOpened(old)) => {
                let desk = it.desk.without(target);
                let body = opening(it, &desk, act, old)?;
                (act.opened_at, opening_subjects(&body), body.into())
            }
            (AmendTo::Value(index, value), Body::ReadingTaken(old)) => {
                return Ok((item(it, (target, old), *index, value)?, Vec::new()));
            }
            (AmendTo::Reading(act), Body::ReadingTaken(_)) => {
                let body = reading(it, &it.desk.without(target), act)?;
                (act.taken_at, vec![act.batch.into(), body.holding.into()], body.into())
            }
            (AmendTo::Addition(act), Body::AdditionRecorded(old)) => {
                let body = corrected(it, target, old, act)?;
                (act.done_at, subjects_of(act, &body), body.into())
            }
            (AmendTo::Receipt(act), Body::LotReceived(old)) => {
                if act.lot != old.lot {
                    return Err(
                        Refusal::meaningless("/lot", "the lot itself stays the same").into()
                    );
                }
                if act.status != old.status {
                    it.needs(&[Role::Quality], "change whether a lot may be used")?;
                }
                let body = receipt(it, act)?;
                (act.received_at, vec![act.lot.into(), body.holding.into()], body.into())
            }
            _ => return Err(other_kind().into()),
        };
    let replacement = Replacement {
        occurred_at,
        subjects: subjects.iter().map(|s| About { kind: s.kind, id: s.id }).collect(),
        kv: body.kind().1,
        body: body.write().map_err(|e| Refusal::meaningless("/effect", e.to_string()))?,
    };
    Ok((Effect::Replace(replacement), subjects))
}

/// A batch or a lot that something was done with cannot be undone: what is wrong about it is corrected.
fn nothing_leans_on(it: &Deciding<'_>, target: &InForce) -> Result<(), Stop> {
    let subject: Subject = match target.body.as_ref() {
        Body::BatchOpened(body) => body.batch.into(),
        Body::LotReceived(body) => body.lot.into(),
        _ => return Ok(()),
    };
    let others = it.desk.subject(subject)?.entries.iter();
    if others.filter(|other| !other.void && other.seq != target.seq).count() == 0 {
        return Ok(());
    }
    Err(Refusal::conflict(format!(
        "other entries lean on this {}: void those first, or correct what is wrong with it",
        subject.kind.name()
    ))
    .into())
}

/// One value of a reading; values that others were computed from are replaced with the whole reading.
fn item(
    it: &Deciding<'_>,
    (target, old): (&InForce, &crate::book::body::ReadingTaken),
    index: u32,
    value: &crate::book::body::Reading,
) -> Result<Effect, Stop> {
    let at = "/effect/value";
    let was =
        usize::try_from(index).ok().and_then(|index| old.values.get(index)).ok_or_else(|| {
            Refusal::meaningless(
                "/effect/index",
                format!("the reading has {} values, counted from 0", old.values.len()),
            )
        })?;
    if was.quantity != value.quantity {
        return Err(Refusal::meaningless(
            &format!("{at}/quantity"),
            format!(
                "value {index} is a {}: replace the whole reading to change that",
                was.quantity
            ),
        )
        .into());
    }
    if old.nitrogen.is_some() {
        return Err(Refusal::meaningless(
            at,
            "nitrogen was computed from this reading: replace the whole reading",
        )
        .into());
    }
    let desk = it.desk.without(target);
    let sampled =
        Sampled { batch: desk.batch(old.batch)?, at: target.occurred_at.at, beside: &old.values };
    let checked = checked(it, sampled, value, at)?;
    let value =
        serde_json::to_value(checked).map_err(|e| Refusal::meaningless(at, e.to_string()))?;
    let (_, kv) = Body::READING_TAKEN;
    Ok(Effect::Item(ItemChange { index, kv, value }))
}

pub(super) fn issue(it: &mut Deciding<'_>, act: &Issue) -> Result<Decision, Stop> {
    it.needs(&[Role::Lead, Role::Quality], "hand out a record")?;
    it.desk.batch(act.batch)?;
    let n = it.desk.subject(act.batch.into())?.n;
    if n != act.batch_n {
        return Err(Refusal::conflict(
            "something was recorded while the record was made: make it again",
        )
        .into());
    }
    let body = RecordIssued {
        batch: act.batch,
        batch_n: act.batch_n,
        log_size: act.log_size,
        pdf: act.pdf.clone(),
        json: act.json.clone(),
        entries: act.entries.clone(),
        to: act.to.clone(),
    };
    let draft = it.draft(act.issued_at, [act.batch.into()], body);
    Ok(Decision { drafts: vec![draft], blobs: act.documents.clone(), ..Decision::default() })
}
