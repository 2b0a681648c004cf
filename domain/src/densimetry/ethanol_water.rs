//! Density of ethanol and water: the formula of OIML R 22 (1975), the law's own in many countries.
//!
//! ρ(p, t) = A₁ + Σ Aₖ pᵏ⁻¹ + Σ Bₖ dᵏ + Σ Σ Cᵢₖ pᵏ dⁱ with p the mass fraction of ethanol, d = t − 20 °C, ρ in kg/m³
//! in vacuum; −20 to 40 °C. Read in Council Directive 76/766/EEC (annex: form, validity, first coefficients) and,
//! complete, in three independent open transcriptions that agree. Whether a mixture is frozen is not checked.

use super::{Celsius, DensimetryError, Limits, MassFraction, polynomial};

/// Said with every density below 0 °C.
pub const FREEZING_NOT_CHECKED: &str = "below 0 °C the mixture may be frozen: not checked";

const FRACTIONS: Limits = Limits {
    what: "ethanol mass fraction",
    min: 0.0,
    max: 1.0,
    unit: "",
    advice: "give grams per gram (33.3 % is 0.333)",
};

const TEMPERATURES: Limits = Limits {
    what: "spirit temperature",
    min: -20.0,
    max: 40.0,
    unit: " °C",
    advice: "bring the sample between −20 and 40 °C and read again",
};

/// A₁ to A₁₂, per power of p from p⁰.
const A: [f64; 12] = [
    998.201_230_0,
    -192.976_949_5,
    389.123_895_8,
    -1_668.103_923,
    13_522.154_41,
    -88_292.783_88,
    306_287.404_2,
    -613_838.123_4,
    747_017.299_8,
    -547_846.135_4,
    223_446.033_4,
    -39_032.854_26,
];

/// B₁ to B₆, per power of d from d¹.
const B: [f64; 6] = [
    -2.061_851_3e-1,
    -5.268_254_2e-3,
    3.613_001_3e-5,
    -3.895_770_2e-7,
    7.169_354_0e-9,
    -9.973_923_1e-11,
];

/// Cᵢₖ: one row per power of d from d¹, in it one coefficient per power of p from p¹.
const C: [&[f64]; 5] = [
    &[
        1.693_443_461_530_087e-1,
        -1.046_914_743_455_169e1,
        7.196_353_469_546_523e1,
        -7.047_478_054_272_792e2,
        3.924_090_430_035_045e3,
        -1.210_164_659_068_747e4,
        2.248_646_550_400_788e4,
        -2.605_562_982_188_164e4,
        1.852_373_922_069_467e4,
        -7.420_201_433_430_137e3,
        1.285_617_841_998_974e3,
    ],
    &[
        -1.193_013_005_057_01e-2,
        2.517_399_633_803_461e-1,
        -2.170_575_700_536_993,
        1.353_034_988_843_029e1,
        -5.029_988_758_547_014e1,
        1.096_355_666_577_57e2,
        -1.422_753_946_421_155e2,
        1.080_435_942_856_23e2,
        -4.414_153_236_817_392e1,
        7.442_971_530_188_783,
    ],
    &[
        -6.802_995_733_503_803e-4,
        1.876_837_790_289_664e-2,
        -2.002_561_813_734_156e-1,
        1.022_992_966_719_22,
        -2.895_696_483_903_638,
        4.810_060_584_300_675,
        -4.672_147_440_794_683,
        2.458_043_105_903_461,
        -5.411_227_621_436_812e-1,
    ],
    &[
        4.075_376_675_622_027e-6,
        -8.763_058_573_471_11e-6,
        6.515_031_360_099_368e-6,
        -1.515_784_836_987_21e-6,
    ],
    &[-2.788_074_354_782_409e-8, 1.345_612_883_493_354e-8],
];

/// Density in kg/m³ (in vacuum) of an ethanol-water mixture.
///
/// ```
/// use domain::densimetry::{Celsius, MassFraction, ethanol_water};
/// let spirit = ethanol_water::density(MassFraction(0.31), Celsius(13.0))?;
/// assert!((spirit - 956.42).abs() < 0.005); // OIML R 22, table I
/// # Ok::<(), domain::densimetry::DensimetryError>(())
/// ```
///
/// # Errors
/// [`DensimetryError::OutOfRange`] outside 0 to 1 g/g or −20 to 40 °C.
pub fn density(ethanol: MassFraction, at: Celsius) -> Result<f64, DensimetryError> {
    FRACTIONS.admit(ethanol.0)?;
    TEMPERATURES.admit(at.0)?;
    Ok(formula(ethanol, at))
}

/// The bare formula, for arguments already known to be in range.
pub(super) fn formula(ethanol: MassFraction, at: Celsius) -> f64 {
    let p = ethanol.0;
    let d = at.0 - 20.0;
    let by_degree = C.map(|row| polynomial(row, p) * p);
    polynomial(&A, p) + (polynomial(&B, d) + polynomial(&by_degree, d)) * d
}

/// Density of pure ethanol at 20 °C in kg/m³, by the formula: 789.2391, printed as 789.24.
pub(super) fn pure_ethanol_20c() -> f64 {
    formula(MassFraction(1.0), Celsius::TWENTY)
}
