//! Two batches of the demonstration, addition by addition: B, a white must, and A, a molasses and cane wash.
//! The figures were computed beforehand by an independent script from the published formulas.

use crate::checks::{Basis, LotStatus, Preparation, Verdict};

use super::given::{Batch, autolysate, dap, fraction, proposal, rehydration, yeast};
use super::{DAP_RULE, found, lot_amount, supply, worst};

#[test]
fn b1_pitching_with_rehydration_product_is_clear() {
    let batch = Batch::must().before_pitching();
    let mut pitch =
        proposal("2025-09-09T09:00:00-07:00", vec![yeast("YW-0001", "750"), rehydration("900")]);
    pitch.carrier_water_ul = 8_000_000;
    let answer = batch.assess(&pitch);
    assert_eq!(worst(&answer), []);
    assert_eq!(answer.verdict, Verdict::Clear);
    assert_eq!(supply(&answer), "150.4");
    let thiamine = found(&answer, "us-wine.thiamine-hydrochloride");
    assert_eq!(thiamine.value.as_deref(), Some("0.300"));
    assert_eq!(thiamine.limit.as_deref(), Some("0.599"));
    let water = found(&answer, "us-wine.carrier-water");
    assert!(water.sentence.contains("8.0 L of at most 30.0 L"), "{}", water.sentence);
    let shortage = found(&answer, "need.shortage");
    assert_eq!(shortage.verdict, Verdict::Clear);
    assert_eq!(shortage.params["shortage_mg_l"], "71.1");
    // More of the rehydration product would break the limit on thiamine.
    let cure = &shortage.remedy.as_ref().unwrap().sentence;
    assert!(cure.contains("1,006 g of diammonium phosphate"), "{cure}");
}

#[test]
fn b2_amino_nitrogen_before_ammonium_is_clear() {
    let batch = Batch::must().after_b1().fraction(fraction(0.05, 0.02));
    let answer =
        batch.assess(&proposal("2025-09-11T10:00:00-07:00", vec![autolysate("900")]).water(6));
    assert_eq!(worst(&answer), []);
    assert_eq!(supply(&answer), "164.2");
    let cure = &found(&answer, "need.shortage").remedy.as_ref().unwrap().sentence;
    assert!(cure.contains("3,737 g more of AU-0208"), "{cure}");
}

#[test]
fn b3_two_lots_of_one_salt_count_together() {
    let batch = Batch::must().after_b2().fraction(fraction(0.246, 0.02));
    let lines = vec![dap("DP-0387", "500"), dap("DP-0412", "400")];
    let answer = batch.assess(&proposal("2025-09-13T11:00:00-07:00", lines).water(6));
    assert_eq!(worst(&answer), []);
    assert_eq!(supply(&answer), "227.8");
    assert_eq!(answer.account_after.line_mg_l.as_deref(), Some("236.4"));
    let dose = found(&answer, DAP_RULE);
    assert_eq!(dose.value.as_deref(), Some("300.000"));
    assert_eq!(dose.verdict, Verdict::Clear);
    let topics: Vec<&str> = answer.cautions.iter().map(|one| one.topic.as_str()).collect();
    assert!(topics.contains(&"carbon-dioxide") && topics.contains(&"foam"), "{topics:?}");
    assert!(answer.cautions.iter().any(|caution| caution.text.contains("headspace")));
}

#[test]
fn b4_the_running_total_over_the_limit_is_refused_and_the_need_is_the_remedy() {
    let batch = Batch::must().after_b3().fraction(fraction(0.425, 0.02));
    let answer =
        batch.assess(&proposal("2025-09-15T09:30:00-07:00", vec![dap("DP-0412", "2100")]).water(2));
    assert_eq!(answer.verdict, Verdict::Refuse);
    assert_eq!(supply(&answer), "376.3");
    let dose = found(&answer, DAP_RULE);
    assert_eq!(dose.verdict, Verdict::Refuse);
    assert_eq!(dose.basis, Basis::Law);
    assert_eq!(dose.value.as_deref(), Some("1000.000"));
    assert_eq!(dose.limit.as_deref(), Some("958.611"));
    assert_eq!(dose.citation.as_deref(), Some("27 CFR 24.246"));
    assert_eq!(dose.rule_set.as_deref(), Some(answer.rule_sets[0].digest.as_str()));
    assert_eq!(dose.params["law_rest_g"], "1975");
    assert_eq!(lot_amount(dose), "121 g");
    assert_eq!(
        dose.sentence,
        "Ammonium phosphate comes to 1.000 g/L with this; the limit is 0.958611 g/L \
         (8 lb per 1,000 US gal, 27 CFR 24.246; printed 0.96 g/L)."
    );
    assert_eq!(
        dose.remedy.as_ref().unwrap().sentence,
        "Add at most 121 g: that meets what this batch needs. (27 CFR 24.246 alone would leave 1,975 g.)"
    );
    let excess = found(&answer, "common-practice.excess");
    assert_eq!((excess.verdict, lot_amount(excess).as_str()), (Verdict::Refer, "121 g"));
}

#[test]
fn b4_done_as_the_remedy_says_has_no_dose_and_no_excess_finding() {
    let batch = Batch::must().after_b3().fraction(fraction(0.246, 0.02));
    let answer = batch.assess(&proposal("2025-09-15T09:30:00-07:00", vec![dap("DP-0412", "121")]));
    assert_eq!(worst(&answer), []);
    let one_more =
        batch.assess(&proposal("2025-09-15T09:30:00-07:00", vec![dap("DP-0412", "123")]));
    assert_eq!(worst(&one_more), [(Verdict::Advise, "common-practice.excess")]);
}

#[test]
fn b4b_between_a_third_and_half_with_a_little_too_much_is_two_advices() {
    let batch = Batch::must().after_b3().fraction(fraction(0.425, 0.02));
    let answer =
        batch.assess(&proposal("2025-09-15T09:32:00-07:00", vec![dap("DP-0412", "210")]).water(2));
    assert_eq!(
        worst(&answer),
        [
            (Verdict::Advise, "common-practice.sugar-used"),
            (Verdict::Advise, "common-practice.excess"),
        ]
    );
    assert_eq!(supply(&answer), "242.7");
    assert_eq!(found(&answer, "common-practice.excess").params["excess_mg_l"], "6.3");
}

#[test]
fn b5_late_ammonium_is_referred_with_what_to_do_instead() {
    let batch = Batch::must().after_b3().fraction(fraction(0.605, 0.999));
    let answer =
        batch.assess(&proposal("2025-09-18T18:00:00-07:00", vec![dap("DP-0412", "150")]).water(2));
    assert_eq!(
        worst(&answer),
        [
            (Verdict::Refer, "common-practice.sugar-used"),
            (Verdict::Advise, "common-practice.excess"),
        ]
    );
    assert_eq!(supply(&answer), "238.4");
    assert_eq!(found(&answer, "common-practice.excess").params["excess_mg_l"], "2.0");
    let instead = &found(&answer, "common-practice.sugar-used").remedy.as_ref().unwrap().sentence;
    assert!(instead.contains("warmed") && instead.contains("up to 1,078 g"), "{instead}");
    let water = found(&answer, "us-wine.carrier-water");
    assert!(water.sentence.contains("22.0 L of at most 30.0 L"), "{}", water.sentence);
}

#[test]
fn b5a_a_held_lot_is_refused_with_its_reason() {
    let batch = Batch::must().after_b3().fraction(fraction(0.605, 0.999));
    let mut wanted = proposal("2025-09-18T18:00:00-07:00", vec![autolysate("300")]);
    wanted.lines[0].lot_status = LotStatus::Held;
    wanted.lines[0].hold_reason = Some("certificate missing".to_owned());
    let answer = batch.assess(&wanted);
    assert_eq!(answer.verdict, Verdict::Refuse);
    let held = found(&answer, "common-practice.lot");
    assert_eq!(held.sentence, "Lot AU-0208 is on hold: certificate missing.");
    assert!(held.remedy.as_ref().unwrap().sentence.contains("another lot"));
}

#[test]
fn a1_says_that_the_analysis_is_old_and_that_no_dose_law_was_checked() {
    let batch =
        Batch::wash().yan("2025-09-21T12:00:00-07:00", 12.0, 46.0).fraction(fraction(0.04, 0.001));
    let answer = batch.assess(&proposal("2025-09-22T18:10:00-07:00", vec![autolysate("1600")]));
    assert_eq!(worst(&answer), [(Verdict::Advise, "common-practice.yan-age")]);
    assert_eq!(supply(&answer), "94.8");
    let coverage = found(&answer, "coverage.no-dose-law");
    assert_eq!(coverage.verdict, Verdict::Clear);
    assert!(coverage.sentence.starts_with(
        "No adopted set limits nutrients at these premises: no legal dose check was made here"
    ));
    let bound: Vec<&str> = answer.rule_sets.iter().map(|set| set.id.as_str()).collect();
    assert_eq!(bound, ["common-practice"]);
}

#[test]
fn a2_up_to_the_need_is_clear() {
    let batch = Batch::wash().after_a1().fraction(fraction(0.21, 0.01));
    let answer =
        batch.assess(&proposal("2025-09-23T06:30:00-07:00", vec![dap("DP-0412", "400")]).water(4));
    assert_eq!(worst(&answer), []);
    assert_eq!(supply(&answer), "139.2");
    assert_eq!(answer.account_after.need_mg_l, "140.0");
    assert!(answer.findings.iter().any(|finding| finding.rule == "coverage.no-dose-law"));
}

#[test]
fn a3_thrown_in_at_night_gives_three_findings() {
    let batch = Batch::wash().after_a2().fraction(fraction(0.583, 0.97));
    let mut done = proposal("2025-09-24T02:40:00-07:00", vec![dap("DP-0412", "300")]);
    done.preparation = Preparation::Powder;
    done.already_done = true;
    let answer = batch.assess_at("2025-09-24T09:05:00-07:00", &done);
    assert_eq!(
        worst(&answer),
        [
            (Verdict::Refer, "common-practice.sugar-used"),
            (Verdict::Advise, "common-practice.excess"),
            (Verdict::Advise, "common-practice.powder"),
        ]
    );
    assert_eq!(supply(&answer), "171.0");
    assert_eq!(found(&answer, "common-practice.excess").params["excess_mg_l"], "31.0");
}
