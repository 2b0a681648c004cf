use super::*;

/// Held against values of the reference: name, input, member, expected, tolerance.
const PUBLISHED: &[(&str, &str, &str, f64, f64)] = &[
    // OIML R 22: the worked examples of volume and strength at 20 °C, tolerance 0.002.
    (
        "dilution",
        r#"{"volume_l":200,"from_abv":63.5,"to_abv":40}"#,
        "final_volume_l",
        317.500,
        0.002,
    ),
    ("dilution", r#"{"volume_l":200,"from_abv":63.5,"to_abv":40}"#, "water_l", 120.991, 0.002),
    ("dilution", r#"{"volume_l":200,"from_abv":63.5,"to_abv":40}"#, "contraction_l", 3.491, 0.002),
    ("dilution", r#"{"volume_l":100,"from_abv":96,"to_abv":40}"#, "water_l", 147.053, 0.002),
    (
        "alcoholic_strength",
        r#"{"density_kg_m3":948.00,"temperature_c":23.4}"#,
        "abv_20c",
        38.6141,
        0.0002,
    ),
    (
        "ethanol_water_density",
        r#"{"mass_fraction":0.31,"temperature_c":13}"#,
        "density_kg_m3",
        956.42,
        0.005,
    ),
    // density.md E: 1,000 kg at 63.5 % vol and 17 °C; a tank of 1,250 L at 12 °C; A.2: strengths at 20 °C.
    (
        "pure_alcohol",
        r#"{"abv_20c":63.5,"temperature_c":17,"weight_kg":1000}"#,
        "pure_alcohol_l",
        705.482,
        0.002,
    ),
    (
        "pure_alcohol",
        r#"{"abv_20c":63.5,"temperature_c":17,"weight_kg":1000}"#,
        "volume_20c_l",
        1_110.995,
        0.002,
    ),
    (
        "pure_alcohol",
        r#"{"abv_20c":63.5,"temperature_c":12,"volume_l":1250}"#,
        "pure_alcohol_l",
        799.182,
        0.002,
    ),
    ("strength_convert", r#"{"abv_20c":40}"#, "mass_fraction", 0.332_996, 1e-6),
    ("strength_convert", r#"{"mass_fraction":0.424257}"#, "abv_20c", 50.0, 1e-4),
    ("strength_convert", r#"{"us_proof":200}"#, "abv_20c", 100.0, 1e-9),
    // The demo's hearts: 71.0 L at 67 % brought to 42 %; 0.52 mg/L at 42 % vol; 0.9 g/hL of pure alcohol at 67 %.
    ("dilution", r#"{"volume_l":71,"from_abv":67,"to_abv":42}"#, "water_l", 43.688, 0.002),
    (
        "contaminant_convert",
        r#"{"value":0.52,"unit":"mg/L","abv_20c":42}"#,
        "ug_per_kg",
        550.4,
        0.1,
    ),
    (
        "contaminant_convert",
        r#"{"value":0.9,"unit":"g/hL_pure_alcohol","abv_20c":67}"#,
        "mg_per_l",
        6.03,
        1e-9,
    ),
    // Heat and gas of 240 g/L; 3 g/(L h).
    ("heat_and_gas", r#"{"sugar_g_l":240,"volume_l":1,"rate_g_l_h":3}"#, "co2_l", 64.092, 0.001),
    (
        "heat_and_gas",
        r#"{"sugar_g_l":240,"volume_l":1,"rate_g_l_h":3}"#,
        "adiabatic_rise_k",
        34.09,
        0.005,
    ),
    ("heat_and_gas", r#"{"sugar_g_l":240,"volume_l":1,"rate_g_l_h":3}"#, "peak_w", 0.464_487, 1e-6),
    // Stoichiometry: 1 g/L of diammonium phosphate carries 212.1 mg N/L and 234.55 mg P/L.
    (
        "nutrient_dose",
        r#"{"mass_g":1,"volume_l":1,"composition":{"dap":1}}"#,
        "nitrogen_mg_l",
        212.1,
        0.05,
    ),
    (
        "nutrient_dose",
        r#"{"mass_g":1,"volume_l":1,"composition":{"dap":1}}"#,
        "phosphorus_mg_l",
        234.55,
        0.01,
    ),
    (
        "nutrient_dose",
        r#"{"mass_g":1,"volume_l":1,"composition":{"ammonium_sulfate":1}}"#,
        "nitrogen_mg_l",
        212.01,
        0.01,
    ),
    // The demo's must: 40.4 + 98 mg N/L; need 221.5, line 236.4; 180 g metabisulfite on 3,120 L.
    ("yan", r#"{"ammonium_mg_l":52,"primary_amino_n_mg_l":98}"#, "yan_mg_l", 138.4, 0.05),
    ("nitrogen_need", r#"{"brix":22.456,"sg":1.094,"demand":"medium"}"#, "need_mg_l", 221.5, 0.05),
    (
        "nitrogen_need",
        r#"{"brix":22.456,"sg":1.094,"demand":"medium"}"#,
        "line_by_brix_mg_l",
        236.4,
        0.05,
    ),
    ("nitrogen_need", r#"{"sugar_g_l":92,"demand":"medium"}"#, "need_mg_l", 140.0, 1e-9),
    (
        "so2",
        r#"{"salt":"potassium_metabisulfite","mass_g":180,"volume_l":3120}"#,
        "so2_mg_l",
        33.2,
        0.05,
    ),
    // Gravity: a reading at 27 °C, extract of 1.094, alcohol of beer 1.048 to 1.012.
    (
        "hydrometer",
        r#"{"reading":1.0665,"scale":"sg_20_20","temperature_c":27}"#,
        "corrected",
        1.0685,
        5e-5,
    ),
    // density.md C: SG 1.0500 on a scale of 60 °F at 25 °C reads 0.00230 too low.
    (
        "hydrometer",
        r#"{"reading":1.05,"scale":"sg_60_60","temperature_c":25}"#,
        "correction",
        0.002_30,
        2e-5,
    ),
    ("extract", r#"{"sg_20_20":1.094}"#, "brix", 22.456, 0.001),
    ("alcohol_by_gravity", r#"{"original_sg":1.048,"present_sg":1.012}"#, "abv_20c", 4.73, 0.005),
    ("water_density", r#"{"temperature_c":20}"#, "density_kg_m3", 998.2067, 0.0005),
    (
        "sucrose_density",
        r#"{"mass_fraction":0.2,"temperature_c":20}"#,
        "density_kg_m3",
        1080.9775,
        1e-4,
    ),
    // HMRC Notice 226: the factor changes after 6.9; 5.98 is rounded down.
    ("uk_beer_estimate", r#"{"original_minus_present":6.9}"#, "factor", 0.125, 0.0),
    ("uk_beer_estimate", r#"{"original_minus_present":7.0}"#, "factor", 0.126, 0.0),
    ("uk_beer_estimate", r#"{"original_minus_present":46.0}"#, "abv_rounded_down", 5.9, 1e-9),
    ("uk_beer_estimate", r#"{"original_minus_present":100.7}"#, "factor", 0.135, 0.0),
    ("molar_mass", r#"{"formula":"(NH4)2HPO4"}"#, "g_per_mol", 132.056, 0.001),
];

fn computed(name: &str, input: &str) -> Result<Value, Fault> {
    let input: Value = serde_json::from_str(input).unwrap();
    Calculation::of(name).unwrap().compute(&input)
}

#[test]
fn published_values_come_out() {
    for (name, input, member, expected, tolerance) in PUBLISHED {
        let found = computed(name, input).unwrap();
        let value = found[*member].as_f64().unwrap();
        assert!(
            (value - expected).abs() <= *tolerance,
            "{name} {input}: {member} {value}, not {expected}"
        );
    }
}

#[test]
fn every_row_of_molar_masses_comes_out() {
    let table =
        include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../tests/reference/molar_mass.csv"));
    let mut rows = 0;
    for line in table.lines().filter(|line| !line.starts_with(['#', 'n'])) {
        let cells: Vec<&str> = line.split(',').collect();
        let [name, formula, expected] = cells[..3] else { panic!("{line}") };
        let found = computed("molar_mass", &json!({"formula": formula}).to_string()).unwrap();
        let expected: f64 = expected.parse().unwrap();
        let value = found["g_per_mol"].as_f64().unwrap();
        assert!((value - expected).abs() < 0.0015, "{name}: {value}, not {expected}");
        rows += 1;
    }
    assert!(rows > 10, "{rows} rows");
}

/// The rows of a table with their cells.
fn rows(table: &'static str) -> impl Iterator<Item = Vec<&'static str>> {
    let lines = table.lines().filter(|line| !line.starts_with('#')).skip(1);
    lines.map(|line| line.split(',').collect())
}

#[test]
fn every_row_of_must_and_refractometer_comes_out() {
    let must =
        include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../tests/reference/must_sugar.csv"));
    let number = |cell: &str| cell.parse::<f64>().unwrap();
    let mut count = 0;
    for row in rows(must) {
        let found = computed("must_sugar", &format!("{{\"sucrose_percent\":{}}}", row[0])).unwrap();
        let near = |name: &str, cell: &str, tolerance: f64| {
            let value = found[name].as_f64().unwrap();
            assert!((value - number(cell)).abs() <= tolerance, "{row:?}: {name} {value}");
        };
        near("sugar_g_l", row[3], number(row[6]));
        near("density_kg_l", row[2], 0.0001);
        near("sugar_g_kg", row[4], 0.1);
        near("potential_abv_1683", row[5], 0.01);
        let found = computed("refractive_index", &format!("{{\"n_d20\":{}}}", row[1])).unwrap();
        let value = found["sucrose_percent"].as_f64().unwrap();
        assert!((value - number(row[0])).abs() < 0.01, "{row:?}: {value}");
        count += 1;
    }
    let index = include_str!(concat!(
        env!("CARGO_MANIFEST_DIR"),
        "/../tests/reference/refractive_brix.csv"
    ));
    for row in rows(index) {
        let found = computed("refractive_index", &format!("{{\"n_d20\":{}}}", row[0])).unwrap();
        let value = found["sucrose_percent"].as_f64().unwrap();
        assert!((value - number(row[1])).abs() <= number(row[2]), "{row:?}: {value}");
        count += 1;
    }
    assert!(count > 40, "{count} rows");
}

#[test]
fn every_row_of_tanks_and_weights_comes_out() {
    let table =
        include_str!(concat!(env!("CARGO_MANIFEST_DIR"), "/../tests/reference/vessel_mass.csv"));
    let mut count = 0;
    for row in rows(table) {
        let amount = match row[0] {
            "la_per_100l_steel_tank" => "\"volume_l\":100",
            "la_per_100kg_in_air" => "\"weight_kg\":100",
            _ => continue,
        };
        let input = format!("{{\"abv_20c\":{},\"temperature_c\":{},{amount}}}", row[1], row[2]);
        let value = computed("pure_alcohol", &input).unwrap()["pure_alcohol_l"].as_f64().unwrap();
        let [expected, tolerance] = [row[4], row[6]].map(|cell| cell.parse::<f64>().unwrap());
        assert!((value - expected).abs() <= tolerance, "{row:?}: {value}");
        count += 1;
    }
    assert!(count > 10, "{count} rows");
}

#[test]
fn storage_is_a_band_between_both_energies_and_refuses_spirits() {
    let at = |celsius: f64| {
        let input = json!({"profile": [{"days": 365, "temperature_c": celsius}]}).to_string();
        let found = computed("storage_factor", &input).unwrap()["equivalent_days_20c"].clone();
        (found["low"].as_f64().unwrap(), found["high"].as_f64().unwrap())
    };
    let (low, high) = at(20.0);
    assert!((low - 365.0).abs() < 1e-9 && (high - 365.0).abs() < 1e-9);
    let (low, high) = at(30.0);
    assert!(365.0 < low && low < high);
    let (low, high) = at(12.0);
    assert!(high < low && low < 365.0);
    let spirit = r#"{"profile":[{"days":1,"temperature_c":20}],"product":"spirit"}"#;
    assert_eq!(computed("storage_factor", spirit).unwrap_err().field.as_deref(), Some("product"));
}

#[test]
fn a_blend_of_one_part_is_that_part_and_alcohol_is_kept() {
    let one = computed("blend", r#"{"parts":[{"volume_l":71,"abv":67}]}"#).unwrap();
    let number = |found: &Value, name: &str| found[name].as_f64().unwrap();
    assert!((number(&one, "volume_l") - 71.0).abs() < 1e-6);
    assert!((number(&one, "abv_20c") - 67.0).abs() < 1e-6);
    let parts = r#"{"parts":[{"volume_l":71,"abv":67},{"volume_l":43.688,"abv":0}]}"#;
    let two = computed("blend", parts).unwrap();
    assert!((number(&two, "abv_20c") - 42.0).abs() < 0.001);
    assert!((number(&two, "contraction_l") - 1.426).abs() < 0.002);
    assert!((number(&two, "pure_alcohol_l") - 47.57).abs() < 1e-9);
}

#[test]
fn every_result_says_how_it_was_found_and_has_the_members_it_promises() {
    for (name, input, ..) in PUBLISHED {
        let calculation = Calculation::of(name).unwrap();
        let found = computed(name, input).unwrap();
        assert!(found["method"].as_str().is_some_and(|method| !method.is_empty()), "{name}");
        assert!(found["notes"].is_array(), "{name}");
        for member in found.as_object().unwrap().keys() {
            let promised = ["method", "notes"].contains(&member.as_str())
                || calculation.gives.contains(&member.as_str());
            assert!(promised, "{name} gives {member}");
        }
    }
}

#[test]
fn names_are_unlike_and_each_has_a_source() {
    let mut names = std::collections::BTreeSet::new();
    for calculation in calculations() {
        assert!(names.insert(calculation.name));
        assert!(!calculation.source.is_empty() && !calculation.meaning.is_empty());
        assert!(!calculation.fields.is_empty() && !calculation.gives.is_empty());
    }
    assert_eq!(names.len(), 23);
}

#[test]
fn what_cannot_be_computed_names_the_member_and_what_would_do() {
    for (name, input, field, says) in [
        ("water_density", "{}", Some("temperature_c"), "give a number"),
        ("water_density", r#"{"temperature_c":"20"}"#, Some("temperature_c"), "give a number"),
        (
            "water_density",
            r#"{"temperature_c":120}"#,
            Some("temperature_c"),
            "unit of the temperature",
        ),
        ("water_density", r#"{"celsius":20}"#, Some("celsius"), "takes temperature_c"),
        ("extract", "{}", None, "exactly one of"),
        ("extract", r#"{"plato":12,"brix":12}"#, None, "exactly one of"),
        (
            "hydrometer",
            r#"{"reading":12,"scale":"twaddell","temperature_c":20}"#,
            Some("scale"),
            "sg_20_20",
        ),
        ("dilution", r#"{"volume_l":1,"from_abv":40,"to_abv":50}"#, Some("to_abv"), "up to 40"),
        ("yan", "{}", None, "ammonium"),
        (
            "nutrient_dose",
            r#"{"mass_g":1,"volume_l":1,"composition":{"urea":1}}"#,
            Some("composition/urea"),
            "dap",
        ),
        (
            "nutrient_dose",
            r#"{"mass_g":1,"volume_l":1,"composition":{"dap":0.9,"amino_n":0.2}}"#,
            Some("composition"),
            "more than 1",
        ),
        (
            "uk_beer_estimate",
            r#"{"original_minus_present":100.8}"#,
            Some("original_minus_present"),
            "100.7",
        ),
        ("molar_mass", r#"{"formula":"Xy2"}"#, Some("formula"), "such as"),
        ("molar_mass", r#"{"formula":"(NH4"}"#, Some("formula"), "such as"),
        ("storage_factor", r#"{"profile":[]}"#, Some("profile"), "list"),
        ("blend", r#"{"parts":[{"volume_l":1}]}"#, Some("parts/0/abv"), "number"),
        ("so2", r#"{"salt":"potassium_metabisulfite"}"#, Some("mass_g"), "grams"),
    ] {
        let fault = computed(name, input).unwrap_err();
        assert_eq!(fault.field.as_deref(), field, "{name} {input}: {fault}");
        assert!(fault.detail.contains(says), "{name} {input}: {fault}");
    }
    assert!(Calculation::of("water_density").unwrap().compute(&json!([1])).is_err());
}
