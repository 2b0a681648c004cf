//! Densities, gravities, extract and the alcohol between two gravities.

use super::{Calculation, Fault, Field, Found, Given};
use crate::densimetry::alcohol::{OriginalGravity, PresentGravity, expected_alcohol};
use crate::densimetry::balling::{
    self, AlcoholByMass, ApparentExtract, OriginalExtract, RealExtract,
};
use crate::densimetry::{
    Celsius, MassFraction, Scale, SpecificGravity, correct, ethanol_water, extract, refractometer,
    sucrose, water,
};

const TEMPERATURE: Field =
    Field { name: "temperature_c", takes: "the liquid's temperature in °C" };
const GRAVITY: &str = "specific gravity 20/20 °C, in air, 0.7 to 1.6";
const EXTRACT: &str = "grams in 100 g, -20 to 70";

pub(super) const ALL: &[Calculation] = &[
    Calculation {
        name: "water_density",
        meaning: "the density of water",
        fields: &[TEMPERATURE],
        gives: &["density_kg_m3"],
        source: "CIPM 2001 to 40 °C, Kell with ITS-90 coefficients above",
        run: water_density,
    },
    Calculation {
        name: "ethanol_water_density",
        meaning: "the density of an ethanol-water mixture",
        fields: &[
            Field { name: "mass_fraction", takes: "grams of ethanol per gram, 0 to 1" },
            TEMPERATURE,
        ],
        gives: &["density_kg_m3"],
        source: "OIML R 22",
        run: ethanol_water_density,
    },
    Calculation {
        name: "sucrose_density",
        meaning: "the density of a sucrose solution",
        fields: &[
            Field { name: "mass_fraction", takes: "grams of sucrose per gram, 0 to 0.7" },
            TEMPERATURE,
        ],
        gives: &["density_kg_m3", "g_per_l"],
        source: "SPS-4 on Kell's water",
        run: sucrose_density,
    },
    Calculation {
        name: "extract",
        meaning: "one gravity on the other scales",
        fields: &[
            Field { name: "sg_20_20", takes: GRAVITY },
            Field { name: "plato", takes: EXTRACT },
            Field { name: "brix", takes: EXTRACT },
        ],
        gives: &[
            "sg_20_20",
            "plato",
            "brix",
            "density_20c_kg_m3",
            "extract_g_l",
            "oechsle",
            "baume_145",
        ],
        source: "ASBC cubic (Plato), NBS cubic (Brix)",
        run: scales,
    },
    Calculation {
        name: "hydrometer",
        meaning: "a hydrometer reading at the temperature of its scale",
        fields: &[
            Field { name: "reading", takes: "as the scale shows it" },
            Field {
                name: "scale",
                takes: "a scale of the ledger, such as brix, plato, sg_20_20, sg_60_60",
            },
            TEMPERATURE,
        ],
        gives: &["corrected", "correction"],
        source: "sucrose densities of SPS-4, glass 25e-6 per K",
        run: hydrometer,
    },
    Calculation {
        name: "alcohol_by_gravity",
        meaning: "the alcohol made between two gravities of beer or wash",
        fields: &[
            Field { name: "original_sg", takes: GRAVITY },
            Field { name: "present_sg", takes: GRAVITY },
        ],
        gives: &[
            "abw",
            "abv_20c",
            "real_extract",
            "apparent_attenuation_percent",
            "real_attenuation_percent",
        ],
        source: "Balling with Tabarié, solved",
        run: alcohol_by_gravity,
    },
    Calculation {
        name: "balling",
        meaning: "original, real and apparent extract and alcohol, by Balling",
        fields: &[
            Field { name: "original_extract", takes: "degrees Plato" },
            Field { name: "apparent_extract", takes: "degrees Plato" },
            Field { name: "real_extract", takes: "% mass" },
            Field { name: "abw", takes: "alcohol, % mass" },
        ],
        gives: &[
            "original_extract",
            "real_extract",
            "real_extract_constant_form",
            "abw",
            "apparent_attenuation_percent",
            "real_attenuation_percent",
            "alcohol_factor",
        ],
        source: "Balling; real attenuation by ASBC",
        run: by_balling,
    },
    Calculation {
        name: "refractive_index",
        meaning: "a refractive index as sucrose, of unfermented liquid",
        fields: &[Field { name: "n_d20", takes: "at 20 °C and 589.3 nm, 1.333 to 1.5" }],
        gives: &["sucrose_percent"],
        source: "our fit to table II of OIV-MA-AS2-02 from 10 to 30 %; outside, a polynomial of degree 5",
        run: refractive_index,
    },
    Calculation {
        name: "must_sugar",
        meaning: "the sugar of grape must from a refractometer",
        fields: &[Field { name: "sucrose_percent", takes: "% mass of sucrose, 10 to 30" }],
        gives: &["density_kg_l", "sugar_g_l", "sugar_g_kg", "potential_abv_1683"],
        source: "our fits to table II of OIV-MA-AS2-02",
        run: must_sugar,
    },
    Calculation {
        name: "uk_beer_estimate",
        meaning: "alcohol of beer by the United Kingdom's factors",
        fields: &[Field {
            name: "original_minus_present",
            takes: "degrees of gravity (1000 SG), 0 to 100.7",
        }],
        gives: &["factor", "abv_rounded_down"],
        source: "HMRC Notice 226, sections 30.2 and 30.3, as quoted",
        run: uk_beer_estimate,
    },
];

/// A gravity of the input.
fn sg(given: &Given<'_>, name: &str) -> Result<SpecificGravity, Fault> {
    SpecificGravity::new(given.number(name)?).map_err(|error| Fault::at(name, error))
}

fn water_density(given: &Given<'_>) -> Result<Found, Fault> {
    let at = Celsius(given.number("temperature_c")?);
    let found = water::density(at).map_err(|error| Fault::at("temperature_c", error))?;
    Ok(Found::by(found.method).number("density_kg_m3", found.kg_m3))
}

fn ethanol_water_density(given: &Given<'_>) -> Result<Found, Fault> {
    let fraction = MassFraction(given.within("mass_fraction", 0.0, 1.0)?);
    let at = Celsius(given.number("temperature_c")?);
    let density =
        ethanol_water::density(fraction, at).map_err(|error| Fault::at("temperature_c", error))?;
    Ok(Found::by("OIML R 22")
        .number("density_kg_m3", density)
        .note_if(at.0 < 0.0, "whether the mixture freezes is not checked"))
}

fn sucrose_density(given: &Given<'_>) -> Result<Found, Fault> {
    let fraction = MassFraction(given.within("mass_fraction", 0.0, 0.7)?);
    let at = Celsius(given.number("temperature_c")?);
    let density =
        sucrose::density(fraction, at).map_err(|error| Fault::at("temperature_c", error))?;
    Ok(Found::by("SPS-4 on Kell's water with ITS-90 coefficients")
        .number("density_kg_m3", density)
        .number("g_per_l", density * fraction.0))
}

fn scales(given: &Given<'_>) -> Result<Found, Fault> {
    let (name, value) = given.one_of(&["sg_20_20", "plato", "brix"])?;
    let gravity = match name {
        "plato" => extract::gravity_of_plato(value),
        "brix" => extract::gravity_of_brix(value),
        _ => SpecificGravity::new(value),
    }
    .map_err(|error| Fault::at(name, error))?;
    let plato = extract::plato(gravity);
    let fitted = plato <= extract::PLATO_FITTED_TO;
    let found = Found::by("ASBC cubic (Plato), NBS cubic (Brix); each inverse uses its own cubic")
        .number("sg_20_20", gravity.get());
    let found = if fitted {
        found.number("plato", plato)
    } else {
        found
            .member("plato", serde_json::Value::Null)
            .note("the ASBC cubic is meant up to 25 degrees Plato")
    };
    Ok(found
        .number("brix", extract::brix(gravity))
        .number("density_20c_kg_m3", extract::density_20c(gravity))
        .number("extract_g_l", extract::extract_g_l(gravity))
        .number("oechsle", extract::oechsle(gravity))
        .number("baume_145", extract::baume_145(gravity))
        .note_if(gravity.get() < 1.0, "lighter than water: the extract is apparent and negative")
        .note_if(
            extract::brix(gravity) > extract::BRIX_FITTED_TO,
            "the NBS cubic is meant up to 40 Brix",
        ))
}

fn hydrometer(given: &Given<'_>) -> Result<Found, Fault> {
    let (reading, scale) = (given.number("reading")?, given.text("scale")?);
    let celsius = given.within("temperature_c", 0.0, 80.0)?;
    let known = Scale::parse(scale).map_err(|error| Fault::at("scale", error))?;
    let found = correct(reading, known, celsius).map_err(|error| Fault::at("reading", error))?;
    let mut result = Found::by(found.method)
        .number("corrected", found.corrected)
        .number("correction", found.correction);
    result.notes = found.notes.into_iter().map(str::to_owned).collect();
    Ok(result)
}

fn alcohol_by_gravity(given: &Given<'_>) -> Result<Found, Fault> {
    let (original, present) = (sg(given, "original_sg")?, sg(given, "present_sg")?);
    let estimate = expected_alcohol(OriginalGravity(original), PresentGravity(present))
        .map_err(|error| Fault::at("present_sg", error))?;
    let mut found = Found::by(estimate.method)
        .number("abw", estimate.abw)
        .number("abv_20c", estimate.abv_20c)
        .number("real_extract", estimate.real_extract)
        .number("apparent_attenuation_percent", estimate.apparent_attenuation_percent)
        .number("real_attenuation_percent", estimate.real_attenuation_percent);
    found.notes = estimate.notes.iter().map(|note| (*note).to_owned()).collect();
    Ok(found)
}

fn by_balling(given: &Given<'_>) -> Result<Found, Fault> {
    let degrees = |name: &str| given.optional_within(name, -20.0, 70.0);
    let original = degrees("original_extract")?.map(OriginalExtract);
    let apparent = degrees("apparent_extract")?.map(ApparentExtract);
    let real = degrees("real_extract")?.map(RealExtract);
    let alcohol = given.optional_within("abw", 0.0, 50.0)?.map(AlcoholByMass);
    let (original, apparent, real) = match (original, apparent, real, alcohol) {
        (Some(original), Some(apparent), None, None) => {
            (original, apparent, balling::real_extract(original, apparent))
        }
        (Some(original), None, Some(real), None) => {
            (original, balling::apparent_extract(original, real), real)
        }
        (None, None, Some(real), Some(alcohol)) => {
            let original = balling::original_extract(alcohol, real);
            (original, balling::apparent_extract(original, real), real)
        }
        _ => {
            return Err(Fault::whole(
                "give original_extract with apparent_extract or real_extract, or abw with real_extract",
            ));
        }
    };
    Ok(Found::by("Balling, attenuation-quotient form; real attenuation by ASBC")
        .number("original_extract", original.0)
        .number("real_extract", real.0)
        .number(
            "real_extract_constant_form",
            balling::real_extract_constant_form(original, apparent).0,
        )
        .number("abw", balling::alcohol_by_mass(original, real).0)
        .number(
            "apparent_attenuation_percent",
            balling::apparent_attenuation_percent(original, apparent),
        )
        .number("real_attenuation_percent", balling::real_attenuation_percent(original, real))
        .number("alcohol_factor", balling::alcohol_factor(original)))
}

fn refractive_index(given: &Given<'_>) -> Result<Found, Fault> {
    let found = refractometer::sucrose_percent(given.number("n_d20")?)
        .map_err(|error| Fault::at("n_d20", error))?;
    Ok(Found::by(found.method)
        .number("sucrose_percent", found.percent)
        .note_if(found.note.is_some(), found.note.unwrap_or_default())
        .note("of unfermented liquid at 20 °C: alcohol makes it worthless"))
}

fn must_sugar(given: &Given<'_>) -> Result<Found, Fault> {
    let must = refractometer::must_sugar(given.number("sucrose_percent")?)
        .map_err(|error| Fault::at("sucrose_percent", error))?;
    Ok(Found::by(must.method)
        .number("density_kg_l", must.density_kg_l)
        .number("sugar_g_l", must.sugar_g_l)
        .number("sugar_g_kg", must.sugar_g_kg)
        .number("potential_abv_1683", must.potential_abv_1683)
        .note("of unfermented grape must at 20 °C"))
}

/// Up to so many degrees, this factor.
const UK_FACTORS: [(f64, f64); 11] = [
    (6.9, 0.125),
    (10.4, 0.126),
    (17.2, 0.127),
    (26.1, 0.128),
    (36.0, 0.129),
    (46.5, 0.130),
    (57.1, 0.131),
    (67.9, 0.132),
    (78.8, 0.133),
    (89.7, 0.134),
    (100.7, 0.135),
];

fn uk_beer_estimate(given: &Given<'_>) -> Result<Found, Fault> {
    let fallen = given.within("original_minus_present", 0.0, 100.7)?;
    let row = UK_FACTORS.iter().find(|(up_to, _)| fallen <= *up_to);
    let (_, factor) = row.ok_or_else(|| given.fault("original_minus_present", "no factor"))?;
    // A product such as 46.0 × 0.13 = 5.98 must not fall to the tenth below by its last binary digit.
    let abv = (fallen * factor * 10.0 + 1e-9).floor() / 10.0;
    Ok(Found::by("HMRC Notice 226, sections 30.2 and 30.3, as quoted in public threads")
        .number("factor", *factor)
        .number("abv_rounded_down", abv)
        .note("guidance of the United Kingdom, no proof of strength"))
}
