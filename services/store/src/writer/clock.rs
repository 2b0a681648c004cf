//! The log's clock never goes back.

use domain::stamp::Micros;

use super::WriteError;

/// A step back of at most this repeats the last entry's time: clocks are disciplined by such steps.
const STEP_BACK: i64 = 2_000_000;

/// What the head says about time.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub(super) struct Clock {
    /// When the last entry was recorded.
    pub(super) last: Micros,
    /// The clock's time when it was declared right although it was behind `last`.
    pub(super) corrected: Option<Micros>,
}

impl Clock {
    /// When the next entry is recorded, if the clock shows `now`.
    ///
    /// After a correction the last time is repeated until the clock has caught up, so that entries stay in order.
    pub(super) fn next(&self, now: Micros, is_correction: bool) -> Result<Micros, WriteError> {
        let floor = self.corrected.unwrap_or(self.last);
        if now.0 < floor.0.saturating_sub(STEP_BACK) && !is_correction {
            let seconds = floor.0.saturating_sub(now.0) / 1_000_000;
            return Err(WriteError::ClockBehind { seconds });
        }
        Ok(now.max(self.last))
    }

    /// The clock after an entry was recorded while it showed `now`.
    pub(super) fn after(self, now: Micros, recorded: Micros, was_correction: bool) -> Self {
        let corrected = if was_correction { Some(now) } else { self.corrected };
        Self { last: recorded, corrected: corrected.filter(|_| now < recorded) }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const fn seconds(s: i64) -> Micros {
        Micros(s * 1_000_000)
    }

    #[test]
    fn a_small_step_back_repeats_the_last_time() {
        let clock = Clock { last: seconds(100), corrected: None };
        assert_eq!(clock.next(seconds(101), false).unwrap(), seconds(101));
        assert_eq!(clock.next(seconds(98), false).unwrap(), seconds(100));
    }

    #[test]
    fn a_larger_step_back_stops_writing_until_the_clock_is_declared_right() {
        let clock = Clock { last: seconds(1000), corrected: None };
        let refused = clock.next(seconds(400), false);
        assert!(matches!(refused, Err(WriteError::ClockBehind { seconds: 600 })));

        let recorded = clock.next(seconds(400), true).unwrap();
        assert_eq!(recorded, seconds(1000));
        let corrected = clock.after(seconds(400), recorded, true);
        assert_eq!(corrected.next(seconds(401), false).unwrap(), seconds(1000));
        assert!(corrected.next(seconds(300), false).is_err(), "it went back once more");

        let caught_up = corrected.after(seconds(1001), seconds(1001), false);
        assert_eq!(caught_up, Clock { last: seconds(1001), corrected: None });
    }
}
