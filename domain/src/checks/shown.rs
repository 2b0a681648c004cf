//! What a signer saw, in one canonical list: a signature binds its digest.

use serde_json::{Value, json};

use crate::stamp::Micros;

use super::finding::Assessment;
use super::situation::{Proposed, ProposedLine};

/// From when until when what is signed may be done.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub struct Window {
    /// The first instant.
    pub from: Micros,
    /// The last instant.
    pub until: Micros,
}

/// The id, the findings, the amounts and the window, as strings, integers, arrays and objects only; the caller writes
/// it in canonical form and hashes it.
pub fn shown_digest_input(
    proposal: &str,
    proposed: &Proposed,
    assessment: &Assessment,
    window: Window,
) -> Value {
    let findings: Vec<Value> = assessment
        .findings
        .iter()
        .map(|finding| {
            json!({
                "rule": finding.rule,
                "verdict": finding.verdict.name(),
                "sentence": finding.sentence,
                "params": finding.params,
            })
        })
        .collect();
    json!({
        "id": proposal,
        "verdict": assessment.verdict.name(),
        "findings": findings,
        "amounts": proposed.lines.iter().map(amount).collect::<Vec<_>>(),
        "carrier_water_ul": proposed.carrier_water_ul,
        "preparation": proposed.preparation.name(),
        "planned_at": proposed.planned_at.to_string(),
        "window": { "from": window.from.to_string(), "until": window.until.to_string() },
    })
}

fn amount(proposed: &ProposedLine) -> Value {
    let amount = &proposed.line.amount;
    json!({
        "lot": proposed.line.lot_code,
        "material": proposed.line.material_name,
        "entered": amount.entered(),
        "unit": amount.unit(),
        "base": amount.base(),
    })
}
