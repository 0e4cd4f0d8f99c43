//! A straight line through most of the points, whatever the rest does.
//!
//! Repeated median: slope = median over `i` of the median over `j` of `(z_j - z_i) / (x_j - x_i)`; up to
//! half of the points may be anything. Siegel (1982), *Robust regression using repeated medians*,
//! Biometrika 69, 242; from memory. Its cost is quadratic, so it works on medians of blocks.

use crate::intake::order_statistics::{median, scatter_about};

/// Where the bisquare weight of a residual falls to zero, in robust standard deviations (95 % efficient
/// for normal scatter; from memory).
const BISQUARE_REACH: f64 = 4.685;

/// A line `level + slope (x - middle)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Line {
    /// Where the level is taken, m.
    pub(super) middle: f64,
    /// Height there, m.
    pub(super) level: f64,
    /// Slope, 1.
    pub(super) slope: f64,
    /// Robust standard deviation of the points about it, m.
    pub(super) scatter: f64,
}

impl Line {
    /// Its height at `x`.
    pub(super) fn at(&self, x: f64) -> f64 {
        self.level + self.slope * (x - self.middle)
    }
}

/// The bisquare weight of a residual.
pub(super) fn bisquare(residual: f64, scatter: f64) -> f64 {
    let u = residual / (BISQUARE_REACH * scatter);
    if u.abs() < 1.0 {
        let rest = 1.0 - u * u;
        rest * rest
    } else {
        // Exact data have no scatter; then only exact points count.
        f64::from(u8::from(residual.abs() <= 0.0))
    }
}

/// Medians of at most `count` blocks of neighbouring points.
fn block_medians(x: &[f64], z: &[f64], count: usize) -> (Vec<f64>, Vec<f64>) {
    let size = x.len().div_ceil(count.max(1)).max(1);
    let middles = x.chunks(size).map(|block| {
        let (first, last) = (block[0], block[block.len() - 1]);
        0.5 * (first + last)
    });
    let levels = z.chunks(size).map(|block| median(&mut block.to_vec()));
    (middles.collect(), levels.collect())
}

/// The robust line through points, on the medians of at most `count` blocks; `None` for less than two
/// places.
pub(super) fn robust_line(x: &[f64], z: &[f64], count: usize) -> Option<Line> {
    let (xs, zs) = block_medians(x, z, count);
    let mut outer = Vec::with_capacity(xs.len());
    let mut inner = Vec::with_capacity(xs.len());
    for (i, (&xi, &zi)) in xs.iter().zip(&zs).enumerate() {
        inner.clear();
        inner.extend(
            xs.iter()
                .zip(&zs)
                .enumerate()
                .filter(|(j, _)| *j != i)
                .map(|(_, (&xj, &zj))| (zj - zi) / (xj - xi))
                .filter(|slope| slope.is_finite()),
        );
        if !inner.is_empty() {
            outer.push(median(&mut inner));
        }
    }
    if outer.is_empty() {
        return None;
    }
    let slope = median(&mut outer);
    let (first, last) = (x.first()?, x.last()?);
    let middle = 0.5 * (first + last);
    let mut rests: Vec<f64> = xs
        .iter()
        .zip(&zs)
        .map(|(x, z)| z - slope * (x - middle))
        .collect();
    let level = median(&mut rests);
    let line = Line {
        middle,
        level,
        slope,
        scatter: 0.0,
    };
    let stride = (x.len() / 2000).max(1);
    let mut distances: Vec<f64> = x
        .iter()
        .zip(z)
        .step_by(stride)
        .map(|(&x, &z)| z - line.at(x))
        .collect();
    let scatter = scatter_about(&mut distances, 0.0);
    line.polished(x, z, scatter)
}

impl Line {
    /// One step of weighted least squares from this line, which takes back the efficiency that medians
    /// lose.
    fn polished(self, x: &[f64], z: &[f64], scatter: f64) -> Option<Self> {
        let mut sums = [0.0_f64; 5];
        for (&x, &z) in x.iter().zip(z) {
            let r = z - self.at(x);
            let w = bisquare(r, scatter);
            let t = x - self.middle;
            for (sum, term) in sums.iter_mut().zip([w, w * t, w * t * t, w * r, w * r * t]) {
                *sum += term;
            }
        }
        let [w, wt, wtt, wr, wrt] = sums;
        let determinant = w * wtt - wt * wt;
        let usable = w > 0.0 && determinant > 1e-9 * w * wtt;
        let (level, slope) = if usable {
            (
                (wtt * wr - wt * wrt) / determinant,
                (w * wrt - wt * wr) / determinant,
            )
        } else {
            (0.0, 0.0)
        };
        let line = Self {
            level: self.level + level,
            slope: self.slope + slope,
            scatter,
            ..self
        };
        (line.level.is_finite() && line.slope.is_finite()).then_some(line)
    }
}

/// The least-squares line through points; `None` for less than two places.
pub(super) fn least_squares_line(x: &[f64], z: &[f64]) -> Option<Line> {
    let n = x.len() as f64;
    let middle = x.iter().sum::<f64>() / n;
    let level = z.iter().sum::<f64>() / n;
    let (mut xx, mut xz) = (0.0, 0.0);
    for (&x, &z) in x.iter().zip(z) {
        xx += (x - middle) * (x - middle);
        xz += (x - middle) * (z - level);
    }
    let slope = xz / xx;
    if !slope.is_finite() {
        return None;
    }
    let line = Line {
        middle,
        level,
        slope,
        scatter: 0.0,
    };
    let squares: f64 = x
        .iter()
        .zip(z)
        .map(|(&x, &z)| (z - line.at(x)) * (z - line.at(x)))
        .sum();
    Some(Line {
        scatter: (squares / n).sqrt(),
        ..line
    })
}

/// The typical slope of a trace: median of the slopes between samples a hundredth of the trace apart.
///
/// Walls go up as often as down, so they drop out.
pub(super) fn typical_slope(x: &[f64], z: &[f64]) -> f64 {
    let lag = (x.len() / 100).max(1);
    let stride = (x.len() / 50_000).max(1);
    let mut slopes: Vec<f64> = (0..x.len().saturating_sub(lag))
        .step_by(stride)
        .map(|k| (z[k + lag] - z[k]) / (x[k + lag] - x[k]))
        .filter(|slope| slope.is_finite())
        .collect();
    let slope = median(&mut slopes);
    if slope.is_finite() { slope } else { 0.0 }
}

/// Robust standard deviation of values about their median, never quite zero.
pub(super) fn spread(values: &[f64], least: f64) -> f64 {
    let mut sorted = values.to_vec();
    let centre = median(&mut sorted);
    scatter_about(&mut sorted, centre).max(least)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_third_of_dust_does_not_turn_the_robust_line() {
        let x: Vec<f64> = (0..300).map(f64::from).collect();
        let z: Vec<f64> = x
            .iter()
            .map(|x| if *x > 200.0 { 50.0 } else { 1.0 + 0.1 * x })
            .collect();
        let robust = robust_line(&x, &z, 100).unwrap();
        assert!((robust.slope - 0.1).abs() < 1e-9);
        assert!((robust.at(0.0) - 1.0).abs() < 1e-9);
        let plain = least_squares_line(&x, &z).unwrap();
        assert!((plain.slope - 0.1).abs() > 0.05);
        assert!(robust_line(&[1.0], &[1.0], 100).is_none());
        assert!(robust_line(&[], &[], 100).is_none());
        assert!(least_squares_line(&[], &[]).is_none());
    }

    #[test]
    fn walls_drop_out_of_the_typical_slope() {
        let x: Vec<f64> = (0..1000).map(f64::from).collect();
        let z: Vec<f64> = x
            .iter()
            .map(|x| 0.02 * x - if (x % 100.0) > 60.0 { 30.0 } else { 0.0 })
            .collect();
        assert!((typical_slope(&x, &z) - 0.02).abs() < 1e-12);
        assert!(typical_slope(&[], &[]).abs() < 1e-30);
    }
}
