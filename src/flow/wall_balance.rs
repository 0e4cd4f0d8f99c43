//! The factor that makes a curve of the wall shear carry the balanced fluxes.
//!
//! Along a loop the factor is one plus a sum of hats, linear between marks several spacings apart. Every hat
//! times the factor times the curve has the integral that the fluxes give for the hat. So the flux into every
//! stretch of wall a few spacings long is right even where the wall is rough below the grid, and that into
//! the whole wall is exact, while the curve between the marks stays what it was.

/// Distance of the marks, in spacings.
const MARKS: f64 = 4.0;
/// Least number of marks round a loop; shorter loops have one factor.
const LEAST_MARKS: usize = 4;
/// Weight of the change from mark to mark against the integrals, where hats hold hardly any flux.
const STIFFNESS: f64 = 1e-6;
/// Relative residual at which the marks are found, and steps after which the search ends.
const RESIDUAL: f64 = 1e-13;
const MOST_STEPS: usize = 400;

/// A factor along a loop, as a function of arc length.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct BalanceFactor {
    /// Difference from one at the marks, evenly round the loop.
    changes: Vec<f64>,
    /// Marks per length, 1/m.
    density: f64,
}

impl BalanceFactor {
    /// No change.
    pub(crate) fn one() -> Self {
        Self {
            changes: vec![0.0],
            density: 0.0,
        }
    }

    /// No change, with the marks of a loop.
    ///
    /// - `length`: of the loop; `spacing`: of the lattice, m
    pub(crate) fn with_marks(length: f64, spacing: f64) -> Self {
        let count = (length / (MARKS * spacing)).floor() as usize;
        let count = if count < LEAST_MARKS { 1 } else { count };
        Self {
            changes: vec![0.0; count],
            density: count as f64 / length,
        }
    }

    /// Gives a curve the wanted fluxes.
    ///
    /// - `curve`: arc lengths and weighted shear, whose sum is the integral of the curve, m and m^2
    /// - `wanted`: arc lengths and fluxes, m and m^2
    pub(crate) fn fit(&mut self, curve: &[(f64, f64)], wanted: &[(f64, f64)]) {
        let count = self.changes.len();
        let mut diagonal = vec![0.0; count];
        let mut beside = vec![0.0; count];
        let mut right = vec![0.0; count];
        for &(s, flux) in wanted {
            let (k, next, t) = self.place(s);
            right[k] += (1.0 - t) * flux;
            right[next] += t * flux;
        }
        let mut total = 0.0;
        for &(s, flux) in curve {
            let (k, next, t) = self.place(s);
            let u = 1.0 - t;
            right[k] -= u * flux;
            right[next] -= t * flux;
            diagonal[k] += u * u * flux;
            diagonal[next] += t * t * flux;
            beside[k] += u * t * flux;
            total += flux;
        }
        if total > 0.0 {
            if count == 1 {
                self.changes[0] = right[0] / total;
            } else {
                let stiffness = STIFFNESS * total / count as f64;
                for k in 0..count {
                    diagonal[k] += 2.0 * stiffness;
                    beside[k] -= stiffness;
                }
                self.changes = solved(&diagonal, &beside, right);
            }
        }
    }

    /// Arc lengths of the marks between two arc lengths, m.
    pub(crate) fn marks(&self, from: f64, to: f64) -> impl Iterator<Item = f64> + use<> {
        let density = self.density;
        let (first, end) = if self.changes.len() > 1 {
            ((from * density).ceil() as i64, (to * density).floor() as i64)
        } else {
            (0, -1)
        };
        (first..=end).map(move |k| k as f64 / density)
    }

    /// The marks before and after a place and the share of the way between them.
    fn place(&self, arc_length: f64) -> (usize, usize, f64) {
        let count = self.changes.len();
        let at = arc_length * self.density;
        let floor = at.floor();
        let k = (floor as i64).rem_euclid(count as i64) as usize;
        let next = if k + 1 == count { 0 } else { k + 1 };
        (k, next, at - floor)
    }

    /// The factor at an arc length, m.
    pub(crate) fn at(&self, arc_length: f64) -> f64 {
        let (k, next, t) = self.place(arc_length);
        // The velocity stays positive.
        (1.0 + self.changes[k] + t * (self.changes[next] - self.changes[k])).max(0.0)
    }
}

/// Conjugate gradients, scaled by the diagonal, for a symmetric matrix with one value beside the diagonal,
/// round in a ring.
fn solved(diagonal: &[f64], beside: &[f64], mut residual: Vec<f64>) -> Vec<f64> {
    let n = diagonal.len();
    let dot = |a: &[f64], b: &[f64]| -> f64 { a.iter().zip(b).map(|(x, y)| x * y).sum() };
    let mut found = vec![0.0; n];
    let scaled = |r: &[f64]| -> Vec<f64> { r.iter().zip(diagonal).map(|(r, d)| r / d).collect() };
    let mut step = scaled(&residual);
    let mut size = dot(&residual, &step);
    let target = RESIDUAL * RESIDUAL * size;
    for _ in 0..MOST_STEPS {
        if size <= target {
            break;
        }
        let image: Vec<f64> = (0..n)
            .map(|k| {
                let (before, after) = ((k + n - 1) % n, (k + 1) % n);
                diagonal[k] * step[k] + beside[before] * step[before] + beside[k] * step[after]
            })
            .collect();
        let length = size / dot(&step, &image);
        for k in 0..n {
            found[k] += length * step[k];
            residual[k] -= length * image[k];
        }
        let next = scaled(&residual);
        let new_size = dot(&residual, &next);
        for k in 0..n {
            step[k] = next[k] + new_size / size * step[k];
        }
        size = new_size;
    }
    found
}
