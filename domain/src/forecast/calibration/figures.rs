//! What a set of simulated batches says of the forecast.

use std::fmt;

use super::cellar::{Batch, Dice};
use crate::forecast::{Course, FractionForecast};

/// A straight line that does not get to half within so many times the true hours counts as if it did then.
const WORST_LINE: f64 = 10.0;
/// Proposals made on one batch.
const PROPOSALS: usize = 40;

/// How many of how many.
#[derive(Clone, Copy, Debug, Default)]
pub(super) struct Share {
    pub(super) held: u32,
    pub(super) of: u32,
}

impl Share {
    pub(super) fn count(&mut self, held: bool) {
        self.held += u32::from(held);
        self.of += 1;
    }

    pub(super) fn share(self) -> f64 {
        f64::from(self.held) / f64::from(self.of)
    }
}

/// Errors of a time, hours.
#[derive(Clone, Copy, Debug)]
pub(super) struct Error {
    pub(super) mean: f64,
    pub(super) median: f64,
}

impl Error {
    fn of(errors: Vec<f64>) -> Self {
        let count = u32::try_from(errors.len()).unwrap();
        let mean = errors.iter().sum::<f64>() / f64::from(count);
        Self { mean, median: median(errors) }
    }
}

/// The middle one.
pub(super) fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    values[values.len() / 2]
}

#[derive(Clone, Debug)]
pub(super) struct Figures {
    /// Of the forecast's half-sugar time.
    pub(super) error: Error,
    /// Of that of the straight line through all readings (least squares).
    pub(super) line: Error,
    /// Of that of the straight line through the last two.
    last_two: Error,
    /// Whether at the true half-sugar time the band holds one half.
    pub(super) half_held: Share,
    /// The same of a band half as wide.
    pub(super) half_held_by_half_the_band: Share,
    /// Whether 6 to 36 hours after the last reading the band holds the truth.
    pub(super) later_held: Share,
    /// Of the proposals called 40 to 60 % late, those that are.
    pub(super) called: Share,
}

impl Figures {
    pub(super) fn of(batches: &[Batch], seed: u64) -> Self {
        let mut dice = Dice::new(seed);
        let (mut errors, mut line, mut last_two) = (Vec::new(), Vec::new(), Vec::new());
        let [mut half, mut narrow, mut later, mut called] = [Share::default(); 4];
        for batch in batches {
            let course = Course::fit(batch.span, &batch.readings).unwrap();
            errors.push((half_of(&course, batch) - batch.half_h).abs());
            line.push((line_through(batch, batch.readings.len()) - batch.half_h).abs());
            last_two.push((line_through(batch, 2) - batch.half_h).abs());

            let at_half = course.at(batch.half_h).unwrap();
            half.count((at_half.low..=at_half.high).contains(&0.5));
            narrow.count(
                (at_half.low.midpoint(at_half.mid)..=at_half.mid.midpoint(at_half.high))
                    .contains(&0.5),
            );

            let last_h = batch.last_h();
            let next_h = last_h + dice.between(6.0, 36.0);
            let seen: FractionForecast = course.at(next_h).unwrap();
            later.count((seen.low..=seen.high).contains(&batch.truth.at(next_h)));

            for _ in 0..PROPOSALS {
                let ahead_h = dice.between(0.0, 2.0 * (batch.half_h - last_h) + 24.0);
                let planned = course.at(last_h + ahead_h).unwrap();
                if (0.4..=0.6).contains(&planned.probability_more_than(0.5)) {
                    called.count(batch.half_h < last_h + ahead_h);
                }
            }
        }
        Self {
            error: Error::of(errors),
            line: Error::of(line),
            last_two: Error::of(last_two),
            half_held: half,
            half_held_by_half_the_band: narrow,
            later_held: later,
            called,
        }
    }
}

impl fmt::Display for Figures {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let percent = |share: Share| 100.0 * share.share();
        writeln!(f)?;
        writeln!(
            f,
            "  half-sugar time: mean error {:.1} h (median {:.1}), straight line {:.1} h ({:.1}): {:.0} %; line through the last \
             two {:.1} h ({:.1})",
            self.error.mean,
            self.error.median,
            self.line.mean,
            self.line.median,
            100.0 * self.error.mean / self.line.mean,
            self.last_two.mean,
            self.last_two.median,
        )?;
        writeln!(
            f,
            "  90 % band: holds the half-sugar time of {:.1} %, the sugar 6 to 36 h on of {:.1} %",
            percent(self.half_held),
            percent(self.later_held),
        )?;
        write!(
            f,
            "  called 40 to 60 % late: {}, truly late {:.1} %",
            self.called.of,
            percent(self.called)
        )
    }
}

/// The hour at which the forecast's middle is one half.
fn half_of(course: &Course, batch: &Batch) -> f64 {
    let (mut early, mut late) = (batch.last_h(), WORST_LINE * batch.half_h);
    for _ in 0..50 {
        let middle = early.midpoint(late);
        if course.at(middle).unwrap().mid < 0.5 { early = middle } else { late = middle }
    }
    early.midpoint(late)
}

/// The hour at which the straight line through the last so many readings is at one half.
fn line_through(batch: &Batch, last: usize) -> f64 {
    let readings = &batch.readings[batch.readings.len() - last..];
    let count = f64::from(u32::try_from(last).unwrap());
    let used = |at: usize| batch.span.fraction_used(readings[at].extract);
    let hour = readings.iter().map(|reading| reading.at_h).sum::<f64>() / count;
    let height = (0..last).map(used).sum::<f64>() / count;
    let (mut both, mut square) = (0.0, 0.0);
    for (at, reading) in readings.iter().enumerate() {
        both += (reading.at_h - hour) * (used(at) - height);
        square += (reading.at_h - hour).powi(2);
    }
    let worst = WORST_LINE * batch.half_h;
    if both <= 0.0 { worst } else { (hour + (0.5 - height) * square / both).min(worst) }
}
