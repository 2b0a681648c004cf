//! One link founds one site: whole or not at all, and told the same however often it is asked.

use std::sync::Barrier;
use std::thread;

use serde_json::{Value, json};
use tests::cellar::{found, founding};
use tests::program::Options;
use tests::{Answer, Client, Engine, Home, Program, cellar, on_both_engines, random_id};

/// A program on an empty book, and the token of its link.
fn unfounded(engine: Engine) -> (Program, Client, String) {
    let program = Program::start(&Home::new(engine), Options::default());
    let token = program.founding_token().expect("a founding link").to_owned();
    let nobody = Client::new(program.url());
    (program, nobody, token)
}

fn open(nobody: &Client) -> bool {
    nobody.get("/v1/founding").expect(200).json()["open"] == true
}

/// How many logs `verify` reads.
fn sites(program: &Program) -> usize {
    let verified = program.home().run(&["verify"]).expect_success().printed;
    verified.lines().filter(|line| line.contains(": whole; root ")).count()
}

/// What a founding leaves that broke off after its first step: a registered site with an empty log.
fn break_off(program: &Program, code: &str, origin: &str) {
    let bytes = |hex: &str| match program.home().engine() {
        Engine::Sqlite => format!("x'{hex}'"),
        Engine::Postgres => format!("decode('{hex}', 'hex')"),
    };
    let id = bytes("0198f2a45b1c7d3e8f90a1b2c3d4e5f6");
    // The root of an empty tree is the hash of nothing (RFC 9162, section 2.1.1).
    let root = bytes("e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    let frontier = bytes("");
    program.home().sql(&format!(
        "insert into site (number, id, code, origin) values (1, {id}, '{code}', '{origin}'); \
         insert into log_head (site, size, frontier, root, note, last_recorded_at) \
         values (1, 0, {frontier}, {root}, '', 0);"
    ));
}

on_both_engines! {
    fn two_foundings_at_once_with_one_link_found_one_site(engine) {
        let (program, nobody, token) = unfounded(engine);
        let barrier = Barrier::new(2);
        let ask = |code: &'static str| {
            let (barrier, token, nobody) = (&barrier, &token, nobody.at(program.url()));
            move || {
                barrier.wait();
                found(&nobody, token, code, false)
            }
        };
        let answers: Vec<Answer> = thread::scope(|scope| {
            let asked = [scope.spawn(ask("EXW")), scope.spawn(ask("EXY"))];
            asked.into_iter().map(|thread| thread.join().expect("an answer")).collect()
        });
        let (founded, refused): (Vec<_>, Vec<_>) =
            answers.into_iter().partition(|answer| answer.status == 201);
        assert_eq!((founded.len(), refused.len()), (1, 1), "{founded:?} {refused:?}");
        for answer in refused {
            answer.expect_problem(403, "forbidden");
        }
        assert_eq!(sites(&program), 1);
        assert!(!open(&nobody));
        cellar::deep_check(program.home());
    }

    fn what_is_refused_registers_nothing_and_leaves_the_link_good(engine) {
        let (program, nobody, token) = unfounded(engine);
        let change = |at: &str, to: Value| {
            let mut body = founding(&token, "EXW", false);
            *body.pointer_mut(at).expect("a member") = to;
            body
        };
        for (at, to) in [
            ("/premises", json!([])),
            ("/premises/1/code", json!("BW")),
            ("/origin", json!("with a blank")),
            ("/time_zone", json!("Europe/Atlantis")),
            ("/admin/password", json!("too short")),
        ] {
            let pointer = if at.starts_with("/premises") { "/premises" } else { at };
            let refused = nobody.post("/v1/founding", &change(at, to));
            let refused = refused.expect_problem(422, "meaningless").json();
            assert_eq!(refused["errors"][0]["pointer"], pointer, "{refused}");
        }
        nobody.post("/v1/founding", &founding("guessed", "EXW", false)).expect_problem(403, "forbidden");
        assert_eq!(sites(&program), 0);
        assert!(open(&nobody));
        let _ = found(&nobody, &token, "EXW", false).expect(201);
        assert_eq!(sites(&program), 1);
        cellar::deep_check(program.home());
    }

    fn a_repeat_gives_the_first_answer_and_anything_else_finds_the_link_used_up(engine) {
        let (mut program, nobody, token) = unfounded(engine);
        let (key, body) = (random_id(), founding(&token, "EXW", false));
        let first = nobody.post_as(&key, "/v1/founding", &body).expect(201);
        let people = |client: &Client| client.get("/v1/people").expect(200).items();
        let (login, _, password, _) = cellar::PEOPLE[3];
        let dov = nobody.signed_in("EXW", login, password);
        assert_eq!(people(&dov)[0]["id"], first.json()["admin"]);

        let again = nobody.post_as(&key, "/v1/founding", &body).expect(201);
        assert_eq!(again.json(), first.json());
        program.kill_and_restart();
        assert_eq!(program.founding_token(), None);
        let nobody = nobody.at(program.url());
        let after_kill = nobody.post_as(&key, "/v1/founding", &body).expect(201);
        assert_eq!(after_kill.json(), first.json());

        nobody.post("/v1/founding", &body).expect_problem(403, "forbidden");
        let mut other = body.clone();
        other["admin"]["login"] = json!("eve");
        let other = nobody.post_as(&key, "/v1/founding", &other);
        other.expect_problem(422, "idempotency-key-reused");
        assert_eq!(people(&dov.at(program.url())).len(), 1);
        cellar::deep_check(program.home());
    }

    fn a_founding_that_broke_off_is_taken_up_with_its_code_and_origin_only(engine) {
        let (mut program, nobody, _) = unfounded(engine);
        break_off(&program, "EXW", "exw.example/book");
        program.kill_and_restart();
        let token = program.founding_token().expect("no book yet, so a link").to_owned();
        let nobody = nobody.at(program.url());
        for (code, origin, names) in [
            ("EXW", "other.example/book", "exw.example/book"),
            ("EXY", "exw.example/book", "EXW"),
        ] {
            let mut body = founding(&token, code, false);
            body["origin"] = json!(origin);
            let refused = nobody.post("/v1/founding", &body).expect_problem(409, "conflict");
            assert!(refused.text("/detail").contains(names), "{refused:?}");
        }
        let founded = found(&nobody, &token, "EXW", false).expect(201);
        assert_eq!(founded.text("/site"), "0198f2a4-5b1c-7d3e-8f90-a1b2c3d4e5f6");
        assert_eq!(sites(&program), 1);
        cellar::deep_check(program.home());
    }
}
