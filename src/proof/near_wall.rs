//! The velocity of the lower bound in the squares near the wall, as a small system of its own.
//!
//! In each square `v` is linear in the values at its corners, so `abs(grad v)^2` gives a quadratic form of four
//! values ([`Share`]). The nodes of these squares are numbered anew, in order of their rows, and each has its
//! couplings to the eight nodes around it in one place.

use crate::grid::Mask;
use crate::solve::Field;

use super::cut_polygon::{Polygon, corner_at};
use super::square_energy::{COUPLINGS, Square};
use super::triangulation::{Division, Triangle, Vertex};

/// Rounds of dividing and improving.
const ROUNDS: usize = 2;
/// Times each value is improved in a round.
const SWEEPS: usize = 3;
/// Marks a corner that is not a fluid node.
const NONE: u32 = u32::MAX;

/// A square that the wall does not cut but that has a divided one around it.
#[derive(Debug, Clone, Copy)]
pub(super) struct WholeSquare {
    /// Row-by-row numbers of its corners, anticlockwise from the lower left.
    pub(super) nodes: [Option<usize>; 4],
    /// Its bubbles, fixed.
    pub(super) bubbles: [f64; 4],
}

/// Integrals over the polygon of one square as functions of the values at its corners.
#[derive(Debug, Clone, Copy, Default)]
struct Share {
    /// Integral of each corner's function.
    volume: [f64; 4],
    /// Integrals of the products of the gradients.
    energy: [[f64; 4]; 4],
}

impl Share {
    fn add(&mut self, triangle: &Triangle) {
        for (k, corner) in triangle.nodes.iter().enumerate() {
            let &Some(a) = corner else {
                continue;
            };
            self.volume[a] += triangle.weight();
            for (l, other) in triangle.nodes.iter().enumerate() {
                if let &Some(b) = other {
                    self.energy[a][b] += triangle.product(k, l);
                }
            }
        }
    }
}

/// A node whose value may be improved.
#[derive(Debug, Clone, Copy)]
struct Row {
    node: u32,
    /// Nodes around it and itself, row by row from below; itself where it has no coupling.
    around: [u32; 9],
    /// Couplings to these.
    energy: [f64; 9],
    /// Half the derivative of twice the volume less the energy, where all values are zero.
    pull: f64,
}

pub(super) struct NearWall<'a> {
    polygons: &'a [Polygon],
    /// Corners of the squares of the polygons, [`NONE`] where there is no fluid node of the polygon.
    polygon_nodes: Vec<[u32; 4]>,
    shares: Vec<Share>,
    squares: &'a [WholeSquare],
    square_nodes: Vec<[u32; 4]>,
    values: Vec<f64>,
    /// Nodes that a polygon holds and whose value is free.
    is_free: Vec<bool>,
    /// Nodes held at zero.
    is_held: Vec<bool>,
}

impl<'a> NearWall<'a> {
    pub(super) fn new(
        mask: &Mask,
        phi: &Field,
        polygons: &'a [Polygon],
        squares: &'a [WholeSquare],
    ) -> Self {
        let corners: Vec<[Option<usize>; 4]> = polygons.iter().map(Polygon::nodes).collect();
        let all = corners
            .iter()
            .chain(squares.iter().map(|square| &square.nodes));
        let numbering = Numbering::new(mask.nodes(), all.flatten().copied().flatten());
        let renumbered =
            |nodes: &[Option<usize>; 4]| nodes.map(|n| n.map_or(NONE, |n| numbering.of(n)));
        let polygon_nodes: Vec<[u32; 4]> = corners.iter().map(renumbered).collect();
        let values = numbering.values(mask, phi);
        let mut is_free = vec![false; values.len()];
        for &node in polygon_nodes.iter().flatten().filter(|&&n| n != NONE) {
            is_free[node as usize] = true;
        }
        Self {
            polygons,
            polygon_nodes,
            shares: Vec::new(),
            squares,
            square_nodes: squares.iter().map(|s| renumbered(&s.nodes)).collect(),
            is_held: vec![false; values.len()],
            values,
            is_free,
        }
    }

    /// Divides the cut squares and improves the values of their nodes, a few times in turn.
    pub(super) fn improve(&mut self) {
        for _ in 0..ROUNDS {
            self.divide();
            let rows = self.rows();
            for _ in 0..SWEEPS {
                for row in &rows {
                    self.improve_node(row);
                }
            }
        }
    }

    /// Divides every polygon; the nodes of those that cannot be divided are set to zero and held there, after
    /// which they need no division.
    fn divide(&mut self) {
        let mut division = Division::default();
        self.shares.clear();
        for (polygon, nodes) in self.polygons.iter().zip(&self.polygon_nodes) {
            let vertices = polygon.vertices.iter().map(|&(at, node)| {
                let corner = node.map(|_| corner_at(at));
                let place = corner.map_or(NONE, |corner| nodes[corner]) as usize;
                Vertex {
                    at,
                    node: corner.filter(|_| !self.is_held[place]),
                    value: self.values.get(place).copied().unwrap_or(0.0),
                }
            });
            let mut share = Share::default();
            let is_divided =
                !polygon.has_hole && division.divide(vertices, |triangle| share.add(triangle));
            if !is_divided {
                share = Share::default();
                for &node in nodes.iter().filter(|&&n| n != NONE) {
                    self.values[node as usize] = 0.0;
                    self.is_held[node as usize] = true;
                    self.is_free[node as usize] = false;
                }
            }
            self.shares.push(share);
        }
    }

    /// The free nodes with their couplings, in order.
    fn rows(&self) -> Vec<Row> {
        let mut place = vec![NONE; self.values.len()];
        let mut rows = Vec::new();
        for (node, place) in place
            .iter_mut()
            .enumerate()
            .filter(|(n, _)| self.is_free[*n])
        {
            *place = rows.len() as u32;
            rows.push(Row {
                node: node as u32,
                around: [node as u32; 9],
                energy: [0.0; 9],
                pull: 0.0,
            });
        }
        let mut add = |nodes: &[u32; 4], corner: usize, pull: f64, energy: [f64; 4]| {
            let index = place.get(nodes[corner] as usize).copied().unwrap_or(NONE);
            let Some(row) = rows.get_mut(index as usize) else {
                return;
            };
            row.pull += pull;
            for (other, entry) in energy.into_iter().enumerate() {
                if nodes[other] != NONE {
                    let k = step_between(corner, other);
                    row.around[k] = nodes[other];
                    row.energy[k] += entry;
                }
            }
        };
        for (share, nodes) in self.shares.iter().zip(&self.polygon_nodes) {
            for corner in 0..4 {
                add(nodes, corner, share.volume[corner], share.energy[corner]);
            }
        }
        for (square, nodes) in self.squares.iter().zip(&self.square_nodes) {
            let bare = Square {
                corners: [0.0; 4],
                bubbles: square.bubbles,
            };
            for corner in 0..4 {
                let pull = 0.25 - bare.half_slope(corner);
                add(nodes, corner, pull, COUPLINGS[corner]);
            }
        }
        rows
    }

    /// Sets one value so that twice the volume less the energy is largest.
    fn improve_node(&mut self, row: &Row) {
        let coupled = row.around.iter().zip(&row.energy);
        let slope: f64 = coupled.map(|(&n, e)| e * self.values[n as usize]).sum();
        let change = (row.pull - slope) / row.energy[4];
        if row.energy[4] > 0.0 && change.is_finite() {
            self.values[row.node as usize] += change;
        }
    }

    /// Integrals of `v` and `abs(grad v)^2` over the squares near the wall.
    pub(super) fn integrals(&self) -> [f64; 2] {
        let at = |nodes: &[u32; 4]| {
            nodes.map(|node| self.values.get(node as usize).copied().unwrap_or(0.0))
        };
        let mut sum = [0.0; 2];
        for (share, nodes) in self.shares.iter().zip(&self.polygon_nodes) {
            let values = at(nodes);
            for (a, value) in values.iter().enumerate() {
                sum[0] += share.volume[a] * value;
                let slope: f64 = share.energy[a].iter().zip(values).map(|(e, v)| e * v).sum();
                sum[1] += value * slope;
            }
        }
        for (square, nodes) in self.squares.iter().zip(&self.square_nodes) {
            let square = Square {
                corners: at(nodes),
                bubbles: square.bubbles,
            };
            sum[0] += square.volume();
            sum[1] += square.energy();
        }
        sum
    }
}

/// Number in [`Row::around`] of one corner of a square seen from another.
fn step_between(from: usize, to: usize) -> usize {
    let column = |corner: usize| usize::from(corner == 1 || corner == 2);
    let row = |corner: usize| usize::from(corner >= 2);
    3 * (1 + row(to) - row(from)) + 1 + column(to) - column(from)
}

/// New numbers, in the same order, for some of the nodes that are numbered row by row.
struct Numbering {
    /// One bit for each node.
    bits: Vec<u64>,
    /// Number of bits set before each word.
    before: Vec<u32>,
}

impl Numbering {
    fn new(nodes: usize, chosen: impl Iterator<Item = usize>) -> Self {
        let mut bits = vec![0_u64; nodes / 64 + 1];
        for node in chosen {
            bits[node / 64] |= 1 << (node % 64);
        }
        let mut count = 0;
        let before = bits.iter().map(|word| {
            count += word.count_ones();
            count - word.count_ones()
        });
        Self {
            before: before.collect(),
            bits,
        }
    }

    /// New number of a chosen node.
    fn of(&self, node: usize) -> u32 {
        let below = self.bits[node / 64] & ((1 << (node % 64)) - 1);
        self.before[node / 64] + below.count_ones()
    }

    /// Values of the chosen nodes.
    fn values(&self, mask: &Mask, phi: &Field) -> Vec<f64> {
        let mut values = Vec::new();
        let mut runs = mask.runs.iter().peekable();
        for (index, &word) in self.bits.iter().enumerate() {
            let mut rest = word;
            while rest != 0 {
                let node = 64 * index as u32 + rest.trailing_zeros();
                rest &= rest - 1;
                while runs.next_if(|run| run.natural + run.len <= node).is_some() {}
                let value = runs.peek().and_then(|run| {
                    let (colour, place) = run.node(run.first + (node - run.natural));
                    phi.colour[colour as usize].get(place as usize).copied()
                });
                values.push(value.unwrap_or(0.0));
            }
        }
        values
    }
}
