//! A simulated cellar: draws ferments, reads their gravity as people do, with error.

use super::kinetics::{Change, Ferment, Model, Trajectory};
use crate::densimetry::balling::{ApparentExtract, OriginalExtract};
use crate::densimetry::{SpecificGravity, extract};
use crate::forecast::{FinalExtract, Reading, SugarSpan};

/// Standard deviation of a simulated gravity: one degree Oechsle.
const NOISE_SG: f64 = 0.001;
/// The mark of the scale to which a gravity is read.
const MARK_SG: f64 = 0.0005;
/// Readings are taken until so much of the sugar is truly used.
const READ_TO: f64 = 0.30;

/// Numbers that look drawn and are the same in every run: splitmix64 (Steele, Lea and Flood, OOPSLA 2014).
#[derive(Clone, Debug)]
pub(super) struct Dice(u64);

impl Dice {
    pub(super) const fn new(seed: u64) -> Self {
        Self(seed)
    }

    fn next(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut mixed = self.0;
        mixed = (mixed ^ (mixed >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        mixed = (mixed ^ (mixed >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        mixed ^ (mixed >> 31)
    }

    /// Evenly from 0 up to 1.
    fn part(&mut self) -> f64 {
        let high = u32::try_from(self.next() >> 32).unwrap();
        f64::from(high) / 2.0_f64.powi(32)
    }

    /// Evenly between two numbers.
    pub(super) fn between(&mut self, low: f64, high: f64) -> f64 {
        low + (high - low) * self.part()
    }

    fn chance(&mut self, probability: f64) -> bool {
        self.part() < probability
    }

    /// Standard normal (Box and Muller).
    fn normal(&mut self) -> f64 {
        let radius = (-2.0 * (1.0 - self.part()).ln()).sqrt();
        radius * (std::f64::consts::TAU * self.part()).cos()
    }
}

/// A simulated batch with the readings of its first part.
#[derive(Clone, Debug)]
pub(super) struct Batch {
    pub(super) truth: Trajectory,
    pub(super) span: SugarSpan,
    pub(super) readings: Vec<Reading>,
    /// When half the sugar is truly used, hours since pitching.
    pub(super) half_h: f64,
}

impl Batch {
    /// Reads a ferment; `None` if fewer than three readings fall into its first part, or half is never used.
    ///
    /// The expected end is the true one. The original extract is the first reading with its error, as in the book. 10 g
    /// of sugar in a litre are one degree of apparent extract, and dry is 0.09 of the original below nothing: both as
    /// in the demo's must (246 g/L from 22.46 to −2.09).
    pub(super) fn read(truth: Trajectory, sugar_g_l: f64, dice: &mut Dice) -> Option<Self> {
        let width = sugar_g_l / 10.0;
        let original = width / 1.09;
        let mut readings: Vec<Reading> = Vec::new();
        for at_h in hours_read(dice) {
            let used = truth.at(at_h);
            if READ_TO < used {
                break;
            }
            let extract = ApparentExtract(hydrometer(original - used * width, dice));
            readings.push(Reading { at_h, extract });
        }
        let half_h = truth.hour_of(0.5)?;
        if readings.len() < 3 {
            return None;
        }
        let first = OriginalExtract(readings[0].extract.0);
        let span = SugarSpan::new(first, FinalExtract(original - width)).ok()?;
        Some(Self { truth, span, readings, half_h })
    }

    /// The hour of the last reading.
    pub(super) fn last_h(&self) -> f64 {
        self.readings.last().unwrap().at_h
    }
}

/// What a hydrometer shows of a true extract, as extract again.
fn hydrometer(extract_true: f64, dice: &mut Dice) -> f64 {
    let gravity = extract::gravity_of_brix(extract_true).unwrap().get() + NOISE_SG * dice.normal();
    let read = (gravity / MARK_SG).round() * MARK_SG;
    extract::brix(SpecificGravity::new(read).unwrap())
}

/// Hours since pitching at which a cellar reads: at pitching, then once, twice or three times a day give or take half
/// an hour, one in twelve forgotten.
fn hours_read(dice: &mut Dice) -> Vec<f64> {
    const ROUNDS: [&[f64]; 3] = [&[8.0], &[8.0, 17.0], &[7.0, 13.0, 19.0]];
    let pitched = dice.between(8.0, 18.0);
    let rounds = match dice.between(0.0, 3.0) {
        once if once < 1.0 => ROUNDS[0],
        twice if twice < 2.0 => ROUNDS[1],
        _ => ROUNDS[2],
    };
    let mut hours = vec![0.0];
    for day in 0_u32..40 {
        for round in rounds {
            let at_h = 24.0 * f64::from(day) + round + dice.between(-0.5, 0.5) - pitched;
            if at_h > 2.0 && !dice.chance(1.0 / 12.0) {
                hours.push(at_h);
            }
        }
    }
    hours
}

/// A ferment drawn within the range to which the models were fitted or in which the references were computed: 12 to 30
/// °C, 200 to 300 g/L sugar, 80 to 330 mg N/L, 1 to 6 million cells in a millilitre. One in four is fed, one in four
/// changes its temperature by up to 4 K, in the first five days.
pub(super) fn drawn(dice: &mut Dice) -> Ferment {
    let model = match dice.between(0.0, 3.0) {
        fast if fast < 1.0 => Model::ColemanFast,
        slow if slow < 2.0 => Model::ColemanSlow,
        _ => Model::Cramer,
    };
    let degrees = dice.between(12.0, 30.0);
    let mut changes = Vec::new();
    if dice.chance(0.25) {
        changes.push((dice.between(24.0, 120.0), Change::Feed(dice.between(20.0, 60.0))));
    }
    if dice.chance(0.25) {
        let warmer = degrees + dice.between(-4.0, 4.0);
        changes.push((dice.between(24.0, 120.0), Change::Degrees(warmer)));
    }
    changes.sort_by(|a, b| a.0.total_cmp(&b.0));
    Ferment {
        model,
        degrees,
        nitrogen_mg_l: dice.between(80.0, 330.0),
        sugar_g_l: dice.between(200.0, 300.0),
        cells_g_l: dice.between(0.04, 0.25),
        changes,
    }
}

/// So many batches, drawn and read.
pub(super) fn batches(seed: u64, count: usize) -> Vec<Batch> {
    let mut dice = Dice::new(seed);
    let mut batches = Vec::with_capacity(count);
    while batches.len() < count {
        let ferment = drawn(&mut dice);
        let truth = ferment.run(480.0);
        batches.extend(Batch::read(truth, ferment.sugar_g_l, &mut dice));
    }
    batches
}
