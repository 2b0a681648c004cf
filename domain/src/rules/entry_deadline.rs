//! Until when an event is to be entered in the record.

use jiff::civil::Date;
use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::{Finding, Verdict};
use crate::stamp::Stamp;

use super::Source;
use super::calendar::{business_days_after, local_day};
use super::rows::Rows;

/// The last day for an entry.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct EntryDeadline {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// The events, by the kind of their entry, such as `addition.recorded`; or `any`.
    pub events: Vec<String>,
    /// Business days after the day of the event; 0 is the day itself.
    pub business_days: u32,
    /// The same, where a complete source record was made at the time.
    #[serde(default)]
    pub with_source_record: Option<u32>,
    /// What a late entry means.
    pub verdict: Verdict,
    /// Where it comes from.
    pub source: Source,
}

/// An event and when it was entered.
#[derive(Clone, Copy, Debug)]
pub struct Entered<'a> {
    /// The kind of the entry.
    pub event: &'a str,
    /// When it happened, on the wall clock of the place.
    pub occurred: Stamp,
    /// When it was entered, on the same wall clock.
    pub entered: Stamp,
    /// A complete record was made at the time, from which it was posted.
    pub has_source_record: bool,
}

impl EntryDeadline {
    /// The last day on which such an event may still be entered; `None` if the rule is not about it.
    pub fn last_day(&self, entered: &Entered<'_>, holidays: &[Date]) -> Option<Date> {
        if !self.events.iter().any(|event| event == entered.event || event == "any") {
            return None;
        }
        let longer = self.with_source_record.filter(|_| entered.has_source_record);
        let days = longer.unwrap_or(self.business_days);
        business_days_after(local_day(entered.occurred)?, days, holidays)
    }

    /// The finding if it was entered late.
    pub(crate) fn judge(
        &self,
        entered: &Entered<'_>,
        holidays: &[Date],
        mark: &Mark<'_>,
    ) -> Option<Finding> {
        let last = self.last_day(entered, holidays)?;
        let day = local_day(entered.entered)?;
        if day <= last {
            return None;
        }
        let sentence = format!(
            "This was entered on {day}; the last day for it was {last} ({}).",
            self.source.shown()
        );
        let finding = mark
            .finding(&self.id, &self.source, self.verdict, sentence)
            .param("last_day", last.to_string())
            .param("entered_on", day.to_string());
        Some(finding.cured_by("Say in the record why it is late."))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// The days are those of 27 CFR 19.580: the next business day, the third with an auxiliary record.
    const SPIRITS: &str = r#"
        id = "entry"
        events = ["addition.recorded"]
        business_days = 1
        with_source_record = 3
        verdict = "advise"
        source = { citation = "made up", status = "READ", basis = "law" }
    "#;

    fn late(event: &str, entered: &str, has_source_record: bool) -> bool {
        let rule: EntryDeadline = toml::from_str(SPIRITS).unwrap();
        let stamp = |text: &str| Stamp::parse(text).unwrap();
        let entered = Entered {
            event,
            occurred: stamp("2025-09-12T23:00:00-07:00"), // a Friday night
            entered: stamp(entered),
            has_source_record,
        };
        rule.judge(&entered, &[], &Mark::House("test")).is_some()
    }

    #[test]
    fn the_next_business_day_is_in_time_and_the_one_after_is_not() {
        assert!(!late("addition.recorded", "2025-09-15T23:59:59-07:00", false));
        assert!(late("addition.recorded", "2025-09-16T00:00:00-07:00", false));
        assert!(!late("reading.taken", "2025-09-30T00:00:00-07:00", false));
    }

    #[test]
    fn a_source_record_gives_longer() {
        assert!(!late("addition.recorded", "2025-09-17T23:59:59-07:00", true));
        assert!(late("addition.recorded", "2025-09-18T00:00:00-07:00", true));
    }
}
