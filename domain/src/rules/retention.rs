//! How long a record is kept.

use jiff::ToSpan;
use jiff::civil::{Date, date};
use serde::Deserialize;

use crate::checks::case::Mark;
use crate::checks::{Finding, Verdict};

use super::Source;
use super::rows::Rows;

/// From when the years count.
#[derive(Clone, Copy, Debug, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum From {
    /// The day of the last entry that the record needed.
    LastEntry,
    /// The end of the year of that entry.
    EndOfYear,
}

/// A term for keeping records.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct Retention {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// What is kept, in a sentence.
    pub records: String,
    /// At least so many years …
    pub years: u16,
    /// … from here.
    pub from: From,
    /// The authority may add so many.
    #[serde(default)]
    pub may_add_years: Option<u16>,
    /// Where it comes from.
    pub source: Source,
}

impl Retention {
    /// The last day on which it must be kept; `None` outside the years that calendars know.
    pub fn keep_until(&self, last_entry: Date) -> Option<Date> {
        let start = match self.from {
            From::LastEntry => last_entry,
            From::EndOfYear => date(last_entry.year(), 12, 31),
        };
        start.checked_add(i32::from(self.years).years()).ok()
    }

    /// The finding if it is destroyed too early; without a term that can be computed it is kept.
    pub(crate) fn judge(
        &self,
        last_entry: Date,
        destroyed: Date,
        mark: &Mark<'_>,
    ) -> Option<Finding> {
        let until = self.keep_until(last_entry);
        if until.is_some_and(|until| until < destroyed) {
            return None;
        }
        let until = until.map_or_else(|| "further notice".to_owned(), |day| day.to_string());
        let longer = self.may_add_years.map_or_else(String::new, |years| {
            format!(" The authority may ask for up to {years} years more.")
        });
        let sentence =
            format!("{} are kept until {until} ({}).{longer}", self.records, self.source.shown());
        let finding = mark.finding(&self.id, &self.source, Verdict::Refuse, sentence);
        Some(finding.param("keep_until", until).cured_by("Keep it."))
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn rule(years: u16, from: &str) -> Retention {
        let text = format!(
            r#"
            id = "kept"
            records = "Records"
            years = {years}
            from = "{from}"
            source = {{ citation = "made up", status = "READ", basis = "law" }}
            "#
        );
        toml::from_str(&text).unwrap()
    }

    #[test]
    fn years_count_from_the_last_entry_or_from_the_end_of_its_year() {
        let last = date(2025, 9, 19);
        assert_eq!(rule(3, "last_entry").keep_until(last), Some(date(2028, 9, 19)));
        assert_eq!(rule(6, "end_of_year").keep_until(last), Some(date(2031, 12, 31)));
        assert_eq!(rule(1, "last_entry").keep_until(date(2024, 2, 29)), Some(date(2025, 2, 28)));
    }

    #[test]
    fn the_last_day_still_counts() {
        let early = |day| {
            rule(3, "last_entry").judge(date(2025, 9, 19), day, &Mark::House("test")).is_some()
        };
        assert!(early(date(2028, 9, 19)));
        assert!(!early(date(2028, 9, 20)));
    }

    #[test]
    fn what_no_calendar_knows_is_kept() {
        let found = rule(9_000, "last_entry").judge(
            date(2025, 9, 19),
            date(2026, 1, 1),
            &Mark::House("test"),
        );
        assert!(found.unwrap().sentence.contains("further notice"));
    }
}
