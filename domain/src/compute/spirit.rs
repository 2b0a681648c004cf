//! Strength of ethanol-water mixtures by OIML R 22: density, dilution, blends, concentrations per pure alcohol.

use serde_json::Value;

use super::{Calculation, Fault, Field, Found, Given, member};
use crate::densimetry::solve::rising_root;
use crate::densimetry::{Celsius, MassFraction, ethanol_water};

const METHOD: &str = "OIML R 22";
const STRENGTH: &str = "% vol at 20 °C, 0 to 100";

const VAPOUR: &str = "ethanol vapour ignites from sparks and flames: none near it, earthed vessels, ventilation; local rules prevail";

pub(super) const ALL: &[Calculation] = &[
    Calculation {
        name: "alcoholic_strength",
        meaning: "the strength of a spirit from its density",
        fields: &[
            Field { name: "density_kg_m3", takes: "density in kg/m³" },
            Field { name: "temperature_c", takes: "at this temperature, -20 to 40 °C" },
        ],
        gives: &["mass_fraction", "abv_20c"],
        source: METHOD,
        run: alcoholic_strength,
    },
    Calculation {
        name: "strength_convert",
        meaning: "one strength on the other scales",
        fields: &[
            Field { name: "abv_20c", takes: STRENGTH },
            Field { name: "mass_fraction", takes: "grams of ethanol per gram, 0 to 1" },
            Field { name: "us_proof", takes: "degrees of proof at 60 °F, 0 to 200" },
        ],
        gives: &["abv_20c", "mass_fraction", "us_proof", "density_20c_kg_m3", "ethanol_g_l"],
        source: METHOD,
        run: strength_convert,
    },
    Calculation {
        name: "pure_alcohol",
        meaning: "litres of pure alcohol at 20 °C in a steel tank, or in what was weighed in air",
        fields: &[
            Field { name: "abv_20c", takes: STRENGTH },
            Field { name: "temperature_c", takes: "the spirit's temperature, -20 to 40 °C" },
            Field {
                name: "volume_l",
                takes: "litres as the tank, calibrated at 20 °C, indicates them",
            },
            Field { name: "weight_kg", takes: "kilograms weighed in air" },
        ],
        gives: &["pure_alcohol_l", "volume_20c_l"],
        source: "OIML R 22, tables XI and XII",
        run: pure_alcohol,
    },
    Calculation {
        name: "dilution",
        meaning: "water to bring a spirit to a lower strength",
        fields: &[
            Field { name: "volume_l", takes: "litres at 20 °C" },
            Field { name: "from_abv", takes: STRENGTH },
            Field { name: "to_abv", takes: STRENGTH },
        ],
        gives: &["final_volume_l", "water_l", "contraction_l"],
        source: METHOD,
        run: dilution,
    },
    Calculation {
        name: "blend",
        meaning: "volume and strength of spirits put together",
        fields: &[Field { name: "parts", takes: "a list of {volume_l, abv}, at 20 °C" }],
        gives: &["volume_l", "abv_20c", "contraction_l", "pure_alcohol_l"],
        source: METHOD,
        run: blend,
    },
    Calculation {
        name: "contaminant_convert",
        meaning: "one concentration in a spirit in the units of the laws",
        fields: &[
            Field { name: "value", takes: "a number, not below zero" },
            Field { name: "unit", takes: "ug/kg, ug/L, mg/L or g/hL_pure_alcohol" },
            Field { name: "abv_20c", takes: STRENGTH },
        ],
        gives: &["ug_per_kg", "ug_per_l", "mg_per_l", "g_per_hl_pure_alcohol"],
        source: METHOD,
        run: contaminant_convert,
    },
];

/// kg/m³ at 20 °C.
fn density_20c(fraction: f64) -> f64 {
    ethanol_water::density(MassFraction(fraction.clamp(0.0, 1.0)), Celsius::TWENTY)
        .unwrap_or(f64::NAN)
}

/// % vol at 20 °C of a mass fraction.
fn by_volume(fraction: f64) -> f64 {
    100.0 * fraction * density_20c(fraction) / density_20c(1.0)
}

fn fraction_of_abv(abv: f64) -> f64 {
    rising_root(0.0, 1.0, |fraction| by_volume(fraction) - abv)
}

fn abv(given: &Given<'_>, name: &str) -> Result<f64, Fault> {
    given.within(name, 0.0, 100.0)
}

fn alcoholic_strength(given: &Given<'_>) -> Result<Found, Fault> {
    let density = given.number("density_kg_m3")?;
    let at = Celsius(given.within("temperature_c", -20.0, 40.0)?);
    let of = |fraction: f64| ethanol_water::density(MassFraction(fraction), at).unwrap_or(f64::NAN);
    let (lightest, heaviest) = (of(1.0), of(0.0));
    if !(lightest..=heaviest).contains(&density) {
        let detail = format!(
            "{density} is outside {lightest:.2} to {heaviest:.2}, from pure ethanol to water at {} °C",
            at.0
        );
        return Err(Fault::at("density_kg_m3", detail));
    }
    let fraction = rising_root(0.0, 1.0, |fraction| density - of(fraction));
    Ok(Found::by("OIML R 22, solved for the mass fraction")
        .number("mass_fraction", fraction)
        .number("abv_20c", by_volume(fraction))
        .note("of ethanol and water alone: sugar and other solids make it read too weak"))
}

/// Degrees of proof of a mass fraction: twice the volume per cent at 60 °F.
fn us_proof(fraction: f64) -> f64 {
    let of = |fraction: f64| {
        let fraction = MassFraction(fraction.clamp(0.0, 1.0));
        ethanol_water::density(fraction, Celsius::SIXTY_FAHRENHEIT).unwrap_or(f64::NAN)
    };
    200.0 * fraction * of(fraction) / of(1.0)
}

fn strength_convert(given: &Given<'_>) -> Result<Found, Fault> {
    let (name, _) = given.one_of(&["abv_20c", "mass_fraction", "us_proof"])?;
    let fraction = match name {
        "abv_20c" => fraction_of_abv(abv(given, name)?),
        "us_proof" => {
            let proof = given.within(name, 0.0, 200.0)?;
            rising_root(0.0, 1.0, |fraction| us_proof(fraction) - proof)
        }
        _ => given.within(name, 0.0, 1.0)?,
    };
    Ok(Found::by("OIML R 22; proof at 60 °F by the same formula")
        .number("abv_20c", by_volume(fraction))
        .number("mass_fraction", fraction)
        .number("us_proof", us_proof(fraction))
        .number("density_20c_kg_m3", density_20c(fraction))
        .number("ethanol_g_l", fraction * density_20c(fraction))
        .note("for duty the statutory tables prevail"))
}

/// Expansion of a steel tank, per K (OIML R 22, table XI).
const STEEL: f64 = 36e-6;
/// kg/m³ of air, and of the weights that a balance is adjusted with.
const AIR: f64 = 1.2;
const WEIGHTS: f64 = 8_000.0;

fn pure_alcohol(given: &Given<'_>) -> Result<Found, Fault> {
    let fraction = fraction_of_abv(abv(given, "abv_20c")?);
    let celsius = given.within("temperature_c", -20.0, 40.0)?;
    let density = ethanol_water::density(MassFraction(fraction), Celsius(celsius))
        .map_err(|error| Fault::at("temperature_c", error))?;
    let (name, amount) = given.one_of(&["volume_l", "weight_kg"])?;
    if amount < 0.0 {
        return Err(Fault::at(name, "give an amount not below zero"));
    }
    let (kilograms, method) = if name == "volume_l" {
        let litres = amount * (1.0 + STEEL * (celsius - 20.0));
        (litres * density / 1_000.0, "OIML R 22, table XI: steel tank, 36e-6 per K")
    } else {
        let buoyancy = 1.0 - AIR * (1.0 / WEIGHTS - 1.0 / density);
        (amount * buoyancy, "OIML R 22, table XII: weighed in air of 1.2 kg/m³")
    };
    Ok(Found::by(method)
        .number("pure_alcohol_l", kilograms * fraction / density_20c(1.0) * 1_000.0)
        .number("volume_20c_l", kilograms / density_20c(fraction) * 1_000.0)
        .note("ethanol and water alone; for duty the statutory tables prevail"))
}

fn dilution(given: &Given<'_>) -> Result<Found, Fault> {
    let volume = given.within("volume_l", 0.0, 1e9)?;
    let (from, to) = (abv(given, "from_abv")?, abv(given, "to_abv")?);
    if to <= 0.0 || to > from {
        return Err(Fault::at("to_abv", format!("give a strength above 0 and up to {from} % vol")));
    }
    let diluted = volume * from / to;
    let [before, after] = [from, to].map(|strength| density_20c(fraction_of_abv(strength)));
    let water = (diluted * after - volume * before) / density_20c(0.0);
    Ok(Found::by(METHOD)
        .number("final_volume_l", diluted)
        .number("water_l", water)
        .number("contraction_l", volume + water - diluted)
        .note("volumes at 20 °C; measure the strength after mixing")
        .note(VAPOUR))
}

fn blend(given: &Given<'_>) -> Result<Found, Fault> {
    let (mut volume, mut mass, mut ethanol) = (0.0, 0.0, 0.0);
    for (index, part) in given.items("parts")?.iter().enumerate() {
        let at = format!("parts/{index}");
        let (litres, strength) = (member(part, &at, "volume_l")?, member(part, &at, "abv")?);
        let only = |part: &Value| part.as_object().is_some_and(|members| members.len() == 2);
        if litres < 0.0 || !(0.0..=100.0).contains(&strength) || !only(part) {
            return Err(Fault::at(&at, "give volume_l, not below zero, and abv, 0 to 100"));
        }
        volume += litres;
        mass += litres * density_20c(fraction_of_abv(strength));
        ethanol += litres * strength / 100.0 * density_20c(1.0);
    }
    if mass <= 0.0 {
        return Err(Fault::at("parts", "give a volume above zero"));
    }
    let fraction = ethanol / mass;
    let blended = mass / density_20c(fraction);
    Ok(Found::by(METHOD)
        .number("volume_l", blended)
        .number("abv_20c", by_volume(fraction))
        .number("contraction_l", volume - blended)
        .number("pure_alcohol_l", ethanol / density_20c(1.0))
        .note("volumes at 20 °C, ethanol and water alone; measure the strength after mixing")
        .note(VAPOUR))
}

fn contaminant_convert(given: &Given<'_>) -> Result<Found, Fault> {
    let value = given.within("value", 0.0, 1e12)?;
    let strength = abv(given, "abv_20c")?;
    let kg_per_l = density_20c(fraction_of_abv(strength)) / 1_000.0;
    // 1 g in a hectolitre of pure alcohol is 10 mg in a litre of it.
    let per_pure = 10.0 * strength / 100.0;
    let mg_per_l = match given.text("unit")? {
        "mg/L" => value,
        "ug/L" => value / 1_000.0,
        "ug/kg" => value * kg_per_l / 1_000.0,
        "g/hL_pure_alcohol" if strength > 0.0 => value * per_pure,
        "g/hL_pure_alcohol" => {
            return Err(Fault::at("abv_20c", "per pure alcohol there must be some alcohol"));
        }
        _ => return Err(given.fault("unit", "unknown unit")),
    };
    let found = Found::by("OIML R 22 density at 20 °C")
        .number("ug_per_kg", mg_per_l * 1_000.0 / kg_per_l)
        .number("ug_per_l", mg_per_l * 1_000.0)
        .number("mg_per_l", mg_per_l);
    Ok(if strength > 0.0 {
        found.number("g_per_hl_pure_alcohol", mg_per_l / per_pure)
    } else {
        found
            .member("g_per_hl_pure_alcohol", Value::Null)
            .note("without alcohol there is no concentration per pure alcohol")
    })
}
