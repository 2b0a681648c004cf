//! The root of a function that changes sign once.

/// Halvings until two neighbouring doubles remain of an interval of length 1.
const HALVINGS: u32 = 60;

/// Where a rising function crosses zero between `low` and `high`; the nearer end if it does not.
pub(crate) fn rising_root(low: f64, high: f64, function: impl Fn(f64) -> f64) -> f64 {
    let (mut low, mut high) = (low, high);
    for _ in 0..HALVINGS {
        let middle = low.midpoint(high);
        if function(middle) < 0.0 {
            low = middle;
        } else {
            high = middle;
        }
    }
    low.midpoint(high)
}
