//! Questions to the adopted sets that are not about an addition: may it be released, and where; does it keep its
//! claims; is a step in order and gauged; was it entered in time; how long is it kept.
//!
//! Each function asks every rule of its forms that is on, in every set that binds [`Place`]; nothing is assumed that
//! the caller does not hand in.

use jiff::civil::Date;

use crate::checks::case::Mark;
use crate::checks::situation::{AdoptedSet, Standing};
use crate::checks::{Basis, Finding, Verdict};
use crate::stamp::Micros;

use super::category_claim::Claimed;
use super::contaminant_limit::covers;
use super::entry_deadline::Entered;
use super::gauge_required::Gauge;
use super::held::{Held, Outcome};
use super::product::Product;
use super::sequence::{Course, Step};

/// Where and when a question is asked.
#[derive(Clone, Copy, Debug)]
pub struct Place<'a> {
    /// The kind of premises.
    pub premises_kind: &'a str,
    /// The class of product.
    pub product_class: &'a str,
    /// The markets it is meant for.
    pub destinations: &'a [String],
    /// The time of the event.
    pub at: Micros,
}

/// Whether a product may be released, here and by market.
#[derive(Clone, Debug, PartialEq)]
pub struct Release {
    /// What the sets say that bind where we are.
    pub here: Vec<Finding>,
    /// The worst of those.
    pub verdict: Verdict,
    /// Each destination, in the order asked.
    pub markets: Vec<Market>,
}

/// One destination.
#[derive(Clone, Debug, PartialEq)]
pub struct Market {
    /// Its name.
    pub market: String,
    /// Open, closed, or to be measured first.
    pub state: MarketState,
    /// Why, worst first.
    pub findings: Vec<Finding>,
}

/// What a market is to a product.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
pub enum MarketState {
    /// No rule that was asked stands against it.
    Open,
    /// A law there is broken.
    Closed,
    /// Something must be measured first.
    Measure,
}

impl MarketState {
    /// The word used in columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Open => "open",
            Self::Closed => "closed",
            Self::Measure => "measure",
        }
    }
}

/// May this product be released, and to which of its destinations?
pub fn release(sets: &[AdoptedSet], place: &Place<'_>, product: &Product) -> Release {
    let mut here = Vec::new();
    for adopted in binding(sets, place).filter(|one| one.standing == Standing::Production) {
        here.extend(residues(adopted, product).map(|held| held.finding));
    }
    here.sort_by_key(|finding| std::cmp::Reverse(finding.verdict));
    let verdict = here.first().map_or(Verdict::Clear, |worst| worst.verdict);
    let judged = |market: &String| one_market(sets, place, market, product);
    Release { here, verdict, markets: place.destinations.iter().map(judged).collect() }
}

fn one_market(sets: &[AdoptedSet], place: &Place<'_>, market: &str, product: &Product) -> Market {
    let mut held = Vec::new();
    for adopted in binding(sets, place) {
        match &adopted.standing {
            Standing::Production => {}
            Standing::Market { market: here } if covers(here, market) => {
                held.extend(residues(adopted, product));
            }
            Standing::Market { .. } => continue,
        }
        let mark = Mark::Set(adopted);
        let levels = adopted.set.contaminant_limit.iter().filter(|rule| rule.source.on);
        held.extend(levels.filter_map(|rule| rule.judge(market, product, &mark)));
    }
    let state = if held.iter().any(closes) {
        MarketState::Closed
    } else if held.iter().any(|one| one.outcome == Outcome::Measure) {
        MarketState::Measure
    } else {
        MarketState::Open
    };
    let mut findings: Vec<Finding> = held.into_iter().map(|one| one.finding).collect();
    findings.sort_by_key(|finding| std::cmp::Reverse(finding.verdict));
    if findings.is_empty() {
        findings.push(nothing_asked(market));
    }
    Market { market: market.to_owned(), state, findings }
}

fn closes(held: &Held) -> bool {
    held.outcome == Outcome::Broken && held.finding.verdict >= Verdict::Refer
}

/// Never a silent "open".
fn nothing_asked(market: &str) -> Finding {
    let sentence = format!(
        "No adopted set says what the market {market} lets this product hold: nothing was checked here."
    );
    Finding::new("coverage.no-market-rule", Verdict::Clear, Basis::Law, sentence)
}

fn residues<'a>(
    adopted: &'a AdoptedSet,
    product: &'a Product,
) -> impl Iterator<Item = Held> + use<'a> {
    let rules = adopted.set.residual_limit.iter().filter(|rule| rule.source.on);
    rules.filter_map(move |rule| rule.judge(product, &Mark::Set(adopted)))
}

/// The sets that bind there and then.
fn binding<'a>(
    sets: &'a [AdoptedSet],
    place: &'a Place<'_>,
) -> impl Iterator<Item = &'a AdoptedSet> {
    sets.iter().filter(|adopted| {
        let here = match &adopted.standing {
            Standing::Production => adopted.set.binds_premises(place.premises_kind),
            Standing::Market { market } => {
                place.destinations.iter().any(|destination| covers(market, destination))
            }
        };
        here && adopted.set.binds_class(place.product_class) && adopted.set.in_force(place.at)
    })
}

macro_rules! ask {
    ($sets:expr, $place:expr, $form:ident, |$rule:ident, $mark:ident| $judged:expr) => {{
        let mut findings: Vec<Finding> = Vec::new();
        for adopted in binding($sets, $place) {
            let $mark = Mark::Set(adopted);
            for $rule in adopted.set.$form.iter().filter(|rule| rule.source.on) {
                findings.extend($judged);
            }
        }
        findings
    }};
}

/// What contradicts the claims that a batch carries.
pub fn claims(sets: &[AdoptedSet], place: &Place<'_>, batch: &Claimed) -> Vec<Finding> {
    ask!(sets, place, category_claim, |rule, mark| rule.judge(batch, &mark))
}

/// What must come before the next step and has not.
pub fn order(sets: &[AdoptedSet], place: &Place<'_>, course: &Course<'_>) -> Vec<Finding> {
    ask!(sets, place, sequence, |rule, mark| rule.judge(course, &mark))
}

/// What must be gauged before the next step and was not since `changed_at`, when the quantity last changed.
pub fn gauging(
    sets: &[AdoptedSet],
    place: &Place<'_>,
    next: &Step,
    gauges: &[Gauge],
    changed_at: Micros,
) -> Vec<Finding> {
    ask!(sets, place, gauge_required, |rule, mark| rule.judge(next, gauges, changed_at, &mark))
}

/// What was entered too late; `holidays` are days on which no business is done, besides week-ends.
pub fn lateness(
    sets: &[AdoptedSet],
    place: &Place<'_>,
    entered: &Entered<'_>,
    holidays: &[Date],
) -> Vec<Finding> {
    ask!(sets, place, entry_deadline, |rule, mark| rule.judge(entered, holidays, &mark))
}

/// Why a record whose last needed entry is of that day may not be destroyed on another.
pub fn keeping(
    sets: &[AdoptedSet],
    place: &Place<'_>,
    last_entry: Date,
    destroyed: Date,
) -> Vec<Finding> {
    ask!(sets, place, retention, |rule, mark| rule.judge(last_entry, destroyed, &mark))
}

#[cfg(test)]
mod tests;
