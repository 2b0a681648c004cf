//! Days as a duty to record counts them: on the wall clock of the place, without week-ends and holidays.

use jiff::civil::{Date, Weekday};
use jiff::tz::Offset;
use jiff::{Timestamp, ToSpan};

use crate::stamp::Stamp;

/// The day of an event where it happened; `None` outside the years that calendars know.
pub fn local_day(stamp: Stamp) -> Option<Date> {
    let offset = Offset::from_seconds(i32::from(stamp.offset_minutes) * 60).ok()?;
    let at = Timestamp::from_microsecond(stamp.at.0).ok()?;
    Some(offset.to_datetime(at).date())
}

/// So many business days later; a day that is none counts nothing.
pub fn business_days_after(day: Date, days: u32, holidays: &[Date]) -> Option<Date> {
    let mut day = day;
    for _ in 0..days {
        day = day.checked_add(1.day()).ok()?;
        while !is_business_day(day, holidays) {
            day = day.checked_add(1.day()).ok()?;
        }
    }
    Some(day)
}

fn is_business_day(day: Date, holidays: &[Date]) -> bool {
    !matches!(day.weekday(), Weekday::Saturday | Weekday::Sunday) && !holidays.contains(&day)
}

#[cfg(test)]
mod tests {
    use jiff::civil::date;

    use super::*;

    #[test]
    fn an_event_belongs_to_the_day_of_its_own_wall_clock() {
        let stamp = |text: &str| Stamp::parse(text).unwrap();
        assert_eq!(local_day(stamp("2025-09-11T23:30:00-07:00")), Some(date(2025, 9, 11)));
        assert_eq!(local_day(stamp("2025-09-12T06:30:00Z")), Some(date(2025, 9, 12)));
    }

    /// 2025-09-12 is a Friday; 2025-09-15 is taken as a holiday.
    #[test]
    fn week_ends_and_holidays_do_not_count() {
        let friday = date(2025, 9, 12);
        assert_eq!(business_days_after(friday, 0, &[]), Some(friday));
        assert_eq!(business_days_after(friday, 1, &[]), Some(date(2025, 9, 15)));
        assert_eq!(business_days_after(friday, 1, &[date(2025, 9, 15)]), Some(date(2025, 9, 16)));
        assert_eq!(business_days_after(date(2025, 9, 13), 1, &[]), Some(date(2025, 9, 15)));
        assert_eq!(business_days_after(friday, 3, &[]), Some(date(2025, 9, 17)));
    }
}
