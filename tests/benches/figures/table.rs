//! How figures are printed.

use std::time::Duration;

/// One line: what, and how much.
pub(crate) fn line(what: &str, value: &str) {
    println!("{what:<58} {value}");
}

/// The machine's load over 1, 5 and 15 minutes.
pub(crate) fn load_average() -> String {
    let text = std::fs::read_to_string("/proc/loadavg").unwrap_or_default();
    text.split(' ').take(3).collect::<Vec<_>>().join(" ")
}

/// A count as a floating number, for ratios.
#[expect(clippy::cast_precision_loss, reason = "counts here stay far below 2^52")]
pub(crate) const fn real(count: u64) -> f64 {
    count as f64
}

/// How many.
pub(crate) fn count(length: usize) -> u64 {
    u64::try_from(length).expect("a count of 64 bits")
}

/// So many a second.
pub(crate) fn rate(count: u64, within: Duration) -> f64 {
    real(count) / within.as_secs_f64()
}

/// Milliseconds with two places.
pub(crate) fn millis(time: Duration) -> String {
    format!("{:.2} ms", time.as_secs_f64() * 1e3)
}
