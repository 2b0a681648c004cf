//! The forecast against the demo's reading tables, and its properties.

use proptest::prelude::*;

use super::*;
use crate::densimetry::{Scale, SpecificGravity, correct, extract};

/// 09-09 09:00, then daily at 08:00; hours count from 09-09 00:00.
const GRAPE_MUST: [f64; 20] = [
    1.0940, 1.0930, 1.0885, 1.0790, 1.0685, 1.0585, 1.0490, 1.0420, 1.0370, 1.0325, 1.0260, 1.0195,
    1.0130, 1.0070, 1.0025, 0.9985, 0.9960, 0.9935, 0.9925, 0.9920,
];

/// Hours from 09-22 00:00, and gravity as corrected.
const MOLASSES_WASH: [(f64, f64); 12] = [
    (10.0, 1.0685),
    (18.0, 1.0665),
    (30.0, 1.0570),
    (40.0, 1.0465),
    (50.5, 1.0370),
    (57.0, 1.0330),
    (66.0, 1.0280),
    (78.0, 1.0225),
    (90.0, 1.0190),
    (102.0, 1.0170),
    (110.0, 1.0160),
    (116.0, 1.0155),
];

fn brix(gravity: f64) -> f64 {
    extract::brix(SpecificGravity::new(gravity).unwrap())
}

fn span(original: f64, end: f64) -> SugarSpan {
    SugarSpan::new(OriginalExtract(brix(original)), FinalExtract(brix(end))).unwrap()
}

fn reading(at_h: f64, gravity: f64) -> Reading {
    Reading { at_h, extract: ApparentExtract(brix(gravity)) }
}

fn must() -> (SugarSpan, Vec<Reading>) {
    let day = |index: u32| if index == 0 { 9.0 } else { 24.0 * f64::from(index) + 8.0 };
    let readings = (0..).zip(GRAPE_MUST).map(|(index, sg)| reading(day(index), sg)).collect();
    (span(1.094, 0.992), readings)
}

fn wash() -> (SugarSpan, Vec<Reading>) {
    let readings = MOLASSES_WASH.into_iter().map(|(at_h, sg)| reading(at_h, sg)).collect();
    (span(1.0685, 1.0155), readings)
}

/// The forecast to `target_h` from what had been read by `known_h`.
fn known_at(
    (span, readings): (SugarSpan, Vec<Reading>),
    known_h: f64,
    target_h: f64,
) -> FractionForecast {
    let known: Vec<Reading> = readings.into_iter().filter(|r| r.at_h <= known_h).collect();
    forecast(span, &known, target_h).unwrap()
}

fn within(value: f64, low: f64, high: f64) {
    assert!((low..=high).contains(&value), "{value} is not within {low} to {high}");
}

/// Hours on the must's clock.
fn september(day: u32, hour: f64) -> f64 {
    24.0 * f64::from(day - 9) + hour
}

#[test]
fn print() {
    for (n, f) in [
        ("A1", known_at(wash(), 18.1, 18.0 + 1.0 / 6.0)),
        ("A2", known_at(wash(), 30.1, 30.5)),
        ("A3", known_at(wash(), 51.0, 50.0 + 2.0 / 3.0 + 2.0)),
        ("A3", known_at(wash(), 51.0, 50.0 + 2.0 / 3.0)),
        ("A3b", known_at(wash(), 57.0, 50.0 + 2.0 / 3.0)),
        ("B3", known_at(must(), september(13, 8.0), september(13, 11.0))),
        ("B4", known_at(must(), september(15, 8.0), september(15, 9.5))),
        ("B5", known_at(must(), september(18, 8.0), september(18, 18.0))),
        ("B5+1", known_at(must(), september(18, 8.0), september(19, 8.0))),
        ("B5+2", known_at(must(), september(18, 8.0), september(20, 8.0))),
        ("B1r", known_at(must(), september(9, 9.0), september(10, 8.0))),
        ("B2r", known_at(must(), september(10, 9.0), september(11, 8.0))),
        ("B3r", known_at(must(), september(11, 9.0), september(12, 8.0))),
    ] {
        println!(
            "{n}: {:.4} [{:.4} {:.4}] sd {:.4} P>1/3 {:.2e} P>1/2 {:.6}",
            f.mid,
            f.low,
            f.high,
            f.sd,
            f.probability_more_than(1.0 / 3.0),
            f.probability_more_than(0.5)
        );
    }
    for (name, case) in [("must", must()), ("wash", wash())] {
        let mut inside = 0;
        let mut total = 0;
        for n in 1..case.1.len() {
            let known = &case.1[..n];
            let next = case.1[n];
            let f = forecast(case.0, known, next.at_h).unwrap();
            let truth = case.0.fraction_used(next.extract);
            total += 1;
            if f.low <= truth && truth <= f.high {
                inside += 1;
            }
            println!("{name} {n} truth {truth:.3}: {:.3} [{:.3} {:.3}]", f.mid, f.low, f.high);
        }
        println!("{inside}/{total}");
    }
}
