use super::*;
use crate::rules::shipped;

const PRACTICE: &str = include_str!("../sets/common-practice.toml");

fn found(text: &str) -> Vec<Located> {
    check(text).unwrap_err()
}

/// The lines of what is told, each with the line it points at.
fn pointed(text: &str) -> Vec<(String, String)> {
    let line = |one: &Located| text.lines().nth(one.line - 1).unwrap_or_default().to_owned();
    found(text).iter().map(|one| (line(one), one.message.clone())).collect()
}

fn changed(changes: &[(&str, &str)]) -> String {
    changes.iter().fold(PRACTICE.to_owned(), |text, (from, to)| {
        assert!(text.contains(from), "{from}");
        text.replacen(from, to, 1)
    })
}

#[test]
fn what_ships_passes_and_reads_the_same_either_way() {
    for (id, text) in shipped() {
        assert_eq!(check(text), Ok(RuleSet::parse(text).unwrap()), "{id}");
    }
}

#[test]
fn every_slip_is_told_at_its_own_line_and_in_the_order_of_the_text() {
    let text = changed(&[
        ("at_least = \"dose_gap_hours\"", "at_least = \"dose_gap\""),
        ("expired = \"refer\"", "expired = \"perhaps\""),
        ("powder_into_active", "powder"),
    ]);
    let told = pointed(&text);
    assert_eq!(told.len(), 3, "{told:?}");
    assert!(told[0].0.contains("dose_gap") && told[0].1.contains("no setting \"dose_gap\""));
    assert!(told[1].0.starts_with("expired") && told[1].1.contains("perhaps"), "{told:?}");
    assert!(told[2].0.starts_with("powder") && told[2].1.contains("unknown field"), "{told:?}");
}

#[test]
fn a_slip_in_the_head_is_told_beside_one_in_a_rule() {
    let text = changed(&[("2000-01-01", "2000-13-01"), ("held = \"refuse\"", "held = 1")]);
    let told = pointed(&text);
    assert_eq!(told.len(), 2, "{told:?}");
    assert!(told[0].0.starts_with("effective_from") && told[0].1.contains("is not a day"));
    assert!(told[1].0.starts_with("held"), "{told:?}");
}

#[test]
fn a_contradiction_points_at_the_member_that_makes_it() {
    let text = changed(&[
        ("form = 1", "form = 2"),
        ("id = \"dose-gap\"", "id = \"sugar-used\""),
        ("below = \"low_supply_mg_l\", ", ""),
        (
            "status = \"READ\", basis = \"common practice\"",
            "status = \"unconfirmed\", basis = \"common practice\"",
        ),
    ]);
    let told = pointed(&text);
    let wanted = [
        ("form = 2", "reads form = 1"),
        ("id = \"sugar-used\"", "used twice"),
        ("bands = ", "a bound above or below"),
        ("source = ", "on = false"),
    ];
    assert_eq!(told.len(), wanted.len(), "{told:?}");
    for ((line, message), (start, part)) in told.iter().zip(wanted) {
        assert!(line.starts_with(start) && message.contains(part), "{line}: {message}");
    }
    assert!(
        text.lines().take(found(&text)[1].line).filter(|line| *line == wanted[1].0).count() == 2
    );
}

#[test]
fn what_is_not_toml_is_told_where_it_breaks() {
    let told = found("id = \"a\"\nform = = 1\ntitle = \"b\"\n");
    assert_eq!((told[0].line, told[0].column), (2, 8), "{told:?}");
}

#[test]
fn a_missing_member_is_told_at_its_rule() {
    let told = pointed(&changed(&[("rejected = \"refuse\"\n", "")]));
    assert_eq!(told.len(), 1, "{told:?}");
    assert!(told[0].1.contains("missing field `rejected`"), "{told:?}");
    assert_eq!(told[0].0, "[[lot_status]]");
}

#[test]
fn a_rule_in_single_brackets_is_told() {
    let told = found(&changed(&[("[[preparation]]", "[preparation]")]));
    assert!(told.iter().any(|one| one.message.contains("double brackets")), "{told:?}");
}

#[test]
fn columns_count_characters() {
    let told = located("é = x\nöö = 1", "é = x\nöö = ".len(), String::new());
    assert_eq!((told.line, told.column), (2, 6));
    assert_eq!(told.to_string(), "line 2, column 6: ");
}

#[test]
fn rules_that_could_never_speak_are_refused() {
    let source = "source = { citation = \"made up\", status = \"READ\", basis = \"law\" }";
    let rule = |body: &str| format!("{PRACTICE}\n{body}\n{source}\n");
    for body in [
        "[[category_claim]]\nid = \"x\"\nclaim = \"y\"\nname = \"y\"",
        "[[gauge_required]]\nid = \"x\"\nsteps = []\nmeasures = [\"volume\"]\nverdict = \"refer\"",
        "[[entry_deadline]]\nid = \"x\"\nevents = []\nbusiness_days = 1\nverdict = \"advise\"",
        "[[contaminant_limit]]\nid = \"x\"\nmarkets = []\nname = \"y\"\nsubstance = \"y\"\nlimit = { amount = \"1\" }",
    ] {
        let told = found(&rule(body));
        assert!(told.len() == 1 && told[0].message.contains("it says nothing"), "{told:?}");
    }
}
