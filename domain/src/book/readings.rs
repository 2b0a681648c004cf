//! Which quantities can be read, in which units, and within which bounds a number is believed.
//!
//! The bounds only keep out what cannot be: they are physical or of the instrument, not limits of any law.

use crate::densimetry::scale::UNITS as SCALES;

/// One quantity that can be read.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Readable {
    /// Its name in entries, columns and JSON.
    pub name: &'static str,
    /// Units or scales, each with the least and the greatest number believed.
    pub units: &'static [(&'static str, f64, f64)],
    /// What it is, for people.
    pub meaning: &'static str,
}

/// Every quantity that can be read.
pub const READABLE: &[Readable] = &[
    Readable {
        name: "gravity",
        units: &SCALES,
        meaning: "specific gravity or extract by hydrometer or density meter; of unfermented liquid also by refractometer",
    },
    Readable {
        name: "temperature",
        units: &[("Cel", -30.0, 130.0), ("[degF]", -22.0, 266.0)],
        meaning: "temperature of the liquid",
    },
    Readable {
        name: "ammonium",
        units: &[("mg/L", 0.0, 5_000.0)],
        meaning: "ammonium as NH4, or as N where expressed_as says N",
    },
    Readable {
        name: "primary_amino_nitrogen",
        units: &[("mg/L", 0.0, 5_000.0)],
        meaning: "nitrogen of primary amino acids, proline left out",
    },
    Readable {
        name: "sugar",
        units: &[("g/L", 0.0, 1_000.0)],
        meaning: "fermentable sugar, for example glucose and fructose",
    },
    Readable { name: "ph", units: &[("[pH]", 0.0, 14.0)], meaning: "pH" },
    Readable {
        name: "ethanol",
        units: &[("%{vol}", 0.0, 100.0)],
        meaning: "alcoholic strength by volume at 20 °C",
    },
    Readable { name: "urea", units: &[("mg/L", 0.0, 1_000.0)], meaning: "urea" },
    Readable {
        name: "ethyl_carbamate",
        units: &[("ug/L", 0.0, 1_000_000.0)],
        meaning: "ethyl carbamate",
    },
    Readable {
        name: "sulfur_dioxide_total",
        units: &[("mg/L", 0.0, 5_000.0)],
        meaning: "total sulfur dioxide",
    },
    Readable {
        name: "sulfur_dioxide_free",
        units: &[("mg/L", 0.0, 5_000.0)],
        meaning: "free sulfur dioxide",
    },
];

/// The quantity of that name.
pub fn readable(name: &str) -> Option<&'static Readable> {
    READABLE.iter().find(|readable| readable.name == name)
}
