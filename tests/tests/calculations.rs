//! Computations offered on their own: the same by REST and on the command line.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use std::io::Write as _;
use std::process::{Command, Stdio};

use serde_json::{Value, json};
use tests::{Cellar, Engine};

/// What `tallystave compute` answers to these lines, and whether it ends well.
fn on_the_command_line(name: &str, lines: &str) -> (bool, Vec<Value>) {
    let mut program = Command::new(tests::program::binary());
    program.args(["compute", name]).stdin(Stdio::piped()).stdout(Stdio::piped());
    let mut child = program.stderr(Stdio::piped()).spawn().unwrap();
    child.stdin.take().unwrap().write_all(lines.as_bytes()).unwrap();
    let output = child.wait_with_output().unwrap();
    let printed = String::from_utf8(output.stdout).unwrap();
    let results = printed.lines().map(|line| serde_json::from_str(line).unwrap()).collect();
    (output.status.success(), results)
}

#[test]
fn rest_and_the_command_line_give_the_same_result() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let asked = json!({"volume_l": 200, "from_abv": 63.5, "to_abv": 40});
    let answer = cellar.ana.post("/v1/calculations/dilution", &asked).expect(200).json();
    assert!((answer["water_l"].as_f64().unwrap() - 120.991).abs() < 0.002, "OIML R 22: {answer}");
    assert!(answer["method"].as_str().unwrap().contains("R 22"));
    let (ended_well, results) = on_the_command_line("dilution", &format!("{asked}\n"));
    assert!(ended_well);
    assert_eq!(results, [answer]);
}

#[test]
fn a_list_is_answered_in_order_with_an_error_in_its_place() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let asked = json!([{"temperature_c": 20}, {"temperature_c": 120}, {"temperature_c": 4}]);
    let answers = cellar.ana.post("/v1/calculations/water_density", &asked).expect(200).json();
    assert_eq!(answers.as_array().unwrap().len(), 3);
    assert_eq!(answers[1]["error"]["field"], "temperature_c");
    assert!(answers[2]["density_kg_m3"].as_f64().unwrap() > 999.9);
    let lines = "{\"temperature_c\":20}\n{\"temperature_c\":120}\n{\"temperature_c\":4}\n";
    let (ended_well, results) = on_the_command_line("water_density", lines);
    assert!(!ended_well, "one line could not be computed");
    assert_eq!(Value::from(results), answers);
}

#[test]
fn what_cannot_be_computed_is_a_problem_that_says_what_to_do() {
    let cellar = Cellar::simulated(Engine::Sqlite);
    let path = "/v1/calculations/water_density";
    let problem = cellar.ana.post(path, &json!({"celsius": 20})).expect(422).json();
    assert_eq!(problem["errors"][0]["pointer"], "/celsius");
    assert!(problem["detail"].as_str().unwrap().contains("temperature_c"));
    let many = Value::from(vec![json!({"temperature_c": 20}); 1_001]);
    let problem = cellar.ana.post(path, &many).expect(422).json();
    assert!(problem["detail"].as_str().unwrap().contains("1000"), "{problem}");
    let unknown = cellar.ana.post("/v1/calculations/moon_phase", &json!({})).expect(404).json();
    assert!(unknown["detail"].as_str().unwrap().contains("/v1/calculations"));
    let listed = cellar.ana.get("/v1/calculations").expect(200).items();
    assert!(listed.iter().any(|one| one["name"] == "water_density" && one["source"] != ""));
    cellar.nobody().get("/v1/calculations").expect(401);
}
