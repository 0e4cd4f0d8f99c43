//! Identities that the exact solution of every section fulfils, checked on the computed one.
//!
//! They cost nothing and each tests something else: the mean of the wall shear, its distribution, and the
//! field inside.

use crate::geometry::{Corner, Outline};

use super::grid_integrals::GridIntegrals;
use super::section_flow::{Identity, WallSample};

/// Tolerance per unit of `1 / cells_across` for the wall identities of a section without re-entrant
/// corners; chosen, not derived: at 64 to 128 cells smooth sections stay well below it.
const WALL_TOLERANCE: f64 = 0.6;
/// The same per unit of `cells_across^(-1/2)` where re-entrant corners make the shear unbounded.
const SINGULAR_TOLERANCE: f64 = 1.5;
/// Tolerance per unit of `1 / cells_across` for the two quadratures of `K`.
const ENERGY_TOLERANCE: f64 = 0.6;

/// The three identities; `samples` sorted along the wall, shear in m, `conductance` in m^4.
pub(crate) fn identities(
    outline: &Outline,
    corners: &[Vec<Corner>],
    samples: &[WallSample],
    conductance: f64,
    finest: (GridIntegrals, f64),
    cells_across: f64,
) -> Vec<Identity> {
    let singular = corners.iter().flatten().any(|c| c.turning < 0.0);
    let wall_tolerance = if singular {
        SINGULAR_TOLERANCE / cells_across.sqrt()
    } else {
        WALL_TOLERANCE / cells_across
    };
    let centre = outline.centroid();
    let (mut mean, mut rellich) = (0.0, 0.0);
    for (loop_index, wall) in outline.loops().enumerate() {
        let first = samples.partition_point(|s| s.loop_index < loop_index);
        let end = samples.partition_point(|s| s.loop_index <= loop_index);
        let (m, r) = along_loop(
            &samples[first..end],
            corners.get(loop_index).map_or(&[][..], Vec::as_slice),
            wall.length(),
            centre,
        );
        mean += m;
        rellich += r;
    }
    let (integrals, scale) = finest;
    let area = outline.area();
    vec![
        identity(
            "mean_wall_shear",
            "integral of abs(dphi/dn) over the wall = A",
            (mean, area),
            wall_tolerance,
        ),
        identity(
            "rellich",
            "integral of (r.n) (dphi/dn)^2 over the wall = 4 K",
            (rellich, 4.0 * conductance),
            wall_tolerance,
        ),
        identity(
            "energy",
            "integral of abs(grad phi)^2 = integral of phi, both on the finest grid",
            (integrals.conductance * scale, integrals.sum * scale),
            ENERGY_TOLERANCE / cells_across,
        ),
    ]
}

fn identity(
    name: &'static str,
    formula: &'static str,
    (computed, expected): (f64, f64),
    tolerance: f64,
) -> Identity {
    let relative_difference = computed / expected - 1.0;
    Identity {
        name,
        formula,
        computed,
        expected,
        relative_difference,
        tolerance,
        holds: relative_difference.abs() <= tolerance,
    }
}

/// Integrals of `abs(dphi/dn)` and of `(r.n) (dphi/dn)^2` along one closed loop: trapezoidal rule between
/// samples; the shear is zero at a convex corner, and beside any corner the nearest sample holds.
fn along_loop(
    samples: &[WallSample],
    corners: &[Corner],
    length: f64,
    centre: [f64; 2],
) -> (f64, f64) {
    // Arc length, shear, (r.n) shear^2; a corner is entered twice, once for either side.
    let mut points: Vec<(f64, f64, f64)> = samples
        .iter()
        .map(|s| {
            let arm = (s.at[0] - centre[0]) * s.normal[0] + (s.at[1] - centre[1]) * s.normal[1];
            let shear = s.shear_per_gradient;
            (s.arc_length, shear, arm * shear * shear)
        })
        .collect();
    if points.is_empty() {
        return (0.0, 0.0);
    }
    for corner in corners.iter().filter(|c| c.turning > 0.3) {
        points.push((corner.arc_length, 0.0, 0.0));
    }
    points.sort_by(|a, b| a.0.total_cmp(&b.0));
    let first = points[0];
    points.push((first.0 + length, first.1, first.2));
    points.windows(2).fold((0.0, 0.0), |(mean, rellich), pair| {
        let step = pair[1].0 - pair[0].0;
        (
            mean + 0.5 * step * (pair[0].1 + pair[1].1),
            rellich + 0.5 * step * (pair[0].2 + pair[1].2),
        )
    })
}
