//! Many hands on the last of a lot: the book never has less than nothing.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::sync::Barrier;
use std::thread;

use serde_json::Value;
use tests::{Answer, Cellar, Client, on_both_engines};

const HANDS: usize = 50;
/// 10 kg in micrograms.
const ALL: i64 = 10_000_000_000;
/// What each hand takes, 300 g, in micrograms.
const EACH: i64 = 300_000_000;

/// Every hand at the same moment, each with a connection of its own.
fn all_hands(cellar: &Cellar, ask: impl Fn(&Client, usize) -> Answer + Sync) -> Vec<Answer> {
    let barrier = Barrier::new(HANDS);
    thread::scope(|scope| {
        let threads: Vec<_> = (0..HANDS)
            .map(|hand| {
                let (barrier, ask) = (&barrier, &ask);
                let client = cellar.ana.at(cellar.program.url());
                scope.spawn(move || {
                    barrier.wait();
                    ask(&client, hand)
                })
            })
            .collect();
        threads.into_iter().map(|thread| thread.join().unwrap()).collect()
    })
}

/// Runs through the batch's entries in the log's order and gives what came out of the lot's stock and what out of the
/// unexplained; the stock is never overdrawn on the way.
fn drawn(cellar: &Cellar, batch: &str, lot: &str) -> (i64, i64) {
    let entries = cellar.caro.get(&format!("/v1/batches/{batch}/entries")).expect(200).items();
    let (mut stock, mut unexplained) = (0, 0);
    for entry in entries.iter().filter(|entry| entry["kind"] == "addition.recorded") {
        let body = &entry["body"];
        assert_eq!(body["lines"][0]["lot"], *lot);
        let missing = body["shortfalls"][0]["amount"]["base"].as_i64().unwrap_or(0);
        let out = |leg: &&Value| leg["direction"] == "out";
        let legs = body["legs"].as_array().unwrap().iter().filter(out);
        let out: i64 = legs.map(|leg| leg["amount"]["base"].as_i64().unwrap()).sum();
        assert_eq!(out, EACH, "{body}");
        unexplained += missing;
        stock += out - missing;
        assert!(stock <= ALL, "more was taken out of the lot than there was");
    }
    (stock, unexplained)
}

on_both_engines! {
    fn fifty_hands_who_had_taken_from_the_last_10_kg_leave_nothing_and_not_less(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("SU-0001", "SUG", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let path = format!("/v1/batches/{batch}/additions");
        let body = cellar.already_done(&[(&lot, "300", "g")]);
        let answers = all_hands(&cellar, |client, _| client.post(&path, &body));
        let mut deviations = 0;
        for answer in answers {
            let answer = answer.expect(201);
            let short = answer.json().pointer("/entries/0/body/shortfalls").is_some();
            assert_eq!(answer.json()["deviation"].is_string(), short);
            deviations += usize::from(short);
        }
        assert_eq!(cellar.remaining(&lot), 0);
        assert_eq!(drawn(&cellar, &batch, &lot), (ALL, 50 * EACH - ALL));
        assert_eq!(deviations, 50 - 33, "33 times 300 g were there, the 34th found 100 g");
        assert_eq!(cellar.caro.get("/v1/deviations").expect(200).items().len(), deviations);
        cellar.deep_check();
    }

    fn of_fifty_proposals_on_the_last_10_kg_only_33_are_carried_out(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("SU-0001", "SUG", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let line = [(lot.as_str(), "300", "g")];
        let proposals: Vec<String> = (0..HANDS)
            .map(|_| cellar.propose(&batch, &line).expect(201).text("/proposal"))
            .collect();
        let path = format!("/v1/batches/{batch}/additions");
        let body = |hand: usize| {
            serde_json::json!({"proposal": proposals[hand], "done_at": cellar.now(),
                "lines": tests::cellar::draws(&line), "preparation": "slurry"})
        };
        let answers = all_hands(&cellar, |client, hand| client.post(&path, &body(hand)));
        let (done, refused): (Vec<_>, Vec<_>) =
            answers.into_iter().partition(|answer| answer.status == 201);
        for answer in &refused {
            answer.clone().expect_problem(409, "conflict");
        }
        assert_eq!((done.len(), refused.len()), (33, 17));
        assert_eq!(cellar.remaining(&lot), ALL - 33 * EACH);
        assert_eq!(drawn(&cellar, &batch, &lot), (33 * EACH, 0));
        cellar.deep_check();
    }
}
