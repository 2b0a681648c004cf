//! The amount that would remove a finding: the smallest of law, need and practice. The legal rest is small print.

use crate::rules::exact::{PARTS, grouped};
use crate::units::{Dimension, Quantity};

use super::case::{Case, Noticed};
use super::finding::Remedy;
use super::number::{real, whole};

/// What sets a cap.
#[derive(Clone, Debug, Eq, PartialEq)]
pub(crate) enum Ground {
    /// A dose rule.
    Dose {
        /// Where it is written.
        citation: String,
    },
    /// The need is met.
    Need,
}

/// A finding's cap: of what the lines bring (`proposed`), only `rest` may go in.
#[derive(Clone, Debug)]
pub(crate) struct Cap {
    /// Which lines of the proposal bring it.
    pub(crate) lines: Vec<usize>,
    /// What may go in.
    pub(crate) rest: i128,
    /// What would go in.
    pub(crate) proposed: i128,
    /// Why.
    pub(crate) ground: Ground,
}

impl Cap {
    /// The cap at the need: the room before the proposal against the nitrogen in it, in nanograms.
    pub(crate) fn to_need(case: &Case<'_>) -> Option<Self> {
        let volume_l = real(i128::from(case.volume_ul()?)) / 1e6;
        let room_mg = case.before.room()? * volume_l;
        let lines = case.proposed_lines().enumerate();
        let lines = lines.filter(|(_, line)| line.nitrogen().is_some_and(|sum| sum > 0));
        Some(Self {
            lines: lines.map(|(index, _)| index).collect(),
            rest: i128::from(whole(room_mg * 1e6, i64::MAX)),
            proposed: i128::from(whole(case.nitrogen_mg() * 1e6, i64::MAX)),
            ground: Ground::Need,
        })
    }

    /// Whether a line of one is a line of the other.
    fn touches(&self, other: &Self) -> bool {
        self.lines.iter().any(|line| other.lines.contains(line))
    }

    /// How much of `mass_ug` the cap leaves, rounded down.
    fn leaves(&self, mass_ug: i64) -> i64 {
        if self.rest >= self.proposed {
            return mass_ug;
        }
        let exact = i128::from(mass_ug).checked_mul(self.rest).map(|sum| sum / self.proposed);
        // Past 127 bits: as if the lot were all substance, which never leaves too much.
        let left = exact.unwrap_or(self.rest / PARTS);
        i64::try_from(left).unwrap_or(mass_ug).min(mass_ug)
    }
}

/// Gives every capped finding the one amount that would remove all of them, with the legal rest beside it.
pub(crate) fn attach(case: &Case<'_>, noticed: &mut [Noticed]) {
    let caps: Vec<Cap> = noticed.iter().filter_map(|one| one.cap.clone()).collect();
    for one in noticed {
        let Some(cap) = &one.cap else { continue };
        let mass_ug = mass_of(case, &cap.lines);
        let touching = caps.iter().filter(|other| other.touches(cap));
        let Some(tightest) = touching.min_by_key(|other| other.leaves(mass_ug)) else { continue };
        let grams = shown_grams(tightest.leaves(mass_ug));
        let own = shown_grams(cap.leaves(mass_ug));
        if let Ground::Dose { citation } = &cap.ground {
            one.finding.params.insert("law_rest_g".to_owned(), own.clone());
            let small = small_print(tightest, &own, citation);
            one.finding.remedy = Some(remedy(tightest, &grams, &small));
        } else {
            one.finding.remedy = Some(remedy(tightest, &grams, ""));
        }
    }
}

fn small_print(tightest: &Cap, own_grams: &str, citation: &str) -> String {
    if tightest.ground == Ground::Need {
        format!(" ({citation} alone would leave {} g.)", grouped(own_grams))
    } else {
        String::new()
    }
}

fn remedy(tightest: &Cap, grams: &str, small_print: &str) -> Remedy {
    let why = match &tightest.ground {
        Ground::Need => "that meets what this batch needs".to_owned(),
        Ground::Dose { citation } => format!("that is all {citation} leaves"),
    };
    let nothing = grams.bytes().all(|b| b == b'0' || b == b'.');
    let sentence = if nothing {
        let why = match &tightest.ground {
            Ground::Need => "what this batch needs is in it".to_owned(),
            Ground::Dose { citation } => format!("{citation} leaves nothing"),
        };
        format!("Add none: {why}.{small_print}")
    } else {
        format!("Add at most {} g: {why}.{small_print}", grouped(grams))
    };
    Remedy { sentence, lot_amount: Quantity::parse(grams, "g", Dimension::Mass).ok() }
}

fn mass_of(case: &Case<'_>, lines: &[usize]) -> i64 {
    let all = case.proposed_lines().enumerate();
    all.filter(|(index, _)| lines.contains(index))
        .fold(0, |sum, (_, line)| sum.saturating_add(line.amount.base()))
}

/// Grams rounded down as a scoop is read: whole from 10 g, tenths from 1 g, milligrams below.
pub(crate) fn shown_grams(mass_ug: i64) -> String {
    let (step, places) = match mass_ug {
        10_000_000.. => (1_000_000, 0),
        1_000_000.. => (100_000, 1),
        _ => (1_000, 3),
    };
    decimal_grams(mass_ug / step * step, places)
}

fn decimal_grams(mass_ug: i64, places: usize) -> String {
    let whole = mass_ug / 1_000_000;
    if places == 0 {
        return whole.to_string();
    }
    let fraction = format!("{:06}", mass_ug % 1_000_000);
    format!("{whole}.{}", &fraction[..places])
}
