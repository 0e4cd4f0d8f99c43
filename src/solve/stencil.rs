//! The five-point operator: relaxation of one colour and residuals.
//!
//! Scaled by the grid's own spacing squared: at a node with whole arms `4 phi - (sum of neighbours) = b`
//! with `b = h^2 f`. At a wall node with arms `a` (Shortley and Weller 1938) the weight of the neighbour
//! along arm `l` with opposite arm `r` is `2 / (l (l + r))` and the diagonal `2 / (l r) + 2 / (d u)`.
//!
//! A sweep writes one colour and reads only the other, so nodes are independent of each other and the
//! result does not depend on how the work is shared out. Every function does one row, so that passes can do
//! several things to a row while it is in cache.

use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, WallNode};

use super::field::Field;
use super::row_set::Row;

/// Right side of the equation on one grid.
#[derive(Debug, Clone, Copy)]
pub(crate) enum Source<'a> {
    /// The same everywhere.
    Uniform(f64),
    /// One value for every node.
    Nodal(&'a Field),
}

impl Source<'_> {
    fn at(self, colour: usize, node: u32) -> f64 {
        match self {
            Self::Uniform(value) => value,
            Self::Nodal(field) => field.colour[colour][node as usize],
        }
    }
}

/// Stencil of one wall node.
#[derive(Debug, Clone, Copy)]
struct WallStencil {
    node: u32,
    neighbour: [u32; 4],
    weight: [f64; 4],
    diagonal: f64,
}

/// The operator of one grid.
#[derive(Debug, Clone)]
pub(crate) struct Stencil {
    wall: [Vec<WallStencil>; 2],
}

/// Weights of the four neighbours, zero where the arm is cut, and the diagonal.
pub(crate) fn weights(node: &WallNode) -> ([f64; 4], f64) {
    let [left, right, down, up] = node.arm;
    let mut weight = [
        2.0 / (left * (left + right)),
        2.0 / (right * (left + right)),
        2.0 / (down * (down + up)),
        2.0 / (up * (down + up)),
    ];
    for (w, &n) in weight.iter_mut().zip(&node.neighbour) {
        if n == crate::grid::NO_NODE {
            *w = 0.0;
        }
    }
    (weight, 2.0 / (left * right) + 2.0 / (down * up))
}

/// The arm that points the other way.
pub(crate) fn opposite(arm: usize) -> usize {
    match arm {
        ARM_LEFT => ARM_RIGHT,
        ARM_RIGHT => ARM_LEFT,
        ARM_DOWN => ARM_UP,
        _ => ARM_DOWN,
    }
}

impl Stencil {
    /// Memory, bytes.
    pub(crate) fn bytes(&self) -> usize {
        self.wall.iter().map(|wall| size_of_val(&wall[..])).sum()
    }

    pub(crate) fn new(mask: &Mask) -> Self {
        let of = |colour: usize| {
            mask.wall[colour]
                .iter()
                .map(|node| {
                    let (weight, diagonal) = weights(node);
                    WallStencil {
                        node: node.node,
                        neighbour: node.neighbour,
                        weight,
                        diagonal,
                    }
                })
                .collect()
        };
        Self {
            wall: [of(0), of(1)],
        }
    }

    /// Solves the equation of every node of one colour in one row for the given values of the other.
    ///
    /// - `own`: values that hold the row, and the storage index of their first
    /// - `other`: rows of the other colour below, at and above it
    pub(crate) fn relax_row(
        &self,
        mask: &Mask,
        (colour, row): (Colour, usize),
        (own, first): (&mut [f64], usize),
        other: [Row; 3],
        source: Source,
    ) {
        let c = colour as usize;
        let [at, next] = [&mask.starts[row], &mask.starts[row + 1]];
        for s in &mask.segments[c][at.segment[c] as usize..next.segment[c] as usize] {
            let n = s.len as usize;
            let target = &mut own[s.start as usize - first..][..n];
            let beside = other[1].from(s.left, n + 1);
            let (west, east) = (&beside[..n], &beside[1..][..n]);
            let (down, up) = (other[0].from(s.down, n), other[2].from(s.up, n));
            match source {
                Source::Uniform(b) => {
                    for k in 0..n {
                        target[k] = 0.25 * (((west[k] + east[k]) + (down[k] + up[k])) + b);
                    }
                }
                Source::Nodal(field) => {
                    let b = &field.colour[c][s.start as usize..][..n];
                    for k in 0..n {
                        target[k] = 0.25 * (((west[k] + east[k]) + (down[k] + up[k])) + b[k]);
                    }
                }
            }
        }
        for w in &self.wall[c][at.wall[c] as usize..next.wall[c] as usize] {
            let sum = source.at(c, w.node) + gather(w, other);
            own[w.node as usize - first] = sum / w.diagonal;
        }
    }

    /// `b - A phi` at the nodes of one colour in one row.
    ///
    /// - `own`: the row of `phi`
    /// - `other`: rows of the other colour below, at and above it
    pub(crate) fn residual_row(
        &self,
        mask: &Mask,
        (colour, row): (Colour, usize),
        (own, other): (Row, [Row; 3]),
        source: Source,
        out: &mut [f64],
    ) {
        let c = colour as usize;
        let [at, next] = [&mask.starts[row], &mask.starts[row + 1]];
        let first = at.node[c];
        for s in &mask.segments[c][at.segment[c] as usize..next.segment[c] as usize] {
            let n = s.len as usize;
            let target = &mut out[(s.start - first) as usize..][..n];
            let beside = other[1].from(s.left, n + 1);
            let (west, east) = (&beside[..n], &beside[1..][..n]);
            let (down, up) = (other[0].from(s.down, n), other[2].from(s.up, n));
            let centre = own.from(s.start, n);
            match source {
                Source::Uniform(b) => {
                    for k in 0..n {
                        let around = (west[k] + east[k]) + (down[k] + up[k]);
                        target[k] = (around + b) - 4.0 * centre[k];
                    }
                }
                Source::Nodal(field) => {
                    let b = &field.colour[c][s.start as usize..][..n];
                    for k in 0..n {
                        let around = (west[k] + east[k]) + (down[k] + up[k]);
                        target[k] = (around + b[k]) - 4.0 * centre[k];
                    }
                }
            }
        }
        for w in &self.wall[c][at.wall[c] as usize..next.wall[c] as usize] {
            out[(w.node - first) as usize] =
                source.at(c, w.node) + gather(w, other) - w.diagonal * own.at(w.node);
        }
    }

    /// `b - A phi` at all nodes of one colour.
    pub(crate) fn residual(
        &self,
        mask: &Mask,
        colour: Colour,
        phi: &Field,
        source: Source,
        out: &mut [f64],
    ) {
        let c = colour as usize;
        for row in 0..mask.rows() {
            let range = mask.starts[row].node[c] as usize..mask.starts[row + 1].node[c] as usize;
            let own = phi.row(mask, colour, row);
            let other = phi.around(mask, colour.other(), row);
            self.residual_row(mask, (colour, row), (own, other), source, &mut out[range]);
        }
    }
}

fn gather(w: &WallStencil, other: [Row; 3]) -> f64 {
    let rows = [other[1], other[1], other[0], other[2]];
    let [left, right, down, up] =
        std::array::from_fn(|arm| w.weight[arm] * rows[arm].at(w.neighbour[arm]));
    ((left + right) + down) + up
}
