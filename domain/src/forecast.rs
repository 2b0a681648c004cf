//! How much of the fermentable sugar is used, and how much will be at a planned time.
//!
//! The fraction used is f = (OE − AE)/(OE − AE at the end), from apparent extracts. The end is the *expected* final
//! extract: a molasses wash that stops at SG 1.0155 is finished there, not at 1.000.
//!
//! # The curve
//! Everything runs on the clock of a typical ferment (`forecast/clock.rs`): slow while the yeast grows, then,
//! in z = 1 − √(1 − f), at a constant speed, which is a constant use of sugar early on that fades towards the expected
//! end and never passes it. The readings are first made monotone (sugar does not come back), then:
//!
//! - **after the last reading** the present speed of the clock is carried on. It comes from a filter whose speed
//!   wanders at random (the local linear trend of A. C. Harvey, *Forecasting, Structural Time Series Models and the
//!   Kalman Filter*, 1989), so late readings count most, readings close together count little, and those taken while
//!   the yeast still grows count little too;
//! - **between two readings** the clock goes evenly from one to the other;
//! - **before the first** all that is known is that less was used.
//!
//! # The band
//! 90 % of the judgement, made of: the error of the reading and of the original extract, enlarged if readings went
//! backwards; what growth still leaves open; the uncertainty of the speed, enlarged if it changed much lately; and how
//! far ahead the time lies. Uncertain progress is a factor, never negative.
//!
//! # What it does not promise
//! It knows no sticking, no feeding, no change of temperature to come. It takes the expected final extract as given: a
//! wrong one shifts everything, and the band does not allow for it. Sugar added after the original extract was taken
//! must be put into that extract by the caller. Its figures are fitted on simulated wine ferments and hold on others of
//! them (`forecast/calibration.rs` says how well); beers, simulated by other models, come earlier than forecast, though
//! mostly within the band. On real cellars it was never verified.

#[cfg(test)]
mod calibration;
mod clock;
mod monotone;
mod score;
mod speed;

#[cfg(test)]
mod tests;

use crate::densimetry::balling::{ApparentExtract, OriginalExtract};
use clock::{clock, growth_doubt, growth_left};
use score::share_below;
use speed::Speed;

/// Standard deviation of one gravity as a cellar takes it, with what scale, gas on the float and layers in the tank
/// add: one degree Oechsle, two marks of a scale divided into halves. A judgement of ours, not a measurement, and
/// unconfirmed: no published figure was found. The simulated cellar that the band is held against reads with this
/// error; the demo's readings had no part in it.
pub const READING_SD_SG: f64 = 0.001;
/// Degrees of extract per unit of gravity: the slope of the extract cubic at SG 1.04 (259 at 1.00, 230 at 1.07).
const EXTRACT_PER_GRAVITY: f64 = 241.4;

/// Normal score of the upper edge of a 90 % band.
const SCORE_90: f64 = 1.644_854;
/// Beyond this score lies less than one part in a million.
const LARGEST_SCORE: f64 = 5.0;

/// The smallest span that a hydrometer can follow at all, % mass: four times the reading error. A judgement of ours.
const SMALLEST_SPAN: f64 = 1.0;

/// Extract at the expected end in % mass; negative for a dry end.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct FinalExtract(pub f64);

/// The extracts between which the batch ferments.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SugarSpan {
    original: f64,
    width: f64,
}

/// The original extract is not far enough above the expected end.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[error(
    "the original extract {original} is not at least {SMALLEST_SPAN} % above the expected final extract {end}: check \
     both, the used sugar cannot be told from them"
)]
pub struct NoSpan {
    original: f64,
    end: f64,
}

impl SugarSpan {
    /// # Errors
    /// [`NoSpan`] if the two are less than 1 % of mass apart, exchanged or not numbers.
    pub fn new(original: OriginalExtract, end: FinalExtract) -> Result<Self, NoSpan> {
        let width = original.0 - end.0;
        if SMALLEST_SPAN <= width && width.is_finite() {
            Ok(Self { original: original.0, width })
        } else {
            Err(NoSpan { original: original.0, end: end.0 })
        }
    }

    /// Fraction of the fermentable sugar used: (OE − AE)/(OE − AE at the end). Slightly below 0 or above 1 by reading
    /// error.
    ///
    /// ```
    /// use domain::densimetry::balling::{ApparentExtract, OriginalExtract};
    /// use domain::forecast::{FinalExtract, SugarSpan};
    /// let wash = SugarSpan::new(OriginalExtract(16.71), FinalExtract(3.952))?;
    /// assert!((wash.fraction_used(ApparentExtract(10.33)) - 0.5).abs() < 0.001);
    /// # Ok::<(), domain::forecast::NoSpan>(())
    /// ```
    pub fn fraction_used(&self, apparent: ApparentExtract) -> f64 {
        (self.original - apparent.0) / self.width
    }

    /// The reading error as a fraction.
    fn reading_sd(&self) -> f64 {
        READING_SD_SG * EXTRACT_PER_GRAVITY / self.width
    }
}

/// One gravity reading, corrected for temperature.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Reading {
    /// Hours on any clock, the same for all readings and the target.
    pub at_h: f64,
    /// Apparent extract in % mass.
    pub extract: ApparentExtract,
}

/// What a forecast rests on.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum Basis {
    /// The time lies before the first reading.
    BeforeFirstReading,
    /// The time lies between two readings, or at one.
    BetweenReadings,
    /// The time lies ahead of the last of several readings. As long as they differ by less than their error there is no
    /// speed either.
    AheadOfReadings,
    /// There is one reading and no speed: the band is that of any fermentation.
    AheadOfOneReading,
}

/// The fraction of fermentable sugar used at one time, as a band.
#[derive(Clone, Debug, PartialEq)]
pub struct FractionForecast {
    /// Lower edge of the 90 % band.
    pub low: f64,
    /// Median.
    pub mid: f64,
    /// Upper edge of the 90 % band.
    pub high: f64,
    /// Standard deviation of a normal distribution with that band.
    pub sd: f64,
    /// What it rests on.
    pub basis: Basis,
    law: Law,
}

impl FractionForecast {
    fn new(basis: Basis, law: Law) -> Self {
        let (low, high) = (law.fraction(-SCORE_90), law.fraction(SCORE_90));
        let sd = (high - low) / (2.0 * SCORE_90);
        Self { low, mid: law.fraction(0.0), high, sd, basis, law }
    }

    /// The probability that more than `fraction` is used by then.
    pub fn probability_more_than(&self, fraction: f64) -> f64 {
        let (mut least, mut most) = (-LARGEST_SCORE, LARGEST_SCORE);
        if fraction < self.law.fraction(least) {
            return 1.0;
        }
        if self.law.fraction(most) <= fraction {
            return 0.0;
        }
        for _ in 0..60 {
            let middle = least.midpoint(most);
            if self.law.fraction(middle) <= fraction {
                least = middle;
            } else {
                most = middle;
            }
        }
        share_below(-most)
    }
}

/// A batch's readings, ready to be asked about any time.
#[derive(Clone, Debug, PartialEq)]
pub struct Course {
    points: Vec<Point>,
    /// Standard deviation of one reading's fraction.
    sd: f64,
    /// That of the original extract, as a fraction of the sugar.
    origin_sd: f64,
    speed: Speed,
}

/// A reading as fraction used.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Point {
    at_h: f64,
    fraction: f64,
}

impl Course {
    /// Reads a course from readings in any order; `None` without any. What is not a finite number is left out.
    pub fn fit(span: SugarSpan, readings: &[Reading]) -> Option<Self> {
        let raw = monotone::in_order(readings.iter().map(|reading| Point {
            at_h: reading.at_h,
            fraction: span.fraction_used(reading.extract),
        }));
        if raw.is_empty() {
            return None;
        }
        let points = monotone::never_falling(&raw);
        let sd = span.reading_sd().hypot(monotone::disagreement(&raw, &points));
        let speed = Speed::at_the_last(&points, sd);
        Some(Self { points, sd, origin_sd: span.reading_sd().min(1.0 / LARGEST_SCORE), speed })
    }

    /// The fraction used at a time on the readings' clock; `None` for a time that is not a number.
    pub fn at(&self, target_h: f64) -> Option<FractionForecast> {
        let (first, last) = (self.points.first()?, self.points.last()?);
        if !target_h.is_finite() {
            return None;
        }
        Some(if target_h < first.at_h {
            FractionForecast::new(
                Basis::BeforeFirstReading,
                Law::Before { first: self.level(first) },
            )
        } else if target_h <= last.at_h && self.points.len() > 1 {
            self.between(target_h)?
        } else {
            self.ahead(last, target_h - last.at_h)
        })
    }

    fn between(&self, target_h: f64) -> Option<FractionForecast> {
        let pair = self.points.windows(2).find(|pair| target_h <= pair[1].at_h)?;
        let gap_h = pair[1].at_h - pair[0].at_h;
        let (from, to) = (self.level(&pair[0]), self.level(&pair[1]));
        let law = Law::Between {
            share: (target_h - pair[0].at_h) / gap_h,
            bow: self.speed.bow(gap_h, to.clock(0.0) - from.clock(0.0)),
            from,
            to,
        };
        Some(FractionForecast::new(Basis::BetweenReadings, law))
    }

    fn ahead(&self, last: &Point, hours: f64) -> FractionForecast {
        let basis = match self.points.len() {
            1 => Basis::AheadOfOneReading,
            _ => Basis::AheadOfReadings,
        };
        let progress = self.speed.per_hour * hours;
        let law = Law::Ahead {
            last: self.level(last),
            growth: growth_doubt(last.fraction),
            skipped: self.speed.skipped(growth_left(last.fraction), progress),
            progress,
            doubt: self.speed.doubt(hours),
            together: self.speed.with_level,
        };
        FractionForecast::new(basis, law)
    }

    /// A reading with its own error and that of the original extract, which was read in the same way: an error e there
    /// shifts the fraction f by e (1 − f).
    fn level(&self, point: &Point) -> Level {
        let of_origin = self.origin_sd * (1.0 - point.fraction).clamp(0.0, 1.0);
        Level { fraction: point.fraction, sd: self.sd.hypot(of_origin) }
    }
}

/// The fraction used at `target_h`, from the readings; `None` without any reading.
pub fn forecast(span: SugarSpan, readings: &[Reading], target_h: f64) -> Option<FractionForecast> {
    Course::fit(span, readings)?.at(target_h)
}

/// One reading with its error.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Level {
    fraction: f64,
    sd: f64,
}

impl Level {
    /// The clock that a normal score stands for.
    fn clock(self, score: f64) -> f64 {
        clock(self.fraction + score * self.sd)
    }
}

/// A distribution of the clock, written as the clock that each normal score stands for. Every law rises with the score
/// and with time.
#[derive(Clone, Debug, PartialEq)]
enum Law {
    /// Anything from nothing to the first reading.
    Before { first: Level },
    /// From one reading to the next, along a line that bows within the step.
    Between { from: Level, to: Level, share: f64, bow: f64 },
    /// Beyond the last reading: its error, with the doubt of growth and what of growth may be over unseen, and a
    /// log-normal progress; `together` is their correlation, from 0 to 1.
    Ahead { last: Level, growth: f64, skipped: f64, progress: f64, doubt: f64, together: f64 },
}

impl Law {
    fn clock(&self, score: f64) -> f64 {
        match *self {
            Self::Before { first } => {
                let nothing = clock(0.0);
                nothing + (first.clock(score) - nothing) * share_below(score)
            }
            Self::Between { from, to, share, bow } => {
                let bent = share + (score * bow).clamp(-1.0, 1.0) * share * (1.0 - share);
                let (start, end) = (from.clock(score), to.clock(score));
                start + (end - start) * bent
            }
            Self::Ahead { last, growth, skipped, progress, doubt, together } => {
                let of_level = (last.clock(score) - last.clock(0.0)).hypot(score * growth);
                let of_level = of_level.hypot(score.max(0.0) * skipped);
                let of_progress = (progress * (score * doubt).exp_m1()).abs();
                let both = 2.0 * together * of_level * of_progress;
                let off = (of_level.powi(2) + both + of_progress.powi(2)).sqrt();
                last.clock(0.0) + progress + off.copysign(score)
            }
        }
    }

    /// The fraction that a normal score stands for, within 0 and 1.
    fn fraction(&self, score: f64) -> f64 {
        clock::fraction(self.clock(score))
    }
}
