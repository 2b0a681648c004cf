//! A clock that was ahead and was set back.

use tests::{Cellar, Client, Engine, Program, on_both_engines};

on_both_engines! {
    fn a_clock_set_back_stops_writing_until_an_operator_says_so_in_the_book(engine) {
        set_back(engine);
    }
}

/// Method: a simulation is driven far ahead of the machine's clock, then served on the machine's clock.
fn set_back(engine: Engine) {
    let mut cellar = Cellar::simulated(engine);
    let batch = cellar.open("EXW-25-K1", "3000", "L");
    cellar.drive_to("2098-01-01T00:00:00Z");
    let _ = cellar.gravity(&batch, "1.0900");
    let _ = cellar.program.terminate();
    let home = cellar.program.home().clone();
    let program = Program::start(&home, tests::program::Options::default());
    let ana = cellar.ana.at(program.url());
    let path = format!("/v1/batches/{batch}/readings");
    let reading = serde_json::json!({"taken_at": "2025-09-09T08:00:00-07:00", "values": [
        {"quantity": "gravity", "value": "1.0850", "unit": "sg_20_20"}]});
    let key = tests::random_id();
    let waiting = ana.post_as(&key, &path, &reading).expect_problem(503, "unavailable");
    assert!(waiting.text("/detail").contains("clock"), "{waiting:?}");
    assert!(waiting.header("retry-after").is_some(), "{waiting:?}");

    let nothing = home.run(&["correct-clock", "--site", "NOBODY", "--reason", "x"]);
    let _ = nothing.expect_code(1);
    let reason = "the battery of the server's clock was changed";
    let said = home.run(&["correct-clock", "--site", "EXW", "--reason", reason]).expect_success();
    assert!(said.printed.contains("it goes on from"), "{}", said.printed);
    let again = home.run(&["correct-clock", "--site", "EXW", "--reason", reason]).expect_code(1);
    assert!(again.complaints.contains("nothing to correct"), "{}", again.complaints);

    let answer = ana.post_as(&key, &path, &reading).expect(201);
    assert!(*answer.text("/entries/0/recorded_at") < *"2098", "{answer:?}");
    tests::cellar::deep_check(&home);
    let _: Client = ana;
}
