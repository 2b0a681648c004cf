//! The core alone, on the demo's batch B as the scenario leaves it.

use std::time::Instant;

use domain::book::assessing::{Question, assess};
use domain::book::body::Preparation;
use domain::book::command::Draw;
use domain::densimetry::balling::{ApparentExtract, OriginalExtract};
use domain::forecast::{Course, FinalExtract, Reading, SugarSpan};
use domain::ids::LotId;
use domain::ledger::entry::Actor;
use domain::stamp::{Micros, Stamp};
use domain::units::{Dimension, Quantity};
use house::House;
use house::clock::Clock;
use house::secrets::Secrets;
use store::{Db, Place};

use crate::{place, starting, table};

/// The demo's batch of white must.
const BATCH: &str = "EXW-25-B1";
/// When the last late addition was asked about.
const B5: &str = "2025-09-18T18:00:00-07:00";
const TIMES: u32 = 5_000;

/// Measures and prints.
pub(crate) fn print() {
    let directory = tempfile::tempdir().expect("a temporary directory");
    let book = starting::demo_book(directory.path());
    place::runtime().block_on(async {
        let db = Db::open(&Place::Directory(book.clone())).await.expect("the book");
        let secrets = Secrets::open(&book.join("secrets")).expect("the secrets");
        let begin = Micros::parse(starting::DEMO_BEGINS).expect("a time");
        let house = House::open(db, secrets, Clock::simulated(begin)).await.expect("the house");
        measure(&house).await;
        house.close().await;
    });
}

async fn measure(house: &House) {
    let site = house.sites().await.expect("sites").remove(0);
    let batch = house.batches(&site, Some(BATCH), 1).await.expect("batches")[0];
    let lot: LotId = house.lots(&site, Some("DP-0412"), None, 1).await.expect("lots")[0];
    let at = Stamp::parse(B5).expect("a time").at;
    let question = Question {
        batch,
        at,
        draws: vec![Draw {
            lot,
            amount: Quantity::parse("150", "g", Dimension::Mass).expect("an amount"),
        }],
        carrier_water: None,
        preparation: Preparation::Slurry,
        already_done: false,
        actor: Actor::Person(uuid::Uuid::from_u128(1).into()),
    };
    let mut desk = house.desk(&site, &[site.id.into(), batch.into()]).await.expect("a desk");
    let ask = |desk: &domain::book::Desk| assess(desk, &question, at);
    let found = house.ask(&site, &mut desk, ask).await.expect("an answer");
    let verdict = found.assessment.verdict;
    let findings = found.assessment.findings.len();
    let each = repeated(|| assess(&desk, &question, at).is_ok());
    let what = format!("one assessment with its fit ({verdict:?}, {findings} findings)");
    table::line(&what, &each);
    let state = desk.batch(batch).expect("the batch");
    let (_, opened) = state.opened.as_ref().expect("an open batch");
    let original = state.original().expect("a first gravity");
    let end = opened.expected_final.as_ref().expect("an expected end");
    let end = FinalExtract(end.apparent_extract_percent.parse().expect("a number"));
    let span = SugarSpan::new(OriginalExtract(original.extract), end).expect("a span");
    let readings: Vec<Reading> = state
        .gravities
        .iter()
        .map(|gravity| Reading {
            at_h: gravity.at.hours_since(original.at),
            extract: ApparentExtract(gravity.extract),
        })
        .collect();
    let each = repeated(|| {
        let forecast = Course::fit(span, &readings).and_then(|course| course.at(300.0));
        forecast.is_some_and(|found| found.probability_more_than(0.5) > 0.0)
    });
    table::line(&format!("one fit of {} readings, asked once", readings.len()), &each);
}

/// How long one of many calls takes; each must succeed, so that none is left out.
fn repeated(call: impl Fn() -> bool) -> String {
    let start = Instant::now();
    let good = (0..TIMES).filter(|_| std::hint::black_box(call())).count();
    let spent = start.elapsed();
    assert_eq!(u32::try_from(good), Ok(TIMES));
    format!("{:.1} µs", spent.as_secs_f64() * 1e6 / f64::from(TIMES))
}
