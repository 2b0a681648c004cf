//! Yeast assimilable nitrogen: how much there is, and how much is needed.
//!
//! YAN = ammonium nitrogen + primary amino nitrogen, in mg N per litre of liquid; proline and other secondary amines
//! are not counted. The needs are published rules of thumb with a wide scatter between strains: a plan to be watched,
//! not a promise. How much of an addition the yeast really takes up is another question.
//!
//! Atomic masses: IUPAC 2021, abridged: H 1.008, N 14.007, O 15.999, P 30.974, S 32.06, C 12.011. The constants are
//! given to six digits, as the published checks print them; a test derives each from the masses.

#[cfg(test)]
mod tests;

/// g N per g ammonium ion: 14.007/18.039.
pub const NITROGEN_IN_AMMONIUM_ION: f64 = 0.776_484;
/// g N per g ammonia: 14.007/17.031.
pub const NITROGEN_IN_AMMONIA: f64 = 0.822_441;
/// g N per g diammonium phosphate, (NH₄)₂HPO₄: 28.014/132.056.
pub const NITROGEN_IN_DIAMMONIUM_PHOSPHATE: f64 = 0.212_137;
/// g N per g ammonium sulfate, (NH₄)₂SO₄: 28.014/132.134.
pub const NITROGEN_IN_AMMONIUM_SULFATE: f64 = 0.212_012;
/// g N per g urea: 28.014/60.056. Not permitted as an addition in many countries.
pub const NITROGEN_IN_UREA: f64 = 0.466_465;
/// g N per g arginine, all four nitrogens: 56.028/174.204.
pub const NITROGEN_IN_ARGININE: f64 = 0.321_623;
/// g N per g arginine, the three nitrogens counted as assimilable (convention of Crépin et al. 2012).
pub const ASSIMILABLE_NITROGEN_IN_ARGININE: f64 = 0.241_217;
/// mg N per mg isoleucine (14.007/131.175), the standard of the NOPA assay (Dukes and Butzke 1998, from memory).
pub const NITROGEN_IN_ISOLEUCINE: f64 = 0.106_781;

/// The nitrogen a fermentation needs to finish at all, mg N/L; strain dependent (Brice et al. 2014, Microb. Cell Fact.,
/// doi 10.1186/s12934-014-0109-0, background).
pub const FLOOR_MG_L: f64 = 140.0;

/// g/mol of nitrogen as formol titration rounds it (Zoecklein, Gump and Fugelsang, as taught at Virginia Tech).
const FORMOL_NITROGEN: f64 = 14.0;

/// kg/L of water by which the sugar rule divides, as printed with the strain factors.
const WATER_KG_L: f64 = 0.9982;

/// Why nitrogen or need could not be worked out.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum NitrogenError {
    /// Below zero, absurdly large, or not a number.
    #[error(
        "{what} {value} {unit} is outside {min} to {max} {unit}: check the number and its unit"
    )]
    OutOfRange {
        /// What the value is.
        what: &'static str,
        /// The value given.
        value: f64,
        /// The smallest accepted.
        min: f64,
        /// The largest accepted.
        max: f64,
        /// The unit.
        unit: &'static str,
    },
}

fn within(
    what: &'static str,
    value: f64,
    (min, max): (f64, f64),
    unit: &'static str,
) -> Result<f64, NitrogenError> {
    if (min..=max).contains(&value) {
        Ok(value)
    } else {
        Err(NitrogenError::OutOfRange { what, value, min, max, unit })
    }
}

/// How a laboratory states ammonium, each in mg/L.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Ammonium {
    /// mg/L of the ion NH₄⁺.
    Ion(f64),
    /// mg/L of NH₃.
    Ammonia(f64),
    /// mg N/L.
    Nitrogen(f64),
}

impl Ammonium {
    /// mg N/L.
    pub fn nitrogen_mg_l(self) -> f64 {
        match self {
            Self::Ion(mg_l) => NITROGEN_IN_AMMONIUM_ION * mg_l,
            Self::Ammonia(mg_l) => NITROGEN_IN_AMMONIA * mg_l,
            Self::Nitrogen(mg_l) => mg_l,
        }
    }
}

/// Assimilable nitrogen by form, mg N/L.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Yan {
    /// From ammonium.
    pub ammonium_n_mg_l: f64,
    /// From primary amino acids, proline left out.
    pub primary_amino_n_mg_l: f64,
}

impl Yan {
    /// The largest part accepted, mg N/L: five times what the richest musts hold (usual range 80 to 400); our limit.
    pub const LARGEST_PART_MG_L: f64 = 2_000.0;

    /// Adds up a laboratory's two results.
    ///
    /// ```
    /// use domain::nitrogen::{Ammonium, Yan};
    /// let must = Yan::from_parts(Ammonium::Ion(52.0), 98.0)?;
    /// assert!((must.total_mg_l() - 138.4).abs() < 0.05);
    /// # Ok::<(), domain::nitrogen::NitrogenError>(())
    /// ```
    ///
    /// # Errors
    /// [`NitrogenError::OutOfRange`] for a part below zero or above [`Yan::LARGEST_PART_MG_L`].
    pub fn from_parts(
        ammonium: Ammonium,
        primary_amino_n_mg_l: f64,
    ) -> Result<Self, NitrogenError> {
        let range = (0.0, Self::LARGEST_PART_MG_L);
        let ammonium_n_mg_l = within("ammonium", ammonium.nitrogen_mg_l(), range, "mg N/L")?;
        let primary_amino_n_mg_l =
            within("primary amino nitrogen", primary_amino_n_mg_l, range, "mg N/L")?;
        Ok(Self { ammonium_n_mg_l, primary_amino_n_mg_l })
    }

    /// Ammonium and amino nitrogen together, mg N/L.
    pub fn total_mg_l(self) -> f64 {
        self.ammonium_n_mg_l + self.primary_amino_n_mg_l
    }
}

/// A formol titration: formaldehyde sets free the acid of ammonium and amino groups, which is titrated to pH 8.0.
///
/// Part of proline is titrated and arginine counts as one nitrogen of four; recoveries are 77 to 88 % for ammonium,
/// 90 to 97 % for arginine; repeatability about ±6 mg N/L.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Formol {
    /// Alkali used in the titration proper, mL.
    pub titrant_ml: f64,
    /// Its concentration, mol/L.
    pub titrant_mol_l: f64,
    /// Sample titrated, mL.
    pub aliquot_ml: f64,
    /// Final volume over volume of juice: 2.5 for 10 mL made up to 25 mL.
    pub dilution: f64,
}

impl Formol {
    /// V c 14 × dilution × 1000/aliquot, in mg N/L.
    ///
    /// # Errors
    /// [`NitrogenError::OutOfRange`] for a volume, concentration or dilution that no titration has.
    pub fn yan_mg_l(self) -> Result<f64, NitrogenError> {
        let volume_ml = within("titrant", self.titrant_ml, (0.0, 1_000.0), "mL")?;
        let mol_l = within("titrant concentration", self.titrant_mol_l, (0.0001, 10.0), "mol/L")?;
        let aliquot_ml = within("aliquot", self.aliquot_ml, (0.1, 10_000.0), "mL")?;
        let dilution = within("dilution", self.dilution, (1.0, 1_000.0), "times")?;
        Ok(volume_ml * mol_l * FORMOL_NITROGEN * dilution * 1_000.0 / aliquot_ml)
    }
}

/// Sugar in g/L.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct SugarGramsPerLitre(f64);

impl SugarGramsPerLitre {
    /// # Errors
    /// [`NitrogenError::OutOfRange`] outside 0 to 900 g/L, the sugar of a saturated syrup.
    pub fn new(g_l: f64) -> Result<Self, NitrogenError> {
        within("sugar", g_l, (0.0, 900.0), "g/L").map(Self)
    }

    /// 10 × Brix × SG/0.9982: the sugar that the strain factors were published with.
    ///
    /// It takes every dissolved solid for sugar, some ten per cent more than a laboratory finds in must: whoever shows
    /// a need must show which sugar it was worked out with.
    ///
    /// # Errors
    /// [`NitrogenError::OutOfRange`] outside 0 to 70 Brix or SG 0.7 to 1.6.
    pub fn of_brix(brix: Brix, sg_20_20: f64) -> Result<Self, NitrogenError> {
        let degrees = within("extract", brix.0, (0.0, 70.0), "Brix")?;
        let gravity = within("specific gravity", sg_20_20, (0.7, 1.6), "")?;
        Self::new(10.0 * degrees * gravity / WATER_KG_L)
    }

    /// The plain number, g/L.
    pub const fn get(self) -> f64 {
        self.0
    }
}

/// Soluble solids as sucrose, % mass.
#[derive(Clone, Copy, Debug, PartialEq, PartialOrd)]
pub struct Brix(pub f64);

/// How much nitrogen a yeast strain asks for per gram of sugar.
#[derive(Clone, Copy, Debug, Eq, Hash, Ord, PartialEq, PartialOrd)]
pub enum Demand {
    /// 0.75 mg N per g sugar.
    Low,
    /// 0.90 mg N per g sugar.
    Medium,
    /// 1.25 mg N per g sugar.
    High,
}

impl Demand {
    /// Every demand, in rising order.
    pub const ALL: [Self; 3] = [Self::Low, Self::Medium, Self::High];

    /// mg N per g sugar: a widely published rule of the trade (common practice), read in more than one text.
    pub const fn factor(self) -> f64 {
        match self {
            Self::Low => 0.75,
            Self::Medium => 0.90,
            Self::High => 1.25,
        }
    }

    /// The name used in columns and JSON.
    pub const fn name(self) -> &'static str {
        match self {
            Self::Low => "low",
            Self::Medium => "medium",
            Self::High => "high",
        }
    }

    /// The demand of that name.
    pub fn parse(name: &str) -> Option<Self> {
        Self::ALL.into_iter().find(|demand| demand.name() == name)
    }
}

/// What a fermentation needs, each source's figure beside the one that counts, mg N/L.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Need {
    /// max(floor, factor × sugar).
    pub need_mg_l: f64,
    /// [`FLOOR_MG_L`].
    pub floor_mg_l: f64,
    /// Strain factor × sugar.
    pub by_strain_mg_l: f64,
}

impl Need {
    /// The need of a strain for this sugar.
    ///
    /// ```
    /// use domain::nitrogen::{Demand, Need, SugarGramsPerLitre};
    /// let need = Need::of(SugarGramsPerLitre::new(240.0)?, Demand::Medium);
    /// assert_eq!(need.need_mg_l, 216.0);
    /// # Ok::<(), domain::nitrogen::NitrogenError>(())
    /// ```
    pub fn of(sugar: SugarGramsPerLitre, demand: Demand) -> Self {
        let by_strain_mg_l = demand.factor() * sugar.get();
        Self { need_mg_l: FLOOR_MG_L.max(by_strain_mg_l), floor_mg_l: FLOOR_MG_L, by_strain_mg_l }
    }

    /// How much may be supplied before it is in excess: the larger of the need and the line by Brix, mg N/L.
    pub fn ceiling_mg_l(self, must: Option<Brix>) -> f64 {
        must.and_then(line_by_brix_mg_l).map_or(self.need_mg_l, |line| line.max(self.need_mg_l))
    }
}

/// 200 + 25 (Brix − 21) mg N/L for grape must of 21 to 27 Brix; nothing outside.
///
/// The straight line through the recommendations of Bisson and Butzke (2000), Am. J. Enol. Vitic. 51:168: 200, 250,
/// 300 and 350 at 21, 23, 25 and 27 Brix.
pub fn line_by_brix_mg_l(must: Brix) -> Option<f64> {
    (21.0..=27.0).contains(&must.0).then_some(200.0 + 25.0 * (must.0 - 21.0))
}
