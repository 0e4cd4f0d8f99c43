//! The largest value of `phi` and where it is: the top of the biquadratic through nine nodes.

use nalgebra::{Matrix2, Vector2};

use crate::grid::Mask;
use crate::solve::Field;

/// Largest value and its place, in lattice units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct GridPeak {
    pub(crate) value: f64,
    pub(crate) at: [f64; 2],
}

pub(crate) fn peak(mask: &Mask, phi: &Field) -> GridPeak {
    let mut best = (f64::NEG_INFINITY, 0, 0);
    for run in &mask.runs {
        for first in [run.first, run.first + 1] {
            if first >= run.end() {
                continue;
            }
            let (colour, node) = run.node(first);
            let count = (run.end() - first).div_ceil(2) as usize;
            let values = &phi.colour[colour as usize][node as usize..][..count];
            for (k, &value) in values.iter().enumerate() {
                if value > best.0 {
                    best = (value, first + 2 * k as u32, run.row);
                }
            }
        }
    }
    let (value, i, j) = best;
    let (value, step) = top(mask, phi, i, j).unwrap_or((value, [0.0; 2]));
    let size = f64::from(mask.stride);
    GridPeak {
        value,
        at: [
            size * (f64::from(i) + step[0]),
            size * (f64::from(j) + step[1]),
        ],
    }
}

/// Newton's method on the biquadratic through the nine nodes around `(i, j)`; `None` where not all nine
/// are fluid or the top is not inside.
fn top(mask: &Mask, phi: &Field, i: u32, j: u32) -> Option<(f64, [f64; 2])> {
    let mut nine = [[0.0; 3]; 3];
    for (row, values) in nine.iter_mut().enumerate() {
        for (column, value) in values.iter_mut().enumerate() {
            let x = (i + column as u32).checked_sub(1)?;
            let y = (j + row as u32).checked_sub(1)?;
            *value = phi.at(mask, x, y)?;
        }
    }
    let mut s = Vector2::zeros();
    for _ in 0..8 {
        let (gradient, hessian) = derivatives(&nine, s);
        // A ridge is flat along itself: without curvature there is nowhere to go in that direction.
        let eigen = hessian.symmetric_eigen();
        let steepest = eigen.eigenvalues.amax();
        let mut step = Vector2::zeros();
        for k in 0..2 {
            if eigen.eigenvalues[k] < -1e-6 * steepest {
                let direction = eigen.eigenvectors.column(k);
                step -= direction * (direction.dot(&gradient) / eigen.eigenvalues[k]);
            }
        }
        s += step;
        if s.amax() > 1.0 {
            return None;
        }
    }
    Some((value(&nine, s), [s.x, s.y]))
}

/// Quadratic through values at -1, 0, 1: value, first and second derivative at `s`.
fn along(v: [f64; 3], s: f64) -> [f64; 3] {
    let (slope, curvature) = (0.5 * (v[2] - v[0]), v[0] + v[2] - 2.0 * v[1]);
    [
        v[1] + slope * s + 0.5 * curvature * s * s,
        slope + curvature * s,
        curvature,
    ]
}

fn value(nine: &[[f64; 3]; 3], s: Vector2<f64>) -> f64 {
    along(nine.map(|row| along(row, s.x)[0]), s.y)[0]
}

fn derivatives(nine: &[[f64; 3]; 3], s: Vector2<f64>) -> (Vector2<f64>, Matrix2<f64>) {
    let rows = nine.map(|row| along(row, s.x));
    let part = |k: usize| along([rows[0][k], rows[1][k], rows[2][k]], s.y);
    let (plain, slope, curvature) = (part(0), part(1), part(2));
    (
        Vector2::new(slope[0], plain[1]),
        Matrix2::new(curvature[0], slope[1], slope[1], plain[2]),
    )
}
