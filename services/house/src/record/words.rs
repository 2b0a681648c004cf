//! Figures and times as a record prints them.

use domain::book::body::{Line, Reading};
use domain::checks;
use domain::densimetry::Scale;
use domain::stamp::{Micros, Stamp};
use domain::units::{Dimension, Quantity, div_half_even};

/// `YYYY-MM-DD HH:MM` on the wall clock of a zone.
pub(crate) fn clock(at: Micros, zone: &str) -> String {
    let stamp = Stamp::in_zone(at, zone).to_string();
    stamp.get(..16).unwrap_or(&stamp).replace('T', " ")
}

/// `YYYY-MM-DD` on the wall clock of a zone.
pub(crate) fn date(at: Micros, zone: &str) -> String {
    let stamp = Stamp::in_zone(at, zone).to_string();
    stamp.get(..10).unwrap_or(&stamp).to_owned()
}

/// `YYYY-MM-DD` as it was stated, in the stated offset: midnight is not the evening before in another season.
pub(crate) fn stated_date(stamp: Stamp) -> String {
    let stamp = stamp.to_string();
    stamp.get(..10).unwrap_or(&stamp).to_owned()
}

/// How far a zone is from Greenwich at that instant: `UTC-07:00`.
pub(crate) fn offset(at: Micros, zone: &str) -> String {
    let stamp = Stamp::in_zone(at, zone).to_string();
    format!("UTC{}", stamp.get(26..).unwrap_or_default())
}

/// A length of time in the two largest units that say it: `6 h 25 min`.
pub(crate) fn span(micros: i64) -> String {
    let minutes = micros.max(0) / 60_000_000;
    let (days, hours, rest) = (minutes / 1_440, minutes / 60 % 24, minutes % 60);
    match (days, hours) {
        (0, 0) => format!("{rest} min"),
        (0, _) => format!("{hours} h {rest} min"),
        _ => format!("{days} d {hours} h"),
    }
}

/// An amount as it was typed; one that was computed in a unit that people use.
pub(crate) fn amount(quantity: &Quantity) -> String {
    match (quantity.unit(), quantity.dimension()) {
        ("ug" | "uL" | "g/g", Ok(dimension)) => base_amount(quantity.base(), dimension),
        _ => quantity.to_string(),
    }
}

/// An amount of base units: g or from 10 kg on kg, L or below one L mL, pieces.
pub(crate) fn base_amount(base: i64, dimension: Dimension) -> String {
    let (places, unit) = match dimension {
        Dimension::Mass if base.abs() >= 10_000_000_000 => (9, " kg"),
        Dimension::Mass => (6, " g"),
        Dimension::Volume if base.abs() >= 1_000_000 => (6, " L"),
        Dimension::Volume => (3, " mL"),
        Dimension::Count => (0, ""),
        Dimension::Fraction => (7, " %"),
    };
    format!("{}{unit}", shifted(base, places))
}

/// base × 10^-places, exactly, without idle zeros.
fn shifted(base: i64, places: usize) -> String {
    let sign = if base < 0 { "-" } else { "" };
    let digits = format!("{:0>width$}", base.unsigned_abs(), width = places + 1);
    let (whole, fraction) = digits.split_at(digits.len() - places);
    match fraction.trim_end_matches('0') {
        "" => format!("{sign}{whole}"),
        fraction => format!("{sign}{whole}.{fraction}"),
    }
}

/// The sum of several amounts of one lot: as typed if there is only one.
pub(crate) fn sum<'a>(amounts: impl IntoIterator<Item = &'a Quantity>) -> String {
    let amounts: Vec<_> = amounts.into_iter().collect();
    match (amounts.as_slice(), amounts.first().map(|first| first.dimension())) {
        ([one], _) => amount(one),
        (all, Some(Ok(dimension))) => base_amount(all.iter().map(|q| q.base()).sum(), dimension),
        _ => String::new(),
    }
}

/// What was done beside what was proposed: `151 g (+0.7 %)`.
pub(crate) fn beside(done: &Quantity, proposed: &Quantity) -> String {
    let difference = i128::from(done.base()) - i128::from(proposed.base());
    if difference == 0 || proposed.base() == 0 {
        return amount(done);
    }
    let tenths = div_half_even(difference * 1_000, i128::from(proposed.base()));
    let sign = if tenths < 0 { '-' } else { '+' };
    let size = tenths.unsigned_abs();
    format!("{} ({sign}{}.{} %)", amount(done), size / 10, size % 10)
}

/// The lots of a dose in a line: `500 g DP-0387 + 400 g DP-0412`.
pub(crate) fn dose(lines: &[Line]) -> String {
    let each = |line: &Line| format!("{} {}", amount(&line.amount), line.lot_code);
    lines.iter().map(each).collect::<Vec<_>>().join(" + ")
}

/// What was measured, for people.
pub(crate) fn kind(reading: &Reading) -> String {
    let name = match reading.quantity.as_str() {
        "ph" => "pH".to_owned(),
        "sulfur_dioxide_total" => "total sulfur dioxide".to_owned(),
        "sulfur_dioxide_free" => "free sulfur dioxide".to_owned(),
        other => other.replace('_', " "),
    };
    match (&reading.expressed_as, reading.quantity.as_str()) {
        (Some(form), _) => format!("{name}, as {form}"),
        (None, "ammonium") => format!("{name}, as NH4"),
        _ => name,
    }
}

/// A value as entered: qualifier, number, unit, temperature of the sample.
pub(crate) fn entered(reading: &Reading) -> String {
    let mut text = match &reading.qualifier {
        Some(qualifier) => format!("{qualifier} {}", reading.value),
        None => reading.value.clone(),
    };
    let unit = unit(&reading.unit);
    if !unit.is_empty() {
        text = format!("{text} {unit}");
    }
    match &reading.sample_temperature {
        Some(given) if given.unit == "[degF]" => format!("{text} at {} °F", given.value),
        Some(given) => format!("{text} at {} °C", given.value),
        None => text,
    }
}

/// The sign of a unit or scale.
fn unit(code: &str) -> &str {
    if let Ok(scale) = Scale::parse(code) {
        return scale.sign();
    }
    match code {
        "Cel" => "°C",
        "[degF]" => "°F",
        "[pH]" => "",
        "%{vol}" => "% vol",
        "ug/L" => "µg/L",
        other => other,
    }
}

/// The scale of an expected gravity, for people.
pub(crate) fn on_scale(value: &str, scale: &str) -> String {
    format!("{value} {}", unit(scale))
}

/// What a rule stands on.
pub(crate) const fn basis(basis: checks::Basis) -> &'static str {
    match basis {
        checks::Basis::Law => "law",
        checks::Basis::Guidance => "guidance",
        checks::Basis::Voluntary => "voluntary",
        checks::Basis::CommonPractice => "common practice",
        checks::Basis::SiteSetting => "site setting",
        checks::Basis::Model => "model",
    }
}

/// A verdict as the paper draws it.
pub(crate) const fn verdict(verdict: checks::Verdict) -> records::Verdict {
    match verdict {
        checks::Verdict::Clear => records::Verdict::Clear,
        checks::Verdict::Advise => records::Verdict::Advise,
        checks::Verdict::Refer => records::Verdict::Refer,
        checks::Verdict::Refuse => records::Verdict::Refuse,
    }
}

/// A name of the code as words.
pub(crate) fn plain(name: &str) -> String {
    name.replace('_', " ")
}

#[cfg(test)]
mod tests {
    use super::*;

    fn grams(text: &str) -> Quantity {
        Quantity::parse(text, "g", Dimension::Mass).unwrap()
    }

    #[test]
    fn amounts_are_exact_and_without_idle_zeros() {
        assert_eq!(base_amount(551_000_000, Dimension::Mass), "551 g");
        assert_eq!(base_amount(23_469_500_000, Dimension::Mass), "23.4695 kg");
        assert_eq!(base_amount(20_500, Dimension::Volume), "20.5 mL");
        assert_eq!(sum([&grams("400"), &grams("151")]), "551 g");
        assert_eq!(sum([&grams("0.50")]), "0.50 g", "one amount stands as typed");
    }

    #[test]
    fn a_difference_is_told_in_tenths_of_a_per_cent() {
        assert_eq!(beside(&grams("151"), &grams("150")), "151 g (+0.7 %)");
        assert_eq!(beside(&grams("146"), &grams("150")), "146 g (-2.7 %)");
        assert_eq!(beside(&grams("150"), &grams("150")), "150 g");
    }

    #[test]
    fn times_are_on_the_wall_clock_with_their_year() {
        let at = Micros::parse("2025-09-24T16:05:00Z").unwrap();
        assert_eq!(clock(at, "America/Los_Angeles"), "2025-09-24 09:05");
        assert_eq!(offset(at, "America/Los_Angeles"), "UTC-07:00");
        assert_eq!(date(at, "Pacific/Auckland"), "2025-09-25");
        let expiry = Stamp::parse("2025-12-31T00:00:00-07:00").unwrap();
        assert_eq!(date(expiry.at, "America/Los_Angeles"), "2025-12-30");
        assert_eq!(stated_date(expiry), "2025-12-31");
        assert_eq!(span(23_100_000_000), "6 h 25 min");
        assert_eq!(span(3 * 86_400_000_000), "3 d 0 h");
    }
}
