//! From the solved grids to the answers of a section.

use crate::geometry::{Corner, Outline};
use crate::measured::Estimate;
use crate::proof::Bracket;

use super::accuracy::Accuracy;
use super::attempt::{Attempt, WallAnswer};
use super::extrapolation::{LOOSE, extrapolate, least_share};
use super::identities::identities;
use super::range_extrapolation::{Law, from_ranges, within};
use super::section_flow::{
    LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport, WallSample,
};
use super::solve_warnings::{ISLAND_CELLS, warnings};
use super::solved_grids::{GridAnswer, SolvedGrids};
use super::tangents::tangents;
use super::wall_curve::WallCurve;
use super::wall_shear::without_curve;

/// Fluid angle, radians, from which the term of a corner is removed by extrapolation: its exponent there
/// is 3.6.
const WIDE_CORNER: f64 = 100.0 * std::f64::consts::PI / 180.0;

/// The answers, from the grid that is kept.
///
/// - `conductance`: best value, m^4
pub(super) fn assemble(
    outline: &Outline,
    attempt: &Attempt,
    conductance: Estimate,
    wall: WallAnswer,
) -> SectionFlow {
    let Attempt {
        grids,
        grid,
        bracket,
        ..
    } = attempt;
    let SolvedGrids {
        lattice,
        corners,
        answers,
        ..
    } = grids;
    let geometry = geometry(outline);
    let h = grid.spacing;
    let over_grids = |of: &dyn Fn(&GridAnswer) -> f64| {
        let values: Vec<f64> = useful(answers).iter().map(of).collect();
        to_limit(outline, grids, &values)
    };
    let square = over_grids(&|a| a.integrals.square).scaled(h.powi(6));
    let cube = over_grids(&|a| a.integrals.cube).scaled(h.powi(8));
    let top = over_grids(&|a| a.peak.value).scaled(h * h);
    let finest = answers.first().map(|a| a.integrals).unwrap_or_default();
    let (area, diameter) = (geometry.area, geometry.hydraulic_diameter);
    let fanning_dh = diameter * diameter * area / (2.0 * conductance.value);
    let mut flow = SectionFlow {
        conductance,
        bracket: *bracket,
        conductance_finest_grid: finest.conductance * h.powi(4),
        fanning_dh,
        darcy_dh: 4.0 * fanning_dh,
        fanning_sqrt_area: 2.0 * area.powf(2.5) / (geometry.wetted_perimeter * conductance.value),
        peak: Peak {
            phi: top.value,
            to_mean: ratio(top, conductance, 1, area),
            at: answers
                .first()
                .map_or([0.0; 2], |a| lattice.position(a.peak.at)),
        },
        momentum_factor: ratio(square, conductance, 2, area),
        kinetic_energy_factor: ratio(cube, conductance, 3, area * area),
        wall_shear: without_curve(outline, corners, wall.samples),
        solver: solver_report(answers, h, attempt.seconds),
        grid: grid.clone(),
        geometry,
        identities: Vec::new(),
        accuracy: Accuracy {
            source: attempt.source,
            ..Accuracy::default()
        },
        warnings: Vec::new(),
    };
    finish(&mut flow, outline, grids, (wall.curve, wall.plain));
    flow
}

/// Adds the curve of the wall shear, the identities and the warnings.
///
/// - `curve`: with its mean before it was balanced
fn finish(
    flow: &mut SectionFlow,
    outline: &Outline,
    grids: &SolvedGrids,
    (curve, plain): (WallCurve, f64),
) {
    let shear = &mut flow.wall_shear;
    if let Some(largest) = curve.largest() {
        shear.max_per_gradient = largest.shear_per_gradient;
        shear.max_at = largest.at;
    }
    shear.curve = curve;
    let h = flow.grid.spacing;
    let finest = grids.answers.first().map(|a| a.integrals);
    flow.identities = identities(
        outline,
        &grids.corners,
        (&shear.curve, plain),
        flow.conductance.value,
        (finest.unwrap_or_default(), h.powi(4)),
        flow.grid.cells_across,
    );
    flow.warnings = warnings(flow, small_islands(outline, h), grids.mask.pinned.len());
}

/// Answers of the grids that extrapolation uses: grids with hardly any nodes say nothing about the limit.
fn useful(answers: &[GridAnswer]) -> &[GridAnswer] {
    let count = answers.iter().take_while(|a| a.nodes >= 9).count().max(1);
    answers.get(..count.min(4)).unwrap_or(answers)
}

/// Best value from one number of every useful grid.
fn to_limit(outline: &Outline, grids: &SolvedGrids, values: &[f64]) -> Estimate {
    let exponent = leading_exponent(&grids.corners);
    let least_share = least_share(
        convex_angles(&grids.corners),
        grids.facet_turning,
        grids.cells_in_diameter,
    );
    let mut estimate = extrapolate(values, exponent, grids.misfit, least_share);
    if let (Some(fine), true) = (
        values.first(),
        small_islands(outline, grids.lattice.spacing) > 0,
    ) {
        // The coarser grids hardly see such islands, so the sequence says less than it seems to.
        estimate.error = estimate.error.max((estimate.value - fine).abs());
    }
    estimate
}

/// Best value of `K`, m^4, from the sequence of grids and the proven ranges.
///
/// - `ranges`: proven, and that of the second grid, m^4
pub(super) fn best_conductance(
    outline: &Outline,
    grids: &SolvedGrids,
    samples: &[WallSample],
    [proven, coarse]: [Option<Bracket>; 2],
) -> Estimate {
    let spacing = grids.lattice.spacing;
    let curved = tangents(outline, samples, spacing);
    let values: Vec<f64> = useful(&grids.answers)
        .iter()
        .map(|answer| {
            let own = spacing * f64::from(answer.stride);
            // Without the excess at tangent walls.
            let excess: f64 = curved
                .iter()
                .map(|t| t.excess(grids.lattice.origin, own))
                .sum();
            answer.integrals.conductance * spacing.powi(4) - excess
        })
        .collect();
    let extrapolated = to_limit(outline, grids, &values);
    let Some(proven) = proven else {
        return extrapolated;
    };
    let re_entrant = leading_exponent(&grids.corners).filter(|p| *p < 2.0);
    match coarse {
        Some(coarse) => {
            let law = Law {
                re_entrant,
                is_one: re_entrant.is_some() && grids.misfit <= LOOSE,
            };
            from_ranges(extrapolated, [proven, coarse], law, grids.cells_in_diameter)
        }
        None => within(extrapolated, proven, re_entrant.is_some()),
    }
}

/// Fluid angles of the corners that are not re-entrant, radians.
fn convex_angles(corners: &[Vec<Corner>]) -> impl Iterator<Item = f64> {
    let all = corners.iter().flatten().map(Corner::fluid_angle);
    all.filter(|angle| *angle < std::f64::consts::PI)
}

/// `moment * factor / K^power` with its error.
fn ratio(moment: Estimate, conductance: Estimate, power: i32, factor: f64) -> Estimate {
    let value = moment.value * factor / conductance.value.powi(power);
    // Both errors come from the same grids; their sum is the careful choice.
    let relative = moment.relative() + f64::from(power) * conductance.relative();
    Estimate {
        value,
        error: value * relative,
    }
}

fn geometry(outline: &Outline) -> SectionGeometry {
    let (low, high) = outline.bounds().unwrap_or(([0.0; 2], [0.0; 2]));
    let (area, wetted_perimeter) = (outline.area(), outline.wetted_perimeter());
    SectionGeometry {
        area,
        wetted_perimeter,
        hydraulic_diameter: 4.0 * area / wetted_perimeter,
        width: high[0] - low[0],
        height: high[1] - low[1],
        lumens: outline.lumens.len(),
        islands: outline.lumens.iter().map(|l| l.islands.len()).sum(),
        vertices: outline.loops().map(|l| l.points.len()).sum(),
    }
}

/// Exponent `2 pi / omega` of the widest corner, `None` where every corner is so narrow that its term
/// vanishes among the rest.
pub(super) fn leading_exponent(corners: &[Vec<Corner>]) -> Option<f64> {
    let widest = corners
        .iter()
        .flatten()
        .map(Corner::fluid_angle)
        .fold(0.0, f64::max);
    // A crack cannot open further than the full turn.
    let widest = widest.min(std::f64::consts::TAU);
    (widest > WIDE_CORNER).then(|| std::f64::consts::TAU / widest)
}

fn solver_report(answers: &[GridAnswer], spacing: f64, seconds: f64) -> SolverReport {
    let levels = answers
        .iter()
        .map(|a| LevelReport {
            spacing: spacing * f64::from(a.stride),
            fluid_nodes: a.nodes,
            wall_nodes: a.wall_nodes,
            cycles: a.solved.cycles,
            conductance: a.integrals.conductance * spacing.powi(4),
        })
        .collect();
    let finest = answers.first().map(|a| a.solved);
    SolverReport {
        cycles: finest.map_or(0, |s| s.cycles),
        residual: finest.map_or(0.0, |s| s.residual),
        converged: answers.iter().all(|a| a.solved.converged),
        convergence_factor: finest.map_or(0.0, |s| s.convergence_factor),
        accelerated: answers.iter().any(|a| a.solved.accelerated),
        seconds,
        levels,
    }
}

/// Islands whose larger dimension spans fewer than [`ISLAND_CELLS`] cells.
fn small_islands(outline: &Outline, spacing: f64) -> usize {
    outline
        .lumens
        .iter()
        .flat_map(|lumen| &lumen.islands)
        .filter(|island| {
            let extent = |axis: usize| {
                let along = island.points.iter().map(|p| p[axis]);
                let low = along.clone().fold(f64::INFINITY, f64::min);
                along.fold(f64::NEG_INFINITY, f64::max) - low
            };
            extent(0).max(extent(1)) < ISLAND_CELLS * spacing
        })
        .count()
}
