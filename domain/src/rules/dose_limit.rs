//! How much of a substance, or of a family of substances, a liquid may be given over its life.
//!
//! The dose is the sum over every lot that carries the substance, earlier additions and the proposal together, on the
//! liquid volume: present fill and planned fill both, and the stricter decides. The comparison is exact.

use std::cmp::Ordering;

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::remedy::{Cap, Ground};
use crate::checks::situation::Line;
use crate::checks::{Finding, Verdict};
use crate::units::Dimension;

use super::Source;
use super::exact::{PARTS, Ratio, concentration, grouped};

/// What is summed.
#[derive(Clone, Copy, Debug, Default, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Counts {
    /// The mass of the substances.
    #[default]
    Substance,
    /// The volume of the water that materials are carried in.
    CarrierWater,
}

/// A ceiling on the total of one substance or family over the life of a batch.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct DoseLimit {
    /// Unique in the set.
    pub id: String,
    /// What it is called in a sentence.
    pub name: String,
    /// What is summed.
    #[serde(default)]
    pub counts: Counts,
    /// The family: as named in compositions.
    #[serde(default)]
    pub substances: Vec<String>,
    /// The ceiling, exact.
    pub limit: Ratio,
    /// The metric figure printed beside it, which need not be the exact conversion.
    #[serde(default)]
    pub printed: Option<String>,
    /// What a breach means.
    #[serde(default = "refuse")]
    pub breach: Verdict,
    /// What else the person should know.
    #[serde(default)]
    pub note: Option<String>,
    /// Where it comes from.
    pub source: Source,
}

const fn refuse() -> Verdict {
    Verdict::Refuse
}

/// How much of a line is the substance.
#[derive(Clone, Copy, Debug, Eq, PartialEq)]
enum Share {
    /// None of it, as far as is known.
    None,
    /// So many base units × [`PARTS`].
    Parts(i128),
    /// Listed as the substance, without a stated content: counted whole.
    Whole(i128),
    /// It carries the substance, but was measured by volume.
    NotWeighed,
}

/// The dose so far and with the proposal, base units × [`PARTS`].
#[derive(Clone, Debug, Default)]
struct Tally {
    already: i128,
    proposed: i128,
    lines: Vec<usize>,
    whole: bool,
    not_weighed: Option<String>,
    not_weighed_earlier: bool,
}

impl Tally {
    const fn total(&self) -> i128 {
        self.already + self.proposed
    }
}

impl DoseLimit {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        let tally = self.tally(case);
        let mut noticed = Vec::new();
        if let Some(lot) = &tally.not_weighed {
            noticed.push(self.not_weighed(mark, lot).into());
        }
        if tally.proposed == 0 {
            return noticed;
        }
        if tally.not_weighed_earlier {
            noticed.push(self.earlier_not_weighed(mark).into());
        }
        let Some(volume_ul) = case.strictest_volume_ul() else {
            noticed.push(self.no_volume(mark).into());
            return noticed;
        };
        if self.limit.compare(tally.total(), volume_ul) == Ordering::Greater {
            noticed.push(self.over(case, mark, &tally, volume_ul));
        } else {
            noticed.push(self.within(case, mark, &tally, volume_ul).into());
        }
        noticed
    }

    /// What of the substance may still go in at the present and the planned fill, base units; `None` without a volume.
    pub(crate) fn rest(&self, case: &Case<'_>) -> Option<i128> {
        let already = self.tally(case).already;
        let volume_ul = case.strictest_volume_ul()?;
        Some((self.limit.most(volume_ul) - already).max(0) / PARTS)
    }

    fn tally(&self, case: &Case<'_>) -> Tally {
        if self.counts == Counts::CarrierWater {
            return Tally {
                already: PARTS * case.earlier_water_ul(),
                proposed: PARTS * i128::from(case.proposed.carrier_water_ul.max(0)),
                ..Tally::default()
            };
        }
        let mut tally = Tally::default();
        for line in case.earlier_lines() {
            match self.share(line) {
                Share::None => {}
                Share::Parts(parts) | Share::Whole(parts) => tally.already += parts,
                Share::NotWeighed => tally.not_weighed_earlier = true,
            }
        }
        for (index, line) in case.proposed_lines().enumerate() {
            let share = self.share(line);
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

    fn share(&self, line: &Line) -> Share {
        let stated: Option<i64> = self
            .substances
            .iter()
            .filter_map(|name| line.composition.get(name))
            .copied()
            .reduce(i64::saturating_add);
        let listed = || line.names().any(|name| self.substances.contains(&name));
        let (parts, whole) = match stated {
            Some(0) => return Share::None,
            Some(parts) => (i128::from(parts), false),
            None if listed() => (PARTS, true),
            None => return Share::None,
        };
        match line.amount.dimension() {
            Ok(Dimension::Mass) => {
                let total = i128::from(line.amount.base()) * parts;
                if whole { Share::Whole(total) } else { Share::Parts(total) }
            }
            _ => Share::NotWeighed,
        }
    }

    fn over(&self, case: &Case<'_>, mark: &Mark<'_>, tally: &Tally, volume_ul: i64) -> Noticed {
        let rest = (self.limit.most(volume_ul) - tally.already).max(0);
        let dose = self.shown_dose(case, tally, volume_ul, true);
        let sentence = format!(
            "{} would come to {dose}; the limit is {} ({}, {}).",
            self.name,
            self.shown_limit(case, volume_ul),
            self.limit.text(),
            self.source.citation,
        );
        let mut finding = self.measured(case, mark, self.breach, sentence, tally, volume_ul, true);
        if self.counts == Counts::CarrierWater {
            let rest_l = litres(rest / PARTS);
            finding = finding.param("rest_l", rest_l.clone()).cured_by(format!(
                "Use at most {rest_l} L of water, or stir it up in the liquid itself."
            ));
            return finding.into();
        }
        let cap = Cap {
            lines: tally.lines.clone(),
            rest,
            proposed: tally.proposed,
            ground: Ground::Dose { citation: self.source.citation.clone() },
        };
        Noticed { finding, cap: Some(cap) }
    }

    fn within(&self, case: &Case<'_>, mark: &Mark<'_>, tally: &Tally, volume_ul: i64) -> Finding {
        let sentence = format!(
            "{}: {} of at most {} ({}, {}).",
            self.name,
            self.shown_dose(case, tally, volume_ul, false),
            self.shown_limit(case, volume_ul),
            self.limit.text(),
            self.source.citation,
        );
        self.measured(case, mark, Verdict::Clear, sentence, tally, volume_ul, false)
    }

    #[expect(clippy::too_many_arguments, reason = "what a dose finding is made of, in one place")]
    fn measured(
        &self,
        case: &Case<'_>,
        mark: &Mark<'_>,
        verdict: Verdict,
        mut sentence: String,
        tally: &Tally,
        volume_ul: i64,
        over: bool,
    ) -> Finding {
        if tally.whole {
            sentence.push_str(" The content is not stated, so the whole lot was counted.");
        }
        if let Some(note) = &self.note {
            sentence.push(' ');
            sentence.push_str(note);
        }
        let unit = self.unit();
        let value = concentration(tally.total(), volume_ul, over).unwrap_or_default();
        let mut finding = mark
            .finding(&self.id, &self.source, verdict, sentence)
            .measured(value, self.limit.per_thousand(), unit)
            .param("volume_l", litres(i128::from(volume_ul)));
        let suffix = if unit == "mg/L" { "mg_l" } else { "ml_l" };
        for (name, volume) in case.volumes() {
            let over = self.limit.compare(tally.total(), volume) == Ordering::Greater;
            if let Some(value) = concentration(tally.total(), volume, over) {
                finding = finding.param(&format!("dose_{name}_{suffix}"), value);
            }
        }
        if let Some(value) = concentration(tally.already, volume_ul, false) {
            finding = finding.param(&format!("already_{suffix}"), value);
        }
        finding
    }

    fn not_weighed(&self, mark: &Mark<'_>, lot: &str) -> Finding {
        let sentence = format!(
            "{lot} carries {}, but was given by volume: its dose cannot be held against {}.",
            self.name.to_lowercase(),
            self.source.citation,
        );
        mark.finding(&self.id, &self.source, self.breach, sentence)
            .cured_by("Weigh it and propose it by mass.")
    }

    fn earlier_not_weighed(&self, mark: &Mark<'_>) -> Finding {
        let sentence = format!(
            "An earlier addition carried {}, given by volume: the sum here leaves it out.",
            self.name.to_lowercase(),
        );
        mark.finding(&self.id, &self.source, self.breach.min(Verdict::Advise), sentence)
            .cured_by("Amend the earlier addition with its mass.")
    }

    fn no_volume(&self, mark: &Mark<'_>) -> Finding {
        let sentence = format!(
            "No liquid volume is known, so {} cannot be held against {}.",
            self.name.to_lowercase(),
            self.source.citation,
        );
        mark.finding(&self.id, &self.source, self.breach, sentence)
            .cured_by("Record the fill first.")
    }

    fn unit(&self) -> &'static str {
        match self.limit.measure() {
            Dimension::Volume => "mL/L",
            _ => "mg/L",
        }
    }

    /// `1.0000 g/L`, with the planned fill beside it where there is one.
    fn shown_dose(&self, case: &Case<'_>, tally: &Tally, volume_ul: i64, over: bool) -> String {
        if self.counts == Counts::CarrierWater {
            return format!("{} L", litres(tally.total() / PARTS));
        }
        let mut text = spoken(&concentration(tally.total(), volume_ul, over).unwrap_or_default());
        for (name, volume) in case.volumes() {
            if volume != volume_ul
                && let Some(value) = concentration(tally.total(), volume, over)
            {
                text.push_str(&format!(" ({} at the {name} fill)", spoken(&value)));
            }
        }
        text
    }

    fn shown_limit(&self, case: &Case<'_>, volume_ul: i64) -> String {
        debug_assert!(case.volumes().iter().any(|(_, volume)| *volume == volume_ul));
        if self.counts == Counts::CarrierWater {
            return format!("{} L", litres(self.limit.most(volume_ul) / PARTS));
        }
        spoken(&self.limit.per_thousand())
    }
}

/// Litres with one digit, cut off.
fn litres(volume_ul: i128) -> String {
    let tenths = volume_ul / 100_000;
    format!("{}.{}", tenths / 10, tenths % 10)
}

/// `958.611` mg/L as `0.958611 g/L`; small ones stay in mg/L.
fn spoken(mg_l: &str) -> String {
    let Some((whole, fraction)) = mg_l.split_once('.') else { return format!("{mg_l} mg/L") };
    if whole.len() < 3 {
        return format!("{mg_l} mg/L");
    }
    let (grams, rest) = whole.split_at(whole.len() - 3);
    let grams = if grams.is_empty() { "0" } else { grams };
    format!("{}.{rest}{fraction} g/L", grouped(grams))
}
