//! "May I add this now?": what a proposal is held against, and the answer with its reasons.
//!
//! [`assess`] is a pure function of a [`Situation`] and of what is [`Proposed`]. All findings are given at once, each
//! with its number, its limit, its source and what would remove it; the worst one is the verdict. What is not known is
//! a finding too. A limit shown is never legal advice, and a computed level never a laboratory analysis.
//!
//! Doses are judged on the liquid volume, present and planned fill both; sums are exact integers. Compositions name
//! substances in small letters with underscores: `diammonium_phosphate`, `monoammonium_phosphate`, `ammonium_sulfate`,
//! `ammonium_nitrogen`, `amino_nitrogen`, `thiamine_hydrochloride`, `yeast_cell_walls`, `soy_flour`,
//! `calcium_pantothenate`, `urea`, `sulfur_dioxide` and whatever else a rule set names. The `f64` of a situation are
//! finite; none of them reaches an entry except as a decimal text.
//!
//! What is not here yet: ethyl carbamate, fusel pressure, process findings. Claims, residues, markets' contaminants,
//! order and records are not about an addition alone: [`crate::rules::release`] answers those.

mod account;
pub(crate) mod case;
pub(crate) mod cautions;
mod finding;
mod measure;
mod need;
pub(crate) mod number;
pub mod plausibility;
pub(crate) mod remedy;
pub(crate) mod situation;
mod stock;
mod substances;

use crate::rules::RuleSet;
use crate::rules::lot_status::LotStatusRule;

use self::case::{Case, Mark, Noticed};
use self::number::fixed;

pub use self::cautions::always as always_cautions;
pub use self::finding::{
    Account, Assessment, Basis, Caution, Finding, FractionUsed, Remedy, SetUsed, Verdict,
};
pub use self::situation::{
    AdoptedSet, Category, Done, Fraction, Line, LotStatus, Preparation, Proposed, ProposedLine,
    Situation, Standing, Yan,
};
pub use self::substances::nitrogen_mg_l;

/// The version of the crate, and of the way it assesses.
pub const ENGINE: &str = concat!("tallystave ", env!("CARGO_PKG_VERSION"), "/1");

/// Holds a proposal against everything that binds it.
pub fn assess(situation: &Situation<'_>, proposed: &Proposed) -> Assessment {
    let case = Case::new(situation, proposed);
    let mut noticed = by_rules(&case);
    noticed.extend(by_house(&case));
    remedy::attach(&case, &mut noticed);
    let mut findings: Vec<Finding> = noticed.into_iter().map(|one| one.finding).collect();
    findings.sort_by_key(|finding| std::cmp::Reverse(finding.verdict));
    Assessment {
        verdict: findings.first().map_or(Verdict::Clear, |worst| worst.verdict),
        findings,
        account_before: case.before.written(situation),
        account_after: case.after.written(situation),
        fraction_used: situation.fraction.as_ref().map(|fraction| FractionUsed {
            low: fixed(fraction.low, 3),
            mid: fixed(fraction.mid, 3),
            high: fixed(fraction.high, 3),
        }),
        engine: ENGINE.to_owned(),
        rule_sets: case.binding.iter().map(|adopted| set_used(adopted)).collect(),
        cautions: cautions::cautions(&case),
    }
}

fn set_used(adopted: &AdoptedSet) -> SetUsed {
    SetUsed {
        id: adopted.set.id.clone(),
        version: adopted.set.version.clone(),
        digest: adopted.digest.clone(),
        standing: adopted.standing.name(),
    }
}

/// Every rule that is on, of every set that binds.
fn by_rules(case: &Case<'_>) -> Vec<Noticed> {
    let mut noticed = Vec::new();
    for adopted in &case.binding {
        let set: &RuleSet = &adopted.set;
        let mark = Mark::Set(adopted);
        macro_rules! run {
            ($($form:ident)*) => { $(
                for rule in set.$form.iter().filter(|rule| rule.source.on) {
                    noticed.extend(rule.check(case, &mark));
                }
            )* };
        }
        run!(positive_list dose_limit timing_limit level_band lot_status measurement_age preparation);
    }
    noticed
}

/// What every cellar is told, whatever it has adopted.
fn by_house(case: &Case<'_>) -> Vec<Noticed> {
    let mut noticed = Vec::new();
    let has_lot_rule = |set: &RuleSet| set.lot_status.iter().any(|rule| rule.source.on);
    if !case.binding.iter().any(|adopted| has_lot_rule(&adopted.set)) {
        noticed.extend(LotStatusRule::house().check(case, &Mark::House("lot")));
    }
    let mut findings = stock::not_enough(case);
    findings.extend(stock::against_own_refusal(case));
    findings.extend(need::shortage(case));
    findings.extend(measure::unknowns(case));
    noticed.extend(findings.into_iter().map(Noticed::from));
    noticed
}

#[cfg(test)]
mod tests;
