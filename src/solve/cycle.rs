//! Nested iteration and V-cycles.
//!
//! Every grid is solved in turn from the coarsest up, each started from the interpolated solution of the
//! one before, because the grid sequence is wanted: extrapolation and error estimate come from it.

use crate::grid::Colour;

use super::hierarchy::{Grid, GridSource, Hierarchy};
use super::krylov;
use super::passes::{Lift, Start, ascend, descend, residual_of};

/// A cycle that reduces the residual by less than this calls for the Krylov acceleration.
const SLOW: f64 = 0.35;

/// Reduction that one cycle usually gives.
const EXPECTED: f64 = 0.15;

/// How far to iterate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SolveControl {
    /// Residual at which a grid counts as solved, see [`Solved::residual`].
    pub residual: f64,
    /// Most cycles on one grid.
    pub most_cycles: usize,
}

/// How the solution on one grid went.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Solved {
    /// Cycles on this grid; zero where it was solved directly.
    pub cycles: usize,
    /// Root mean square of `1 + lap(phi)` over its nodes, weighted with `phi`: that is the share a residual has
    /// in `K`. Near the wall it may be larger, as the truncation error is.
    pub residual: f64,
    /// Mean factor by which one cycle reduced the residual.
    pub convergence_factor: f64,
    /// Whether the requested residual was reached.
    pub converged: bool,
    /// Whether the Krylov acceleration was needed.
    pub accelerated: bool,
}

impl Hierarchy {
    /// Solves on every grid, coarsest first; the answer on the finest grid stands in `grids[0].phi`.
    ///
    /// - `inspect`: called with each grid and its evidence as soon as it is solved, coarsest first; later
    ///   cycles on finer grids reuse the coarse fields for corrections
    pub fn solve(&mut self, control: SolveControl, inspect: impl FnMut(&Grid, Solved)) {
        self.solve_to_share(control, 0.0, inspect);
    }

    /// The same, but a grid also counts as solved where its residual is below a share of that of its first guess.
    ///
    /// The first guess differs from the solution by about what the grid changes in the answer of the one before, so that
    /// share compares what the iteration leaves with the error of discretisation, however rough the wall is.
    pub fn solve_to_share(
        &mut self,
        control: SolveControl,
        share: f64,
        mut inspect: impl FnMut(&Grid, Solved),
    ) {
        for level in (0..self.grids.len()).rev() {
            let grid = &mut self.grids[level];
            grid.source = GridSource::Uniform(f64::from(grid.mask.stride).powi(2));
            let solved = if level + 1 == self.grids.len() {
                self.solve_coarsest(control)
            } else {
                self.ascend(level, Lift::Replace);
                self.solve_grid(level, control, share)
            };
            inspect(&self.grids[level], solved);
        }
    }

    fn solve_coarsest(&mut self, control: SolveControl) -> Solved {
        self.solve_directly();
        let residual = self.grids.last();
        let residual = residual.map_or(0.0, |grid| residual_of(grid, &[Colour::Even, Colour::Odd]));
        Solved {
            cycles: 0,
            residual,
            convergence_factor: 0.0,
            converged: residual <= control.residual,
            accelerated: false,
        }
    }

    fn solve_grid(&mut self, level: usize, control: SolveControl, share: f64) -> Solved {
        let start = self.descend(level, Start::Present);
        let control = SolveControl {
            residual: control.residual.max(share * start),
            ..control
        };
        let (mut residual, mut cycles, mut slow) = (start, 0, 0);
        let mut accelerated = false;
        while residual > control.residual && cycles < control.most_cycles {
            if slow >= 2 {
                accelerated = true;
                let spent = krylov::accelerate(self, level, control, control.most_cycles - cycles);
                cycles += spent;
                residual = self.descend(level, Start::Present);
                break;
            }
            self.correct(level);
            cycles += 1;
            if residual * EXPECTED < control.residual {
                // Probably the last cycle: only look, which costs a quarter of a pass.
                let reached = residual_of(&self.grids[level], &[Colour::Even]);
                if reached <= control.residual {
                    residual = reached;
                    break;
                }
            }
            let now = self.descend(level, Start::Present);
            slow = if now > SLOW * residual { slow + 1 } else { 0 };
            residual = now;
        }
        let factor = if cycles > 0 && start > 0.0 {
            (residual / start).powf(1.0 / cycles as f64)
        } else {
            0.0
        };
        Solved {
            cycles,
            residual,
            convergence_factor: factor,
            converged: residual <= control.residual,
            accelerated,
        }
    }

    fn solve_directly(&mut self) {
        if let Some(grid) = self.grids.last_mut() {
            let mut values = vec![0.0; grid.mask.nodes()];
            match grid.source {
                GridSource::Uniform(value) => values.fill(value),
                GridSource::Own => grid.rhs.write_natural(&grid.mask, &mut values),
            }
            self.direct.solve(&mut values);
            grid.phi.read_natural(&grid.mask, &values);
        }
    }

    /// One V-cycle from zero on `phi` of a grid for its right side.
    pub(crate) fn cycle_from_zero(&mut self, level: usize) {
        if level + 1 == self.grids.len() {
            self.solve_directly();
        } else {
            self.descend(level, Start::Zero);
            self.correct(level);
        }
    }

    /// The coarse correction and the smoothing after it.
    fn correct(&mut self, level: usize) {
        self.cycle_from_zero(level + 1);
        self.ascend(level, Lift::Correct);
    }

    /// The pass down; returns the residual, as in [`Solved::residual`].
    fn descend(&mut self, level: usize, start: Start) -> f64 {
        let (fine, coarse) = self.grids.split_at_mut(level + 1);
        let (Some(fine), Some(coarse)) = (fine.last_mut(), coarse.first_mut()) else {
            return 0.0;
        };
        let left = descend(fine, coarse, &self.transfers[level], start);
        left.root_mean_square() / f64::from(fine.mask.stride).powi(2)
    }

    fn ascend(&mut self, level: usize, lift: Lift) {
        let (fine, coarse) = self.grids.split_at_mut(level + 1);
        if let (Some(fine), Some(coarse)) = (fine.last_mut(), coarse.first_mut()) {
            ascend(fine, coarse, &self.transfers[level], lift);
        }
    }
}
