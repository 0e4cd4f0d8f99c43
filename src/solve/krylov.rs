//! Krylov acceleration of the V-cycle for the few grids on which it is slow alone.
//!
//! Generalised conjugate residuals, truncated, with one V-cycle from zero as right preconditioner: the
//! operator with unequal arms is not symmetric, and the cycle need not be the same each time.
//!
//! # Source
//! S. C. Eisenstat, H. C. Elman, M. H. Schultz (1983), Variational iterative methods for nonsymmetric
//! systems of linear equations, SIAM J. Numer. Anal. 20, 345, doi:10.1137/0720023 (from memory).

use crate::grid::Colour;

use super::cycle::SolveControl;
use super::field::Field;
use super::hierarchy::{Grid, GridSource, Hierarchy};
use super::stencil::Source;

/// Earlier directions kept.
const KEPT: usize = 8;

/// Iterates on `phi` of a grid until its residual is small enough; returns the cycles spent.
pub(crate) fn accelerate(
    hierarchy: &mut Hierarchy,
    level: usize,
    control: SolveControl,
    most_cycles: usize,
) -> usize {
    let grid = &hierarchy.grids[level];
    let (source, rhs) = (grid.source, grid.rhs.clone());
    let mut solution = grid.phi.clone();
    let mut residual = left_over(grid, &solution, source.of(&rhs));
    let scale = f64::from(grid.mask.stride).powi(2);
    let goal = grid.mask.nodes() as f64 * (control.residual * scale).powi(2);
    // Direction, its image, and the squared norm of the image.
    let mut kept: std::collections::VecDeque<(Field, Field, f64)> =
        std::collections::VecDeque::new();
    let mut cycles = 0;
    while cycles < most_cycles && residual.dot(&residual) > goal {
        hierarchy.grids[level].rhs = residual.clone();
        hierarchy.grids[level].source = GridSource::Own;
        hierarchy.cycle_from_zero(level);
        cycles += 1;
        let mut direction = hierarchy.grids[level].phi.clone();
        let mut image = apply(&hierarchy.grids[level], &direction);
        for (old_direction, old_image, norm) in &kept {
            let share = image.dot(old_image) / norm;
            direction.add_scaled(-share, old_direction);
            image.add_scaled(-share, old_image);
        }
        let norm = image.dot(&image);
        if norm <= 0.0 {
            break;
        }
        let step = residual.dot(&image) / norm;
        solution.add_scaled(step, &direction);
        residual.add_scaled(-step, &image);
        if kept.len() == KEPT {
            kept.pop_front();
        }
        kept.push_back((direction, image, norm));
    }
    let grid = &mut hierarchy.grids[level];
    grid.rhs = rhs;
    grid.source = source;
    grid.phi = solution;
    cycles
}

/// `A x` on one grid.
fn apply(grid: &Grid, x: &Field) -> Field {
    let mut image = left_over(grid, x, Source::Uniform(0.0));
    for value in image.colour.iter_mut().flatten() {
        *value = -*value;
    }
    image
}

/// `b - A x` on one grid.
fn left_over(grid: &Grid, x: &Field, source: Source) -> Field {
    let mut image = Field::constant(&grid.mask, 0.0);
    for colour in [Colour::Even, Colour::Odd] {
        let out = &mut image.colour[colour as usize];
        grid.stencil.residual(&grid.mask, colour, x, source, out);
    }
    image
}
