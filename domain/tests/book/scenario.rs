//! Two batches of the invented works, played through the book act by act: a white must and a molasses wash. Every
//! verdict, supply and finding is one that the works' own paper computed beforehand by an independent script.

use std::sync::Arc;

use domain::book::body::readings::Temperature;
use domain::book::body::{Body, LotStatus};
use domain::book::command::{Act, Amend, AmendTo, OpenBatch, ResolveDeviation};
use domain::book::state::State;
use domain::book::subject::{Subject, SubjectKind};
use domain::checks::Verdict;
use domain::ids::{BatchId, DeviationId};
use domain::ledger::entry::Entry;
use domain::stamp::Stamp;

use crate::bench::at;
use crate::cellar::{
    Answer, Cellar, addition_of, body_of, carrying_out, deviation_of, found, quantity, reading,
};

/// Day, gravity, temperature at 08:00 in T-12; the reading at pitching, 09:00, comes before them.
const MUST_COURSE: &[(&str, &str, &str)] = &[
    ("09-10", "1.0930", "15.2"),
    ("09-11", "1.0885", "15.8"),
    ("09-12", "1.0790", "16.4"),
    ("09-13", "1.0685", "16.8"),
    ("09-14", "1.0585", "17.0"),
    ("09-15", "1.0490", "16.4"),
    ("09-16", "1.0420", "14.1"),
    ("09-17", "1.0370", "12.4"),
    ("09-18", "1.0325", "12.9"),
    ("09-19", "1.0260", "16.0"),
    ("09-20", "1.0195", "17.0"),
];

/// What the book answered on the white must.
pub(crate) struct Must {
    pub(crate) batch: BatchId,
    pub(crate) sulfite: Answer,
    pub(crate) pitch: Answer,
    pub(crate) autolysate: Answer,
    pub(crate) phosphate: Answer,
    pub(crate) slip: Answer,
    pub(crate) instead: Answer,
    pub(crate) held: Answer,
    pub(crate) late: Answer,
    pub(crate) late_done: Vec<Arc<Entry>>,
}

fn gravities(cellar: &mut Cellar, batch: BatchId, from: &str, to: &str) {
    for (day, sg, celsius) in MUST_COURSE.iter().filter(|(day, ..)| from <= *day && *day <= to) {
        cellar.gravity(batch, &format!("{day} 08:00"), sg, celsius);
    }
}

/// Plays the white must from the juice to the late dose of 18 September.
pub(crate) fn play_must(cellar: &mut Cellar) -> Must {
    let ben = cellar.ben.clone();
    let opening = cellar.must("EXW-25-B1", "T-12", "09-08 14:30");
    let batch = cellar.open(opening);
    let sulfite = cellar.asks(batch, ["09-08 14:50", "09-08 15:00"], &[("KM-0033", "180 g")], None);
    cellar.adds(&sulfite, "09-08 15:00").unwrap();
    cellar.clock("09-08 20:00");
    juice_analysis(cellar, batch);
    cellar.gravity(batch, "09-09 09:00", "1.0940", "15.0");

    let yeast = [("YW-0001", "750 g"), ("RH-0091", "900 g")];
    let pitch = cellar.asks(batch, ["09-09 09:00", "09-09 09:00"], &yeast, Some("8 L"));
    cellar.adds(&pitch, "09-09 09:00").unwrap();
    gravities(cellar, batch, "09-10", "09-11");
    let autolysate =
        cellar.asks(batch, ["09-11 09:50", "09-11 10:00"], &[("AU-0208", "900 g")], Some("6 L"));
    cellar.adds(&autolysate, "09-11 10:00").unwrap();
    gravities(cellar, batch, "09-12", "09-13");
    let two_lots = [("DP-0387", "500 g"), ("DP-0412", "400 g")];
    let phosphate = cellar.asks(batch, ["09-13 10:50", "09-13 11:00"], &two_lots, Some("6 L"));
    cellar.adds(&phosphate, "09-13 11:00").unwrap();
    gravities(cellar, batch, "09-14", "09-15");

    let times = ["09-15 09:30", "09-15 09:45"];
    let slip = cellar.asks(batch, times, &[("DP-0412", "2100 g")], None);
    let times = ["09-15 09:32", "09-15 09:45"];
    let instead = cellar.asks(batch, times, &[("DP-0412", "210 g")], None);
    gravities(cellar, batch, "09-16", "09-16");
    cellar.lot_status("09-16 09:00", "AU-0208", LotStatus::Held, "certificate missing");
    gravities(cellar, batch, "09-17", "09-18");
    let times = ["09-18 10:00", "09-18 18:00"];
    let held = cellar.asks(batch, times, &[("AU-0208", "300 g")], None);
    let times = ["09-18 10:05", "09-18 18:00"];
    let late = cellar.asks(batch, times, &[("DP-0412", "150 g")], Some("2 L"));
    cellar.signs(&ben, "09-18 14:20", &late).unwrap();
    cellar.clock("09-18 18:05");
    let mut done = carrying_out(&late, "09-18 18:05");
    done.draws[0].amount = quantity("151 g");
    let late_done = cellar.add(done).unwrap();
    cellar.lot_status("09-19 10:00", "AU-0208", LotStatus::Released, "certificate came");
    Must { batch, sulfite, pitch, autolysate, phosphate, slip, instead, held, late, late_done }
}

fn juice_analysis(cellar: &mut Cellar, batch: BatchId) {
    let values = [
        ("ammonium", "52", "mg/L"),
        ("primary_amino_nitrogen", "98", "mg/L"),
        ("sugar", "220", "g/L"),
    ];
    let mut reading = reading(batch, "09-08 16:00", &values);
    reading.values[0].expressed_as = Some("NH4".to_owned());
    reading.values[2].expressed_as = Some("glucose and fructose".to_owned());
    reading.laboratory = Some("Example Laboratory".to_owned());
    reading.reported_at = Some(at("09-08 20:00"));
    cellar.take(reading);
}

/// What the book answered on the wash.
pub(crate) struct Wash {
    pub(crate) batch: BatchId,
    pub(crate) autolysate: Answer,
    pub(crate) phosphate: Answer,
    pub(crate) swapped: Vec<Arc<Entry>>,
    pub(crate) at_night: Vec<Arc<Entry>>,
}

fn mash_in(cellar: &mut Cellar) -> OpenBatch {
    let ingredients =
        cellar.draws(&[("ML-0501", "360 kg"), ("CS-0502", "60 kg"), ("SB-019", "200 L")]);
    OpenBatch {
        name: Some("Molasses and cane sugar wash".to_owned()),
        product_class: "wash".to_owned(),
        premises: "D".to_owned(),
        claims: Vec::new(),
        volume: quantity("2000 L"),
        liquid: quantity("2000 L"),
        expected_final: Some((
            "1.0155".to_owned(),
            "sg_20_20".to_owned(),
            "composition: 238.6 kg fermentable in 2,000 L".to_owned(),
        )),
        fermentable_sugar: Some(("119.3".to_owned(), "lots' sugars as invert".to_owned())),
        ingredients,
        ..cellar.must("EXW-25-A1", "F-3", "09-22 09:30")
    }
}

/// Plays the wash from mashing in to the dose thrown in at night. The gravity of 23 September, 16:00, is typed like
/// this, and amended if it was typed wrong.
fn play_wash(cellar: &mut Cellar, typed: &str) -> Wash {
    let opening = mash_in(cellar);
    let batch = cellar.open(opening);
    cellar.clock("09-22 10:00");
    let mut first = reading(batch, "09-22 10:00", &[("gravity", "1.0665", "sg_20_20")]);
    first.values[0].sample_temperature =
        Some(Temperature { value: "27.0".to_owned(), unit: "Cel".to_owned() });
    first.values[0].instrument = Some(cellar.instrument("H-1"));
    cellar.take(first);
    cellar.nitrogen(batch, "09-21 15:00", "09-22 10:10", ["12", "N", "46"]);
    let pitch = cellar.asks(batch, ["09-22 10:20", "09-22 10:30"], &[("YD-0001", "500 g")], None);
    cellar.adds(&pitch, "09-22 10:30").unwrap();
    cellar.gravity(batch, "09-22 18:00", "1.0665", "29.0");
    let times = ["09-22 18:05", "09-22 18:10"];
    let autolysate = cellar.asks(batch, times, &[("AU-0208", "1600 g")], None);
    cellar.adds(&autolysate, "09-22 18:10").unwrap();
    cellar.nitrogen(batch, "09-22 16:30", "09-22 21:00", ["13", "N", "47"]);
    cellar.gravity(batch, "09-23 06:00", "1.0570", "30.8");
    let times = ["09-23 06:25", "09-23 06:30"];
    let phosphate = cellar.asks(batch, times, &[("DP-0412", "400 g")], Some("4 L"));
    cellar.adds(&phosphate, "09-23 06:30").unwrap();

    let swapped = cellar.gravity(batch, "09-23 16:00", typed, "32.4");
    if typed != "1.0465" {
        amend_gravity(cellar, batch, &swapped[0]);
    }
    cellar.gravity(batch, "09-24 02:30", "1.0370", "35.4");
    cellar.gravity(batch, "09-24 09:00", "1.0330", "33.0");

    cellar.clock("09-24 09:05");
    let mut night = cellar.already(batch, "09-24 02:40", &[("DP-0412", "300 g")]);
    night.already_done = Some("cooling pump tripped at 16:00".to_owned());
    let at_night = cellar.add(night).unwrap();
    Wash { batch, autolysate, phosphate, swapped, at_night }
}

fn amend_gravity(cellar: &mut Cellar, batch: BatchId, entry: &Entry) {
    let amended_at = cellar.clock("09-23 16:48");
    let value = reading(batch, "09-23 16:00", &[("gravity", "1.0465", "sg_20_20")]).values;
    let amend = Amend {
        target: entry.id,
        effect: AmendTo::Value(0, Box::new(value[0].clone())),
        reason: "slip shows 1.0465".to_owned(),
        amended_at,
    };
    let ana = cellar.ana.clone();
    cellar.done(&ana, Act::Amend(Box::new(amend)));
}

/// Both batches, with the lots for the wash in between.
pub(crate) fn play(cellar: &mut Cellar) -> (Must, Wash) {
    let must = play_must(cellar);
    cellar.receive_for_the_wash();
    let wash = play_wash(cellar, "1.0645");
    (must, wash)
}

#[test]
fn the_white_must_is_fed_as_the_paper_says() {
    let mut cellar = Cellar::stocked();
    let must = play_must(&mut cellar);
    assert_eq!(must.sulfite.verdict(), Verdict::Clear);

    let pitch = &must.pitch;
    assert_eq!((pitch.verdict(), pitch.supply()), (Verdict::Clear, "150.4"));
    let account = &pitch.said.assessment.account_before;
    assert_eq!(account.supply_mg_l.as_deref(), Some("138.4"));
    assert_eq!((account.sugar_g_l.as_str(), account.need_mg_l.as_str()), ("246.1", "221.5"));
    assert_eq!(account.line_mg_l.as_deref(), Some("236.4"));
    assert_eq!(account.other_sugar_g_l.as_deref(), Some("220.0"));
    assert_eq!(account.other_need_mg_l.as_deref(), Some("198.0"));

    assert_eq!((must.autolysate.verdict(), must.autolysate.supply()), (Verdict::Clear, "164.2"));
    assert_eq!((must.phosphate.verdict(), must.phosphate.supply()), (Verdict::Clear, "227.8"));
    let cautions = &must.phosphate.said.assessment.cautions;
    assert!(cautions.iter().any(|caution| caution.topic.contains("foam")), "{cautions:?}");
}

#[test]
fn ten_times_the_dose_is_refused_and_a_tenth_of_it_advised() {
    let mut cellar = Cellar::stocked();
    let must = play_must(&mut cellar);
    let slip = &must.slip;
    assert_eq!((slip.verdict(), slip.supply()), (Verdict::Refuse, "376.3"));
    let worst = &slip.said.assessment.findings[0];
    assert_eq!(worst.rule, "us-wine.ammonium-phosphate");
    assert!(worst.citation.as_ref().unwrap().starts_with("27 CFR 24.246"));
    let instead = worst.remedy.as_ref().unwrap();
    assert_eq!(instead.lot_amount, Some(quantity("121 g")), "{}", instead.sentence);

    let tenth = &must.instead;
    assert_eq!((tenth.verdict(), tenth.supply()), (Verdict::Advise, "242.7"));
    assert_eq!(tenth.found(), ["common-practice.sugar-used", "common-practice.excess"]);
    assert_eq!(tenth.said.assessment.account_after.excess_mg_l.as_deref(), Some("6.3"));
}

#[test]
fn a_held_lot_is_refused_and_the_late_dose_goes_in_under_a_signature() {
    let mut cellar = Cellar::stocked();
    let must = play_must(&mut cellar);
    assert_eq!(must.held.verdict(), Verdict::Refuse);
    assert_eq!(must.held.found()[0], "common-practice.lot");

    let late = &must.late;
    assert_eq!((late.verdict(), late.supply()), (Verdict::Refer, "238.4"));
    assert_eq!(late.found(), ["common-practice.sugar-used", "common-practice.excess"]);
    assert_eq!(late.said.assessment.account_after.excess_mg_l.as_deref(), Some("2.0"));
    let used = late.said.assessment.fraction_used.as_ref().unwrap();
    let [low, mid, high] =
        [&used.low, &used.mid, &used.high].map(|text| text.parse::<f64>().unwrap());
    assert!((0.595..=0.615).contains(&mid), "{used:?}");
    assert!(0.57 <= low && high <= 0.64, "{used:?}");
    let remedy = late.said.assessment.findings[0].remedy.as_ref().unwrap();
    assert!(remedy.sentence.contains("1,078 g"), "{}", remedy.sentence);

    assert_eq!(must.late_done.len(), 1, "no deviation opens");
    let done = addition_of(&must.late_done[0]);
    assert_eq!(done.assessment.verdict, Verdict::Refer);
    assert!(done.late.is_none() && done.shortfalls.is_empty() && done.already_done.is_none());
    let State::Batch(batch) = cellar.state(must.batch) else { panic!() };
    let proposal = &batch.proposals[&late.said.proposal];
    assert_eq!(proposal.done_by, Some(must.late_done[0].seq));
    assert_eq!(proposal.signoffs.len(), 1);
    assert_eq!(batch.proposals[&must.instead.said.proposal].done_by, None);
}

#[test]
fn the_wash_is_fed_as_the_paper_says() {
    let mut cellar = Cellar::stocked();
    let (_, wash) = play(&mut cellar);
    let autolysate = &wash.autolysate;
    assert_eq!((autolysate.verdict(), autolysate.supply()), (Verdict::Advise, "94.8"));
    assert_eq!(autolysate.found(), ["common-practice.yan-age"]);
    let findings = &autolysate.said.assessment.findings;
    assert!(findings.iter().any(|finding| finding.rule == "coverage.no-dose-law"));

    let phosphate = &wash.phosphate;
    assert_eq!((phosphate.verdict(), phosphate.supply()), (Verdict::Clear, "139.2"));
    let account = &phosphate.said.assessment.account_before;
    assert_eq!(account.supply_mg_l.as_deref(), Some("96.8"), "60 rebased at 16:30, and 36.8 since");
    assert_eq!(account.need_mg_l, "140.0");
    assert_eq!(account.line_mg_l, None);

    let State::Batch(batch) = cellar.state(wash.batch) else { panic!() };
    let first = batch.original().unwrap();
    assert_eq!(format!("{:.4} {:.2}", first.sg, first.extract), "1.0685 16.71");
    let found = batch.gravities.iter().find(|gravity| gravity.seq == wash.swapped[0].seq).unwrap();
    assert_eq!(format!("{:.4}", found.sg), "1.0465");
}

#[test]
fn the_dose_thrown_in_at_night_is_recorded_late_with_one_deviation() {
    let mut cellar = Cellar::stocked();
    let (_, wash) = play(&mut cellar);
    let [addition, deviation] = wash.at_night.as_slice() else { panic!("{:?}", wash.at_night) };
    let done = addition_of(addition);
    assert!(done.late.is_some());
    assert_eq!(done.assessment.verdict, Verdict::Refer);
    let expected =
        ["common-practice.sugar-used", "common-practice.excess", "common-practice.powder"];
    assert_eq!(found(&done.assessment), expected);
    assert_eq!(done.assessment.account_after.supply_mg_l.as_deref(), Some("171.0"));
    assert_eq!(done.assessment.account_after.excess_mg_l.as_deref(), Some("31.0"));
    let used: f64 = done.assessment.fraction_used.as_ref().unwrap().mid.parse().unwrap();
    assert!((used - 0.583).abs() < 0.01, "{used}");

    let opened = deviation_of(deviation);
    assert_eq!((opened.code.as_str(), opened.entry), ("EXW-25-A1-D1", Some(addition.id)));
    let rules: Vec<_> = opened.findings.iter().map(|finding| finding.rule.as_str()).collect();
    assert_eq!(rules, expected);

    close(&mut cellar, opened.deviation);
    let State::Deviation(state) = cellar.state(opened.deviation) else { panic!() };
    assert!(state.resolved.is_some());
}

fn close(cellar: &mut Cellar, deviation: DeviationId) {
    let resolved_at: Stamp = cellar.clock("10-06 10:00");
    let caro = cellar.caro.clone();
    let resolve = ResolveDeviation {
        deviation,
        cause: "the cooling pump tripped".to_owned(),
        action: "distil within three days; keep this run's feints apart".to_owned(),
        conclusion: "ethyl carbamate is measured in the hearts".to_owned(),
        resolved_at,
    };
    cellar.done(&caro, Act::ResolveDeviation(resolve));
}

#[test]
fn the_lots_hold_what_the_paper_leaves_in_them() {
    let mut cellar = Cellar::stocked();
    let (must, _) = play(&mut cellar);
    let grams = |cellar: &Cellar, code: &str| cellar.remaining(code) / 1_000_000;
    assert_eq!(cellar.remaining("DP-0387"), 0);
    assert_eq!(grams(&cellar, "DP-0412"), 25_000 - 400 - 151 - 400 - 300);
    assert_eq!(grams(&cellar, "AU-0208"), 10_000 - 900 - 1_600);
    assert_eq!(grams(&cellar, "RH-0091"), 5_000 - 900);
    let State::Batch(batch) = cellar.state(must.batch) else { panic!() };
    let holding = batch.opened.as_ref().unwrap().1.holding;
    assert_eq!(cellar.booked_mass(holding) / 1_000_000, 180 + 750 + 900 + 900 + 900 + 151);
}

/// No other reading of the story is called odd.
#[test]
fn only_the_slip_is_called_odd() {
    let mut cellar = Cellar::stocked();
    let (must, wash) = play(&mut cellar);
    for batch in [must.batch, wash.batch] {
        let subject = Subject::new(SubjectKind::Batch, batch);
        for entry in cellar.ledger.entries_of(subject, usize::MAX) {
            if let Body::ReadingTaken(body) = body_of(&entry) {
                let slip = entry.id == wash.swapped[0].id;
                assert_eq!(body.findings.is_empty(), !slip, "{:?}", body.findings);
            }
        }
    }
}

#[test]
fn the_swapped_digits_of_a_reading_change_no_later_verdict() {
    let mut cellar = Cellar::stocked();
    let (_, wash) = play(&mut cellar);
    let entries =
        cellar.ledger.entries_of(Subject::new(SubjectKind::Batch, wash.batch), usize::MAX);
    let amendment = entries.iter().find(|entry| entry.kind == "entry.amended").unwrap();
    let Body::EntryAmended(said) = body_of(amendment) else { panic!() };
    assert_eq!(said.target.id, wash.swapped[0].id);
    assert_eq!(said.reason, "slip shows 1.0465");
    let Body::ReadingTaken(typed) = body_of(&wash.swapped[0]) else { panic!() };
    assert_eq!(typed.findings.len(), 1);
    assert_eq!(typed.findings[0].rule, "plausibility.gravity-rise");
    assert_eq!(
        typed.findings[0].sentence,
        "Gravity 1.0645 is 0.0075 above the last one, 1.0570 at 2025-09-23 06:00, and no sugar is recorded since: \
         were two digits swapped (1.0465)?"
    );

    let mut straight = Cellar::stocked();
    play_must(&mut straight);
    straight.receive_for_the_wash();
    let straight = play_wash(&mut straight, "1.0465");
    let [slipped, straight] =
        [wash, straight].map(|wash| addition_of(&wash.at_night[0]).assessment);
    assert_eq!(slipped, straight);
}
