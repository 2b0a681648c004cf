//! From the book to the question the checks answer: the batch as it stood at a moment, and what is to go in.

use std::collections::BTreeMap;
use std::sync::Arc;

use super::body::{self, AdditionRecorded, BatchOpened, Component, Line};
use super::command::{Draw, Refusal, Stop};
use super::desk::Desk;
use super::in_force::InForce;
use super::state::batch::has_dropped;
use super::state::{BatchState, LotState, State};
use super::subject::Subject;
use crate::checks::{
    self, Assessment, Category, Done, Fraction, LotStatus, Proposed, ProposedLine, Situation, Yan,
};
use crate::densimetry::balling::{ApparentExtract, OriginalExtract};
use crate::forecast::{FinalExtract, Reading, SugarSpan, forecast};
use crate::ids::BatchId;
use crate::ledger::entry::Actor;
use crate::nitrogen::{Brix, Demand, SugarGramsPerLitre};
use crate::settings::{Setting, Settings};
use crate::stamp::Micros;
use crate::units::{Decimal, Dimension, Quantity};

/// What is to go in, and when.
#[derive(Clone, Debug)]
pub struct Question {
    /// Into which batch.
    pub batch: BatchId,
    /// When.
    pub at: Micros,
    /// What.
    pub draws: Vec<Draw>,
    /// Water that carries it in.
    pub carrier_water: Option<Quantity>,
    /// In which form.
    pub preparation: body::Preparation,
    /// It has happened.
    pub already_done: bool,
    /// Who asks.
    pub actor: Actor,
}

impl Question {
    /// Nothing is to go in: how does the batch stand?
    pub const fn nothing(batch: BatchId, at: Micros, actor: Actor) -> Self {
        Self {
            batch,
            at,
            draws: Vec::new(),
            carrier_water: None,
            preparation: body::Preparation::AsDelivered,
            already_done: false,
            actor,
        }
    }
}

/// An answer found on a snapshot, with the running numbers it was found on.
#[derive(Clone, Debug)]
pub struct Prepared {
    /// What it was assessed on.
    pub basis: Vec<(Subject, u64)>,
    /// What was proposed, with the lots' facts.
    pub lines: Vec<Line>,
    /// The answer.
    pub assessment: Assessment,
}

impl Prepared {
    /// Whether nothing it leans on has moved since.
    pub fn stands_on(&self, desk: &Desk) -> bool {
        self.basis.iter().all(|(subject, n)| desk.cached_n(subject) == Some(*n))
    }
}

/// Answers a question on what lies on the desk.
///
/// # Errors
/// [`Stop`].
pub fn assess(desk: &Desk, question: &Question, now: Micros) -> Result<Prepared, Stop> {
    let site = desk.site()?;
    let settings = settings_of(&site.settings)?;
    let batch_subject = Subject::from(question.batch);
    let past;
    let mut batch = desk.batch(question.batch)?;
    if question.already_done {
        past = batch_as_of(desk, question.batch, question.at)?;
        // Done before the stated opening: a true event all the same, judged on what is known of the batch now.
        if past.opened.is_some() {
            batch = &past;
        }
    }
    let Some((_, opened)) = &batch.opened else { return Err(Refusal::unknown("batch").into()) };
    let mut basis = vec![(desk.site_id().into(), desk.subject(desk.site_id().into())?.n)];
    basis.push((batch_subject, desk.subject(batch_subject)?.n));
    let mut lines = Vec::new();
    let mut proposed_lines = Vec::new();
    for draw in &question.draws {
        let lot_subject = Subject::from(draw.lot);
        let lot = lot_as_of(desk, draw, question)?;
        let line = line_of(desk, &lot, draw)?;
        basis.push((lot_subject, desk.subject(lot_subject)?.n));
        basis.push((line.material.into(), desk.subject(line.material.into())?.n));
        proposed_lines.push(proposed_line(&lot, &line));
        lines.push(line);
    }
    let sets = desk.adopted(question.at)?;
    let premises_kind = premises_kind(site, opened)?;
    let situation = Situation {
        settings: &settings,
        sets: &sets,
        premises_kind,
        ..situation(batch, opened, question.at, now, &settings)?
    };
    let proposed = Proposed {
        planned_at: question.at,
        lines: proposed_lines,
        carrier_water_ul: question.carrier_water.as_ref().map_or(0, Quantity::base),
        preparation: preparation(question.preparation),
        already_done: question.already_done,
        recent_refusal: question.already_done
            && was_just_refused(desk.batch(question.batch)?, question, now, &settings),
    };
    let assessment = checks::assess(&situation, &proposed);
    Ok(Prepared { basis, lines, assessment })
}

/// The batch with only what had happened by then: an addition already made is judged as of its own time.
fn batch_as_of(desk: &Desk, batch: BatchId, at: Micros) -> Result<BatchState, Stop> {
    let subject = Subject::from(batch);
    let loaded = desk.subject(subject)?;
    let until = loaded.entries.iter().take_while(|entry| entry.occurred_at.at <= at);
    match State::fold(subject, until) {
        State::Batch(state) => Ok(*state),
        _ => Err(Refusal::unknown("batch").into()),
    }
}

fn lot_as_of(desk: &Desk, draw: &Draw, question: &Question) -> Result<LotState, Stop> {
    let current = desk.lot(draw.lot)?;
    if !question.already_done {
        return Ok(current.clone());
    }
    let subject = Subject::from(draw.lot);
    let until =
        desk.subject(subject)?.entries.iter().take_while(|e| e.occurred_at.at <= question.at);
    match State::fold(subject, until) {
        State::Lot(state) if state.received.is_some() => Ok(*state),
        // Used before its receipt was recorded: the facts are those of the receipt, the stock was nothing.
        _ => Ok(current.clone()),
    }
}

/// What a lot is, at the moment it is drawn from.
///
/// # Errors
/// [`Stop`].
pub(crate) fn line_of(desk: &Desk, lot: &LotState, draw: &Draw) -> Result<Line, Stop> {
    let Some((_, received)) = &lot.received else { return Err(Refusal::unknown("lot").into()) };
    let material = desk.material(received.material)?;
    let Some((_, material)) = &material.current else {
        return Err(Refusal::unknown("material").into());
    };
    let dimension = draw.amount.dimension().map_or("", Dimension::name);
    if dimension != material.dimension {
        return Err(Refusal::meaningless(
            "/lines",
            format!(
                "lot {} is counted by {}, but the amount {} is a {dimension}: give it in a unit of {}",
                received.code, material.dimension, draw.amount, material.dimension
            ),
        )
        .into());
    }
    let composition =
        if received.composition.is_empty() { &material.composition } else { &received.composition };
    Ok(Line {
        lot: draw.lot,
        lot_code: received.code.clone(),
        material: received.material,
        material_name: material.name.clone(),
        category: material.category.clone(),
        listed_as: material.listed_as.clone(),
        composition: composition.clone(),
        amount: draw.amount.clone(),
    })
}

fn proposed_line(lot: &LotState, line: &Line) -> ProposedLine {
    ProposedLine {
        line: checks_line(line),
        lot_status: match lot.status {
            body::LotStatus::Held => LotStatus::Held,
            body::LotStatus::Rejected => LotStatus::Rejected,
            body::LotStatus::Released => LotStatus::Released,
        },
        hold_reason: lot.status_reason.clone(),
        expires_at: lot.expires_at(),
        remaining_base: lot.remaining_base(),
    }
}

/// A line as the checks take it.
pub fn checks_line(line: &Line) -> checks::Line {
    checks::Line {
        lot_code: line.lot_code.clone(),
        material_name: line.material_name.clone(),
        category: Category::of(&line.category).unwrap_or(Category::Other),
        composition: parts(&line.composition),
        listed_as: line.listed_as.clone(),
        amount: line.amount.clone(),
    }
}

fn parts(composition: &[Component]) -> BTreeMap<String, i64> {
    composition.iter().map(|part| (part.substance.clone(), part.fraction.base())).collect()
}

const fn preparation(preparation: body::Preparation) -> checks::Preparation {
    match preparation {
        body::Preparation::AsDelivered => checks::Preparation::AsDelivered,
        body::Preparation::Powder => checks::Preparation::Powder,
        body::Preparation::Slurry => checks::Preparation::Slurry,
        body::Preparation::Solution => checks::Preparation::Solution,
    }
}

/// The site's settings over the defaults.
///
/// # Errors
/// [`Stop`] if the log holds a setting this program does not know.
pub(crate) fn settings_of(named: &BTreeMap<String, String>) -> Result<Settings, Stop> {
    Settings::with(named).map_err(|e| Refusal::meaningless("/settings", e.to_string()).into())
}

fn premises_kind(site: &super::state::SiteState, opened: &BatchOpened) -> Result<String, Stop> {
    site.founded
        .iter()
        .flat_map(|founded| &founded.premises)
        .find(|premises| premises.code == opened.premises)
        .map(|premises| premises.kind.clone())
        .ok_or_else(|| Refusal::unknown("premises").into())
}

/// What the checks have to know about a batch at a moment.
fn situation<'a>(
    batch: &BatchState,
    opened: &BatchOpened,
    at: Micros,
    now: Micros,
    settings: &'a Settings,
) -> Result<Situation<'a>, Stop> {
    let demand = Demand::parse(&opened.demand).ok_or_else(|| Refusal::unknown("demand"))?;
    let original = batch.original();
    let sugar = sugar(batch, opened);
    let gravity_known = batch.gravities.last();
    let fraction = fraction(batch, opened, at);
    let dropped = match (original, gravity_known) {
        (Some(first), Some(last)) => has_dropped(first.extract, last.extract),
        _ => false,
    };
    Ok(Situation {
        settings,
        sets: &[],
        premises_kind: String::new(),
        product_class: opened.product_class.clone(),
        destinations: opened.destinations.clone(),
        liquid_present_ul: opened.liquid.base(),
        liquid_planned_ul: opened.liquid_planned.as_ref().map(Quantity::base),
        sugar_g_l: sugar.g_per_l,
        sugar_basis: sugar.basis,
        other_sugar: sugar.other,
        original_brix: original.map(|gravity| gravity.extract),
        demand_mg_g: demand.factor(),
        yan: batch.nitrogen.last().map(|found| Yan {
            sampled_at: found.sampled_at,
            ammonium_n_mg_l: found.ammonium,
            amino_n_mg_l: found.amino,
        }),
        last_ingredient_at: batch.last_ingredient_at,
        pitched_at: batch.pitched_at,
        last_gravity_at: gravity_known.map(|gravity| gravity.at),
        additions: batch.additions().map(|(entry, body)| done(entry, body)).collect(),
        fraction,
        active: dropped || batch.pitched_at.is_some_and(|pitched| pitched < at),
        now,
    })
}

fn done(entry: &Arc<InForce>, body: &AdditionRecorded) -> Done {
    Done {
        at: entry.occurred_at.at,
        lines: body.lines.iter().map(checks_line).collect(),
        carrier_water_ul: body.carrier_water.as_ref().map_or(0, Quantity::base),
    }
}

struct Sugar {
    g_per_l: f64,
    basis: String,
    other: Option<(f64, String)>,
}

/// The sugar that need is judged on: what was stated as fermentable, else what the first gravity says; the laboratory's
/// figure is shown beside it.
fn sugar(batch: &BatchState, opened: &BatchOpened) -> Sugar {
    let by_gravity = batch
        .original()
        .and_then(|first| SugarGramsPerLitre::of_brix(Brix(first.extract), first.sg).ok())
        .map(SugarGramsPerLitre::get);
    let gravity_basis = || "first gravity: 10 Brix × SG / 0.9982".to_owned();
    let stated = opened
        .fermentable_sugar
        .as_ref()
        .and_then(|stated| Some((stated.g_per_l.parse::<f64>().ok()?, stated.basis.clone())));
    let laboratory = batch.sugar.first().map(|found| (found.g_per_l, "laboratory".to_owned()));
    match (stated, by_gravity) {
        (Some((g_per_l, basis)), by_gravity) => Sugar {
            g_per_l,
            basis,
            other: by_gravity.map(|found| (found, gravity_basis())).or(laboratory),
        },
        (None, Some(g_per_l)) => Sugar { g_per_l, basis: gravity_basis(), other: laboratory },
        (None, None) => match laboratory {
            Some((g_per_l, basis)) => Sugar { g_per_l, basis, other: None },
            None => Sugar {
                g_per_l: 0.0,
                basis: "not known yet: take a gravity".to_owned(),
                other: None,
            },
        },
    }
}

/// How much of the fermentable sugar will be gone at that time.
pub(crate) fn fraction(batch: &BatchState, opened: &BatchOpened, at: Micros) -> Option<Fraction> {
    let original = batch.original()?;
    let end: f64 = opened.expected_final.as_ref()?.apparent_extract_percent.parse().ok()?;
    let span = SugarSpan::new(OriginalExtract(original.extract), FinalExtract(end)).ok()?;
    let readings: Vec<Reading> = batch
        .gravities
        .iter()
        .map(|gravity| Reading {
            at_h: gravity.at.hours_since(original.at),
            extract: ApparentExtract(gravity.extract),
        })
        .collect();
    let found = forecast(span, &readings, at.hours_since(original.at))?;
    Some(Fraction {
        low: found.low,
        mid: found.mid,
        high: found.high,
        p_third: found.probability_more_than(1.0 / 3.0),
        p_half: found.probability_more_than(0.5),
        out_of_range_note: None,
    })
}

/// Whether the same person was told `refer` or `refuse` on this batch shortly before doing it all the same.
fn was_just_refused(
    batch: &BatchState,
    question: &Question,
    now: Micros,
    settings: &Settings,
) -> bool {
    let minutes = Decimal::parse(settings.text(Setting::OwnRefusalMinutes))
        .ok()
        .and_then(|minutes| minutes.scaled_by(1, 1))
        .unwrap_or(0);
    let since = now.plus_minutes(-minutes);
    batch.proposals.values().any(|proposal| {
        let answer = proposal.body().map(|body| body.assessment.verdict);
        proposal.entry.actor == question.actor
            && proposal.entry.recorded_at >= since
            && matches!(answer, Some(checks::Verdict::Refer | checks::Verdict::Refuse))
            && proposal.done_by.is_none()
    })
}
