//! Sets beyond those of the story, each asked through a whole assessment.

use std::collections::BTreeMap;

use super::given::{Batch, autolysate, dap, proposal};
use super::*;

const WHEN: &str = "2025-09-10T09:00:00-07:00";

fn pure(substance: &str, grams: &str) -> ProposedLine {
    let mut line = dap("PURE-1", grams);
    line.line.composition = BTreeMap::from([(substance.to_owned(), 1_000_000_000)]);
    line.line.listed_as = vec![substance.to_owned()];
    line
}

fn ask(batch: &Batch, lines: Vec<ProposedLine>) -> Assessment {
    batch.assess(&proposal(WHEN, lines))
}

fn verdict(batch: &Batch, lines: Vec<ProposedLine>, rule: &str) -> Verdict {
    found(&ask(batch, lines), rule).verdict
}

/// Del. Reg. (EU) 2019/934 Annex I Part A Table 2, lines 4.2, 4.3 and footnote (5): 1 g/L of each, and of all together.
#[test]
fn ammonium_salts_count_by_themselves_and_together() {
    let batch = Batch::must().adopting("eu-wine");
    let both = || vec![pure("diammonium_phosphate", "1800"), pure("ammonium_sulfate", "1200")];
    let answer = ask(&batch, both());
    assert_eq!(found(&answer, "eu-wine.diammonium-phosphate").verdict, Verdict::Clear);
    assert_eq!(found(&answer, "eu-wine.ammonium-salts").verdict, Verdict::Clear);
    let mut more = both();
    more.push(pure("ammonium_sulfate", "0.1"));
    let answer = ask(&batch, more);
    assert_eq!(found(&answer, "eu-wine.ammonium-sulfate").verdict, Verdict::Clear);
    assert_eq!(found(&answer, "eu-wine.ammonium-salts").verdict, Verdict::Refuse);
}

/// Line 4.5: 0.6 mg/L as thiamin for each treatment; 3,000 L take 1.8 g of it, as 2.2877 g of the hydrochloride.
#[test]
fn thiamin_is_judged_as_thiamin_and_by_treatment() {
    let batch = Batch::must().adopting("eu-wine");
    let rule = "eu-wine.thiamine";
    let hydrochloride = |grams: &str| vec![pure("thiamine_hydrochloride", grams)];
    assert_eq!(verdict(&batch, hydrochloride("2.287"), rule), Verdict::Clear);
    assert_eq!(verdict(&batch, hydrochloride("2.288"), rule), Verdict::Refuse);
    assert_eq!(verdict(&batch, vec![pure("thiamine", "1.8")], rule), Verdict::Clear);
    assert_eq!(verdict(&batch, vec![pure("thiamine", "1.801")], rule), Verdict::Refuse);
    let treated = batch.with("2025-09-09T12:00:00-07:00", hydrochloride("2.2"), 0);
    assert_eq!(verdict(&treated, hydrochloride("2.2"), rule), Verdict::Clear);

    // 27 CFR 24.246(b) sums what the European text does not.
    let here = Batch::must().with("2025-09-09T12:00:00-07:00", hydrochloride("1.0"), 0);
    let rule = "us-wine.thiamine-hydrochloride";
    assert_eq!(verdict(&here, hydrochloride("1.0"), rule), Verdict::Refuse);
}

#[test]
fn urea_is_not_among_the_european_activators() {
    let batch = Batch::must().adopting("eu-wine");
    let answer = ask(&batch, vec![pure("urea", "10")]);
    let list = found(&answer, "eu-wine.activators");
    assert_eq!(list.verdict, Verdict::Refuse);
    assert!(list.sentence.contains("none of the lines 4.1 to 4.9"), "{}", list.sentence);
    assert_eq!(
        verdict(&batch, vec![pure("ammonium_phosphate", "10")], "eu-wine.activators"),
        Verdict::Advise
    );
}

/// 27 CFR 24.246: 35 lb of potassium bitartrate per 1,000 US gallons, in grape wine.
#[test]
fn a_limit_for_one_class_says_nothing_of_another() {
    let rule = "us-wine.potassium-bitartrate";
    let line = || vec![pure("potassium_bitartrate", "15000")];
    assert_eq!(verdict(&Batch::must(), line(), rule), Verdict::Advise);
    let cider = ask(&Batch::must().class("cider"), line());
    assert!(cider.findings.iter().all(|finding| finding.rule != rule));
}

/// Copper sulfate whose label does not say which is counted as the anhydrous salt.
#[test]
fn copper_is_counted_in_its_salt() {
    let rule = "us-wine.copper";
    // 6 mg/L of copper in 3,000 L are 18 g: 70.69 g of the pentahydrate, 45.20 g of the anhydrous salt.
    let salt = |name: &str, grams: &str| verdict(&Batch::must(), vec![pure(name, grams)], rule);
    assert_eq!(salt("copper_sulfate_pentahydrate", "70.6"), Verdict::Clear);
    assert_eq!(salt("copper_sulfate_pentahydrate", "70.8"), Verdict::Refuse);
    assert_eq!(salt("copper_sulfate", "45.2"), Verdict::Clear);
    assert_eq!(salt("copper_sulfate", "45.3"), Verdict::Refuse);
}

/// 21 CFR 184.1923: urea is lawful at a spirits plant; who wants it signs for it.
#[test]
fn a_spirits_plant_is_told_that_no_list_was_found_and_urea_is_signed_for() {
    let batch = Batch::wash().adopting("us-spirits-plant");
    let rule = "us-spirits-plant.nutrients";
    let answer = ask(&batch, vec![dap("DP-0412", "100")]);
    let told = found(&answer, rule);
    assert_eq!((told.verdict, &told.remedy), (Verdict::Clear, &None));
    assert!(told.sentence.contains("no list of nutrients with numbers was found"));
    assert_eq!(found(&answer, "coverage.no-dose-law").verdict, Verdict::Clear);
    assert_eq!(verdict(&batch, vec![pure("urea", "100")], rule), Verdict::Refer);
}

/// A list that was read in part points out what is not on it, and does not refuse it.
#[test]
fn a_list_read_in_part_does_not_refuse() {
    let batch = Batch::must().adopting("ca-wine");
    let rule = "ca-wine.yeast-foods";
    assert_eq!(verdict(&batch, vec![autolysate("100")], rule), Verdict::Advise);
    let told = ask(&batch, vec![dap("DP-0412", "100")]);
    assert!(found(&told, rule).sentence.contains("state the purpose"));
}

/// Order of 13 November 1987, art. 2: 0.3 g/L; 27 CFR 24.247: 10 lb per 1,000 US gallons.
#[test]
fn cider_in_france_and_distilling_material_have_limits_of_their_own() {
    let cider = Batch::must().class("cider").adopting("fr-cider");
    let rule = "fr-cider.diammonium-phosphate";
    assert_eq!(verdict(&cider, vec![dap("DP-0412", "900")], rule), Verdict::Clear);
    assert_eq!(verdict(&cider, vec![dap("DP-0412", "900.1")], rule), Verdict::Refer);
    let mash = Batch::must().class("fruit_mash").adopting("us-distilling-material");
    let rule = "us-distilling-material.ammonium-phosphate";
    assert_eq!(verdict(&mash, vec![dap("DP-0412", "3594")], rule), Verdict::Clear);
    assert_eq!(verdict(&mash, vec![dap("DP-0412", "3595")], rule), Verdict::Refuse);
}

/// What is from memory works and says so; what is unconfirmed is silent.
#[test]
fn memory_is_marked_and_the_unconfirmed_is_silent() {
    let wine = Batch::must().adopting("uk-wine");
    let answer = ask(&wine, vec![dap("DP-0412", "3001")]);
    let told = found(&answer, "uk-wine.diammonium-phosphate");
    assert_eq!(told.verdict, Verdict::Refer);
    assert!(told.citation.as_ref().unwrap().ends_with("(from memory)"));
    let cider = Batch::must().class("cider").adopting("fr-cider");
    let answer = ask(&cider, vec![pure("thiamine", "100")]);
    assert!(answer.findings.iter().all(|finding| finding.rule != "fr-cider.thiamine"));
}

/// What a province is sold under binds what is meant for it: the batch is meant for a province of Canada.
#[test]
fn a_set_of_a_market_binds_what_is_meant_for_a_part_of_it() {
    let lines = || vec![dap("DP-0412", "3000")];
    let rule = "us-wine.ammonium-phosphate";
    let told = ask(&Batch::must().for_market("CA"), lines());
    assert_eq!(found(&told, rule).verdict, Verdict::Refer);
    let told = ask(&Batch::must().for_market("CA-QC"), lines());
    assert!(told.findings.iter().all(|finding| finding.rule != rule));
}
