//! The main job: from an outline to its [`SectionFlow`].

use std::time::Instant;

use crate::geometry::{Outline, largest_inscribed_circle};
use crate::grid::{Lattice, Mask, ResolutionError};
use crate::solve::Field;
use crate::warning::{Code, Warning};

use super::accuracy::{DEFAULT_TOLERANCE, Goal, further, judge, refine};
use super::attempt::Attempt;
use super::field::DenseField;
use super::section_flow::SectionFlow;
use super::solve_cost::SolveCost;
use super::solved_grids::SolvedGrids;

/// Estimated relative error of `K` from which a grid that was asked for is called rough.
const ROUGH: f64 = 1e-3;
/// Memory that one solve may use by default, bytes.
pub const DEFAULT_MEMORY: f64 = 8e9;

/// What to solve for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SolveOptions {
    /// Cells across the largest circle that fits into the smallest lumen; `None` refines until the
    /// goal is met.
    pub cells_across: Option<f64>,
    /// What is aimed at when `cells_across` is `None`.
    pub goal: Goal,
    /// Where the lower left corner of the bounding box falls behind the first lattice lines, in units of
    /// the spacing, not negative; `None` puts the sharpest re-entrant corner on a node of every grid, or
    /// the lower left corner on the first lattice lines where there is no such corner.
    pub grid_offset: Option<[f64; 2]>,
    /// Memory that one solve may use, bytes.
    pub memory_limit: f64,
    /// Time beyond which no finer grid is begun, s; `None` for no limit.
    pub time_limit: Option<f64>,
    /// What lumens that are not in the outline, because they are tiny, conduct at most, m^4: it is part of the
    /// proven range, and so of what the goal asks of it.
    pub conductance_left_out: f64,
}

impl Default for SolveOptions {
    fn default() -> Self {
        Self {
            cells_across: None,
            goal: Goal::Proven(DEFAULT_TOLERANCE),
            grid_offset: None,
            memory_limit: DEFAULT_MEMORY,
            time_limit: None,
            conductance_left_out: 0.0,
        }
    }
}

impl SolveOptions {
    /// Whether a search would then have taken longer than allowed.
    ///
    /// - `seconds`: from its start, s
    pub(super) fn is_out_of_time(&self, seconds: f64) -> bool {
        self.time_limit.is_some_and(|limit| seconds > limit)
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
    cost: SolveCost,
}

impl SolvedSection {
    /// - `flow`: read off the grids
    pub(super) fn new(
        flow: SectionFlow,
        outline: Outline,
        grids: SolvedGrids,
        cost: SolveCost,
    ) -> Self {
        Self {
            flow,
            outline,
            cost,
            lattice: grids.lattice,
            mask: grids.mask,
            phi: grids.phi,
        }
    }

    /// The section on a finer grid, judged by the goal of the search that found this one.
    ///
    /// `None` where the grid is foreseen to need more memory or time than `options` allow, and where it does not
    /// reach the goal though this one does.
    ///
    /// - `spent`: time used so far, s
    pub(crate) fn on_finer_grid(
        &self,
        cells_across: f64,
        options: &SolveOptions,
        spent: f64,
    ) -> Option<Self> {
        let grid = &self.flow.grid;
        let finer = cells_across / grid.cells_across;
        let foreseen = self.flow.solver.seconds * finer * finer;
        if options.is_out_of_time(spent + foreseen) {
            return None;
        }
        let start = Instant::now();
        let diameter = grid.inscribed_diameter;
        let attempt = Attempt::new(&self.outline, diameter, cells_across, options).ok()?;
        let mut solved = attempt.answered(&self.outline);
        if let Some(goal) = self.flow.accuracy.goal {
            let (stop, seconds) = (self.flow.accuracy.stop, start.elapsed().as_secs_f64());
            let options = SolveOptions { goal, ..*options };
            judge(&mut solved.flow, &self.outline, &options, stop, seconds);
        }
        let is_worse = self.flow.accuracy.is_met && !solved.flow.accuracy.is_met;
        (!is_worse).then_some(solved)
    }

    /// The outline that was solved, oriented.
    pub fn outline(&self) -> &Outline {
        &self.outline
    }

    /// What the last grid cost.
    pub fn cost(&self) -> &SolveCost {
        &self.cost
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
    let Some(cells) = options.cells_across else {
        return refine(&outline, diameter, options);
    };
    let mut solved = Attempt::new(&outline, diameter, cells, options)?.answered(&outline);
    solved.flow.accuracy.further = further(&outline, &solved.flow);
    warn_if_rough(&mut solved.flow, ROUGH);
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
