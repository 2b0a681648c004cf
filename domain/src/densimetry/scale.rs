//! The scales on which a gravity or an extract is read: one table, from which every list, sign and bound is taken.
//!
//! A new scale is a row here and, if it shows something new, a way to [`Shows`] it. No scale carries a correction for
//! the meniscus: none is published in the sources used, so a float is read at the level it was made for.

use super::extract::{
    baume_at, gravity_at_baume, gravity_at_kmw, gravity_at_oechsle, kmw_at, oechsle_at,
};
use super::{Celsius, DensimetryError};

/// A scale by which a reading is told.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Scale {
    /// Specific gravity 20/20 °C.
    Sg20_20,
    /// Specific gravity 60/60 °F.
    Sg60_60,
    /// Degrees Plato, grams per 100 g.
    Plato,
    /// Degrees Brix by a float, grams per 100 g.
    Brix,
    /// Degrees Oechsle.
    Oechsle,
    /// Degrees of the Klosterneuburg must balance.
    Kmw,
    /// Degrees Baumé, modulus 145.
    Baume145,
    /// Degrees Brix by a refractometer: of unfermented liquid only.
    RefractometerBrix,
}

/// One number from another.
pub(super) type Formula = fn(f64) -> f64;

/// What a scale's number stands for.
#[derive(Clone, Copy, Debug)]
pub(super) enum Shows {
    /// A gravity against water of the same temperature, there and back.
    Gravity(Formula, Formula),
    /// Grams of sucrose in 100 g.
    Extract,
    /// The sucrose that would bend light as much.
    Refraction,
}

/// One row of the table.
#[derive(Debug)]
struct Row {
    scale: Scale,
    name: &'static str,
    sign: &'static str,
    meaning: &'static str,
    /// The least and the greatest number believed.
    range: (f64, f64),
    /// What to do about a number beyond it.
    advice: &'static str,
    /// The temperature at which it reads true, and its name in a note.
    calibration: (Celsius, &'static str),
    shows: Shows,
    /// What a reader must always know.
    remarks: &'static [&'static str],
}

const TWENTY: (Celsius, &str) = (
    Celsius::TWENTY,
    "read more than 5 K from 20 °C: the correction is an estimate, the more so with alcohol",
);
const SIXTY: (Celsius, &str) = (
    Celsius::SIXTY_FAHRENHEIT,
    "read more than 5 K from 60 °F: the correction is an estimate, the more so with alcohol",
);

const DIGITS: &str =
    "check the digits and the scale (1.050 is a gravity, 1050 and 12.4 are other scales)";
const PERCENT: &str = "check the scale (12.4 is degrees Plato or Brix, 1.050 a gravity); dilute by weight what is stronger";
const MUST: &str = "check the scale (1.050 is a gravity); dilute by weight what is heavier, and read on sg_20_20 what is lighter than this scale reaches";

/// Every scale, in the order a list shows them, which is that of [`Scale`].
const ROWS: [Row; 8] = [
    Row {
        scale: Scale::Sg20_20,
        name: "sg_20_20",
        sign: "SG",
        meaning: "specific gravity 20/20 °C, in air",
        range: (0.7, 1.6),
        advice: DIGITS,
        calibration: TWENTY,
        shows: Shows::Gravity(std::convert::identity, std::convert::identity),
        remarks: &[],
    },
    Row {
        scale: Scale::Sg60_60,
        name: "sg_60_60",
        sign: "SG 60/60 °F",
        meaning: "specific gravity 60/60 °F, in air",
        range: (0.7, 1.6),
        advice: DIGITS,
        calibration: SIXTY,
        shows: Shows::Gravity(std::convert::identity, std::convert::identity),
        remarks: &["brought from 60 °F to 20 °C as the same sugar solution"],
    },
    Row {
        scale: Scale::Plato,
        name: "plato",
        sign: "°P",
        meaning: "degrees Plato, grams of extract in 100 g",
        range: (-20.0, 70.0),
        advice: PERCENT,
        calibration: TWENTY,
        shows: Shows::Extract,
        remarks: &[],
    },
    Row {
        scale: Scale::Brix,
        name: "brix",
        sign: "°Bx",
        meaning: "degrees Brix by hydrometer or density meter, grams of extract in 100 g",
        range: (-20.0, 70.0),
        advice: PERCENT,
        calibration: TWENTY,
        shows: Shows::Extract,
        remarks: &[],
    },
    // 1000 (d20/20 − 1). From the lightest liquid of the sugar model to a syrup of 70 %.
    Row {
        scale: Scale::Oechsle,
        name: "oechsle",
        sign: "°Oe",
        meaning: "degrees Oechsle, 1000 (SG 20/20 − 1)",
        range: (-50.0, 350.0),
        advice: MUST,
        calibration: TWENTY,
        shows: Shows::Gravity(gravity_at_oechsle, oechsle_at),
        remarks: &[],
    },
    Row {
        scale: Scale::Kmw,
        name: "kmw",
        sign: "°KMW",
        meaning: "degrees of the Klosterneuburg must balance (KMW)",
        range: (0.0, 50.0),
        advice: MUST,
        calibration: TWENTY,
        shows: Shows::Gravity(gravity_at_kmw, kmw_at),
        remarks: &[
            "KMW by Oe = KMW (0.022 KMW + 4.54) (Ambrosi 1994); where a statutory table applies, that prevails",
        ],
    },
    // Only what is heavier than water: the scale for lighter liquids is another one.
    Row {
        scale: Scale::Baume145,
        name: "baume_145",
        sign: "°Bé (modulus 145)",
        meaning: "degrees Baumé of liquids heavier than water, modulus 145",
        range: (0.0, 38.0),
        advice: MUST,
        calibration: TWENTY,
        shows: Shows::Gravity(gravity_at_baume, baume_at),
        remarks: &[
            "Baumé with the modulus 145, taken on SG 20/20; the modulus is from memory: check what the instrument says",
        ],
    },
    Row {
        scale: Scale::RefractometerBrix,
        name: "refractometer_brix",
        sign: "°Bx by refractometer",
        meaning: "degrees Brix by refractometer, of unfermented liquid only",
        range: (0.0, 70.0),
        advice: "check the digits and the scale; dilute by weight what is stronger, and read on sg_20_20 what is below 0",
        calibration: TWENTY,
        shows: Shows::Refraction,
        remarks: &[
            "by refractometer: holds only while nothing has fermented",
            "taken as sucrose in water; grape must of the same reading is up to 0.002 heavier (OIV-MA-AS2-02 table II)",
        ],
    },
];

/// Every scale's name with the least and the greatest number believed.
pub const UNITS: [(&str, f64, f64); ROWS.len()] = {
    let mut units = [("", 0.0, 0.0); ROWS.len()];
    let mut at = 0;
    while at < ROWS.len() {
        units[at] = (ROWS[at].name, ROWS[at].range.0, ROWS[at].range.1);
        at += 1;
    }
    units
};

impl Scale {
    /// Every scale, in the order a list shows them.
    pub fn all() -> impl Iterator<Item = Self> {
        ROWS.iter().map(|row| row.scale)
    }

    /// All names, for a message.
    pub fn names() -> String {
        ROWS.map(|row| row.name).join(", ")
    }

    /// The scale of that name.
    ///
    /// # Errors
    /// [`DensimetryError::UnknownScale`] with the names that exist.
    pub fn parse(name: &str) -> Result<Self, DensimetryError> {
        let unknown = || DensimetryError::UnknownScale(name.chars().take(40).collect());
        Self::all().find(|scale| scale.name() == name).ok_or_else(unknown)
    }

    /// The name used in columns, JSON and on the command line.
    pub const fn name(self) -> &'static str {
        self.row().name
    }

    /// How people write it behind a number.
    pub const fn sign(self) -> &'static str {
        self.row().sign
    }

    /// What it is, for people.
    pub const fn meaning(self) -> &'static str {
        self.row().meaning
    }

    /// The least and the greatest number believed.
    pub const fn range(self) -> (f64, f64) {
        self.row().range
    }

    /// What to do about a number beyond the range.
    pub(super) const fn advice(self) -> &'static str {
        self.row().advice
    }

    /// The temperature at which it reads true.
    pub const fn calibration(self) -> Celsius {
        self.row().calibration.0
    }

    /// What is said of a reading taken far from there.
    pub(super) const fn far_off(self) -> &'static str {
        self.row().calibration.1
    }

    pub(super) const fn shows(self) -> Shows {
        self.row().shows
    }

    pub(super) const fn remarks(self) -> &'static [&'static str] {
        self.row().remarks
    }

    /// The number itself if this scale can show it.
    ///
    /// # Errors
    /// [`DensimetryError::OffScale`] beyond [`Scale::range`], or if it is not a number.
    pub fn admit(self, reading: f64) -> Result<f64, DensimetryError> {
        let (least, most) = self.range();
        if (least..=most).contains(&reading) {
            Ok(reading)
        } else {
            Err(DensimetryError::OffScale { scale: self, reading })
        }
    }

    const fn row(self) -> &'static Row {
        const TABLE: &[Row] = &ROWS;
        &TABLE[self as usize]
    }
}
