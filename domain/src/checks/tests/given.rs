//! The two batches, as the story tells them.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::checks::{
    AdoptedSet, Assessment, Category, Done, Fraction, Line, LotStatus, Preparation, Proposed,
    ProposedLine, Situation, Standing, Yan, assess,
};
use crate::rules::{RuleSet, digest, shipped};
use crate::settings::Settings;
use crate::stamp::Micros;
use crate::units::{Dimension, Quantity};

pub(super) fn at(text: &str) -> Micros {
    Micros::parse(text).unwrap()
}

pub(super) fn grams(text: &str) -> Quantity {
    Quantity::parse(text, "g", Dimension::Mass).unwrap()
}

fn litres(number: &str, unit: &str) -> i64 {
    Quantity::parse(number, unit, Dimension::Volume).unwrap().base()
}

fn line(
    lot: &str,
    category: Category,
    composition: &[(&str, i64)],
    listed_as: &[&str],
    amount_g: &str,
) -> ProposedLine {
    let line = Line {
        lot_code: lot.to_owned(),
        material_name: lot.to_owned(),
        category,
        composition: composition.iter().map(|(name, ppb)| ((*name).to_owned(), *ppb)).collect(),
        listed_as: listed_as.iter().map(|name| (*name).to_owned()).collect(),
        amount: grams(amount_g),
    };
    ProposedLine {
        line,
        lot_status: LotStatus::Released,
        hold_reason: None,
        expires_at: None,
        remaining_base: 25_000_000_000,
    }
}

pub(super) fn dap(lot: &str, amount_g: &str) -> ProposedLine {
    let composition = [("diammonium_phosphate", 1_000_000_000)];
    line(lot, Category::Nutrient, &composition, &["ammonium_phosphate"], amount_g)
}

pub(super) fn autolysate(amount_g: &str) -> ProposedLine {
    let composition = [("amino_nitrogen", 46_000_000)];
    line("AU-0208", Category::Nutrient, &composition, &["autolysed_yeast"], amount_g)
}

pub(super) fn rehydration(amount_g: &str) -> ProposedLine {
    let composition = [("amino_nitrogen", 40_000_000), ("thiamine_hydrochloride", 1_000_000)];
    let listed = ["autolysed_yeast", "thiamine_hydrochloride"];
    line("RH-0091", Category::Nutrient, &composition, &listed, amount_g)
}

pub(super) fn yeast(lot: &str, amount_g: &str) -> ProposedLine {
    line(lot, Category::Yeast, &[], &[], amount_g)
}

pub(super) fn proposal(planned_at: &str, lines: Vec<ProposedLine>) -> Proposed {
    Proposed {
        planned_at: at(planned_at),
        lines,
        carrier_water_ul: 0,
        preparation: Preparation::Slurry,
        already_done: false,
        recent_refusal: false,
    }
}

impl Proposed {
    pub(super) fn water(mut self, litres: i64) -> Self {
        self.carrier_water_ul = litres * 1_000_000;
        self
    }
}

/// A forecast around `mid`; more than a third is as good as certain above it and as good as impossible below.
pub(super) fn fraction(mid: f64, p_half: f64) -> Fraction {
    let p_third = if mid > 1.0 / 3.0 { 0.98 } else { 0.02 };
    Fraction { low: mid - 0.025, mid, high: mid + 0.025, p_third, p_half, out_of_range_note: None }
}

#[derive(Clone, Debug)]
pub(super) struct Batch {
    sets: Vec<AdoptedSet>,
    premises: &'static str,
    class: String,
    volume_ul: (i64, Option<i64>),
    sugar: f64,
    other_sugar: Option<(f64, String)>,
    brix: Option<f64>,
    yan: Option<Yan>,
    last_ingredient: Micros,
    pitched: Option<Micros>,
    gravity: GravityAt,
    additions: Vec<Done>,
    fraction: Option<Fraction>,
}

#[derive(Clone, Copy, Debug)]
enum GravityAt {
    /// Three hours before the planned time.
    Fresh,
    Never,
    At(Micros),
}

fn adopted(standing: &Standing) -> Vec<AdoptedSet> {
    let here = |(id, _): &&(&str, &str)| ["us-wine", "common-practice"].contains(id);
    shipped().iter().filter(here).map(|(_, text)| adopt(text, standing)).collect()
}

fn adopt(text: &str, standing: &Standing) -> AdoptedSet {
    AdoptedSet {
        set: Arc::new(RuleSet::parse(text).unwrap()),
        digest: digest(text),
        standing: standing.clone(),
    }
}

impl Batch {
    /// B: 3,000 L of white must; 22.456 Brix, 246.1 g/L by Brix and gravity, 220 g/L by the laboratory, 138.4 mg N/L.
    pub(super) fn must() -> Self {
        Self {
            sets: adopted(&Standing::Production),
            premises: "bonded_wine_premises",
            class: "grape_wine".to_owned(),
            volume_ul: (litres("3000", "L"), None),
            sugar: 10.0 * 22.456 * 1.0940 / 0.9982,
            other_sugar: Some((220.0, "laboratory, glucose and fructose".to_owned())),
            brix: Some(22.456),
            yan: Some(Yan {
                sampled_at: at("2025-09-08T15:30:00-07:00"),
                ammonium_n_mg_l: 0.776_484 * 52.0,
                amino_n_mg_l: 98.0,
            }),
            last_ingredient: at("2025-09-08T15:00:00-07:00"),
            pitched: Some(at("2025-09-09T09:00:00-07:00")),
            gravity: GravityAt::Fresh,
            additions: Vec::new(),
            fraction: None,
        }
    }

    /// A: 2,000 L of molasses and cane wash at the spirits plant, 119.3 g/L fermentable, pitched 09-22.
    pub(super) fn wash() -> Self {
        Self {
            premises: "distilled_spirits_plant",
            class: "wash".to_owned(),
            volume_ul: (litres("2000", "L"), None),
            sugar: 119.3,
            other_sugar: None,
            brix: Some(16.710),
            yan: None,
            last_ingredient: at("2025-09-22T09:30:00-07:00"),
            pitched: Some(at("2025-09-22T10:00:00-07:00")),
            ..Self::must()
        }
    }

    pub(super) fn before_pitching(mut self) -> Self {
        self.pitched = None;
        self
    }

    pub(super) fn after_b1(self) -> Self {
        let lines = vec![yeast("YW-0001", "750"), rehydration("900")];
        self.with("2025-09-09T09:00:00-07:00", lines, 8)
    }

    pub(super) fn after_b2(self) -> Self {
        self.after_b1().with("2025-09-11T10:00:00-07:00", vec![autolysate("900")], 6)
    }

    pub(super) fn after_b3(self) -> Self {
        let lines = vec![dap("DP-0387", "500"), dap("DP-0412", "400")];
        self.after_b2().with("2025-09-13T11:00:00-07:00", lines, 6)
    }

    /// The laboratory's answer for a sample taken at 16:30, before the first feeding, rebases the account.
    pub(super) fn after_a1(self) -> Self {
        self.with("2025-09-22T18:10:00-07:00", vec![autolysate("1600")], 0).yan(
            "2025-09-22T16:30:00-07:00",
            13.0,
            47.0,
        )
    }

    pub(super) fn after_a2(self) -> Self {
        self.after_a1().with("2025-09-23T06:30:00-07:00", vec![dap("DP-0412", "400")], 4)
    }

    pub(super) fn with(mut self, when: &str, lines: Vec<ProposedLine>, water_l: i64) -> Self {
        self.additions.push(Done {
            at: at(when),
            lines: lines.into_iter().map(|proposed| proposed.line).collect(),
            carrier_water_ul: water_l * 1_000_000,
        });
        self
    }

    pub(super) fn fraction(mut self, fraction: Fraction) -> Self {
        self.fraction = Some(fraction);
        self
    }

    pub(super) fn yan(mut self, sampled_at: &str, ammonium: f64, amino: f64) -> Self {
        self.yan = Some(Yan {
            sampled_at: at(sampled_at),
            ammonium_n_mg_l: ammonium,
            amino_n_mg_l: amino,
        });
        // A story that samples before the must was complete says so; the others are complete by then.
        if self.premises == "bonded_wine_premises" {
            self.last_ingredient = self.last_ingredient.min(at(sampled_at));
        }
        self
    }

    pub(super) fn without_yan(mut self) -> Self {
        self.yan = None;
        self
    }

    pub(super) fn without_sets(mut self) -> Self {
        self.sets.clear();
        self
    }

    /// With that set alone.
    pub(super) fn adopting(mut self, id: &str) -> Self {
        let (_, text) = shipped().iter().find(|(shipped, _)| *shipped == id).unwrap();
        self.sets = vec![adopt(text, &Standing::Production)];
        self
    }

    pub(super) fn for_market(mut self, market: &str) -> Self {
        self.sets = adopted(&Standing::Market { market: market.to_owned() });
        self
    }

    pub(super) fn without_gravity(mut self) -> Self {
        self.gravity = GravityAt::Never;
        self
    }

    pub(super) fn gravity_at(mut self, when: &str) -> Self {
        self.gravity = GravityAt::At(at(when));
        self
    }

    pub(super) fn class(mut self, class: &str) -> Self {
        self.class = class.to_owned();
        self
    }

    pub(super) fn sugar(mut self, sugar_g_l: f64) -> Self {
        self.sugar = sugar_g_l;
        self.brix = None;
        self
    }

    pub(super) fn volume(mut self, number: &str, unit: &str) -> Self {
        self.volume_ul = (litres(number, unit), None);
        self
    }

    pub(super) fn filling(mut self, present_l: &str, planned_l: &str) -> Self {
        self.volume_ul = (litres(present_l, "L"), Some(litres(planned_l, "L")));
        self
    }

    pub(super) fn assess(&self, proposed: &Proposed) -> Assessment {
        self.assess_now(proposed.planned_at, proposed)
    }

    pub(super) fn assess_at(&self, now: &str, proposed: &Proposed) -> Assessment {
        self.assess_now(at(now), proposed)
    }

    fn assess_now(&self, now: Micros, proposed: &Proposed) -> Assessment {
        let settings = Settings::with(&BTreeMap::new()).unwrap();
        let situation = Situation {
            settings: &settings,
            sets: &self.sets,
            premises_kind: self.premises.to_owned(),
            product_class: self.class.clone(),
            destinations: ["US", "EU", "CA-ON"].map(str::to_owned).to_vec(),
            liquid_present_ul: self.volume_ul.0,
            liquid_planned_ul: self.volume_ul.1,
            sugar_g_l: self.sugar,
            sugar_basis: "original gravity".to_owned(),
            other_sugar: self.other_sugar.clone(),
            original_brix: self.brix,
            demand_mg_g: 0.90,
            yan: self.yan,
            last_ingredient_at: Some(self.last_ingredient),
            pitched_at: self.pitched,
            last_gravity_at: match self.gravity {
                GravityAt::Fresh => Some(proposed.planned_at.plus_hours(-3)),
                GravityAt::Never => None,
                GravityAt::At(when) => Some(when),
            },
            additions: self.additions.clone(),
            fraction: self.fraction.clone(),
            active: self.pitched.is_some(),
            now,
        };
        assess(&situation, proposed)
    }
}
