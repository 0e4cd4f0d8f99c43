//! Nested iteration and V-cycles.
//!
//! Every grid is solved in turn from the coarsest up, each started from the interpolated solution of the
//! one before, because the grid sequence is wanted: extrapolation and error estimate come from it.

use crate::grid::Colour;

use super::hierarchy::{Grid, Hierarchy};
use super::krylov;

/// Relaxation sweeps (both colours) before and after the coarse correction.
const SWEEPS: [usize; 2] = [1, 1];
/// A cycle that reduces the residual by less than this calls for the Krylov acceleration.
const SLOW: f64 = 0.35;

/// How far to iterate.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct SolveControl {
    /// Root mean square of `1 + lap(phi)` over the nodes of a grid at which it counts as solved.
    pub residual: f64,
    /// Most cycles on one grid.
    pub most_cycles: usize,
}

/// How the solution on one grid went.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Solved {
    /// Cycles on this grid; zero where it was solved directly.
    pub cycles: usize,
    /// Root mean square of `1 + lap(phi)` over its nodes.
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
    pub fn solve(&mut self, control: SolveControl, mut inspect: impl FnMut(&Grid, Solved)) {
        for level in (0..self.grids.len()).rev() {
            self.set_unit_source(level);
            if level + 1 < self.grids.len() {
                self.start_from_coarser(level);
            }
            let solved = self.solve_grid(level, control);
            inspect(&self.grids[level], solved);
        }
    }

    /// The right side of `-lap(phi) = 1`, scaled by the grid's spacing squared.
    fn set_unit_source(&mut self, level: usize) {
        let grid = &mut self.grids[level];
        grid.rhs.fill(f64::from(grid.mask.stride).powi(2));
    }

    fn start_from_coarser(&mut self, level: usize) {
        let (fine, coarse) = self.grids.split_at_mut(level + 1);
        let (Some(fine), Some(coarse)) = (fine.last_mut(), coarse.first_mut()) else {
            return;
        };
        fine.phi.fill(0.0);
        coarse.phi.write_natural(&coarse.mask, &mut coarse.natural);
        self.transfers[level].prolong(&coarse.natural, &mut fine.phi.colour[1]);
        self.relax(level, Colour::Even);
    }

    fn solve_grid(&mut self, level: usize, control: SolveControl) -> Solved {
        if level + 1 == self.grids.len() {
            self.solve_directly();
            let residual = self.residual_norm(level);
            return Solved {
                cycles: 0,
                residual,
                convergence_factor: 0.0,
                converged: residual <= control.residual,
                accelerated: false,
            };
        }
        let start = self.residual_norm(level);
        let (mut residual, mut cycles, mut slow) = (start, 0, 0);
        let mut accelerated = false;
        while residual > control.residual && cycles < control.most_cycles {
            if slow >= 2 {
                accelerated = true;
                let spent = krylov::accelerate(self, level, control, control.most_cycles - cycles);
                cycles += spent;
                residual = self.residual_norm(level);
                break;
            }
            self.cycle(level);
            cycles += 1;
            let now = self.residual_norm(level);
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
            grid.rhs.write_natural(&grid.mask, &mut grid.natural);
            self.direct.solve(&mut grid.natural);
            grid.phi.read_natural(&grid.mask, &grid.natural);
        }
    }

    /// One V-cycle on `phi` of a grid for its right side.
    pub(crate) fn cycle(&mut self, level: usize) {
        if level + 1 == self.grids.len() {
            self.solve_directly();
            return;
        }
        for _ in 0..SWEEPS[0] {
            self.relax(level, Colour::Even);
            self.relax(level, Colour::Odd);
        }
        let (fine, coarse) = self.grids.split_at_mut(level + 1);
        if let (Some(fine), Some(coarse)) = (fine.last_mut(), coarse.first_mut()) {
            let phi = [&fine.phi.colour[0][..], &fine.phi.colour[1][..]];
            let rhs = &fine.rhs.colour[0];
            fine.stencil
                .residual(&fine.mask, Colour::Even, phi, rhs, &mut fine.residual);
            self.transfers[level].restrict(&fine.residual, &mut coarse.natural);
            coarse.rhs.read_natural(&coarse.mask, &coarse.natural);
            coarse.phi.fill(0.0);
        }
        self.cycle(level + 1);
        let (fine, coarse) = self.grids.split_at_mut(level + 1);
        if let (Some(fine), Some(coarse)) = (fine.last_mut(), coarse.first_mut()) {
            coarse.phi.write_natural(&coarse.mask, &mut coarse.natural);
            self.transfers[level].prolong(&coarse.natural, &mut fine.phi.colour[1]);
        }
        for _ in 0..SWEEPS[1] {
            self.relax(level, Colour::Even);
            self.relax(level, Colour::Odd);
        }
    }

    fn relax(&mut self, level: usize, colour: Colour) {
        let grid = &mut self.grids[level];
        let [even, odd] = &mut grid.phi.colour;
        let (own, other) = match colour {
            Colour::Even => (even, odd),
            Colour::Odd => (odd, even),
        };
        let rhs = &grid.rhs.colour[colour as usize];
        grid.stencil.relax(&grid.mask, colour, own, other, rhs);
    }

    /// Root mean square of the residual in units of the source, right after a sweep over the odd nodes or
    /// the direct solution: only even nodes have one.
    fn residual_norm(&mut self, level: usize) -> f64 {
        let grid = &mut self.grids[level];
        let phi = [&grid.phi.colour[0][..], &grid.phi.colour[1][..]];
        let mut sum = 0.0;
        grid.stencil.residual(
            &grid.mask,
            Colour::Even,
            phi,
            &grid.rhs.colour[0],
            &mut grid.residual,
        );
        sum += grid.residual.iter().map(|r| r * r).sum::<f64>();
        let odd = &mut grid.natural[..grid.mask.count[1]];
        grid.stencil
            .residual(&grid.mask, Colour::Odd, phi, &grid.rhs.colour[1], odd);
        sum += odd.iter().map(|r| r * r).sum::<f64>();
        let scale = f64::from(grid.mask.stride).powi(2);
        (sum / grid.mask.nodes() as f64).sqrt() / scale
    }
}
