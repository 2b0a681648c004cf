//! The forecast against the demo's reading tables, and its properties.

use proptest::prelude::*;

use super::*;
use crate::densimetry::{Scale, SpecificGravity, correct, extract};

/// Grape must of the demo (invented): gravity as corrected and fraction used as printed there; the first at 09-09
/// 09:00, then daily at 08:00.
const GRAPE_MUST: [(f64, f64); 20] = [
    (1.0940, 0.0),
    (1.0930, 0.009),
    (1.0885, 0.050),
    (1.0790, 0.137),
    (1.0685, 0.234),
    (1.0585, 0.329),
    (1.0490, 0.420),
    (1.0420, 0.488),
    (1.0370, 0.537),
    (1.0325, 0.582),
    (1.0260, 0.647),
    (1.0195, 0.713),
    (1.0130, 0.780),
    (1.0070, 0.842),
    (1.0025, 0.889),
    (0.9985, 0.931),
    (0.9960, 0.957),
    (0.9935, 0.984),
    (0.9925, 0.995),
    (0.9920, 1.0),
];

/// Molasses wash of the demo (invented): hours from 09-22 00:00, gravity as corrected, fraction used as printed there.
/// The first gravity was read as 1.0665 at 27 °C.
const MOLASSES_WASH: [(f64, f64, f64); 12] = [
    (10.0, 1.0685, 0.0),
    (18.0, 1.0665, 0.036),
    (30.0, 1.0570, 0.209),
    (40.0, 1.0465, 0.404),
    (50.5, 1.0370, 0.583),
    (57.0, 1.0330, 0.660),
    (66.0, 1.0280, 0.756),
    (78.0, 1.0225, 0.863),
    (90.0, 1.0190, 0.931),
    (102.0, 1.0170, 0.970),
    (110.0, 1.0160, 0.990),
    (116.0, 1.0155, 1.0),
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
    let readings = (0..).zip(GRAPE_MUST).map(|(index, (sg, _))| reading(day(index), sg)).collect();
    (span(1.094, 0.992), readings)
}

fn wash() -> (SugarSpan, Vec<Reading>) {
    let readings = MOLASSES_WASH.into_iter().map(|(at_h, sg, _)| reading(at_h, sg)).collect();
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
fn the_fractions_of_both_tables_come_out_as_printed() {
    let (must_span, must_readings) = must();
    for (reading, (_, printed)) in must_readings.iter().zip(GRAPE_MUST) {
        within(must_span.fraction_used(reading.extract), printed - 0.000_6, printed + 0.000_6);
    }
    let (wash_span, wash_readings) = wash();
    for (reading, (.., printed)) in wash_readings.iter().zip(MOLASSES_WASH) {
        within(wash_span.fraction_used(reading.extract), printed - 0.000_6, printed + 0.000_6);
    }
}

#[test]
fn the_first_reading_of_the_wash_corrected_for_27_degrees_is_nothing_used() {
    let first = correct(1.0665, Scale::Sg20_20, 27.0).unwrap();
    let used = wash().0.fraction_used(ApparentExtract(first.apparent_extract));
    within(used, -0.001, 0.001);
}

/// B5: planned 09-18 18:00 as known at 10:05, with the last reading of 08:00 and the cooling just repaired.
#[test]
fn the_late_dose_of_the_must_is_forecast_after_half() {
    let planned = known_at(must(), september(18, 10.1), september(18, 18.0));
    within(planned.mid, 0.595, 0.61);
    within(planned.low, 0.575, 0.592);
    within(planned.high, 0.61, 0.635);
    assert!(planned.probability_more_than(0.5) > 0.999);
    assert_eq!(planned.basis, Basis::AheadOfReadings);
}

/// B3: planned 09-13 11:00, last reading 08:00.
#[test]
fn the_early_dose_of_the_must_is_forecast_before_a_third() {
    let planned = known_at(must(), september(13, 9.0), september(13, 11.0));
    within(planned.mid, 0.243, 0.249);
    assert!(planned.probability_more_than(1.0 / 3.0) < 0.01);
}

/// B4: 09-15 09:30.
#[test]
fn the_dose_between_a_third_and_a_half_is_forecast_there() {
    let planned = known_at(must(), september(15, 9.5), september(15, 9.5));
    within(planned.mid, 0.423, 0.428);
    assert!(planned.probability_more_than(1.0 / 3.0) > 0.99);
    assert!(planned.probability_more_than(0.5) < 0.01);
}

/// A1 and A2: 09-22 18:10 and 09-23 06:30.
#[test]
fn the_doses_of_the_wash_are_forecast_soon_after_their_reading() {
    let first = known_at(wash(), 18.1, 18.0 + 1.0 / 6.0);
    within(first.mid, 0.034, 0.039);
    let second = known_at(wash(), 30.4, 30.5);
    within(second.mid, 0.209, 0.221);
    assert!(second.probability_more_than(1.0 / 3.0) < 0.01);
}

/// A3: done 09-24 02:40, entered at 09:05 when the 09:00 reading was there too.
#[test]
fn the_night_dose_is_past_half_whether_seen_from_before_or_after() {
    let done_h = 48.0 + 2.0 + 2.0 / 3.0;
    for (entered_h, basis) in [(51.0, Basis::AheadOfReadings), (57.1, Basis::BetweenReadings)] {
        let night = known_at(wash(), entered_h, done_h);
        within(night.mid, 0.580, 0.588);
        assert!(night.probability_more_than(0.5) > 0.999, "{night:?}");
        assert_eq!(night.basis, basis);
    }
}

/// The band is called 90 %: of the next readings of both tables, each forecast from those before it, that many fall in.
#[test]
fn nine_in_ten_next_readings_fall_into_the_band() {
    let mut inside = 0;
    let mut asked = 0;
    for (span, readings) in [must(), wash()] {
        for known in 1..readings.len() {
            let next = readings[known];
            let band = forecast(span, &readings[..known], next.at_h).unwrap();
            asked += 1;
            inside += i32::from((band.low..=band.high).contains(&span.fraction_used(next.extract)));
        }
    }
    assert_eq!(asked, 30);
    within(f64::from(inside), 26.0, 29.0);
}

#[test]
fn no_reading_is_no_forecast() {
    let (span, readings) = must();
    assert_eq!(forecast(span, &[], 24.0), None);
    assert_eq!(forecast(span, &readings, f64::NAN), None);
    let nonsense = Reading { at_h: f64::NAN, extract: ApparentExtract(20.0) };
    assert_eq!(forecast(span, &[nonsense], 24.0), None);
}

#[test]
fn one_reading_gives_a_band_as_wide_as_any_fermentation() {
    let one = known_at(must(), september(9, 9.0), september(10, 9.0));
    assert_eq!(one.basis, Basis::AheadOfOneReading);
    assert!(one.high - one.low > 0.35, "{one:?}");
    let two = known_at(must(), september(10, 8.0), september(11, 9.0));
    assert_eq!(two.basis, Basis::AheadOfReadings);
    assert!(two.sd < one.sd);
}

#[test]
fn two_readings_leave_the_speed_in_more_doubt_than_six() {
    let (span, readings) = must();
    let pair = [readings[0], readings[5]];
    let next = forecast(span, &pair, readings[10].at_h).unwrap();
    let all = forecast(span, &readings[..6], readings[10].at_h).unwrap();
    assert!(next.high - next.low > 0.25, "{next:?}");
    assert!(next.sd > 1.2 * all.sd, "{next:?} {all:?}");
}

#[test]
fn at_a_reading_between_others_the_forecast_is_that_reading() {
    for (span, readings) in [must(), wash()] {
        let course = Course::fit(span, &readings).unwrap();
        for reading in &readings[1..] {
            let seen = course.at(reading.at_h).unwrap();
            let used = span.fraction_used(reading.extract);
            within(seen.mid, used - 1e-9, used + 1e-9);
            assert_eq!(seen.basis, Basis::BetweenReadings);
        }
    }
}

#[test]
fn before_the_first_reading_less_was_used() {
    let (span, readings) = must();
    let seen = forecast(span, &readings[6..9], september(14, 0.0)).unwrap();
    assert_eq!(seen.basis, Basis::BeforeFirstReading);
    assert!(seen.high < 0.44 && seen.low < 0.05, "{seen:?}");
}

#[test]
fn the_band_and_the_probabilities_say_the_same() {
    let seen = known_at(must(), september(14, 9.0), september(15, 20.0));
    within(seen.probability_more_than(seen.low), 0.95 - 1e-6, 0.95 + 1e-6);
    within(seen.probability_more_than(seen.mid), 0.5 - 1e-6, 0.5 + 1e-6);
    within(seen.probability_more_than(seen.high), 0.05 - 1e-6, 0.05 + 1e-6);
    within(seen.probability_more_than(-0.1), 1.0, 1.0);
    within(seen.probability_more_than(1.0), 0.0, 0.0);
}

/// From one hour to the next it may narrow by a little, since what is left to be used shrinks; over half a day it
/// widens.
#[test]
fn half_a_day_more_ahead_widens_the_band() {
    for ((span, readings), known, most_h) in [(must(), 5, 72), (must(), 10, 72), (wash(), 4, 12)] {
        let course = Course::fit(span, &readings[..known]).unwrap();
        let sd = |ahead: i32| course.at(readings[known - 1].at_h + f64::from(ahead)).unwrap().sd;
        for ahead in 0..most_h {
            assert!(sd(ahead) < sd(ahead + 12), "{known} readings, {ahead} h");
            assert!(sd(ahead) < 1.01 * sd(ahead + 1), "{known} readings, {ahead} h");
        }
    }
}

#[test]
fn a_confirming_reading_narrows_the_band() {
    let (span, readings) = must();
    for known in 3..12 {
        let mut seen = readings[..known].to_vec();
        let last_h = seen[known - 1].at_h;
        let target_h = last_h + 48.0;
        let before = forecast(span, &seen, target_h).unwrap();
        let expected = forecast(span, &seen, last_h + 24.0).unwrap().mid;
        let extract = ApparentExtract(span.original - expected * span.width);
        seen.push(Reading { at_h: last_h + 24.0, extract });
        let after = forecast(span, &seen, target_h).unwrap();
        assert!(after.sd < before.sd, "{known}: {} then {}", before.sd, after.sd);
    }
}

#[test]
fn scatter_widens_the_band() {
    let (span, readings) = must();
    let known = &readings[..9];
    let target_h = september(18, 8.0);
    let calm = forecast(span, known, target_h).unwrap();

    let mut backwards = known.to_vec();
    backwards[6].extract = readings[4].extract;
    assert!(forecast(span, &backwards, target_h).unwrap().sd > 1.2 * calm.sd);

    let mut jerky = known.to_vec();
    for (sign, reading) in [-1.0, 1.0].into_iter().cycle().zip(&mut jerky[2..]) {
        reading.extract.0 += sign * 0.7;
    }
    assert!(forecast(span, &jerky, target_h).unwrap().sd > 1.2 * calm.sd);
}

#[test]
fn a_finished_batch_stays_finished() {
    let (span, readings) = must();
    let end = forecast(span, &readings, september(40, 8.0)).unwrap();
    within(end.mid, 1.0, 1.0);
    assert!(end.low > 0.97, "{end:?}");
}

#[test]
fn a_batch_that_stands_is_forecast_to_stand_with_room_above() {
    let (span, readings) = must();
    let mut stuck = readings[..8].to_vec();
    for day in 1..=5 {
        stuck.push(Reading { at_h: readings[7].at_h + 24.0 * f64::from(day), ..readings[7] });
    }
    let last_h = stuck[12].at_h;
    let next = forecast(span, &stuck, last_h + 24.0).unwrap();
    within(next.mid, 0.485, 0.51);
    assert!(next.high - next.mid > 0.01, "{next:?}");
}

#[test]
fn a_span_that_cannot_be_is_refused_with_what_to_do() {
    for (original, end) in [(2.0, 1.5), (3.0, 20.0), (f64::NAN, 0.0), (f64::INFINITY, 0.0)] {
        assert!(SugarSpan::new(OriginalExtract(original), FinalExtract(end)).is_err());
    }
    let swapped = SugarSpan::new(OriginalExtract(3.0), FinalExtract(20.0)).unwrap_err();
    assert_eq!(
        swapped.to_string(),
        "the original extract 3 is not at least 1 % above the expected final extract 20: check both, the used sugar \
         cannot be told from them"
    );
}

#[test]
fn the_extract_per_gravity_is_the_slope_of_the_cubic() {
    within(
        (brix(1.0405) - brix(1.0395)) / 0.001,
        EXTRACT_PER_GRAVITY - 0.1,
        EXTRACT_PER_GRAVITY + 0.1,
    );
}

/// Any readings at all, even nonsense: up to twelve, over forty days, from 3 % below the end to 2 % above the start.
fn any_readings() -> impl Strategy<Value = Vec<Reading>> {
    let one = (0.0..960.0_f64, -5.0..24.5_f64)
        .prop_map(|(at_h, extract)| Reading { at_h, extract: ApparentExtract(extract) });
    proptest::collection::vec(one, 1..12)
}

proptest! {
    #[test]
    fn any_course_stays_within_nothing_and_all_and_never_falls(
        readings in any_readings(),
        start_h in -48.0..1_200.0_f64,
        hours in 0.0..400.0_f64,
        fraction in -0.1..1.1_f64,
    ) {
        let course = Course::fit(must().0, &readings).unwrap();
        let (now, later) = (course.at(start_h).unwrap(), course.at(start_h + hours).unwrap());
        for seen in [&now, &later] {
            prop_assert!(0.0 <= seen.low && seen.low <= seen.mid);
            prop_assert!(seen.mid <= seen.high && seen.high <= 1.0);
            prop_assert!(seen.sd.is_finite());
        }
        let error = 1e-12;
        prop_assert!(now.low <= later.low + error && now.mid <= later.mid + error);
        prop_assert!(now.high <= later.high + error);
        let chances =
            (now.probability_more_than(fraction), later.probability_more_than(fraction));
        prop_assert!(chances.0 <= chances.1 + 1e-6, "{:?}", chances);
        prop_assert!((0.0..=1.0).contains(&chances.0));
    }

    #[test]
    fn a_larger_fraction_is_never_more_probable(
        readings in any_readings(),
        at_h in -48.0..1_200.0_f64,
        (less, more) in (-0.1..1.1_f64, 0.0..0.5_f64),
    ) {
        let seen = forecast(must().0, &readings, at_h).unwrap();
        prop_assert!(seen.probability_more_than(less + more) <= seen.probability_more_than(less));
    }

    /// Hours may as well be quarters of hours: only the order and the proportions of time matter.
    #[test]
    fn stretching_time_changes_nothing(
        known in 5_usize..20,
        factor in 0.3..3.0_f64,
        shift_h in -1_000.0..1_000.0_f64,
        target_h in 0.0..600.0_f64,
    ) {
        let (span, readings) = must();
        let stretch = |at_h: f64| shift_h + factor * at_h;
        let stretched: Vec<Reading> =
            readings[..known].iter().map(|r| Reading { at_h: stretch(r.at_h), ..*r }).collect();
        let plain = forecast(span, &readings[..known], target_h).unwrap();
        let other = forecast(span, &stretched, stretch(target_h)).unwrap();
        prop_assert!((plain.mid - other.mid).abs() < 1e-8);
        prop_assert!((plain.low - other.low).abs() < 1e-8);
        prop_assert!((plain.high - other.high).abs() < 1e-8);
    }
}
