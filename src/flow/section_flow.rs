//! The result of one section with its evidence and warnings. SI throughout.

use crate::geometry::Point;
use crate::measured::Estimate;
use crate::proof::{Bracket, ProofError};
use crate::warning::Warning;

use super::accuracy::Accuracy;
use super::wall_curve::WallCurve;

/// Everything the solve of one section says, per unit pressure gradient and viscosity.
#[derive(Debug, Clone)]
pub struct SectionFlow {
    /// What the outline alone says.
    pub geometry: SectionGeometry,
    /// Conductance `K`, m^4, best value from the grid sequence.
    pub conductance: Estimate,
    /// Proven bounds of `K` for the outline as given, m^4, or why there are none.
    pub bracket: Result<Bracket, ProofError>,
    /// `K` on the finest grid alone, m^4, before extrapolation.
    pub conductance_finest_grid: f64,
    /// Poiseuille number: Fanning `f Re` on the hydraulic diameter, `Dh^2 A / (2 K)`.
    pub fanning_dh: f64,
    /// Darcy `f Re` on the hydraulic diameter, four times the Fanning one.
    pub darcy_dh: f64,
    /// Fanning `f Re` on `sqrt(A)`, `2 A^(5/2) / (P K)`.
    pub fanning_sqrt_area: f64,
    /// The fastest point.
    pub peak: Peak,
    /// Momentum factor `(1/A)` integral of `(u/ubar)^2`.
    pub momentum_factor: Estimate,
    /// Kinetic-energy factor `(1/A)` integral of `(u/ubar)^3`.
    pub kinetic_energy_factor: Estimate,
    /// Wall shear per pressure gradient.
    pub wall_shear: WallShear,
    /// The finest grid.
    pub grid: GridReport,
    /// How the solver went.
    pub solver: SolverReport,
    /// The free identities, computed against exact.
    pub identities: Vec<Identity>,
    /// How its accuracy came about.
    pub accuracy: Accuracy,
    /// Warnings about this result.
    pub warnings: Vec<Warning>,
}

/// What the outline alone says.
#[derive(Debug, Clone, PartialEq)]
pub struct SectionGeometry {
    /// Flow area `A`, m^2.
    pub area: f64,
    /// Wetted perimeter `P`, m.
    pub wetted_perimeter: f64,
    /// `Dh = 4 A / P`, m.
    pub hydraulic_diameter: f64,
    /// Width of the bounding box, m.
    pub width: f64,
    /// Height of the bounding box, m.
    pub height: f64,
    /// Number of lumens.
    pub lumens: usize,
    /// Number of islands in all lumens.
    pub islands: usize,
    /// Number of outline vertices.
    pub vertices: usize,
}

/// The fastest point of the section.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Peak {
    /// Largest `phi`, m^2.
    pub phi: f64,
    /// Peak over mean velocity, with its estimated error.
    pub to_mean: Estimate,
    /// Where, m.
    pub at: Point,
}

/// Wall shear divided by the pressure gradient: `abs(dphi/dn)`, in metres.
#[derive(Debug, Clone, PartialEq)]
pub struct WallShear {
    /// Mean over the wall, exactly `A / P`, m.
    pub mean_per_gradient: f64,
    /// Largest value of the curve, m; beside a singular corner the mean over the curve's
    /// `singular_length` stands for the shear.
    pub max_per_gradient: f64,
    /// Where the largest value is, m.
    pub max_at: Point,
    /// Re-entrant corners where the shear of the sharp outline has no bound, m.
    pub singular_corners: Vec<Point>,
    /// Samples along the wall, ordered by loop and arc length.
    pub samples: Vec<WallSample>,
    /// The shear as a curve along every loop, made from the samples.
    pub curve: WallCurve,
}

/// One wall sample.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallSample {
    /// Index of the loop, counted over the outline: outer loop, then its islands, lumen by lumen.
    pub loop_index: usize,
    /// Arc length from the first vertex of the loop, m.
    pub arc_length: f64,
    /// Position, m.
    pub at: Point,
    /// Unit normal pointing out of the fluid.
    pub normal: Point,
    /// `abs(dphi/dn)`, m.
    pub shear_per_gradient: f64,
}

/// The finest grid.
#[derive(Debug, Clone, PartialEq)]
pub struct GridReport {
    /// Node distance `h`, m.
    pub spacing: f64,
    /// Number of fluid nodes.
    pub fluid_nodes: usize,
    /// Cells across the largest circle that fits into the smallest lumen.
    pub cells_across: f64,
    /// Diameter of that circle, m.
    pub inscribed_diameter: f64,
}

/// How the solver went.
#[derive(Debug, Clone, PartialEq)]
pub struct SolverReport {
    /// Multigrid cycles on the finest grid.
    pub cycles: usize,
    /// Root mean square of `1 + lap(phi)` over the fluid nodes of the finest grid, weighted with `phi`.
    pub residual: f64,
    /// Whether the requested residual was reached.
    pub converged: bool,
    /// Mean reduction of the residual by one cycle on the finest grid.
    pub convergence_factor: f64,
    /// Whether the Krylov acceleration was needed.
    pub accelerated: bool,
    /// Wall-clock time of rasterising and solving, s.
    pub seconds: f64,
    /// The grids, finest first.
    pub levels: Vec<LevelReport>,
}

/// One grid of the hierarchy.
#[derive(Debug, Clone, PartialEq)]
pub struct LevelReport {
    /// Node distance, m.
    pub spacing: f64,
    /// Fluid nodes.
    pub fluid_nodes: usize,
    /// Nodes with at least one arm cut by the wall.
    pub wall_nodes: usize,
    /// Cycles spent on this grid during nested iteration; zero on the coarsest, solved directly.
    pub cycles: usize,
    /// `K` on this grid, m^4.
    pub conductance: f64,
}

/// One free identity of the exact solution, checked on the computed one.
#[derive(Debug, Clone, PartialEq)]
pub struct Identity {
    /// Short name, the key in machine output.
    pub name: &'static str,
    /// The formula in plain text.
    pub formula: &'static str,
    /// Left side as computed.
    pub computed: f64,
    /// Right side it must equal.
    pub expected: f64,
    /// `computed / expected - 1`.
    pub relative_difference: f64,
    /// Largest difference that still counts as holding.
    pub tolerance: f64,
    /// Whether it holds.
    pub holds: bool,
}
