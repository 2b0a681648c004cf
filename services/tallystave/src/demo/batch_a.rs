//! Batch A: molasses and cane-sugar wash at a spirits plant, with a dose thrown in at night and two digits swapped.

use serde_json::json;

use super::stage::{BATCH_A, Events, tell, when};

/// Gravities at 20 °C and vessel temperatures.
const READINGS: [(&str, &str, &str); 10] = [
    ("2025-09-22T18:00:00-07:00", "1.0665", "29.0"),
    ("2025-09-23T06:00:00-07:00", "1.0570", "30.8"),
    ("2025-09-23T16:00:00-07:00", "1.0465", "32.4"),
    ("2025-09-24T02:30:00-07:00", "1.0370", "35.4"),
    ("2025-09-24T09:00:00-07:00", "1.0330", "33.0"),
    ("2025-09-25T06:00:00-07:00", "1.0225", "30.5"),
    ("2025-09-25T18:00:00-07:00", "1.0190", "30.0"),
    ("2025-09-26T06:00:00-07:00", "1.0170", "29.5"),
    ("2025-09-26T14:00:00-07:00", "1.0160", "29.0"),
    ("2025-09-26T20:00:00-07:00", "1.0155", "29.0"),
];

pub(super) fn events(events: &mut Events) {
    opening(events);
    for (time, sg, celsius) in READINGS {
        events.at(time, move |stage| stage.gravity(BATCH_A, time, sg, celsius));
    }
    doses(events);
    night(events);
    swapped_digits(events);
}

fn nitrogen(taken: &str, reported: &str, ammonium: &str, amino: &str) -> serde_json::Value {
    json!({"taken_at": taken, "reported_at": reported, "laboratory": "Example Laboratory", "values": [
        {"quantity": "ammonium", "value": ammonium, "unit": "mg/L", "expressed_as": "N", "method": "enzymatic"},
        {"quantity": "primary_amino_nitrogen", "value": amino, "unit": "mg/L", "method": "OPA"}]})
}

fn opening(events: &mut Events) {
    events.at("2025-09-22T10:00:00-07:00", |stage| {
        let body = json!({
            "code": BATCH_A, "product_class": "wash", "premises": "DSP", "vessel": stage.id("F-3")?,
            "destinations": ["US"], "opened_at": "2025-09-22T10:00:00-07:00",
            "volume": {"value": "2000", "unit": "L"}, "volume_basis": "gauge of F-3 at 20 °C", "demand": "medium",
            "expected_final": {"value": "1.0155", "scale": "sg_20_20", "basis": "composition: unfermentable solids of the molasses"},
            "fermentable_sugar": {"g_per_l": "119.3", "basis": "composition of molasses and cane sugar"},
            "ingredients": stage.lines(&[("ML-0501", "360", "kg"), ("CS-0502", "60", "kg"), ("SB-019", "200", "L")])?,
        });
        let answer = stage.as_("ben")?.post("/v1/batches", &body)?;
        stage.note(BATCH_A, &answer, "id")?;
        stage.say(&format!("2025-09-22 10:00  {BATCH_A} opened: 2,000 L molasses and cane-sugar wash in F-3"));
        Ok(())
    });
    events.at("2025-09-22T10:02:00-07:00", |stage| {
        let body = json!({"taken_at": "2025-09-22T10:00:00-07:00", "values": [
            {"quantity": "gravity", "value": "1.0665", "unit": "sg_20_20", "sample_temperature": {"value": "27.0", "unit": "Cel"},
             "instrument": stage.id("HY-1")?},
            {"quantity": "temperature", "value": "28.5", "unit": "Cel", "method": "vessel thermometer"}]});
        let path = format!("/v1/batches/{}/readings", stage.id(BATCH_A)?);
        let answer = stage.as_("ana")?.post(&path, &body)?;
        let corrected = &answer["entries"][0]["body"]["values"][0]["corrected"];
        stage.say(&format!(
            "2025-09-22 10:02  {BATCH_A}  read 1.0665 at 27.0 °C, corrected to {} at 20 °C",
            corrected["sg_20_20"].as_str().unwrap_or_default()
        ));
        Ok(())
    });
    events.at("2025-09-22T10:05:00-07:00", |stage| {
        let body = nitrogen("2025-09-21T15:00:00-07:00", "2025-09-22T09:00:00-07:00", "12", "46");
        stage.as_("ana")?.post(&format!("/v1/batches/{}/readings", stage.id(BATCH_A)?), &body)?;
        stage.say(&format!("2025-09-22 10:05  {BATCH_A}  laboratory: 58 mg N/L, sampled before the stillage went in"));
        Ok(())
    });
    events.at("2025-09-22T21:00:00-07:00", |stage| {
        let body = nitrogen("2025-09-22T16:30:00-07:00", "2025-09-22T21:00:00-07:00", "13", "47");
        stage.as_("ana")?.post(&format!("/v1/batches/{}/readings", stage.id(BATCH_A)?), &body)?;
        stage.say(&format!(
            "2025-09-22 21:00  {BATCH_A}  laboratory: 60 mg N/L in the full wash, sampled 16:30"
        ));
        Ok(())
    });
}

/// A1 and A2: asked and done.
fn doses(events: &mut Events) {
    for (name, time, lot, grams, wanted, water) in [
        ("A1", "2025-09-22T18:10:00-07:00", "AU-0208", "1600", "advise", None),
        ("A2", "2025-09-23T06:30:00-07:00", "DP-0412", "400", "clear", Some("4")),
    ] {
        events.at(time, move |stage| {
            let lines = stage.lines(&[(lot, grams, "g")])?;
            let mut proposal = json!({"planned_at": time, "lines": lines, "preparation": "slurry"});
            let mut addition = json!({"done_at": time, "lines": lines, "preparation": "slurry"});
            if let Some(litres) = water {
                proposal["carrier_water"] = json!({"value": litres, "unit": "L"});
                addition["carrier_water"] = json!({"value": litres, "unit": "L"});
            }
            let verdict = stage.propose(name, BATCH_A, &proposal)?;
            anyhow::ensure!(verdict == wanted, "{name} was {verdict}, not {wanted}");
            addition["proposal"] = stage.id(name)?.into();
            stage.add(BATCH_A, &addition)?;
            Ok(())
        });
    }
}

/// A3: thrown in at night, entered in the morning; the deviation is resolved by quality.
fn night(events: &mut Events) {
    events.at("2025-09-24T09:05:00-07:00", |stage| {
        let body = json!({"already_done": true, "done_at": "2025-09-24T02:40:00-07:00", "preparation": "powder",
            "lines": stage.lines(&[("DP-0412", "300", "g")])?,
            "reason": "cooling pump tripped at 16:00; wash hot and smelling of sulfide at night"});
        let answer = stage.add(BATCH_A, &body)?;
        anyhow::ensure!(answer["deviation"].is_string(), "A3 opened no deviation");
        Ok(())
    });
    events.at("2025-10-06T11:00:00-07:00", |stage| {
        let body = json!({
            "cause": "cooling pump tripped at 16:00 on 23 September; night dose given without asking",
            "action": "wash distilled within three days; feints of this run kept apart; ethyl carbamate of the hearts to be measured",
            "conclusion": "late ammonium in a wash: urea stays in the stillage; carry-over in tails and cyanate are watched",
            "secret": stage.password()});
        let path = format!("/v1/deviations/{}/resolution", stage.id(&format!("{BATCH_A} deviation"))?);
        stage.as_("caro")?.post(&path, &body)?;
        stage.say("2025-10-06 11:00  Caro Example resolves and signs the deviation");
        Ok(())
    });
}

/// 1.0280 typed as 1.0820, and amended from the slip.
fn swapped_digits(events: &mut Events) {
    events.at("2025-09-24T18:05:00-07:00", |stage| {
        let body = json!({"taken_at": "2025-09-24T18:00:00-07:00", "values": [
            {"quantity": "gravity", "value": "1.0820", "unit": "sg_20_20", "sample_temperature": {"value": "20.0", "unit": "Cel"},
             "instrument": stage.id("HY-1")?},
            {"quantity": "temperature", "value": "31.5", "unit": "Cel", "method": "vessel thermometer"}]});
        let path = format!("/v1/batches/{}/readings", stage.id(BATCH_A)?);
        let answer = stage.as_("ana")?.post(&path, &body)?;
        stage.note("swapped", &answer, "id")?;
        stage.say(&format!("{}  {BATCH_A}  gravity 1.0820 typed", when("2025-09-24T18:05")));
        tell(&answer["entries"][0]["body"]);
        Ok(())
    });
    events.at("2025-09-24T18:48:00-07:00", |stage| {
        let body = json!({"reason": "slip shows 1.0280", "value": {"index": 0, "value":
            {"quantity": "gravity", "value": "1.0280", "unit": "sg_20_20", "sample_temperature": {"value": "20.0", "unit": "Cel"},
             "instrument": stage.id("HY-1")?}}});
        let path = format!("/v1/entries/{}/amendments", stage.id("swapped")?);
        stage.as_("ana")?.post(&path, &body)?;
        stage.say(&format!("{}  {BATCH_A}  amended to 1.0280: slip shows 1.0280", when("2025-09-24T18:48")));
        Ok(())
    });
}
