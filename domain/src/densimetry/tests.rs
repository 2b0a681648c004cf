//! The formulas against every row of the published tables, and against each other.
//!
//! `cargo test -p domain densimetry -- --nocapture` prints the rows checked and the worst deviation of each table.

use super::alcohol::{OriginalGravity, PresentGravity};
use super::balling::{self, AlcoholByMass, ApparentExtract, OriginalExtract, RealExtract};
use super::*;

mod scales;

/// One row of a reference table, by column.
struct Row(Vec<&'static str>);

impl Row {
    fn number(&self, column: usize) -> f64 {
        self.0[column].parse().unwrap_or_else(|_| panic!("{:?} column {column}", self.0))
    }

    fn optional(&self, column: usize) -> Option<f64> {
        (!self.0[column].is_empty()).then(|| self.number(column))
    }
}

/// The data rows below the comments and the column names.
fn rows(table: &'static str) -> Vec<Row> {
    let lines = table.lines().filter(|line| !line.starts_with('#') && !line.is_empty());
    lines.skip(1).map(|line| Row(line.split(',').collect())).collect()
}

/// Counts the comparisons of one table and remembers the worst.
struct Held {
    table: &'static str,
    count: usize,
    worst: f64,
    worst_of_tolerance: f64,
}

impl Held {
    fn new(table: &'static str) -> Self {
        Self { table, count: 0, worst: 0.0, worst_of_tolerance: 0.0 }
    }

    fn compare(&mut self, what: &str, actual: f64, expected: f64, tolerance: f64) {
        let off = (actual - expected).abs();
        assert!(
            off <= tolerance,
            "{}: {what}: {actual} is not {expected} ± {tolerance}",
            self.table
        );
        self.count += 1;
        self.worst = self.worst.max(off);
        self.worst_of_tolerance = self.worst_of_tolerance.max(off / tolerance);
    }

    fn report(&self, rows: usize) {
        println!(
            "{}: {rows} rows, {} values, worst {:.2e}, {:.0} % of its tolerance",
            self.table,
            self.count,
            self.worst,
            100.0 * self.worst_of_tolerance
        );
        assert!(self.count >= rows, "{}: a row was not compared", self.table);
    }
}

fn sg(value: f64) -> SpecificGravity {
    SpecificGravity::new(value).unwrap()
}

fn alcohol(original: f64, present: f64) -> AlcoholEstimate {
    expected_alcohol(OriginalGravity(sg(original)), PresentGravity(sg(present))).unwrap()
}

/// What a scale shows of a gravity 20/20 at 20 °C; a scale of 60 °F about as much.
fn on(scale: Scale, gravity: f64) -> f64 {
    match scale {
        Scale::Sg20_20 | Scale::Sg60_60 => gravity,
        Scale::Plato => extract::plato(sg(gravity)),
        Scale::Brix | Scale::RefractometerBrix => extract::brix(sg(gravity)),
        Scale::Oechsle => extract::oechsle(sg(gravity)),
        Scale::Kmw => extract::kmw(sg(gravity)),
        Scale::Baume145 => extract::baume_145(sg(gravity)),
    }
}

fn close(actual: f64, expected: f64, tolerance: f64) {
    assert!((actual - expected).abs() <= tolerance, "{actual} is not {expected}");
}

#[test]
fn both_water_formulas_agree_with_iapws_95() {
    let table = rows(include_str!("../../../tests/reference/water_density.csv"));
    let mut kell = Held::new("water_density.csv, Kell-90");
    let mut used = Held::new("water_density.csv, as used");
    for row in &table {
        let at = Celsius(row.number(0));
        kell.compare("kell", water::kell_90(at), row.number(1), row.number(2));
        let tolerance = if at.0 <= 40.0 { 0.002 } else { row.number(2) };
        let density = water::density(at).unwrap();
        used.compare(density.method, density.kg_m3, row.number(1), tolerance);
    }
    kell.report(table.len());
    used.report(table.len());
}

#[test]
fn sucrose_densities_agree_with_the_plato_table_and_the_formula_rows() {
    let table = rows(include_str!("../../../tests/reference/sucrose_density.csv"));
    let mut published = Held::new("sucrose_density.csv, Plato");
    let mut formula = Held::new("sucrose_density.csv, SPS-4");
    let mut counts = (0, 0);
    for row in &table {
        let fraction = MassFraction(row.number(0) / 100.0);
        let density = sucrose::density(fraction, Celsius(row.number(1))).unwrap();
        let held = if row.0[5].starts_with("published") {
            counts.0 += 1;
            &mut published
        } else {
            counts.1 += 1;
            &mut formula
        };
        held.compare("density", density, row.number(2), row.number(4));
        if let Some(g_l) = row.optional(3) {
            held.compare("g/L", fraction.0 * density, g_l, row.number(4));
        }
    }
    published.report(counts.0);
    formula.report(counts.1);
}

#[test]
fn the_extract_cubics_agree_with_the_plato_table_and_their_own_rows() {
    let table = rows(include_str!("../../../tests/reference/plato_sg.csv"));
    let mut held = Held::new("plato_sg.csv");
    for row in &table {
        let (gravity, tolerance) = (sg(row.number(0)), row.number(5));
        if let Some(plato) = row.optional(1) {
            held.compare("plato", extract::plato(gravity), plato, tolerance);
        }
        held.compare("brix", extract::brix(gravity), row.number(2), tolerance);
        if let Some(baume) = row.optional(4) {
            held.compare("baume", extract::baume_145(gravity), baume, tolerance);
        }
    }
    held.report(table.len());
}

#[test]
fn hydrometer_corrections_agree_with_the_table_on_both_extract_scales() {
    let table = rows(include_str!("../../../tests/reference/hydrometer_correction.csv"));
    let mut held = Held::new("hydrometer_correction.csv");
    for row in &table {
        for scale in [Scale::Brix, Scale::Plato] {
            let corrected = correct(row.number(0), scale, row.number(1)).unwrap();
            held.compare(scale.name(), corrected.correction, row.number(2), row.number(3));
        }
    }
    held.report(table.len());
}

#[test]
fn ethanol_water_densities_agree_with_every_source() {
    let table = rows(include_str!("../../../tests/reference/ethanol_water_density.csv"));
    let mut published = Held::new("ethanol_water_density.csv, published and library");
    let mut formula = Held::new("ethanol_water_density.csv, R 22");
    let mut counts = (0, 0);
    for row in &table {
        let ethanol = MassFraction(row.number(0) / 100.0);
        let density = ethanol_water::density(ethanol, Celsius(row.number(1))).unwrap();
        let held = if row.0[4].starts_with("formula") {
            counts.1 += 1;
            &mut formula
        } else {
            counts.0 += 1;
            &mut published
        };
        held.compare("density", density, row.number(2), row.number(3));
    }
    published.report(counts.0);
    formula.report(counts.1);
}

#[test]
fn ballings_relations_agree_with_every_row() {
    let table = rows(include_str!("../../../tests/reference/balling.csv"));
    let mut published = Held::new("balling.csv, published");
    let mut formula = Held::new("balling.csv, formula");
    let mut counts = (0, 0);
    for row in &table {
        let value = balling_of(row);
        let held = if row.0[7].contains("published") {
            counts.0 += 1;
            &mut published
        } else {
            counts.1 += 1;
            &mut formula
        };
        held.compare(row.0[0], value, row.number(4), row.number(6));
    }
    published.report(counts.0);
    formula.report(counts.1);
}

fn balling_of(row: &Row) -> f64 {
    let original = OriginalExtract(row.number(1));
    let second = row.optional(2).unwrap_or(f64::NAN);
    match row.0[0] {
        "balling_alcohol_factor" => balling::alcohol_factor(original),
        "balling_oe_from_abw_re" => {
            balling::original_extract(AlcoholByMass(row.number(1)), RealExtract(second)).0
        }
        "real_extract_q" => balling::real_extract(original, ApparentExtract(second)).0,
        "real_extract_const" => {
            balling::real_extract_constant_form(original, ApparentExtract(second)).0
        }
        "abw_from_oe_re" => balling::alcohol_by_mass(original, RealExtract(second)).0,
        "adf_pct" => balling::apparent_attenuation_percent(original, ApparentExtract(second)),
        "rdf_asbc_pct" => balling::real_attenuation_percent(original, RealExtract(second)),
        kind => panic!("unknown kind {kind}"),
    }
}

/// Worked values: 12 and 18 °P with the constant form, inverse exact.
#[test]
fn balling_is_inverted_exactly() {
    for (oe, ae, re, abw, rdf) in [
        (12.0, 2.5, 4.2176, 4.014_609_083, 66.296_409_5),
        (18.0, 3.2, 5.875_84, 6.467_839_939, 69.462_922_2),
    ] {
        let original = OriginalExtract(oe);
        let real = balling::real_extract_constant_form(original, ApparentExtract(ae));
        close(real.0, re, 1e-6);
        let made = balling::alcohol_by_mass(original, real);
        close(made.0, abw, 1e-6);
        close(balling::original_extract(made, real).0, oe, 1e-9);
        close(balling::real_extract_beside(original, made).0, real.0, 1e-9);
        close(balling::real_attenuation_percent(original, real), rdf, 1e-6);
        let by_quotient = balling::real_extract(original, ApparentExtract(ae));
        close(balling::apparent_extract(original, by_quotient).0, ae, 1e-9);
    }
}

/// The exact column of the comparison of methods (own solution of Balling with Tabarié).
#[test]
fn expected_alcohol_agrees_with_its_table() {
    for (og, fg, abw, abv) in [
        (1.040, 1.010, 3.068, 3.92),
        (1.048, 1.012, 3.693, 4.73),
        (1.060, 1.012, 4.958, 6.35),
        (1.080, 1.016, 6.661, 8.56),
    ] {
        let estimate = alcohol(og, fg);
        close(estimate.abw, abw, 0.000_6);
        close(estimate.abv_20c, abv, 0.005_5);
    }
}

/// Three batches of the demo; their expected ends are rounded to half a degree of gravity.
#[test]
fn expected_alcohol_and_final_gravity_fit_the_demo_batches() {
    close(alcohol(1.0940, 0.9920).abv_20c, 13.7, 0.05);
    close(alcohol(1.0535, 1.0135).abv_20c, 5.27, 0.005);
    close(alcohol(1.0685, 1.0155).abv_20c, 7.04, 0.005);
    for (og, abv, fg) in [(1.0535, 5.26, 1.0135), (1.0685, 7.02, 1.0155)] {
        let last = expected_final_gravity(OriginalGravity(sg(og)), abv).unwrap();
        close(last.get(), fg, 0.000_25);
        close(alcohol(og, last.get()).abv_20c, abv, 1e-9);
    }
}

#[test]
fn nothing_fermented_is_no_alcohol() {
    close(alcohol(1.050, 1.050).abv_20c, 0.0, 1e-9);
    let last = expected_final_gravity(OriginalGravity(sg(1.05)), 0.0).unwrap();
    close(last.get(), 1.05, 1e-9);
}

#[test]
fn impossible_gravities_are_refused_with_what_to_do() {
    let swapped =
        expected_alcohol(OriginalGravity(sg(1.01)), PresentGravity(sg(1.05))).unwrap_err();
    assert!(swapped.to_string().contains("exchanged"), "{swapped}");
    let too_light =
        expected_alcohol(OriginalGravity(sg(1.04)), PresentGravity(sg(0.98))).unwrap_err();
    assert!(matches!(too_light, DensimetryError::MoreThanTheExtract { .. }), "{too_light}");
    let water = expected_alcohol(OriginalGravity(sg(1.0)), PresentGravity(sg(1.0))).unwrap_err();
    assert!(matches!(water, DensimetryError::OutOfRange { .. }), "{water}");
    let original = OriginalGravity(sg(1.05));
    assert!(expected_final_gravity(original, -0.1).is_err());
    assert!(expected_final_gravity(original, 9.0).is_err());
    assert!(expected_final_gravity(original, f64::NAN).is_err());
}

#[test]
fn each_cubic_is_undone_by_its_own_inverse() {
    for permille in 900..1_180 {
        let gravity = sg(f64::from(permille) / 1_000.0);
        let by_brix = extract::gravity_of_brix(extract::brix(gravity).max(-20.0)).unwrap();
        let by_plato = extract::gravity_of_plato(extract::plato(gravity).max(-20.0)).unwrap();
        if extract::brix(gravity) > -20.0 {
            close(by_brix.get(), gravity.get(), 1e-12);
            close(by_plato.get(), gravity.get(), 1e-12);
        }
    }
}

#[test]
fn dry_wine_has_a_negative_apparent_extract_and_a_note() {
    let wine = correct(0.992, Scale::Sg20_20, 20.0).unwrap();
    close(wine.apparent_extract, -2.09, 0.005);
    close(wine.correction, 0.0, 1e-12);
    assert!(wine.notes.iter().any(|note| note.contains("negative")), "{:?}", wine.notes);
}

/// Regression values of the model (SG 1.0500), for a 20 °C and a 60 °F scale.
#[test]
fn gravity_scales_are_corrected_by_the_model() {
    let add = |calibration, at| corrected_by(1.05, calibration, Celsius(at)) - 1.05;
    for (at, correction) in [(10.0, -0.00188), (25.0, 0.00131), (30.0, 0.00284), (40.0, 0.00651)] {
        close(add(Celsius::TWENTY, at), correction, 2e-5);
    }
    for (at, correction) in [(10.0, -0.00092), (25.0, 0.00230), (30.0, 0.00384), (40.0, 0.00752)] {
        close(add(Celsius::SIXTY_FAHRENHEIT, at), correction, 2e-5);
    }
    close(correct(12.0, Scale::Brix, 27.0).unwrap().correction, 0.45, 0.005);
}

fn corrected_by(reading: f64, calibration: Celsius, at: Celsius) -> f64 {
    hydrometer::corrected_gravity(sg(reading), calibration, at).unwrap()
}

#[test]
fn the_first_reading_of_the_demo_wash_is_corrected_from_27_degrees() {
    let wash = correct(1.0665, Scale::Sg20_20, 27.0).unwrap();
    close(wash.sg_20_20, 1.0685, 5e-5);
    close(wash.correction, 0.0020, 5e-5);
    assert!(wash.notes.iter().any(|note| note.contains("estimate")), "{:?}", wash.notes);
    assert!(correct(1.0665, Scale::Sg20_20, 24.0).unwrap().notes.is_empty());
}

/// The Plato and the Brix scale show the same solution, so their gravities agree as far as the two cubics do.
#[test]
fn the_three_scales_agree_on_one_liquid() {
    let by_gravity = correct(1.05, Scale::Sg20_20, 26.0).unwrap();
    let brix = extract::brix(sg(1.05));
    let by_brix = correct(brix, Scale::Brix, 26.0).unwrap();
    let by_plato = correct(brix, Scale::Plato, 26.0).unwrap();
    close(by_brix.sg_20_20, by_gravity.sg_20_20, 3e-5);
    close(by_plato.sg_20_20, by_brix.sg_20_20, 3e-5);
    close(by_brix.apparent_extract, by_brix.corrected, 1e-9);
}

#[test]
fn warmer_liquid_means_a_larger_correction() {
    for scale in Scale::all().filter(|scale| *scale != Scale::RefractometerBrix) {
        for gravity in [0.995, 1.0, 1.04, 1.1] {
            let reading = on(scale, gravity);
            if scale.admit(reading).is_err() {
                assert!(gravity < 1.0, "{} shows no {gravity}", scale.name());
                continue;
            }
            let at = |celsius: i32| correct(reading, scale, f64::from(celsius)).unwrap().correction;
            for celsius in 10..60 {
                assert!(at(celsius) < at(celsius + 1), "{} at {celsius}", scale.name());
            }
        }
    }
}

#[test]
fn readings_outside_every_scale_are_refused_with_what_to_do() {
    for (reading, scale, at) in [
        (0.69, Scale::Sg20_20, 20.0),
        (1.61, Scale::Sg20_20, 20.0),
        (f64::NAN, Scale::Sg20_20, 20.0),
        (71.0, Scale::Brix, 20.0),
        (-21.0, Scale::Plato, 20.0),
        (1.05, Scale::Sg20_20, -1.0),
        (1.05, Scale::Sg20_20, 81.0),
        (1.05, Scale::Sg20_20, f64::INFINITY),
    ] {
        let refused = correct(reading, scale, at).unwrap_err();
        let kind = matches!(
            refused,
            DensimetryError::OutOfRange { .. } | DensimetryError::OffScale { .. }
        );
        assert!(kind, "{refused}");
    }
    for scale in Scale::all() {
        let (least, most) = scale.range();
        for reading in [least - 0.01, most + 0.01, f64::NAN, f64::INFINITY] {
            let refused = correct(reading, scale, 20.0).unwrap_err().to_string();
            assert!(Scale::all().all(|each| refused.contains(each.name())), "{refused}");
            assert!(refused.contains("check"), "{refused}");
        }
    }
    let slip = correct(1050.0, Scale::Sg20_20, 20.0).unwrap_err().to_string();
    assert!(slip.starts_with("1050 sg_20_20 is outside 0.7 to 1.6: check"), "{slip}");
}

#[test]
fn what_the_sugar_model_does_not_cover_is_left_as_read_and_said_so() {
    let spirit = correct(0.80, Scale::Sg20_20, 25.0).unwrap();
    close(spirit.sg_20_20, 0.80, 0.0);
    assert!(spirit.notes.iter().any(|note| note.contains("not corrected")), "{:?}", spirit.notes);
    let syrup = correct(55.0, Scale::Plato, 20.0).unwrap();
    assert_eq!(syrup.notes.len(), 2, "{:?}", syrup.notes);
}

#[test]
fn every_scale_is_found_by_its_name() {
    for (position, scale) in Scale::all().enumerate() {
        assert_eq!(Scale::parse(scale.name()), Ok(scale));
        let (name, least, most) = scale::UNITS[position];
        assert_eq!((scale.name(), scale.range()), (name, (least, most)));
        assert!(!scale.meaning().is_empty() && !scale.sign().is_empty());
    }
    assert_eq!(Scale::all().count(), scale::UNITS.len());
    let unknown = Scale::parse("SG").unwrap_err().to_string();
    assert_eq!(
        unknown,
        "unknown scale \"SG\": use one of sg_20_20, sg_60_60, plato, brix, oechsle, kmw, baume_145, refractometer_brix"
    );
}

#[test]
fn densities_outside_their_formulas_are_refused() {
    assert!(water::density(Celsius(-0.1)).is_err());
    assert!(water::density(Celsius(100.1)).is_err());
    assert!(sucrose::density(MassFraction(0.71), Celsius::TWENTY).is_err());
    assert!(sucrose::density(MassFraction(12.0), Celsius::TWENTY).is_err());
    assert!(ethanol_water::density(MassFraction(-0.01), Celsius::TWENTY).is_err());
    assert!(ethanol_water::density(MassFraction(0.4), Celsius(41.0)).is_err());
}

/// OIML R 22: the coefficients A sum to the density of pure ethanol; ρ falls with strength at every temperature.
#[test]
fn spirit_gets_lighter_with_strength_everywhere() {
    close(ethanol_water::pure_ethanol_20c(), 789.239_12, 5e-6);
    for celsius in -20..=40 {
        let at = Celsius(f64::from(celsius));
        let density = |tenths: i32| {
            ethanol_water::density(MassFraction(f64::from(tenths) / 1_000.0), at).unwrap()
        };
        for tenths in 0..1_000 {
            assert!(density(tenths + 1) < density(tenths), "{tenths} at {celsius} °C");
        }
    }
}

#[test]
fn a_litre_of_must_holds_the_extract_that_its_gravity_says() {
    let must = sg(1.094);
    close(extract::density_20c(must), 1.094 * 998.2067 - 1.2 * 0.094, 1e-3);
    close(extract::extract_g_l(must), 0.22456 * extract::density_20c(must), 0.01);
    close(extract::oechsle(must), 94.0, 1e-9);
}
