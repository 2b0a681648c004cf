//! Opening a batch.

use super::additions::{draw_legs, free_code, shortfall_finding};
use super::lots::zone;
use super::{Deciding, ENGINE};
use crate::book::assessing::line_of;
use crate::book::body::LotStatus;
use crate::book::body::{
    BatchOpened, DeviationOpened, Direction, ExpectedFinal, FermentableSugar, Leg, VesselDescribed,
};
use crate::book::command::{Decision, OpenBatch, Refusal, Stop, ingredient, not_ahead};
use crate::book::desk::Desk;
use crate::book::subject::{Subject, SubjectKind};
use crate::checks::{Basis, Finding, Verdict};
use crate::densimetry::{Scale, at_calibration};
use crate::ids::{BatchId, DeviationId, HoldingId, LotId};
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
    it.desk.code_is_free(SubjectKind::Batch, &act.code, act.batch.0)?;
    let holding: HoldingId = it.id();
    let body = filled(it, it.desk, act, act.batch, holding)?;
    let found = found_at_opening(it, &body)?;
    let subjects = opening_subjects(&body);
    let deviation = if found.is_empty() { None } else { Some(deviation_of(it, &body, found)?) };
    let mut drafts = vec![it.draft(act.opened_at, subjects, body)];
    if let Some((opened, subjects)) = deviation {
        let at = Stamp::in_zone(it.now, &zone(it)?);
        let opened = DeviationOpened { entry: Some(drafts[0].id), ..opened };
        drafts.push(it.draft(at, subjects, opened));
    }
    Ok(Decision { drafts, ..Decision::default() })
}

/// The opening as an amendment puts it in place of the old: the batch and its holding stay.
pub(super) fn opening(
    it: &Deciding<'_>,
    desk: &Desk,
    act: &OpenBatch,
    old: &BatchOpened,
) -> Result<BatchOpened, Stop> {
    it.desk.code_is_free(SubjectKind::Batch, &act.code, old.batch.0)?;
    let body = filled(it, desk, act, old.batch, old.holding)?;
    Ok(BatchOpened { late: old.late.clone(), ..body })
}

/// What an opening is about.
pub(super) fn opening_subjects(body: &BatchOpened) -> Vec<Subject> {
    let mut subjects = vec![body.batch.into(), body.vessel.into(), body.holding.into()];
    subjects.extend(body.ingredients.iter().map(|ingredient| Subject::from(ingredient.lot)));
    subjects.extend(body.legs.iter().map(|leg| Subject::from(leg.holding)));
    subjects
}

fn filled(
    it: &Deciding<'_>,
    desk: &Desk,
    act: &OpenBatch,
    batch: BatchId,
    holding: HoldingId,
) -> Result<BatchOpened, Stop> {
    not_ahead("/opened_at", act.opened_at, it.now)?;
    let vessel = desk.vessel(act.vessel)?;
    if let Some((_, vessel)) = &vessel.current {
        is_told_right(act, vessel)?;
    }
    known_words(act)?;
    each_lot_once(act)?;
    let mut ingredients = Vec::new();
    let mut legs = Vec::new();
    let mut shortfalls = Vec::new();
    for draw in &act.ingredients {
        let lot = desk.lot(draw.lot)?;
        let line = line_of(desk, lot, draw)?;
        ingredients.push(ingredient(draw, &line.lot_code, &line.material_name));
        draw_legs(lot, draw, holding, &mut legs, &mut shortfalls);
    }
    legs.push(Leg { holding, direction: Direction::In, amount: act.volume.clone() });
    Ok(BatchOpened {
        batch,
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
        late: it.late(act.opened_at, None, None)?,
        legs,
    })
}

/// What was wrong with a fill that has happened: more than the book had, more than the vessel holds, a lot that must
/// not be used.
fn found_at_opening(it: &Deciding<'_>, body: &BatchOpened) -> Result<Vec<Finding>, Stop> {
    let code_of = |lot: LotId| {
        let line = body.ingredients.iter().find(|ingredient| ingredient.lot == lot);
        line.map_or("", |line| line.lot_code.as_str())
    };
    let mut found: Vec<Finding> =
        body.shortfalls.iter().map(|short| shortfall_finding(code_of(short.lot), short)).collect();
    if let Some((_, vessel)) = &it.desk.vessel(body.vessel)?.current
        && body.volume.base() > vessel.capacity.base()
    {
        let sentence = format!(
            "{} were filled into {}, which holds {}.",
            body.volume, vessel.code, vessel.capacity
        );
        found.push(
            Finding::new("vessel.over-capacity", Verdict::Refer, Basis::SiteSetting, sentence)
                .param("vessel", vessel.code.as_str())
                .cured_by("Measure the volume again, or mend the vessel's capacity in the book."),
        );
    }
    for ingredient in &body.ingredients {
        let lot = it.desk.lot(ingredient.lot)?;
        if lot.status != LotStatus::Released || lot.is_expired(it.now) {
            let how = if lot.status == LotStatus::Released { "expired" } else { lot.status.name() };
            let sentence = format!("Lot {} was used although it is {how}.", ingredient.lot_code);
            found.push(
                Finding::new("lot.status", Verdict::Refer, Basis::SiteSetting, sentence)
                    .param("lot", ingredient.lot_code.as_str())
                    .cured_by("Have quality decide what becomes of the batch."),
            );
        }
    }
    Ok(found)
}

/// The deviation that a fill opens.
fn deviation_of(
    it: &mut Deciding<'_>,
    body: &BatchOpened,
    findings: Vec<Finding>,
) -> Result<(DeviationOpened, [Subject; 3]), Stop> {
    let deviation: DeviationId = it.id();
    let code = free_code(it, &body.code, 1, deviation)?;
    let opened = DeviationOpened {
        deviation,
        code,
        title: format!("{} filled otherwise than the book allows", body.code),
        batch: Some(body.batch),
        entry: None,
        findings,
    };
    Ok((opened, [body.batch.into(), body.holding.into(), deviation.into()]))
}

/// What is filled must be liquid at most as much as the whole, in a vessel on the batch's premises.
fn is_told_right(act: &OpenBatch, vessel: &VesselDescribed) -> Result<(), Refusal> {
    if vessel.premises != act.premises {
        return Err(Refusal::meaningless(
            "/vessel",
            format!(
                "vessel {} stands on premises {}, not {}: the law that binds follows the premises",
                vessel.code, vessel.premises, act.premises
            ),
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
    if read_on == Scale::RefractometerBrix {
        return Err(wrong(
            "a refractometer does not show the end of a fermentation, because it sees alcohol as well as sugar: \
             give the expected final on a scale of density, such as sg_20_20"
                .to_owned(),
        ));
    }
    let number = crate::units::Decimal::parse(value).map_err(|e| wrong(e.to_string()))?;
    let found = at_calibration(number.to_f64(), read_on).map_err(|e| wrong(e.to_string()))?;
    Ok(ExpectedFinal {
        value: value.clone(),
        scale: scale.clone(),
        apparent_extract_percent: format!("{:.4}", found.apparent_extract),
        basis: basis.clone(),
        method: found.method.to_owned(),
        engine: ENGINE.to_owned(),
    })
}
