//! Sulfur dioxide, heat and gas of fermentation, storage, molar masses.

use serde_json::json;

use crate::checks::cautions;

use super::{Calculation, Fault, Field, Found, Given, member};

pub(super) const ALL: &[Calculation] = &[
    Calculation {
        name: "so2",
        meaning: "sulfur dioxide from a salt, or the molecular part of free sulfur dioxide",
        fields: &[
            Field {
                name: "salt",
                takes: "potassium_metabisulfite, sodium_metabisulfite or ammonium_bisulfite, with mass_g and volume_l",
            },
            Field { name: "mass_g", takes: "grams" },
            Field { name: "volume_l", takes: "litres, above zero" },
            Field { name: "free_mg_l", takes: "free sulfur dioxide in mg/L, with ph" },
            Field { name: "ph", takes: "0 to 14" },
        ],
        gives: &["so2_mg_l", "molecular_mg_l"],
        source: "molar masses; pKa 1.81 at 20 °C (from memory)",
        run: sulfur_dioxide,
    },
    Calculation {
        name: "heat_and_gas",
        meaning: "heat and carbon dioxide of a fermentation",
        fields: &[
            Field { name: "sugar_g_l", takes: "hexose used up, g/L, 0 to 900" },
            Field { name: "volume_l", takes: "litres, above zero" },
            Field { name: "rate_g_l_h", takes: "sugar used at the peak, g/(L h)" },
        ],
        gives: &["co2_l", "heat_kj", "peak_w", "adiabatic_rise_k"],
        source: "557.384 kJ and 267.05 L (20 °C, 1 atm) per kg hexose",
        run: heat_and_gas,
    },
    Calculation {
        name: "storage_factor",
        meaning: "days of storage of wine as days at 20 °C, for the formation of ethyl carbamate from urea",
        fields: &[
            Field { name: "profile", takes: "a list of {days, temperature_c}" },
            Field { name: "product", takes: "wine (the default); a spirit is refused" },
        ],
        gives: &["equivalent_days_20c"],
        source: "activation energies 21 and 28 kcal/mol (Kodama et al. 1994), 10 to 40 °C",
        run: storage_factor,
    },
    Calculation {
        name: "molar_mass",
        meaning: "the molar mass of a formula",
        fields: &[Field {
            name: "formula",
            takes: "such as (NH4)2HPO4, of H, C, N, O, P, S and K",
        }],
        gives: &["g_per_mol"],
        source: "IUPAC 2021 abridged standard atomic weights",
        run: molar_mass,
    },
];

/// IUPAC 2021, abridged.
const WEIGHTS: [(&str, f64); 7] = [
    ("H", 1.0080),
    ("C", 12.011),
    ("N", 14.007),
    ("O", 15.999),
    ("P", 30.974),
    ("S", 32.06),
    ("K", 39.098),
];
/// Sodium, from memory of the same table; the reference at hand does not list it.
const SODIUM: f64 = 22.990;
/// First dissociation of sulfurous acid at 20 °C, from memory.
const PKA: f64 = 1.81;

fn sulfur_dioxide(given: &Given<'_>) -> Result<Found, Fault> {
    let has = |name| given.get(name).is_some();
    match (has("salt"), has("free_mg_l")) {
        (true, false) if !has("ph") => of_salt(given),
        (false, true) if !has("mass_g") && !has("volume_l") => molecular(given),
        _ => Err(Fault::whole("give salt, mass_g and volume_l; or free_mg_l and ph")),
    }
}

fn of_salt(given: &Given<'_>) -> Result<Found, Fault> {
    let (fraction, remembered) = match given.text("salt")? {
        "potassium_metabisulfite" => (2.0 * mass_of("SO2") / mass_of("K2S2O5"), false),
        "sodium_metabisulfite" => (2.0 * mass_of("SO2") / (2.0 * SODIUM + mass_of("S2O5")), true),
        "ammonium_bisulfite" => (mass_of("SO2") / mass_of("NH4HSO3"), false),
        _ => return Err(given.fault("salt", "unknown salt")),
    };
    let mass = given.within("mass_g", 0.0, 1e12)?;
    let volume = given.within("volume_l", 1e-6, 1e12)?;
    Ok(Found::by("mass balance, IUPAC 2021 abridged atomic masses")
        .number("so2_mg_l", mass * fraction / volume * 1_000.0)
        .note("of a fresh salt: an old one has lost some")
        .note(cautions::SULFUR_DIOXIDE.text)
        .note_if(remembered, "the atomic mass of sodium is from memory"))
}

fn molecular(given: &Given<'_>) -> Result<Found, Fault> {
    let free = given.within("free_mg_l", 0.0, 10_000.0)?;
    let ph = given.within("ph", 0.0, 14.0)?;
    Ok(Found::by("free / (1 + 10^(pH - 1.81))")
        .number("molecular_mg_l", free / (1.0 + 10_f64.powf(ph - PKA)))
        .note("pKa 1.81 at 20 °C is from memory; alcohol and temperature change it"))
}

fn heat_and_gas(given: &Given<'_>) -> Result<Found, Fault> {
    const KJ_PER_KG: f64 = 557.384;
    const LITRES_PER_KG: f64 = 267.05;
    let sugar = given.within("sugar_g_l", 0.0, 900.0)?;
    let volume = given.within("volume_l", 1e-6, 1e12)?;
    let rate = given.optional_within("rate_g_l_h", 0.0, 100.0)?;
    let kg = sugar * volume / 1_000.0;
    let watts = rate.map(|rate| KJ_PER_KG * rate / 3_600.0 * volume);
    Ok(Found::by("24 kcal per mol hexose; ideal gas at 20 °C and 1 atm")
        .number("co2_l", LITRES_PER_KG * kg)
        .number("heat_kj", KJ_PER_KG * kg)
        .member("peak_w", json!(watts))
        .number("adiabatic_rise_k", KJ_PER_KG * sugar / 1_000.0 / (1.09 * 3.6))
        .note(cautions::CARBON_DIOXIDE.text))
}

fn storage_factor(given: &Given<'_>) -> Result<Found, Fault> {
    /// cal/(mol K).
    const R: f64 = 1.987_204_258_64;
    if given.get("product").is_some() && given.text("product")? != "wine" {
        let detail = "only wine: in spirits urea stays in the stillage, and ethyl carbamate takes other routes";
        return Err(Fault::at("product", detail));
    }
    let (mut low, mut high) = (0.0, 0.0);
    let mut fitted = true;
    for (index, step) in given.items("profile")?.iter().enumerate() {
        let at = format!("profile/{index}");
        let (days, celsius) = (member(step, &at, "days")?, member(step, &at, "temperature_c")?);
        let two = step.as_object().is_some_and(|members| members.len() == 2);
        if !(0.0..=36_525.0).contains(&days) || !(-20.0..=80.0).contains(&celsius) || !two {
            return Err(Fault::at(&at, "give days, 0 to 36525, and temperature_c, -20 to 80"));
        }
        fitted &= (10.0..=40.0).contains(&celsius);
        let step =
            |calories: f64| days * (calories / R * (1.0 / 293.15 - 1.0 / (celsius + 273.15))).exp();
        low += step(21_000.0);
        high += step(28_000.0);
    }
    Ok(Found::by("Arrhenius with 21 and 28 kcal/mol (Kodama et al. 1994)")
        .member("equivalent_days_20c", json!({"low": low, "high": high}))
        .note("low and high name the energies: below 20 °C the higher energy gives fewer days")
        .note("a relative factor, never a concentration: no absolute rate is published")
        .note_if(!fitted, "outside the 10 to 40 °C of the experiments"))
}

fn molar_mass(given: &Given<'_>) -> Result<Found, Fault> {
    let formula = given.text("formula")?;
    let mass = Formula { rest: formula }
        .whole()
        .ok_or_else(|| given.fault("formula", "not understood"))?;
    Ok(Found::by("IUPAC 2021 abridged standard atomic weights").number("g_per_mol", mass))
}

/// g/mol of a formula of these elements.
fn mass_of(formula: &str) -> f64 {
    Formula { rest: formula }.whole().unwrap_or(f64::NAN)
}

/// What is left to read of a formula.
struct Formula<'a> {
    rest: &'a str,
}

impl Formula<'_> {
    fn whole(mut self) -> Option<f64> {
        let mass = self.group(8)?;
        (self.rest.is_empty() && mass > 0.0).then_some(mass)
    }

    /// Atoms and brackets, each with how many of it, nested at most so deep.
    fn group(&mut self, depth: u8) -> Option<f64> {
        let mut mass = 0.0;
        while let Some(first) = self.rest.chars().next().filter(|first| *first != ')') {
            let one = if first == '(' {
                self.rest = &self.rest[1..];
                let inner = self.group(depth.checked_sub(1)?)?;
                self.rest = self.rest.strip_prefix(')')?;
                inner
            } else {
                let (symbol, weight) =
                    WEIGHTS.iter().find(|(symbol, _)| self.rest.starts_with(symbol))?;
                self.rest = &self.rest[symbol.len()..];
                *weight
            };
            mass += one * self.count()?;
        }
        Some(mass)
    }

    fn count(&mut self) -> Option<f64> {
        let digits = self.rest.bytes().take_while(u8::is_ascii_digit).count();
        let (number, rest) = self.rest.split_at(digits);
        self.rest = rest;
        if digits == 0 {
            Some(1.0)
        } else {
            number.parse::<u16>().ok().filter(|n| *n > 0).map(f64::from)
        }
    }
}
