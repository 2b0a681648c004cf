//! A ledger never refuses a true event: what has happened is recorded, and what is wrong with it is said.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use serde_json::Value;
use tests::{Answer, Cellar, on_both_engines};

/// The legs of an addition as (holding, direction, base amount).
fn legs(entry: &Value) -> Vec<(String, String, i64)> {
    let leg = |leg: &Value| {
        let text = |member: &str| leg[member].as_str().unwrap().to_owned();
        (text("holding"), text("direction"), leg["amount"]["base"].as_i64().unwrap())
    };
    entry["body"]["legs"].as_array().unwrap().iter().map(leg).collect()
}

on_both_engines! {
    fn a_gravity_that_can_hardly_be_is_recorded_and_its_likely_cause_is_told(engine) {
        let mut cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let findings = |answer: &Answer| answer.json()["entries"][0]["body"]["findings"].clone();
        cellar.drive_to("2025-09-09T08:00:00-07:00");
        assert_eq!(findings(&cellar.gravity(&batch, "1.0310")), Value::Null, "nothing odd");
        cellar.drive_to("2025-09-10T08:00:00-07:00");
        let odd = findings(&cellar.gravity(&batch, "1.0620"));
        assert_eq!(odd.as_array().unwrap().len(), 1);
        assert_eq!(odd[0]["rule"], "plausibility.gravity-rise");
        assert_eq!(odd[0]["verdict"], "advise");
        let sentence = odd[0]["sentence"].as_str().unwrap();
        assert!(sentence.contains("1.0310 at 2025-09-09 08:00"), "{sentence}");
        assert!(sentence.ends_with("were two digits swapped (1.0260)?"), "{sentence}");
        let kept = cellar.caro.get(&format!("/v1/batches/{batch}/readings")).expect(200).items();
        assert_eq!(kept[1]["reading"]["findings"], odd, "it stays with the reading");
        cellar.deep_check();
    }

    fn more_than_the_stock_is_recorded_and_the_lot_stands_at_nothing_not_below(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let answer = cellar.add_unasked(&batch, &[(&lot, "12.5", "kg")]).expect(201);
        assert_eq!(answer.text("/verdict"), "refuse");
        let entry = &answer.json()["entries"][0];
        let shortfalls = &entry["body"]["shortfalls"];
        assert_eq!(shortfalls.as_array().unwrap().len(), 1);
        assert_eq!(shortfalls[0]["lot"], *lot);
        assert_eq!(shortfalls[0]["amount"]["base"], 2_500_000_000_i64);
        let unexplained = shortfalls[0]["unexplained"].as_str().unwrap();
        let legs = legs(entry);
        let into: Vec<_> = legs.iter().filter(|leg| leg.1 == "in").map(|leg| leg.2).collect();
        assert_eq!(into, [12_500_000_000]);
        let out: Vec<_> = legs.iter().filter(|leg| leg.1 == "out").collect();
        assert_eq!(out.len(), 2);
        assert!(out.iter().any(|leg| leg.0 == unexplained && leg.2 == 2_500_000_000), "{out:?}");
        assert!(out.iter().any(|leg| leg.0 != unexplained && leg.2 == 10_000_000_000), "{out:?}");
        assert_eq!(cellar.remaining(&lot), 0);

        let again = cellar.add_unasked(&batch, &[(&lot, "1", "g")]).expect(201);
        let shortfall = &again.json()["entries"][0]["body"]["shortfalls"][0];
        assert_eq!(shortfall["amount"]["base"], 1_000_000);
        assert_eq!(cellar.remaining(&lot), 0);
        cellar.deep_check();
    }

    fn what_was_wrong_with_it_opens_one_deviation_that_stays_open_until_quality_resolves_it(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let answer = cellar.add_unasked(&batch, &[(&lot, "12", "kg")]).expect(201);
        let id = answer.text("/deviation");
        let listed = cellar.caro.get("/v1/deviations").expect(200).items();
        assert_eq!(listed.len(), 1);
        assert_eq!(listed[0]["id"], *id);
        let path = format!("/v1/deviations/{id}");
        let open = cellar.caro.get(&path).expect(200).json();
        assert_eq!(open["batch"], *batch);
        assert_eq!(open["resolution"], Value::Null);
        let found: Vec<_> =
            open["findings"].as_array().unwrap().iter().map(|f| f["rule"].as_str().unwrap()).collect();
        assert!(found.contains(&"us-wine.ammonium-phosphate"), "{found:?}");
        assert!(found.contains(&"stock.shortfall"), "{found:?}");
        let resolution = serde_json::json!({"cause": "a torn bag", "action": "counted",
            "conclusion": "not for sale as wine", "secret": tests::cellar::PEOPLE[2].2});
        let resolve = || cellar.caro.post(&format!("{path}/resolution"), &resolution);
        resolve().expect(201);
        let resolved = cellar.caro.get(&path).expect(200);
        assert_eq!(resolved.text("/resolution/cause"), "a torn bag");
        assert_eq!(resolved.text("/resolution/by"), format!("person:{}", cellar.people[2]));
        resolve().expect_problem(409, "conflict");
        cellar.deep_check();
    }

    fn what_was_done_from_a_held_lot_is_recorded_too(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("AU-0208", "AUT", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let hold = serde_json::json!({"status": "held", "reason": "certificate missing"});
        let path = format!("/v1/lots/{lot}/status");
        let held = cellar.caro.request("POST", &path).header("if-match", "*").key(&tests::random_id());
        held.json(&hold).send().expect(201);
        let proposed = cellar.propose(&batch, &[(&lot, "300", "g")]).expect(201);
        assert_eq!(proposed.text("/verdict"), "refuse");
        let done = cellar.add_unasked(&batch, &[(&lot, "300", "g")]).expect(201);
        assert_eq!(done.text("/verdict"), "refuse");
        assert!(done.json()["deviation"].is_string());
        assert_eq!(cellar.remaining(&lot), 9_700_000_000);
        cellar.deep_check();
    }

    fn what_was_done_without_a_fault_opens_no_deviation(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("AU-0208", "AUT", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        cellar.nitrogen(&batch, "40.4", "98");
        let done = cellar.add_unasked(&batch, &[(&lot, "300", "g")]).expect(201);
        assert_ne!(done.text("/verdict"), "refuse");
        assert_eq!(done.json()["deviation"], Value::Null, "{done:?}");
        assert!(cellar.caro.get("/v1/deviations").expect(200).items().is_empty());
        assert_eq!(cellar.remaining(&lot), 9_700_000_000);
        cellar.deep_check();
    }

    fn every_proposal_is_recorded_with_its_verdict_and_a_refused_one_is_not_carried_out(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let refused = cellar.propose(&batch, &[(&lot, "3", "kg")]).expect(201);
        assert_eq!(refused.text("/verdict"), "refuse");
        let allowed = cellar.propose(&batch, &[(&lot, "300", "g")]).expect(201);
        assert_ne!(allowed.text("/verdict"), "refuse");
        assert_eq!(cellar.size(), before + 2);

        let path = format!("/v1/batches/{batch}/proposals");
        let listed = cellar.caro.get(&path).expect(200).items();
        let verdicts: Vec<_> =
            listed.iter().map(|entry| entry["body"]["assessment"]["verdict"].as_str().unwrap()).collect();
        assert_eq!(verdicts, [&allowed.text("/verdict"), "refuse"], "newest first");
        assert_eq!(listed[1]["id"], refused.text("/entry"));
        assert_eq!(listed[1]["body"]["assessment"], refused.json()["assessment"]);

        let proposal = refused.text("/proposal");
        cellar.carry_out(&batch, &proposal, &[(&lot, "3", "kg")]).expect_problem(409, "conflict");
        assert_eq!(cellar.size(), before + 2);
        assert_eq!(cellar.remaining(&lot), 25_000_000_000);
        cellar.deep_check();
    }

    fn an_assessment_answers_like_a_proposal_and_records_nothing(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let asked = cellar.proposal(&[(&lot, "3", "kg")]);
        let path = format!("/v1/batches/{batch}/assessments");
        let answer = cellar.ana.request("POST", &path).json(&asked).send().expect(200);
        assert_eq!(answer.text("/verdict"), "refuse");
        assert_eq!(cellar.size(), before);
        let proposed = cellar.propose(&batch, &[(&lot, "3", "kg")]).expect(201);
        assert_eq!(proposed.json()["assessment"]["findings"], answer.json()["assessment"]["findings"]);
        assert_eq!(cellar.deep_check(), before + 1);
    }
}
