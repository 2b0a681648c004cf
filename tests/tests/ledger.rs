//! The log as anybody may check it: with a checker that shares no code with ours, and against altered copies.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::io::Write as _;
use std::process::Stdio;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use domain::ledger::note::{Checkpoint, VerifierKey};
use domain::ledger::tree::{Hash, verify_consistency};
use serde_json::{Value, json};
use tests::{Answer, Cellar, Engine, on_both_engines};

/// Runs the independent checker on an export and gives whether it agrees, and what it says.
fn check(export: &Value) -> (bool, String) {
    let script = concat!(env!("CARGO_MANIFEST_DIR"), "/independent/check_ledger.py");
    let mut python = tests::program::python();
    python.arg(script).stdin(Stdio::piped()).stdout(Stdio::piped()).stderr(Stdio::piped());
    let mut child = python.spawn().expect("Python");
    child.stdin.take().unwrap().write_all(export.to_string().as_bytes()).unwrap();
    let output = child.wait_with_output().unwrap();
    let said = String::from_utf8_lossy(&output.stdout).into_owned();
    let complaints = String::from_utf8_lossy(&output.stderr);
    assert!(complaints.is_empty(), "PyPI cryptography and rfc8785 must be installed: {complaints}");
    (output.status.success(), said)
}

fn ledger(cellar: &Cellar, what: &str) -> Answer {
    cellar.caro.get(&format!("/v1/sites/{}/ledger/{what}", cellar.site))
}

/// All entries, in pages of seven, as canonical bytes in base64.
fn entries(cellar: &Cellar, size: u64) -> Vec<String> {
    let mut entries = Vec::new();
    while (entries.len() as u64) < size {
        let page =
            ledger(cellar, &format!("entries?from={}&limit=7", entries.len())).expect(200).json();
        let page = page["entries"].as_array().unwrap().clone();
        assert!(!page.is_empty() && page.len() <= 7);
        for entry in page {
            assert_eq!(entry["seq"].as_u64().unwrap(), entries.len() as u64);
            entries.push(entry["bytes"].as_str().unwrap().to_owned());
        }
    }
    entries.truncate(usize::try_from(size).unwrap());
    entries
}

/// Everything a stranger needs, fetched over REST.
fn export(cellar: &Cellar) -> Value {
    let head = cellar.head();
    let size = head.number("/size");
    let proof = |index: u64, of: u64| {
        let answer = ledger(cellar, &format!("inclusion?index={index}&size={of}")).expect(200);
        json!({"index": index, "size": of, "hashes": answer.json()["hashes"]})
    };
    let mut proofs: Vec<Value> = (0..size).map(|index| proof(index, size)).collect();
    proofs.extend((1..size).map(|of| proof(of - 1, of)));
    json!({"vkey": head.text("/key"), "checkpoint": head.text("/note"),
        "entries": entries(cellar, size), "proofs": proofs})
}

/// A cellar in which something of most kinds has happened.
fn lived_in(engine: Engine) -> Cellar {
    let mut cellar = Cellar::simulated(engine);
    let lot = cellar.receive("DP-0412", "DAP", "10", "kg");
    let batch = cellar.open("B1", "3000", "L");
    let reading = cellar.gravity(&batch, "1.0940");
    cellar.nitrogen(&batch, "40.4", "98");
    cellar.propose(&batch, &[(&lot, "3", "kg")]).expect(201);
    cellar.add_unasked(&batch, &[(&lot, "12", "kg")]).expect(201);
    let path = format!("/v1/entries/{}/amendments", reading.text("/id"));
    let amendment =
        json!({"reason": "slip shows 1.0950 – Süßmost", "reading": cellar.gravity_body("1.0950")});
    cellar.ana.post(&path, &amendment).expect(201);
    cellar
}

fn changed(export: &Value, change: impl Fn(&mut Value)) -> Value {
    let mut copy = export.clone();
    change(&mut copy);
    copy
}

on_both_engines! {
    fn an_independent_checker_agrees_with_the_whole_log_and_refuses_every_altered_copy(engine) {
        let cellar = lived_in(engine);
        let export = export(&cellar);
        let count = export["entries"].as_array().unwrap().len();
        assert_eq!(check(&export), (true, format!("ok {count} entries\n")));

        let reworded = |text: &Value, from: &str, to: &str| {
            let bytes = STANDARD.decode(text.as_str().unwrap()).unwrap();
            let old = String::from_utf8(bytes).unwrap();
            let new = old.replacen(from, to, 1);
            assert_ne!(new, old);
            json!(STANDARD.encode(new))
        };
        let last = count - 1;
        let stranger = VerifierKey::new("exw.example/book", stranger_key()).unwrap().to_string();
        let altered: Vec<(&str, Value)> = vec![
            ("one word changed", changed(&export, |copy| {
                copy["entries"][0] = reworded(&export["entries"][0], "Example Works", "Example Wirks");
            })),
            ("one blank more", changed(&export, |copy| {
                copy["entries"][3] = reworded(&export["entries"][3], ":", ": ");
            })),
            ("two entries changed places", changed(&export, |copy| {
                copy["entries"].as_array_mut().unwrap().swap(4, 5);
            })),
            ("the last entry cut off", changed(&export, |copy| {
                copy["entries"].as_array_mut().unwrap().pop();
            })),
            ("an entry left out", changed(&export, |copy| {
                copy["entries"].as_array_mut().unwrap().remove(6);
            })),
            ("an entry twice", changed(&export, |copy| {
                let again = export["entries"][last].clone();
                copy["entries"].as_array_mut().unwrap().push(again);
            })),
            ("another size signed", changed(&export, |copy| {
                let note = export["checkpoint"].as_str().unwrap();
                copy["checkpoint"] = json!(note.replacen(&format!("\n{count}\n"), &format!("\n{last}\n"), 1));
                copy["entries"].as_array_mut().unwrap().pop();
            })),
            ("another key", changed(&export, |copy| copy["vkey"] = json!(stranger))),
            ("a hash of a proof changed", changed(&export, |copy| {
                copy["proofs"][2]["hashes"][0] = json!("00".repeat(32));
            })),
            ("a proof of another entry", changed(&export, |copy| copy["proofs"][2]["index"] = json!(3))),
            ("a proof cut short", changed(&export, |copy| {
                copy["proofs"][2]["hashes"].as_array_mut().unwrap().pop();
            })),
        ];
        for (what, copy) in altered {
            let (agrees, said) = check(&copy);
            assert!(!agrees && said.starts_with("failed: "), "{what}: {said}");
        }
        cellar.deep_check();
    }

    fn a_newer_head_is_proved_to_continue_every_older_one(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let key: VerifierKey = cellar.head().text("/key").parse().unwrap();
        let signed = || Checkpoint::verify(&cellar.head().text("/note"), &key).unwrap().head();
        let mut heads = vec![signed()];
        for _ in 0..12 {
            cellar.gravity(&batch, "1.0940");
            heads.push(signed());
        }
        let proof = |old: u64, new: u64| -> Vec<Hash> {
            let answer = ledger(&cellar, &format!("consistency?old={old}&new={new}")).expect(200).json();
            answer["hashes"].as_array().unwrap().iter().map(|h| h.as_str().unwrap().parse().unwrap()).collect()
        };
        for old in &heads {
            for new in heads.iter().filter(|new| new.size >= old.size) {
                let hashes = proof(old.size, new.size);
                verify_consistency(old, new, &hashes).unwrap();
                if new.size > old.size {
                    let mut forked = *old;
                    forked.root = new.root;
                    assert!(verify_consistency(&forked, new, &hashes).is_err());
                }
            }
        }
        cellar.deep_check();
    }

    fn proofs_of_what_is_not_there_are_422(engine) {
        let cellar = Cellar::simulated(engine);
        let size = cellar.size();
        for question in [
            format!("inclusion?index={size}&size={size}"),
            format!("inclusion?index=0&size={}", size + 1),
            "inclusion?index=0&size=0".to_owned(),
            format!("consistency?old=1&new={}", size + 1),
            "consistency?old=0&new=1".to_owned(),
            "consistency?old=2&new=1".to_owned(),
        ] {
            ledger(&cellar, &question).expect_problem(422, "meaningless");
        }
        for question in ["inclusion?index=-1&size=1", "inclusion?index=0", "consistency?old=a&new=b",
            "inclusion?index=18446744073709551616&size=1"] {
            ledger(&cellar, question).expect_problem(400, "not-readable");
        }
        let huge = ledger(&cellar, "inclusion?index=0&size=18446744073709551615");
        huge.expect_problem(422, "meaningless");
        cellar.deep_check();
    }

    fn the_log_of_a_killed_program_goes_on_where_it_was(engine) {
        let mut cellar = lived_in(engine);
        let before = export(&cellar);
        cellar.kill_and_restart();
        assert_eq!(export(&cellar), before);
        cellar.ben.get("/readyz").expect(200);
        assert!(cellar.program.terminate().success(), "a program that is asked to end ends well");
        tests::cellar::deep_check(cellar.program.home());
    }
}

/// The public key of RFC 8032, section 7.1, test 1: nobody's here.
fn stranger_key() -> ed25519_dalek::VerifyingKey {
    let hex = "d75a980182b10ab7d54bfed3c964073a0ee172f3daa62325af021a68f707511a";
    let bytes: Hash = hex.parse().unwrap();
    ed25519_dalek::VerifyingKey::from_bytes(&bytes.0).unwrap()
}
