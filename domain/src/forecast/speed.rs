//! The speed of a fermentation at its last reading, and how well it is known.

use super::clock::{clock, growth_doubt};
use super::{Point, SCORE_90};

/// Speed of the clock per hour where nothing is known: 0.05 a day, which ends in three weeks. With [`MOST_DOUBT`] the
/// 90 % band spans 0.01 to 0.26 a day, from a slow mead to a hot molasses wash. A judgement of ours.
const UNKNOWN_PER_HOUR: f64 = 0.05 / 24.0;
/// The slowest mean speed believed, per hour: 0.01 a day would take over three months. It keeps a batch in its lag
/// from being called still for ever.
const SLOWEST_PER_HOUR: f64 = 0.01 / 24.0;
/// A batch that seems to stand is still given this part of its mean speed.
const LEAST_PART: f64 = 0.1;
/// The most that a speed may be in doubt, as the natural logarithm of a factor per standard deviation.
const MOST_DOUBT: f64 = 1.0;

/// Readings tell a speed once they differ by so many times their error; before, they say no more than one of them.
const SEEN: f64 = 2.0;
/// How far the speed wanders where nothing is seen of it: by so much of its square over the whole span of the readings,
/// a factor of e^±0.12. Fitted as `clock.rs` says, with one simulated ferment in four changing its temperature by up to
/// 4 K.
const WANDER_UNSEEN: f64 = 0.015;

/// Speed of the clock, with its doubt as a logarithm.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Speed {
    /// Whether readings tell it.
    known: bool,
    /// Clock per hour, above zero.
    pub(super) per_hour: f64,
    /// Standard deviation of its logarithm now.
    doubt_now: f64,
    /// Correlation of its error with that of the last reading, from 0 to 1: what reads too far makes it too fast as
    /// well.
    pub(super) with_level: f64,
    /// Variance by which the speed itself wanders, clock² per h³.
    wander: f64,
}

impl Speed {
    const UNKNOWN: Self = Self {
        known: false,
        per_hour: UNKNOWN_PER_HOUR,
        doubt_now: MOST_DOUBT,
        with_level: 0.0,
        wander: 0.0,
    };

    /// What of the growth left on the clock may be over without having been read, for a speed that is not known: all of
    /// it, but no more than the upper edge of the 90 % band of the speed gets through by then.
    pub(super) fn skipped(&self, growth_left: f64, progress: f64) -> f64 {
        if self.known { 0.0 } else { growth_left.min(progress * (SCORE_90 * MOST_DOUBT).exp()) }
    }

    /// From monotone points, of which there is at least one; `sd` is the error of one fraction.
    pub(super) fn at_the_last(points: &[Point], sd: f64) -> Self {
        let [first, .., last] = points else {
            return Self::UNKNOWN;
        };
        if last.fraction - first.fraction < SEEN * sd {
            return Self::UNKNOWN;
        }
        let span_h = last.at_h - first.at_h;
        let mean = ((clock(last.fraction) - clock(first.fraction)) / span_h).max(SLOWEST_PER_HOUR);
        let measured: Vec<Measured> =
            points.iter().map(|point| Measured::from(*point, sd)).collect();
        let wander = wander(&measured, mean, span_h);
        let trend = Trend::through(&measured, mean, wander);
        let per_hour = trend.speed.max(LEAST_PART * mean);
        let relative_variance = trend.speed_variance / per_hour.powi(2);
        let doubt_now = relative_variance.ln_1p().sqrt().min(MOST_DOUBT);
        let with_level = trend.covariance / (trend.level_variance * trend.speed_variance).sqrt();
        Self { known: true, per_hour, doubt_now, with_level: with_level.clamp(0.0, 1.0), wander }
    }

    /// Standard deviation of the logarithm of the progress made in `hours`.
    ///
    /// A wandering speed adds the variance q h³/3 to the progress v h. The part it adds here, s/(1 + s) with
    /// s = q h/(3 v²), is that for small s and stays below 1, so that progress never shrinks as hours go by.
    pub(super) fn doubt(&self, hours: f64) -> f64 {
        let added = self.wander * hours / (3.0 * self.per_hour.powi(2));
        self.doubt_now.hypot((added / (1.0 + added)).sqrt())
    }

    /// How far the course between two readings bows off the straight line, per unit of `rise` and standard deviation.
    ///
    /// A wandering speed held at both ends has the variance q g³ w² (1 − w)²/3 at the part w of the gap g.
    pub(super) fn bow(&self, gap_h: f64, rise: f64) -> f64 {
        if rise > 0.0 { (self.wander * gap_h.powi(3) / 3.0).sqrt() / rise } else { 0.0 }
    }
}

/// A reading as clock with its variance.
#[derive(Clone, Copy)]
struct Measured {
    at_h: f64,
    level: f64,
    variance: f64,
}

impl Measured {
    /// The reading error is half the clock between the reading with it and without, so that it stays finite at both
    /// ends.
    fn from(point: Point, sd: f64) -> Self {
        let used = point.fraction.min(1.0);
        let of_reading = 0.5 * (clock(used + sd) - clock(used - sd));
        let variance = of_reading.powi(2) + growth_doubt(point.fraction).powi(2);
        Self { at_h: point.at_h, level: clock(point.fraction), variance }
    }
}

/// The variance per hour by which the speed wanders.
///
/// Without evidence, [`WANDER_UNSEEN`] of the square of the mean speed over the whole span. Evidence is each change
/// from one interval's speed to the next, less what reading error explains; a change that is mostly reading error
/// counts little.
fn wander(measured: &[Measured], mean: f64, span_h: f64) -> f64 {
    let (mut changed, mut hours) = (WANDER_UNSEEN * mean.powi(2), span_h);
    for three in measured.windows(3) {
        let (before_h, after_h) = (three[1].at_h - three[0].at_h, three[2].at_h - three[1].at_h);
        let before = (three[1].level - three[0].level) / before_h;
        let after = (three[2].level - three[1].level) / after_h;
        let noise = three[0].variance / before_h.powi(2)
            + three[1].variance * (1.0 / before_h + 1.0 / after_h).powi(2)
            + three[2].variance / after_h.powi(2);
        let weight = mean.powi(2) / (mean.powi(2) + noise);
        changed += weight * ((after - before).powi(2) - noise).max(0.0);
        hours += weight * before_h.midpoint(after_h);
    }
    changed / hours
}

/// The state of the local linear trend: the clock and its speed, with their covariance.
struct Trend {
    level: f64,
    speed: f64,
    level_variance: f64,
    covariance: f64,
    speed_variance: f64,
}

impl Trend {
    /// Filters the readings in order, starting from the mean speed give or take itself.
    fn through(measured: &[Measured], mean: f64, wander: f64) -> Self {
        let mut trend = Self {
            level: measured[0].level,
            speed: mean,
            level_variance: measured[0].variance,
            covariance: 0.0,
            speed_variance: mean.powi(2),
        };
        for pair in measured.windows(2) {
            trend.pass(pair[1].at_h - pair[0].at_h, wander);
            trend.learn(pair[1]);
        }
        trend
    }

    /// Lets time pass.
    fn pass(&mut self, hours: f64, wander: f64) {
        self.level += self.speed * hours;
        self.level_variance += hours * (2.0 * self.covariance + hours * self.speed_variance)
            + wander * hours.powi(3) / 3.0;
        self.covariance += hours * self.speed_variance + wander * hours.powi(2) / 2.0;
        self.speed_variance += wander * hours;
    }

    /// Takes a reading in.
    fn learn(&mut self, reading: Measured) {
        let surprise = reading.level - self.level;
        let variance = self.level_variance + reading.variance;
        let (level_gain, speed_gain) = (self.level_variance / variance, self.covariance / variance);
        self.level += level_gain * surprise;
        self.speed += speed_gain * surprise;
        self.speed_variance -= speed_gain * self.covariance;
        self.covariance *= 1.0 - level_gain;
        self.level_variance *= 1.0 - level_gain;
    }
}
