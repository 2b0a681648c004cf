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
    #[schema(example = "2.5", pattern = r"^-?[0-9]+(\.[0-9]+)?$", max_length = 17)]
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
pub struct Faults {
    /// What stands before every pointer.
    within: String,
    all: Vec<FieldError>,
}

/// The longest code, in characters (ours). The descriptions of bodies say the same as these.
const LONGEST_CODE: usize = 40;
/// The longest name of one line (ours).
const LONGEST_NAME: usize = 200;
/// The longest text in words (ours).
const LONGEST_WORDS: usize = 2_000;
/// The longest list of names, roles or premises (ours).
pub(crate) const LONGEST_LIST: usize = 50;
/// The most substances of one composition (ours).
pub(crate) const MOST_SUBSTANCES: usize = 100;

impl Faults {
    /// What is noted from now on stands below this place of the body.
    pub fn enter(&mut self, pointer: &str) {
        pointer.clone_into(&mut self.within);
    }

    /// A code, which stands in addresses and on labels: 1 to 40 characters of one line without a slash, no blank at
    /// either end. Nothing at all is a matter of who described the body.
    pub fn code<'a>(&mut self, pointer: &str, text: impl Into<Option<&'a str>>) {
        let Some(text) = text.into() else { return };
        if text.contains(char::is_control) || text.contains('/') || text.trim() != text {
            self.note(pointer, "a code has one line, no slash, and no blank at either end");
        }
        self.length(pointer, text, LONGEST_CODE);
    }

    /// A name: 1 to 200 characters of one line, not blank.
    pub fn name<'a>(&mut self, pointer: &str, text: impl Into<Option<&'a str>>) {
        let Some(text) = text.into() else { return };
        if text.contains(char::is_control) {
            self.note(pointer, "write it in one line");
        }
        self.length(pointer, text, LONGEST_NAME);
    }

    /// Something in words: 1 to 2,000 characters, not blank.
    pub fn words<'a>(&mut self, pointer: &str, text: impl Into<Option<&'a str>>) {
        let Some(text) = text.into() else { return };
        self.length(pointer, text, LONGEST_WORDS);
    }

    fn length(&mut self, pointer: &str, text: &str, most: usize) {
        if text.trim().is_empty() {
            self.note(pointer, "say something here; blanks are not enough");
        } else if text.chars().nth(most).is_some() {
            self.note(pointer, format_args!("it has at most {most} characters"));
        }
    }

    /// A list of at most so many items, each of which is then looked at with its pointer.
    pub fn list<T>(
        &mut self,
        pointer: &str,
        items: &[T],
        most: usize,
        mut look: impl FnMut(&mut Self, &str, &T),
    ) {
        if items.len() > most {
            self.note(pointer, format_args!("give at most {most}"));
            return;
        }
        for (index, item) in items.iter().enumerate() {
            look(self, &format!("{pointer}/{index}"), item);
        }
    }

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
        let pointer = format!("{}{pointer}", self.within);
        self.all.push(FieldError { pointer, detail: detail.to_string() });
    }

    /// The whole, if nothing was wrong. Give `None` only where a fault was noted.
    ///
    /// # Errors
    /// [`Kind::Meaningless`] with every fault.
    pub fn finish<T>(self, whole: Option<T>) -> Result<T, Problem> {
        match whole {
            Some(whole) if self.all.is_empty() => Ok(whole),
            _ => Err(self.problem()),
        }
    }

    /// The problem with every fault.
    pub(crate) fn problem(self) -> Problem {
        let Some(first) = self.all.first() else {
            tracing::error!("a body was refused without a fault being noted");
            return Problem::new(Kind::Internal, Kind::Internal.advice());
        };
        let detail = match self.all.len() {
            1 => first.detail.clone(),
            many => format!("{many} places are wrong; the first: {}", first.detail),
        };
        Problem::new(Kind::Meaningless, detail).with_errors(self.all)
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

    #[track_caller]
    fn pointed_at(look: impl FnOnce(&mut Faults)) -> Vec<String> {
        let mut faults = Faults::default();
        look(&mut faults);
        faults.all.into_iter().map(|fault| fault.pointer).collect()
    }

    #[test]
    fn a_code_has_one_to_forty_characters_no_slash_and_no_blank_at_its_ends() {
        let longest = "\u{fc}".repeat(40);
        for good in ["B", "EXW-25-B1", "two words", &longest] {
            assert_eq!(pointed_at(|f| f.code("/code", good)), [""; 0], "{good:?}");
        }
        let longer = format!("{longest}x");
        for bad in ["", " ", " B", "B ", "B\n", "\u{a0}B", "a/b", "a\tb", "a\nb", &longer] {
            assert!(pointed_at(|f| f.code("/code", bad)).contains(&"/code".to_owned()), "{bad:?}");
        }
        assert_eq!(pointed_at(|f| f.code("/code", None)), [""; 0]);
    }

    #[test]
    fn a_name_has_one_line_and_words_may_have_several() {
        let (name, words) = ("n".repeat(200), "w".repeat(2_000));
        assert_eq!(pointed_at(|f| f.name("/name", name.as_str())), [""; 0]);
        assert_eq!(pointed_at(|f| f.words("/reason", words.as_str())), [""; 0]);
        assert_eq!(pointed_at(|f| f.words("/reason", "two\nlines")), [""; 0]);
        let (name, words) = (format!("{name}n"), format!("{words}w"));
        for bad in ["", "  ", "two\nlines", &name] {
            assert_eq!(pointed_at(|f| f.name("/name", bad)), ["/name"], "{bad:?}");
        }
        for bad in ["", "\n \n", &words] {
            assert_eq!(pointed_at(|f| f.words("/reason", bad)), ["/reason"], "{bad:?}");
        }
    }

    #[test]
    fn a_list_is_bounded_and_its_items_are_pointed_at_where_they_stand() {
        let look = |faults: &mut Faults, at: &str, item: &&str| faults.code(at, *item);
        let pointers = pointed_at(|faults| {
            faults.enter("/lot");
            faults.list("/claims", &["a", "", "b", "/"], 4, look);
        });
        assert_eq!(pointers, ["/lot/claims/1", "/lot/claims/3"]);
        assert_eq!(pointed_at(|f| f.list("/claims", &["a", "", "b", "/"], 3, look)), ["/claims"]);
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
