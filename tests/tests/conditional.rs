//! Changes that need to know what they change: `ETag`, `If-Match`, `If-None-Match`.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use serde_json::{Value, json};
use tests::{Answer, Cellar, on_both_engines, random_id};

/// Holds the lot, on the condition that a client sends.
fn hold(cellar: &Cellar, lot: &str, condition: Option<&str>) -> Answer {
    let path = format!("/v1/lots/{lot}/status");
    let asking = cellar.caro.request("POST", &path).key(&random_id());
    let asking = match condition {
        Some(condition) => asking.header("if-match", condition),
        None => asking,
    };
    asking.json(&json!({"status": "held", "reason": "certificate missing"})).send()
}

fn redescribe(cellar: &Cellar, vessel: &Value, condition: &str, key: &str) -> Answer {
    let path = format!("/v1/vessels/{}", cellar.id("T-12"));
    cellar.ben.request("PUT", &path).key(key).header("if-match", condition).json(vessel).send()
}

on_both_engines! {
    fn a_stale_change_is_412_a_blind_one_428_and_neither_is_recorded(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let path = format!("/v1/lots/{lot}");
        let seen = cellar.caro.get(&path).expect(200).header("etag").unwrap().to_owned();
        let batch = cellar.open("B1", "3000", "L");
        cellar.add_unasked(&batch, &[(&lot, "300", "g")]).expect(201);
        let now = cellar.caro.get(&path).expect(200).header("etag").unwrap().to_owned();
        assert_ne!(now, seen, "every entry about the lot moves its tag");

        let before = cellar.size();
        hold(&cellar, &lot, Some(&seen)).expect_problem(412, "stale");
        hold(&cellar, &lot, Some(&format!("W/{now}"))).expect_problem(412, "stale");
        hold(&cellar, &lot, None).expect_problem(428, "if-match-missing");
        hold(&cellar, &lot, Some("nonsense")).expect_problem(400, "not-readable");
        assert_eq!(cellar.size(), before);
        hold(&cellar, &lot, Some(&now)).expect(201);
        hold(&cellar, &lot, Some(&now)).expect_problem(412, "stale");
        assert_eq!(cellar.deep_check(), before + 1);
    }

    fn a_repeat_with_the_old_tag_is_the_first_answer_and_not_412(engine) {
        let cellar = Cellar::simulated(engine);
        let path = format!("/v1/vessels/{}", cellar.id("T-12"));
        let seen = cellar.ben.get(&path).expect(200).header("etag").unwrap().to_owned();
        let vessel = json!({"code": "T-12", "name": "tank by the door", "premises": "BW",
            "capacity": {"value": "3500", "unit": "L"}});
        let key = random_id();
        let first = redescribe(&cellar, &vessel, &seen, &key).expect(200);
        let again = redescribe(&cellar, &vessel, &seen, &key).expect(200);
        assert_eq!(again.json(), first.json());
        redescribe(&cellar, &vessel, &seen, &random_id()).expect_problem(412, "stale");
        assert_eq!(cellar.ben.get(&path).expect(200).text("/name"), "tank by the door");
        cellar.deep_check();
    }

    fn who_has_it_already_gets_304_until_it_changes(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let paths = [
            format!("/v1/batches/{batch}"),
            format!("/v1/lots/{lot}"),
            format!("/v1/materials/{}", cellar.id("DAP")),
        ];
        let ask = |path: &str, tag: &str| cellar.ana.request("GET", path).header("if-none-match", tag).send();
        for path in &paths {
            let whole = cellar.ana.get(path).expect(200);
            let tag = whole.header("etag").unwrap();
            assert_eq!(tag, format!("\"{}\"", whole.number("/n")));
            let unchanged = ask(path, tag).expect(304);
            assert!(unchanged.bytes.is_empty());
            assert_eq!(unchanged.header("etag"), Some(tag));
            assert_eq!(ask(path, "\"999\"").expect(200).json(), whole.json());
        }
        let tag = cellar.ana.get(&paths[0]).expect(200).header("etag").unwrap().to_owned();
        cellar.gravity(&batch, "1.0940");
        ask(&paths[0], &tag).expect(200);
        cellar.deep_check();
    }
}
