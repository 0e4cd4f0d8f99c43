//! Correction of the energy sums where a curved wall is tangent to the lattice lines.
//!
//! The energy of a lattice line, as a function of the line's position, has a kink of power 3/2 where the
//! line becomes tangent to a wall of radius `r`: near the wall `phi` is `phi_n` times the distance, so
//! `phi_x` is `phi_n x / r`, and the chord of depth `d` carries `C d^(3/2)` with
//! `C = (2/3) 2^(3/2) phi_n^2 / sqrt(r)`. Summing over lines instead of integrating is then off by
//! `C h^(5/2) zeta(-3/2, t)`, where `t h` is the depth of the first line and `zeta` Hurwitz's function
//! (Euler-Maclaurin for an end singularity; P. J. Davis, P. Rabinowitz 1984, Methods of Numerical
//! Integration, section 2.9, from memory). The term jumps as the grid moves; taking it off leaves a smooth
//! error for extrapolation (K of a ring with inner radius a tenth of the outer, 128 cells: from 3e-5 to
//! 1e-6 over ten places of the grid).

use crate::geometry::{Loop, Outline, Point, distance, turning_at};

use super::section_flow::WallSample;

/// `(2/3) 2^(3/2)`.
const CHORD: f64 = 1.885_618_083_164_126_7;
/// Spacings of wall on either side that must be smooth around a tangent point.
const REACH: f64 = 1.5;
/// Vertices that this stretch must have at least: fewer are facets, not a curve.
const LEAST_VERTICES: usize = 6;
/// Largest turning of the wall over that stretch, radians.
const LARGEST_TURNING: f64 = 1.2;

/// A point where a smooth wall is tangent to a lattice axis.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Tangent {
    /// Axis that numbers the lines: 1 for rows, 0 for columns.
    axis: usize,
    /// Coordinate of the tangent point along that axis, m.
    at: f64,
    /// Direction in which the chord lies: +1 or -1 along the axis.
    inward: f64,
    /// `C` of the kink, m^(3/2), negative where the chord is solid (island).
    strength: f64,
}

impl Tangent {
    /// What the sum over the lines of a grid is too large by, m^4.
    ///
    /// - `origin`: coordinate of a lattice line, m; `spacing`: of the grid, m
    pub(crate) fn excess(&self, origin: Point, spacing: f64) -> f64 {
        let lines = (self.at - origin[self.axis]) / spacing;
        let depth = if self.inward > 0.0 {
            lines.ceil() - lines
        } else {
            lines - lines.floor()
        };
        self.strength * spacing.powf(2.5) * hurwitz_zeta(depth)
    }
}

/// All tangent points of smooth walls, for a finest spacing.
///
/// - `samples`: wall shear, sorted by loop and arc length
pub(crate) fn tangents(outline: &Outline, samples: &[WallSample], spacing: f64) -> Vec<Tangent> {
    let mut found = Vec::new();
    for (index, wall) in outline.loops().enumerate() {
        let points = &wall.points;
        let first = samples.partition_point(|s| s.loop_index < index);
        let end = samples.partition_point(|s| s.loop_index <= index);
        if points.len() < LEAST_VERTICES || first == end {
            continue;
        }
        let mut arc = 0.0;
        for k in 0..points.len() {
            let (before, here, after) = (
                points[(k + points.len() - 1) % points.len()],
                points[k],
                points[(k + 1) % points.len()],
            );
            for axis in 0..2 {
                let (rise, fall) = (here[axis] - before[axis], after[axis] - here[axis]);
                // Half-open, so that a vertex beside a level edge is taken once.
                if rise * fall > 0.0 || rise == 0.0 {
                    continue;
                }
                let near = nearest(&samples[first..end], arc);
                found.extend(tangent(wall, k, axis, spacing, near));
            }
            arc += distance(here, after);
        }
    }
    found
}

/// Shear of the sample nearest in arc length.
fn nearest(samples: &[WallSample], arc: f64) -> f64 {
    let after = samples.partition_point(|s| s.arc_length < arc);
    [after.checked_sub(1), Some(after)]
        .into_iter()
        .flatten()
        .filter_map(|k| samples.get(k))
        .min_by(|a, b| {
            (a.arc_length - arc)
                .abs()
                .total_cmp(&(b.arc_length - arc).abs())
        })
        .map_or(0.0, |s| s.shear_per_gradient)
}

/// The tangent point at vertex `k` if the wall around it is a smooth curve.
fn tangent(wall: &Loop, k: usize, axis: usize, spacing: f64, shear: f64) -> Option<Tangent> {
    let points = &wall.points;
    let n = points.len();
    let curvature = curvature(wall, k, REACH * spacing)?;
    let here = points[k][axis];
    let (before, after) = (points[(k + n - 1) % n][axis], points[(k + 1) % n][axis]);
    Some(Tangent {
        axis,
        at: here,
        inward: ((before - here) + (after - here)).signum(),
        // The fluid lies to the left: it fills the chord where the wall turns to the left.
        strength: curvature.signum() * CHORD * shear.powi(2) * curvature.abs().sqrt(),
    })
}

/// Curvature of the wall around vertex `k`, 1/m, if it is smooth over `reach` to either side.
fn curvature(wall: &Loop, k: usize, reach: f64) -> Option<f64> {
    let points = &wall.points;
    let n = points.len();
    let own = turning_at(wall, k);
    let (mut turning, mut largest, mut vertices) = (own, own.abs(), 1);
    for forward in [true, false] {
        let (mut j, mut walked) = (k, 0.0);
        loop {
            let next = if forward {
                (j + 1) % n
            } else {
                (j + n - 1) % n
            };
            walked += (points[next][0] - points[j][0]).hypot(points[next][1] - points[j][1]);
            if walked > reach {
                break;
            }
            let angle = turning_at(wall, next);
            turning += angle;
            largest = f64::max(largest, angle.abs());
            vertices += 1;
            if vertices > n {
                return None;
            }
            j = next;
        }
    }
    let smooth = vertices >= LEAST_VERTICES
        && (1e-6..LARGEST_TURNING).contains(&turning.abs())
        && largest < 0.5 * turning.abs();
    smooth.then(|| turning / (2.0 * reach))
}

/// Hurwitz's zeta function at -3/2, for `0 <= a <= 1`.
fn hurwitz_zeta(a: f64) -> f64 {
    const TERMS: i32 = 10;
    let s = -1.5_f64;
    let sum: f64 = (0..TERMS).map(|k| (a + f64::from(k)).powf(-s)).sum();
    let x = a + f64::from(TERMS);
    // Euler-Maclaurin for the rest.
    sum + x.powf(1.0 - s) / (s - 1.0) + 0.5 * x.powf(-s) + s * x.powf(-s - 1.0) / 12.0
        - s * (s + 1.0) * (s + 2.0) * x.powf(-s - 3.0) / 720.0
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn hurwitz_zeta_has_its_known_value_and_mean() {
        // zeta(-3/2) = -0.02548520188983..., computed with 30 digits.
        assert!((hurwitz_zeta(1.0) + 0.025_485_201_889_833).abs() < 1e-7);
        assert!((hurwitz_zeta(0.0) - hurwitz_zeta(1.0)).abs() < 1e-7);
        let mean: f64 = (0..1000)
            .map(|k| hurwitz_zeta((f64::from(k) + 0.5) / 1000.0))
            .sum::<f64>()
            / 1000.0;
        assert!(mean.abs() < 1e-6, "{mean}");
    }
}
