//! Every collected row against what ships: on, off with a reason, or out of scope with a reason; and every number.

use std::collections::{BTreeMap, BTreeSet};

use super::*;
use crate::rules::content::{Content, Of};

const RULES: &str = include_str!("../../../../tests/reference/rules.csv");
const CONTAMINANTS: &str = include_str!("../../../../tests/reference/contaminants.csv");
const OUT_OF_SCOPE: &str = include_str!("../../../../tests/reference/rules_out_of_scope.csv");

/// Fields of one line; quotes may hold commas, and a doubled quote stands for one.
fn fields(line: &str) -> Vec<String> {
    let mut fields = vec![String::new()];
    let mut quoted = false;
    let mut letters = line.chars().peekable();
    while let Some(letter) = letters.next() {
        match letter {
            '"' if quoted && letters.peek() == Some(&'"') => {
                letters.next();
                fields.last_mut().unwrap().push('"');
            }
            '"' => quoted = !quoted,
            ',' if !quoted => fields.push(String::new()),
            other => fields.last_mut().unwrap().push(other),
        }
    }
    assert!(!quoted, "{line}");
    fields
}

type Row = BTreeMap<String, String>;

fn table(text: &str) -> Vec<Row> {
    let mut lines = text.lines().filter(|line| !line.starts_with('#'));
    let names = fields(lines.next().unwrap());
    lines
        .map(|line| {
            let values = fields(line);
            assert_eq!(names.len(), values.len(), "{line}");
            names.iter().cloned().zip(values).collect()
        })
        .collect()
}

fn collected() -> BTreeMap<String, Row> {
    let rows: Vec<Row> = [RULES, CONTAMINANTS].iter().flat_map(|text| table(text)).collect();
    let count = rows.len();
    let by_id: BTreeMap<_, _> = rows.into_iter().map(|row| (row["id"].clone(), row)).collect();
    assert_eq!(by_id.len(), count, "an id is used twice");
    by_id
}

fn sets() -> Vec<RuleSet> {
    shipped().iter().map(|(_, text)| RuleSet::parse(text).unwrap()).collect()
}

#[test]
fn every_collected_row_ships_or_is_out_of_scope_with_a_reason() {
    let rows = collected();
    assert_eq!(rows.len(), 111 + 57);
    let known: BTreeSet<&str> = rows.keys().map(String::as_str).collect();
    let sets = sets();
    let linked: BTreeSet<&str> =
        sets.iter().flat_map(RuleSet::rules).flat_map(|rule| rule.rows.ids()).collect();
    let out = table(OUT_OF_SCOPE);
    assert!(out.iter().all(|row| row["reason"].len() > 10), "{out:?}");
    let out: BTreeSet<&str> = out.iter().map(|row| row["row"].as_str()).collect();
    let unknown: Vec<_> = linked.union(&out).filter(|id| !known.contains(*id)).collect();
    assert!(unknown.is_empty(), "not collected: {unknown:?}");
    let both: Vec<_> = linked.intersection(&out).collect();
    assert!(both.is_empty(), "shipped and out of scope: {both:?}");
    let held: BTreeSet<&str> = linked.union(&out).copied().collect();
    let missing: Vec<_> = known.difference(&held).collect();
    assert!(missing.is_empty(), "neither shipped nor out of scope: {missing:?}");
}

/// A rule that works is known at least as well as it says: what was not read does not ship as READ.
#[test]
fn no_rule_claims_to_be_known_better_than_its_rows() {
    let rows = collected();
    let rank = |status: &str| match status {
        "READ" => 2,
        "FROM MEMORY" => 1,
        "unconfirmed" => 0,
        other => panic!("{other}"),
    };
    let mut seen = 0;
    for set in sets() {
        // A list joins rows of every standing: each name on it is either listed, or marked as unsettled.
        for rule in set.rules().filter(|rule| rule.form != "positive_list") {
            let own = match rule.source.status {
                Status::Read => 2,
                Status::FromMemory => 1,
                Status::Unconfirmed => 0,
            };
            for id in rule.rows.ids() {
                assert!(own <= rank(&rows[id]["status"]), "{}.{} and {id}", set.id, rule.id);
                seen += 1;
            }
        }
    }
    assert!(seen > 120, "{seen}");
}

/// A collected unit as the terms of a content; `None` where it has none.
fn in_unit(amount: &str, unit: &str) -> Option<Content> {
    let product = |unit, per, per_unit| Content::new([amount, unit, per, per_unit], Of::Product);
    let alcohol =
        |unit, per, per_unit| Content::new([amount, unit, per, per_unit], Of::PureAlcohol);
    let content = match unit {
        "lb per 1000 US gal" => product("[lb_av]", "1000", "[gal_us]"),
        "lb per 25000 US gal" => product("[lb_av]", "25000", "[gal_us]"),
        "oz per 1000 US gal" => product("[oz_av]", "1000", "[gal_us]"),
        // Parts per million of a drink are taken as mg/L, as the rows do.
        "mg/L" | "mg/L in distillate" | "ppm" | "mg/L of wine" | "mg/L enzyme preparation" => {
            product("mg", "1", "L")
        }
        "g/L" => product("g", "1", "L"),
        "g/hL" => product("g", "1", "hL"),
        "ug/L" => product("ug", "1", "L"),
        "ug/kg" => product("ug", "1", "kg"),
        "mg/kg" => product("mg", "1", "kg"),
        "% w/v" => product("g", "100", "mL"),
        "% v/v" | "% by volume" => product("L", "100", "L"),
        "g/hL of 100 % vol alcohol" => alcohol("g", "1", "hL"),
        "g/L of ethanol" => alcohol("g", "1", "L"),
        "mg/100 mL anhydrous alcohol" => alcohol("mg", "100", "mL"),
        "pH" => Content::bare(amount),
        _ => return None,
    };
    Some(content.unwrap())
}

/// Every plain number of a text.
fn numbers(text: &str) -> Vec<&str> {
    text.split(|c: char| !c.is_ascii_digit() && c != '.')
        .map(|number| number.trim_matches('.'))
        .filter(|number| !number.is_empty())
        .collect()
}

/// A number that a rule holds something against, as a content; it goes by its id.
fn limits(set: &RuleSet) -> Vec<(&str, &Rows, Content)> {
    let doses =
        set.dose_limit.iter().map(|rule| (rule.id.as_str(), &rule.row, (&rule.limit).into()));
    let left =
        set.residual_limit.iter().map(|rule| (rule.id.as_str(), &rule.row, rule.limit.clone()));
    let levels =
        set.contaminant_limit.iter().map(|rule| (rule.id.as_str(), &rule.row, rule.limit.clone()));
    doses.chain(left).chain(levels).collect()
}

/// In which unit the numbers of a row are; a note may give another figure in a unit of its own.
fn units(row: &Row) -> Vec<&str> {
    let noted = ["g/hL of 100 % vol alcohol"].into_iter().filter(|_| row["note"].contains("g/hL"));
    noted.chain([row["unit"].as_str()]).collect()
}

/// Rows whose number is printed in a unit that was not believed, or that has no kind: the rule is off and says why.
const DOUBTED: [&str; 2] = ["FR-C-003", "MEOH-022"];

#[test]
fn every_collected_number_is_the_number_that_ships() {
    let rows = collected();
    let sets = sets();
    let limits: Vec<_> = sets.iter().flat_map(limits).collect();
    let mut held = 0;
    for (id, row) in rows.iter().filter(|(id, _)| !DOUBTED.contains(&id.as_str())) {
        let linked: Vec<&Content> = limits
            .iter()
            .filter(|(_, rows, _)| rows.ids().any(|linked| linked == id))
            .map(|(_, _, content)| content)
            .collect();
        let printed = numbers(&row["limit_value"]);
        // Strengths belong to claims, which a test of their own holds.
        let strength = row["unit"] == "% vol";
        if strength
            || linked.is_empty()
            || !row["limit_value"].starts_with(|c: char| c.is_ascii_digit())
        {
            continue;
        }
        let wanted = |amount: &str| {
            in_unit(amount, &row["unit"]).unwrap_or_else(|| panic!("{id}: {}", row["unit"]))
        };
        let ships = |amount: &str| linked.iter().any(|limit| limit.is_same(&wanted(amount)));
        assert!(ships(printed[0]), "{id}: {} {} ships as {linked:?}", printed[0], row["unit"]);
        if row["limit_value"].contains(';') {
            for part in row["limit_value"].split(';') {
                assert!(ships(numbers(part)[0]), "{id}: {part} does not ship: {linked:?}");
            }
        }
        held += 1;
    }
    assert!(held > 100, "{held}");
}

#[test]
fn every_shipped_number_is_a_collected_one() {
    let rows = collected();
    let sets = sets();
    let limits: Vec<_> = sets.iter().flat_map(limits).collect();
    for (rule, linked, limit) in &limits {
        let ids: Vec<&str> =
            linked.ids().filter(|id| !DOUBTED.contains(id) && *id != "UK-W-001").collect();
        let stands = ids.iter().any(|id| {
            let row = &rows[*id];
            let mut printed = numbers(&row["limit_value"]);
            printed.extend(numbers(&row["note"]));
            let wanted = units(row)
                .into_iter()
                .flat_map(|unit| printed.iter().filter_map(move |amount| in_unit(amount, unit)));
            wanted.into_iter().any(|wanted| limit.is_same(&wanted))
        });
        assert!(ids.is_empty() || stands, "{rule}: {} is in none of {ids:?}", limit.text());
    }
}

/// The row of the United Kingdom has no number of its own: it says that those of the European text hold.
#[test]
fn the_british_numbers_are_the_european_ones() {
    let sets = sets();
    let of = |id: &str| sets.iter().find(|set| set.id == id).unwrap();
    let (here, there) = (of("uk-wine"), of("eu-wine"));
    assert_eq!(here.dose_limit.len(), 5);
    for rule in &here.dose_limit {
        let other = there.dose_limit.iter().find(|other| other.id == rule.id).unwrap();
        assert_eq!((&rule.limit, rule.over), (&other.limit, other.over), "{}", rule.id);
        assert_eq!((&rule.substances, &rule.counts_as), (&other.substances, &other.counts_as));
    }
}

#[test]
fn claims_ask_what_was_collected() {
    let rows = collected();
    let sets = sets();
    let spirits = sets.iter().find(|set| set.id == "eu-spirits").unwrap();
    let mut stills = 0;
    for claim in &spirits.category_claim {
        let id = claim.row.ids().next().unwrap();
        let row = &rows[id];
        let number = &row["limit_value"];
        let asked = match row["what_is_limited"].as_str() {
            "distillation strength (must be below)" => {
                stills += 1;
                claim.still_below.as_ref()
            }
            "strength at sale, minimum" => claim.sale_at_least.as_ref(),
            "ageing" => {
                let months: Vec<u32> = claim.ageing.iter().map(|way| way.months).collect();
                assert_eq!(
                    (number.as_str(), months),
                    ("6 months in wood under 1000 L, or 1 year", vec![6, 12])
                );
                assert_eq!(claim.ageing[0].wood_below_l.as_ref().unwrap().text(), "1000");
                continue;
            }
            other => panic!("{id}: {other}"),
        };
        assert_eq!(asked.map(exact::Exact::text), Some(number.as_str()), "{id}");
    }
    assert_eq!(stills, 16);
    let fruit = &spirits.category_claim[0];
    assert_eq!(fruit.sale_at_least.as_ref().unwrap().text(), rows["EU-S-021"]["limit_value"]);
    assert_eq!(fruit.sweetening_at_most.as_ref().unwrap().text(), rows["EU-S-022"]["limit_value"]);
    let sugar = positive_list::CategoryName(crate::checks::Category::Sugar);
    assert!(fruit.barred.contains(&sugar));
}

/// Strength and sweetness at sale stand in the rows of a name, or in the notes that list the other names.
#[test]
fn what_claims_ask_at_sale_is_in_their_rows() {
    let rows = collected();
    let sets = sets();
    let spirits = sets.iter().find(|set| set.id == "eu-spirits").unwrap();
    let mut held = 0;
    for claim in &spirits.category_claim {
        let texts: Vec<&str> = claim
            .row
            .ids()
            .flat_map(|id| [rows[id]["limit_value"].as_str(), rows[id]["note"].as_str()])
            .collect();
        for asked in claim.sale_at_least.iter().chain(&claim.sweetening_at_most) {
            let none =
                asked.text() == "0" && texts.iter().any(|text| text.contains("no sweetening"));
            let stands = texts.iter().any(|text| numbers(text).contains(&asked.text()));
            assert!(none || stands, "{}: {}", claim.id, asked.text());
            held += 1;
        }
    }
    assert_eq!(held, 20);
}
