//! Readings put in order, and made never to fall.

use super::Point;

/// Readings closer together than a second are one reading, in hours.
const SAME_TIME_H: f64 = 1.0 / 3_600.0;

/// The finite points by time; those of one time become their mean.
pub(super) fn in_order(points: impl Iterator<Item = Point>) -> Vec<Point> {
    let mut sorted: Vec<Point> =
        points.filter(|point| point.at_h.is_finite() && point.fraction.is_finite()).collect();
    sorted.sort_by(|a, b| a.at_h.total_cmp(&b.at_h));
    let groups = sorted.chunk_by(|a, b| b.at_h - a.at_h < SAME_TIME_H);
    groups.map(|group| Point { at_h: group[0].at_h, fraction: mean(group) }).collect()
}

/// The closest never falling series in least squares: neighbours that fall are pooled to their mean (Ayer et al., Ann.
/// Math. Statist. 26 (1955) 641).
pub(super) fn never_falling(raw: &[Point]) -> Vec<Point> {
    let mut pools: Vec<&[Point]> = Vec::new();
    for at in 0..raw.len() {
        let (mut start, end) = (at, at + 1);
        while let Some(before) = pools.last()
            && mean(before) > mean(&raw[start..end])
        {
            start -= before.len();
            pools.pop();
        }
        pools.push(&raw[start..end]);
    }
    let level = |pool: &[Point]| {
        let fraction = mean(pool);
        pool.iter().map(move |point| Point { at_h: point.at_h, fraction }).collect::<Vec<_>>()
    };
    pools.into_iter().flat_map(level).collect()
}

/// Root mean square by which the readings had to be moved.
pub(super) fn disagreement(raw: &[Point], moved: &[Point]) -> f64 {
    let squares: f64 = raw.iter().zip(moved).map(|(a, b)| (a.fraction - b.fraction).powi(2)).sum();
    (squares / count(raw)).sqrt()
}

fn mean(points: &[Point]) -> f64 {
    points.iter().map(|point| point.fraction).sum::<f64>() / count(points)
}

fn count(points: &[Point]) -> f64 {
    u32::try_from(points.len()).map_or(f64::INFINITY, f64::from)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn points(fractions: &[f64]) -> Vec<Point> {
        let hours = (0_u32..).map(f64::from);
        hours.zip(fractions).map(|(at_h, &fraction)| Point { at_h, fraction }).collect()
    }

    fn fractions(points: &[Point]) -> Vec<f64> {
        points.iter().map(|point| point.fraction).collect()
    }

    #[test]
    fn neighbours_that_fall_are_pooled_and_the_rest_is_left() {
        let raw = points(&[0.0, 0.25, 0.125, 0.5, 0.25, 0.0, 1.0]);
        let moved = never_falling(&raw);
        let expected = [0.0, 0.1875, 0.1875, 0.25, 0.25, 0.25, 1.0];
        for (actual, expected) in fractions(&moved).into_iter().zip(expected) {
            assert!((actual - expected).abs() < 1e-12, "{moved:?}");
        }
        assert!(disagreement(&raw, &moved) > 0.1);
    }

    #[test]
    fn rising_readings_stay_as_they_are() {
        let raw = points(&[-0.01, 0.0, 0.3, 0.3, 1.01]);
        assert_eq!(never_falling(&raw), raw);
        assert!(disagreement(&raw, &raw) <= 0.0);
    }

    #[test]
    fn readings_are_sorted_and_those_of_one_time_are_averaged() {
        let unordered = [(2.0, 0.5), (1.0, 0.2), (2.0, 0.25), (f64::NAN, 0.9), (3.0, f64::NAN)];
        let ordered =
            in_order(unordered.into_iter().map(|(at_h, fraction)| Point { at_h, fraction }));
        let expected = [Point { at_h: 1.0, fraction: 0.2 }, Point { at_h: 2.0, fraction: 0.375 }];
        assert_eq!(ordered, expected);
    }
}
