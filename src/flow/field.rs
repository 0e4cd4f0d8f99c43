//! The solved field on a plain rectangular lattice, for pictures and field files.

use crate::geometry::Point;
use crate::grid::{Lattice, Mask, WallEdge, coverage};
use crate::solve::Field;

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

impl DenseField {
    /// The solution on every `stride`-th lattice line, with one line of margin on every side.
    pub(crate) fn new(lattice: &Lattice, mask: &Mask, phi: &Field, most_nodes: usize) -> Self {
        let nodes = |stride: usize| {
            let along = |lines: usize| (lines - 1).div_ceil(stride) + 3;
            (along(lattice.columns), along(lattice.rows))
        };
        let mut stride = 1;
        while nodes(stride).0 * nodes(stride).1 > most_nodes.max(64) {
            stride += 1;
        }
        let (nodes_x, nodes_y) = nodes(stride);
        let scale = 1.0 / stride as f64;
        let place = |p: Point| [p[0] * scale + 1.0, p[1] * scale + 1.0];
        let edges = lattice.edges.iter().map(|edge| WallEdge {
            start: place(edge.start),
            end: place(edge.end),
            loop_index: edge.loop_index,
        });
        let fluid_fraction = coverage(edges, nodes_x - 1, nodes_y - 1);
        let unit = lattice.spacing * lattice.spacing;
        let mut values = vec![0.0; nodes_x * nodes_y];
        for run in mask
            .runs
            .iter()
            .filter(|run| (run.row as usize).is_multiple_of(stride))
        {
            let row = (run.row as usize / stride + 1) * nodes_x;
            let first = run.first.next_multiple_of(stride as u32);
            for i in (first..run.end()).step_by(stride) {
                let (colour, node) = run.node(i);
                values[row + i as usize / stride + 1] =
                    phi.colour[colour as usize][node as usize] * unit;
            }
        }
        Self {
            origin: lattice.position([-(stride as f64); 2]),
            spacing: lattice.spacing * stride as f64,
            nodes_x,
            nodes_y,
            phi: values,
            fluid_fraction,
            stride,
        }
    }
}
