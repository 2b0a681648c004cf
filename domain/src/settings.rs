//! The site's thresholds: one table of named numbers with defaults.
//!
//! Every number here is a **setting**: chosen by the site, with a default that stands on common practice. None is
//! a published limit, and no page or paper may show one as science or as law.

use std::collections::BTreeMap;

use crate::units::Decimal;

/// The name of one threshold.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Setting {
    /// An entry this many hours after the event is marked late.
    LateEntryHours,
    /// A sign-off may be used for this many hours.
    SignoffValidHours,
    /// How far the executed amount may be from the proposed one.
    AmountTolerancePercent,
    /// A nitrogen analysis sampled longer than this before pitching is old.
    YanAgeHours,
    /// Two nitrogen doses closer than this are pointed out.
    DoseGapHours,
    /// A last gravity older than this is pointed out.
    GravityAgeHours,
    /// A proposal lapses this long after its planned time.
    ProposalLapseHours,
    /// The length of a shift, within which the author may correct an entry.
    ShiftHours,
    /// "More than half the sugar used" at this probability needs a second person.
    HalfProbabilityRefer,
    /// "More than half the sugar used" at this probability is pointed out.
    HalfProbabilityAdvise,
    /// "More than a third of the sugar used" at this probability is pointed out for ammonium.
    ThirdProbabilityAdvise,
    /// A supply over the need by more than this needs a second person.
    ExcessReferMgL,
    /// Doing what one's own proposal was just refused is pointed out for this long.
    OwnRefusalMinutes,
    /// Below this supply a ferment is expected to stick.
    LowSupplyMgL,
    /// A gravity that rises by more than this, or ends lower than expected by more, is pointed out.
    GravityRiseSg,
}

/// One row of the table of settings.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Definition {
    /// Which setting.
    pub setting: Setting,
    /// Its name in entries, REST and rule sets.
    pub name: &'static str,
    /// The default, a plain decimal.
    pub default: &'static str,
    /// Its unit, for people.
    pub unit: &'static str,
    /// The least value accepted, a plain decimal.
    pub least: &'static str,
    /// The largest value accepted, a plain decimal.
    pub most: &'static str,
    /// What it decides, for people.
    pub meaning: &'static str,
}

const fn row(
    setting: Setting,
    name: &'static str,
    [default, least, most]: [&'static str; 3],
    unit: &'static str,
    meaning: &'static str,
) -> Definition {
    Definition { setting, name, default, unit, least, most, meaning }
}

/// Every setting, in the order of [`Setting`]. Defaults are common practice of the site, not published numbers.
static TABLE: [Definition; 15] = [
    row(
        Setting::LateEntryHours,
        "late_entry_hours",
        ["2", "0", "168"],
        "h",
        "an entry recorded later than this after the event is marked late",
    ),
    row(
        Setting::SignoffValidHours,
        "signoff_valid_hours",
        ["12", "1", "168"],
        "h",
        "a sign-off may be used for this long",
    ),
    row(
        Setting::AmountTolerancePercent,
        "amount_tolerance_percent",
        ["3", "0", "20"],
        "%",
        "how far the executed amount may be from the proposed one",
    ),
    row(
        Setting::YanAgeHours,
        "yan_age_hours",
        ["48", "1", "720"],
        "h",
        "a nitrogen sample taken longer than this before pitching is pointed out",
    ),
    row(
        Setting::DoseGapHours,
        "dose_gap_hours",
        ["12", "0", "168"],
        "h",
        "two nitrogen doses closer together than this are pointed out",
    ),
    row(
        Setting::GravityAgeHours,
        "gravity_age_hours",
        ["24", "1", "168"],
        "h",
        "a last gravity older than this is pointed out",
    ),
    row(
        Setting::ProposalLapseHours,
        "proposal_lapse_hours",
        ["12", "1", "168"],
        "h",
        "a proposal lapses this long after its planned time",
    ),
    row(
        Setting::ShiftHours,
        "shift_hours",
        ["12", "1", "24"],
        "h",
        "the length of a shift, within which authors correct their own entries",
    ),
    row(
        Setting::HalfProbabilityRefer,
        "half_probability_refer",
        ["0.5", "0.01", "1"],
        "1",
        "a probability of at least this that more than half the sugar is used needs a second person",
    ),
    row(
        Setting::HalfProbabilityAdvise,
        "half_probability_advise",
        ["0.1", "0.01", "1"],
        "1",
        "a probability of at least this that more than half the sugar is used is pointed out",
    ),
    row(
        Setting::ThirdProbabilityAdvise,
        "third_probability_advise",
        ["0.5", "0.01", "1"],
        "1",
        "for ammonium, a probability of at least this that more than a third is used is pointed out",
    ),
    row(
        Setting::ExcessReferMgL,
        "excess_refer_mg_l",
        ["50", "0", "500"],
        "mg N/L",
        "a supply over the need by more than this needs a second person",
    ),
    row(
        Setting::OwnRefusalMinutes,
        "own_refusal_minutes",
        ["60", "0", "1440"],
        "min",
        "for this long, doing what one's own proposal was refused or referred is pointed out",
    ),
    row(
        Setting::LowSupplyMgL,
        "low_supply_mg_l",
        ["50", "0", "140"],
        "mg N/L",
        "below this supply a ferment is expected to stick: not a dose to aim at",
    ),
    row(
        Setting::GravityRiseSg,
        "gravity_rise_sg",
        ["0.002", "0.0005", "0.05"],
        "SG",
        "a gravity above the last one, or below the expected end, by more than this is pointed out as hardly possible",
    ),
];

impl Setting {
    /// The setting of that name.
    pub fn of(name: &str) -> Option<Self> {
        TABLE.iter().find(|row| row.name == name).map(|row| row.setting)
    }

    /// Its row in the table.
    pub const fn definition(self) -> &'static Definition {
        &TABLE[self as usize]
    }
}

/// Why settings were not taken.
#[derive(Clone, Debug, Eq, PartialEq, thiserror::Error)]
pub enum SettingError {
    /// No setting has this name.
    #[error("there is no setting {name:?}: use one of {known}")]
    Unknown {
        /// The name given.
        name: String,
        /// The names that exist.
        known: String,
    },
    /// Not a number, or outside its range.
    #[error(
        "{name} cannot be {value:?}: give a plain decimal number from {least} to {most} {unit}"
    )]
    OutOfRange {
        /// Which setting.
        name: &'static str,
        /// What was given.
        value: String,
        /// The least value.
        least: &'static str,
        /// The largest value.
        most: &'static str,
        /// The unit of both.
        unit: &'static str,
    },
    /// Pointing out must begin before a second person is needed.
    #[error(
        "half_probability_advise ({advise}) is above half_probability_refer ({refer}): set it lower or equal"
    )]
    Crossed {
        /// The probability pointed out.
        advise: String,
        /// The probability referred.
        refer: String,
    },
}

/// A site's thresholds: the defaults, and what the site changed.
///
/// ```
/// use domain::settings::{Setting, Settings};
/// let settings = Settings::default();
/// assert_eq!(settings.text(Setting::AmountTolerancePercent), "3");
/// ```
#[derive(Clone, Debug, Default, Eq, PartialEq)]
pub struct Settings {
    changed: BTreeMap<Setting, String>,
}

impl Settings {
    /// The defaults with these values put in their place.
    ///
    /// # Errors
    /// Any [`SettingError`]; each says what would be accepted.
    pub fn with(values: &BTreeMap<String, String>) -> Result<Self, SettingError> {
        let mut changed = BTreeMap::new();
        for (name, value) in values {
            let setting = Setting::of(name).ok_or_else(|| SettingError::Unknown {
                name: name.clone(),
                known: known_names(),
            })?;
            if !in_range(setting.definition(), value) {
                return Err(out_of_range(setting.definition(), value));
            }
            changed.insert(setting, value.clone());
        }
        let settings = Self { changed };
        settings.uncrossed()
    }

    fn uncrossed(self) -> Result<Self, SettingError> {
        let (advise, refer) = (Setting::HalfProbabilityAdvise, Setting::HalfProbabilityRefer);
        if self.number(advise) > self.number(refer) {
            return Err(SettingError::Crossed {
                advise: self.text(advise).to_owned(),
                refer: self.text(refer).to_owned(),
            });
        }
        Ok(self)
    }

    /// Every setting there is, for listing.
    pub fn table() -> &'static [Definition] {
        &TABLE
    }

    /// The value as written.
    pub fn text(&self, setting: Setting) -> &str {
        self.changed.get(&setting).map_or(setting.definition().default, String::as_str)
    }

    /// The value as a number in the setting's unit.
    pub fn number(&self, setting: Setting) -> f64 {
        decimal(self.text(setting))
    }

    /// The value as a length of time in microseconds; `None` for what is not hours or minutes.
    pub fn micros(&self, setting: Setting) -> Option<i64> {
        let per_unit = match setting.definition().unit {
            "h" => 3_600_000_000,
            "min" => 60_000_000,
            _ => return None,
        };
        Decimal::parse(self.text(setting)).ok()?.scaled_by(per_unit, 1)
    }

    /// Whether the site has set it, rather than left the default.
    pub fn is_changed(&self, setting: Setting) -> bool {
        self.changed.contains_key(&setting)
    }
}

fn known_names() -> String {
    TABLE.iter().map(|row| row.name).collect::<Vec<_>>().join(", ")
}

fn in_range(row: &Definition, value: &str) -> bool {
    Decimal::parse(value)
        .is_ok_and(|number| (decimal(row.least)..=decimal(row.most)).contains(&number.to_f64()))
}

fn out_of_range(row: &Definition, value: &str) -> SettingError {
    SettingError::OutOfRange {
        name: row.name,
        value: value.chars().take(40).collect(),
        least: row.least,
        most: row.most,
        unit: row.unit,
    }
}

/// Values in [`Settings`] and in the table were read once already; a NaN would fail every comparison.
fn decimal(text: &str) -> f64 {
    Decimal::parse(text).map_or(f64::NAN, Decimal::to_f64)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn with(name: &str, value: &str) -> Result<Settings, SettingError> {
        Settings::with(&BTreeMap::from([(name.to_owned(), value.to_owned())]))
    }

    #[test]
    fn every_default_is_inside_its_range_and_every_name_leads_back() {
        for row in Settings::table() {
            assert!(in_range(row, row.default), "{}", row.name);
            assert_eq!(Setting::of(row.name), Some(row.setting));
            assert_eq!(row.setting.definition().name, row.name);
            assert!(!row.meaning.is_empty());
        }
    }

    #[test]
    fn a_changed_setting_replaces_the_default_and_only_that() {
        let settings = with("dose_gap_hours", "8.5").unwrap();
        assert_eq!(settings.text(Setting::DoseGapHours), "8.5");
        assert_eq!(settings.micros(Setting::DoseGapHours), Some(30_600_000_000));
        assert!(settings.is_changed(Setting::DoseGapHours));
        assert_eq!(settings.text(Setting::GravityAgeHours), "24");
        assert_eq!(settings.micros(Setting::LowSupplyMgL), None);
        assert_eq!(settings.micros(Setting::OwnRefusalMinutes), Some(3_600_000_000));
    }

    #[test]
    fn an_unknown_name_is_refused_with_the_names_that_exist() {
        let error = with("dose_gap", "8").unwrap_err().to_string();
        assert!(error.contains("dose_gap_hours"), "{error}");
    }

    #[test]
    fn a_value_out_of_range_is_refused_with_the_range() {
        for value in ["-1", "169", "eight", "1e2", ""] {
            let error = with("dose_gap_hours", value).unwrap_err().to_string();
            assert!(error.contains("from 0 to 168 h"), "{error}");
        }
    }

    #[test]
    fn pointing_out_may_not_begin_above_referring() {
        assert!(matches!(
            with("half_probability_advise", "0.6"),
            Err(SettingError::Crossed { .. })
        ));
        assert!(with("half_probability_advise", "0.5").is_ok());
    }
}
