//! The setting: works, people, vessels, materials, lots. All invented.

use serde_json::{Value, json};

use super::stage::{Events, Stage};

/// Founds the book with the one-time token, and enrols the others.
pub(super) fn found(stage: &mut Stage, token: &str) -> anyhow::Result<()> {
    let password = stage.password().to_owned();
    let body = json!({
        "token": token, "code": "EXW", "name": "Example Works (simulation)",
        "origin": "example-works.example/book", "time_zone": "America/Los_Angeles",
        "licence": "EXAMPLE-000", "simulation": true,
        "premises": [
            {"code": "BW", "kind": "bonded_wine_premises", "name": "Bonded wine premises"},
            {"code": "DSP", "kind": "distilled_spirits_plant", "name": "Distilled spirits plant"}],
        "admin": {"login": "dov", "name": "Dov Example", "password": password},
    });
    stage.nobody().post("/v1/founding", &body)?;
    stage.say("the book is founded as a simulation; Dov Example is its administrator");
    for (login, name, role) in [
        ("ana", "Ana Example", "cellar"),
        ("ben", "Ben Example", "lead"),
        ("caro", "Caro Example", "quality"),
    ] {
        let body = json!({"login": login, "name": name, "password": password, "roles": [role]});
        stage.as_("dov")?.post("/v1/people", &body)?;
        stage.say(&format!("{name} is enrolled: {role}"));
    }
    adopt(stage)?;
    describe(stage)
}

/// Adopts two of the shipped rule sets: nothing binds that a person did not adopt.
fn adopt(stage: &Stage) -> anyhow::Result<()> {
    let quality = stage.as_("caro")?;
    let sets = quality.get("/v1/rule-sets")?.body;
    for set in sets["items"].as_array().map(Vec::as_slice).unwrap_or_default() {
        let body = json!({"standing": "production", "digest": set["digest"], "from": super::BEGIN});
        let id = set["id"].as_str().unwrap_or_default();
        if !["us-wine", "common-practice"].contains(&id) {
            continue;
        }
        quality.post(&format!("/v1/rule-sets/{id}/adoptions"), &body)?;
        stage.say(&format!("rule set {id} binds from now on"));
    }
    Ok(())
}

fn percent(substance: &str, value: &str) -> Value {
    json!({"substance": substance, "fraction": {"value": value, "unit": "%"}})
}

fn describe(stage: &mut Stage) -> anyhow::Result<()> {
    let lead = stage.as_("ben")?;
    for (code, name) in [
        ("MOL", "Example Molasses Supplier"),
        ("NUT", "Example Nutrient Supplier"),
        ("ORC", "Example Orchard"),
        ("VIN", "Example Vineyard"),
    ] {
        let body = json!({"code": code, "name": name, "address": "1 Example Road, Exampleton"});
        let answer = lead.post("/v1/parties", &body)?;
        stage.note(code, &answer, "id")?;
    }
    for (code, name, litres, premises) in
        [("T-12", "stainless tank", "3500", "BW"), ("F-3", "open fermenter", "2400", "DSP")]
    {
        let body = json!({"code": code, "name": name, "premises": premises,
            "capacity": {"value": litres, "unit": "L"}});
        let answer = lead.post("/v1/vessels", &body)?;
        stage.note(code, &answer, "id")?;
    }
    let hydrometer = json!({"code": "HY-1", "name": "hydrometer, SG 20/20 °C",
        "calibrated_on": "2025-03-03", "calibration_due": "2026-03-03", "certificate": "EX-117"});
    let answer = lead.post("/v1/instruments", &hydrometer)?;
    stage.note("HY-1", &answer, "id")?;
    for material in materials() {
        let answer = lead.post("/v1/materials", &material)?;
        let code = material["code"].as_str().unwrap_or_default().to_owned();
        stage.note(&code, &answer, "id")?;
    }
    stage.say("suppliers, vessels, the hydrometer and the materials are described");
    Ok(())
}

/// Compositions of `demo-scenario`: the salt is what the law counts, its nitrogen follows from it.
fn materials() -> Vec<Value> {
    let material = |code: &str, name: &str, category: &str, listed: &[&str], parts: Vec<Value>| {
        json!({"code": code, "name": name, "category": category, "dimension": "mass",
            "listed_as": listed, "composition": parts})
    };
    vec![
        material(
            "DAP",
            "diammonium phosphate",
            "nutrient",
            &["ammonium_phosphate"],
            vec![percent("diammonium_phosphate", "100")],
        ),
        material(
            "AUTO",
            "yeast autolysate",
            "nutrient",
            &["autolysed_yeast"],
            vec![percent("amino_nitrogen", "4.6")],
        ),
        material(
            "REHY",
            "rehydration product (autolysed yeast with thiamine hydrochloride)",
            "nutrient",
            &["autolysed_yeast", "thiamine_hydrochloride"],
            vec![
                percent("amino_nitrogen", "4.0"),
                json!({"substance": "thiamine_hydrochloride", "fraction": {"value": "1.0", "unit": "g/kg"}}),
            ],
        ),
        material("YEAST-W", "dry yeast for white wine", "yeast", &[], vec![]),
        material("GRAPE", "white grapes", "fruit", &[], vec![]),
        material("MOLASSES", "cane molasses", "base", &[], vec![]),
        material("CANE", "raw cane sugar", "sugar", &[], vec![]),
        json!({"code": "STILLAGE", "name": "stillage (dunder) of an own earlier run", "category": "base",
            "dimension": "volume"}),
    ]
}

/// When, lot, material, supplier, how much.
type Receipt =
    (&'static str, &'static str, &'static str, Option<&'static str>, &'static str, &'static str);

/// The lots of the scenario, at their times.
pub(super) fn receipts(events: &mut Events) {
    let lots: [Receipt; 9] = [
        ("2025-06-02T09:00:00-07:00", "DP-0387", "DAP", Some("NUT"), "500", "g"),
        ("2025-09-08T08:00:00-07:00", "DP-0412", "DAP", Some("NUT"), "25000", "g"),
        ("2025-09-08T08:05:00-07:00", "AU-0208", "AUTO", Some("NUT"), "10000", "g"),
        ("2025-09-08T08:10:00-07:00", "RH-0091", "REHY", Some("NUT"), "5000", "g"),
        ("2025-09-08T08:15:00-07:00", "YW-0001", "YEAST-W", Some("NUT"), "2", "kg"),
        ("2025-09-08T09:00:00-07:00", "GR-0908", "GRAPE", Some("VIN"), "4300", "kg"),
        ("2025-09-15T09:00:00-07:00", "ML-0501", "MOLASSES", Some("MOL"), "1000", "kg"),
        ("2025-09-15T09:10:00-07:00", "CS-0502", "CANE", Some("MOL"), "200", "kg"),
        ("2025-09-19T16:00:00-07:00", "SB-019", "STILLAGE", None, "400", "L"),
    ];
    for (time, code, material, supplier, value, unit) in lots {
        events.at(time, move |stage| {
            let mut body = json!({"code": code, "material": stage.id(material)?, "received_at": time,
                "amount": {"value": value, "unit": unit}, "status": "released"});
            if let Some(supplier) = supplier {
                body["supplier"] = stage.id(supplier)?.into();
                body["supplier_lot"] = format!("S-{code}").into();
                body["document"] = format!("delivery note {code}").into();
            }
            let answer = stage.as_("ana")?.post("/v1/lots", &body)?;
            stage.note(code, &answer, "id")?;
            stage.say(&format!("{}  lot {code} received: {value} {unit}", super::stage::when(time)));
            Ok(())
        });
    }
    hold(events);
}

/// The autolysate is held while its certificate is missing.
fn hold(events: &mut Events) {
    for (time, status, reason) in [
        ("2025-09-16T09:00:00-07:00", "held", "certificate missing"),
        ("2025-09-19T11:00:00-07:00", "released", "certificate arrived"),
    ] {
        events.at(time, move |stage| {
            let quality = stage.as_("caro")?;
            let path = format!("/v1/lots/{}", stage.id("AU-0208")?);
            let etag = quality.get(&path)?.etag.unwrap_or_default();
            let body = json!({"status": status, "reason": reason});
            quality.post_if(&format!("{path}/status"), &etag, &body)?;
            stage.say(&format!("{}  lot AU-0208 {status}: {reason}", super::stage::when(time)));
            Ok(())
        });
    }
}
