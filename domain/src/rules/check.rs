//! A site's own rule set, read with every fault at its line.

use std::collections::BTreeSet;

use serde::Deserialize;
use serde::de::IntoDeserializer;
use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::category_claim::CategoryClaim;
use super::contaminant_limit::ContaminantLimit;
use super::dose_limit::DoseLimit;
use super::entry_deadline::EntryDeadline;
use super::gauge_required::GaugeRequired;
use super::level_band::LevelBand;
use super::lot_status::LotStatusRule;
use super::measurement_age::MeasurementAge;
use super::positive_list::PositiveList;
use super::preparation::PreparationRule;
use super::residual_limit::ResidualLimit;
use super::retention::Retention;
use super::sequence::Sequence;
use super::timing_limit::TimingLimit;
use super::{RuleSet, Status};

/// What is wrong, and where.
#[derive(Clone, Debug, Eq, Ord, PartialEq, PartialOrd, thiserror::Error)]
#[error("line {line}, column {column}: {message}")]
pub struct Located {
    /// From 1.
    pub line: usize,
    /// From 1, in characters.
    pub column: usize,
    /// In plain words.
    pub message: String,
}

/// A rule, or the set as a whole, that contradicts itself.
#[derive(Clone, Debug, Eq, PartialEq)]
pub(super) struct Fault {
    /// The list it stands in and its place there; `None` for the set as a whole.
    place: Option<(&'static str, usize)>,
    /// The member to look at.
    member: &'static str,
    /// Its id.
    pub(super) rule: String,
    /// What is wrong, and what to do.
    pub(super) reason: &'static str,
}

/// Reads a rule set and tells everything that is wrong with it, in the order of the text.
///
/// ```
/// use domain::rules::{check, shipped};
/// let (_, text) = shipped()[0];
/// assert!(check(text).is_ok());
/// let slip = text.replacen("amount = \"8\"", "amount = \"eight\"", 1);
/// let faults = check(&slip).unwrap_err();
/// assert_eq!(faults.len(), 1);
/// assert!(slip.lines().nth(faults[0].line - 1).unwrap().contains("eight"));
/// ```
///
/// # Errors
/// Every fault with its line and column. What is not TOML is told alone, as what follows it cannot be trusted.
pub fn check(text: &str) -> Result<RuleSet, Vec<Located>> {
    let (table, errors) = DeTable::parse_recoverable(text);
    if !errors.is_empty() {
        return Err(sorted(errors.iter().map(|error| told(text, error, 0)).collect()));
    }
    let members = members(table.get_ref(), text);
    if !members.is_empty() {
        return Err(sorted(members));
    }
    let set = RuleSet::deserialize(table.clone().into_deserializer())
        .map_err(|error| vec![told(text, &error, 0)])?;
    let mut found: Vec<Located> = faults(&set)
        .into_iter()
        .map(|fault| {
            let message = format!("rule {:?}: {}", fault.rule, fault.reason);
            located(text, place(table.get_ref(), &fault), message)
        })
        .collect();
    if set.form != 1 {
        let at = span(table.get_ref(), "form").unwrap_or(0);
        let message = format!("form = {}: this program reads form = 1", set.form);
        found.push(located(text, at, message));
    }
    if found.is_empty() { Ok(set) } else { Err(sorted(found)) }
}

fn sorted(mut found: Vec<Located>) -> Vec<Located> {
    found.sort();
    found
}

/// What is wrong inside single rules, each read by itself, and with the set's own members.
fn members(table: &DeTable<'_>, text: &str) -> Vec<Located> {
    let mut found = Vec::new();
    let mut head = table.clone();
    macro_rules! read {
        ($($form:ident: $rule:ty),* $(,)?) => { $(
            if let Some(list) = head.remove(stringify!($form)) {
                found.extend(read::<$rule>(&list, text));
            }
        )* };
    }
    read!(
        positive_list: PositiveList,
        dose_limit: DoseLimit,
        timing_limit: TimingLimit,
        level_band: LevelBand,
        lot_status: LotStatusRule,
        measurement_age: MeasurementAge,
        preparation: PreparationRule,
        residual_limit: ResidualLimit,
        contaminant_limit: ContaminantLimit,
        category_claim: CategoryClaim,
        sequence: Sequence,
        entry_deadline: EntryDeadline,
        gauge_required: GaugeRequired,
        retention: Retention,
    );
    let head = Spanned::new(0..0, head);
    let head = RuleSet::deserialize(head.into_deserializer());
    found.extend(head.err().map(|error| told(text, &error, 0)));
    found
}

fn read<'i, T: Deserialize<'i>>(list: &Spanned<DeValue<'i>>, text: &str) -> Vec<Located> {
    let DeValue::Array(rules) = list.get_ref() else {
        let message = "this is a list of rules: write it in double brackets".to_owned();
        return vec![located(text, list.span().start, message)];
    };
    let fault = |rule: &Spanned<DeValue<'i>>| {
        let error = T::deserialize(rule.clone().into_deserializer()).err()?;
        Some(told(text, &error, rule.span().start))
    };
    rules.iter().filter_map(fault).collect()
}

/// An error of the reader, at its own place or else at `otherwise`.
fn told(text: &str, error: &toml::de::Error, otherwise: usize) -> Located {
    let at = error.span().map_or(otherwise, |span| span.start);
    located(text, at, error.message().to_owned())
}

fn located(text: &str, at: usize, message: String) -> Located {
    let before = text.get(..at).unwrap_or(text);
    let line_start = before.rfind('\n').map_or(0, |end| end + 1);
    let column = before.get(line_start..).unwrap_or_default().chars().count() + 1;
    Located { line: before.matches('\n').count() + 1, column, message }
}

/// Where a fault is to be looked for: its member, else its rule.
fn place(table: &DeTable<'_>, fault: &Fault) -> usize {
    let Some((form, index)) = fault.place else { return span(table, fault.member).unwrap_or(0) };
    let rule = table.get(form).and_then(|list| list.get_ref().get(index));
    let Some(rule) = rule else { return 0 };
    let members = rule.get_ref().as_table();
    members.and_then(|members| span(members, fault.member)).unwrap_or(rule.span().start)
}

fn span(table: &DeTable<'_>, member: &str) -> Option<usize> {
    table.get(member).map(|value| value.span().start)
}

/// Everything that contradicts itself in a set that could be read.
pub(super) fn faults(set: &RuleSet) -> Vec<Fault> {
    let mut found = of_the_set(set);
    let mut seen = BTreeSet::new();
    for rule in set.rules() {
        let mut note = |member, reason| {
            let place = Some((rule.form, rule.index));
            found.push(Fault { place, member, rule: rule.id.to_owned(), reason });
        };
        if !plain(rule.id) {
            note("id", "an id is made of small letters, digits and hyphens");
        }
        if !seen.insert(rule.id) {
            note("id", "this id is used twice in the set");
        }
        if rule.source.status == Status::Unconfirmed && rule.source.on {
            note("source", "an unconfirmed rule ships switched off: set on = false");
        }
        if !rule.source.on && rule.source.why.as_deref().is_none_or(str::is_empty) {
            note("source", "a rule that is switched off says why");
        }
    }
    found.extend(mute(set));
    found
}

fn of_the_set(set: &RuleSet) -> Vec<Fault> {
    let fault = |member, reason| Fault { place: None, member, rule: set.id.clone(), reason };
    let mut found = Vec::new();
    if !plain(&set.id) {
        found.push(fault("id", "the set's id is made of small letters, digits and hyphens"));
    }
    if set.effective_to.is_some_and(|end| end <= set.effective_from) {
        found.push(fault("effective_to", "effective_to must be later than effective_from"));
    }
    found
}

fn plain(id: &str) -> bool {
    let letter = |c: char| c.is_ascii_lowercase() || c.is_ascii_digit() || c == '-';
    !id.is_empty() && id.chars().all(letter)
}

/// Rules that could never speak, or that would compare unlike things.
fn mute(set: &RuleSet) -> Vec<Fault> {
    let mut found = Vec::new();
    macro_rules! look {
        ($form:ident, $member:expr, |$rule:ident| $reason:expr) => {
            for (index, $rule) in set.$form.iter().enumerate() {
                let reason: Option<&'static str> = $reason;
                found.extend(reason.map(|reason| Fault {
                    place: Some((stringify!($form), index)),
                    member: $member,
                    rule: $rule.id.clone(),
                    reason,
                }));
            }
        };
    }
    look!(dose_limit, "limit", |rule| rule.fault());
    look!(timing_limit, "id", |rule| {
        (rule.sugar_used.is_empty() && rule.since_last_dose.is_none())
            .then_some("give it sugar_used or since_last_dose: as it stands it says nothing")
    });
    look!(level_band, "bands", |rule| {
        let open = rule.bands.iter().any(|band| band.above.is_none() && band.below.is_none());
        open.then_some("each band has a bound above or below")
    });
    look!(contaminant_limit, "markets", |rule| {
        rule.markets.is_empty().then_some("name the markets: as it stands it says nothing")
    });
    look!(gauge_required, "steps", |rule| {
        (rule.steps.is_empty() || rule.measures.is_empty())
            .then_some("name the steps and what is measured: as it stands it says nothing")
    });
    look!(entry_deadline, "events", |rule| {
        rule.events.is_empty().then_some("name the events: as it stands it says nothing")
    });
    look!(category_claim, "claim", |rule| rule.fault());
    found
}

#[cfg(test)]
mod tests;
