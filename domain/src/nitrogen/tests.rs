//! The published worked values.

use super::*;

fn close(actual: f64, expected: f64, tolerance: f64) {
    assert!((actual - expected).abs() <= tolerance, "{actual} is not {expected}");
}

fn sugar(g_l: f64) -> SugarGramsPerLitre {
    SugarGramsPerLitre::new(g_l).unwrap()
}

/// IUPAC 2021 abridged atomic masses.
#[expect(clippy::many_single_char_names, reason = "the symbols of the elements")]
#[test]
fn the_nitrogen_fractions_follow_from_the_atomic_masses() {
    let (h, c, n, o, p, s) = (1.008, 12.011, 14.007, 15.999, 30.974, 32.06);
    let ammonium = n + 4.0 * h;
    let dap = 2.0 * ammonium + h + p + 4.0 * o;
    let sulfate = 2.0 * ammonium + s + 4.0 * o;
    let urea = c + o + 2.0 * (n + 2.0 * h);
    let arginine = 6.0 * c + 14.0 * h + 4.0 * n + 2.0 * o;
    let isoleucine = 6.0 * c + 13.0 * h + n + 2.0 * o;
    close(NITROGEN_IN_AMMONIUM_ION, n / ammonium, 5e-7);
    close(NITROGEN_IN_AMMONIA, n / (n + 3.0 * h), 5e-7);
    close(NITROGEN_IN_DIAMMONIUM_PHOSPHATE, 2.0 * n / dap, 5e-7);
    close(NITROGEN_IN_AMMONIUM_SULFATE, 2.0 * n / sulfate, 5e-7);
    close(NITROGEN_IN_UREA, 2.0 * n / urea, 5e-7);
    close(NITROGEN_IN_ARGININE, 4.0 * n / arginine, 5e-7);
    close(ASSIMILABLE_NITROGEN_IN_ARGININE, 3.0 * n / arginine, 5e-7);
    close(NITROGEN_IN_ISOLEUCINE, n / isoleucine, 5e-7);
}

#[test]
fn a_hundred_milligrams_of_dap_bring_twenty_one_of_nitrogen() {
    close(100.0 * NITROGEN_IN_DIAMMONIUM_PHOSPHATE, 21.2137, 1e-9);
    close(1.0 / NITROGEN_IN_DIAMMONIUM_PHOSPHATE, 4.713_929, 1e-5);
}

/// 8 lb/1000 US gal (27 CFR 24.246); pound 453.59237 g, gallon 3.785411784 L, exact.
#[test]
fn eight_pounds_of_dap_per_thousand_gallons_bring_203_mg_of_nitrogen() {
    let g_l = 8.0 * 453.592_37 / 3_785.411_784;
    close(g_l, 0.958_611, 5e-7);
    close(1_000.0 * g_l * NITROGEN_IN_DIAMMONIUM_PHOSPHATE, 203.357, 5e-4);
}

#[test]
fn ammonium_counts_the_same_however_it_is_stated() {
    close(Ammonium::Ion(18.039).nitrogen_mg_l(), 14.007, 1e-5);
    close(Ammonium::Ammonia(17.031).nitrogen_mg_l(), 14.007, 1e-5);
    close(Ammonium::Nitrogen(14.007).nitrogen_mg_l(), 14.007, 0.0);
}

#[test]
fn the_three_demo_musts_have_the_printed_yan() {
    let grape = Yan::from_parts(Ammonium::Ion(52.0), 98.0).unwrap();
    close(grape.ammonium_n_mg_l, 40.4, 0.05);
    close(grape.total_mg_l(), 138.4, 0.05);
    close(Yan::from_parts(Ammonium::Nitrogen(9.0), 62.0).unwrap().total_mg_l(), 71.0, 1e-12);
    close(Yan::from_parts(Ammonium::Nitrogen(13.0), 47.0).unwrap().total_mg_l(), 60.0, 1e-12);
}

#[test]
fn negative_absurd_and_undefined_nitrogen_is_refused_with_what_to_do() {
    let negative = Yan::from_parts(Ammonium::Nitrogen(-1.0), 10.0).unwrap_err();
    assert_eq!(
        negative.to_string(),
        "ammonium -1 mg N/L is outside 0 to 2000 mg N/L: check the number and its unit"
    );
    assert!(Yan::from_parts(Ammonium::Nitrogen(1.0), f64::NAN).is_err());
    assert!(Yan::from_parts(Ammonium::Ion(1.0), 2_001.0).is_err());
    assert!(SugarGramsPerLitre::new(f64::INFINITY).is_err());
}

/// Virginia Tech; Zoecklein, Gump and Fugelsang: 175 V with 0.05 mol/L, 28 V direct.
#[test]
fn formol_titration_gives_the_published_factors() {
    let diluted = Formol { titrant_ml: 1.2, titrant_mol_l: 0.05, aliquot_ml: 10.0, dilution: 2.5 };
    close(diluted.yan_mg_l().unwrap(), 210.0, 1e-9);
    let direct = Formol { titrant_ml: 1.0, titrant_mol_l: 0.1, aliquot_ml: 50.0, dilution: 1.0 };
    close(direct.yan_mg_l().unwrap(), 28.0, 1e-9);
    assert!(Formol { aliquot_ml: 0.0, ..direct }.yan_mg_l().is_err());
}

#[test]
fn each_demand_has_its_published_need_at_240_grams() {
    for (demand, need) in [(Demand::Low, 180.0), (Demand::Medium, 216.0), (Demand::High, 300.0)] {
        close(Need::of(sugar(240.0), demand).need_mg_l, need, 1e-9);
        assert_eq!(Demand::parse(demand.name()), Some(demand));
    }
    assert_eq!(Demand::parse("extreme"), None);
}

#[test]
fn the_sugar_of_24_brix_needs_238() {
    let must = SugarGramsPerLitre::of_brix(Brix(24.0), 1.101_01).unwrap();
    close(Need::of(must, Demand::Medium).need_mg_l, 238.247, 5e-4);
}

#[test]
fn the_floor_holds_where_sugar_is_low() {
    let wash = Need::of(sugar(119.3), Demand::Medium);
    close(wash.by_strain_mg_l, 107.4, 0.05);
    close(wash.need_mg_l, 140.0, 0.0);
    close(Need::of(sugar(0.0), Demand::High).need_mg_l, 140.0, 0.0);
}

/// Bisson and Butzke 2000.
#[test]
fn the_line_by_brix_goes_through_its_four_points_and_no_further() {
    for (brix, need) in [(21.0, 200.0), (23.0, 250.0), (25.0, 300.0), (27.0, 350.0)] {
        close(line_by_brix_mg_l(Brix(brix)).unwrap(), need, 1e-9);
    }
    assert_eq!(line_by_brix_mg_l(Brix(20.99)), None);
    assert_eq!(line_by_brix_mg_l(Brix(27.01)), None);
    assert_eq!(line_by_brix_mg_l(Brix(f64::NAN)), None);
}

#[test]
fn the_ceiling_is_the_larger_of_need_and_line() {
    let must = SugarGramsPerLitre::of_brix(Brix(22.456), 1.094).unwrap();
    close(must.get(), 246.1, 0.05);
    let need = Need::of(must, Demand::Medium);
    close(need.need_mg_l, 221.5, 0.05);
    close(need.ceiling_mg_l(Some(Brix(22.456))), 236.4, 0.05);
    close(need.ceiling_mg_l(Some(Brix(30.0))), 221.5, 0.05);
    close(need.ceiling_mg_l(None), 221.5, 0.05);
    let hungry = Need::of(must, Demand::High);
    close(hungry.ceiling_mg_l(Some(Brix(22.456))), hungry.need_mg_l, 0.0);
}
