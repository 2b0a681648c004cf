//! Published inputs, entered over REST in the units of their source.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use serde_json::{Value, json};
use tests::{Answer, Cellar, on_both_engines};

/// 27 CFR 24.246: at most 8 lb of ammonium phosphate in 1,000 gal of wine.
const DOSE: &str = "us-wine.ammonium-phosphate";
/// 8 lb and 4 lb in grams: the pound is 453.59237 g (NIST SP 811, appendix B.8), each and a tenth of a gram more.
const EIGHT_POUNDS_AND_A_BIT: &str = "3628.83896";
const FOUR_POUNDS_AND_A_BIT: &str = "1814.46948";

fn finding(answer: &Answer, rule: &str) -> Option<Value> {
    let document = answer.json();
    let findings = document["assessment"]["findings"].as_array().cloned().unwrap();
    findings.into_iter().find(|finding| finding["rule"] == rule)
}

fn is_within_the_dose(answer: Answer) {
    let answer = answer.expect(201);
    let finding = finding(&answer, DOSE).expect("what the dose comes to");
    assert_eq!(finding["verdict"], "clear", "{finding}");
    assert_ne!(answer.text("/verdict"), "refuse");
}

fn is_over_the_dose(answer: Answer) {
    let answer = answer.expect(201);
    assert_eq!(answer.text("/verdict"), "refuse");
    let finding = finding(&answer, DOSE).expect("the dose rule's finding");
    assert_eq!(finding["verdict"], "refuse");
    assert_eq!(finding["basis"], "law");
    assert!(finding["citation"].as_str().unwrap().contains("27 CFR 24.246"), "{finding}");
    assert!(finding["remedy"]["sentence"].is_string(), "{finding}");
}

on_both_engines! {
    fn exactly_8_pounds_in_1000_gallons_is_not_over_the_limit_and_a_tenth_of_a_gram_more_is(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "1000", "[gal_us]");
        is_within_the_dose(cellar.propose(&batch, &[(&lot, "8", "[lb_av]")]));
        is_within_the_dose(cellar.propose(&batch, &[(&lot, "3628.73896", "g")]));
        is_over_the_dose(cellar.propose(&batch, &[(&lot, EIGHT_POUNDS_AND_A_BIT, "g")]));
        cellar.deep_check();
    }

    fn two_lots_of_4_pounds_count_together(engine) {
        let mut cellar = Cellar::simulated(engine);
        let opened = cellar.receive("DP-0387", "DAP", "10", "kg");
        let fresh = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "1000", "[gal_us]");
        let four = (opened.as_str(), "4", "[lb_av]");
        is_within_the_dose(cellar.propose(&batch, &[four, (&fresh, "4", "[lb_av]")]));
        is_over_the_dose(cellar.propose(&batch, &[four, (&fresh, FOUR_POUNDS_AND_A_BIT, "g")]));
        cellar.deep_check();
    }

    fn what_went_in_before_counts_together_with_what_is_proposed(engine) {
        let mut cellar = Cellar::simulated(engine);
        let opened = cellar.receive("DP-0387", "DAP", "10", "kg");
        let fresh = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "1000", "[gal_us]");
        cellar.add_unasked(&batch, &[(&opened, "4", "[lb_av]")]).expect(201);
        is_within_the_dose(cellar.propose(&batch, &[(&fresh, "4", "[lb_av]")]));
        is_over_the_dose(cellar.propose(&batch, &[(&fresh, FOUR_POUNDS_AND_A_BIT, "g")]));
        cellar.deep_check();
    }

    /// Varela, Pizarro & Agosin 2004, Appl. Environ. Microbiol. 70:3392, Table 1: two musts of 240 g/L of sugar. That
    /// with 300 mg N/L was dry in 170 h, that with 50 mg N/L took 700 h. Need at medium demand, 0.90 mg N per g of
    /// sugar: 216 mg N/L, so 166 mg/L are missing in 3,000 L: 498 g of nitrogen, 498 / 0.212137 g of the salt.
    fn of_the_two_musts_of_varela_2004_the_second_is_under_fed_and_told_the_cure(engine) {
        let mut cellar = Cellar::simulated(engine);
        let yeast = cellar.receive("YW-0001", "YW", "2", "kg");
        let salt = cellar.receive("DP-0412", "DAP", "25", "kg");
        let must = |code: &str, nitrogen: &str| {
            let mut body = cellar.batch(code, "3000", "L");
            body["fermentable_sugar"] = json!({"g_per_l": "240", "basis": "composition"});
            let batch = cellar.ben.post("/v1/batches", &body).id();
            cellar.nitrogen(&batch, "0", nitrogen);
            batch
        };
        let (fed, starving) = (must("FED", "300"), must("STARVING", "50"));
        let account = |batch: &str| cellar.caro.get(&format!("/v1/batches/{batch}/account")).expect(200);
        for (batch, supply, shortage) in [(&fed, "300.0", "0.0"), (&starving, "50.0", "166.0")] {
            let account = account(batch);
            assert_eq!(account.text("/account/supply_mg_l"), supply);
            assert_eq!(account.text("/account/need_mg_l"), "216.0");
            assert_eq!(account.text("/account/shortage_mg_l"), shortage);
        }
        let pitch = [(yeast.as_str(), "750", "g")];
        let answer = cellar.propose(&fed, &pitch).expect(201);
        assert_eq!(finding(&answer, "need.shortage"), None);
        let answer = cellar.propose(&starving, &pitch).expect(201);
        let shortage = finding(&answer, "need.shortage").expect("the shortage");
        assert_eq!(shortage["params"]["shortage_mg_l"], "166.0");
        assert_eq!(shortage["params"]["missing_nitrogen_g"], "498.0");
        let cure = shortage["remedy"]["sentence"].as_str().unwrap();
        assert!(cure.contains("2,348 g of diammonium phosphate"), "{cure}");
        let cured = cellar.propose(&starving, &[(&salt, "2348", "g")]).expect(201);
        assert_eq!(finding(&cured, "need.shortage"), None);
        assert_eq!(cured.text("/assessment/account_after/shortage_mg_l"), "0.0");
        cellar.deep_check();
    }
}
