//! What was acknowledged is there, whenever the program is killed.
//!
//! Goal: no acknowledged command lost, none written twice, the log whole. Method: eight clients record readings while
//! the program is killed at random moments and started again; at the end every key that got its answer is sent once
//! more and must be answered with the very entry of the first answer.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::collections::BTreeMap;
use std::sync::atomic::{AtomicBool, Ordering};
use std::sync::{Arc, Mutex, RwLock};
use std::time::{Duration, Instant};

use tests::{Cellar, Client, Engine, on_both_engines, random_id};

/// How many clients record at once.
const CLIENTS: usize = 8;
/// How often the program is killed.
const KILLS: usize = 20;
/// After which a program that records nothing is held to be broken; a loaded machine is slow.
const PATIENCE: Duration = Duration::from_mins(1);

/// Key → the entry that its answer named.
type Acknowledged = Arc<Mutex<BTreeMap<String, String>>>;

on_both_engines! {
    fn every_acknowledged_command_is_found_once_by_its_key_after_twenty_kills(engine) {
        crash(engine);
    }
}

fn crash(engine: Engine) {
    let mut cellar = Cellar::simulated(engine);
    let batches: Vec<String> =
        ["T-12", "T-13"].iter().enumerate().map(|(i, tank)| open(&cellar, i, tank)).collect();
    let body = cellar.gravity_body("1.0900");
    let acknowledged = Acknowledged::default();
    let stop = Arc::new(AtomicBool::new(false));
    let url = Arc::new(RwLock::new(cellar.program.url().to_owned()));
    let clients: Vec<_> = (0..CLIENTS)
        .map(|i| {
            let path = format!("/v1/batches/{}/readings", batches[i % batches.len()]);
            let (ana, body) = (cellar.ana.clone(), body.clone());
            let (known, stop, url) =
                (Arc::clone(&acknowledged), Arc::clone(&stop), Arc::clone(&url));
            std::thread::spawn(move || record(&ana, &path, &body, &known, &stop, &url))
        })
        .collect();
    for _ in 0..KILLS {
        wait_for_more(&acknowledged);
        std::thread::sleep(Duration::from_millis(random_pause()));
        cellar.kill_and_restart();
        cellar.program.url().clone_into(&mut url.write().unwrap());
    }
    wait_for_more(&acknowledged);
    stop.store(true, Ordering::SeqCst);
    let asked: usize = clients.into_iter().map(|client| client.join().unwrap()).sum();
    every_answer_stands(&cellar, &batches, &acknowledged.lock().unwrap(), &body);
    let entries = cellar.deep_check();
    let known = acknowledged.lock().unwrap().len();
    println!("{engine:?}: {KILLS} kills, {asked} asked, {known} acknowledged, {entries} entries");
    assert!(known >= KILLS, "only {known} commands were acknowledged in all");
}

fn open(cellar: &Cellar, index: usize, tank: &str) -> String {
    let mut body = cellar.batch(&format!("EXW-25-K{index}"), "3000", "L");
    body["vessel"] = cellar.id(tank).into();
    cellar.ben.post("/v1/batches", &body).id()
}

/// Records readings until told to stop; a command without an answer is sent again with its key.
fn record(
    ana: &Client,
    path: &str,
    body: &serde_json::Value,
    known: &Acknowledged,
    stop: &AtomicBool,
    url: &RwLock<String>,
) -> usize {
    let mut asked = 0;
    while !stop.load(Ordering::SeqCst) {
        let key = random_id();
        asked += 1;
        while !stop.load(Ordering::SeqCst) {
            let here = ana.at(&url.read().unwrap());
            let sent = here.request("POST", path).key(&key).json(body).try_send();
            match sent {
                Ok(answer) if answer.status == 201 => {
                    known.lock().unwrap().insert(key.clone(), answer.text("/id"));
                    break;
                }
                Ok(answer) => assert_eq!(answer.status, 503, "{answer:?}"),
                Err(_) => std::thread::sleep(Duration::from_millis(5)),
            }
        }
    }
    asked
}

/// Each acknowledged key is answered as before, and each entry carries a key of its own.
fn every_answer_stands(
    cellar: &Cellar,
    batches: &[String],
    known: &BTreeMap<String, String>,
    body: &serde_json::Value,
) {
    let before = cellar.size();
    for (key, entry) in known {
        let again = batches.iter().find_map(|batch| {
            let path = format!("/v1/batches/{batch}/readings");
            let answer = cellar.ana.post_as(key, &path, body);
            (answer.status == 201).then(|| answer.text("/id"))
        });
        assert_eq!(again.as_ref(), Some(entry), "the answer to {key} is another now");
    }
    assert_eq!(cellar.size(), before, "a repeat was written");
}

/// Waits until more commands are acknowledged than now, so that no kill comes before the program is at work again.
fn wait_for_more(acknowledged: &Acknowledged) {
    let count = || acknowledged.lock().unwrap().len();
    let (before, end) = (count(), Instant::now() + PATIENCE);
    while count() == before {
        assert!(Instant::now() < end, "nothing was recorded for {PATIENCE:?}");
        std::thread::sleep(Duration::from_millis(5));
    }
}

/// From 20 to 275 ms, by chance.
fn random_pause() -> u64 {
    let id = random_id();
    20 + u64::from_str_radix(&id[..2], 16).unwrap()
}
