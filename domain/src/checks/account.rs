//! The nitrogen account: supply against need.

use super::finding::Account;
use super::number::{fixed, real, settled};
use super::situation::{Done, Situation};
use super::substances::PER_MICROGRAM;

/// The least that finishes a ferment, mg N/L. Brice et al. 2014 (read).
const FLOOR_MG_L: f64 = 140.0;

/// The class of product that the Brix line was published for.
const MUST: &str = "grape_wine";

/// Supply and need in mg N per litre of liquid.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Balance {
    /// Measured and added since; `None` while nothing was measured or no volume is known.
    pub(crate) supply: Option<f64>,
    /// Added since the sample.
    pub(crate) added: f64,
    /// The larger of floor and factor × sugar.
    pub(crate) need: f64,
    /// 200 + 25 (Brix − 21), 21 to 27 Brix, must only.
    pub(crate) line: Option<f64>,
}

impl Balance {
    /// What is enough: the larger of need and line.
    pub(crate) fn target(&self) -> f64 {
        self.line.map_or(self.need, |line| line.max(self.need))
    }

    /// Supply over the target.
    pub(crate) fn excess(&self) -> Option<f64> {
        self.supply.map(|supply| settled((supply - self.target()).max(0.0)))
    }

    /// Supply under the need.
    pub(crate) fn shortage(&self) -> Option<f64> {
        self.supply.map(|supply| settled((self.need - supply).max(0.0)))
    }

    /// What may still go in.
    pub(crate) fn room(&self) -> Option<f64> {
        self.supply.map(|supply| (self.target() - supply).max(0.0))
    }

    /// The account as it is written down.
    pub(crate) fn written(&self, situation: &Situation<'_>) -> Account {
        let one = |value: f64| fixed(value, 1);
        let other = situation.other_sugar.as_ref();
        Account {
            supply_mg_l: self.supply.map(one),
            added_mg_l: one(self.added),
            need_mg_l: one(self.need),
            floor_mg_l: one(FLOOR_MG_L),
            factor_mg_g: fixed(situation.demand_mg_g, 2),
            line_mg_l: self.line.map(one),
            room_mg_l: self.room().map(one),
            shortage_mg_l: self.shortage().map(one),
            excess_mg_l: self.excess().map(one),
            sugar_g_l: one(situation.sugar_g_l),
            sugar_basis: situation.sugar_basis.clone(),
            other_sugar_g_l: other.map(|(sugar, _)| one(*sugar)),
            other_sugar_basis: other.map(|(_, basis)| basis.clone()),
            other_need_mg_l: other.map(|(sugar, _)| one(need(situation.demand_mg_g, *sugar))),
        }
    }
}

/// The need: the larger of the floor and factor × sugar. Factors 0.75, 0.90, 1.25 mg N per g (read at second hand).
fn need(factor_mg_g: f64, sugar_g_l: f64) -> f64 {
    FLOOR_MG_L.max(factor_mg_g * sugar_g_l)
}

/// Bisson & Butzke 2000: 21, 23, 25, 27 Brix need 200, 250, 300, 350 mg N/L; the line through them, inside that range.
fn line(situation: &Situation<'_>) -> Option<f64> {
    let brix = situation.original_brix.filter(|brix| (21.0..=27.0).contains(brix))?;
    (situation.product_class == MUST).then_some(200.0 + 25.0 * (brix - 21.0))
}

/// Additions that the sample cannot have seen: those made when it was taken, or later.
pub(crate) fn since_sample<'a>(situation: &'a Situation<'_>) -> impl Iterator<Item = &'a Done> {
    let sampled_at = situation.yan.map(|yan| yan.sampled_at);
    situation.additions.iter().filter(move |done| sampled_at.is_none_or(|at| done.at >= at))
}

/// The account with so much nitrogen (micrograms × `PER_MICROGRAM`) added since the sample.
pub(crate) fn balance(
    situation: &Situation<'_>,
    nitrogen: i128,
    volume_ul: Option<i64>,
) -> Balance {
    let added = volume_ul
        .map(|volume| real(nitrogen) / real(PER_MICROGRAM) / real(i128::from(volume)) * 1_000.0);
    let measured = situation.yan.map(|yan| yan.ammonium_n_mg_l + yan.amino_n_mg_l);
    Balance {
        supply: measured.zip(added).map(|(measured, added)| measured + added),
        added: added.unwrap_or_default(),
        need: need(situation.demand_mg_g, situation.sugar_g_l),
        line: line(situation),
    }
}
