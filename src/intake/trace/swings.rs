//! Where a trace swings between an upper and a lower level, whatever the shape between them.
//!
//! Turning points of noise pair off in small ranges, lands and grooves in large ones. Counting the ranges
//! by the three-point stack of rainflow counting (Downing and Socie 1982, Int. J. Fatigue 4, 31; from
//! memory) is linear in time and independent of the shape of walls and floors.

/// A stretch on one side of the half height, indices `from..to`.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) struct Stretch {
    /// On the upper level.
    pub(super) high: bool,
    /// First sample.
    pub(super) from: usize,
    /// One past the last sample.
    pub(super) to: usize,
}

/// Heights at the turning points, from end to end.
fn turning_heights(z: &[f64]) -> Vec<f64> {
    let mut turns: Vec<f64> = Vec::new();
    for &height in z {
        match turns.as_slice() {
            [.., last] if (height - last).abs() <= 0.0 => {}
            [.., before, last] if (last - before) * (height - last) > 0.0 => {
                turns.pop();
                turns.push(height);
            }
            _ => turns.push(height),
        }
    }
    turns
}

/// Ranges of all swings from `least` on, smallest inside larger ones, in falling order.
pub(super) fn swing_ranges(z: &[f64], least: f64) -> Vec<f64> {
    let mut stack: Vec<f64> = Vec::new();
    let mut ranges = Vec::new();
    for height in turning_heights(z) {
        stack.push(height);
        while let [.., first, second, third] = *stack.as_slice() {
            let inner = (second - first).abs();
            if (third - second).abs() < inner {
                break;
            }
            ranges.push(inner);
            if stack.len() == 3 {
                stack.remove(0);
                break;
            }
            stack.truncate(stack.len() - 3);
            stack.push(third);
        }
    }
    ranges.extend(stack.windows(2).map(|pair| (pair[1] - pair[0]).abs()));
    ranges.retain(|range| *range >= least);
    ranges.sort_by(|a, b| b.total_cmp(a));
    ranges
}

/// What noise alone does not reach: normal noise of `n` samples spans about `2 sqrt(2 ln n)` standard
/// deviations, and two are added.
fn noise_span(noise: f64, samples: usize) -> f64 {
    (2.0 * (2.0 * (samples.max(2) as f64).ln()).sqrt() + 2.0) * noise
}

/// Heights that part lands and grooves from noise: in the widest gaps between the ranges of swings,
/// the widest first, at most three.
pub(super) fn swing_thresholds(z: &[f64], noise: f64) -> Vec<f64> {
    let span = noise_span(noise, z.len());
    let ranges = swing_ranges(z, 0.5 * span);
    let smallest = span.max(1e-9 * ranges.first().copied().unwrap_or(0.0));
    let mut gaps: Vec<(f64, f64)> = Vec::new();
    for (k, &range) in ranges.iter().enumerate() {
        if range <= smallest {
            break;
        }
        let next = ranges
            .get(k + 1)
            .copied()
            .unwrap_or(0.0)
            .max(0.5 * smallest);
        gaps.push((range / next, (range * next).sqrt().max(0.3 * range)));
    }
    gaps.retain(|(ratio, _)| *ratio >= 1.8);
    gaps.sort_by(|a, b| b.0.total_cmp(&a.0));
    gaps.iter()
        .take(3)
        .map(|(_, threshold)| *threshold)
        .collect()
}

/// Indices of the highest and lowest samples between reversals of at least `threshold`, in turn.
fn extremes(z: &[f64], threshold: f64) -> Vec<usize> {
    let mut found = Vec::new();
    let (mut top, mut bottom) = (0, 0);
    let mut rising: Option<bool> = None;
    for (at, &height) in z.iter().enumerate() {
        if height > z[top] {
            top = at;
        }
        if height < z[bottom] {
            bottom = at;
        }
        if rising != Some(true) && height - z[bottom] >= threshold {
            found.push(bottom);
            rising = Some(true);
            top = at;
        } else if rising != Some(false) && z[top] - height >= threshold {
            found.push(top);
            rising = Some(false);
            bottom = at;
        }
    }
    match rising {
        Some(true) => found.push(top),
        Some(false) => found.push(bottom),
        None => {}
    }
    found
}

/// Stretches above and below half height, in turn, from end to end; empty where nothing reaches `threshold`.
pub(super) fn stretches(z: &[f64], threshold: f64) -> Vec<Stretch> {
    let turns = extremes(z, threshold);
    let mut found: Vec<Stretch> = Vec::new();
    let mut from = 0;
    for pair in turns.windows(2) {
        let (a, b) = (pair[0], pair[1]);
        let half = 0.5 * (z[a] + z[b]);
        let falls = z[a] > z[b];
        // The crossing next to the lower end, so that dust on a wall does not move it.
        let crossing = if falls {
            (a..b).rev().find(|&k| z[k] > half).map_or(b, |k| k + 1)
        } else {
            (a..b).find(|&k| z[k] > half).unwrap_or(b)
        };
        found.push(Stretch {
            high: falls,
            from,
            to: crossing,
        });
        from = crossing;
    }
    if let Some(last) = found.last().copied() {
        found.push(Stretch {
            high: !last.high,
            from,
            to: z.len(),
        });
    }
    found
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn swings_inside_swings_are_counted_once() {
        let z = [0.0, 10.0, 4.0, 5.0, 4.5, 6.0, 0.0, 10.0, 10.0, 9.0];
        let ranges = swing_ranges(&z, 0.4);
        assert_eq!(ranges.len(), 6);
        assert_eq!(swing_ranges(&z, 0.6).len(), 5);
        for (found, expected) in ranges.iter().zip([10.0, 10.0, 10.0, 2.0, 1.0, 0.5]) {
            assert!((found - expected).abs() < 1e-12, "{ranges:?}");
        }
    }

    #[test]
    fn stretches_alternate_and_cover_the_trace() {
        let z = [9.0, 9.1, 9.0, 1.0, 1.2, 1.0, 9.0, 9.2, 9.0, 1.0];
        let found = stretches(&z, 4.0);
        let bounds: Vec<_> = found.iter().map(|s| (s.high, s.from, s.to)).collect();
        assert_eq!(
            bounds,
            [(true, 0, 3), (false, 3, 6), (true, 6, 9), (false, 9, 10)]
        );
        assert!(stretches(&z, 40.0).is_empty());
        assert!(stretches(&[], 1.0).is_empty());
    }
}
