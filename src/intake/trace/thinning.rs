//! Fewer vertices for a polyline, none of the left-out ones farther away than a tolerance.

use crate::geometry::Point;

/// Which vertices are kept so that every other one lies within `tolerance` vertically, m, of the polyline through
/// them.
///
/// From each kept vertex the slopes that pass all vertices since within the tolerance shrink to a narrower
/// and narrower range; the last vertex before one whose own slope is outside it is kept. Costs O(n).
/// Vertices of `fixed` are kept; both ends are.
pub(super) fn kept(points: &[Point], fixed: impl Fn(usize) -> bool, tolerance: f64) -> Vec<usize> {
    let mut kept = Vec::new();
    let Some(mut from) = points.first().copied() else {
        return kept;
    };
    kept.push(0);
    let (mut low, mut high) = (f64::NEG_INFINITY, f64::INFINITY);
    // Vertices on a straight line have equal slopes up to rounding only.
    let size = points
        .iter()
        .flatten()
        .fold(0.0, |m: f64, c| m.max(c.abs()));
    let tolerance = tolerance.max(8.0 * f64::EPSILON * size);
    for (index, &p) in points.iter().enumerate().skip(1) {
        let run = p[0] - from[0];
        let slope = (p[1] - from[1]) / run;
        let passes = slope >= low && slope <= high;
        if index > 1 && (!passes || fixed(index - 1)) && kept.last() != Some(&(index - 1)) {
            from = points[index - 1];
            kept.push(index - 1);
            (low, high) = (f64::NEG_INFINITY, f64::INFINITY);
        }
        let run = p[0] - from[0];
        low = low.max((p[1] - tolerance - from[1]) / run);
        high = high.min((p[1] + tolerance - from[1]) / run);
    }
    if points.len() > 1 {
        kept.push(points.len() - 1);
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn corners_stay_and_straight_samples_go() {
        let points: Vec<Point> = (0..=40)
            .map(|i| {
                let x = f64::from(i) * 0.3;
                [x, -(x.min(12.0 - x).min(3.0))]
            })
            .collect();
        assert_eq!(kept(&points, |_| false, 0.0), [0, 10, 30, 40]);
        assert_eq!(kept(&points, |i| i == 20, 0.0), [0, 10, 20, 30, 40]);
        assert_eq!(kept(&points, |_| false, 9.0), [0, 40]);
    }

    proptest! {
        #[test]
        fn what_is_left_out_is_within_the_tolerance(
            heights in proptest::collection::vec(-1.0..1.0_f64, 2..200), tolerance in 0.0..0.5_f64,
        ) {
            let points: Vec<Point> = heights.iter().zip(0..).map(|(&z, i)| [f64::from(i), z]).collect();
            let kept = kept(&points, |_| false, tolerance);
            for pair in kept.windows(2) {
                let (a, b) = (points[pair[0]], points[pair[1]]);
                for p in &points[pair[0]..pair[1]] {
                    let line = a[1] + (p[0] - a[0]) / (b[0] - a[0]) * (b[1] - a[1]);
                    prop_assert!((line - p[1]).abs() <= tolerance + 1e-12);
                }
            }
        }
    }
}
