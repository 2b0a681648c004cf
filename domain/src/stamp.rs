//! Times as the ledger writes them: microseconds, six digits, and for what happened on site the wall clock's offset.

use std::fmt;

use jiff::Timestamp;
use jiff::fmt::temporal::Pieces;
use jiff::tz::Offset;
use serde::{Deserialize, Deserializer, Serialize, Serializer};

/// A time that cannot be read.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
#[error("{0:?} is not a time with its offset, such as 2025-09-11T10:00:00-07:00")]
pub struct NotATime(String);

/// An instant in microseconds since 1970-01-01T00:00:00Z; written `…Z` with six digits.
#[derive(Clone, Copy, Debug, Default, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct Micros(pub i64);

impl Micros {
    /// Reads an RFC 3339 time; microseconds are the finest kept, the rest is cut off.
    ///
    /// # Errors
    /// [`NotATime`].
    pub fn parse(text: &str) -> Result<Self, NotATime> {
        Stamp::parse(text).map(|stamp| stamp.at)
    }

    /// This many hours later (or earlier, if negative).
    #[must_use]
    pub const fn plus_hours(self, hours: i64) -> Self {
        Self(self.0.saturating_add(hours.saturating_mul(3_600_000_000)))
    }

    /// This many minutes later (or earlier, if negative).
    #[must_use]
    pub const fn plus_minutes(self, minutes: i64) -> Self {
        Self(self.0.saturating_add(minutes.saturating_mul(60_000_000)))
    }

    /// Hours from `earlier` to this instant.
    pub fn hours_since(self, earlier: Self) -> f64 {
        #[expect(clippy::cast_precision_loss, reason = "a microsecond is lost after 285 years")]
        let micros = (self.0 - earlier.0) as f64;
        micros / 3.6e9
    }
}

impl fmt::Display for Micros {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let at = Timestamp::from_microsecond(self.0).map_err(|_| fmt::Error)?;
        write!(f, "{at:.6}")
    }
}

/// When something happened, with the offset of the wall clock it was read from.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub struct Stamp {
    /// The instant.
    pub at: Micros,
    /// Minutes east of Greenwich.
    pub offset_minutes: i16,
}

impl Stamp {
    /// Reads an RFC 3339 time, which must say its offset.
    ///
    /// # Errors
    /// [`NotATime`].
    pub fn parse(text: &str) -> Result<Self, NotATime> {
        let fail = || NotATime(text.chars().take(60).collect());
        if !text.is_ascii() || text.contains('[') || !text.contains(['T', 't']) {
            return Err(fail());
        }
        let at: Timestamp = text.parse().map_err(|_| fail())?;
        let pieces = Pieces::parse(text).map_err(|_| fail())?;
        let offset = pieces.to_numeric_offset().ok_or_else(fail)?;
        if offset.seconds() % 60 != 0 {
            return Err(fail());
        }
        let offset_minutes = i16::try_from(offset.seconds() / 60).map_err(|_| fail())?;
        Ok(Self { at: Micros(at.as_microsecond()), offset_minutes })
    }

    /// The instant on the wall clock of an IANA time zone; UTC if there is no such zone.
    pub fn in_zone(at: Micros, zone: &str) -> Self {
        let offset_minutes = jiff::tz::TimeZone::get(zone)
            .ok()
            .zip(Timestamp::from_microsecond(at.0).ok())
            .and_then(|(zone, at)| i16::try_from(zone.to_offset(at).seconds() / 60).ok())
            .unwrap_or(0);
        Self { at, offset_minutes }
    }

    /// Local day and minute, for sentences: `2025-09-15 08:00`.
    pub fn minute(&self) -> String {
        self.to_string().chars().take(16).map(|c| if c == 'T' { ' ' } else { c }).collect()
    }

    /// The instant on a wall clock that far from Greenwich.
    pub const fn new(at: Micros, offset_minutes: i16) -> Self {
        Self { at, offset_minutes }
    }
}

impl fmt::Display for Stamp {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let at = Timestamp::from_microsecond(self.at.0).map_err(|_| fmt::Error)?;
        let offset =
            Offset::from_seconds(i32::from(self.offset_minutes) * 60).map_err(|_| fmt::Error)?;
        let local = offset.to_datetime(at);
        let (sign, minutes) = if self.offset_minutes < 0 {
            ('-', -self.offset_minutes)
        } else {
            ('+', self.offset_minutes)
        };
        write!(f, "{local:.6}{sign}{:02}:{:02}", minutes / 60, minutes % 60)
    }
}

macro_rules! as_text {
    ($name:ident) => {
        impl Serialize for $name {
            fn serialize<S: Serializer>(&self, serializer: S) -> Result<S::Ok, S::Error> {
                serializer.collect_str(self)
            }
        }
        impl<'de> Deserialize<'de> for $name {
            fn deserialize<D: Deserializer<'de>>(deserializer: D) -> Result<Self, D::Error> {
                let text = std::borrow::Cow::<'_, str>::deserialize(deserializer)?;
                Self::parse(&text).map_err(serde::de::Error::custom)
            }
        }
    };
}
as_text!(Micros);
as_text!(Stamp);

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_stamp_keeps_its_offset_and_has_six_digits() {
        let stamp = Stamp::parse("2025-09-11T10:00:00-07:00").unwrap();
        assert_eq!(stamp.to_string(), "2025-09-11T10:00:00.000000-07:00");
        assert_eq!(stamp.at.to_string(), "2025-09-11T17:00:00.000000Z");
        assert_eq!(Stamp::parse(&stamp.to_string()).unwrap(), stamp);
        assert_eq!(
            Stamp::parse("2025-09-11T10:00:00Z").unwrap().to_string(),
            "2025-09-11T10:00:00.000000+00:00"
        );
        assert_eq!(
            Stamp::parse("2025-09-11T10:00:00.5+05:45").unwrap().to_string(),
            "2025-09-11T10:00:00.500000+05:45"
        );
    }

    #[test]
    fn a_time_without_offset_is_refused() {
        for text in
            ["2025-09-11T10:00:00", "2025-09-11", "10:00", "", "2025-13-01T00:00:00Z", "yesterday"]
        {
            assert!(Stamp::parse(text).is_err(), "{text:?}");
        }
    }
}
