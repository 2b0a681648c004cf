//! What clients of the built program see over HTTP.

use serde_json::json;
use tests::{Cellar, Engine};

use crate::load::{Times, clients, request};
use crate::{floors, place, table};

/// How many readings a batch has that proposals are made on.
const READINGS: usize = 20;

/// Measures and prints.
pub(crate) fn print(engine: Engine) {
    println!("{engine:?}: over HTTP");
    let home = place::home(engine);
    let mut cellar = Cellar::founded(&home, None);
    let floor = floors::measure(&home);
    let batches = fed_batches(&mut cellar);
    reads(&cellar, &batches[0]);
    for (how_many, spread) in [(1, 8), (32, 8), (32, 1), (128, 8)] {
        let times = readings(&cellar, how_many, spread);
        let of_floor = times.rate() / floor.rate();
        let what = format!("  POST readings, {how_many} clients, {spread} batches");
        table::line(&what, &format!("{times}   {of_floor:.2} of the bare loop"));
    }
    for how_many in [1, 32] {
        let times = proposals(&cellar, how_many, &batches);
        table::line(
            &format!("  POST proposals, {how_many} clients, 8 batches"),
            &times.to_string(),
        );
    }
    let entries = cellar.deep_check();
    table::line("  deep check afterwards", &format!("whole, {entries} entries"));
}

fn reads(cellar: &Cellar, batch: &str) {
    let url = cellar.program.url();
    let token = cellar.ana.token().expect("a token");
    let entry = cellar.gravity(batch, "1.0200").text("/id");
    for path in ["/healthz".to_owned(), format!("/v1/entries/{entry}")] {
        for how_many in [1, 32] {
            let get = request("GET", &path, token, "");
            let times = clients(url, how_many, 200, |_, _| get.clone());
            let shown = path.split('/').take(3).collect::<Vec<_>>().join("/");
            table::line(&format!("  GET {shown}, {how_many} connections"), &times.to_string());
        }
    }
}

fn readings(cellar: &Cellar, how_many: usize, spread: usize) -> Times {
    let batches = place::batches(cellar, &format!("EXW-R{how_many}-{spread}"), spread);
    let token = cellar.ana.token().expect("a token");
    clients(cellar.program.url(), how_many, 201, |client, sent| {
        let batch = &batches[(client + sent) % batches.len()];
        let body = cellar.gravity_body("1.0900").to_string();
        request("POST", &format!("/v1/batches/{batch}/readings"), token, &body)
    })
}

/// Batches a few days on: an analysis, falling gravities, three additions.
fn fed_batches(cellar: &mut Cellar) -> Vec<String> {
    cellar.receive("DP-1", "DAP", "25000", "kg");
    cellar.receive("AU-1", "AUT", "25000", "kg");
    cellar.receive("YW-1", "YW", "25000", "kg");
    let batches = (0..8).map(|index| opened(cellar, index)).collect::<Vec<_>>();
    for batch in &batches {
        cellar.nitrogen(batch, "40", "98");
        for line in [("YW-1", "750"), ("AU-1", "900"), ("DP-1", "900")] {
            let lines = [(cellar.id(line.0), line.1, "g")];
            let _ = cellar.add_unasked(batch, &lines).expect(201);
        }
        for step in 1..READINGS {
            cellar.gravity(batch, &format!("1.0{:02}0", 94 - 3 * step));
        }
    }
    batches
}

fn opened(cellar: &Cellar, index: usize) -> String {
    let mut body = cellar.batch(&format!("EXW-P-{index}"), "3000", "L");
    body["expected_final"] = json!({"value": "0.9930", "scale": "sg_20_20", "basis": "invented"});
    cellar.ben.post("/v1/batches", &body).id()
}

fn proposals(cellar: &Cellar, how_many: usize, batches: &[String]) -> Times {
    let token = cellar.ana.token().expect("a token");
    let lot = cellar.id("DP-1");
    clients(cellar.program.url(), how_many, 201, |client, sent| {
        let batch = &batches[(client + sent) % batches.len()];
        let body = cellar.proposal(&[(lot, "150", "g")]).to_string();
        request("POST", &format!("/v1/batches/{batch}/proposals"), token, &body)
    })
}
