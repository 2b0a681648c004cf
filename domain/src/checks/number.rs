//! Derived numbers on their way into sentences and entries: plain decimals, never floating point.

/// A plain decimal with so many digits; minus zero is zero.
pub(crate) fn fixed(value: f64, places: usize) -> String {
    let text = format!("{value:.places$}");
    let zero = text.strip_prefix('-').filter(|rest| rest.bytes().all(|b| b == b'0' || b == b'.'));
    zero.map_or_else(|| text.clone(), str::to_owned)
}

/// A fraction in whole per cent.
pub(crate) fn percent(fraction: f64) -> String {
    fixed(fraction * 100.0, 0)
}

/// A probability in whole per cent, never "0" and never "100".
pub(crate) fn chance(probability: f64) -> String {
    match probability {
        p if p > 0.99 => "over 99".to_owned(),
        p if p < 0.01 => "under 1".to_owned(),
        p => percent(p),
    }
}

/// The nearest double of a sum of base units.
pub(crate) fn real(sum: i128) -> f64 {
    #[expect(clippy::cast_precision_loss, reason = "53 bits are enough for a derived figure")]
    let value = sum as f64;
    value
}

/// The whole part of an amount in base units that was computed, from 0 to `most`.
pub(crate) fn whole(value: f64, most: i64) -> i64 {
    #[expect(
        clippy::cast_possible_truncation,
        reason = "cutting off is what is wanted; `as` saturates"
    )]
    let cut = value as i64;
    cut.clamp(0, most.max(0))
}

/// Rounds a level to the tenth of a milligram per litre that is shown: what is decided is what can be read.
pub(crate) fn settled(mg_l: f64) -> f64 {
    (mg_l * 10.0).round() / 10.0
}
