//! Recording what was measured. Corrections are computed here, once, and kept with their method.

use super::lots::zone;
use super::{Deciding, ENGINE};
use crate::book::assessing::settings_of;
use crate::book::body::batches::ExpectedFinal;
use crate::book::body::readings::{CorrectedGravity, Temperature};
use crate::book::body::{Nitrogen, Reading, ReadingTaken};
use crate::book::command::{Decision, Refusal, Stop, TakeReading, not_ahead};
use crate::book::desk::Desk;
use crate::book::readings::{READABLE, readable};
use crate::book::state::batch::{BatchState, has_dropped};
use crate::checks::Finding;
use crate::checks::plausibility::{self, Before, GravityRead};
use crate::densimetry::{
    Corrected, DensimetryError, Scale, at_calibration, correct, refractometer,
};
use crate::nitrogen::{Ammonium, Yan};
use crate::settings::Setting;
use crate::stamp::{Micros, Stamp};
use crate::units::Decimal;

/// The most values one entry holds.
const MOST_VALUES: usize = 50;

pub(super) fn take(it: &mut Deciding<'_>, act: &TakeReading) -> Result<Decision, Stop> {
    let body = reading(it, it.desk, act)?;
    let subjects = [act.batch.into(), body.holding.into()];
    let mut draft = it.draft(act.taken_at, subjects, body);
    draft.captured_at = act.captured_at;
    Ok(Decision { drafts: vec![draft], ..Decision::default() })
}

/// The reading as an entry says it; also what an amendment puts in its place, on a desk without the old one.
pub(super) fn reading(
    it: &Deciding<'_>,
    desk: &Desk,
    act: &TakeReading,
) -> Result<ReadingTaken, Stop> {
    not_ahead("/taken_at", act.taken_at, it.now)?;
    let batch = desk.batch(act.batch)?;
    let Some((_, opened)) = &batch.opened else { return Err(Refusal::unknown("batch").into()) };
    let holding = opened.holding;
    if act.values.is_empty() || act.values.len() > MOST_VALUES {
        return Err(
            Refusal::meaningless("/values", format!("give 1 to {MOST_VALUES} values")).into()
        );
    }
    let sampled = Sampled { batch, at: act.taken_at.at, beside: &act.values };
    let values = act
        .values
        .iter()
        .enumerate()
        .map(|(index, value)| checked(it, sampled, value, &format!("/values/{index}")))
        .collect::<Result<Vec<_>, Stop>>()?;
    Ok(ReadingTaken {
        batch: act.batch,
        holding,
        reported_at: act.reported_at,
        sample: act.sample.clone(),
        laboratory: act.laboratory.clone(),
        nitrogen: nitrogen(&values),
        findings: odd(it, batch, act, &values)?,
        late: it.late(
            act.reported_at.unwrap_or(act.taken_at),
            act.captured_at,
            act.note.as_ref(),
        )?,
        values,
        note: act.note.clone(),
    })
}

/// What is odd about the gravities, held against the batch as it was before.
fn odd(
    it: &Deciding<'_>,
    batch: &BatchState,
    act: &TakeReading,
    values: &[Reading],
) -> Result<Vec<Finding>, Stop> {
    let at = act.taken_at.at;
    let last = batch.gravities.iter().rev().find(|gravity| gravity.at < at);
    let shown = match last {
        Some(last) => Stamp::in_zone(last.at, &zone(it)?).minute(),
        None => String::new(),
    };
    let before = last.map(|last| Before {
        sg: last.sg,
        at: &shown,
        sugar_since: batch.ingredient_between(last.at, at),
    });
    let rise = settings_of(&it.desk.site()?.settings)?.number(Setting::GravityRiseSg);
    let opened = batch.opened.as_ref().map(|(_, opened)| opened);
    let expected_end = opened.and_then(|opened| opened.expected_final.as_ref()).and_then(end_sg);
    let gravities = values.iter().filter_map(|value| {
        let sg = value.corrected.as_ref()?.sg_20_20.parse().ok()?;
        let scale = Scale::parse(&value.unit).ok()?;
        let celsius = value.sample_temperature.as_ref().and_then(Temperature::celsius);
        let celsius = celsius.unwrap_or(scale.calibration().0);
        let entered = value.value.as_str();
        Some(GravityRead { entered, scale, celsius, sg, before, expected_end, rise })
    });
    Ok(gravities.flat_map(|read| plausibility::gravity(&read)).collect())
}

/// The gravity at which a batch is expected to end, 20/20 °C.
fn end_sg(expected: &ExpectedFinal) -> Option<f64> {
    let scale = Scale::parse(&expected.scale).ok()?;
    Some(at_calibration(expected.value.parse().ok()?, scale).ok()?.sg_20_20)
}

/// What was read: which batch, when, and what else was found in the same sample.
#[derive(Clone, Copy)]
pub(super) struct Sampled<'a> {
    pub(super) batch: &'a BatchState,
    pub(super) at: Micros,
    pub(super) beside: &'a [Reading],
}

impl Sampled<'_> {
    /// Why there may be alcohol in it, if that is known, when it reads as this apparent extract.
    fn fermenting(self, extract: f64) -> Option<&'static str> {
        let alcohol = self.beside.iter().filter(|value| value.quantity == "ethanol");
        let found = |value: &Reading| Decimal::parse(&value.value).is_ok_and(|v| v.to_f64() > 0.0);
        let mut measured = alcohol.filter(|value| value.qualifier.as_deref() != Some("<"));
        if self.batch.pitched_at.is_some_and(|pitched| pitched < self.at) {
            return Some("yeast went in before");
        }
        if measured.any(found) {
            return Some("alcohol was found in it");
        }
        let known = self.batch.gravities.iter().take_while(|known| known.at <= self.at);
        let mut extracts = known.map(|known| known.extract).chain([extract]);
        let first = extracts.next()?;
        extracts
            .any(|later| has_dropped(first, later))
            .then_some("its gravity has fallen since the first reading")
    }
}

/// One value, believed or refused with what is believed; a gravity also brought to 20 °C.
pub(super) fn checked(
    it: &Deciding<'_>,
    sampled: Sampled<'_>,
    value: &Reading,
    at: &str,
) -> Result<Reading, Stop> {
    let Some(known) = readable(&value.quantity) else {
        let names: Vec<_> = READABLE.iter().map(|readable| readable.name).collect();
        return Err(Refusal::meaningless(
            &format!("{at}/quantity"),
            format!("{:?} cannot be read here: use one of {}", value.quantity, names.join(", ")),
        )
        .into());
    };
    let Some((_, least, most)) = known.units.iter().find(|(unit, ..)| *unit == value.unit) else {
        let units: Vec<_> = known.units.iter().map(|(unit, ..)| *unit).collect();
        return Err(Refusal::meaningless(
            &format!("{at}/unit"),
            format!("{} is not read in {:?}: use {}", known.name, value.unit, units.join(" or ")),
        )
        .into());
    };
    let number = Decimal::parse(&value.value)
        .map_err(|e| Refusal::meaningless(&format!("{at}/value"), e.to_string()))?
        .to_f64();
    if known.name == "gravity" {
        let within = Scale::parse(&value.unit).and_then(|scale| scale.admit(number));
        within.map_err(|e| Refusal::meaningless(&format!("{at}/value"), e.to_string()))?;
    }
    if !(*least..=*most).contains(&number) {
        return Err(Refusal::meaningless(
            &format!("{at}/value"),
            format!(
                "a {} of {} {} cannot be: it lies between {least} and {most}; check the digits and the unit",
                known.name, value.value, value.unit
            ),
        )
        .into());
    }
    if known.name == "ammonium" && value.expressed_as.is_none() {
        return Err(Refusal::meaningless(
            &format!("{at}/expressed_as"),
            "say as what the laboratory counts ammonium: NH4, NH3 or N",
        )
        .into());
    }
    if let Some(instrument) = value.instrument {
        it.desk.instrument(instrument)?;
    }
    let (corrected, left_as_read) = match known.name {
        "gravity" => match gravity(sampled, value, number, at)? {
            Ok(corrected) => (Some(corrected), None),
            Err(why) => (None, Some(why)),
        },
        _ => (None, None),
    };
    Ok(Reading { corrected, left_as_read, ..value.clone() })
}

/// A gravity at 20 °C, or why it is kept as it was read: hotter than the sugar tables reach, or by refractometer in a
/// liquid that holds alcohol. Without the sample's temperature it is taken as read, and says so.
fn gravity(
    sampled: Sampled<'_>,
    value: &Reading,
    number: f64,
    at: &str,
) -> Result<Result<CorrectedGravity, String>, Refusal> {
    let unknown = |e: DensimetryError| Refusal::meaningless(&format!("{at}/unit"), e.to_string());
    let scale = Scale::parse(&value.unit).map_err(unknown)?;
    let celsius = value.sample_temperature.as_ref().map(|given| believed(given, at)).transpose()?;
    let found = match celsius {
        Some(celsius) => correct(number, scale, celsius),
        None => at_calibration(number, scale),
    };
    let found = match found {
        Ok(found) => found,
        Err(e) => return Ok(Err(e.to_string())),
    };
    if scale == Scale::RefractometerBrix
        && let Some(reason) = sampled.fermenting(found.apparent_extract)
    {
        return Ok(Err(format!("{reason}: {}", refractometer::FERMENTED)));
    }
    Ok(Ok(kept(found, celsius.is_some())))
}

/// A corrected gravity as an entry keeps it.
fn kept(found: Corrected, temperature_known: bool) -> CorrectedGravity {
    let mut method = if temperature_known {
        found.method.to_owned()
    } else {
        "taken as read: no sample temperature was given".to_owned()
    };
    for note in found.notes {
        method.push_str("; ");
        method.push_str(note);
    }
    CorrectedGravity {
        sg_20_20: format!("{:.5}", found.sg_20_20),
        apparent_extract_percent: format!("{:.4}", found.apparent_extract),
        correction: format!("{:.5}", found.correction),
        method,
        engine: ENGINE.to_owned(),
    }
}

/// A sample's temperature in °C, if it can be one of a liquid.
fn believed(given: &Temperature, at: &str) -> Result<f64, Refusal> {
    let pointer = format!("{at}/sample_temperature");
    let celsius = given
        .celsius()
        .ok_or_else(|| Refusal::meaningless(&pointer, "give a decimal number in Cel or [degF]"))?;
    if (-30.0..=130.0).contains(&celsius) {
        return Ok(celsius);
    }
    Err(Refusal::meaningless(
        &pointer,
        format!("{} {} cannot be: a sample lies between -30 and 130 °C", given.value, given.unit),
    ))
}

/// Assimilable nitrogen, if both of its parts were found and neither is a mere bound.
fn nitrogen(values: &[Reading]) -> Option<Nitrogen> {
    let found = |name: &str| {
        values.iter().find(|value| value.quantity == name && value.qualifier.is_none())
    };
    let ammonium = found("ammonium")?;
    let amino: f64 = found("primary_amino_nitrogen")?.value.parse().ok()?;
    let number: f64 = ammonium.value.parse().ok()?;
    let ammonium = match ammonium.expressed_as.as_deref() {
        Some("N") => Ammonium::Nitrogen(number),
        Some("NH3") => Ammonium::Ammonia(number),
        _ => Ammonium::Ion(number),
    };
    let yan = Yan::from_parts(ammonium, amino).ok()?;
    Some(Nitrogen {
        ammonium_mg_l: format!("{:.3}", yan.ammonium_n_mg_l),
        amino_mg_l: format!("{:.3}", yan.primary_amino_n_mg_l),
        total_mg_l: format!("{:.3}", yan.total_mg_l()),
        method: "ammonium nitrogen + primary amino nitrogen; N/NH4 0.776484, N/NH3 0.822441 (IUPAC 2021 atomic masses)".to_owned(),
        engine: ENGINE.to_owned(),
    })
}
