//! Gravities on every scale, over REST.
#![expect(clippy::unwrap_used, reason = "a test that finds nothing to unwrap fails, as it should")]

use serde_json::{Value, json};
use tests::{Answer, Cellar, on_both_engines};

/// One must of SG 1.0900 and 20 °C, or 60 °F for the scale of that temperature.
const MUST: [(&str, &str, &str, &str); 8] = [
    ("sg_20_20", "1.0900", "20.0", "Cel"),
    ("sg_60_60", "1.0904", "60.0", "[degF]"),
    ("plato", "21.57", "20.0", "Cel"),
    ("brix", "21.57", "20.0", "Cel"),
    ("oechsle", "90.0", "20.0", "Cel"),
    ("kmw", "18.23", "20.0", "Cel"),
    ("baume_145", "11.97", "20.0", "Cel"),
    ("refractometer_brix", "21.57", "20.0", "Cel"),
];

fn take(cellar: &Cellar, batch: &str, on: (&str, &str, &str, &str)) -> Answer {
    let (scale, shown, degrees, unit) = on;
    let body = json!({"taken_at": cellar.now(), "values": [
        {"quantity": "gravity", "value": shown, "unit": scale,
         "sample_temperature": {"value": degrees, "unit": unit}}]});
    cellar.ana.post(&format!("/v1/batches/{batch}/readings"), &body)
}

fn kept(cellar: &Cellar, batch: &str) -> Value {
    let readings = cellar.ana.get(&format!("/v1/batches/{batch}/readings")).expect(200).items();
    readings.last().unwrap()["reading"]["values"][0].clone()
}

fn last_gravity(cellar: &Cellar, batch: &str) -> Value {
    cellar.ana.get(&format!("/v1/batches/{batch}")).expect(200).json()["last_gravity"].clone()
}

fn about(text: &Value, expected: f64, within: f64) {
    let found: f64 = text.as_str().unwrap().parse().unwrap();
    assert!((found - expected).abs() <= within, "{found} is not {expected}");
}

on_both_engines! {
    fn a_must_is_one_gravity_whatever_scale_it_is_read_on(engine) {
        let cellar = Cellar::simulated(engine);
        for (position, on) in MUST.into_iter().enumerate() {
            let batch = cellar.open(&format!("B{position}"), "1000", "L");
            take(&cellar, &batch, on).expect(201);
            let value = kept(&cellar, &batch);
            assert_eq!((&value["unit"], &value["value"]), (&json!(on.0), &json!(on.1)));
            about(&value["corrected"]["sg_20_20"], 1.09, 0.0001);
            about(&value["corrected"]["apparent_extract_percent"], 21.57, 0.02);
            about(&last_gravity(&cellar, &batch)["sg_20_20"], 1.09, 0.0001);
        }
        cellar.deep_check();
    }

    fn a_refractometer_after_the_yeast_is_kept_as_read_and_says_what_to_do(engine) {
        let mut cellar = Cellar::simulated(engine);
        let yeast = cellar.receive("YW-1", "YW", "5", "kg");
        let batch = cellar.open("B1", "1000", "L");
        take(&cellar, &batch, MUST[7]).expect(201);
        cellar.add_unasked(&batch, &[(&yeast, "250", "g")]).expect(201);
        let mut later = cellar.now();
        later.replace_range(8..10, "12");
        cellar.drive_to(&later);
        take(&cellar, &batch, ("refractometer_brix", "12.0", "20.0", "Cel")).expect(201);
        let value = kept(&cellar, &batch);
        assert_eq!(value["value"], "12.0");
        assert_eq!(value["corrected"], Value::Null);
        let why = value["left_as_read"].as_str().unwrap();
        assert!(why.contains("yeast went in before") && why.contains("read a hydrometer"), "{why}");
        about(&last_gravity(&cellar, &batch)["sg_20_20"], 1.09, 0.0001);
        cellar.deep_check();
    }

    fn a_scale_that_is_none_and_a_number_off_its_scale_are_answered_with_all_scales(engine) {
        let cellar = Cellar::simulated(engine);
        let batch = cellar.open("B1", "1000", "L");
        for on in [("sg", "1.0900", "20.0", "Cel"), ("oechsle", "1090", "20.0", "Cel")] {
            let refused = take(&cellar, &batch, on).expect(422);
            for (scale, ..) in MUST {
                assert!(refused.text("/detail").contains(scale), "{refused:?}");
            }
        }
        cellar.deep_check();
    }
}

/// The description is written by hand; the table of scales is not.
#[test]
fn the_description_names_every_scale_a_gravity_is_read_on() {
    let cellar = Cellar::simulated(tests::Engine::Sqlite);
    let document = cellar.nobody().get("/v1/openapi.json").expect(200).json();
    let said = |pointer: &str| document.pointer(pointer).unwrap()["description"].to_string();
    let unit = said("/components/schemas/NewValue/properties/unit");
    let expected = said("/components/schemas/NewExpectedFinal/properties/scale");
    for scale in domain::densimetry::Scale::all() {
        let name = format!("`{}`", scale.name());
        assert!(unit.contains(&name), "{name} in {unit}");
        let of_density = scale != domain::densimetry::Scale::RefractometerBrix;
        assert_eq!(expected.contains(&name), of_density, "{name} in {expected}");
    }
}
