//! The factor that makes a curve of the wall shear carry the balanced fluxes.
//!
//! Along a loop the factor is one plus a sum of hats, linear between marks several spacings apart. Every hat
//! times the factor times the curve has the integral that the fluxes give for the hat. So the flux into every
//! stretch of wall a few spacings long is right even where the wall is rough below the grid, and that into
//! the whole wall is exact, while the curve between the marks stays what it was. Around a re-entrant corner,
//! where differences of nodes are no fluxes, the factor is the same over several spacings.

use super::wall_path::way_forward;

/// Distance of the marks, in spacings.
const MARKS: f64 = 4.0;
/// Distance from a re-entrant corner up to which the factor is the same, in spacings: nearer to it the fluxes
/// between cells are not resolved.
const PLATEAU: f64 = 8.0;
/// The same as a share of the way to the next re-entrant corner.
const PLATEAU_SHARE: f64 = 0.35;
/// Loops shorter than this, in spacings, have one factor.
const SHORT_LOOP: f64 = 16.0;
/// Weight of the change from mark to mark against the integrals, where hats hold hardly any flux.
const STIFFNESS: f64 = 1e-6;
/// Relative residual at which the marks are found, and steps after which the search ends.
const RESIDUAL: f64 = 1e-13;
const MOST_STEPS: usize = 400;

/// A factor along a loop, as a function of arc length.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct BalanceFactor {
    /// Difference from one, by the index of a mark; indices follow each other round the loop.
    changes: Vec<f64>,
    /// Arc lengths and indices of the marks from the last one before the loop to the first one past it, m. Two
    /// in a row have the same index where the factor does not change.
    marks: Vec<(f64, usize)>,
    /// Length of the loop, m.
    length: f64,
    /// First mark past the begin of each of as many equal parts of the loop as there are marks.
    parts: Vec<u32>,
}

impl BalanceFactor {
    /// No change, with the marks of a loop.
    ///
    /// - `length`: of the loop; `spacing`: of the lattice, m
    /// - `singular`: arc lengths of its re-entrant corners, sorted, m
    pub(crate) fn with_marks(length: f64, spacing: f64, singular: &[f64]) -> Self {
        if length < SHORT_LOOP * spacing {
            return Self::new(vec![0.0], vec![(0.0, 0), (length, 0)], length);
        }
        let gap = |k: usize| {
            let next = singular[(k + 1) % singular.len()];
            way_forward(singular[k], next, length)
        };
        // Once round from the first corner, or from the first vertex.
        let mut around: Vec<(f64, usize)> = Vec::new();
        let mut count = 0;
        let mut fill = |around: &mut Vec<(f64, usize)>, from: f64, to: f64| {
            let pieces = ((to - from) / (MARKS * spacing)).floor().max(1.0);
            for k in 1..pieces as usize {
                count += 1;
                around.push((from + (to - from) * k as f64 / pieces, count));
            }
            count += 1;
            count
        };
        if singular.is_empty() {
            around.push((0.0, 0));
            fill(&mut around, 0.0, length);
        }
        let mut own = 0;
        for (k, &corner) in singular.iter().enumerate() {
            let before = gap((k + singular.len() - 1) % singular.len());
            let after = gap(k);
            let half = |gap: f64| (PLATEAU * spacing).min(PLATEAU_SHARE * gap);
            around.push((corner - half(before.min(after)), own));
            around.push((corner + half(before.min(after)), own));
            let next = (k + 1) % singular.len();
            let far = half(after.min(gap(next)));
            own = fill(
                &mut around,
                corner + half(before.min(after)),
                corner + after - far,
            );
        }
        let mut marks: Vec<(f64, usize)> = [-length, 0.0, length]
            .iter()
            .flat_map(|turn| around.iter().map(move |&(s, k)| (s + turn, k)))
            .collect();
        let first = marks
            .partition_point(|mark| mark.0 <= 0.0)
            .saturating_sub(1);
        let end = marks.partition_point(|mark| mark.0 < length) + 1;
        marks.truncate(end);
        marks.drain(..first);
        Self::new(vec![0.0; count], marks, length)
    }

    fn new(changes: Vec<f64>, marks: Vec<(f64, usize)>, length: f64) -> Self {
        let part = length / marks.len() as f64;
        let parts = (0..marks.len())
            .map(|k| marks.partition_point(|m| m.0 <= k as f64 * part) as u32)
            .collect();
        Self {
            changes,
            marks,
            length,
            parts,
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
            total += flux;
            if k == next {
                right[k] -= flux;
                diagonal[k] += flux;
                continue;
            }
            let u = 1.0 - t;
            right[k] -= u * flux;
            right[next] -= t * flux;
            diagonal[k] += u * u * flux;
            diagonal[next] += t * t * flux;
            beside[k] += u * t * flux;
        }
        if total > 0.0 {
            let stiffness = STIFFNESS * total / count as f64;
            for k in 0..count {
                diagonal[k] += 2.0 * stiffness;
                beside[k] -= stiffness;
            }
            self.changes = solved(&diagonal, &beside, right);
        }
    }

    /// Arc lengths of the marks between two arc lengths, which may lie a turn ahead, m.
    pub(crate) fn marks(&self, from: f64, to: f64) -> impl Iterator<Item = f64> + '_ {
        [0.0, self.length].into_iter().flat_map(move |turn| {
            let first = self.marks.partition_point(|m| m.0 + turn < from.max(turn));
            self.marks[first..]
                .iter()
                .map(move |m| m.0 + turn)
                .take_while(move |&s| s <= to && s <= turn + self.length)
        })
    }

    /// The marks before and after a place and the share of the way between them.
    fn place(&self, arc_length: f64) -> (usize, usize, f64) {
        let s = if (0.0..=self.length).contains(&arc_length) {
            arc_length
        } else {
            arc_length.rem_euclid(self.length)
        };
        let part = (s / self.length * self.parts.len() as f64) as usize;
        // One part back, against rounding.
        let mut next = self.parts[part.min(self.parts.len() - 1).saturating_sub(1)] as usize;
        while self.marks.get(next).is_some_and(|m| m.0 <= s) {
            next += 1;
        }
        let next = next.clamp(1, self.marks.len() - 1);
        let ((from, k), (to, after)) = (self.marks[next - 1], self.marks[next]);
        (k, after, (s - from) / (to - from))
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
