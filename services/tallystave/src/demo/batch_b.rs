//! Batch B: white grape must on bonded wine premises, with a slip that is refused and a late dose that is signed.

use serde_json::json;

use super::stage::{BATCH_B, Events};

/// Daily gravities and vessel temperatures; the first is at pitching.
const READINGS: [(&str, &str, &str); 21] = [
    ("2025-09-09T08:55:00-07:00", "1.0940", "15.0"),
    ("2025-09-10T08:00:00-07:00", "1.0930", "15.2"),
    ("2025-09-11T08:00:00-07:00", "1.0885", "15.8"),
    ("2025-09-12T08:00:00-07:00", "1.0790", "16.4"),
    ("2025-09-13T08:00:00-07:00", "1.0685", "16.8"),
    ("2025-09-14T08:00:00-07:00", "1.0585", "17.0"),
    ("2025-09-15T08:00:00-07:00", "1.0490", "16.4"),
    ("2025-09-16T08:00:00-07:00", "1.0420", "14.1"),
    ("2025-09-17T08:00:00-07:00", "1.0370", "12.4"),
    ("2025-09-18T08:00:00-07:00", "1.0325", "12.9"),
    ("2025-09-19T08:00:00-07:00", "1.0260", "16.0"),
    ("2025-09-20T08:00:00-07:00", "1.0195", "17.0"),
    ("2025-09-21T08:00:00-07:00", "1.0130", "17.2"),
    ("2025-09-22T08:00:00-07:00", "1.0070", "17.4"),
    ("2025-09-23T08:00:00-07:00", "1.0025", "17.5"),
    ("2025-09-24T08:00:00-07:00", "0.9985", "17.6"),
    ("2025-09-25T08:00:00-07:00", "0.9960", "17.8"),
    ("2025-09-26T08:00:00-07:00", "0.9935", "18.0"),
    ("2025-09-27T08:00:00-07:00", "0.9925", "18.0"),
    ("2025-09-28T08:00:00-07:00", "0.9920", "18.0"),
    ("2025-09-29T08:00:00-07:00", "0.9920", "18.0"),
];

pub(super) fn events(events: &mut Events) {
    opening(events);
    for (time, sg, celsius) in READINGS {
        events.at(time, move |stage| stage.gravity(BATCH_B, time, sg, celsius));
    }
    early_doses(events);
    slip(events);
    late_dose(events);
    laboratory(events);
}

fn opening(events: &mut Events) {
    events.at("2025-09-08T14:00:00-07:00", |stage| {
        let body = json!({
            "code": BATCH_B, "product_class": "grape_wine", "premises": "BW",
            "destinations": ["US", "EU", "CA"], "claims": ["white", "dry"], "vessel": stage.id("T-12")?,
            "opened_at": "2025-09-08T14:00:00-07:00", "volume": {"value": "3000", "unit": "L"},
            "volume_basis": "dip rod in T-12, clear juice off 120 L lees", "demand": "medium",
            "expected_final": {"value": "0.9920", "scale": "sg_20_20", "basis": "earlier batches"},
            "ingredients": stage.lines(&[("GR-0908", "4300", "kg")])?,
        });
        let answer = stage.as_("ben")?.post("/v1/batches", &body)?;
        stage.note(BATCH_B, &answer, "id")?;
        stage.say(&format!("2025-09-08 14:00  {BATCH_B} opened: 3,000 L white must in T-12"));
        Ok(())
    });
    events.at("2025-09-09T08:00:00-07:00", |stage| {
        let body = json!({
            "taken_at": "2025-09-08T16:00:00-07:00", "reported_at": "2025-09-09T08:00:00-07:00",
            "sample": "L-2201", "laboratory": "Example Laboratory", "values": [
                {"quantity": "sugar", "value": "220", "unit": "g/L", "method": "glucose and fructose, enzymatic"},
                {"quantity": "ammonium", "value": "52", "unit": "mg/L", "expressed_as": "NH4", "method": "enzymatic"},
                {"quantity": "primary_amino_nitrogen", "value": "98", "unit": "mg/L", "method": "OPA"}],
        });
        let answer =
            stage.as_("ana")?.post(&format!("/v1/batches/{}/readings", stage.id(BATCH_B)?), &body)?;
        let total = &answer["entries"][0]["body"]["nitrogen"]["total_mg_l"];
        stage.say(&format!("2025-09-09 08:00  {BATCH_B}  laboratory: assimilable nitrogen {} mg N/L", total.as_str().unwrap_or_default()));
        Ok(())
    });
}

/// B1 to B3: asked, clear, done.
fn early_doses(events: &mut Events) {
    type Lots = &'static [(&'static str, &'static str, &'static str)];
    let doses: [(&'static str, &'static str, &'static str, Lots, &'static str, &'static str); 3] = [
        (
            "B1",
            "2025-09-09T09:00:00-07:00",
            "pitching, yeast rehydrated",
            &[("YW-0001", "750", "g"), ("RH-0091", "900", "g")],
            "8",
            "slurry",
        ),
        (
            "B2",
            "2025-09-11T10:00:00-07:00",
            "amino nitrogen early",
            &[("AU-0208", "900", "g")],
            "6",
            "slurry",
        ),
        (
            "B3",
            "2025-09-13T11:00:00-07:00",
            "ammonium before a third of the sugar",
            &[("DP-0387", "500", "g"), ("DP-0412", "400", "g")],
            "6",
            "slurry",
        ),
    ];
    for (name, time, purpose, lots, water, preparation) in doses {
        events.at(time, move |stage| {
            let lines = stage.lines(lots)?;
            let water = json!({"value": water, "unit": "L"});
            let verdict = stage.propose(
                name,
                BATCH_B,
                &json!({"planned_at": time, "lines": lines, "carrier_water": water,
                    "preparation": preparation, "purpose": purpose}),
            )?;
            anyhow::ensure!(verdict == "clear", "{name} was {verdict}, not clear");
            let body = json!({"proposal": stage.id(name)?, "done_at": time, "lines": lines,
                "carrier_water": water, "preparation": preparation});
            stage.add(BATCH_B, &body)?;
            Ok(())
        });
    }
}

/// B4: 2,100 g typed for 210 g.
fn slip(events: &mut Events) {
    events.at("2025-09-15T09:30:00-07:00", |stage| {
        let body = json!({"planned_at": "2025-09-15T09:30:00-07:00", "preparation": "slurry",
            "lines": stage.lines(&[("DP-0412", "2100", "g")])?});
        let verdict = stage.propose("B4", BATCH_B, &body)?;
        anyhow::ensure!(verdict == "refuse", "B4 was {verdict}, not refuse");
        let body = json!({"proposal": stage.id("B4")?, "done_at": "2025-09-15T09:30:00-07:00",
            "lines": body["lines"], "preparation": "slurry"});
        let path = format!("/v1/batches/{}/additions", stage.id(BATCH_B)?);
        let answer = stage.as_("ana")?.try_post(&path, &body)?;
        anyhow::ensure!(answer.status == 409, "a refused dose was recorded as carried out");
        stage.say("2025-09-15 09:30  B4 cannot be carried out: the slip was caught");
        Ok(())
    });
    events.at("2025-09-15T09:32:00-07:00", |stage| {
        let body = json!({"planned_at": "2025-09-15T09:35:00-07:00", "preparation": "slurry",
            "lines": stage.lines(&[("DP-0412", "210", "g")])?});
        let verdict = stage.propose("B4b", BATCH_B, &body)?;
        anyhow::ensure!(verdict == "advise", "B4b was {verdict}, not advise");
        Ok(())
    });
}

/// B5: late ammonium, signed by a second person, done within the tolerance.
fn late_dose(events: &mut Events) {
    events.at("2025-09-18T10:00:00-07:00", |stage| {
        let body = json!({"planned_at": "2025-09-18T18:00:00-07:00", "preparation": "slurry",
            "lines": stage.lines(&[("AU-0208", "300", "g")])?});
        let verdict = stage.propose("B5a", BATCH_B, &body)?;
        anyhow::ensure!(verdict == "refuse", "B5a was {verdict}, not refuse");
        Ok(())
    });
    events.at("2025-09-18T10:05:00-07:00", |stage| {
        let body = json!({"planned_at": "2025-09-18T18:00:00-07:00", "preparation": "slurry",
            "carrier_water": {"value": "2", "unit": "L"},
            "lines": stage.lines(&[("DP-0412", "150", "g")])?});
        let verdict = stage.propose("B5", BATCH_B, &body)?;
        anyhow::ensure!(verdict == "refer", "B5 was {verdict}, not refer");
        Ok(())
    });
    events.at("2025-09-18T14:20:00-07:00", |stage| {
        let body = json!({"meaning": "approved the exception", "shown": stage.id("B5 shown")?,
            "secret": stage.password(),
            "reason": "strong hydrogen sulfide; cooling repaired; amino lot on hold; urea to be measured before bottling"});
        let path = format!("/v1/entries/{}/signoffs", stage.id("B5 entry")?);
        stage.as_("ben")?.post(&path, &body)?;
        stage.say("2025-09-18 14:20  Ben Example signs B5: approved the exception");
        Ok(())
    });
    events.at("2025-09-18T18:05:00-07:00", |stage| {
        let body = json!({"proposal": stage.id("B5")?, "done_at": "2025-09-18T18:05:00-07:00",
            "lines": stage.lines(&[("DP-0412", "151", "g")])?, "preparation": "slurry",
            "carrier_water": {"value": "2", "unit": "L"}});
        stage.add(BATCH_B, &body)?;
        Ok(())
    });
}

fn laboratory(events: &mut Events) {
    events.at("2025-10-04T10:00:00-07:00", |stage| {
        let body = json!({
            "taken_at": "2025-10-03T09:00:00-07:00", "reported_at": "2025-10-04T10:00:00-07:00",
            "sample": "L-2290", "laboratory": "Example Laboratory", "values": [
                {"quantity": "sugar", "value": "1.6", "unit": "g/L", "method": "glucose and fructose, enzymatic"},
                {"quantity": "ethanol", "value": "13.0", "unit": "%{vol}", "method": "distillation"},
                {"quantity": "urea", "value": "1.1", "unit": "mg/L", "method": "enzymatic"},
                {"quantity": "ethyl_carbamate", "value": "5", "qualifier": "<", "unit": "ug/L", "method": "GC-MS"},
                {"quantity": "sulfur_dioxide_total", "value": "92", "unit": "mg/L", "method": "aeration-oxidation"}],
        });
        stage.as_("ana")?.post(&format!("/v1/batches/{}/readings", stage.id(BATCH_B)?), &body)?;
        stage.say(&format!("2025-10-04 10:00  {BATCH_B}  laboratory: urea 1.1 mg/L, ethyl carbamate < 5 µg/L"));
        Ok(())
    });
}
