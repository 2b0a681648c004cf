//! Under-feeding, which is a risk as real as excess.

use crate::rules::exact::grouped;

use super::case::Case;
use super::finding::{Basis, Finding, Verdict};
use super::number::{fixed, real, whole};
use super::remedy::shown_grams;
use super::substances::PER_MICROGRAM;

/// Nitrogen in diammonium phosphate (derived from the atomic masses, see `substances`).
const DAP: f64 = 0.212_137;

/// A shortage once the proposal is in: information with the amount that would cure it while the feeding window is open,
/// pointed out once it has closed.
pub(crate) fn shortage(case: &Case<'_>) -> Option<Finding> {
    let shortage = case.after.shortage().filter(|missing| *missing > 0.0)?;
    let supply = fixed(case.after.supply?, 1);
    let need = fixed(case.after.need, 1);
    let missing_g = shortage * real(i128::from(case.volume_ul()?)) / 1e9;
    let closed = case.window_closed() && case.situation.active;
    let verdict = if closed { Verdict::Advise } else { Verdict::Clear };
    let mut sentence = format!(
        "Supply would be {supply} mg N/L, {} short of the need of {need}.",
        fixed(shortage, 1)
    );
    if closed {
        sentence.push_str(" The time for feeding has passed: watch for sticking.");
    }
    let mut finding = Finding::new("need.shortage", verdict, Basis::Guidance, sentence)
        .measured(supply.clone(), need.clone(), "mg N/L")
        .param("supply_mg_l", supply)
        .param("need_mg_l", need)
        .param("shortage_mg_l", fixed(shortage, 1))
        .param("missing_nitrogen_g", fixed(missing_g, 1))
        .param("as_diammonium_phosphate_g", fixed(missing_g / DAP, 0))
        .param("sugar_g_l", fixed(case.situation.sugar_g_l, 1));
    if let Some((sugar, _)) = &case.situation.other_sugar {
        finding = finding.param("other_sugar_g_l", fixed(*sugar, 1));
    }
    finding.citation =
        Some("need = max(140, factor × sugar): Brice et al. 2014; Bisson & Butzke 2000".to_owned());
    Some(if closed { finding.cured_by(WATCH) } else { finding.cured_by(cure(case, missing_g)) })
}

const WATCH: &str = "Take gravities more often and keep the temperature even; nitrogen this late is often not taken up.";

/// The nitrogen missing, also as the amount of the proposed lot or of diammonium phosphate that carries it.
fn cure(case: &Case<'_>, missing_g: f64) -> String {
    let nitrogen = fixed(missing_g, 1);
    let same_lot = only_feed(case)
        .map(|(lot, per_gram)| (lot, missing_g / per_gram))
        .map(|(lot, grams)| format!("{} g more of {lot}", whole_grams(grams)));
    let amount = same_lot.unwrap_or_else(|| {
        format!(
            "{} g of diammonium phosphate, if a dose limit leaves room",
            whole_grams(missing_g / DAP)
        )
    });
    format!("{nitrogen} g more nitrogen meets the need: {amount}, in good time and in portions.")
}

/// The one lot of the proposal that brings nitrogen, and how many grams of it a gram holds.
fn only_feed<'a>(case: &Case<'a>) -> Option<(&'a str, f64)> {
    let mut feeds = case.proposed_lines().filter_map(|line| Some((line, line.nitrogen()?)));
    let (line, nitrogen) = feeds.find(|(_, nitrogen)| *nitrogen > 0)?;
    if feeds.any(|(_, nitrogen)| nitrogen > 0) || line.has_ammonium() {
        return None;
    }
    let per_gram = real(nitrogen) / real(PER_MICROGRAM) / real(i128::from(line.amount.base()));
    Some((&line.lot_code, per_gram))
}

fn whole_grams(grams: f64) -> String {
    grouped(&shown_grams(whole(grams.ceil() * 1e6, i64::MAX)))
}
