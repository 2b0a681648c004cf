//! What the program says while it works: requests where it serves them, and of secrets nothing.

use tests::{Cellar, Engine, cellar};

#[test]
fn serving_logs_each_request_by_its_route_and_no_secret_while_other_commands_are_quiet() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let batch = cellar.open("B1", "3000", "L");
    let _ = cellar.ana.get(&format!("/v1/batches/{batch}")).expect(200);
    cellar.ana.get("/v1/nowhere").expect_problem(404, "not-found");
    let said = cellar.program.complaints();
    for logged in ["path=\"/v1/batches/{id}\"", "status=200", "status=404", "answered"] {
        assert!(plain(&said).contains(logged), "{logged}: {said}");
    }
    let (_, _, password, _) = cellar::PEOPLE[0];
    for secret in [password, cellar.ana.token().unwrap()] {
        assert!(!said.contains(secret), "{said}");
    }
    let verified = cellar.program.home().run(&["verify"]).expect_success();
    assert_eq!(verified.complaints, "");
}

/// The text without the colours of a terminal.
fn plain(said: &str) -> String {
    let mut pieces = said.split('\u{1b}');
    let first = pieces.next().unwrap_or_default().to_owned();
    pieces.fold(first, |text, piece| text + piece.split_once('m').map_or("", |(_, rest)| rest))
}
