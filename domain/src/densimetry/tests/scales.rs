//! The scales other than gravity 20/20, Plato and Brix: against their tables, and against each other.

use super::*;

/// Scales of density that are a mere rewriting of the gravity 20/20.
const REWRITTEN: [Scale; 3] = [Scale::Oechsle, Scale::Kmw, Scale::Baume145];

fn at_20(reading: f64, scale: Scale) -> Corrected {
    correct(reading, scale, 20.0).unwrap()
}

fn says(found: &Corrected, word: &str) -> bool {
    found.notes.iter().any(|note| note.contains(word))
}

#[test]
fn kmw_and_oechsle_agree_with_their_table_both_ways() {
    let table = rows(include_str!("../../../../tests/reference/kmw_oechsle.csv"));
    let mut held = Held::new("kmw_oechsle.csv");
    for row in &table {
        let (kmw, oechsle, tolerance) = (row.number(0), row.number(1), row.number(2));
        let must = sg(at_20(kmw, Scale::Kmw).sg_20_20);
        held.compare("oechsle", extract::oechsle(must), oechsle, tolerance);
        let must = sg(at_20(oechsle, Scale::Oechsle).sg_20_20);
        held.compare("kmw", extract::kmw(must), kmw, tolerance);
    }
    held.report(table.len());
}

/// The rounding of the table's fifth decimal is worth 1e-7 in gravity.
#[test]
fn baume_gives_back_the_gravity_of_every_row() {
    let table = rows(include_str!("../../../../tests/reference/plato_sg.csv"));
    let mut held = Held::new("plato_sg.csv, from Baumé");
    let with_baume = table.iter().filter_map(|row| Some((row, row.optional(4)?)));
    let mut count = 0;
    for (row, baume) in with_baume {
        held.compare("gravity", at_20(baume, Scale::Baume145).sg_20_20, row.number(0), 1e-7);
        count += 1;
    }
    assert!(count > 20, "{count} rows of Baumé");
    held.report(count);
}

#[test]
fn one_must_is_one_gravity_on_every_scale_at_every_temperature() {
    for gravity in [1.000_1, 1.02, 1.05, 1.085, 1.1, 1.15, 1.25] {
        for celsius in [5.0, 15.0, 20.0, 27.0, 40.0] {
            let known = correct(gravity, Scale::Sg20_20, celsius).unwrap();
            for scale in REWRITTEN {
                let found = correct(on(scale, gravity), scale, celsius).unwrap();
                close(found.sg_20_20, known.sg_20_20, 1e-12);
                close(found.apparent_extract, known.apparent_extract, 1e-9);
                close(found.corrected, on(scale, known.sg_20_20), 1e-9);
            }
        }
    }
}

/// A scale of 60 °F through the whole correction: the regression values of the model for SG 1.0500.
#[test]
fn a_scale_of_60_fahrenheit_is_corrected_to_60_fahrenheit() {
    for (at, correction) in [(10.0, -0.00092), (25.0, 0.00230), (30.0, 0.00384), (40.0, 0.00752)] {
        let found = correct(1.05, Scale::Sg60_60, at).unwrap();
        close(found.correction, correction, 2e-5);
        assert!(says(&found, "60 °F"), "{:?}", found.notes);
    }
}

/// Two floats in one liquid show the same glass and the same density, whatever is engraved on them.
#[test]
fn floats_of_20_celsius_and_60_fahrenheit_agree_in_one_liquid() {
    let glass = |calibration: Celsius, at: f64| 1.0 - 25e-6 * (at - calibration.0);
    for percent in [-2.0, 0.0, 5.0, 12.0, 24.0, 45.0] {
        for at in [8.0, 15.0, 20.0, 31.0] {
            let liquid = sucrose::formula(MassFraction(percent / 100.0), Celsius(at));
            let shown = |scale: Scale| {
                let calibration = scale.calibration();
                liquid / glass(calibration, at) / water::kell_90(calibration)
            };
            let by = |scale: Scale| correct(shown(scale), scale, at).unwrap();
            let (celsius, fahrenheit) = (by(Scale::Sg20_20), by(Scale::Sg60_60));
            close(celsius.sg_20_20, fahrenheit.sg_20_20, 1e-12);
            close(celsius.apparent_extract, percent, 0.05);
        }
    }
    close(at_calibration(1.0, Scale::Sg60_60).unwrap().sg_20_20, 1.0, 1e-12);
    let heavy = at_calibration(1.1, Scale::Sg60_60).unwrap();
    assert!(heavy.sg_20_20 < 1.0999, "sugar water thins faster than water: {}", heavy.sg_20_20);
}

#[test]
fn what_the_sugar_model_does_not_cover_is_no_gravity_20_20_if_read_at_60_fahrenheit() {
    let refused = correct(0.8, Scale::Sg60_60, 25.0).unwrap_err();
    assert!(matches!(refused, DensimetryError::NotCovered { .. }), "{refused}");
    assert!(refused.to_string().contains("sg_20_20 at 20 °C"), "{refused}");
}

#[test]
fn below_water_the_apparent_extract_is_negative_on_every_scale_that_reaches_there() {
    let wine = at_20(-8.0, Scale::Oechsle);
    close(wine.apparent_extract, -2.09, 0.005);
    assert!(says(&wine, "negative"), "{:?}", wine.notes);
    let wine = at_calibration(0.992, Scale::Sg60_60).unwrap();
    assert!(wine.apparent_extract < -1.9 && says(&wine, "negative"), "{wine:?}");
    for scale in [Scale::Kmw, Scale::Baume145, Scale::RefractometerBrix] {
        let refused = correct(-1.0, scale, 20.0).unwrap_err().to_string();
        assert!(refused.contains("read on sg_20_20"), "{refused}");
    }
}

#[test]
fn a_refractometer_is_corrected_by_every_cell_of_its_table() {
    let table = rows(include_str!("../../../../tests/reference/refractometer_temperature.csv"));
    let mut held = Held::new("refractometer_temperature.csv");
    for row in &table {
        let (reading, at, correction) = (row.number(0), row.number(1), row.number(2));
        let found = refractometer::temperature_correction(reading, Celsius(at)).unwrap();
        held.compare("correction", found, correction, 1e-12);
        if Scale::RefractometerBrix.admit(reading).is_ok() {
            let found = correct(reading, Scale::RefractometerBrix, at).unwrap();
            held.compare("corrected", found.corrected, reading + correction, 1e-9);
            close(found.apparent_extract, found.corrected, 1e-9);
        }
    }
    held.report(table.len());
}

/// Between two cells of one column or row the correction lies between theirs, and it goes to nothing at 20 °C.
#[test]
fn a_refractometer_is_corrected_between_the_cells() {
    let add = |reading, at| refractometer::temperature_correction(reading, Celsius(at)).unwrap();
    close(add(20.0, 11.0), f64::midpoint(-0.65, -0.53), 1e-12);
    close(add(22.5, 13.0), f64::midpoint(-0.47, -0.48), 1e-12);
    close(add(15.0, 10.0), f64::midpoint(-0.59, -0.65), 1e-12);
    close(add(20.0, 18.0), -0.14, 1e-12);
    close(add(0.0, 20.0), 0.0, 0.0);
    for tenths in 100..200 {
        let at = f64::from(tenths) / 10.0;
        assert!(add(20.0, at) < add(20.0, at + 0.1), "{at} °C");
    }
}

#[test]
fn a_refractometer_is_not_corrected_where_no_table_reaches() {
    for (reading, at) in [(22.0, 20.1), (22.0, 25.0), (22.0, 9.9), (9.0, 15.0), (22.0, f64::NAN)] {
        let refused = correct(reading, Scale::RefractometerBrix, at).unwrap_err();
        assert!(matches!(refused, DensimetryError::NotCovered { .. }), "{refused}");
        assert!(refused.to_string().contains("bring the sample to 20 °C"), "{refused}");
    }
}

/// The table's own bands: 0.03 % for the polynomial; 0.0034 % and the last digit of the index for the own cubic.
#[test]
fn refractive_indices_agree_with_the_oiv_table() {
    let table = rows(include_str!("../../../../tests/reference/refractive_brix.csv"));
    let mut polynomial = Held::new("refractive_brix.csv, fifth degree");
    let mut cubic = Held::new("refractive_brix.csv, own cubic");
    for row in &table {
        let (index, percent) = (row.number(0), row.number(1));
        let found = refractometer::sucrose_percent(index).unwrap();
        assert!(found.note.is_none(), "{found:?}");
        cubic.compare("percent", found.percent, percent, 0.003_5);
        let by_polynomial = refractometer::by_fifth_degree(index);
        polynomial.compare("percent", by_polynomial, percent, row.number(2));
        assert!(by_polynomial < percent, "it runs below the table: {by_polynomial}");
    }
    polynomial.report(table.len());
    cubic.report(table.len());
    for (percent, index) in
        [(10.0, 1.347_82), (15.0, 1.355_68), (20.0, 1.363_84), (25.0, 1.372_33), (30.0, 1.381_15)]
    {
        close(refractometer::sucrose_percent(index).unwrap().percent, percent, 0.003_5);
    }
    assert!(refractometer::sucrose_percent(1.4).unwrap().note.is_some());
    assert!(refractometer::sucrose_percent(1.2).is_err());
}

/// Sugar within the table's band; density, g/kg and % vol within one unit of their last printed digit.
#[test]
fn must_sugar_agrees_with_every_row() {
    let table = rows(include_str!("../../../../tests/reference/must_sugar.csv"));
    let mut sugar = Held::new("must_sugar.csv, g/L");
    let mut rest = Held::new("must_sugar.csv, density, g/kg, % vol");
    for row in &table {
        let must = refractometer::must_sugar(row.number(0)).unwrap();
        sugar.compare("g/L", must.sugar_g_l, row.number(3), row.number(6));
        rest.compare("kg/L", must.density_kg_l, row.number(2), 0.000_1);
        rest.compare("g/kg", must.sugar_g_kg, row.number(4), 0.1);
        rest.compare("% vol", must.potential_abv_1683, row.number(5), 0.01);
    }
    sugar.report(table.len());
    rest.report(table.len());
    assert!(refractometer::must_sugar(9.9).is_err());
    assert!(refractometer::must_sugar(30.1).is_err());
}

/// What the note on a refractometer's gravity says of grape must.
#[test]
fn grape_must_is_heavier_than_sucrose_of_the_same_reading_by_up_to_0_002() {
    let table = rows(include_str!("../../../../tests/reference/must_sugar.csv"));
    let mut most: f64 = 0.0;
    for row in &table {
        let as_sucrose = at_20(row.number(0), Scale::RefractometerBrix);
        assert!(says(&as_sucrose, "nothing has fermented") && says(&as_sucrose, "0.002"));
        let heavier = row.number(2) - extract::density_20c(sg(as_sucrose.sg_20_20)) / 1_000.0;
        assert!(0.0 < heavier && heavier <= 0.002, "{heavier} at {} %", row.number(0));
        most = most.max(heavier);
    }
    assert!(most > 0.001, "{most}");
    println!("must_sugar.csv: at most {most:.5} kg/L heavier than sucrose");
}

#[test]
fn what_is_from_memory_or_an_approximation_is_said_of_every_reading() {
    assert!(says(&at_20(11.0, Scale::Baume145), "from memory"));
    assert!(says(&at_20(19.0, Scale::Kmw), "statutory table"));
    assert!(says(&at_calibration(1.05, Scale::Sg60_60).unwrap(), "60 °F"));
    for scale in [Scale::Sg20_20, Scale::Plato, Scale::Brix, Scale::Oechsle] {
        let plain = at_20(on(scale, 1.05), scale);
        assert!(plain.notes.is_empty(), "{:?}", plain.notes);
    }
}
