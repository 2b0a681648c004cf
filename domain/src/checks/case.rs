//! One proposal in one situation, with what every rule asks about it computed once.

use crate::rules::contaminant_limit::covers;
use crate::rules::timing_limit::Carries;
use crate::rules::{RuleName, Source};
use crate::settings::Setting;
use crate::stamp::Micros;

use super::account::{Balance, balance, since_sample};
use super::finding::{Finding, Verdict};
use super::number::real;
use super::remedy::Cap;
use super::situation::{AdoptedSet, Category, Line, Proposed, Situation, Standing};
use super::substances::PER_MICROGRAM;

/// A finding, and what it leaves room for.
#[derive(Clone, Debug)]
pub(crate) struct Noticed {
    pub(crate) finding: Finding,
    pub(crate) cap: Option<Cap>,
}

impl From<Finding> for Noticed {
    fn from(finding: Finding) -> Self {
        Self { finding, cap: None }
    }
}

/// Which set a rule is read from, and why it binds.
#[derive(Clone, Copy, Debug)]
pub(crate) enum Mark<'a> {
    /// An adopted set.
    Set(&'a AdoptedSet),
    /// What every cellar is told, under this first part of the rule's name.
    House(&'a str),
}

impl Mark<'_> {
    /// A finding under this mark. A breach of a market's rule closes that market; it does not stop the cellar.
    pub(crate) fn finding(
        &self,
        rule: &str,
        source: &Source,
        verdict: Verdict,
        sentence: String,
    ) -> Finding {
        let (set, digest, market) = match self {
            Self::House(name) => (*name, None, None),
            Self::Set(adopted) => match &adopted.standing {
                Standing::Production => (adopted.set.id.as_str(), Some(&adopted.digest), None),
                Standing::Market { market } => {
                    (adopted.set.id.as_str(), Some(&adopted.digest), Some(market))
                }
            },
        };
        let (verdict, sentence) = match market {
            Some(market) if verdict == Verdict::Refuse => {
                (Verdict::Refer, format!("This closes the market {market}. {sentence}"))
            }
            _ => (verdict, sentence),
        };
        let name = RuleName { set, rule }.to_string();
        let mut finding = Finding::new(&name, verdict, source.basis, sentence);
        finding.citation = Some(source.shown());
        finding.rule_set = digest.cloned();
        finding
    }
}

/// A proposal in its situation.
#[derive(Debug)]
pub(crate) struct Case<'a> {
    pub(crate) situation: &'a Situation<'a>,
    pub(crate) proposed: &'a Proposed,
    /// The sets that bind.
    pub(crate) binding: Vec<&'a AdoptedSet>,
    /// The moment ages are counted to: the present, or the event if it lies in the past.
    pub(crate) judged_at: Micros,
    /// The account without the proposal.
    pub(crate) before: Balance,
    /// The account with it.
    pub(crate) after: Balance,
    /// Nitrogen in the proposal, micrograms × `PER_MICROGRAM`; what is unknown counts nothing here.
    nitrogen: i128,
}

impl<'a> Case<'a> {
    pub(crate) fn new(situation: &'a Situation<'a>, proposed: &'a Proposed) -> Self {
        let earlier: i128 =
            since_sample(situation).flat_map(|done| &done.lines).filter_map(Line::nitrogen).sum();
        let nitrogen: i128 =
            proposed.lines.iter().filter_map(|proposed| proposed.line.nitrogen()).sum();
        let volume_ul = present_ul(situation);
        Self {
            situation,
            proposed,
            binding: binding(situation, proposed),
            judged_at: situation.now.min(proposed.planned_at),
            before: balance(situation, earlier, volume_ul),
            after: balance(situation, earlier + nitrogen, volume_ul),
            nitrogen,
        }
    }

    pub(crate) fn proposed_lines(&self) -> impl Iterator<Item = &'a Line> {
        self.proposed.lines.iter().map(|proposed| &proposed.line)
    }

    pub(crate) fn earlier_lines(&self) -> impl Iterator<Item = &'a Line> {
        self.situation.additions.iter().flat_map(|done| &done.lines)
    }

    pub(crate) fn earlier_water_ul(&self) -> i128 {
        self.situation.additions.iter().map(|done| i128::from(done.carrier_water_ul.max(0))).sum()
    }

    /// The fills that are known, with their names.
    pub(crate) fn volumes(&self) -> Vec<(&'static str, i64)> {
        let present = Some(self.situation.liquid_present_ul);
        [("present", present), ("planned", self.situation.liquid_planned_ul)]
            .into_iter()
            .filter_map(|(name, volume)| Some((name, volume.filter(|volume| *volume > 0)?)))
            .collect()
    }

    /// The smaller of the known fills: what a dose is judged on.
    pub(crate) fn strictest_volume_ul(&self) -> Option<i64> {
        self.volumes().into_iter().map(|(_, volume)| volume).min()
    }

    /// The liquid that amounts are reckoned for: what is there, or what is to come into an empty vessel.
    pub(crate) fn volume_ul(&self) -> Option<i64> {
        present_ul(self.situation)
    }

    pub(crate) fn adds_nitrogen(&self) -> bool {
        self.nitrogen > 0
    }

    /// The proposal's nitrogen, mg.
    pub(crate) fn nitrogen_mg(&self) -> f64 {
        real(self.nitrogen) / real(PER_MICROGRAM) / 1_000.0
    }

    pub(crate) fn carries(&self, what: Carries) -> bool {
        self.proposed_lines().any(|line| match what {
            Carries::Nitrogen => line.nitrogen().is_some_and(|sum| sum > 0) || line.has_ammonium(),
            Carries::Ammonium => line.has_ammonium(),
        })
    }

    /// Whether it feeds the yeast or brings it in: then the measurements behind the need matter.
    pub(crate) fn feeds(&self) -> bool {
        let food = |line: &Line| matches!(line.category, Category::Nutrient | Category::Yeast);
        self.adds_nitrogen() || self.proposed_lines().any(food)
    }

    /// When nitrogen last went in before the planned time; what goes in at the same moment is the same dose.
    pub(crate) fn last_dose_at(&self) -> Option<Micros> {
        let dose = |line: &Line| line.nitrogen().is_none_or(|sum| sum > 0);
        self.situation
            .additions
            .iter()
            .filter(|done| done.at < self.proposed.planned_at && done.lines.iter().any(dose))
            .map(|done| done.at)
            .max()
    }

    /// Whether the feeding window has closed: more than half the sugar is probably used.
    pub(crate) fn window_closed(&self) -> bool {
        let late = self.situation.settings.number(Setting::HalfProbabilityRefer);
        self.situation.fraction.as_ref().is_some_and(|fraction| fraction.p_half >= late)
    }
}

fn present_ul(situation: &Situation<'_>) -> Option<i64> {
    let present = Some(situation.liquid_present_ul).filter(|volume| *volume > 0);
    present.or(situation.liquid_planned_ul.filter(|volume| *volume > 0))
}

fn binding<'a>(situation: &'a Situation<'_>, proposed: &Proposed) -> Vec<&'a AdoptedSet> {
    let binds = |adopted: &&AdoptedSet| {
        let here = match &adopted.standing {
            Standing::Production => adopted.set.binds_premises(&situation.premises_kind),
            Standing::Market { market } => {
                situation.destinations.iter().any(|to| covers(market, to))
            }
        };
        here && adopted.set.binds_class(&situation.product_class)
            && adopted.set.in_force(proposed.planned_at)
    };
    situation.sets.iter().filter(binds).collect()
}
