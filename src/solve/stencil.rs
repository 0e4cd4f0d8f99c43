//! The five-point operator: relaxation of one colour and residuals.
//!
//! Scaled by the grid's own spacing squared: at a node with whole arms `4 phi - (sum of neighbours) = b`
//! with `b = h^2 f`. At a wall node with arms `a` (Shortley and Weller 1938) the weight of the neighbour
//! along arm `l` with opposite arm `r` is `2 / (l (l + r))` and the diagonal `2 / (l r) + 2 / (d u)`.
//!
//! A sweep writes one colour and reads only the other, so nodes are independent of each other and the
//! result does not depend on how the work is shared out.

use rayon::prelude::*;

use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Block, Colour, Mask, WallNode};

/// Fluid nodes below which a sweep stays on one thread.
const PARALLEL_NODES: usize = 120_000;

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

    /// Solves the equation of every node of one colour for the given values of the other.
    pub(crate) fn relax(
        &self,
        mask: &Mask,
        colour: Colour,
        own: &mut [f64],
        other: &[f64],
        rhs: &[f64],
    ) {
        let c = colour as usize;
        for_blocks(mask, colour, own, |part| {
            for s in &mask.segments[c][part.segments.clone()] {
                let n = s.len as usize;
                let (left, down, up) = (s.left as usize, s.down as usize, s.up as usize);
                let target = &mut part.values[s.start as usize - part.offset..][..n];
                let row = &other[left..=left + n];
                let (west, east) = (&row[..n], &row[1..]);
                let (down, up) = (&other[down..][..n], &other[up..][..n]);
                let b = &rhs[s.start as usize..][..n];
                for k in 0..n {
                    target[k] = 0.25 * (((west[k] + east[k]) + (down[k] + up[k])) + b[k]);
                }
            }
            for w in &self.wall[c][part.wall.clone()] {
                let sum = rhs[w.node as usize] + gather(w, other);
                part.values[w.node as usize - part.offset] = sum / w.diagonal;
            }
        });
    }

    /// `b - A phi` at the nodes of one colour.
    pub(crate) fn residual(
        &self,
        mask: &Mask,
        colour: Colour,
        field: [&[f64]; 2],
        rhs: &[f64],
        out: &mut [f64],
    ) {
        let c = colour as usize;
        let (own, other) = (field[c], field[1 - c]);
        for_blocks(mask, colour, out, |part| {
            for s in &mask.segments[c][part.segments.clone()] {
                let n = s.len as usize;
                let (left, down, up) = (s.left as usize, s.down as usize, s.up as usize);
                let target = &mut part.values[s.start as usize - part.offset..][..n];
                let row = &other[left..=left + n];
                let (west, east) = (&row[..n], &row[1..]);
                let (down, up) = (&other[down..][..n], &other[up..][..n]);
                let b = &rhs[s.start as usize..][..n];
                let centre = &own[s.start as usize..][..n];
                for k in 0..n {
                    let around = (west[k] + east[k]) + (down[k] + up[k]);
                    target[k] = (around + b[k]) - 4.0 * centre[k];
                }
            }
            for w in &self.wall[c][part.wall.clone()] {
                let node = w.node as usize;
                part.values[node - part.offset] =
                    rhs[node] + gather(w, other) - w.diagonal * own[node];
            }
        });
    }
}

fn gather(w: &WallStencil, other: &[f64]) -> f64 {
    w.neighbour
        .iter()
        .zip(&w.weight)
        .map(|(&n, weight)| other.get(n as usize).map_or(0.0, |v| weight * v))
        .sum()
}

/// The part of a sweep that one block does.
struct Part<'a> {
    values: &'a mut [f64],
    offset: usize,
    segments: std::ops::Range<usize>,
    wall: std::ops::Range<usize>,
}

/// Runs `work` on every block of a grid, on several threads when the grid is large.
fn for_blocks(
    mask: &Mask,
    colour: Colour,
    values: &mut [f64],
    work: impl Fn(&mut Part) + Sync + Send,
) {
    let c = colour as usize;
    let mut parts = Vec::with_capacity(mask.blocks.len());
    let (mut rest, mut before) = (values, Block::default());
    for block in &mask.blocks {
        let len = (block.node_end[c] - before.node_end[c]) as usize;
        let (head, tail) = rest.split_at_mut(len);
        parts.push(Part {
            values: head,
            offset: before.node_end[c] as usize,
            segments: before.segment_end[c] as usize..block.segment_end[c] as usize,
            wall: before.wall_end[c] as usize..block.wall_end[c] as usize,
        });
        rest = tail;
        before = *block;
    }
    if mask.nodes() >= PARALLEL_NODES && rayon::current_num_threads() > 1 {
        parts.par_iter_mut().for_each(work);
    } else {
        parts.iter_mut().for_each(work);
    }
}
