//! Amounts and times as they stand in REST bodies, and the collecting of what is wrong with them.

use std::fmt::Display;

use domain::stamp::{Micros, NotATime, Stamp};
use domain::units::{Dimension, Quantity, UnitError};
use serde::{Deserialize, Serialize};
use utoipa::ToSchema;

use crate::problem::{FieldError, Kind, Problem};

/// How far ahead of our clock a stated time may lie: clocks of tablets differ (ours; five minutes).
pub const AHEAD: i64 = 5 * 60 * 1_000_000;

/// An amount as entered: a decimal text and a UCUM unit code.
#[derive(Clone, Debug, Deserialize, Eq, PartialEq, Serialize, ToSchema)]
#[serde(deny_unknown_fields)]
pub struct Amount {
    /// Digits with at most one point, as text: no exponent, no thousands mark, no sign.
    #[schema(example = "2.5", pattern = r"^-?[0-9]+(\.[0-9]+)?$", max_length = 40)]
    pub value: String,
    /// UCUM code, capitals as written there.
    #[schema(example = "kg", max_length = 20)]
    pub unit: String,
}

impl Amount {
    /// The exact quantity, if it is one of the wanted dimension.
    ///
    /// # Errors
    /// [`UnitError`], which says what would be right.
    pub fn to_quantity(&self, wanted: Dimension) -> Result<Quantity, UnitError> {
        Quantity::parse(&self.value, &self.unit, wanted)
    }
}

impl From<&Quantity> for Amount {
    fn from(quantity: &Quantity) -> Self {
        Self { value: quantity.entered().to_owned(), unit: quantity.unit().to_owned() }
    }
}

/// A stated time that cannot be meant.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum TimeError {
    /// Not an RFC 3339 time with its offset.
    #[error(transparent)]
    Unreadable(#[from] NotATime),
    /// Before the epoch.
    #[error("{0} lies before 1970")]
    TooEarly(Stamp),
    /// Too far in the future.
    #[error("{stated} lies more than 5 minutes ahead of the clock here, which shows {now}")]
    Ahead {
        /// What was stated.
        stated: Stamp,
        /// Our clock.
        now: Micros,
    },
}

/// Reads when something happened: RFC 3339 with offset, not before 1970, at most [`AHEAD`] of `now`.
///
/// # Errors
/// [`TimeError`].
pub fn stated_time(text: &str, now: Micros) -> Result<Stamp, TimeError> {
    let stated = Stamp::parse(text)?;
    if stated.at < Micros(0) {
        return Err(TimeError::TooEarly(stated));
    }
    if stated.at.0 > now.0.saturating_add(AHEAD) {
        return Err(TimeError::Ahead { stated, now });
    }
    Ok(stated)
}

/// Collects every wrong place of a body, so that one answer names them all.
///
/// ```
/// use api::amounts::{Amount, Faults};
/// use domain::units::Dimension;
/// let amount = Amount { value: "2,5".into(), unit: "kg".into() };
/// let mut faults = Faults::default();
/// let mass = faults.at("/amount", amount.to_quantity(Dimension::Mass));
/// let problem = faults.finish(mass).unwrap_err();
/// assert_eq!(problem.errors()[0].pointer, "/amount");
/// ```
#[derive(Clone, Debug, Default, Eq, PartialEq)]
pub struct Faults(Vec<FieldError>);

impl Faults {
    /// The value, or its error noted at a place of the body.
    pub fn at<T, E: Display>(&mut self, pointer: &str, result: Result<T, E>) -> Option<T> {
        match result {
            Ok(value) => Some(value),
            Err(error) => {
                self.note(pointer, error);
                None
            }
        }
    }

    /// The mass, volume or count at a place of the body; a wrong unit is pointed at itself.
    pub fn amount(
        &mut self,
        pointer: &str,
        amount: &Amount,
        wanted: Dimension,
    ) -> Option<Quantity> {
        let read = amount.to_quantity(wanted);
        let part = match &read {
            Err(UnitError::Unknown(_) | UnitError::WrongDimension { .. }) => "unit",
            _ => "value",
        };
        self.at(&format!("{pointer}/{part}"), read)
    }

    /// Notes what is wrong at a place of the body.
    pub fn note(&mut self, pointer: &str, detail: impl Display) {
        self.0.push(FieldError { pointer: pointer.to_owned(), detail: detail.to_string() });
    }

    /// The whole, if nothing was wrong. Give `None` only where a fault was noted.
    ///
    /// # Errors
    /// [`Kind::Meaningless`] with every fault.
    pub fn finish<T>(self, whole: Option<T>) -> Result<T, Problem> {
        match (whole, self.0.first()) {
            (Some(whole), None) => Ok(whole),
            (_, Some(first)) => {
                let detail = match self.0.len() {
                    1 => first.detail.clone(),
                    many => format!("{many} places are wrong; the first: {}", first.detail),
                };
                Err(Problem::new(Kind::Meaningless, detail).with_errors(self.0))
            }
            (None, None) => {
                tracing::error!("a body was refused without a fault being noted");
                Err(Problem::new(Kind::Internal, Kind::Internal.advice()))
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn amount(value: &str, unit: &str) -> Amount {
        Amount { value: value.to_owned(), unit: unit.to_owned() }
    }

    #[test]
    fn all_faults_are_named_at_once_each_at_its_place() {
        let mut faults = Faults::default();
        let good = faults.amount("/lines/0/amount", &amount("2.5", "kg"), Dimension::Mass);
        assert_eq!(good.unwrap().base(), 2_500_000_000);
        assert_eq!(faults.amount("/lines/1/amount", &amount("2.5", "L"), Dimension::Mass), None);
        assert_eq!(faults.amount("/lines/2/amount", &amount("-1", "kg"), Dimension::Mass), None);
        assert_eq!(faults.amount("/lines/3/amount", &amount("1e3", "kg"), Dimension::Mass), None);
        assert_eq!(faults.amount("/lines/4/amount", &amount("1", "stone"), Dimension::Mass), None);
        assert_eq!(faults.at("/occurred_at", stated_time("noon", Micros(0))), None);
        let problem = faults.finish(Some(())).unwrap_err();
        assert_eq!(problem.kind(), Kind::Meaningless);
        let pointers: Vec<_> = problem.errors().iter().map(|e| e.pointer.as_str()).collect();
        assert_eq!(
            pointers,
            [
                "/lines/1/amount/unit",
                "/lines/2/amount/value",
                "/lines/3/amount/value",
                "/lines/4/amount/unit",
                "/occurred_at"
            ]
        );
        assert!(problem.detail().starts_with("5 places are wrong"), "{}", problem.detail());
    }

    #[test]
    fn nothing_wrong_gives_the_whole_and_nothing_noted_is_our_fault() {
        assert_eq!(Faults::default().finish(Some(7)), Ok(7));
        let ours = Faults::default().finish(None::<()>).unwrap_err();
        assert_eq!(ours.kind(), Kind::Internal);
    }

    #[test]
    fn a_time_before_1970_or_more_than_five_minutes_ahead_is_refused() {
        let now = Stamp::parse("2025-09-11T10:00:00-07:00").unwrap().at;
        let read = |text| stated_time(text, now);
        assert_eq!(read("2025-09-11T10:05:00-07:00").unwrap().offset_minutes, -420);
        assert!(matches!(read("2025-09-11T10:05:00.000001-07:00"), Err(TimeError::Ahead { .. })));
        assert!(read("1970-01-01T00:00:00Z").is_ok());
        assert!(matches!(read("1969-12-31T23:59:59Z"), Err(TimeError::TooEarly(_))));
        assert!(read("1970-01-01T00:59:59+00:00").is_ok());
        assert!(matches!(read("1970-01-01T00:59:59+01:00"), Err(TimeError::TooEarly(_))));
        assert!(matches!(read("2025-09-11T10:00:00"), Err(TimeError::Unreadable(_))));
        let ahead = read("2026-01-01T00:00:00Z").unwrap_err().to_string();
        assert!(ahead.contains("5 minutes") && ahead.contains("2025-09-11T17:00:00"), "{ahead}");
    }

    #[test]
    fn an_amount_is_answered_as_it_was_entered() {
        let entered = amount("8.00", "[lb_av]");
        let quantity = entered.to_quantity(Dimension::Mass).unwrap();
        assert_eq!(Amount::from(&quantity), entered);
    }
}
