//! One grid of a search: solved and proven, with everything else read off only where it is asked for.
//!
//! A search for a proven range needs that range of the grids it leaves behind, and nothing else of them: their best
//! value, the range of their second grid and their wall shear are not worked out.

use std::time::Instant;

use crate::geometry::Outline;
use crate::grid::spacing;
use crate::measured::Estimate;
use crate::proof::{Bracket, ProofError, bracket, is_long};

use super::accuracy::Goal;
use super::assemble::{assemble, best_conductance};
use super::section_flow::{GridReport, WallSample};
use super::solve_cost::StageClock;
use super::solve_outline::{FlowError, SolveOptions, SolvedSection};
use super::solved_grids::{Purpose, SolvedGrids, solve_grids};
use super::wall_curve::WallCurve;
use super::wall_shear::{wall_curve, wall_samples};
use super::width_source::{WidthSource, width_source};

/// Name of a stage of the work.
const SECOND_RANGE: &str = "range of the second grid";

/// The best value, and what it is made of.
struct BestValue {
    conductance: Estimate,
    samples: Vec<WallSample>,
}

/// Wall shear along the wall.
pub(super) struct WallAnswer {
    pub(super) samples: Vec<WallSample>,
    pub(super) curve: WallCurve,
    /// Mean of the curve before it was balanced.
    pub(super) plain: f64,
}

/// A section solved on one grid, with its proven range.
pub(super) struct Attempt {
    pub(super) grids: SolvedGrids,
    pub(super) bracket: Result<Bracket, ProofError>,
    pub(super) grid: GridReport,
    pub(super) source: WidthSource,
    /// What solving took, s.
    pub(super) seconds: f64,
    best: Option<BestValue>,
    clock: StageClock,
}

impl Attempt {
    /// Solves a section on one grid.
    ///
    /// - `outline`: oriented
    /// - `diameter`: of the largest circle in the smallest lumen, m
    pub(super) fn new(
        outline: &Outline,
        diameter: f64,
        cells_across: f64,
        options: &SolveOptions,
    ) -> Result<Self, FlowError> {
        let start = Instant::now();
        let mut clock = StageClock::start();
        let asked = spacing(outline, diameter, cells_across, options.memory_limit)?;
        let grids = solve_grids(
            outline,
            asked,
            cells_across,
            options.grid_offset,
            Purpose::Field,
            &mut clock,
        )?;
        let seconds = start.elapsed().as_secs_f64();
        clock.lap();
        let bracket = bracket(&grids.lattice, &grids.mask, &grids.phi).map(|b| {
            let mut proven = b.scaled(grids.lattice.spacing.powi(4));
            proven.high += options.conductance_left_out;
            proven
        });
        clock.end("proof");
        let source = width_source(&grids.lattice, &grids.mask, &grids.phi, &grids.corners);
        let mut attempt = Self {
            grid: GridReport {
                spacing: grids.lattice.spacing,
                fluid_nodes: grids.mask.nodes(),
                cells_across: diameter / grids.lattice.spacing,
                inscribed_diameter: diameter,
            },
            grids,
            bracket,
            source,
            seconds,
            best: None,
            clock,
        };
        if matches!(options.goal, Goal::Estimated(_)) {
            attempt.best = Some(attempt.best_value(outline));
        }
        Ok(attempt)
    }

    /// The figure reached; the estimated error only where that is the goal.
    pub(super) fn reached(&self, goal: Goal) -> Option<f64> {
        match goal {
            Goal::Proven(_) => self.bracket.ok().map(|proven| proven.relative_width()),
            Goal::Estimated(_) => self.best.as_ref().map(|best| best.conductance.relative()),
        }
    }

    pub(super) fn meets(&self, goal: Goal) -> bool {
        let mut answers = self.grids.answers.iter();
        answers.all(|answer| answer.solved.converged)
            && self.reached(goal).is_some_and(|r| r <= goal.asked())
    }

    fn samples(&self, outline: &Outline) -> Vec<WallSample> {
        let grids = &self.grids;
        let solution = (&grids.lattice, &grids.mask, &grids.phi);
        wall_samples(outline, solution, &grids.corners)
    }

    fn best_value(&mut self, outline: &Outline) -> BestValue {
        self.clock.end("answers");
        let coarse = self.grids.coarse_range(outline);
        if coarse.is_some() {
            self.clock.end(SECOND_RANGE);
        }
        let samples = self.samples(outline);
        let ranges = [self.bracket.ok(), coarse];
        BestValue {
            conductance: best_conductance(outline, &self.grids, &samples, ranges),
            samples,
        }
    }

    fn wall(&self, outline: &Outline, samples: Vec<WallSample>) -> WallAnswer {
        let grids = &self.grids;
        let solution = (&grids.lattice, &grids.mask, &grids.phi);
        let (curve, plain) = wall_curve(outline, solution, &grids.corners, &samples);
        WallAnswer {
            samples,
            curve,
            plain,
        }
    }

    /// Best value and wall shear; the range of the second grid is worked out beside the latter where it takes long.
    fn best_value_and_wall(&mut self, outline: &Outline) -> (Estimate, WallAnswer) {
        if let Some(best) = self.best.take() {
            return (best.conductance, self.wall(outline, best.samples));
        }
        let coarse_range = || {
            let start = Instant::now();
            let coarse = self.grids.coarse_range(outline);
            (coarse, start.elapsed().as_secs_f64())
        };
        let wall = || self.wall(outline, self.samples(outline));
        let ((coarse, seconds), wall) = if is_long(&self.grids.lattice, &self.grids.mask) {
            rayon::join(coarse_range, wall)
        } else {
            (coarse_range(), wall())
        };
        let ranges = [self.bracket.ok(), coarse];
        let conductance = best_conductance(outline, &self.grids, &wall.samples, ranges);
        if coarse.is_some() {
            self.clock.split(SECOND_RANGE, seconds);
        }
        (conductance, wall)
    }

    /// All answers.
    pub(super) fn answered(mut self, outline: &Outline) -> SolvedSection {
        // A search may have tried other grids since.
        self.clock.lap();
        let (conductance, wall) = self.best_value_and_wall(outline);
        self.clock.end("wall shear");
        let flow = assemble(outline, &self, conductance, wall);
        self.clock.end("answers");
        SolvedSection::new(flow, outline.clone(), self.grids, self.clock.cost())
    }
}
