//! The usual safety cautions that go with an addition. Nothing here replaces a risk assessment of the site.

use crate::rules::timing_limit::Carries;

use super::case::Case;
use super::finding::Caution;
use super::situation::Category;

/// What to mind with this proposal; carbon dioxide and the law always.
pub(crate) fn cautions(case: &Case<'_>) -> Vec<Caution> {
    let is = |category| case.proposed_lines().any(|line| line.category == category);
    let sulfite = is(Category::Sulfite)
        || case.proposed_lines().any(|line| line.composition.contains_key("sulfur_dioxide"));
    let feeding = is(Category::Nutrient) || case.carries(Carries::Nitrogen);
    let stone_fruit = matches!(case.situation.product_class.as_str(), "fruit_mash" | "marc");
    let shown = [
        (true, &CARBON_DIOXIDE),
        (feeding, &FOAM),
        (feeding, &LATE_NITROGEN),
        (case.carries(Carries::Ammonium), &AMMONIA),
        (sulfite, &SULFUR_DIOXIDE),
        (stone_fruit, &CYANIDE),
        (true, &LAW),
    ];
    shown.into_iter().filter(|(show, _)| *show).map(|(_, row)| row.caution()).collect()
}

/// What every record on paper says, also where nothing was ever proposed.
pub fn always() -> [Caution; 2] {
    [CARBON_DIOXIDE.caution(), CONFINED_SPACE.caution()]
}

/// One caution.
pub(crate) struct Row {
    topic: &'static str,
    /// As it is shown.
    pub(crate) text: &'static str,
    source: &'static str,
}

impl Row {
    fn caution(&self) -> Caution {
        Caution {
            topic: self.topic.to_owned(),
            text: self.text.to_owned(),
            source: self.source.to_owned(),
        }
    }
}

pub(crate) static CARBON_DIOXIDE: Row = Row {
    topic: "carbon-dioxide",
    text: "Carbon dioxide has no smell, is heavier than air and gathers in pits and tanks. Measure it at low level before you go in, ventilate, never lean into a tank.",
    source: "OSHA 8 h limit 5,000 ppm, 29 CFR 1910.1000 Z-1 (from memory); immediately dangerous at 40,000 ppm (NIOSH, read at second hand)",
};

static CONFINED_SPACE: Row = Row {
    topic: "confined-space",
    text: "Going into a tank, pit or still is permit work: isolate it; test for oxygen, then flammable vapour, then toxic gas; ventilate by forced air all the time; somebody stays outside with rescue ready. Most who die are would-be rescuers.",
    source: "29 CFR 1910.146(b), (c)(5)(ii)(C): oxygen below 19.5 % or above 23.5 %, flammable vapour above 10 % of its lower limit (edition of 2015); the last sentence from memory",
};

pub(crate) static FOAM: Row = Row {
    topic: "foam",
    text: "A nutrient sets gas free in an active ferment: slurry first, add slowly, leave headspace.",
    source: "common practice (from memory)",
};

static LATE_NITROGEN: Row = Row {
    topic: "urea-and-late-nitrogen",
    text: "Urea as a nutrient, ammonium late or in excess, warm storage and light push ethyl carbamate up.",
    source: "US FDA / UC Davis preventative manual (Butzke & Bisson 1997), 27 CFR 24.246",
};

static AMMONIA: Row = Row {
    topic: "ammonia",
    text: "Ammonium salts with caustic or lime set ammonia free, with hypochlorite chloramines. Weigh and store them apart; rinse vessels first.",
    source: "general chemistry; OSHA limit for ammonia 50 ppm, 29 CFR 1910.1000 (from memory)",
};

pub(crate) static SULFUR_DIOXIDE: Row = Row {
    topic: "sulfur-dioxide",
    text: "Sulfur dioxide burns eyes and lungs and can trigger asthma; acid on sulfite sets it free at once. Add to water in open air, never lean over. It is an allergen to be declared.",
    source: "OSHA limit 5 ppm, 29 CFR 1910.1000; NIOSH (from memory)",
};

static CYANIDE: Row = Row {
    topic: "stone-fruit-cyanide",
    text: "Stone fruit: no crushed stones, store the mash briefly, distil promptly; test for hydrogen cyanide and ethyl carbamate before release.",
    source: "Regulation (EU) 2019/787; CXC 70-2011",
};

pub(crate) static LAW: Row = Row {
    topic: "law",
    text: "Local requirements prevail over any result shown here; a limit shown is not legal advice, and a computed figure is no laboratory analysis.",
    source: "statement of this program",
};
