//! How much of a substance, or of a family of substances, a liquid may be given over its life.
//!
//! The dose is the sum over every lot that carries the substance, earlier additions and the proposal together, on the
//! liquid volume: present fill and planned fill both, and the stricter decides. The comparison is exact.

mod tally;

use std::cmp::Ordering;
use std::collections::BTreeMap;

use serde::Deserialize;

use crate::checks::case::{Case, Mark, Noticed};
use crate::checks::remedy::{Cap, Ground};
use crate::checks::{Finding, Verdict};
use crate::units::Dimension;

use super::Source;
use super::exact::{Exact, PARTS, Ratio, concentration, grouped};
use super::rows::Rows;

use self::tally::Tally;

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

/// Over what the doses are summed.
#[derive(Clone, Copy, Debug, Default, Deserialize, Eq, PartialEq)]
#[serde(rename_all = "snake_case")]
pub enum Over {
    /// Every addition over the life of the batch.
    #[default]
    Life,
    /// One treatment: the proposal alone. For a law that says "for each treatment".
    Treatment,
}

/// A ceiling on the total of one substance or family over the life of a batch.
#[derive(Clone, Debug, Deserialize, PartialEq)]
#[serde(deny_unknown_fields)]
pub struct DoseLimit {
    /// Unique in the set.
    pub id: String,
    /// The collected rows it stands on.
    #[serde(default)]
    pub row: Rows,
    /// What it is called in a sentence.
    pub name: String,
    /// What is summed.
    #[serde(default)]
    pub counts: Counts,
    /// The family: as named in compositions.
    #[serde(default)]
    pub substances: Vec<String>,
    /// What one part of a substance counts as, where the law expresses the limit as something else; otherwise 1.
    #[serde(default)]
    pub counts_as: BTreeMap<String, Exact>,
    /// Over what they are summed.
    #[serde(default)]
    pub over: Over,
    /// The classes of product it is about, if not all of the set.
    #[serde(default)]
    pub product_classes: Vec<String>,
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

/// A tally held against the limit in the smaller of the known fills.
#[derive(Clone, Copy, Debug)]
struct Judged<'a> {
    tally: &'a Tally,
    volume_ul: i64,
    over: bool,
}

impl Judged<'_> {
    /// The dose in mg/L (or mL/L) in some fill.
    fn dose_in(&self, volume_ul: i64) -> String {
        concentration(self.tally.total(), volume_ul, self.over).unwrap_or_default()
    }
}

impl DoseLimit {
    pub(crate) fn check(&self, case: &Case<'_>, mark: &Mark<'_>) -> Vec<Noticed> {
        if !self.is_about(&case.situation.product_class) {
            return Vec::new();
        }
        let tally = Tally::of(self, case);
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
        let over = self.limit.compare(tally.total(), volume_ul) == Ordering::Greater;
        let judged = Judged { tally: &tally, volume_ul, over };
        noticed.push(match (over, self.counts) {
            (false, _) => self.within(case, mark, judged).into(),
            (true, Counts::Substance) => self.over(case, mark, judged),
            (true, Counts::CarrierWater) => self.too_much_water(case, mark, judged).into(),
        });
        noticed
    }

    /// What of the substance may still go in at the present and the planned fill, base units; `None` without a volume.
    pub(crate) fn rest(&self, case: &Case<'_>) -> Option<i128> {
        let volume_ul = case.strictest_volume_ul()?;
        Some(self.rest_parts(&Tally::of(self, case), volume_ul) / PARTS)
    }

    /// Whether it is about this class of product, of those that its set binds.
    pub(crate) fn is_about(&self, class: &str) -> bool {
        self.product_classes.is_empty() || self.product_classes.iter().any(|name| name == class)
    }

    /// Why the rule could never be judged.
    pub(super) fn fault(&self) -> Option<&'static str> {
        match (self.counts, self.limit.measure()) {
            (Counts::Substance, _) if self.substances.is_empty() => {
                Some("name the substances that count")
            }
            _ if self.counts_as.keys().any(|name| !self.substances.contains(name)) => {
                Some("counts_as names a substance that does not count")
            }
            (Counts::Substance, Dimension::Mass) | (Counts::CarrierWater, Dimension::Volume) => {
                None
            }
            (Counts::Substance, _) => Some("a substance is limited by its mass per volume"),
            (Counts::CarrierWater, _) => Some("carrier water is limited by volume per volume"),
        }
    }

    /// Whether the dose stays within the limit.
    pub(crate) fn keeps(&self, case: &Case<'_>) -> bool {
        if !self.is_about(&case.situation.product_class) {
            return true;
        }
        let total = Tally::of(self, case).total();
        case.strictest_volume_ul()
            .is_some_and(|volume_ul| self.limit.compare(total, volume_ul) != Ordering::Greater)
    }

    fn rest_parts(&self, tally: &Tally, volume_ul: i64) -> i128 {
        (self.limit.most(volume_ul) - tally.already).max(0)
    }

    fn over(&self, case: &Case<'_>, mark: &Mark<'_>, judged: Judged<'_>) -> Noticed {
        let cap = Cap {
            lines: judged.tally.lines.clone(),
            rest: self.rest_parts(judged.tally, judged.volume_ul),
            proposed: judged.tally.proposed,
            ground: Ground::Dose { citation: self.source.citation.clone() },
        };
        let finding = self.measured(case, mark, self.breach, &self.too_much(case, judged), judged);
        Noticed { finding, cap: Some(cap) }
    }

    fn too_much_water(&self, case: &Case<'_>, mark: &Mark<'_>, judged: Judged<'_>) -> Finding {
        let rest_l = litres(self.rest_parts(judged.tally, judged.volume_ul) / PARTS);
        let remedy =
            format!("Use at most {rest_l} L of water, or stir it up in the batch's own liquid.");
        self.measured(case, mark, self.breach, &self.too_much(case, judged), judged)
            .param("rest_l", rest_l)
            .cured_by(remedy)
    }

    fn too_much(&self, case: &Case<'_>, judged: Judged<'_>) -> String {
        let (dose, limit) = (self.shown_dose(case, judged), self.shown_limit(judged.volume_ul));
        format!("{} comes to {dose} with this; the limit is {limit}.", self.name)
    }

    fn within(&self, case: &Case<'_>, mark: &Mark<'_>, judged: Judged<'_>) -> Finding {
        let (dose, limit) = (self.shown_dose(case, judged), self.shown_limit(judged.volume_ul));
        let sentence = format!("{}: {dose} of at most {limit}.", self.name);
        self.measured(case, mark, Verdict::Clear, &sentence, judged)
    }

    /// A finding with the dose in each fill beside the limit.
    fn measured(
        &self,
        case: &Case<'_>,
        mark: &Mark<'_>,
        verdict: Verdict,
        sentence: &str,
        judged: Judged<'_>,
    ) -> Finding {
        let whole =
            judged.tally.whole.then_some("The content is not stated, so all of it was counted.");
        let parts = [Some(sentence), whole, self.note.as_deref()];
        let sentence = parts.into_iter().flatten().collect::<Vec<_>>().join(" ");
        let (unit, suffix) = match self.limit.measure() {
            Dimension::Volume => ("mL/L", "ml_l"),
            _ => ("mg/L", "mg_l"),
        };
        let already = concentration(judged.tally.already, judged.volume_ul, false);
        let finding = mark
            .finding(&self.id, &self.source, verdict, sentence)
            .measured(judged.dose_in(judged.volume_ul), self.limit.per_thousand(), unit)
            .param("volume_l", litres(i128::from(judged.volume_ul)))
            .param(&format!("already_{suffix}"), already.unwrap_or_default());
        case.volumes().into_iter().fold(finding, |finding, (fill, volume_ul)| {
            finding.param(&format!("dose_{fill}_{suffix}"), judged.dose_in(volume_ul))
        })
    }

    fn not_weighed(&self, mark: &Mark<'_>, lot: &str) -> Finding {
        let (substance, citation) = (self.name.to_lowercase(), self.source.shown());
        let sentence = format!(
            "{lot} carries {substance}, but is given by volume: its dose cannot be held against {citation}."
        );
        mark.finding(&self.id, &self.source, self.breach, sentence)
            .cured_by("Weigh it and propose it by mass.")
    }

    fn earlier_not_weighed(&self, mark: &Mark<'_>) -> Finding {
        let substance = self.name.to_lowercase();
        let sentence = format!(
            "An earlier addition carried {substance}, given by volume: the sum here leaves it out."
        );
        mark.finding(&self.id, &self.source, self.breach.min(Verdict::Advise), sentence)
            .cured_by("Amend the earlier addition with its mass.")
    }

    fn no_volume(&self, mark: &Mark<'_>) -> Finding {
        let (substance, citation) = (self.name.to_lowercase(), self.source.shown());
        let sentence =
            format!("No liquid volume is known, so {substance} cannot be held against {citation}.");
        mark.finding(&self.id, &self.source, self.breach, sentence)
            .cured_by("Record the fill first.")
    }

    /// `1.000 g/L`, with the other fill beside it where there is one.
    fn shown_dose(&self, case: &Case<'_>, judged: Judged<'_>) -> String {
        if self.counts == Counts::CarrierWater {
            return format!("{} L", litres(judged.tally.total() / PARTS));
        }
        let dose = spoken(&judged.dose_in(judged.volume_ul));
        let other = case.volumes().into_iter().find(|(_, volume)| *volume != judged.volume_ul);
        other.map_or(dose.clone(), |(fill, volume_ul)| {
            format!("{dose} ({} at the {fill} fill)", spoken(&judged.dose_in(volume_ul)))
        })
    }

    /// `0.958611 g/L (8 lb per 1,000 US gal, 27 CFR 24.246; printed 0.96 g/L)`.
    fn shown_limit(&self, volume_ul: i64) -> String {
        let limit = match self.counts {
            Counts::CarrierWater => format!("{} L", litres(self.limit.most(volume_ul) / PARTS)),
            Counts::Substance => spoken(&self.limit.per_thousand()),
        };
        let printed = self.printed.as_deref().map(|text| format!("; printed {text}"));
        let (as_written, citation) = (self.limit.text(), self.source.shown());
        format!("{limit} ({as_written}, {citation}{})", printed.unwrap_or_default())
    }
}

/// Litres with one digit, cut off.
fn litres(volume_ul: i128) -> String {
    let tenths = volume_ul / 100_000;
    format!("{}.{}", tenths / 10, tenths % 10)
}

/// `958.611` mg/L as `0.958611 g/L` and `300.000` as `0.300 g/L`; small ones stay in mg/L.
fn spoken(mg_l: &str) -> String {
    let Some((whole, fraction)) = mg_l.split_once('.') else { return format!("{mg_l} mg/L") };
    if whole.len() < 3 {
        return format!("{mg_l} mg/L");
    }
    let (grams, milligrams) = whole.split_at(whole.len() - 3);
    let grams = if grams.is_empty() { "0" } else { grams };
    let fraction = fraction.trim_end_matches('0');
    format!("{}.{milligrams}{fraction} g/L", grouped(grams))
}
