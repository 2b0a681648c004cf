//! The one place where time comes from.
//!
//! A book founded as a simulation runs on a driven clock, every other book on the system's. What this does not
//! promise: that two readings differ, or that the system's clock never steps back; the writer guards against that.

use std::sync::Arc;
use std::sync::atomic::{AtomicI64, Ordering};
use std::time::{SystemTime, UNIX_EPOCH};

use domain::stamp::Micros;

/// Where the time comes from. Clones of a simulated clock share one time.
#[derive(Clone, Debug)]
pub enum Clock {
    /// The machine's clock.
    System,
    /// A clock that stands still until it is set, in microseconds since 1970.
    Simulated(Arc<AtomicI64>),
}

/// Why a clock was not set.
#[derive(Clone, Copy, Debug, Eq, PartialEq, thiserror::Error)]
pub enum ClockError {
    /// Only a simulation's clock can be set.
    #[error("this book runs on the machine's clock; only the clock of a simulation can be set")]
    NotSimulated,
    /// A recorded time is never earlier than the one before it.
    #[error("the simulated clock only moves forward: it stands at {now}")]
    Backwards {
        /// What it shows.
        now: Micros,
    },
}

impl Clock {
    /// A simulated clock that starts at `at`.
    pub fn simulated(at: Micros) -> Self {
        Self::Simulated(Arc::new(AtomicI64::new(at.0)))
    }

    /// The time now. Reading does not advance a simulated clock.
    pub fn now(&self) -> Micros {
        match self {
            Self::System => system_now(),
            Self::Simulated(at) => Micros(at.load(Ordering::SeqCst)),
        }
    }

    /// Whether it is driven by hand.
    pub const fn is_simulated(&self) -> bool {
        matches!(self, Self::Simulated(_))
    }

    /// Moves a simulated clock forward to `to`; setting it to the time it shows is allowed.
    ///
    /// # Errors
    /// [`ClockError::NotSimulated`], or [`ClockError::Backwards`] with the time it keeps.
    pub fn set(&self, to: Micros) -> Result<(), ClockError> {
        let Self::Simulated(at) = self else {
            return Err(ClockError::NotSimulated);
        };
        let before = at.fetch_max(to.0, Ordering::SeqCst);
        if before <= to.0 { Ok(()) } else { Err(ClockError::Backwards { now: Micros(before) }) }
    }
}

/// A machine whose clock stands before 1970 gets negative microseconds, which nothing downstream accepts.
#[expect(clippy::disallowed_methods, reason = "this is the clock that everything else asks")]
fn system_now() -> Micros {
    let micros = |span: std::time::Duration| i64::try_from(span.as_micros()).unwrap_or(i64::MAX);
    Micros(match SystemTime::now().duration_since(UNIX_EPOCH) {
        Ok(since) => micros(since),
        Err(before) => -micros(before.duration()),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_simulated_clock_stands_still_until_it_is_set_and_then_only_goes_forward() {
        let clock = Clock::simulated(Micros(1_000));
        let shared = clock.clone();
        assert_eq!((clock.now(), clock.now()), (Micros(1_000), Micros(1_000)));
        shared.set(Micros(5_000)).unwrap();
        assert_eq!(clock.now(), Micros(5_000));
        assert_eq!(clock.set(Micros(5_000)), Ok(()));
        assert_eq!(clock.set(Micros(4_999)), Err(ClockError::Backwards { now: Micros(5_000) }));
        assert_eq!(clock.now(), Micros(5_000));
    }

    #[test]
    fn the_system_clock_cannot_be_set_and_shows_this_century() {
        let start_of_2025 = Micros(1_735_689_600_000_000);
        assert!(Clock::System.now() > start_of_2025);
        assert_eq!(Clock::System.set(Micros(0)), Err(ClockError::NotSimulated));
    }
}
