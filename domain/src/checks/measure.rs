//! What is not known is told, with what to measure: never a silent `clear`, whatever sets are adopted.

use crate::rules::dose_limit::Counts;

use super::account::since_sample;
use super::case::Case;
use super::finding::{Basis, Finding, Verdict};
use super::situation::{AdoptedSet, Line, Standing};

/// Everything that could not be judged.
pub(crate) fn unknowns(case: &Case<'_>) -> Vec<Finding> {
    let mut findings: Vec<Finding> = coverage(case).into_iter().collect();
    if case.feeds() {
        findings.extend(volume_missing(case));
        findings.extend(yan_missing(case));
        findings.extend(nitrogen_unknown(case));
        findings.extend(earlier_unknown(case));
        findings.extend(fraction_unknown(case));
    }
    findings.extend(forecast_note(case));
    findings
}

/// Where no law was held against the dose, the answer says so.
fn coverage(case: &Case<'_>) -> Option<Finding> {
    let covers = |adopted: &AdoptedSet| {
        adopted.standing == Standing::Production
            && adopted.set.dose_limit.iter().any(|rule| {
                rule.source.on
                    && rule.source.basis == Basis::Law
                    && rule.counts == Counts::Substance
                    && rule.is_about(&case.situation.product_class)
            })
    };
    if case.binding.iter().copied().any(covers) {
        return None;
    }
    let sentence = format!(
        "No adopted set limits nutrients at these premises: no legal dose check was made here (product class {}, premises {}).",
        case.situation.product_class.replace('_', " "),
        case.situation.premises_kind.replace('_', " "),
    );
    Some(Finding::new("coverage.no-dose-law", Verdict::Clear, Basis::Law, sentence))
}

fn advise(rule: &str, sentence: String, remedy: &str) -> Finding {
    Finding::new(rule, Verdict::Advise, Basis::CommonPractice, sentence).cured_by(remedy)
}

fn volume_missing(case: &Case<'_>) -> Option<Finding> {
    case.volume_ul().is_none().then(|| {
        advise(
            "measure.volume-missing",
            "No liquid volume is known: nothing per litre could be judged.".to_owned(),
            "Record the fill first.",
        )
    })
}

fn yan_missing(case: &Case<'_>) -> Option<Finding> {
    case.situation.yan.is_none().then(|| {
        advise(
            "measure.yan-missing",
            "No nitrogen analysis: whether this is too little or too much cannot be said."
                .to_owned(),
            "Sample the full batch; measure ammonium and primary amino nitrogen.",
        )
    })
}

fn nitrogen_unknown(case: &Case<'_>) -> Vec<Finding> {
    case.proposed_lines()
        .filter(|line| line.nitrogen().is_none())
        .map(|line| {
            advise(
                "measure.nitrogen-unknown",
                format!("The nitrogen that {} brings is not known: it counts nothing here.", line.lot_code),
                "Weigh it, and enter amino_nitrogen and ammonium_nitrogen from the lot's analysis; 0 if it says none.",
            )
        })
        .collect()
}

fn earlier_unknown(case: &Case<'_>) -> Option<Finding> {
    let unknown = |line: &&Line| line.nitrogen().is_none();
    let line = since_sample(case.situation).flat_map(|done| &done.lines).find(unknown)?;
    Some(advise(
        "measure.earlier-nitrogen-unknown",
        format!(
            "{} went in earlier with unknown nitrogen: the supply may be higher.",
            line.lot_code
        ),
        "Measure ammonium and primary amino nitrogen again.",
    ))
}

fn fraction_unknown(case: &Case<'_>) -> Option<Finding> {
    if !case.situation.active {
        return None;
    }
    if case.situation.last_gravity_at.is_none() {
        return Some(advise(
            "measure.gravity-missing",
            "No gravity since pitching: how much sugar is used cannot be said.".to_owned(),
            "Take a gravity first.",
        ));
    }
    case.situation.fraction.is_none().then(|| {
        advise(
            "measure.fraction-unknown",
            "There is no forecast: whether this is late was not judged.".to_owned(),
            "Take a gravity, and enter the expected final gravity.",
        )
    })
}

fn forecast_note(case: &Case<'_>) -> Option<Finding> {
    let note = case.situation.fraction.as_ref()?.out_of_range_note.clone()?;
    Some(Finding::new("forecast.out-of-range", Verdict::Clear, Basis::Model, note))
}
