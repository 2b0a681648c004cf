//! The normal distribution.

/// The share of a standard normal distribution below `score`.
///
/// Φ(x) = ½ + φ(x) (x + x³/3 + x⁵/15 + …), the Taylor series of G. Marsaglia, J. Stat. Softw. 11(4), 2004; summed until
/// nothing changes. Beyond eight standard deviations it is 0 or 1.
pub(super) fn share_below(score: f64) -> f64 {
    if score.abs() > 8.0 {
        return if score > 0.0 { 1.0 } else { 0.0 };
    }
    let (mut sum, mut term, mut divisor) = (score, score, 1.0);
    loop {
        divisor += 2.0;
        term *= score * score / divisor;
        let next = sum + term;
        if (next - sum).abs() <= 0.0 {
            break;
        }
        sum = next;
    }
    let density = (-0.5 * score * score).exp() / std::f64::consts::TAU.sqrt();
    (0.5 + density * sum).clamp(0.0, 1.0)
}

#[cfg(test)]
mod tests {
    use super::share_below;

    /// The trapezoid rule on the density, which shares nothing with the series.
    fn by_area(score: f64) -> f64 {
        let steps = 20_000_u32;
        let width = score / f64::from(steps);
        let density = |x: f64| (-0.5 * x * x).exp() / std::f64::consts::TAU.sqrt();
        let inside: f64 = (1..steps).map(|step| density(width * f64::from(step))).sum();
        0.5 + width * (inside + 0.5 * (density(0.0) + density(score)))
    }

    #[test]
    fn the_series_is_the_area_under_the_density() {
        for score in [-5.0, -1.644_854, -0.3, 0.0, 0.7, 1.959_964, 3.0, 6.0] {
            let (series, area) = (share_below(score), by_area(score));
            assert!((series - area).abs() < 1e-8, "{score}: {series} is not {area}");
        }
        assert!((share_below(1.644_854) - 0.95).abs() < 1e-7);
    }

    #[test]
    fn both_halves_are_alike_and_the_tails_end() {
        for tenths in 0..100 {
            let score = f64::from(tenths) / 10.0;
            assert!((share_below(score) + share_below(-score) - 1.0).abs() < 1e-14);
        }
        assert!(share_below(f64::NEG_INFINITY) <= 0.0);
        assert!(share_below(f64::INFINITY) >= 1.0);
    }
}
