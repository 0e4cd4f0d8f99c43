//! Where sections are solved: nested Chebyshev points for the table, spread points for the check.
//!
//! Table points along an axis are `cos(pi k / m)`, the extremes of `T_m`: they hold both ends of the range, and the
//! points of `m` are among those of `2 m`, so a finer table keeps what was solved. Fresh points are Halton's
//! sequence (J. H. Halton 1960, Numer. Math. 2, 84, from memory) in bases 2, 3 and 5, the same in every run.

/// Points along an axis, from -1 to 1.
pub(super) fn chebyshev_points(count: usize) -> Vec<f64> {
    let last = count.saturating_sub(1).max(1) as f64;
    (0..count)
        .map(|k| {
            // Of the sine of the distance from the middle, so that both halves are alike and the middle is 0.
            let from_middle = (2.0 * k as f64 - last) / last;
            (0.5 * std::f64::consts::PI * from_middle).sin()
        })
        .collect()
}

/// Bases of the sequence, one for each axis.
const BASES: [u32; 3] = [2, 3, 5];

/// Spread points, each coordinate strictly between -1 and 1.
///
/// The first of the sequence, whose coordinate in base 2 is the middle of the range and a point of every table, is
/// left out.
pub(super) fn fresh_points(count: usize, axes: usize) -> Vec<Vec<f64>> {
    (0..count)
        .map(|k| {
            let bases = BASES.iter().take(axes);
            bases
                .map(|&base| 2.0 * radical_inverse(k as u64 + 2, u64::from(base)) - 1.0)
                .collect()
        })
        .collect()
}

/// The digits of `k` in a base, mirrored at the point.
fn radical_inverse(mut k: u64, base: u64) -> f64 {
    let (mut value, mut digit) = (0.0, 1.0 / base as f64);
    while k > 0 {
        value += (k % base) as f64 * digit;
        digit /= base as f64;
        k /= base;
    }
    value
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tables_are_nested_and_hold_both_ends() {
        let (coarse, fine) = (chebyshev_points(5), chebyshev_points(9));
        for (k, t) in coarse.iter().enumerate() {
            assert!((t - fine[2 * k]).abs() < 1e-15);
        }
        for (found, exact) in [(coarse[0], -1.0), (coarse[2], 0.0), (coarse[4], 1.0_f64)] {
            assert_eq!(found.to_bits(), exact.to_bits());
        }
    }

    #[test]
    fn fresh_points_are_inside_spread_and_none_is_in_a_table() {
        let fresh = fresh_points(1000, 3);
        let tables: Vec<f64> = chebyshev_points(33);
        for axis in 0..3 {
            let mut boxes = [0; 10];
            for point in &fresh {
                let t = point[axis];
                assert!(t.abs() < 1.0);
                boxes[((t + 1.0) * 5.0) as usize] += 1;
            }
            assert!(
                boxes.iter().all(|n| (90..=110).contains(n)),
                "{axis}: {boxes:?}"
            );
        }
        let nearest = fresh
            .iter()
            .flat_map(|p| tables.iter().map(|t| (p[0] - t).abs()))
            .fold(f64::INFINITY, f64::min);
        assert!(nearest > 1e-6, "{nearest}");
    }
}
