//! A request that is repeated is recorded once, and answered as the first time, for ever.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::sync::Barrier;
use std::thread;

use serde_json::{Value, json};
use tests::cellar::START;
use tests::program::Options;
use tests::{Answer, Cellar, Client, Engine, Program, on_both_engines, random_id};

/// Ids and numbers of the entries an answer tells of.
fn entries(answer: &Answer) -> Vec<(String, u64)> {
    let document = answer.json();
    let entries = document["entries"].as_array().unwrap_or_else(|| panic!("{answer:?}"));
    let one =
        |entry: &Value| (entry["id"].as_str().unwrap().to_owned(), entry["seq"].as_u64().unwrap());
    entries.iter().map(one).collect()
}

/// Runs all of them at the same moment and gives what each came to.
fn at_once<T: Send>(asks: Vec<Box<dyn FnOnce() -> T + Send + '_>>) -> Vec<T> {
    let barrier = Barrier::new(asks.len());
    let barrier = &barrier;
    thread::scope(|scope| {
        let threads: Vec<_> = asks
            .into_iter()
            .map(|ask| {
                scope.spawn(move || {
                    barrier.wait();
                    ask()
                })
            })
            .collect();
        threads.into_iter().map(|thread| thread.join().unwrap()).collect()
    })
}

on_both_engines! {
    fn the_same_key_and_body_give_the_first_answer_also_after_kill_9(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "10", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let requests = [
            (format!("/v1/batches/{batch}/readings"), cellar.gravity_body("1.0940")),
            (format!("/v1/batches/{batch}/proposals"), cellar.proposal(&[(&lot, "3", "kg")])),
            (format!("/v1/batches/{batch}/additions"), cellar.already_done(&[(&lot, "12", "kg")])),
            ("/v1/lots".to_owned(), cellar.lot("DP-0500", "DAP", "1", "kg")),
        ];
        let keyed: Vec<_> = requests.iter().map(|request| (random_id(), request)).collect();
        let ask = |cellar: &Cellar| -> Vec<Answer> {
            let ask = |(key, (path, body)): &(String, &(String, Value))| {
                cellar.ana.post_as(key, path, body).expect(201)
            };
            keyed.iter().map(ask).collect()
        };
        let first = ask(&cellar);
        let size = cellar.size();
        let quoted = cellar.ana.post_as(&format!("\"{}\"", keyed[0].0), &requests[0].0, &requests[0].1);
        assert_eq!(quoted.expect(201).json(), first[0].json());
        let again = ask(&cellar);
        cellar.kill_and_restart();
        let after_kill = ask(&cellar);
        for later in [again, after_kill] {
            for (first, later) in first.iter().zip(later) {
                assert_eq!(later.json(), first.json());
            }
        }
        assert_eq!(entries(&first[2]).len(), 2, "the addition and its deviation");
        assert_eq!(cellar.deep_check(), size);
    }

    fn the_same_key_with_another_body_is_422_also_after_kill_9(engine) {
        let mut cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let path = format!("/v1/batches/{batch}/readings");
        let key = random_id();
        cellar.ana.post_as(&key, &path, &cellar.gravity_body("1.0940")).expect(201);
        let size = cellar.size();
        let other = cellar.gravity_body("1.0950");
        cellar.ana.post_as(&key, &path, &other).expect_problem(422, "idempotency-key-reused");
        let elsewhere = cellar.lot("DP-0500", "DAP", "1", "kg");
        cellar.ana.post_as(&key, "/v1/lots", &elsewhere).expect_problem(422, "idempotency-key-reused");
        cellar.kill_and_restart();
        cellar.ana.post_as(&key, &path, &other).expect_problem(422, "idempotency-key-reused");
        assert_eq!(cellar.deep_check(), size);
    }

    fn a_refused_request_uses_up_no_key(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let path = format!("/v1/batches/{batch}/readings");
        let key = random_id();
        let bad = cellar.ana.post_as(&key, &path, &cellar.gravity_body("9.0000"));
        bad.expect_problem(422, "meaningless");
        cellar.ana.post_as(&key, &path, &cellar.gravity_body("1.0940")).expect(201);
        cellar.deep_check();
    }

    fn a_person_is_enrolled_once_however_often_it_is_asked(engine) {
        let cellar = Cellar::simulated(engine);
        let key = random_id();
        let mut body = json!({"login": "edi", "name": "Edi Example",
            "password": "a ledger reads itself aloud", "roles": ["auditor"]});
        let first = cellar.dov.post_as(&key, "/v1/people", &body).expect(201);
        let again = cellar.dov.post_as(&key, "/v1/people", &body).expect(201);
        assert_eq!(again.json(), first.json());
        body["name"] = json!("Edi Other");
        cellar.dov.post_as(&key, "/v1/people", &body).expect_problem(422, "idempotency-key-reused");
        assert_eq!(cellar.dov.get("/v1/people").expect(200).items().len(), 5);
        cellar.deep_check();
    }

    fn eight_repeats_at_once_are_recorded_once(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let path = format!("/v1/batches/{batch}/readings");
        let body = cellar.gravity_body("1.0940");
        let before = cellar.size();
        for round in 1..=5 {
            let key = random_id();
            let ask = || -> Box<dyn FnOnce() -> Answer + Send + '_> {
                Box::new(|| cellar.ana.post_as(&key, &path, &body).expect(201))
            };
            let answers = at_once((0..8).map(|_| ask()).collect());
            for answer in &answers {
                assert_eq!(answer.json(), answers[0].json());
            }
            assert_eq!(cellar.size(), before + round);
        }
        cellar.deep_check();
    }

    fn thirty_two_clients_at_once_all_land_each_once(engine) {
        const EACH: u64 = 5;
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let path = format!("/v1/batches/{batch}/readings");
        let before = cellar.size();
        let clients: Vec<Client> = (0..32).map(|_| cellar.ana.at(cellar.program.url())).collect();
        let work = |client| -> Box<dyn FnOnce() -> Vec<u64> + Send + '_> {
            let (path, cellar) = (&path, &cellar);
            Box::new(move || {
                let client: &Client = client;
                let take = |_| {
                    let answer = client.post(path, &cellar.gravity_body("1.0940")).expect(201);
                    entries(&answer)[0].1
                };
                (0..EACH).map(take).collect()
            })
        };
        let mut landed: Vec<u64> = at_once(clients.iter().map(work).collect()).concat();
        landed.sort_unstable();
        let wanted: Vec<u64> = (before..before + 32 * EACH).collect();
        assert_eq!(landed, wanted, "every entry has a number of its own, without gaps");
        let entries = cellar.caro.get(&format!("/v1/batches/{batch}/entries")).expect(200).items();
        for (index, entry) in entries.iter().enumerate() {
            let subjects = entry["subjects"].as_array().unwrap();
            let own = subjects.iter().find(|subject| subject["id"] == *batch).unwrap();
            assert_eq!(own["n"].as_u64().unwrap(), index as u64 + 1);
        }
        assert_eq!(cellar.deep_check(), before + 32 * EACH);
    }
}

/// A second instance over the same database, as another machine of the same installation.
fn second_instance(cellar: &Cellar) -> Program {
    let home = cellar.program.home();
    let options =
        Options { simulated_from: Some(START.to_owned()), secrets: Some(home.copy_of_secrets()) };
    Program::start(home, options)
}

#[test]
fn a_pair_sent_at_once_to_two_instances_is_recorded_once() {
    let cellar = Cellar::simulated(Engine::Postgres);
    let batch = cellar.open("B1", "3000", "L");
    let other = second_instance(&cellar);
    let there = cellar.ana.at(other.url());
    let path = format!("/v1/batches/{batch}/readings");
    let body = cellar.gravity_body("1.0940");
    let before = cellar.size();
    for round in 1..=20 {
        let key = random_id();
        let pair = at_once::<Answer>(vec![
            Box::new(|| cellar.ana.post_as(&key, &path, &body).expect(201)),
            Box::new(|| there.post_as(&key, &path, &body).expect(201)),
        ]);
        assert_eq!(pair[0].json(), pair[1].json());
        assert_eq!(cellar.size(), before + round);
    }
    cellar.deep_check();
}

#[test]
fn two_instances_write_one_log_and_each_sees_what_the_other_wrote() {
    let mut cellar = Cellar::simulated(Engine::Postgres);
    let lot = cellar.receive("DP-0412", "DAP", "10", "kg");
    let batch = cellar.open("B1", "3000", "L");
    let other = second_instance(&cellar);
    let there = cellar.ana.at(other.url());
    let path = format!("/v1/batches/{batch}/additions");
    let before = cellar.size();
    let asks = (0..20).map(|index| -> Box<dyn FnOnce() -> Answer + Send + '_> {
        let client = if index % 2 == 0 { &cellar.ana } else { &there };
        let body = cellar.already_done(&[(&lot, "600", "g")]);
        let path = &path;
        Box::new(move || client.post(path, &body).expect(201))
    });
    let answers = at_once(asks.collect());
    let deviations: std::collections::BTreeSet<_> = answers
        .iter()
        .filter_map(|answer| answer.json()["deviation"].as_str().map(str::to_owned))
        .collect();
    assert!(!deviations.is_empty(), "12 kg were taken of 10 kg");
    assert_eq!(cellar.remaining(&lot), 0);
    assert_eq!(there.get(&format!("/v1/lots/{lot}")).expect(200).text("/remaining/value"), "0");
    assert_eq!(cellar.deep_check(), before + 20 + deviations.len() as u64);
}

#[test]
fn a_role_withdrawn_at_one_instance_is_gone_at_the_other_within_a_second() {
    let cellar = Cellar::simulated(Engine::Postgres);
    let other = second_instance(&cellar);
    let there = cellar.ana.at(other.url());
    there.get("/v1/me").expect(200);
    let path = format!("/v1/people/{}/roles/cellar", cellar.people[0]);
    cellar.dov.request("DELETE", &path).key(&random_id()).send().expect(200);
    cellar.ana.get("/v1/me").expect_problem(401, "token-refused");
    thread::sleep(std::time::Duration::from_secs(1));
    there.get("/v1/me").expect_problem(401, "token-refused");
}
