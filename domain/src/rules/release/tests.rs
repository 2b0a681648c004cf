use std::sync::Arc;

use jiff::civil::date;

use super::*;
use crate::checks::situation::Category;
use crate::rules::content::{Content, Liquid, Of};
use crate::rules::exact::Exact;
use crate::rules::product::Colour;
use crate::rules::{RuleSet, digest, shipped};
use crate::stamp::Stamp;

fn adopted(id: &str, standing: Standing) -> AdoptedSet {
    let (_, text) = shipped().iter().find(|(shipped, _)| *shipped == id).unwrap();
    AdoptedSet { set: Arc::new(RuleSet::parse(text).unwrap()), digest: digest(text), standing }
}

fn for_market(id: &str, market: &str) -> AdoptedSet {
    adopted(id, Standing::Market { market: market.to_owned() })
}

fn names(list: &[&str]) -> Vec<String> {
    list.iter().map(|&name| name.to_owned()).collect()
}

fn place<'a>(kind: &'a str, class: &'a str, destinations: &'a [String]) -> Place<'a> {
    let at = Micros::parse("2025-09-20T12:00:00Z").unwrap();
    Place { premises_kind: kind, product_class: class, destinations, at }
}

fn mg_l(milligrams: &str) -> Content {
    Content::new([milligrams, "mg", "1", "L"], Of::Product).unwrap()
}

fn exact(text: &str) -> Exact {
    Exact::parse(text).unwrap()
}

/// A plum spirit of 40 % vol.
fn plum(methanol: &str, cyanide: Option<&str>) -> Product {
    let mut analyses = std::collections::BTreeMap::from([("methanol".to_owned(), mg_l(methanol))]);
    analyses.extend(cyanide.map(|found| ("hydrocyanic_acid".to_owned(), mg_l(found))));
    Product {
        names: names(&["fruit_spirit", "stone_fruit_spirit", "plum_spirit"]),
        liquid: Liquid { strength: Some(exact("40")), density_kg_l: Some(exact("0.948")) },
        analyses,
        ..Product::default()
    }
}

fn state(release: &Release, market: &str) -> MarketState {
    release.markets.iter().find(|one| one.market == market).unwrap().state
}

/// Source: Reg. (EU) 2019/787 Annex I cat. 9: 1,200 g/hL of pure alcohol for plum is 4,800 mg/L at 40 % vol; 7 g/hL of
/// hydrocyanic acid is 28 mg/L.
#[test]
fn a_plum_spirit_is_open_closed_or_to_be_measured_by_market() {
    let sets = [adopted("contaminants", Standing::Production)];
    let destinations = names(&["DE", "CA", "US"]);
    let place = place("distilled_spirits_plant", "fruit_mash", &destinations);
    let asked = |product: &Product| release(&sets, &place, product);
    let carbamate = |mut product: Product, found: &str| {
        product.analyses.insert("ethyl_carbamate".to_owned(), mg_l(found));
        product
    };

    let good = asked(&carbamate(plum("4800", Some("28")), "0.37"));
    let states = ["DE", "CA"].map(|market| state(&good, market));
    assert_eq!(states, [MarketState::Open, MarketState::Open]);
    // The United States set methanol in brandy by volume: milligrams do not answer that.
    assert_eq!(state(&good, "US"), MarketState::Measure);

    let unknown = asked(&plum("4800", None));
    assert_eq!(state(&unknown, "DE"), MarketState::Measure);

    let bad = asked(&carbamate(plum("4801", Some("28")), "0.38"));
    assert_eq!(state(&bad, "DE"), MarketState::Closed);
    let worst = &bad.markets[0].findings[0];
    assert_eq!(
        (worst.rule.as_str(), worst.verdict),
        ("contaminants.methanol-eu-soft-fruit", Verdict::Refer)
    );
    assert!(worst.sentence.starts_with("This closes the market DE. "), "{}", worst.sentence);
    // 400 µg/kg at 0.948 kg/L is 379.2 µg/L: 0.38 mg/L is over.
    assert_eq!(state(&bad, "CA"), MarketState::Closed);
}

#[test]
fn a_market_that_no_set_speaks_of_is_open_and_says_so() {
    let destinations = names(&["JP"]);
    let place = place("distilled_spirits_plant", "fruit_mash", &destinations);
    let found = release(&[], &place, &plum("1", None));
    assert_eq!(found.markets[0].state, MarketState::Open);
    assert_eq!(found.markets[0].findings[0].rule, "coverage.no-market-rule");
}

/// Source: 27 CFR 24.246 (0.5 mg/L of copper) and 27 CFR 4.21(a)(3) (1.2 g/L of volatile acid in white wine).
#[test]
fn a_wine_is_refused_here_and_its_market_closed_by_the_sets_that_bind() {
    let destinations = names(&["FR"]);
    let place = place("bonded_wine_premises", "grape_wine", &destinations);
    let sets = [adopted("us-wine", Standing::Production), for_market("eu-wine", "EU")];
    let wine = |copper: &str, sulfite: &str| Product {
        names: names(&["grape_wine"]),
        colour: Some(Colour::White),
        sparkling: Some(false),
        sugar_g_l: Some(exact("2")),
        analyses: [
            ("copper".to_owned(), mg_l(copper)),
            ("sulfur_dioxide_total".to_owned(), mg_l(sulfite)),
            ("volatile_acidity".to_owned(), mg_l("400")),
            ("carbon_dioxide".to_owned(), mg_l("900")),
        ]
        .into(),
        ..Product::default()
    };
    let good = release(&sets, &place, &wine("0.5", "200"));
    assert_eq!((good.verdict, good.markets[0].state), (Verdict::Clear, MarketState::Open));
    let copper = release(&sets, &place, &wine("0.51", "200"));
    assert_eq!((copper.verdict, copper.markets[0].state), (Verdict::Refuse, MarketState::Open));
    let sulfite = release(&sets, &place, &wine("0.5", "201"));
    assert_eq!((sulfite.verdict, sulfite.markets[0].state), (Verdict::Clear, MarketState::Closed));
    assert_eq!(sulfite.markets[0].findings[0].rule, "eu-wine.sulfur-dioxide-white-dry");
}

#[test]
fn sugar_in_a_fruit_mash_is_refused_as_long_as_it_is_to_be_a_fruit_spirit() {
    let sets = [adopted("eu-spirits", Standing::Production)];
    let place = place("any", "fruit_mash", &[]);
    let mut batch = Claimed {
        claims: names(&["fruit_spirit"]),
        materials: vec![("Beet sugar".to_owned(), Category::Sugar)],
        ..Claimed::default()
    };
    let found = claims(&sets, &place, &batch);
    assert_eq!(found.len(), 1);
    assert_eq!(
        (found[0].rule.as_str(), found[0].verdict),
        ("eu-spirits.fruit-spirit", Verdict::Refuse)
    );
    batch.claims.clear();
    assert!(claims(&sets, &place, &batch).is_empty());
}

#[test]
fn wine_treated_with_urease_is_filtered_before_it_is_packaged() {
    let sets = [adopted("us-wine", Standing::Production)];
    let step = |name: &str, at: i64| Step { name: name.to_owned(), at: Micros(at) };
    let asked = |kind: &str, done: &[Step]| {
        let course = Course { done, next: &step("packaging", 9), below_floor: false };
        order(&sets, &place(kind, "grape_wine", &[]), &course).len()
    };
    assert_eq!(asked("bonded_wine_premises", &[step("urease", 1)]), 1);
    assert_eq!(asked("bonded_wine_premises", &[step("urease", 1), step("filtration", 2)]), 0);
    assert_eq!(asked("distilled_spirits_plant", &[step("urease", 1)]), 0);
}

/// Source: 27 CFR 19.580, 19.585 and 19.575, annual edition 2015.
#[test]
fn a_spirits_plant_gauges_enters_and_keeps() {
    let sets = [adopted("us-spirits-plant", Standing::Production)];
    let place = place("distilled_spirits_plant", "wash", &[]);
    let next = Step { name: "production".to_owned(), at: Micros(9) };
    let gauge = Gauge { measures: names(&["volume", "strength"]), at: Micros(5) };
    assert_eq!(gauging(&sets, &place, &next, &[], Micros(1)).len(), 1);
    assert!(gauging(&sets, &place, &next, &[gauge], Micros(1)).is_empty());

    let stamp = |text: &str| Stamp::parse(text).unwrap();
    let late = |entered: &str, holidays: &[Date]| {
        let entered = Entered {
            event: "addition.recorded",
            occurred: stamp("2025-09-12T10:00:00-07:00"),
            entered: stamp(entered),
            has_source_record: false,
        };
        lateness(&sets, &place, &entered, holidays).len()
    };
    assert_eq!(late("2025-09-15T10:00:00-07:00", &[]), 0);
    assert_eq!(late("2025-09-16T10:00:00-07:00", &[]), 1);
    assert_eq!(late("2025-09-16T10:00:00-07:00", &[date(2025, 9, 15)]), 0);

    let kept = |day| keeping(&sets, &place, date(2025, 9, 19), day).len();
    assert_eq!([kept(date(2028, 9, 19)), kept(date(2028, 9, 20))], [1, 0]);
}

#[test]
fn a_set_that_is_not_in_force_is_not_asked() {
    let sets = [adopted("us-spirits-plant", Standing::Production)];
    let at = Micros::parse("2010-01-01T00:00:00Z").unwrap();
    let place = Place { at, ..place("distilled_spirits_plant", "wash", &[]) };
    let kept = keeping(&sets, &place, date(2010, 1, 1), date(2010, 1, 2));
    assert!(kept.is_empty());
}
