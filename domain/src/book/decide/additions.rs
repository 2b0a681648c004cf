//! Proposals and additions.
//!
//! A proposal is always recorded, whatever the answer: proof that the warning was given. An addition that carries
//! out a proposal is held against it. An addition already made is always recorded; what is wrong with it opens one
//! deviation with all that was found.

use serde_json::json;

use super::Deciding;
use super::late;
use super::lots::{derived, zone};
use crate::book::assessing::{Prepared, Question, assess, settings_of};
use crate::book::body::additions::Shortfall;
use crate::book::body::{
    AdditionRecorded, DeviationOpened, Direction, Leg, Line, ProposalAssessed,
};
use crate::book::command::{Add, Decision, Draft, Draw, Propose, Refusal, Stop, not_ahead};
use crate::book::desk::Desk;
use crate::book::in_force::InForce;
use crate::book::state::{BatchState, LotState, ProposalState};
use crate::book::subject::{Subject, SubjectKind};
use crate::checks::{Assessment, Finding, Verdict};
use crate::ids::{DeviationId, EntryId, HoldingId};
use crate::ledger::entry::Actor;
use crate::settings::{Setting, Settings};
use crate::stamp::{Micros, Stamp};
use crate::units::{Decimal, Dimension, Quantity};

/// The most lots one addition draws from.
const MOST_LINES: usize = 40;

pub(super) fn propose(it: &mut Deciding<'_>, act: &Propose) -> Result<Decision, Stop> {
    enough_lines(&act.draws)?;
    let batch = it.desk.batch(act.batch)?;
    if batch.proposals.contains_key(&act.proposal) {
        return Err(Refusal::conflict("this proposal has been made already").into());
    }
    let settings = settings_of(&it.desk.site()?.settings)?;
    let earliest = it.now.plus_hours(-1);
    if act.planned_at.at < earliest {
        return Err(Refusal::meaningless(
            "/planned_at",
            "this lies more than an hour back: if it has been done, record it as an addition already done",
        )
        .into());
    }
    let question = Question {
        batch: act.batch,
        at: act.planned_at.at,
        draws: act.draws.clone(),
        carrier_water: act.carrier_water.clone(),
        preparation: act.preparation,
        already_done: false,
        actor: it.command.actor,
    };
    let prepared = match &act.prepared {
        Some(prepared) if prepared.stands_on(it.desk) => prepared.as_ref().clone(),
        _ => assess(it.desk, &question, it.now)?,
    };
    let Some((_, opened)) = &batch.opened else { return Err(Refusal::unknown("batch").into()) };
    let holding = opened.holding;
    let lapses_at = Stamp::new(
        Micros(act.planned_at.at.0 + span(&settings, Setting::ProposalLapseHours)),
        act.planned_at.offset_minutes,
    );
    let body = ProposalAssessed {
        proposal: act.proposal,
        batch: act.batch,
        holding,
        planned_at: act.planned_at,
        lapses_at,
        shown: shown(act, lapses_at, &prepared)?,
        lines: prepared.lines,
        carrier_water: act.carrier_water.clone(),
        preparation: act.preparation,
        purpose: act.purpose.clone(),
        assessment: prepared.assessment,
    };
    let mut subjects: Vec<Subject> = vec![act.batch.into(), holding.into()];
    subjects.extend(act.draws.iter().map(|draw| Subject::from(draw.lot)));
    let draft = it.draft(act.asked_at, subjects, body);
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

fn enough_lines(draws: &[Draw]) -> Result<(), Refusal> {
    if draws.is_empty() || draws.len() > MOST_LINES {
        return Err(Refusal::meaningless("/lines", format!("give 1 to {MOST_LINES} lots")));
    }
    if let Some(index) = draws.iter().position(|draw| draw.amount.base() == 0) {
        return Err(Refusal::meaningless(
            &format!("/lines/{index}/amount"),
            "an addition of nothing is none: give the amount",
        ));
    }
    let mut lots: Vec<_> = draws.iter().map(|draw| draw.lot).collect();
    lots.sort();
    lots.dedup();
    if lots.len() < draws.len() {
        return Err(Refusal::meaningless("/lines", "name each lot once, with its whole amount"));
    }
    Ok(())
}

/// SHA-256 over what a signer is shown: batch, proposal, lines, form, water, purpose, window, and all that was found.
fn shown(act: &Propose, lapses_at: Stamp, prepared: &Prepared) -> Result<String, Stop> {
    let lines: Vec<_> = prepared
        .lines
        .iter()
        .map(|line| {
            json!({"lot": line.lot_code, "material": line.material_name, "amount": line.amount})
        })
        .collect();
    let mut value = json!({
        "batch": act.batch,
        "proposal": act.proposal,
        "planned_at": act.planned_at,
        "lapses_at": lapses_at,
        "lines": lines,
        "preparation": act.preparation,
        "found": prepared.assessment.findings,
        "verdict": prepared.assessment.verdict,
    });
    if let Some(water) = &act.carrier_water {
        value["carrier_water"] = json!(water);
    }
    if let Some(purpose) = &act.purpose {
        value["purpose"] = json!(purpose);
    }
    crate::ledger::canonical::digest(&value)
        .map(|digest| digest.to_string())
        .map_err(|e| Refusal::meaningless("", e.to_string()).into())
}

pub(super) fn add(it: &mut Deciding<'_>, act: &Add) -> Result<Decision, Stop> {
    let body = addition(it, act)?;
    let opens = body.already_done.is_some() && body.assessment.verdict >= Verdict::Refer
        || !body.shortfalls.is_empty();
    let deviation = opens.then(|| body.clone());
    let mut addition = it.draft(act.done_at, subjects_of(act, &body), body);
    addition.captured_at = act.captured_at;
    let mut drafts = vec![addition];
    if let Some(body) = deviation {
        let entry = drafts[0].id;
        drafts.push(breach(it, &body, entry, "added before it was asked for")?);
    }
    Ok(Decision { drafts, ..Decision::default() })
}

/// What an addition is about.
pub(super) fn subjects_of(act: &Add, body: &AdditionRecorded) -> Vec<Subject> {
    let mut subjects: Vec<Subject> = vec![act.batch.into(), body.holding.into()];
    subjects.extend(act.draws.iter().map(|draw| Subject::from(draw.lot)));
    subjects.extend(body.legs.iter().map(|leg| Subject::from(leg.holding)));
    subjects
}

/// The addition as an entry says it.
fn addition(it: &Deciding<'_>, act: &Add) -> Result<AdditionRecorded, Stop> {
    let batch = it.desk.batch(act.batch)?;
    let asking =
        Asking { actor: it.command.actor, happened: act.already_done.is_some(), now: it.now };
    let (found, settings) = judged(it.desk, act, &asking)?;
    match (act.proposal, &act.already_done) {
        (Some(proposal), None) => {
            let Some(proposal) = batch.proposals.get(&proposal) else {
                return Err(Refusal::unknown("proposal").into());
            };
            held_against(act, proposal, &found.assessment, &settings)?;
        }
        (None, Some(_)) => {}
        _ => {
            return Err(Refusal::meaningless(
                "/proposal",
                "name the proposal that this carries out, or say already_done with a reason",
            )
            .into());
        }
    }
    let body = recorded(it.desk, act, &asking, found, &settings)?;
    if act.proposal.is_some() && !body.shortfalls.is_empty() {
        return Err(Refusal::conflict(
            "the book has less of a lot than this takes: if it has been done all the same, record it as already done",
        )
        .into());
    }
    Ok(body)
}

/// The addition that an amendment puts in the place of another: it has happened, so nothing stands against it, and it
/// is judged as of its own time on the book without the one it replaces.
pub(super) fn corrected(
    it: &Deciding<'_>,
    target: &InForce,
    old: &AdditionRecorded,
    act: &Add,
) -> Result<AdditionRecorded, Stop> {
    let desk = it.desk.without(target);
    // A correction is nobody's own: no proposal of the person who corrects was refused shortly before it.
    let asking = Asking { actor: Actor::System, happened: true, now: it.now };
    let (found, settings) = judged(&desk, act, &asking)?;
    let body = recorded(&desk, act, &asking, found, &settings)?;
    Ok(AdditionRecorded {
        proposal: old.proposal,
        already_done: old.already_done.clone(),
        late: old.late.clone(),
        ..body
    })
}

/// Whether a correction tells of a breach that the entry did not tell of: a graver answer, more than the lots held, or
/// another amount than the proposal that it carried out.
pub(super) fn is_worse(
    it: &Deciding<'_>,
    act: &Add,
    old: &AdditionRecorded,
    new: &AdditionRecorded,
) -> Result<bool, Stop> {
    let batch = it.desk.batch(old.batch)?;
    let settings = settings_of(&it.desk.site()?.settings)?;
    let proposed = old.proposal.and_then(|id| batch.proposals.get(&id)?.body());
    let strays = proposed.is_some_and(|body| same_amounts(act, &body.lines, &settings).is_err());
    let verdict = new.assessment.verdict;
    Ok(verdict >= Verdict::Refer && (verdict > old.assessment.verdict || strays)
        || !new.shortfalls.is_empty() && new.shortfalls != old.shortfalls)
}

/// Who asks about an addition, when, and whether it has happened.
struct Asking {
    actor: Actor,
    happened: bool,
    now: Micros,
}

fn judged(desk: &Desk, act: &Add, asking: &Asking) -> Result<(Prepared, Settings), Stop> {
    enough_lines(&act.draws)?;
    not_ahead("/done_at", act.done_at, asking.now)?;
    let settings = settings_of(&desk.site()?.settings)?;
    let question = Question {
        batch: act.batch,
        at: act.done_at.at,
        draws: act.draws.clone(),
        carrier_water: act.carrier_water.clone(),
        preparation: act.preparation,
        already_done: asking.happened,
        actor: asking.actor,
    };
    Ok((assess(desk, &question, asking.now)?, settings))
}

fn recorded(
    desk: &Desk,
    act: &Add,
    asking: &Asking,
    mut found: Prepared,
    settings: &Settings,
) -> Result<AdditionRecorded, Stop> {
    let Some((_, opened)) = &desk.batch(act.batch)?.opened else {
        return Err(Refusal::unknown("batch").into());
    };
    let holding = opened.holding;
    let mut legs = Vec::new();
    let mut shortfalls = Vec::new();
    for draw in &act.draws {
        draw_legs(desk.lot(draw.lot)?, draw, holding, &mut legs, &mut shortfalls);
    }
    for shortfall in &shortfalls {
        let line = found.lines.iter().find(|line| line.lot == shortfall.lot);
        let code = line.map_or("", |line| line.lot_code.as_str());
        found.assessment.findings.push(shortfall_finding(code, shortfall));
        found.assessment.verdict = found.assessment.verdict.max(Verdict::Refer);
    }
    let late = late(settings, act.done_at, act.captured_at, asking.now, act.already_done.as_ref());
    Ok(AdditionRecorded {
        batch: act.batch,
        holding,
        proposal: act.proposal,
        lines: found.lines,
        carrier_water: act.carrier_water.clone(),
        preparation: act.preparation,
        already_done: act.already_done.clone(),
        late,
        assessment: found.assessment,
        shortfalls,
        legs,
    })
}

/// Takes an amount out of a lot's stock into a holding; what the stock does not cover comes out of the unexplained.
pub(super) fn draw_legs(
    lot: &LotState,
    draw: &Draw,
    into: HoldingId,
    legs: &mut Vec<Leg>,
    shortfalls: &mut Vec<Shortfall>,
) {
    let Some((_, received)) = &lot.received else { return };
    let dimension = draw.amount.dimension().unwrap_or(Dimension::Mass);
    let covered = lot.remaining_base().clamp(0, draw.amount.base());
    let missing = draw.amount.base() - covered;
    if missing == 0 {
        legs.push(Leg {
            holding: received.holding,
            direction: Direction::Out,
            amount: draw.amount.clone(),
        });
    } else {
        let unexplained = derived(draw.lot, "unexplained");
        let amount = Quantity::computed(missing, dimension);
        if covered > 0 {
            legs.push(Leg {
                holding: received.holding,
                direction: Direction::Out,
                amount: Quantity::computed(covered, dimension),
            });
        }
        legs.push(Leg { holding: unexplained, direction: Direction::Out, amount: amount.clone() });
        shortfalls.push(Shortfall { lot: draw.lot, unexplained, amount });
    }
    legs.push(Leg { holding: into, direction: Direction::In, amount: draw.amount.clone() });
}

pub(super) fn shortfall_finding(code: &str, shortfall: &Shortfall) -> Finding {
    let missing = shortfall.amount.to_string();
    Finding::new(
        "stock.shortfall",
        Verdict::Refer,
        crate::checks::Basis::SiteSetting,
        format!("The book has {missing} less of lot {code} than was used."),
    )
    .param("lot", code)
    .param("missing", shortfall.amount.entered())
    .cured_by("Count the lot, or record the receipt that is missing.")
}

/// Whether what was done is what was proposed, signed where it had to be, in time, and not worse than it looked.
fn held_against(
    act: &Add,
    proposal: &ProposalState,
    now_found: &Assessment,
    settings: &Settings,
) -> Result<(), Stop> {
    let Some(proposed) = proposal.body() else { return Err(Refusal::unknown("proposal").into()) };
    let instead = "propose again, or record it as already done if it has happened";
    if proposal.done_by.is_some() {
        return Err(Refusal::conflict("this proposal has been carried out already").into());
    }
    let asked_at = proposal.entry.occurred_at;
    if is_before(act.done_at, asked_at) {
        return Err(Refusal::conflict(format!(
            "this was done before it was proposed at {asked_at}: record it as already done"
        ))
        .into());
    }
    if act.done_at.at > proposed.lapses_at.at {
        return Err(Refusal::conflict(format!(
            "this proposal lapsed at {}: {instead}",
            proposed.lapses_at
        ))
        .into());
    }
    same_amounts(act, &proposed.lines, settings)?;
    same_way(act, proposed, settings)?;
    let verdict = proposed.assessment.verdict;
    if verdict == Verdict::Refuse {
        return Err(Refusal::conflict(format!("this proposal was refused: {instead}")).into());
    }
    let is_signed = proposal.signoffs.iter().any(|(signed_at, _, signoff)| {
        signoff.binds == proposed.shown
            && signoff.meaning == APPROVED
            && !is_before(act.done_at, *signed_at)
            && signoff.valid_until.is_none_or(|until| act.done_at.at <= until.at)
    });
    if verdict == Verdict::Refer && !is_signed {
        return Err(Refusal::conflict(
            "this proposal needs a second person's signature that approves the exception; it is missing, has run out or came after the fact",
        )
        .into());
    }
    if now_found.verdict > verdict {
        return Err(Refusal::conflict(format!(
            "the answer is {} now, and was {} when it was shown: {instead}",
            now_found.verdict.name(),
            verdict.name()
        ))
        .into());
    }
    let unsigned = now_found.findings.iter().find(|finding| {
        finding.verdict >= Verdict::Refer
            && !proposed.assessment.findings.iter().any(|shown| covers(shown, finding))
    });
    if let Some(finding) = unsigned {
        return Err(Refusal::conflict(format!(
            "something new was found that nobody signed: {} ({instead})",
            finding.sentence
        ))
        .into());
    }
    Ok(())
}

/// What a signature must mean to let an exception pass.
const APPROVED: &str = "approved the exception";

/// Whether what was shown covers what is found now: the same rule about the same lot, and not less grave.
fn covers(shown: &Finding, found: &Finding) -> bool {
    shown.rule == found.rule
        && shown.params.get("lot") == found.params.get("lot")
        && shown.verdict >= found.verdict
}

/// The same form, and no more water than was proposed.
fn same_way(act: &Add, proposed: &ProposalAssessed, settings: &Settings) -> Result<(), Refusal> {
    if act.preparation != proposed.preparation {
        return Err(Refusal::conflict("another form was proposed: propose it as it is done"));
    }
    let water = |quantity: &Option<Quantity>| quantity.as_ref().map_or(0, Quantity::base);
    let wanted = water(&proposed.carrier_water);
    if water(&act.carrier_water) > wanted + tolerated(wanted, settings) {
        return Err(Refusal::conflict("more water than proposed carries it in: propose it anew"));
    }
    Ok(())
}

/// How far an amount may be from the proposed one.
fn tolerated(base: i64, settings: &Settings) -> i64 {
    Decimal::parse(settings.text(Setting::AmountTolerancePercent))
        .ok()
        .and_then(|percent| percent.scaled_by(base, 100))
        .unwrap_or(0)
}

/// Whether it happened in an earlier minute: people write down minutes, the clock knows more.
const fn is_before(happened: Stamp, stamp: Stamp) -> bool {
    happened.at.plus_minutes(1).0 <= stamp.at.0
}

fn same_amounts(act: &Add, proposed: &[Line], settings: &Settings) -> Result<(), Refusal> {
    if act.draws.len() != proposed.len() {
        return Err(Refusal::conflict("other lots were proposed: propose again"));
    }
    let percent = settings.text(Setting::AmountTolerancePercent);
    for line in proposed {
        let Some(done) = act.draws.iter().find(|draw| draw.lot == line.lot) else {
            return Err(Refusal::conflict(format!(
                "lot {} was proposed, but another was used: propose again",
                line.lot_code
            )));
        };
        let tolerance = tolerated(line.amount.base(), settings);
        if (done.amount.base() - line.amount.base()).abs() > tolerance {
            return Err(Refusal::conflict(format!(
                "{} of lot {} were proposed, {} are more than {percent} % away from it: propose the amount anew",
                line.amount, line.lot_code, done.amount
            )));
        }
    }
    Ok(())
}

/// The deviation that an addition opens, with everything that was found above information.
pub(super) fn breach(
    it: &mut Deciding<'_>,
    body: &AdditionRecorded,
    entry: EntryId,
    how: &str,
) -> Result<Draft, Stop> {
    let batch: &BatchState = it.desk.batch(body.batch)?;
    let Some((_, opened)) = &batch.opened else { return Err(Refusal::unknown("batch").into()) };
    let (code, first) = (opened.code.clone(), batch.deviations.len() + 1);
    let deviation: DeviationId = it.id();
    let code = free_code(it, &code, first, deviation)?;
    let what: Vec<_> =
        body.lines.iter().map(|line| format!("{} {}", line.amount, line.material_name)).collect();
    let findings = body
        .assessment
        .findings
        .iter()
        .filter(|finding| finding.verdict > Verdict::Clear)
        .cloned()
        .collect();
    let opened = DeviationOpened {
        deviation,
        code,
        title: format!("{} {how}", what.join(", ")),
        batch: Some(body.batch),
        entry: Some(entry),
        findings,
    };
    let at = Stamp::in_zone(it.now, &zone(it)?);
    let subjects = [body.batch.into(), body.holding.into(), deviation.into()];
    Ok(it.draft(at, subjects, opened))
}

/// The first free code of a batch's deviations from this number on: what has happened is recorded, whoever has used
/// such a code before.
pub(super) fn free_code(
    it: &Deciding<'_>,
    batch_code: &str,
    first: usize,
    deviation: DeviationId,
) -> Result<String, Stop> {
    let mut number = first;
    loop {
        let code = format!("{batch_code}-D{number}");
        match it.desk.code_is_free(SubjectKind::Deviation, &code, deviation.0) {
            Ok(()) => return Ok(code),
            Err(Stop::Refused(_)) => number += 1,
            Err(need) => return Err(need),
        }
    }
}

/// A setting in hours, as microseconds.
pub(super) fn span(settings: &Settings, setting: Setting) -> i64 {
    Decimal::parse(settings.text(setting))
        .ok()
        .and_then(|hours| hours.scaled_by(3_600_000_000, 1))
        .unwrap_or(0)
}
