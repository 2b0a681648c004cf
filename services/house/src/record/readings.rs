//! Readings with what they replaced, and the nitrogen account as the assessments kept it.

use std::collections::{BTreeMap, BTreeSet};

use domain::book::assessing::checks_line;
use domain::book::body::{AdditionRecorded, Body, InstrumentDescribed, Reading, ReadingTaken};
use domain::checks;
use domain::ids::InstrumentId;
use domain::stamp::Micros;
use domain::units::Quantity;
use records::AccountRow;

use super::evidence::{Evidence, Told};
use super::struck::struck;
use super::words;

impl Evidence {
    pub(super) fn printed_readings(&self) -> Vec<records::Reading> {
        let mut seen = Seen::default();
        let readings = self.told.iter().filter_map(|told| match told.read.body.as_ref() {
            Body::ReadingTaken(body) => Some((told, body)),
            _ => None,
        });
        readings.flat_map(|(told, body)| self.rows(told, body, &mut seen)).collect()
    }

    /// One row for each value, also for one that an amendment left out.
    fn rows(&self, told: &Told, body: &ReadingTaken, seen: &mut Seen) -> Vec<records::Reading> {
        let before = told.read.amendments.iter().filter_map(|a| reading_taken(&a.was.1));
        let most = before.map(|was| was.values.len()).chain([body.values.len()]).max();
        (0..most.unwrap_or_default()).map(|index| self.row(told, body, index, seen)).collect()
    }

    fn row(
        &self,
        told: &Told,
        body: &ReadingTaken,
        index: usize,
        seen: &mut Seen,
    ) -> records::Reading {
        let value = body.values.get(index);
        let known = value.or_else(|| {
            let mut before = told.read.amendments.iter().rev();
            before.find_map(|a| reading_taken(&a.was.1)?.values.get(index))
        });
        let mut row = records::Reading {
            n: told.n,
            at: self.clock(told.read.occurred_at.at),
            kind: known.map(words::kind).unwrap_or_default(),
            by: self.name(told.read.actor),
            late: self.late_reading(told, body),
            struck: struck(self, &told.read, |body| said(body, index)),
            ..records::Reading::default()
        };
        match (told.fate(), value) {
            (Some(fate), _) => fate.clone_into(&mut row.entered),
            (None, None) => LEFT_OUT.clone_into(&mut row.entered),
            (None, Some(value)) => {
                row.entered = words::entered(value);
                if let Some(corrected) = &value.corrected {
                    row.corrected = format!("{} SG", corrected.sg_20_20);
                }
            }
        }
        if let Some(value) = known {
            row.method = method(value, told.n, seen);
            row.instrument = self.instrument(value, body, seen);
        }
        if index == 0 {
            row.note = remark(body);
        }
        row
    }

    fn instrument(&self, value: &Reading, body: &ReadingTaken, seen: &mut Seen) -> String {
        let described = value.instrument.map(|id| {
            let state = self.desk.instrument(id).ok().and_then(|state| state.current.as_ref());
            state.map_or_else(
                || id.to_string(),
                |(_, it)| {
                    let is_new = seen.instruments.insert(id);
                    if is_new { in_full(it) } else { it.code.clone() }
                },
            )
        });
        let sample = body.sample.as_ref().map(|sample| format!("sample {sample}"));
        let reported = body.reported_at.map(|at| format!("reported {}", self.clock(at.at)));
        let parts = [described, body.laboratory.clone(), sample, reported];
        parts.into_iter().flatten().collect::<Vec<_>>().join(", ")
    }

    /// A laboratory's answer is late from when it came, not from when the sample was taken.
    fn late_reading(&self, told: &Told, body: &ReadingTaken) -> String {
        let due = body.reported_at.map_or(told.read.occurred_at.at, |at| at.at);
        let event = if body.reported_at.is_some() { "the answer" } else { "the reading" };
        let entered = entered_at(told);
        if body.late.is_some() { self.late_text(entered, due, event) } else { String::new() }
    }

    /// `entered 2025-09-24 09:05, 6 h 25 min after the act`.
    pub(super) fn late_text(&self, entered: Micros, due: Micros, event: &str) -> String {
        format!("entered {}, {} after {event}", self.clock(entered), words::span(entered.0 - due.0))
    }

    /// Samples and doses in the order in which they happened, in the figures that were kept with them.
    pub(crate) fn account(&self) -> Vec<AccountRow> {
        let in_force = self.told.iter().filter(|told| told.is_in_force());
        in_force
            .filter_map(|told| match told.read.body.as_ref() {
                Body::ReadingTaken(body) => self.sampled(told, body),
                Body::AdditionRecorded(body) => Some(self.dosed(told, body)),
                _ => None,
            })
            .collect()
    }

    fn sampled(&self, told: &Told, body: &ReadingTaken) -> Option<AccountRow> {
        let found = body.nitrogen.as_ref()?;
        let by = body.laboratory.as_deref().unwrap_or("own measurement");
        Some(AccountRow {
            at: self.clock(told.read.occurred_at.at),
            what: format!("measured (entry {}), {by}: the account begins anew here", told.n),
            ammonium_n: tenth(&found.ammonium_mg_l),
            amino_n: tenth(&found.amino_mg_l),
            supply: tenth(&found.total_mg_l),
            need: String::new(),
        })
    }

    fn dosed(&self, told: &Told, body: &AdditionRecorded) -> AccountRow {
        let lines: Vec<_> = body.lines.iter().map(checks_line).collect();
        let liquid = self.opening().map_or(0, |(_, opened)| {
            let planned = opened.liquid_planned.as_ref().map_or(0, Quantity::base);
            if opened.liquid.base() > 0 { opened.liquid.base() } else { planned }
        });
        let [ammonium_n, amino_n] = match checks::nitrogen_mg_l(&lines, liquid) {
            Some(parts) => parts.map(|part| format!("+{part}")),
            None => ["not known", "not known"].map(str::to_owned),
        };
        let account = &body.assessment.account_after;
        let supply = account.supply_mg_l.clone();
        AccountRow {
            at: self.clock(told.read.occurred_at.at),
            what: format!("{}{}", words::dose(&body.lines), self.hindsight(told)),
            ammonium_n,
            amino_n,
            supply: supply.unwrap_or_else(|| "not measured".to_owned()),
            need: account.need_mg_l.clone(),
        }
    }

    /// A sample taken before this dose, but answered after it was assessed: its supply rests on an older one.
    fn hindsight(&self, told: &Told) -> String {
        let (at, seq) = (told.read.occurred_at.at, told.read.seq);
        let samples = self.told.iter().filter(|other| {
            other.is_in_force()
                && reading_taken(&other.read.body).is_some_and(|body| body.nitrogen.is_some())
                && other.read.occurred_at.at <= at
        });
        match samples.max_by_key(|sample| sample.read.order()) {
            Some(sample) if sample.read.seq > seq => format!(
                "; supply as assessed then: the sample of {} was answered later",
                self.clock(sample.read.occurred_at.at)
            ),
            _ => String::new(),
        }
    }
}

/// What the rows above have told in full.
#[derive(Default)]
struct Seen {
    /// A correction's formula, and the entry it was told with.
    corrections: BTreeMap<String, u64>,
    instruments: BTreeSet<InstrumentId>,
}

/// An instrument with its last test.
fn in_full(it: &InstrumentDescribed) -> String {
    let day = |lead: &str, day: &Option<String>| {
        day.as_ref().map(|day| format!(", {lead} {day}")).unwrap_or_default()
    };
    let tested = day("calibrated", &it.calibrated_on);
    format!("{} {}{tested}{}", it.code, it.name, day("due", &it.calibration_due))
}

/// What stands for a value that an amendment left out.
const LEFT_OUT: &str = "left out by an amendment";

/// When an entry was typed: on a device without network, or here.
pub(super) fn entered_at(told: &Told) -> Micros {
    let recorded = told.read.recorded_at;
    told.captured_at.map_or(recorded, |captured| captured.at.min(recorded))
}

fn reading_taken(body: &Body) -> Option<&ReadingTaken> {
    match body {
        Body::ReadingTaken(body) => Some(body),
        _ => None,
    }
}

fn said(body: &Body, index: usize) -> String {
    let value = reading_taken(body).and_then(|body| body.values.get(index));
    value.map_or_else(|| LEFT_OUT.to_owned(), words::entered)
}

/// The correction's formula once, then by the entry that told it.
fn method(value: &Reading, n: u64, seen: &mut Seen) -> String {
    let correction = value.corrected.as_ref().map(|corrected| {
        let told = seen.corrections.get(&corrected.method);
        told.map_or_else(
            || corrected.method.clone(),
            |first| format!("corrected as in entry {first}"),
        )
    });
    if let Some(corrected) = &value.corrected {
        seen.corrections.entry(corrected.method.clone()).or_insert(n);
    }
    [value.method.clone(), correction, value.left_as_read.clone()]
        .into_iter()
        .flatten()
        .collect::<Vec<_>>()
        .join("; ")
}

fn remark(body: &ReadingTaken) -> String {
    let nitrogen = body.nitrogen.as_ref().map(|found| {
        format!("assimilable nitrogen {} mg N/L: {}", tenth(&found.total_mg_l), found.method)
    });
    let odd = body.findings.iter().map(|finding| format!("shown: {}", finding.sentence));
    body.note.clone().into_iter().chain(nitrogen).chain(odd).collect::<Vec<_>>().join("; ")
}

/// A figure to a tenth, as the account has it.
fn tenth(text: &str) -> String {
    text.parse::<f64>().map_or_else(|_| text.to_owned(), |value| format!("{value:.1}"))
}
