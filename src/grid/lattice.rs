//! The square lattice laid over an outline, and the outline in its units.
//!
//! Node `(i, j)` sits at `origin + spacing * [i, j]`, `i` to the right, `j` upwards; this is the one
//! definition of indices in the crate. In lattice units the spacing is one.

use crate::geometry::{Outline, Point};

/// One outline edge in lattice units.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallEdge {
    /// Start, lattice units.
    pub start: Point,
    /// End, lattice units.
    pub end: Point,
    /// Loop the edge belongs to, counted over the whole outline.
    pub loop_index: u32,
}

/// A square lattice covering an outline.
#[derive(Debug, Clone)]
pub struct Lattice {
    /// Position of node (0, 0), m.
    pub origin: Point,
    /// Node distance, m.
    pub spacing: f64,
    /// Number of lattice columns that can hold fluid nodes.
    pub columns: usize,
    /// Number of lattice rows that can hold fluid nodes.
    pub rows: usize,
    /// The outline in lattice units, fluid on the left of every edge.
    pub edges: Vec<WallEdge>,
    /// Index of the first edge of each loop, and the total at the end.
    pub loop_starts: Vec<usize>,
    /// Whether each loop is an island.
    pub is_island: Vec<bool>,
}

impl Lattice {
    /// Lays a lattice of the given spacing over an outline.
    ///
    /// - `outline`: oriented, valid, metres
    /// - `spacing`: node distance, m, positive
    /// - `offset`: how far the lower left corner of the bounding box lies behind the first lattice lines,
    ///   lattice units, not negative; `[0, 0]` puts those lines on the left and lower bound
    ///
    /// # Examples
    /// ```
    /// use etchwise::{geometry::Outline, grid::Lattice};
    /// let unit = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
    /// let lattice = Lattice::new(&unit, 0.25, [0.0, 0.0]);
    /// assert_eq!((lattice.columns, lattice.rows), (5, 5));
    /// ```
    pub fn new(outline: &Outline, spacing: f64, offset: [f64; 2]) -> Self {
        let (low, high) = outline.bounds().unwrap_or(([0.0; 2], [0.0; 2]));
        let origin = [low[0] - offset[0] * spacing, low[1] - offset[1] * spacing];
        let scale = 1.0 / spacing;
        let place = |p: Point| [(p[0] - origin[0]) * scale, (p[1] - origin[1]) * scale];
        let mut edges = Vec::new();
        let mut loop_starts = vec![0];
        let mut is_island = Vec::new();
        for lumen in &outline.lumens {
            for (position, wall) in std::iter::once(&lumen.outer)
                .chain(&lumen.islands)
                .enumerate()
            {
                let loop_index = is_island.len() as u32;
                edges.extend(wall.edges().map(|(a, b)| WallEdge {
                    start: place(a),
                    end: place(b),
                    loop_index,
                }));
                loop_starts.push(edges.len());
                is_island.push(position > 0);
            }
        }
        let count = |axis: usize| ((high[axis] - origin[axis]) * scale + 1e-6).floor() as usize + 1;
        Self {
            origin,
            spacing,
            columns: count(0),
            rows: count(1),
            edges,
            loop_starts,
            is_island,
        }
    }

    /// Position of a point given in lattice units, m.
    pub fn position(&self, at: Point) -> Point {
        [
            self.origin[0] + self.spacing * at[0],
            self.origin[1] + self.spacing * at[1],
        ]
    }

    /// The same point in lattice units, from its position, m.
    pub fn coordinates(&self, position: Point) -> Point {
        [0, 1].map(|axis| (position[axis] - self.origin[axis]) / self.spacing)
    }
}
