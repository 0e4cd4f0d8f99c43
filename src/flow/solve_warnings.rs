//! Warnings about a solved section.

use crate::warning::{Code, Warning};

use super::section_flow::SectionFlow;

/// Cells that an island must span to be seen by the three finest grids.
pub(super) const ISLAND_CELLS: f64 = 10.0;
/// Relative difference of the mean of the balanced wall shear from `A / P` that is rounding and quadrature.
const BALANCED: f64 = 1e-4;

pub(super) fn warnings(
    flow: &SectionFlow,
    small_islands: usize,
    lost_islands: usize,
) -> Vec<Warning> {
    let mut warnings = Vec::new();
    for identity in flow.identities.iter().filter(|i| !i.holds) {
        warnings.push(Warning {
            code: Code::IdentityFailed,
            message: format!(
                "{}: off by {:.2} %, allowed {:.2} % on this grid",
                identity.formula,
                100.0 * identity.relative_difference,
                100.0 * identity.tolerance
            ),
            advice: format!(
                "the wall shear along the wall is less sure than its mean and the conductance; for the wall \
                 shear type --cells-across {:.0} and compare",
                2.0 * flow.grid.cells_across
            ),
            numbers: vec![
                ("relative_difference", identity.relative_difference),
                ("tolerance", identity.tolerance),
            ],
        });
    }
    warnings.extend(unbalanced(flow));
    if !flow.solver.converged {
        warnings.push(Warning {
            code: Code::SolverSlow,
            message: format!(
                "the solver stopped after {} cycles at a residual of {:.1e}",
                flow.solver.cycles, flow.solver.residual
            ),
            advice: "the estimated error does not cover this; try another --cells-across"
                .to_owned(),
            numbers: vec![("residual", flow.solver.residual)],
        });
    }
    if let Some(&[x, y]) = flow.wall_shear.singular_corners.first() {
        let count = flow.wall_shear.singular_corners.len();
        warnings.push(Warning {
            code: Code::ShearSingular,
            message: format!(
                "{count} re-entrant corner(s), the first at ({:.3}, {:.3}) \u{b5}m: the wall shear of the \
                 sharp outline has no bound there; the largest value given takes its mean over up to \
                 {:.3} \u{b5}m beside each of them",
                x * 1e6,
                y * 1e6,
                flow.wall_shear.curve.singular_length * 1e6
            ),
            advice: "use the mean wall shear, or give the corner the radius it really has".to_owned(),
            numbers: vec![("corners", count as f64), ("x_m", x), ("y_m", y)],
        });
    }
    if small_islands > 0 {
        warnings.push(Warning {
            code: Code::ThinPart,
            message: format!(
                "{small_islands} island(s) span fewer than {ISLAND_CELLS} cells of {:.3e} m; {lost_islands} of \
                 them fall between the grid lines and stand as single wall nodes",
                flow.grid.spacing
            ),
            advice: "use a larger --cells-across so that every island spans more cells".to_owned(),
            numbers: vec![
                ("islands", small_islands as f64),
                ("islands_between_lines", lost_islands as f64),
                ("spacing_m", flow.grid.spacing),
            ],
        });
    }
    warnings
}

/// Where the fluxes beside the wall could not be balanced, so that the curve is that of the slopes.
fn unbalanced(flow: &SectionFlow) -> Option<Warning> {
    let loops = &flow.wall_shear.curve.loops;
    let received: f64 = loops.iter().map(|along| along.received).sum();
    let off = received / flow.geometry.area - 1.0;
    (off.is_nan() || off.abs() > BALANCED).then(|| Warning {
        code: Code::IdentityFailed,
        message: format!(
            "the fluxes into the wall could not be balanced cell by cell: the mean of the wall shear along the \
             wall is off by {:.2} %",
            100.0 * off
        ),
        advice: format!(
            "the grid is too coarse for some part of the wall; type --cells-across {:.0}",
            2.0 * flow.grid.cells_across
        ),
        numbers: vec![("relative_difference", off)],
    })
}
