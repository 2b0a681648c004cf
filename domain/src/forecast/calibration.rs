//! Is the forecast what it says? Held against simulated ferments, where the truth is known.
//!
//! Everything here is SIMULATED. The ferments are published models, solved: the trajectories of
//! `tests/reference/kinetics_sugar.csv`, and 600 more drawn around them and solved by `kinetics`, which is itself held
//! against that file. They are read by `cellar`: as often as people read, with one degree Oechsle of error, up to 30 %
//! of the sugar. Nothing here says how the forecast does in a real cellar, whose ferments stick, are cooled, and end
//! elsewhere than expected; the end is given as it truly is.
//!
//! The figures in `clock.rs` and `speed.rs` were chosen on drawn ferments of the seeds 1 and 2. What is tested here are
//! other seeds, the reference trajectories, and beers, whose models had no part in the choice.

mod cellar;
mod figures;
mod kinetics;

use std::collections::BTreeMap;

use cellar::{Batch, Dice};
use figures::Figures;
use kinetics::{Change, Ferment, Model, Trajectory};

/// Never used while the forecast's figures were chosen; three others, which had been looked at between two versions,
/// were given up for these.
const TEST_SEEDS: [u64; 3] = [201, 202, 203];
/// Batches of one seed.
const BATCHES: usize = 200;

/// Sugar left by case, with the hours between two rows.
fn reference() -> BTreeMap<&'static str, (f64, Vec<f64>)> {
    let mut cases: BTreeMap<&str, (f64, Vec<f64>)> = BTreeMap::new();
    for row in rows(include_str!("../../../tests/reference/kinetics_sugar.csv")) {
        let (step_h, sugar) = cases.entry(row[0]).or_default();
        if sugar.len() == 1 {
            *step_h = row[1].parse().unwrap();
        }
        sugar.push(row[2].parse().unwrap());
    }
    cases
}

fn rows(table: &'static str) -> Vec<Vec<&'static str>> {
    let lines = table.lines().filter(|line| !line.starts_with('#'));
    lines.skip(1).map(|line| line.split(',').collect()).collect()
}

/// A row of the cases' table and the hours it runs.
fn ferment(row: &[&str]) -> (Ferment, f64) {
    let number = |column: usize| row[column].parse::<f64>().unwrap();
    let model = match row[1] {
        "coleman_a" => Model::ColemanFast,
        "coleman_b" => Model::ColemanSlow,
        "cramer" => Model::Cramer,
        other => panic!("{other}"),
    };
    let changes = row[8].split(';').filter(|change| !change.is_empty()).map(|change| {
        let (kind, rest) = change.split_once('@').unwrap();
        let (at_h, value) = rest.split_once('=').unwrap();
        let value = value.parse().unwrap();
        let change = if kind == "N" { Change::Feed(value) } else { Change::Degrees(value) };
        (at_h.parse().unwrap(), change)
    });
    let ferment = Ferment {
        model,
        degrees: number(2),
        nitrogen_mg_l: number(3),
        sugar_g_l: number(4),
        cells_g_l: number(5),
        changes: changes.collect(),
    };
    (ferment, number(6))
}

#[test]
fn the_models_are_solved_as_the_reference_trajectories_are() {
    let reference = reference();
    let cases = rows(include_str!("../../../tests/reference/kinetics_cases.csv"));
    assert_eq!(cases.len(), 18);
    for case in cases {
        let (ferment, end_h) = ferment(&case);
        let solved = ferment.run(end_h);
        let (step_h, sugar) = &reference[case[0]];
        for (row, left) in (0_u32..).zip(sugar) {
            let used = 1.0 - left / ferment.sugar_g_l;
            let ours = solved.at(f64::from(row) * step_h);
            assert!((ours - used).abs() < 1e-5, "{} row {row}: {ours} is not {used}", case[0]);
        }
    }
}

/// Twelve readings of each reference trajectory whose name starts so.
fn read_references(kind: char, seed: u64) -> Vec<Batch> {
    let mut dice = Dice::new(seed);
    let of_kind = reference().into_iter().filter(|(case, _)| case.starts_with(kind));
    let read = of_kind.flat_map(|(_, (step_h, sugar))| {
        let truth = Trajectory::of_sugar(step_h, &sugar);
        let tries = (0..200).filter_map(|_| Batch::read(truth.clone(), sugar[0], &mut dice));
        tries.take(12).collect::<Vec<_>>()
    });
    read.collect()
}

/// The three figures that the forecast is judged by.
fn meets_all_three(figures: &Figures) {
    let of_line = figures.error.mean / figures.line.mean;
    assert!(of_line <= 0.6, "{of_line} of the straight line's error");
    assert!(figures.error.median <= 0.6 * figures.line.median);
    for band in [&figures.half_held, &figures.later_held] {
        assert!((0.85..=0.95).contains(&band.share()), "the band holds {}", band.share());
    }
    assert!(figures.half_held_by_half_the_band.share() < 0.85, "a band too narrow is noticed");
    assert!(figures.called.of >= 100, "too few were called so");
    let late = figures.called.share();
    assert!((0.4..=0.6).contains(&late), "of those called 40 to 60 % late {late} are");
}

#[test]
fn drawn_ferments_are_forecast_as_well_as_the_band_says() {
    let batches: Vec<Batch> =
        TEST_SEEDS.into_iter().flat_map(|seed| cellar::batches(seed, BATCHES)).collect();
    let figures = Figures::of(&batches, 7);
    println!("{} drawn ferments: {figures}", batches.len());
    meets_all_three(&figures);
    for (seed, batches) in TEST_SEEDS.into_iter().zip(batches.chunks(BATCHES)) {
        let figures = Figures::of(batches, seed);
        println!("the {} of seed {seed}: {figures}", batches.len());
        let held = figures.half_held.share();
        assert!((0.85..=0.95).contains(&held), "of seed {seed} the band holds {held}");
    }
}

#[test]
fn the_reference_trajectories_are_forecast_as_well_as_the_band_says() {
    let batches = read_references('P', 11);
    assert_eq!(batches.len(), 18 * 12);
    let figures = Figures::of(&batches, 12);
    println!("{} readings of 18 reference trajectories: {figures}", batches.len());
    meets_all_three(&figures);
}

/// Beers grow their yeast for longer than the models that the clock was fitted on, so that they come EARLIER than
/// forecast: of those called 40 to 60 % late most are late. What still holds is asserted; that last figure is only
/// printed.
#[test]
fn beers_are_forecast_with_a_band_that_holds_but_too_slowly() {
    let batches = read_references('B', 13);
    assert_eq!(batches.len(), 5 * 12);
    let figures = Figures::of(&batches, 14);
    println!("{} readings of 5 beer trajectories: {figures}", batches.len());
    assert!(figures.error.mean <= 0.6 * figures.line.mean);
    assert!(figures.half_held.share() >= 0.85 && figures.later_held.share() >= 0.80);
}

/// Also early on, when readings hardly differ from one another, the next day falls into the band; the band is wide
/// then.
#[test]
fn the_next_day_falls_into_the_band_from_the_second_reading_on() {
    let mut held = figures::Share::default();
    for batch in cellar::batches(TEST_SEEDS[1], BATCHES) {
        for known in 2..=batch.readings.len() {
            let seen = &batch.readings[..known];
            let next_h = seen[known - 1].at_h + 24.0;
            let band = super::forecast(batch.span, seen, next_h).unwrap();
            held.count((band.low..=band.high).contains(&batch.truth.at(next_h)));
        }
    }
    println!(
        "a day after any but the first reading the band holds {:.3} of {}",
        held.share(),
        held.of
    );
    assert!(held.of > 800 && (0.85..=0.95).contains(&held.share()), "{held:?}");
}

/// Once growth is over the clock runs evenly, early and late.
#[test]
fn the_clock_runs_evenly_on_drawn_ferments() {
    let mut dice = Dice::new(TEST_SEEDS[0]);
    let mut speeds = Vec::new();
    for _ in 0..BATCHES {
        let ferment = Ferment { changes: Vec::new(), ..cellar::drawn(&mut dice) };
        let truth = ferment.run(480.0);
        let hours = [0.1, 0.2, 0.4, 0.6].map(|used| truth.hour_of(used));
        let [Some(tenth), Some(fifth), Some(two_fifths), Some(three_fifths)] = hours else {
            continue;
        };
        let clock = super::clock::clock;
        let early = (clock(0.2) - clock(0.1)) / (fifth - tenth);
        let late = (clock(0.6) - clock(0.4)) / (three_fifths - two_fifths);
        speeds.push(late / early);
    }
    let middle = figures::median(speeds);
    assert!((0.8..=1.25).contains(&middle), "{middle}");
}
