//! The main job: from an outline to its [`SectionFlow`].

use std::time::Instant;

use crate::geometry::{Corner, Outline, Point, largest_inscribed_circle};
use crate::grid::{Lattice, LineCrossings, Mask, ResolutionError, spacing};
use crate::measured::Estimate;
use crate::proof::{Bracket, ProofError, bracket};
use crate::solve::{Field, Hierarchy, SolveControl, Solved};
use crate::warning::{Code, Warning};

use super::corner_alignment::{Alignment, align};
use super::extrapolation::extrapolate;
use super::field::DenseField;
use super::grid_integrals::GridIntegrals;
use super::identities::identities;
use super::peak::{GridPeak, peak};
use super::section_flow::{
    GridReport, LevelReport, Peak, SectionFlow, SectionGeometry, SolverReport,
};
use super::tangents::{Tangent, tangents};
use super::wall_shear::{corners_of, wall_shear};

/// Cells across the smallest lumen that the accuracy search starts from.
const FIRST_CELLS_ACROSS: f64 = 64.0;
/// Cells across beyond which the accuracy search does not go by itself.
const LAST_CELLS_ACROSS: f64 = 1024.0;
/// Fluid nodes beyond which the accuracy search does not go by itself.
const LAST_NODES: f64 = 2e7;
/// Residual as a share of `1 / cells_across^2`: far enough below the discretisation error that
/// extrapolation over the grids is not disturbed.
const RESIDUAL_SHARE: f64 = 0.002;
/// Where the lattice lies where corners are nearly flat, in lines: in step with the lower left corner on
/// the finest grid only, so that the places below are spread evenly over all three. Chosen on the regular
/// polygons of `tests/convergence.rs`, which therefore do not test the choice independently.
const FIRST_PLACE: [f64; 2] = [2.0, 2.0];
/// Other places over which K is averaged there.
const OTHER_PLACES: [[f64; 2]; 3] = [[0.4721, 1.0195], [2.9443, 0.0390], [1.4164, 3.0586]];
/// Exponent below which the widest corner counts as nearly flat: from 135 degrees.
const FLAT_EXPONENT: f64 = 8.0 / 3.0;
/// Fluid nodes up to which it is averaged: beyond, such corners no longer matter.
const AVERAGED_NODES: usize = 200_000;
/// Fluid angle, radians, from which the term of a corner is removed by extrapolation: its exponent there
/// is 3.6.
const WIDE_CORNER: f64 = 100.0 * std::f64::consts::PI / 180.0;
/// Cells that an island must span to be seen by the three finest grids.
const ISLAND_CELLS: f64 = 10.0;
/// Estimated relative error of `K` from which a grid that was asked for is called rough.
const ROUGH: f64 = 1e-3;
/// Relative error of `K` that the default grid aims at.
pub const DEFAULT_ACCURACY: f64 = 1e-4;

/// What to solve for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SolveOptions {
    /// Cells across the largest circle that fits into the smallest lumen; `None` refines until the
    /// estimated error of `K` is within `accuracy`.
    pub cells_across: Option<f64>,
    /// Relative error of `K` aimed at when `cells_across` is `None`.
    pub accuracy: f64,
    /// Where the lower left corner of the bounding box falls behind the first lattice lines, in units of
    /// the spacing, not negative; `None` puts the sharpest re-entrant corner on a node of every grid, or
    /// the lower left corner on the first lattice lines where there is no such corner.
    pub grid_offset: Option<[f64; 2]>,
    /// Memory that one solve may use, bytes.
    pub memory_limit: f64,
}

impl Default for SolveOptions {
    fn default() -> Self {
        Self {
            cells_across: None,
            accuracy: DEFAULT_ACCURACY,
            grid_offset: None,
            memory_limit: 8e9,
        }
    }
}

/// Why a section was not solved.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum FlowError {
    /// The grid was refused.
    #[error(transparent)]
    Resolution(#[from] ResolutionError),
    /// No lattice node falls into the section.
    #[error("no node of the grid (spacing {spacing:.3e} m) falls into the section")]
    NoFluidNode {
        /// Node distance, m.
        spacing: f64,
    },
    /// The outline has no area.
    #[error("the section has no area ({area:.3e} m^2)")]
    NoArea {
        /// Area, m^2.
        area: f64,
    },
}

impl FlowError {
    /// What the user can do.
    pub fn hint(&self) -> String {
        match self {
            Self::Resolution(error) => error.hint(),
            Self::NoFluidNode { .. } => "use a larger --cells-across".to_owned(),
            Self::NoArea { .. } => "run `etchwise check` on the outline".to_owned(),
        }
    }
}

/// A solved section: the answers, and the field they came from.
#[derive(Debug)]
pub struct SolvedSection {
    /// The answers.
    pub flow: SectionFlow,
    outline: Outline,
    lattice: Lattice,
    mask: Mask,
    phi: Field,
}

impl SolvedSection {
    /// The outline that was solved, oriented.
    pub fn outline(&self) -> &Outline {
        &self.outline
    }

    /// The field on a plain lattice of at most about `most_nodes` nodes, thinned if need be.
    pub fn dense_field(&self, most_nodes: usize) -> DenseField {
        DenseField::new(&self.lattice, &self.mask, &self.phi, most_nodes)
    }
}

/// Solves a section.
///
/// - `outline`: valid (see `Outline::problems`), metres
///
/// # Errors
/// [`FlowError`] when the grid is refused or the outline holds no fluid.
///
/// # Examples
/// ```
/// use etchwise::{flow::{SolveOptions, solve_outline}, geometry::Outline};
/// let a = 100e-6;
/// let square = Outline::single(vec![[0.0, 0.0], [a, 0.0], [a, a], [0.0, a]]);
/// let flow = solve_outline(&square, &SolveOptions::default())?.flow;
/// assert!((flow.fanning_dh - 14.227077).abs() < 2e-4);
/// # Ok::<(), etchwise::flow::FlowError>(())
/// ```
pub fn solve_outline(
    outline: &Outline,
    options: &SolveOptions,
) -> Result<SolvedSection, FlowError> {
    let outline = outline.clone().oriented();
    let area = outline.area();
    if area.is_nan() || area <= 0.0 {
        return Err(FlowError::NoArea { area });
    }
    let diameter = outline
        .lumens
        .iter()
        .map(|lumen| largest_inscribed_circle(lumen).map_or(0.0, |circle| 2.0 * circle.radius))
        .fold(f64::INFINITY, f64::min);
    let attempt = |cells: f64| solve_at(&outline, diameter, cells, options);
    let Some(cells) = options.cells_across else {
        return refine(&outline, diameter, options, attempt);
    };
    let mut solved = attempt(cells)?;
    warn_if_rough(&mut solved.flow, options.accuracy.max(ROUGH));
    Ok(solved)
}

/// Adds a warning where the estimated error of `K` is above a limit.
fn warn_if_rough(flow: &mut SectionFlow, limit: f64) {
    let reached = flow.conductance.relative();
    if reached > limit {
        flow.warnings.push(Warning {
            code: Code::AccuracyNotReached,
            message: format!(
                "the estimated numerical error of the conductance is {:.2} %, above {:.2} %",
                100.0 * reached,
                100.0 * limit
            ),
            advice: "ask for a finer grid with --cells-across".to_owned(),
            numbers: vec![("reached", reached), ("asked", limit)],
        });
    }
}

/// Doubles the cells across until the estimated error of `K` is within the accuracy.
fn refine(
    outline: &Outline,
    diameter: f64,
    options: &SolveOptions,
    attempt: impl Fn(f64) -> Result<SolvedSection, FlowError>,
) -> Result<SolvedSection, FlowError> {
    let mut cells = FIRST_CELLS_ACROSS;
    let mut solved = attempt(cells)?;
    while solved.flow.conductance.relative() > options.accuracy {
        let next = 2.0 * cells;
        let nodes = outline.area() * (next / diameter).powi(2);
        if next > LAST_CELLS_ACROSS
            || nodes > LAST_NODES
            || spacing(outline, diameter, next, options.memory_limit).is_err()
        {
            break;
        }
        cells = next;
        solved = attempt(cells)?;
    }
    warn_if_rough(&mut solved.flow, options.accuracy);
    Ok(solved)
}

/// What one grid of the sequence said.
struct GridAnswer {
    stride: u32,
    nodes: usize,
    wall_nodes: usize,
    solved: Solved,
    integrals: GridIntegrals,
    peak: GridPeak,
}

fn solve_at(
    outline: &Outline,
    diameter: f64,
    cells_across: f64,
    options: &SolveOptions,
) -> Result<SolvedSection, FlowError> {
    let start = Instant::now();
    let asked = spacing(outline, diameter, cells_across, options.memory_limit)?;
    let corners = corners_of(outline, asked);
    let is_flat = options.grid_offset.is_none()
        && leading_exponent(&corners).is_some_and(|p| (2.0..FLAT_EXPONENT).contains(&p));
    let fitted = match options.grid_offset {
        None if is_flat => Alignment {
            spacing: asked,
            offset: FIRST_PLACE,
            misfit: 0.0,
        },
        None => align(outline, &corners, asked),
        Some(offset) => Alignment {
            spacing: asked,
            offset,
            misfit: 1.0,
        },
    };
    let spacing = fitted.spacing;
    let (lattice, hierarchy, answers) =
        grid_sequence(outline, spacing, fitted.offset, cells_across)
            .ok_or(FlowError::NoFluidNode { spacing })?;
    let (mask, phi) = hierarchy.into_finest();
    let others: Vec<(Point, Vec<GridAnswer>)> = OTHER_PLACES
        .iter()
        .filter(|_| is_flat && mask.nodes() <= AVERAGED_NODES)
        .filter_map(|&place| grid_sequence(outline, spacing, place, cells_across))
        .map(|(other, _, answers)| (other.origin, answers))
        .collect();
    let seconds = start.elapsed().as_secs_f64();
    let bracket = bracket(&lattice, &mask, &phi).map(|b| b.scaled(spacing.powi(4)));
    let grid = GridReport {
        spacing,
        fluid_nodes: mask.nodes(),
        cells_across: diameter / spacing,
        inscribed_diameter: diameter,
    };
    let solution = Solution {
        lattice: &lattice,
        mask: &mask,
        phi: &phi,
        corners,
        misfit: fitted.misfit,
        bracket,
        answers,
        others,
    };
    let flow = assemble(outline, &solution, grid, seconds);
    Ok(SolvedSection {
        flow,
        outline: outline.clone(),
        lattice,
        mask,
        phi,
    })
}

/// Solves every grid of the sequence on a lattice in a given place; answers finest first.
fn grid_sequence(
    outline: &Outline,
    spacing: f64,
    offset: [f64; 2],
    cells_across: f64,
) -> Option<(Lattice, Hierarchy, Vec<GridAnswer>)> {
    let lattice = Lattice::new(outline, spacing, offset);
    let rows = LineCrossings::rows(&lattice);
    let columns = LineCrossings::columns(&lattice);
    let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns)?;
    let control = SolveControl {
        residual: RESIDUAL_SHARE / (cells_across * cells_across),
        most_cycles: 100,
    };
    let mut answers = Vec::new();
    hierarchy.solve(control, |grid, solved| {
        answers.push(GridAnswer {
            stride: grid.mask.stride,
            nodes: grid.mask.nodes(),
            wall_nodes: grid.mask.wall.iter().map(Vec::len).sum(),
            solved,
            integrals: GridIntegrals::new(&grid.mask, &grid.phi),
            peak: peak(&grid.mask, &grid.phi),
        });
    });
    answers.reverse();
    Some((lattice, hierarchy, answers))
}

/// Everything the answers are read from.
struct Solution<'a> {
    lattice: &'a Lattice,
    mask: &'a Mask,
    phi: &'a Field,
    corners: Vec<Vec<Corner>>,
    /// How far re-entrant corners miss the nodes, 0 to 1.
    misfit: f64,
    /// m^4.
    bracket: Result<Bracket, ProofError>,
    /// Finest first.
    answers: Vec<GridAnswer>,
    /// Answers on the lattice in other places, with its origin.
    others: Vec<(Point, Vec<GridAnswer>)>,
}

fn assemble(outline: &Outline, solution: &Solution, grid: GridReport, seconds: f64) -> SectionFlow {
    let Solution {
        lattice,
        mask,
        phi,
        corners,
        misfit,
        bracket,
        answers,
        others,
    } = solution;
    let geometry = geometry(outline);
    let exponent = leading_exponent(corners);
    let h = grid.spacing;
    let small = small_islands(outline, h);
    // Grids with hardly any nodes say nothing about the limit.
    let useful = answers.iter().take_while(|a| a.nodes >= 9).count().max(1);
    let to_limit = |values: &[f64], averaged: bool| {
        let mut estimate = extrapolate(values, exponent, *misfit, averaged);
        if let (Some(fine), true) = (values.first(), small > 0) {
            // The coarser grids hardly see such islands, so the sequence says less than it seems to.
            estimate.error = estimate.error.max((estimate.value - fine).abs());
        }
        estimate
    };
    let over_grids = |of: &dyn Fn(&GridAnswer) -> f64| {
        let values: Vec<f64> = answers[..useful].iter().take(3).map(of).collect();
        to_limit(&values, false)
    };
    let shear = wall_shear(outline, lattice, mask, phi, corners.clone());
    let curved = tangents(outline, &shear.samples, h);
    let values = mean_conductances(solution, &curved, h, useful.min(3));
    let mut conductance = to_limit(&values, !others.is_empty());
    if let Ok(proven) = bracket {
        conductance = within(conductance, *proven);
    }
    let square = over_grids(&|a| a.integrals.square).scaled(h.powi(6));
    let cube = over_grids(&|a| a.integrals.cube).scaled(h.powi(8));
    let top = over_grids(&|a| a.peak.value).scaled(h * h);
    let finest = answers.first().map(|a| a.integrals).unwrap_or_default();
    let (area, diameter) = (geometry.area, geometry.hydraulic_diameter);
    let fanning_dh = diameter * diameter * area / (2.0 * conductance.value);
    let identities = identities(
        outline,
        corners,
        &shear.samples,
        conductance.value,
        (finest, h.powi(4)),
        grid.cells_across,
    );
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
        wall_shear: shear,
        solver: solver_report(answers, h, seconds),
        grid,
        geometry,
        identities,
        warnings: Vec::new(),
    };
    flow.warnings = warnings(&flow, small, mask.pinned.len());
    flow
}

/// `K` of the finest grids, m^4, without the excess at tangent walls, averaged over the places of the
/// lattice.
fn mean_conductances(
    solution: &Solution,
    curved: &[Tangent],
    spacing: f64,
    grids: usize,
) -> Vec<f64> {
    let corrected = |origin: Point, a: &GridAnswer| {
        let own = spacing * f64::from(a.stride);
        let excess: f64 = curved.iter().map(|t| t.excess(origin, own)).sum();
        a.integrals.conductance * spacing.powi(4) - excess
    };
    (0..grids)
        .map(|level| {
            let own = corrected(solution.lattice.origin, &solution.answers[level]);
            let rest = solution
                .others
                .iter()
                .filter_map(|(origin, list)| Some(corrected(*origin, list.get(level)?)));
            let (sum, count) = rest.fold((own, 1.0), |(sum, n), k| (sum + k, n + 1.0));
            sum / count
        })
        .collect()
}

/// The best value is never outside the proven bounds, nor its error larger than they allow.
fn within(best: Estimate, proven: Bracket) -> Estimate {
    let value = best.value.clamp(proven.low, proven.high);
    let farthest = (value - proven.low).max(proven.high - value);
    Estimate {
        value,
        error: best.error.min(farthest),
    }
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
fn leading_exponent(corners: &[Vec<Corner>]) -> Option<f64> {
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

fn warnings(flow: &SectionFlow, small_islands: usize, lost_islands: usize) -> Vec<Warning> {
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
            advice:
                "the wall shear and its mean are less sure than the conductance; try a finer grid \
                     with --cells-across and compare"
                    .to_owned(),
            numbers: vec![
                ("relative_difference", identity.relative_difference),
                ("tolerance", identity.tolerance),
            ],
        });
    }
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
                 sharp outline has no bound there, so the largest value depends on the grid",
                x * 1e6,
                y * 1e6
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
