//! Opening a batch.

use super::Deciding;
use super::additions::{draw_legs, free_code, shortfall_finding};
use super::lots::zone;
use crate::book::assessing::line_of;
use crate::book::body::additions::Shortfall;
use crate::book::body::{
    BatchOpened, DeviationOpened, Direction, ExpectedFinal, FermentableSugar, Leg, VesselDescribed,
};
use crate::book::command::{Decision, OpenBatch, Refusal, Stop, ingredient, not_ahead};
use crate::book::subject::{Subject, SubjectKind};
use crate::densimetry::{Scale, correct};
use crate::ids::{DeviationId, HoldingId};
use crate::nitrogen::Demand;
use crate::stamp::Stamp;

/// The classes the checks know, in the words of the law texts they come from.
pub const PRODUCT_CLASSES: &[&str] = &[
    "grape_wine",
    "fruit_wine",
    "mead",
    "cider",
    "perry",
    "beer",
    "wash",
    "fruit_mash",
    "marc",
    "wine_spirit_base",
];

pub(super) fn open(it: &mut Deciding<'_>, act: &OpenBatch) -> Result<Decision, Stop> {
    if it.desk.subject(act.batch.into())?.n > 0 {
        return Err(Refusal::conflict("this batch has been opened already").into());
    }
    not_ahead("/opened_at", act.opened_at, it.now)?;
    it.desk.code_is_free(SubjectKind::Batch, &act.code, act.batch.0)?;
    let vessel = it.desk.vessel(act.vessel)?;
    if let Some((_, vessel)) = &vessel.current {
        fits(act, vessel)?;
    }
    known_words(act)?;
    each_lot_once(act)?;
    let holding: HoldingId = it.id();
    let mut ingredients = Vec::new();
    let mut subjects = vec![act.batch.into(), act.vessel.into(), holding.into()];
    let mut legs = Vec::new();
    let mut shortfalls = Vec::new();
    for draw in &act.ingredients {
        let lot = it.desk.lot(draw.lot)?;
        let line = line_of(it.desk, lot, draw)?;
        ingredients.push(ingredient(draw, &line.lot_code, &line.material_name));
        draw_legs(lot, draw, holding, &mut legs, &mut shortfalls);
        subjects.push(draw.lot.into());
    }
    legs.push(Leg { holding, direction: Direction::In, amount: act.volume.clone() });
    subjects.extend(legs.iter().map(|leg| Subject::from(leg.holding)));
    let body = BatchOpened {
        batch: act.batch,
        code: act.code.clone(),
        name: act.name.clone(),
        product_class: act.product_class.clone(),
        premises: act.premises.clone(),
        destinations: act.destinations.clone(),
        claims: act.claims.clone(),
        vessel: act.vessel,
        holding,
        volume: act.volume.clone(),
        volume_basis: act.volume_basis.clone(),
        liquid: act.liquid.clone(),
        liquid_planned: act.liquid_planned.clone(),
        expected_final: act.expected_final.as_ref().map(expected_final).transpose()?,
        fermentable_sugar: act
            .fermentable_sugar
            .clone()
            .map(|(g_per_l, basis)| FermentableSugar { g_per_l, basis }),
        demand: act.demand.clone(),
        ingredients,
        shortfalls,
        legs,
    };
    let deviation = if body.shortfalls.is_empty() { None } else { Some(short_of(it, &body)?) };
    let mut drafts = vec![it.draft(act.opened_at, subjects, body)];
    if let Some((opened, subjects)) = deviation {
        let at = Stamp::in_zone(it.now, &zone(it)?);
        let opened = DeviationOpened { entry: Some(drafts[0].id), ..opened };
        drafts.push(it.draft(at, subjects, opened));
    }
    Ok(Decision { drafts, ..Decision::default() })
}

/// The deviation that a batch opens when it was filled with more than the book had.
fn short_of(
    it: &mut Deciding<'_>,
    body: &BatchOpened,
) -> Result<(DeviationOpened, [Subject; 3]), Stop> {
    let deviation: DeviationId = it.id();
    let code = free_code(it, &body.code, 1, deviation)?;
    let finding = |short: &Shortfall| {
        let line = body.ingredients.iter().find(|ingredient| ingredient.lot == short.lot);
        shortfall_finding(line.map_or("", |line| line.lot_code.as_str()), short)
    };
    let opened = DeviationOpened {
        deviation,
        code,
        title: format!("{} filled with more than the book had", body.code),
        batch: Some(body.batch),
        entry: None,
        findings: body.shortfalls.iter().map(finding).collect(),
    };
    Ok((opened, [body.batch.into(), body.holding.into(), deviation.into()]))
}

/// What is filled must be liquid at most as much as the whole, and must fit into the vessel on the batch's premises.
fn fits(act: &OpenBatch, vessel: &VesselDescribed) -> Result<(), Refusal> {
    if vessel.premises != act.premises {
        return Err(Refusal::meaningless(
            "/vessel",
            format!(
                "vessel {} stands on premises {}, not {}: the law that binds follows the premises",
                vessel.code, vessel.premises, act.premises
            ),
        ));
    }
    if act.volume.base() > vessel.capacity.base() {
        return Err(Refusal::meaningless(
            "/volume",
            format!("{} do not fit into {} of {}", act.volume, vessel.code, vessel.capacity),
        ));
    }
    if act.liquid.base() == 0 || act.liquid.base() > act.volume.base() {
        return Err(Refusal::meaningless(
            "/liquid",
            "the liquid must be more than nothing and at most the whole volume: every dose is judged on it",
        ));
    }
    Ok(())
}

fn known_words(act: &OpenBatch) -> Result<(), Refusal> {
    if !PRODUCT_CLASSES.contains(&act.product_class.as_str()) {
        return Err(Refusal::meaningless(
            "/product_class",
            format!("use one of {}", PRODUCT_CLASSES.join(", ")),
        ));
    }
    if Demand::parse(&act.demand).is_none() {
        return Err(Refusal::meaningless("/demand", "use low, medium or high"));
    }
    Ok(())
}

fn each_lot_once(act: &OpenBatch) -> Result<(), Refusal> {
    let mut lots: Vec<_> = act.ingredients.iter().map(|draw| draw.lot).collect();
    lots.sort();
    lots.dedup();
    if lots.len() == act.ingredients.len() {
        return Ok(());
    }
    Err(Refusal::meaningless("/ingredients", "name each lot once, with its whole amount"))
}

fn expected_final(
    (value, scale, basis): &(String, String, String),
) -> Result<ExpectedFinal, Refusal> {
    let pointer = "/expected_final";
    let wrong = |detail: String| Refusal::meaningless(pointer, detail);
    let read_on = Scale::parse(scale).map_err(|e| wrong(e.to_string()))?;
    let number = crate::units::Decimal::parse(value).map_err(|e| wrong(e.to_string()))?;
    let found = correct(number.to_f64(), read_on, 20.0).map_err(|e| wrong(e.to_string()))?;
    Ok(ExpectedFinal {
        value: value.clone(),
        scale: scale.clone(),
        extract: format!("{:.4}", found.apparent_extract),
        basis: basis.clone(),
    })
}
