//! What an assessment is made on: the batch as it stands, and what somebody wants to add. Nothing here is stored.

use std::collections::BTreeMap;
use std::sync::Arc;

use crate::rules::RuleSet;
use crate::settings::Settings;
use crate::stamp::Micros;
use crate::units::Quantity;

/// Why a rule set binds.
#[derive(Clone, Debug, Eq, PartialEq)]
pub enum Standing {
    /// By where we are: a breach is what the rule says.
    Production,
    /// By where the batch is meant to be sold: a breach closes that market.
    Market {
        /// The market, as in [`Situation::destinations`].
        market: String,
    },
}

impl Standing {
    /// `production`, or `market:` and the market.
    pub fn name(&self) -> String {
        match self {
            Self::Production => "production".to_owned(),
            Self::Market { market } => format!("market:{market}"),
        }
    }
}

/// A rule set that the site has adopted.
#[derive(Clone, Debug)]
pub struct AdoptedSet {
    /// The rules.
    pub set: Arc<RuleSet>,
    /// SHA-256 of the text that was adopted, hex.
    pub digest: String,
    /// Why it binds.
    pub standing: Standing,
}

/// A nitrogen analysis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Yan {
    /// When the sample was taken (not when the answer came).
    pub sampled_at: Micros,
    /// Nitrogen of ammonium, mg N/L.
    pub ammonium_n_mg_l: f64,
    /// Nitrogen of primary amino acids, mg N/L.
    pub amino_n_mg_l: f64,
}

/// What a lot is used as.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Category {
    /// Food for the yeast.
    Nutrient,
    /// Yeast itself.
    Yeast,
    /// Sulfur dioxide and what sets it free.
    Sulfite,
    /// Enzymes.
    Enzyme,
    /// Sugar in any form.
    Sugar,
    /// Fruit and juice.
    Fruit,
    /// Water.
    Water,
    /// What the wash or mash is made of: molasses, stillage, malt.
    Base,
    /// Anything else.
    Other,
}

impl Category {
    /// Every category.
    pub const ALL: [Self; 9] = [
        Self::Nutrient,
        Self::Yeast,
        Self::Sulfite,
        Self::Enzyme,
        Self::Sugar,
        Self::Fruit,
        Self::Water,
        Self::Base,
        Self::Other,
    ];

    /// The word used in columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Nutrient => "nutrient",
            Self::Yeast => "yeast",
            Self::Sulfite => "sulfite",
            Self::Enzyme => "enzyme",
            Self::Sugar => "sugar",
            Self::Fruit => "fruit",
            Self::Water => "water",
            Self::Base => "base",
            Self::Other => "other",
        }
    }

    /// The category of that name.
    pub fn of(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|category| category.name() == name)
    }
}

/// An amount of one lot.
#[derive(Clone, Debug, PartialEq)]
pub struct Line {
    /// The lot's code on the shelf.
    pub lot_code: String,
    /// What it is called.
    pub material_name: String,
    /// What it is used as.
    pub category: Category,
    /// Mass fraction of each substance in parts per thousand million. See [`crate::checks`] for the names.
    pub composition: BTreeMap<String, i64>,
    /// The names under which a positive list may permit it.
    pub listed_as: Vec<String>,
    /// How much, a mass or a volume.
    pub amount: Quantity,
}

/// An addition already in the batch.
#[derive(Clone, Debug, PartialEq)]
pub struct Done {
    /// When it went in.
    pub at: Micros,
    /// What went in.
    pub lines: Vec<Line>,
    /// The water it was carried in, µL.
    pub carrier_water_ul: i64,
}

/// How far the sugar is used at the planned time, from the forecast.
#[derive(Clone, Debug, PartialEq)]
pub struct Fraction {
    /// The low end of the band, 0 to 1.
    pub low: f64,
    /// The middle.
    pub mid: f64,
    /// The high end.
    pub high: f64,
    /// The probability that more than a third is used.
    pub p_third: f64,
    /// The probability that more than half is used.
    pub p_half: f64,
    /// What the forecast says about leaving its fitted range.
    pub out_of_range_note: Option<String>,
}

/// The batch as it stands at `now`, with what the caller has computed about it.
#[derive(Clone, Debug)]
pub struct Situation<'a> {
    /// The site's thresholds.
    pub settings: &'a Settings,
    /// Every set the site has adopted.
    pub sets: &'a [AdoptedSet],
    /// Such as `bonded_wine_premises`, `distilled_spirits_plant`.
    pub premises_kind: String,
    /// Such as `grape_wine`, `wash`.
    pub product_class: String,
    /// The markets the batch is meant for.
    pub destinations: Vec<String>,
    /// Liquid in the vessel, µL: solids left out.
    pub liquid_present_ul: i64,
    /// Liquid when the filling is done, µL, if more is to come or go.
    pub liquid_planned_ul: Option<i64>,
    /// The sugar at the start, g/L.
    pub sugar_g_l: f64,
    /// Where that figure comes from.
    pub sugar_basis: String,
    /// Another figure for the same sugar, g/L, and where it comes from.
    pub other_sugar: Option<(f64, String)>,
    /// Extract at the start, degrees Brix.
    pub original_brix: Option<f64>,
    /// Nitrogen demand of the yeast, mg N per g sugar.
    pub demand_mg_g: f64,
    /// The latest analysis by time of sampling.
    pub yan: Option<Yan>,
    /// When the last ingredient other than a nutrient went in (fruit, sugar, stillage, water to volume).
    pub last_ingredient_at: Option<Micros>,
    /// When the yeast went in.
    pub pitched_at: Option<Micros>,
    /// When the last gravity was taken.
    pub last_gravity_at: Option<Micros>,
    /// What is in the batch already.
    pub additions: Vec<Done>,
    /// The forecast for the planned time.
    pub fraction: Option<Fraction>,
    /// Whether the ferment is under way.
    pub active: bool,
    /// The present, as the assessment sees it.
    pub now: Micros,
}

/// Whether a lot may be used.
#[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
pub enum LotStatus {
    /// It may.
    Released,
    /// Not until somebody releases it.
    Held,
    /// Never.
    Rejected,
}

/// How the material meets the liquid.
#[derive(Clone, Copy, Debug, Eq, Hash, PartialEq)]
pub enum Preparation {
    /// Dry, straight in.
    Powder,
    /// Stirred up in water, must or wash.
    Slurry,
    /// Dissolved.
    Solution,
    /// As it came: a liquid, or nothing to prepare.
    AsDelivered,
}

impl Preparation {
    /// Every way there is.
    pub const ALL: [Self; 4] = [Self::Powder, Self::Slurry, Self::Solution, Self::AsDelivered];

    /// The word used in columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Powder => "powder",
            Self::Slurry => "slurry",
            Self::Solution => "solution",
            Self::AsDelivered => "as_delivered",
        }
    }

    /// The preparation of that name.
    pub fn of(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|preparation| preparation.name() == name)
    }
}

/// A line of a proposal, with the lot as it stands.
#[derive(Clone, Debug, PartialEq)]
pub struct ProposedLine {
    /// What and how much.
    pub line: Line,
    /// Whether the lot may be used.
    pub lot_status: LotStatus,
    /// Why it is held.
    pub hold_reason: Option<String>,
    /// The lot's last day (opened-on counted in).
    pub expires_at: Option<Micros>,
    /// What is left of the lot, base units of its amount.
    pub remaining_base: i64,
}

/// What somebody wants to add, or has added.
#[derive(Clone, Debug, PartialEq)]
pub struct Proposed {
    /// When it is to go in, or went in.
    pub planned_at: Micros,
    /// What.
    pub lines: Vec<ProposedLine>,
    /// The water it is carried in, µL.
    pub carrier_water_ul: i64,
    /// How it is prepared.
    pub preparation: Preparation,
    /// It has already happened: it is recorded whatever the verdict.
    pub already_done: bool,
    /// The same person's own proposal was referred or refused within the site's `own_refusal_minutes`.
    pub recent_refusal: bool,
}
