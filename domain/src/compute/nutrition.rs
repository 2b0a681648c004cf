//! Assimilable nitrogen: what was found, what is needed, what a dose brings.

use serde_json::Value;

use crate::checks::cautions;

use super::{Calculation, Fault, Field, Found, Given, member};
use crate::nitrogen::{
    Ammonium, Brix, Demand, Formol, Need, SugarGramsPerLitre, Yan, line_by_brix_mg_l,
};

pub(super) const ALL: &[Calculation] = &[
    Calculation {
        name: "yan",
        meaning: "yeast assimilable nitrogen from a laboratory's results or a formol titration",
        fields: &[
            Field { name: "ammonium_mg_l", takes: "NH4+ in mg/L" },
            Field { name: "ammonia_mg_l", takes: "NH3 in mg/L" },
            Field { name: "ammonium_n_mg_l", takes: "ammonium as mg N/L" },
            Field { name: "primary_amino_n_mg_l", takes: "mg N/L, proline left out" },
            Field { name: "formol", takes: "{titrant_ml, titrant_mol_l, aliquot_ml, dilution}" },
        ],
        gives: &["yan_mg_l", "ammonium_n_mg_l", "primary_amino_n_mg_l"],
        source: "N/NH4 and N/NH3 by IUPAC 2021 masses; formol factor 14",
        run: yan,
    },
    Calculation {
        name: "nitrogen_need",
        meaning: "what a fermentation needs to finish",
        fields: &[
            Field { name: "sugar_g_l", takes: "g/L, 0 to 900; or brix with sg" },
            Field { name: "brix", takes: "degrees Brix, 0 to 70" },
            Field { name: "sg", takes: "specific gravity 20/20 °C" },
            Field { name: "demand", takes: "low, medium or high" },
        ],
        gives: &[
            "need_mg_l",
            "floor_mg_l",
            "by_strain_mg_l",
            "line_by_brix_mg_l",
            "sugar_g_l",
            "sugar_from",
        ],
        source: "floor 140 mg N/L; 0.75, 0.90 or 1.25 mg N per g sugar (common practice)",
        run: nitrogen_need,
    },
    Calculation {
        name: "nutrient_dose",
        meaning: "what a dose brings into a litre",
        fields: &[
            Field { name: "mass_g", takes: "grams, not below zero" },
            Field { name: "volume_l", takes: "litres of liquid, above zero" },
            Field {
                name: "composition",
                takes: "mass fractions 0 to 1 of dap, ammonium_sulfate, amino_n, thiamine_hydrochloride",
            },
        ],
        gives: &[
            "ammonium_n_mg_l",
            "amino_n_mg_l",
            "nitrogen_mg_l",
            "phosphorus_mg_l",
            "thiamine_hydrochloride_mg_l",
            "diammonium_phosphate_mg_l",
            "ammonium_sulfate_mg_l",
        ],
        source: "IUPAC 2021 abridged atomic masses",
        run: nutrient_dose,
    },
];

fn yan(given: &Given<'_>) -> Result<Found, Fault> {
    if let Some(titration) = given.get("formol") {
        if ["ammonium_mg_l", "ammonia_mg_l", "ammonium_n_mg_l", "primary_amino_n_mg_l"]
            .iter()
            .any(|name| given.get(name).is_some())
        {
            return Err(Fault::at(
                "formol",
                "a formol titration stands alone: it takes in both parts",
            ));
        }
        return formol(titration);
    }
    let names = ["ammonium_mg_l", "ammonia_mg_l", "ammonium_n_mg_l"];
    let amino = given.optional("primary_amino_n_mg_l")?;
    let given_one = names.iter().any(|name| given.get(name).is_some());
    let ammonium = given_one.then(|| given.one_of(&names)).transpose()?;
    if ammonium.is_none() && amino.is_none() {
        return Err(Fault::whole("give ammonium, primary_amino_n_mg_l, or both; or formol"));
    }
    let form = match ammonium {
        Some(("ammonium_mg_l", number)) => Ammonium::Ion(number),
        Some(("ammonia_mg_l", number)) => Ammonium::Ammonia(number),
        Some((_, number)) => Ammonium::Nitrogen(number),
        None => Ammonium::Nitrogen(0.0),
    };
    let found = Yan::from_parts(form, amino.unwrap_or(0.0)).map_err(Fault::whole)?;
    let part = |known: bool, value: f64| if known { Value::from(value) } else { Value::Null };
    Ok(Found::by("ammonium nitrogen + primary amino nitrogen; N/NH4 0.776484, N/NH3 0.822441")
        .number("yan_mg_l", found.total_mg_l())
        .member("ammonium_n_mg_l", part(ammonium.is_some(), found.ammonium_n_mg_l))
        .member("primary_amino_n_mg_l", part(amino.is_some(), found.primary_amino_n_mg_l))
        .note_if(ammonium.is_none(), "without ammonium: a part of the nitrogen only")
        .note_if(amino.is_none(), "without amino nitrogen: a part of the nitrogen only"))
}

fn formol(titration: &Value) -> Result<Found, Fault> {
    const MEMBERS: [&str; 4] = ["titrant_ml", "titrant_mol_l", "aliquot_ml", "dilution"];
    let members = titration.as_object().ok_or_else(|| Fault::at("formol", "give an object"))?;
    if let Some(unknown) = members.keys().find(|name| !MEMBERS.contains(&name.as_str())) {
        return Err(Fault::at(
            &format!("formol/{unknown}"),
            format!("formol takes {}", MEMBERS.join(", ")),
        ));
    }
    let number = |name| member(titration, "formol", name);
    let formol = Formol {
        titrant_ml: number("titrant_ml")?,
        titrant_mol_l: number("titrant_mol_l")?,
        aliquot_ml: number("aliquot_ml")?,
        dilution: number("dilution")?,
    };
    let found = formol.yan_mg_l().map_err(|error| Fault::at("formol", error))?;
    Ok(Found::by("formol titration, factor 14")
        .number("yan_mg_l", found)
        .member("ammonium_n_mg_l", Value::Null)
        .member("primary_amino_n_mg_l", Value::Null)
        .note("an estimate: part of proline is titrated, arginine counts as one nitrogen of four"))
}

fn nitrogen_need(given: &Given<'_>) -> Result<Found, Fault> {
    let demand = Demand::parse(given.text("demand")?)
        .ok_or_else(|| given.fault("demand", "unknown demand"))?;
    let brix = given.optional("brix")?;
    let (sugar, from) = match (given.optional("sugar_g_l")?, brix, given.optional("sg")?) {
        (Some(sugar), None, None) => {
            (SugarGramsPerLitre::new(sugar).map_err(|e| Fault::at("sugar_g_l", e))?, "sugar_g_l")
        }
        (None, Some(brix), Some(sg)) => {
            let sugar = SugarGramsPerLitre::of_brix(Brix(brix), sg);
            (sugar.map_err(|e| Fault::at("brix", e))?, "10 × Brix × SG / 0.9982")
        }
        _ => return Err(Fault::whole("give sugar_g_l, or brix with sg")),
    };
    let need = Need::of(sugar, demand);
    let line = brix.and_then(|brix| line_by_brix_mg_l(Brix(brix)));
    Ok(Found::by("max(140, factor × sugar)")
        .number("need_mg_l", need.need_mg_l)
        .number("floor_mg_l", need.floor_mg_l)
        .number("by_strain_mg_l", need.by_strain_mg_l)
        .member("line_by_brix_mg_l", line.map_or(Value::Null, Value::from))
        .number("sugar_g_l", sugar.get())
        .member("sugar_from", from.into())
        .note("strain factors are common practice, no published limit")
        .note_if(
            brix.is_some(),
            "Brix counts every dissolved solid: some 10 % more than a laboratory's sugar on must",
        ))
}

/// Grams per gram (IUPAC 2021 abridged masses): 2 × 14.007 and 30.974 of 132.056; 2 × 14.007 of 132.134.
const DAP_NITROGEN: f64 = 28.014 / 132.056;
const DAP_PHOSPHORUS: f64 = 30.974 / 132.056;
const SULFATE_NITROGEN: f64 = 28.014 / 132.134;

fn nutrient_dose(given: &Given<'_>) -> Result<Found, Fault> {
    const KNOWN: [&str; 4] = ["dap", "ammonium_sulfate", "amino_n", "thiamine_hydrochloride"];
    let mass = given.within("mass_g", 0.0, 1e12)?;
    let volume = given.within("volume_l", 1e-6, 1e12)?;
    let composition = given.get("composition").and_then(Value::as_object);
    let composition = composition.ok_or_else(|| given.fault("composition", "give an object"))?;
    let mut sum = 0.0;
    for (name, part) in composition {
        let at = format!("composition/{name}");
        if !KNOWN.contains(&name.as_str()) {
            return Err(Fault::at(&at, format!("a composition names {}", KNOWN.join(", "))));
        }
        let fraction = part.as_f64().filter(|part| (0.0..=1.0).contains(part));
        sum += fraction.ok_or_else(|| Fault::at(&at, "give a mass fraction from 0 to 1"))?;
    }
    if sum > 1.0 + 1e-9 {
        return Err(Fault::at("composition", format!("the fractions come to {sum}, more than 1")));
    }
    let mg_l = |name: &str| {
        let fraction = composition.get(name).and_then(Value::as_f64).unwrap_or(0.0);
        mass * fraction / volume * 1_000.0
    };
    let (dap, sulfate) = (mg_l("dap"), mg_l("ammonium_sulfate"));
    let ammonium = dap * DAP_NITROGEN + sulfate * SULFATE_NITROGEN;
    let amino = mg_l("amino_n");
    Ok(Found::by("mass balance, IUPAC 2021 abridged atomic masses")
        .number("ammonium_n_mg_l", ammonium)
        .number("amino_n_mg_l", amino)
        .number("nitrogen_mg_l", ammonium + amino)
        .number("phosphorus_mg_l", dap * DAP_PHOSPHORUS)
        .number("thiamine_hydrochloride_mg_l", mg_l("thiamine_hydrochloride"))
        .number("diammonium_phosphate_mg_l", dap)
        .number("ammonium_sulfate_mg_l", sulfate)
        .note(cautions::FOAM.text)
        .note("a dose computed, no legal check: limits differ by country, product and premises"))
}
