//! Under-feeding, which is a risk as real as excess.

use std::collections::BTreeMap;

use crate::rules::exact::grouped;
use crate::units::{Dimension, Quantity};

use super::case::Case;
use super::finding::{Basis, Finding, Verdict};
use super::number::{fixed, real, whole};
use super::situation::{Category, Line, LotStatus, ProposedLine};

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
        "Supply is {supply} mg N/L with this, {} short of the need of {need}.",
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
        .param("as_diammonium_phosphate_g", fixed((missing_g / DAP).ceil(), 0))
        .param("sugar_g_l", fixed(case.situation.sugar_g_l, 1));
    if let Some((sugar, _)) = &case.situation.other_sugar {
        finding = finding.param("other_sugar_g_l", fixed(*sugar, 1));
    }
    finding.citation =
        Some("need = max(140, factor × sugar): Brice et al. 2014; Bisson & Butzke 2000".to_owned());
    Some(if closed { finding.cured_by(WATCH) } else { finding.cured_by(cure(case, missing_g)) })
}

const WATCH: &str = "Take gravities more often and keep the temperature even; nitrogen this late is often not taken up.";

/// The nitrogen missing, also as the amount of the proposed lot or of diammonium phosphate that carries it, where the
/// dose limits leave room for so much.
fn cure(case: &Case<'_>, missing_g: f64) -> String {
    let nitrogen = fixed(missing_g, 1);
    let amount = more_of_the_lot(case, missing_g).or_else(|| as_phosphate(case, missing_g));
    let amount = amount.unwrap_or_else(|| {
        "dose limits leave no room for all of it as one material, so use amino nitrogen as well"
            .to_owned()
    });
    format!("{nitrogen} g more nitrogen meets the need: {amount}. In good time, and in portions.")
}

/// More of the one lot of the proposal that brings nitrogen, if it brings no ammonium.
fn more_of_the_lot(case: &Case<'_>, missing_g: f64) -> Option<String> {
    let feed = only_feed(case)?;
    let nitrogen_g = case.nitrogen_mg() / 1_000.0;
    let proposed_g = real(i128::from(feed.line.amount.base())) / 1e6;
    let more = with_mass(feed, missing_g * proposed_g / nitrogen_g)?;
    lawful(case, &more)
        .then(|| format!("{} g more of {}", grams(&more.line.amount), feed.line.lot_code))
}

fn only_feed<'a>(case: &Case<'a>) -> Option<&'a ProposedLine> {
    let brings = |line: &&ProposedLine| line.line.nitrogen().is_some_and(|sum| sum > 0);
    let mut feeds = case.proposed.lines.iter().filter(brings);
    let feed = feeds.next().filter(|feed| !feed.line.has_ammonium())?;
    feeds.next().is_none().then_some(feed)
}

fn as_phosphate(case: &Case<'_>, missing_g: f64) -> Option<String> {
    let salt = ProposedLine {
        line: Line {
            lot_code: String::new(),
            material_name: String::new(),
            category: Category::Nutrient,
            composition: BTreeMap::from([("diammonium_phosphate".to_owned(), 1_000_000_000)]),
            listed_as: Vec::new(),
            amount: Quantity::computed(0, Dimension::Mass),
        },
        lot_status: LotStatus::Released,
        hold_reason: None,
        expires_at: None,
        remaining_base: 0,
    };
    let salt = with_mass(&salt, missing_g / DAP)?;
    lawful(case, &salt).then(|| format!("{} g of diammonium phosphate", grams(&salt.line.amount)))
}

/// The same line with so many grams, rounded up to the next whole one.
fn with_mass(line: &ProposedLine, mass_g: f64) -> Option<ProposedLine> {
    let whole_g = whole(mass_g.ceil(), i64::MAX);
    let amount = Quantity::parse(&whole_g.to_string(), "g", Dimension::Mass).ok()?;
    Some(ProposedLine { line: Line { amount, ..line.line.clone() }, ..line.clone() })
}

fn grams(amount: &Quantity) -> String {
    grouped(amount.entered())
}

/// Whether the proposal and this line together stay within every dose rule that binds.
fn lawful(case: &Case<'_>, more: &ProposedLine) -> bool {
    let mut proposed = case.proposed.clone();
    proposed.lines.push(more.clone());
    let with_more = Case::new(case.situation, &proposed);
    case.binding.iter().all(|adopted| {
        let mut rules = adopted.set.dose_limit.iter().filter(|rule| rule.source.on);
        rules.all(|rule| rule.keeps(&with_more))
    })
}
