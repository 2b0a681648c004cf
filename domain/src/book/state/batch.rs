//! A batch: what was filled, what was read, what was proposed, added and signed.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::book::body::{
    AdditionRecorded, BatchOpened, Body, ProposalAssessed, ReadingTaken, SignoffGiven,
};
use crate::book::in_force::InForce;
use crate::book::subject::SubjectKind;
use crate::book::table::{Cell, Row};
use crate::book::tables::{BATCH, CODE};
use crate::ids::{BatchId, DeviationId, ProposalId};
use crate::ledger::entry::Actor;
use crate::stamp::{Micros, Stamp};

/// A batch as its entries say.
#[derive(Clone, Debug)]
pub struct BatchState {
    /// Which.
    pub batch: BatchId,
    /// The opening; absent before it.
    pub opened: Option<(Stamp, BatchOpened)>,
    /// Gravities brought to the common scale, by time.
    pub gravities: Vec<Gravity>,
    /// Assimilable nitrogen found, by time of sampling.
    pub nitrogen: Vec<NitrogenFound>,
    /// Sugar found by the laboratory or the house, by time of sampling.
    pub sugar: Vec<SugarFound>,
    /// What was added, by time.
    pub additions: Vec<Arc<InForce>>,
    /// What was proposed.
    pub proposals: BTreeMap<ProposalId, ProposalState>,
    /// Which addition carried out which proposal; a corrected time may lie before the proposal.
    carried_out: BTreeMap<ProposalId, u64>,
    /// Signatures whose time lies before their proposal's, as clocks of several programs may differ.
    signed_early: BTreeMap<ProposalId, Vec<Signed>>,
    /// When yeast first went in.
    pub pitched_at: Option<Micros>,
    /// When the last ingredient that is no nutrient, yeast or sulfite went in.
    pub last_ingredient_at: Option<Micros>,
    /// Deviations opened on it.
    pub deviations: Vec<DeviationId>,
}

/// One gravity.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Gravity {
    /// Which entry says so.
    pub seq: u64,
    /// When.
    pub at: Micros,
    /// Specific gravity 20/20 °C.
    pub sg: f64,
    /// Apparent extract, % by mass.
    pub extract: f64,
}

/// Assimilable nitrogen of one sample, mg N/L.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct NitrogenFound {
    /// Which entry says so.
    pub seq: u64,
    /// When the sample was taken.
    pub sampled_at: Micros,
    /// As ammonium.
    pub ammonium: f64,
    /// As primary amino nitrogen.
    pub amino: f64,
}

/// Sugar of one sample.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct SugarFound {
    /// Which entry says so.
    pub seq: u64,
    /// When the sample was taken.
    pub sampled_at: Micros,
    /// How much, g/L.
    pub g_per_l: f64,
}

/// A signature: when, by whom, what.
pub type Signed = (Stamp, Actor, SignoffGiven);

/// A proposal with what became of it.
#[derive(Clone, Debug)]
pub struct ProposalState {
    /// The entry that records it.
    pub entry: Arc<InForce>,
    /// Signatures given on it.
    pub signoffs: Vec<Signed>,
    /// The addition that carried it out.
    pub done_by: Option<u64>,
}

impl ProposalState {
    /// What was proposed and answered.
    pub fn body(&self) -> Option<&ProposalAssessed> {
        match self.entry.body.as_ref() {
            Body::ProposalAssessed(body) => Some(body),
            _ => None,
        }
    }
}

/// Whether an apparent extract (% mass) is below the first by more than two readings of one liquid differ: 0.3 %, our
/// own line.
pub(crate) const fn has_dropped(first: f64, later: f64) -> bool {
    later < first - 0.3
}

impl BatchState {
    pub(crate) const fn new(batch: BatchId) -> Self {
        Self {
            batch,
            opened: None,
            gravities: Vec::new(),
            nitrogen: Vec::new(),
            sugar: Vec::new(),
            additions: Vec::new(),
            proposals: BTreeMap::new(),
            carried_out: BTreeMap::new(),
            signed_early: BTreeMap::new(),
            pitched_at: None,
            last_ingredient_at: None,
            deviations: Vec::new(),
        }
    }

    pub(crate) fn apply(&mut self, entry: &Arc<InForce>) {
        match entry.body.as_ref() {
            Body::BatchOpened(body) if body.batch == self.batch => self.open(entry, body),
            Body::ReadingTaken(body) if body.batch == self.batch => self.read(entry, body),
            Body::AdditionRecorded(body) if body.batch == self.batch => self.add(entry, body),
            Body::ProposalAssessed(body) if body.batch == self.batch => {
                let state = ProposalState {
                    entry: Arc::clone(entry),
                    signoffs: self.signed_early.remove(&body.proposal).unwrap_or_default(),
                    done_by: self.carried_out.get(&body.proposal).copied(),
                };
                self.proposals.insert(body.proposal, state);
            }
            Body::SignoffGiven(body) => {
                if let Some(id) = body.proposal {
                    let signed = (entry.occurred_at, entry.actor, body.clone());
                    match self.proposals.get_mut(&id) {
                        Some(proposal) => proposal.signoffs.push(signed),
                        None => self.signed_early.entry(id).or_default().push(signed),
                    }
                }
            }
            Body::DeviationOpened(body) if body.batch == Some(self.batch) => {
                self.deviations.push(body.deviation);
            }
            _ => {}
        }
    }

    fn open(&mut self, entry: &InForce, body: &BatchOpened) {
        if !body.ingredients.is_empty() {
            self.last_ingredient_at = self.last_ingredient_at.max(Some(entry.occurred_at.at));
        }
        self.opened = Some((entry.occurred_at, body.clone()));
    }

    /// Keeps what was read by its time, wherever in the fold it comes.
    fn read(&mut self, entry: &InForce, body: &ReadingTaken) {
        let at = entry.occurred_at.at;
        for value in &body.values {
            if let Some(corrected) = &value.corrected
                && value.qualifier.is_none()
                && let (Ok(sg), Ok(extract)) =
                    (corrected.sg_20_20.parse(), corrected.apparent_extract_percent.parse())
            {
                let gravity = Gravity { seq: entry.seq, at, sg, extract };
                insert_by(&mut self.gravities, gravity, |known| (known.at, known.seq));
            }
            if value.quantity == "sugar"
                && value.qualifier.is_none()
                && let Ok(g_per_l) = value.value.parse()
            {
                let sugar = SugarFound { seq: entry.seq, sampled_at: at, g_per_l };
                insert_by(&mut self.sugar, sugar, |known| (known.sampled_at, known.seq));
            }
        }
        if let Some(found) = &body.nitrogen
            && let (Ok(ammonium), Ok(amino)) =
                (found.ammonium_mg_l.parse(), found.amino_mg_l.parse())
        {
            let found = NitrogenFound { seq: entry.seq, sampled_at: at, ammonium, amino };
            insert_by(&mut self.nitrogen, found, |known| (known.sampled_at, known.seq));
        }
    }

    fn add(&mut self, entry: &Arc<InForce>, body: &AdditionRecorded) {
        let at = entry.occurred_at.at;
        for line in &body.lines {
            match line.category.as_str() {
                "yeast" => {
                    self.pitched_at = Some(self.pitched_at.map_or(at, |first| first.min(at)));
                }
                category if is_ingredient(category) => {
                    self.last_ingredient_at = self.last_ingredient_at.max(Some(at));
                }
                _ => {}
            }
        }
        if let Some(id) = body.proposal {
            self.carried_out.insert(id, entry.seq);
            if let Some(proposal) = self.proposals.get_mut(&id) {
                proposal.done_by = Some(entry.seq);
            }
        }
        self.additions.push(Arc::clone(entry));
    }

    /// The apparent extract it started from: the first gravity.
    pub fn original(&self) -> Option<Gravity> {
        self.gravities.first().copied()
    }

    /// Whether sugar, fruit or liquid went in after `from` and up to `until`.
    pub(crate) fn ingredient_between(&self, from: Micros, until: Micros) -> bool {
        let within = |at: Micros| from < at && at <= until;
        let opened = self
            .opened
            .as_ref()
            .is_some_and(|(at, body)| !body.ingredients.is_empty() && within(at.at));
        opened
            || self.additions().any(|(entry, body)| {
                within(entry.occurred_at.at)
                    && body.lines.iter().any(|line| is_ingredient(&line.category))
            })
    }

    /// Additions with their bodies, by time.
    pub fn additions(&self) -> impl Iterator<Item = (&Arc<InForce>, &AdditionRecorded)> {
        self.additions.iter().filter_map(|entry| match entry.body.as_ref() {
            Body::AdditionRecorded(body) => Some((entry, body)),
            _ => None,
        })
    }

    pub(crate) fn rows(&self) -> Vec<Row> {
        let Some((at, body)) = &self.opened else { return Vec::new() };
        let last = self.gravities.last();
        vec![
            Row {
                table: &BATCH,
                cells: vec![
                    self.batch.0.into(),
                    body.code.as_str().into(),
                    body.product_class.as_str().into(),
                    body.vessel.0.into(),
                    body.holding.0.into(),
                    at.at.0.into(),
                    body.liquid.base().into(),
                    Cell::from(last.map(|gravity| format!("{:.4}", gravity.sg))),
                    Cell::from(last.map(|gravity| gravity.at.0)),
                ],
            },
            Row {
                table: &CODE,
                cells: vec![
                    SubjectKind::Batch.name().into(),
                    body.code.as_str().into(),
                    self.batch.0.into(),
                ],
            },
        ]
    }
}

/// What a batch is made of, beside yeast and what feeds or protects it.
fn is_ingredient(category: &str) -> bool {
    matches!(category, "fruit" | "sugar" | "base")
}

/// Inserts after everything that comes before it or with it.
fn insert_by<T, K: Ord>(list: &mut Vec<T>, item: T, order: impl Fn(&T) -> K) {
    let key = order(&item);
    list.insert(list.partition_point(|known| order(known) <= key), item);
}
