//! The log's clock never goes back, unless an operator says in the book that it was ahead.

use domain::stamp::Micros;

use super::WriteError;

/// A step back of at most this repeats the last entry's time: clocks are disciplined by such steps.
const STEP_BACK: i64 = 2_000_000;

/// When the next entry is recorded, if the last was recorded at `last` and the clock shows `now`.
///
/// A correction itself repeats the last time; the entries after it go on from what it says.
pub(super) fn next(last: Micros, now: Micros, is_correction: bool) -> Result<Micros, WriteError> {
    if now.0 < last.0.saturating_sub(STEP_BACK) && !is_correction {
        let seconds = last.0.saturating_sub(now.0) / 1_000_000;
        return Err(WriteError::ClockBehind { seconds });
    }
    Ok(now.max(last))
}

#[cfg(test)]
mod tests {
    use super::*;

    const fn seconds(s: i64) -> Micros {
        Micros(s * 1_000_000)
    }

    #[test]
    fn a_small_step_back_repeats_the_last_time() {
        assert_eq!(next(seconds(100), seconds(101), false).unwrap(), seconds(101));
        assert_eq!(next(seconds(100), seconds(98), false).unwrap(), seconds(100));
    }

    #[test]
    fn a_larger_step_back_stops_writing_except_for_the_correction() {
        let refused = next(seconds(1_000), seconds(400), false);
        assert!(matches!(refused, Err(WriteError::ClockBehind { seconds: 600 })));
        assert_eq!(next(seconds(1_000), seconds(400), true).unwrap(), seconds(1_000));
    }
}
