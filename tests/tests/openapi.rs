//! The interface's description, judged by a stranger's validator.
use std::process::Command;

use tests::program::{binary, outcome};
use tests::{Cellar, Engine};

#[test]
fn the_description_is_valid_openapi_and_the_same_served_and_printed() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let served = cellar.nobody().get("/v1/openapi.json").expect(200);
    assert_eq!(served.header("content-type"), Some("application/json"));
    let mut program = Command::new(binary());
    program.arg("openapi");
    let printed = outcome(program).expect_success().printed;
    let printed: serde_json::Value = serde_json::from_str(&printed).unwrap();
    assert_eq!(served.json(), printed);
    assert_eq!(printed["openapi"], "3.1.0");

    let file = tempfile::NamedTempFile::new().unwrap();
    std::fs::write(file.path(), &served.bytes).unwrap();
    let mut validator = tests::program::python();
    validator.args(["-m", "openapi_spec_validator"]).arg(file.path());
    let judged = outcome(validator);
    let said = format!("PyPI openapi-spec-validator must be installed: {judged:?}");
    assert_eq!(judged.code, Some(0), "{said}");
    assert!(judged.printed.contains(": OK"), "{said}");
}

#[test]
fn every_problem_that_an_operation_answers_is_described_as_a_problem_document() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let document = cellar.nobody().get("/v1/openapi.json").expect(200).json();
    for (path, item) in document["paths"].as_object().unwrap() {
        for (method, operation) in item.as_object().unwrap() {
            let responses = operation["responses"].as_object().unwrap();
            for (status, response) in responses.iter().filter(|(s, _)| s.starts_with(['4', '5'])) {
                let problem = &response["content"]["application/problem+json"];
                assert!(problem.is_object(), "{method} {path} {status}");
            }
            let changes = method != "get";
            assert!(
                !changes || responses.keys().any(|status| status.starts_with('4')),
                "{method} {path} says nothing of refusals"
            );
        }
    }
}
