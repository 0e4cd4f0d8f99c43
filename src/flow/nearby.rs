//! Conductance of many outlines that differ little from one another, for Monte Carlo, aims and tables.
//!
//! What an ordinary solve works out once per section is worked out once for all: how fine the grid must be. Proof,
//! wall shear and the other answers are left out; what comes back is the extrapolated conductance with
//! its estimated error, from the same grids and by the same rules as everywhere else (with the proven range only
//! where wide corners call for it). Sections are shared out over threads,
//! each on one.
//!
//! The field of a neighbour is no help as a first guess: nested iteration starts from a field that is right to the
//! fourth power of the spacing, which a neighbour a thousandth away is not (see DEVELOPERS.md).

use rayon::prelude::*;

use crate::geometry::{Outline, largest_inscribed_circle};
use crate::grid;
use crate::measured::Estimate;
use crate::proof::bracket;

use super::assemble::best_conductance;
use super::solve_cost::StageClock;
use super::solve_outline::{DEFAULT_MEMORY, FlowError};
use super::solved_grids::{Purpose, solve_grids};
use super::wall_shear::wall_samples;

/// Cells across the smallest lumen that the search for the grid starts from.
const FIRST_CELLS_ACROSS: f64 = 16.0;
/// Share of the tolerance that the reference has to meet, so that its neighbours do as well: where the estimated error is
/// a difference between grids, which varies from neighbour to neighbour, and where it is a part of a proven range.
const SHARES: [f64; 2] = [0.5, 0.8];
/// Least and most by which the next grid is finer.
const FINER: [f64; 2] = [1.1, 2.0];
/// Grids tried.
const MOST_GRIDS: usize = 12;
/// How much finer a neighbour is solved that does not meet the tolerance, and how often.
const NEIGHBOUR_FINER: f64 = 1.4;
/// See [`NEIGHBOUR_FINER`].
const NEIGHBOUR_GRIDS: usize = 3;

/// A grid that suits an outline and its neighbours.
///
/// # Examples
/// ```
/// use etchwise::{flow::NearbySections, geometry::Outline};
/// let etched = |depth: f64| {
///     Outline::single(vec![[20e-6, 0.0], [80e-6, 0.0], [100e-6, depth], [0.0, depth]])
/// };
/// let nearby = NearbySections::new(&etched(40e-6), 1e-4)?;
/// let lot: Vec<Outline> = (0..20).map(|k| etched(40e-6 + 1e-8 * f64::from(k))).collect();
/// let conductances = nearby.conductances(&lot);
/// assert!(conductances.iter().flatten().all(|k| k.relative() < 1e-4));
/// # Ok::<(), etchwise::flow::FlowError>(())
/// ```
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct NearbySections {
    /// Square root of the area of the reference over its spacing.
    size_in_spacings: f64,
    cells_across: f64,
    tolerance: f64,
}

impl NearbySections {
    /// Finds the grid on which the estimated relative error of the reference's conductance is half the tolerance.
    ///
    /// - `reference`: valid, metres
    /// - `tolerance`: relative
    ///
    /// # Errors
    /// [`FlowError`] when the outline holds no fluid, or the grid would need more memory than
    /// [`DEFAULT_MEMORY`].
    pub fn new(reference: &Outline, tolerance: f64) -> Result<Self, FlowError> {
        let outline = reference.clone().oriented();
        let area = positive_area(&outline)?;
        let diameters = outline
            .lumens
            .iter()
            .map(|lumen| largest_inscribed_circle(lumen).map_or(0.0, |circle| 2.0 * circle.radius));
        let diameter = diameters.fold(f64::INFINITY, f64::min);
        let mut cells = FIRST_CELLS_ACROSS;
        for _ in 0..MOST_GRIDS {
            let spacing = grid::spacing(&outline, diameter, cells, DEFAULT_MEMORY)?;
            let found = estimate(&outline, spacing, cells)?;
            let (error, aim) = (
                found.value.relative(),
                tolerance * SHARES[usize::from(found.is_from_ranges)],
            );
            if error <= aim {
                break;
            }
            // An estimated error falls with the third power of the spacing mostly, a range with the second or less.
            let finer = if found.is_from_ranges {
                (error / aim).sqrt()
            } else {
                (error / aim).cbrt()
            };
            cells *= finer.clamp(FINER[0], FINER[1]);
        }
        let spacing = grid::spacing(&outline, diameter, cells, DEFAULT_MEMORY)?;
        Ok(Self {
            size_in_spacings: area.sqrt() / spacing,
            cells_across: cells,
            tolerance,
        })
    }

    /// Cells across the smallest lumen of the reference.
    pub fn cells_across(&self) -> f64 {
        self.cells_across
    }

    /// Conductance of a neighbour, m^4. Where its error is above the tolerance finer grids are tried; what comes
    /// back then may still have a larger error, and says so.
    ///
    /// - `outline`: valid, metres
    ///
    /// # Errors
    /// [`FlowError`] when the outline holds no fluid.
    pub fn conductance(&self, outline: &Outline) -> Result<Estimate, FlowError> {
        let outline = outline.clone().oriented();
        let size = positive_area(&outline)?.sqrt();
        let mut finer = 1.0;
        let mut best = estimate(&outline, size / self.size_in_spacings, self.cells_across)?.value;
        for _ in 0..NEIGHBOUR_GRIDS {
            if best.relative() <= self.tolerance {
                break;
            }
            finer *= NEIGHBOUR_FINER;
            let spacing = size / (self.size_in_spacings * finer);
            let next = estimate(&outline, spacing, self.cells_across * finer)?.value;
            if next.error < best.error {
                best = next;
            }
        }
        Ok(best)
    }

    /// Conductances of many neighbours, in their order; the same on any number of threads.
    pub fn conductances(&self, outlines: &[Outline]) -> Vec<Result<Estimate, FlowError>> {
        let solved = outlines.par_iter();
        solved.map(|outline| self.conductance(outline)).collect()
    }
}

fn positive_area(outline: &Outline) -> Result<f64, FlowError> {
    let area = outline.area();
    if area.is_nan() || area <= 0.0 {
        return Err(FlowError::NoArea { area });
    }
    Ok(area)
}

/// Best value of `K`, m^4.
struct Found {
    value: Estimate,
    /// Whether the proven ranges of two grids gave it.
    is_from_ranges: bool,
}

fn estimate(outline: &Outline, spacing: f64, cells_across: f64) -> Result<Found, FlowError> {
    let grids = solve_grids(
        outline,
        spacing,
        cells_across,
        None,
        Purpose::ConductanceAlone,
        &mut StageClock::start(),
    )?;
    let solution = (&grids.lattice, &grids.mask, &grids.phi);
    let samples = wall_samples(outline, solution, &grids.corners);
    // Only wide corners call for the proven range.
    let coarse = grids.coarse_range(outline);
    let proven = coarse.and_then(|_| bracket(&grids.lattice, &grids.mask, &grids.phi).ok());
    let proven = proven.map(|range| range.scaled(grids.lattice.spacing.powi(4)));
    Ok(Found {
        value: best_conductance(outline, &grids, &samples, [proven, coarse]),
        is_from_ranges: proven.is_some(),
    })
}
