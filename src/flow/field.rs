//! The solved field on a plain rectangular lattice, for pictures and field files.

use crate::geometry::Point;

/// `phi` on the nodes of a lattice and the fluid share of its cells.
///
/// Node `(i, j)` sits at `origin + spacing * [i, j]` and is `phi[j * nodes_x + i]`; cell `(i, j)` lies
/// between nodes `i..=i+1`, `j..=j+1` and is `fluid_fraction[j * (nodes_x - 1) + i]`.
#[derive(Debug, Clone)]
pub struct DenseField {
    /// Position of node (0, 0), m.
    pub origin: Point,
    /// Distance of neighbouring nodes, m.
    pub spacing: f64,
    /// Number of nodes along x.
    pub nodes_x: usize,
    /// Number of nodes along y.
    pub nodes_y: usize,
    /// `phi` in m^2, zero on and outside the wall.
    pub phi: Vec<f64>,
    /// Share of each cell that is fluid, 0 to 1.
    pub fluid_fraction: Vec<f64>,
    /// 1 when every solved node is here, otherwise only every n-th node along each axis.
    pub stride: usize,
}
