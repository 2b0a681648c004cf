//! What cannot be meant, read or allowed: a problem document that says what to do, and nothing written.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::io::{Read as _, Write as _};
use std::net::TcpStream;

use serde_json::{Value, json};
use tests::client::Asking;
use tests::program::Options;
use tests::{Answer, Cellar, Client, Engine, Program, cellar, on_both_engines, random_id};

/// One bad request and what its answer must point at.
struct Bad {
    path: String,
    body: Value,
    pointer: &'static str,
}

fn readings(batch: &str) -> String {
    format!("/v1/batches/{batch}/readings")
}

/// The answer points at this place of the body and says something about it.
fn points_at(answer: &Answer, pointer: &str) {
    let document = answer.json();
    let errors = document["errors"].as_array().unwrap_or_else(|| panic!("no places: {answer:?}"));
    let place = errors.iter().find(|error| error["pointer"] == pointer);
    let place = place.unwrap_or_else(|| panic!("{pointer} is not pointed at: {answer:?}"));
    assert!(place["detail"].as_str().unwrap().len() > 5, "{place}");
}

fn post<'a>(client: &'a Client, path: &str) -> Asking<'a> {
    client.request("POST", path).key(&random_id())
}

on_both_engines! {
    fn amounts_gravities_and_times_that_cannot_be_meant_are_422_at_their_place(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let mut bad = Vec::new();
        for (value, unit, at) in [
            ("1", "stone", "/amount"),
            ("1", "KG", "/amount"),
            ("-1", "kg", "/amount"),
            ("1e3", "kg", "/amount"),
            ("1,5", "kg", "/amount"),
            ("", "kg", "/amount"),
            ("NaN", "kg", "/amount"),
            ("1000001", "t", "/amount"),
            ("99999999999999999999999999999999999999", "kg", "/amount"),
        ] {
            let body = cellar.lot("NEW", "DAP", value, unit);
            bad.push(Bad { path: "/v1/lots".to_owned(), body, pointer: at });
        }
        for sg in ["0.6999", "1.6001", "-1.0", "0", "10940"] {
            let body = cellar.gravity_body(sg);
            bad.push(Bad { path: readings(&batch), body, pointer: "/values/0/value" });
        }
        let mut ahead = cellar.gravity_body("1.0940");
        ahead["taken_at"] = json!("2025-09-08T08:05:00.000001-07:00");
        bad.push(Bad { path: readings(&batch), body: ahead, pointer: "/taken_at" });
        let mut no_offset = cellar.gravity_body("1.0940");
        no_offset["taken_at"] = json!("2025-09-08T08:00:00");
        bad.push(Bad { path: readings(&batch), body: no_offset, pointer: "/taken_at" });
        let mut done = cellar.already_done(&[(&lot, "0", "g")]);
        done["done_at"] = json!("2031-09-08T08:00:00-07:00");
        let path = format!("/v1/batches/{batch}/additions");
        bad.push(Bad { path, body: done, pointer: "/done_at" });
        for Bad { path, body, pointer } in bad {
            let answer = cellar.ana.post(&path, &body);
            points_at(&answer.expect_problem(422, "meaningless"), pointer);
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn the_edges_that_can_be_meant_are_recorded(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let mut reading = cellar.gravity_body("1.5000");
        reading["taken_at"] = json!("2025-09-08T08:05:00-07:00");
        cellar.ana.post(&readings(&batch), &reading).expect(201);
        assert_eq!(cellar.deep_check(), before + 1);
    }

    fn every_wrong_place_is_named_in_one_answer(engine) {
        let cellar = Cellar::simulated(engine);
        let before = cellar.size();
        let mut body = cellar.lot("NEW", "DAP", "1", "stone");
        body["received_at"] = json!("yesterday");
        body["status"] = json!("perhaps");
        let answer = cellar.ana.post("/v1/lots", &body).expect_problem(422, "meaningless");
        for pointer in ["/amount", "/received_at", "/status"] {
            points_at(&answer, pointer);
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn what_cannot_be_read_is_400_at_its_place(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let whole = cellar.gravity_body("1.0940");
        let text = whole.to_string();
        let mut unknown = whole.clone();
        unknown["values"][0]["hydrometer"] = json!("old");
        let mut number = whole.clone();
        number["values"][0]["value"] = json!(1.094);
        let twice = text.replacen('{', "{\"note\":\"a\",\"note\":\"b\",", 1);
        for (body, pointer) in [
            (unknown.to_string(), "/values/0"),
            (number.to_string(), "/values/0/value"),
            (twice, "/note"),
            (text[..text.len() - 1].to_owned(), ""),
            (format!("{text} {text}"), ""),
            ("{}".to_owned(), ""),
            (String::new(), ""),
            ("null".to_owned(), ""),
        ] {
            let asking = post(&cellar.ana, &readings(&batch));
            let answer = asking.raw("application/json", body.clone().into_bytes()).send();
            let answer = answer.expect_problem(400, "not-readable");
            let places = answer.json()["errors"].clone();
            let found = places[0]["pointer"].as_str().unwrap().to_owned();
            assert!(found.starts_with(pointer), "{body}: {places}");
        }
        let not_text = post(&cellar.ana, &readings(&batch)).raw("application/json", vec![0xff, 0xfe]);
        not_text.send().expect_problem(400, "not-readable");
        assert_eq!(cellar.deep_check(), before);
    }

    fn text_is_normalised_before_it_is_recorded_compared_or_refused(engine) {
        let cellar = Cellar::simulated(engine);
        let mut person = json!({"login": "jose\u{301}", "name": "Jose\u{301} Example",
            "password": "a ledger reads itself aloud", "roles": ["auditor"]});
        let key = random_id();
        let first = cellar.dov.post_as(&key, "/v1/people", &person).expect(201);
        person["login"] = json!("jos\u{e9}");
        person["name"] = json!("Jos\u{e9} Example");
        let again = cellar.dov.post_as(&key, "/v1/people", &person).expect(201);
        assert_eq!(again.json(), first.json());
        for login in ["jose\u{301}", "jos\u{e9}"] {
            let _ = cellar.nobody().signed_in("EXW", login, "a ledger reads itself aloud");
        }
        let batch = cellar.open("B1", "3000", "L");
        let mut reading = cellar.gravity_body("1.0940");
        reading["note"] = json!("foam\r\nand\rmore foam");
        let recorded = cellar.ana.post(&readings(&batch), &reading).expect(201);
        assert_eq!(recorded.text("/entries/0/body/note"), "foam\nand\nmore foam");

        let before = cellar.size();
        for note in ["a\tb", "a\u{7f}b", "a\u{85}b", "\u{1b}[2J"] {
            reading["note"] = json!(note);
            let refused = cellar.ana.post(&readings(&batch), &reading);
            points_at(&refused.expect_problem(400, "not-readable"), "/note");
        }
        reading["note"] = json!("\u{fc}".repeat(2_001));
        let refused = cellar.ana.post(&readings(&batch), &reading);
        points_at(&refused.expect_problem(422, "meaningless"), "/note");
        assert_eq!(cellar.deep_check(), before);
    }

    fn codes_names_and_words_have_their_lengths_and_lists_theirs(engine) {
        let mut cellar = Cellar::simulated(engine);
        let lot = cellar.receive("DP-0412", "DAP", "25", "kg");
        let batch = cellar.open("B1", "3000", "L");
        let done = cellar.add_unasked(&batch, &[(&lot, "12", "kg")]).expect(201);
        let (entry, deviation) = (done.text("/id"), done.text("/deviation"));
        let set = cellar.caro.get("/v1/rule-sets").expect(200).items()[0].clone();
        let before = cellar.size();
        let secret = cellar::PEOPLE[1].2;
        let material = json!({"code": "M", "name": "m", "category": "other", "dimension": "mass"});
        let reading = cellar.gravity_body("1.0940");
        let opening = cellar.batch("B2", "1000", "L");
        let receipt = cellar.lot("NEW", "DAP", "1", "kg");
        let amended = json!({"reason": "typed wrongly", "lot": receipt});
        let party = json!({"code": "P", "name": "p"});
        let many = |most: usize| Value::from(vec!["x"; most + 1]);
        let (code, name) = (json!("c".repeat(41)), json!("n".repeat(201)));
        let part = json!({"substance": "x", "fraction": {"value": "0.1", "unit": "mg/kg"}});
        for (who, path, body, pointer, bad) in [
            (&cellar.ana, "/v1/lots", &receipt, "/code", code.clone()),
            (&cellar.ana, "/v1/lots", &receipt, "/code", json!("a/b")),
            (&cellar.ana, "/v1/lots", &receipt, "/code", json!(" ")),
            (&cellar.ana, "/v1/lots", &receipt, "/supplier_lot", name.clone()),
            (&cellar.ana, "/v1/lots", &receipt, "/document", json!("")),
            (&cellar.ana, "/v1/lots", &receipt, "/composition", Value::from(vec![part; 101])),
            (&cellar.ben, "/v1/materials", &material, "/name", json!("two\nlines")),
            (&cellar.ben, "/v1/materials", &material, "/listed_as", many(50)),
            (&cellar.ben, "/v1/materials", &material, "/listed_as/0", json!([""])),
            (&cellar.ben, "/v1/parties", &party, "/licence", name.clone()),
            (&cellar.ben, "/v1/parties", &party, "/address", json!(" \n ")),
            (&cellar.ben, "/v1/batches", &opening, "/code", json!("B2 ")),
            (&cellar.ben, "/v1/batches", &opening, "/claims", many(50)),
            (&cellar.ben, "/v1/batches", &opening, "/destinations/0", json!([code.clone()])),
            (&cellar.ben, "/v1/batches", &opening, "/volume_basis", json!("")),
            (&cellar.ana, &*readings(&batch), &reading, "/laboratory", name.clone()),
            (&cellar.ana, &*readings(&batch), &reading, "/note", json!("")),
            (&cellar.caro, "/v1/deviations", &json!({"code": "D", "title": "t",
                "opened_at": cellar.now()}), "/title", name.clone()),
            (&cellar.caro, &*format!("/v1/deviations/{deviation}/resolution"), &json!({"cause": "c",
                "action": "a", "conclusion": "c", "secret": secret}), "/conclusion", json!("")),
            (&cellar.ana, &*format!("/v1/batches/{batch}/additions"),
                &cellar.already_done(&[(&lot, "1", "g")]), "/reason", json!(" ")),
            (&cellar.ana, &*format!("/v1/batches/{batch}/proposals"),
                &cellar.proposal(&[(&lot, "1", "g")]), "/purpose", json!("")),
            (&cellar.ana, &*format!("/v1/entries/{entry}/amendments"), &amended, "/reason", json!("")),
            (&cellar.ana, &*format!("/v1/entries/{entry}/amendments"), &amended, "/lot/code", code),
            (&cellar.ana, &*format!("/v1/entries/{entry}/amendments"),
                &json!({"reason": "typed wrongly", "batch": opening}), "/batch/claims", many(50)),
            (&cellar.caro, &*format!("/v1/batches/{batch}/record"), &json!({"to": "x"}), "/to", name),
            (&cellar.caro, &*format!("/v1/rule-sets/{}/adoptions", set["id"].as_str().unwrap()),
                &json!({"standing": "market", "market": "EU", "digest": set["digest"],
                "from": cellar.now()}), "/market", json!("E/U")),
            (&cellar.dov, "/v1/people", &json!({"login": "edi", "name": "Edi",
                "password": "a ledger reads itself aloud", "roles": []}), "/roles", many(50)),
        ] {
            let mut body = body.clone();
            let (member, bad) = match pointer.strip_suffix("/0") {
                Some(list) => (list, bad),
                None => (pointer, bad),
            };
            let (within, name) = member.rsplit_once('/').unwrap();
            body.pointer_mut(within).unwrap()[name] = bad;
            let answer = who.post(path, &body);
            points_at(&answer.expect_problem(422, "meaningless"), pointer);
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn a_missing_or_malformed_idempotency_key_is_400(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let asking = || cellar.ana.request("POST", &readings(&batch)).json(&cellar.gravity_body("1.0940"));
        let missing = asking().send().expect_problem(400, "idempotency-key-missing");
        assert!(missing.text("/detail").contains("UUID"), "{missing:?}");
        for malformed in ["1", "order-17", "00000000-0000-0000-0000-000000000000"] {
            asking().key(malformed).send().expect_problem(400, "idempotency-key-malformed");
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn another_content_type_than_json_is_415(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let body = cellar.gravity_body("1.0940").to_string().into_bytes();
        for other in ["text/plain", "application/x-www-form-urlencoded", "application/json; charset=latin1"] {
            let asking = post(&cellar.ana, &readings(&batch)).raw(other, body.clone());
            asking.send().expect_problem(415, "not-json");
        }
        let packed = post(&cellar.ana, &readings(&batch)).header("content-encoding", "gzip");
        packed.raw("application/json", body).send().expect_problem(415, "not-json");
        assert_eq!(cellar.deep_check(), before);
    }

    fn two_megabytes_are_413_announced_or_not(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let large = json!({"note": "x".repeat(2 << 20)}).to_string();
        let announced = post(&cellar.ana, &readings(&batch))
            .header("expect", "100-continue")
            .raw("application/json", large.clone().into_bytes());
        announced.send().expect_problem(413, "too-large");
        let status = send_in_pieces(&cellar, &readings(&batch), large.as_bytes());
        assert_eq!(status, "HTTP/1.1 413 Payload Too Large");
        assert_eq!(cellar.deep_check(), before);
    }

    fn nobody_and_garbage_tokens_are_401_with_a_challenge(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "3000", "L");
        let before = cellar.size();
        let body = cellar.gravity_body("1.0940");
        let token = cellar.ana.token().unwrap().to_owned();
        let (head_and_claims, _) = token.rsplit_once('.').unwrap();
        let with = |token: Option<String>| cellar.nobody().with_token(token).post(&readings(&batch), &body);
        let nobody = with(None).expect_problem(401, "sign-in");
        assert_eq!(nobody.header("www-authenticate"), Some("Bearer realm=\"tallystave\""));
        let other_signature = cellar.ben.token().unwrap().rsplit_once('.').unwrap().1;
        for garbage in [
            "garbage".to_owned(),
            format!("{head_and_claims}."),
            format!("{head_and_claims}.{other_signature}"),
            // The header {"alg":"none","typ":"JWT"}, which asks to be believed unsigned (RFC 8725, section 2.1).
            format!("eyJhbGciOiJub25lIiwidHlwIjoiSldUIn0.{}.", token.split('.').nth(1).unwrap()),
            format!("{token}x"),
        ] {
            let refused = with(Some(garbage)).expect_problem(401, "token-refused");
            assert!(refused.header("www-authenticate").unwrap().contains("invalid_token"));
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn a_role_that_may_not_is_403(engine) {
        let cellar = Cellar::simulated(engine);
        let before = cellar.size();
        let batch = cellar.batch("B1", "3000", "L");
        for person in [&cellar.ana, &cellar.caro, &cellar.dov] {
            person.post("/v1/batches", &batch).expect_problem(403, "forbidden");
        }
        assert_eq!(cellar.deep_check(), before);
    }

    fn an_unknown_address_is_404_and_a_wrong_method_405_with_the_allowed_ones(engine) {
        let cellar = Cellar::simulated(engine);
        cellar.ana.get("/v1/nowhere").expect_problem(404, "not-found");
        cellar.ana.get("/v1/batches/").expect_problem(404, "not-found");
        cellar.ana.get(&format!("/v1/batches/{}", random_id())).expect_problem(404, "not-found");
        for (method, path, allowed) in [
            ("DELETE", "/v1/batches".to_owned(), ["GET", "POST"].as_slice()),
            ("PUT", "/v1/lots".to_owned(), &["GET", "POST"]),
            ("POST", "/healthz".to_owned(), &["GET"]),
            ("PATCH", format!("/v1/vessels/{}", random_id()), &["GET", "PUT"]),
        ] {
            let asking = cellar.dov.request(method, &path).json(&json!({}));
            let answer = asking.send().expect_problem(405, "method-not-allowed");
            let header = answer.header("allow").expect("Allow").to_owned();
            for method in allowed {
                assert!(header.split(',').any(|one| one.trim() == *method), "{header}");
            }
        }
        cellar.deep_check();
    }

    fn an_id_that_is_none_is_refused_as_a_problem(engine) {
        let cellar = Cellar::simulated(engine);
        for path in ["/v1/batches/one", "/v1/lots/1", "/v1/entries/%00", "/v1/materials/../people"] {
            let answer = cellar.ana.get(path);
            assert!(answer.status == 400 || answer.status == 404, "{answer:?}");
            assert_eq!(answer.header("content-type"), Some("application/problem+json"), "{answer:?}");
        }
        for query in ["limit=0", "limit=70000", "limit=x", "colour=red"] {
            let answer = cellar.ana.get(&format!("/v1/lots?{query}"));
            if answer.status != 200 {
                answer.expect_problem(400, "not-readable");
            }
        }
        cellar.deep_check();
    }

    fn what_belongs_to_another_site_is_404_like_what_does_not_exist(engine) {
        let mut here = Cellar::simulated(engine);
        let lot = here.receive("DP-0412", "DAP", "25", "kg");
        let batch = here.open("B1", "3000", "L");
        let done = here.add_unasked(&batch, &[(&lot, "12", "kg")]).expect(201);
        let (entry, deviation) = (done.text("/id"), done.text("/deviation"));
        let there = second_site(&here);
        let before = here.size();
        let other = random_id();
        let material = here.id("DAP").to_owned();
        let vessel = here.id("T-12").to_owned();
        let supplier = here.id("ENS").to_owned();
        for (path, id) in [
            ("/v1/batches/{id}", &batch),
            ("/v1/batches/{id}/readings", &batch),
            ("/v1/batches/{id}/proposals", &batch),
            ("/v1/batches/{id}/additions", &batch),
            ("/v1/batches/{id}/entries", &batch),
            ("/v1/batches/{id}/account", &batch),
            ("/v1/lots/{id}", &lot),
            ("/v1/entries/{id}", &entry),
            ("/v1/deviations/{id}", &deviation),
            ("/v1/materials/{id}", &material),
            ("/v1/vessels/{id}", &vessel),
            ("/v1/parties/{id}", &supplier),
            ("/v1/sites/{id}/ledger/head", &here.site),
            ("/v1/sites/{id}/ledger/entries", &here.site),
            ("/v1/sites/{id}/ledger/inclusion?index=0&size=1", &here.site),
            ("/v1/sites/{id}/ledger/consistency?old=1&new=2", &here.site),
        ] {
            here.dov.get(&path.replace("{id}", id)).expect(200);
            let theirs = there.get(&path.replace("{id}", id)).expect_problem(404, "not-found");
            let none = there.get(&path.replace("{id}", &other)).expect_problem(404, "not-found");
            assert_eq!(theirs.text("/detail"), none.text("/detail"), "no difference to see");
        }
        for (method, path, body) in [
            ("POST", format!("/v1/batches/{batch}/readings"), here.gravity_body("1.0940")),
            ("POST", format!("/v1/batches/{batch}/additions"), here.already_done(&[(&lot, "1", "g")])),
            ("POST", format!("/v1/batches/{batch}/proposals"), here.proposal(&[(&lot, "1", "g")])),
            ("POST", format!("/v1/batches/{batch}/assessments"), here.proposal(&[(&lot, "1", "g")])),
            ("POST", format!("/v1/lots/{lot}/status"), json!({"status": "held", "reason": "mine"})),
            ("POST", format!("/v1/entries/{entry}/amendments"), json!({"reason": "mine", "void": true})),
            ("POST", "/v1/lots".to_owned(), here.lot("NEW", "DAP", "1", "kg")),
            ("PUT", format!("/v1/people/{}/roles/admin", here.people[0]), json!({})),
            ("DELETE", format!("/v1/people/{}/roles/cellar", here.people[0]), json!({})),
        ] {
            let asking = there.request(method, &path).key(&random_id()).header("if-match", "*");
            let answer = if method == "POST" { asking.json(&body).send() } else { asking.send() };
            answer.expect_problem(404, "not-found");
        }
        assert_eq!(here.deep_check(), before);
        here.ana.get("/v1/me").expect(200);
    }

    fn a_founding_link_works_once_and_a_wrong_token_never(engine) {
        let here = Cellar::simulated(engine);
        let refused = cellar::found(&here.nobody(), "guessed", "EXY", true);
        refused.expect_problem(403, "forbidden");
        let token = founding_token(&here.program);
        cellar::found(&here.nobody(), &token, "EXY", true).expect(201);
        cellar::found(&here.nobody(), &token, "EXZ", true).expect_problem(403, "forbidden");
        here.deep_check();
    }

    fn a_real_book_does_not_open_on_a_driven_clock(engine) {
        let mut here = Cellar::real(engine);
        let home = here.program.home().clone();
        assert!(here.program.terminate().success());
        let simulated = Options { simulated_from: Some(cellar::START.to_owned()), ..Options::default() };
        let started = std::panic::catch_unwind(|| Program::start(&home, simulated));
        let said = *started.expect_err("it must not start").downcast::<String>().unwrap();
        assert!(said.contains("is a real book"), "{said}");
        cellar::deep_check(&home);
    }
}

fn founding_token(program: &Program) -> String {
    let said = program.home().run(&["founding-link"]).expect_success().printed;
    said.trim().split_once("/v1/founding#").expect("a link").1.to_owned()
}

/// A second site in the same book, with somebody who may do everything there.
fn second_site(here: &Cellar) -> Client {
    let token = founding_token(&here.program);
    let nobody = here.nobody();
    let founded = cellar::found(&nobody, &token, "EXY", true).expect(201);
    let (login, _, password, _) = cellar::PEOPLE[3];
    let there = nobody.signed_in("EXY", login, password);
    for role in ["cellar", "lead", "quality"] {
        let path = format!("/v1/people/{}/roles/{role}", founded.text("/admin"));
        there.request("PUT", &path).key(&random_id()).send().expect(200);
    }
    there
}

/// Sends a body in chunks without saying how long it will be, and gives the first line of the answer.
fn send_in_pieces(cellar: &Cellar, path: &str, body: &[u8]) -> String {
    let address = cellar.program.url().strip_prefix("http://").unwrap();
    let mut stream = TcpStream::connect(address).unwrap();
    let token = cellar.ana.token().unwrap();
    let key = random_id();
    write!(
        stream,
        "POST {path} HTTP/1.1\r\nhost: {address}\r\nauthorization: Bearer {token}\r\n\
         idempotency-key: {key}\r\ncontent-type: application/json\r\ntransfer-encoding: chunked\r\n\r\n"
    )
    .unwrap();
    for piece in body.chunks(64 << 10) {
        let sent = write!(stream, "{:x}\r\n", piece.len())
            .and_then(|()| stream.write_all(piece))
            .and_then(|()| stream.write_all(b"\r\n"));
        if sent.is_err() {
            break; // the program has seen enough and answered
        }
    }
    let _ = stream.write_all(b"0\r\n\r\n");
    let mut answer = vec![0; 4096];
    let read = stream.read(&mut answer).unwrap();
    let text = String::from_utf8_lossy(&answer[..read]).into_owned();
    text.lines().next().unwrap_or_default().to_owned()
}

/// The body of a request that is refused for what its head says may come later than the head, and the connection goes
/// on.
#[test]
fn a_refused_request_whose_body_comes_late_keeps_its_connection() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let batch = cellar.open("B1", "3000", "L");
    let (path, address) = (readings(&batch), cellar.program.url().strip_prefix("http://").unwrap());
    let body = cellar.gravity_body("1.0940").to_string();
    let mut stream = TcpStream::connect(address).unwrap();
    for round in 0..2 {
        let token = cellar.ana.token().unwrap();
        write!(
            stream,
            "POST {path} HTTP/1.1\r\nhost: {address}\r\nauthorization: Bearer {token}\r\n\
             content-type: application/json\r\ncontent-length: {}\r\n\r\n",
            body.len()
        )
        .unwrap();
        std::thread::sleep(std::time::Duration::from_millis(200));
        stream.write_all(body.as_bytes()).unwrap();
        let mut answer = vec![0; 4096];
        let read = stream.read(&mut answer).unwrap();
        let text = String::from_utf8_lossy(&answer[..read]);
        assert!(text.starts_with("HTTP/1.1 400"), "request {round}: {text}");
        assert!(text.contains("idempotency-key-missing"), "request {round}: {text}");
    }
}
