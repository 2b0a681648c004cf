//! What cannot be: more than there is. And what should not be: doing what was just refused.

use std::collections::BTreeMap;

use crate::rules::exact::grouped;
use crate::settings::Setting;
use crate::units::{Dimension, Quantity};

use super::case::Case;
use super::finding::{Basis, Finding, Remedy, Verdict};
use super::remedy::shown_grams;
use super::situation::ProposedLine;

/// A proposal of more than the stock is refused; if it has been done, the stock's record is in doubt.
pub(crate) fn not_enough(case: &Case<'_>) -> Vec<Finding> {
    let mut lots: BTreeMap<&str, (i64, &ProposedLine)> = BTreeMap::new();
    for line in &case.proposed.lines {
        let lot = lots.entry(&line.line.lot_code).or_insert((0, line));
        lot.0 = lot.0.saturating_add(line.line.amount.base());
    }
    lots.into_iter()
        .filter(|(_, (wanted, line))| *wanted > line.remaining_base)
        .map(|(lot, (wanted, line))| short(case, lot, wanted, line))
        .collect()
}

fn short(case: &Case<'_>, lot: &str, wanted: i64, line: &ProposedLine) -> Finding {
    let left = line.remaining_base.max(0);
    let dimension = line.line.amount.dimension().unwrap_or(Dimension::Mass);
    let (wanted, have) = (shown(wanted, dimension), shown(left, dimension));
    let sentence = format!("Lot {lot} has {have} left by the book, and {wanted} is asked for.");
    let verdict = if case.proposed.already_done { Verdict::Advise } else { Verdict::Refuse };
    let mut finding = Finding::new("stock.not-enough", verdict, Basis::CommonPractice, sentence);
    finding.remedy = Some(if case.proposed.already_done {
        Remedy { sentence: "Count the lot and correct the stock.".to_owned(), lot_amount: None }
    } else {
        Remedy {
            sentence: format!("Use at most {have}, and another lot for the rest."),
            lot_amount: lot_amount(left, dimension),
        }
    });
    finding
}

fn lot_amount(base: i64, dimension: Dimension) -> Option<Quantity> {
    match dimension {
        Dimension::Mass => Quantity::parse(&shown_grams(base), "g", Dimension::Mass).ok(),
        _ => Some(Quantity::computed(base, dimension)),
    }
}

fn shown(base: i64, dimension: Dimension) -> String {
    match dimension {
        Dimension::Mass => format!("{} g", grouped(&shown_grams(base))),
        Dimension::Volume => format!("{} mL", grouped(&(base / 1_000).to_string())),
        Dimension::Count | Dimension::Fraction => base.to_string(),
    }
}

/// Doing at once what was just refused or referred is told of itself.
pub(crate) fn against_own_refusal(case: &Case<'_>) -> Option<Finding> {
    (case.proposed.already_done && case.proposed.recent_refusal).then(|| {
        let minutes = case.situation.settings.text(Setting::OwnRefusalMinutes);
        let sentence = format!(
            "Done within {minutes} min of the same person's own proposal being refused or referred."
        );
        Finding::new("record.after-own-refusal", Verdict::Refer, Basis::SiteSetting, sentence)
            .param("window_min", minutes)
    })
}
