//! The sum that a dose rule judges.

use crate::checks::Line;
use crate::checks::case::Case;
use crate::rules::exact::PARTS;
use crate::units::Dimension;

use super::{Counts, DoseLimit, Over};

/// How much of a line is the substance.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
enum Share {
    /// None of it, as far as is known.
    None,
    /// So many base units × `PARTS`.
    Parts(i128),
    /// Listed as the substance, without a stated content: counted whole.
    Whole(i128),
    /// It carries the substance, but was not weighed.
    NotWeighed,
}

/// The dose so far and with the proposal, base units × `PARTS`.
#[derive(Clone, Debug, Default)]
pub(super) struct Tally {
    /// In the liquid already.
    pub(super) already: i128,
    /// In the proposal.
    pub(super) proposed: i128,
    /// Which lines of the proposal bring it.
    pub(super) lines: Vec<usize>,
    /// A line without a stated content was counted whole.
    pub(super) whole: bool,
    /// A lot of the proposal that was not weighed.
    pub(super) not_weighed: Option<String>,
    /// An earlier line was not weighed.
    pub(super) not_weighed_earlier: bool,
}

impl Tally {
    /// Sums what `rule` counts.
    pub(super) fn of(rule: &DoseLimit, case: &Case<'_>) -> Self {
        match rule.counts {
            Counts::Substance => Self::of_substance(rule, case),
            Counts::CarrierWater => Self {
                already: PARTS * case.earlier_water_ul(),
                proposed: PARTS * i128::from(case.proposed.carrier_water_ul.max(0)),
                ..Self::default()
            },
        }
    }

    fn of_substance(rule: &DoseLimit, case: &Case<'_>) -> Self {
        let mut tally = Self::default();
        if rule.over == Over::Life {
            tally.add_earlier(rule, case);
        }
        for (index, line) in case.proposed_lines().enumerate() {
            let share = share(rule, line);
            match share {
                Share::None => {}
                Share::Parts(parts) | Share::Whole(parts) => {
                    tally.proposed += parts;
                    tally.lines.push(index);
                    tally.whole |= matches!(share, Share::Whole(_));
                }
                Share::NotWeighed => tally.not_weighed = Some(line.lot_code.clone()),
            }
        }
        tally
    }

    fn add_earlier(&mut self, rule: &DoseLimit, case: &Case<'_>) {
        for line in case.earlier_lines() {
            match share(rule, line) {
                Share::None => {}
                Share::Parts(parts) | Share::Whole(parts) => self.already += parts,
                Share::NotWeighed => self.not_weighed_earlier = true,
            }
        }
    }

    /// So far and with the proposal.
    pub(super) const fn total(&self) -> i128 {
        self.already + self.proposed
    }
}

fn share(rule: &DoseLimit, line: &Line) -> Share {
    let stated = rule.substances.iter().filter_map(|name| {
        line.composition.get(name).map(|parts| counted(rule, name, i128::from(*parts)))
    });
    let (parts, whole) = match stated.reduce(i128::saturating_add) {
        Some(parts) => (parts, false),
        None => match line.names().find(|name| rule.substances.contains(name)) {
            Some(name) => (counted(rule, &name, PARTS), true),
            None => return Share::None,
        },
    };
    if parts <= 0 {
        return Share::None;
    }
    if line.amount.dimension() != Ok(Dimension::Mass) {
        return Share::NotWeighed;
    }
    let total = i128::from(line.amount.base()) * parts;
    if whole { Share::Whole(total) } else { Share::Parts(total) }
}

/// Parts of a substance as what the limit is expressed in.
fn counted(rule: &DoseLimit, name: &str, parts: i128) -> i128 {
    rule.counts_as.get(name).map_or(parts, |factor| factor.fraction().of_rounded_up(parts))
}
