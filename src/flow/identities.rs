//! Identities that the exact solution of every section fulfils, checked on the computed one.
//!
//! They cost little and each tests something else: the mean of the slopes at the wall, before the fluxes of the
//! cells correct the curve through them; the corrected curve; and the field inside.

use crate::geometry::{Corner, Outline};

use super::grid_integrals::GridIntegrals;
use super::section_flow::Identity;
use super::wall_curve::WallCurve;

/// Tolerances of the mean of the slopes and of Rellich's identity per unit of `cells_across^(-3/2)` for a section
/// without re-entrant corners; chosen above what was measured on the shipped sections at 16 to 256 cells, where
/// the worst are outlines with vertices closer than the grid (5.9 and 1.4; smooth walls 0.9 and 0.1).
const SMOOTH_TOLERANCE: [f64; 2] = [6.0, 1.5];
/// The same per unit of `1 / cells_across` with re-entrant corners: 1.5 and 1.0, but 7.9 and 5.5 with 58
/// scallops on either wall of a trench, which the grid does not resolve.
const SINGULAR_TOLERANCE: [f64; 2] = [6.0, 2.0];
/// Tolerance per unit of `1 / cells_across` for the two quadratures of `K`.
const ENERGY_TOLERANCE: f64 = 0.6;

/// The three identities; `conductance` in m^4.
///
/// - `plain`: integral of the curve before it was balanced, m^2; afterwards the identity holds by construction
pub(crate) fn identities(
    outline: &Outline,
    corners: &[Vec<Corner>],
    (curve, plain): (&WallCurve, f64),
    conductance: f64,
    finest: (GridIntegrals, f64),
    cells_across: f64,
) -> Vec<Identity> {
    let singular = corners.iter().flatten().any(|c| c.turning < 0.0);
    let [of_mean, of_rellich] = if singular {
        SINGULAR_TOLERANCE.map(|t| t / cells_across)
    } else {
        SMOOTH_TOLERANCE.map(|t| t / cells_across.powf(1.5))
    };
    let centre = outline.centroid();
    let rellich = curve.integrate(2, |place| {
        (place.at[0] - centre[0]) * place.normal[0] + (place.at[1] - centre[1]) * place.normal[1]
    });
    let (integrals, scale) = finest;
    let area = outline.area();
    vec![
        identity(
            "mean_wall_shear",
            "integral of abs(dphi/dn) over the wall = A, before the curve is balanced",
            (plain, area),
            of_mean,
        ),
        identity(
            "rellich",
            "integral of (r.n) (dphi/dn)^2 over the wall = 4 K",
            (rellich, 4.0 * conductance),
            of_rellich,
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
