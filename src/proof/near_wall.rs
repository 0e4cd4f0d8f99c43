//! The velocity of the lower bound in the squares near the wall, as a small system of its own.
//!
//! In each square `v` is linear in the values at its corners, so `abs(grad v)^2` gives a quadratic form of four
//! values ([`Share`]). The nodes of these squares are numbered anew, in order of their rows, and each has its
//! couplings to the eight nodes around it in one place.

use rayon::prelude::*;

use crate::grid::Mask;
use crate::solve::Field;

use super::cut_polygon::{Polygon, corner_at};
use super::interior::sum_in_groups;
use super::numbering::Numbering;
use super::square_energy::{COUPLINGS, Square};
use super::triangulation::{Division, Triangle, Vertex};

/// Times each value is improved.
const SWEEPS: usize = 2;
/// Sum of the squares of the numbers of vertices from which polygons are divided on several threads: some
/// milliseconds on one.
const PARALLEL_WORK: usize = 150_000;
/// Fewest polygons that one thread takes at a time.
const LEAST_TOGETHER: usize = 64;
/// Marks a corner that is not a fluid node.
pub(super) const NONE: u32 = u32::MAX;

/// A square that the wall does not cut but that has a divided one around it.
#[derive(Debug, Clone, Copy)]
pub(super) struct WholeSquare {
    /// Row-by-row numbers of its corners, anticlockwise from the lower left; [`NONE`] where not fluid.
    pub(super) nodes: [u32; 4],
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

    /// Integrals of `v` and `abs(grad v)^2` for given values.
    fn at(&self, values: [f64; 4]) -> [f64; 2] {
        let (mut volume, mut energy) = (0.0, 0.0);
        for (a, value) in values.iter().enumerate() {
            volume += self.volume[a] * value;
            let couplings = self.energy[a].iter().zip(values);
            energy += value * couplings.map(|(e, v)| e * v).sum::<f64>();
        }
        [volume, energy]
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

impl Row {
    /// Adds couplings of one corner of a square, that of this node, to all four.
    fn add(&mut self, corner: usize, nodes: &[u32; 4], couplings: &[f64; 4]) {
        for (other, coupling) in couplings.iter().enumerate() {
            if nodes[other] != NONE {
                let k = STEPS[corner][other];
                self.around[k] = nodes[other];
                self.energy[k] += coupling;
            }
        }
    }
}

fn row_at<'r>(rows: &'r mut [Row], row_of: &[u32], node: u32) -> Option<&'r mut Row> {
    rows.get_mut(*row_of.get(node as usize)? as usize)
}

pub(super) struct NearWall<'a> {
    polygons: &'a [Polygon],
    /// Corners of the squares of the polygons, [`NONE`] where there is no fluid node of the polygon.
    polygon_nodes: Vec<[u32; 4]>,
    shares: Vec<Share>,
    squares: &'a [WholeSquare],
    square_nodes: Vec<[u32; 4]>,
    values: Vec<f64>,
    /// Nodes held at zero.
    is_held: Vec<bool>,
    /// Nodes of polygons, with what the whole squares add to their couplings.
    rows: Vec<Row>,
    /// Place of each node in `rows`, [`NONE`] for those of whole squares only.
    row_of: Vec<u32>,
}

impl<'a> NearWall<'a> {
    pub(super) fn new(
        mask: &Mask,
        phi: &Field,
        polygons: &'a [Polygon],
        squares: &'a [WholeSquare],
    ) -> Self {
        let corners: Vec<[u32; 4]> = polygons.iter().map(node_numbers).collect();
        let all = corners
            .iter()
            .chain(squares.iter().map(|square| &square.nodes));
        let fluid = all.flatten().filter(|&&node| node != NONE);
        let numbering = Numbering::new(mask.nodes(), fluid.map(|&node| node as usize));
        let renumbered =
            |nodes: &[u32; 4]| nodes.map(|node| numbering.of(node as usize).unwrap_or(NONE));
        let polygon_nodes: Vec<[u32; 4]> = corners.iter().map(renumbered).collect();
        let values = numbering.values(mask, phi);
        let mut near_wall = Self {
            polygons,
            polygon_nodes,
            shares: Vec::new(),
            squares,
            square_nodes: squares.iter().map(|s| renumbered(&s.nodes)).collect(),
            is_held: vec![false; values.len()],
            rows: Vec::new(),
            row_of: vec![NONE; values.len()],
            values,
        };
        near_wall.set_up_rows();
        near_wall
    }

    fn set_up_rows(&mut self) {
        for &node in self.polygon_nodes.iter().flatten().filter(|&&n| n != NONE) {
            self.row_of[node as usize] = 0;
        }
        for (node, place) in self.row_of.iter_mut().enumerate().filter(|(_, p)| **p == 0) {
            *place = self.rows.len() as u32;
            self.rows.push(Row {
                node: node as u32,
                around: [node as u32; 9],
                energy: [0.0; 9],
                pull: 0.0,
            });
        }
        for (square, nodes) in self.squares.iter().zip(&self.square_nodes) {
            let bare = Square {
                corners: [0.0; 4],
                bubbles: square.bubbles,
            };
            for (corner, couplings) in COUPLINGS.iter().enumerate() {
                if let Some(row) = row_at(&mut self.rows, &self.row_of, nodes[corner]) {
                    row.pull += 0.25 - bare.half_slope(corner);
                    row.add(corner, nodes, couplings);
                }
            }
        }
    }

    /// Divides the cut squares and improves the values of their nodes.
    #[must_use]
    pub(super) fn improved(mut self) -> Self {
        self.divide();
        let mut rows = std::mem::take(&mut self.rows);
        for (share, nodes) in self.shares.iter().zip(&self.polygon_nodes) {
            for (corner, couplings) in share.energy.iter().enumerate() {
                if let Some(row) = row_at(&mut rows, &self.row_of, nodes[corner]) {
                    row.pull += share.volume[corner];
                    row.add(corner, nodes, couplings);
                }
            }
        }
        for _ in 0..SWEEPS {
            for row in &rows {
                self.improve_node(row);
            }
        }
        self
    }

    /// Divides every polygon; the nodes of those that cannot be divided are set to zero and held there, after
    /// which they need no division.
    fn divide(&mut self) {
        let count = self.polygons.len();
        let mut shares = std::mem::take(&mut self.shares);
        shares.clear();
        if self.is_long_to_divide() {
            let each = (0..count).into_par_iter().with_min_len(LEAST_TOGETHER);
            let divided: Vec<Option<Share>> = each
                .map_init(Division::default, |division, k| self.share(division, k))
                .collect();
            // The first one that cannot be divided holds nodes of those after it.
            shares.extend(divided.into_iter().map_while(|share| share));
        }
        let mut division = Division::default();
        for index in shares.len()..count {
            let share = self.share(&mut division, index);
            if share.is_none() {
                let nodes = self.polygon_nodes[index];
                for node in nodes.into_iter().filter(|&n| n != NONE) {
                    self.values[node as usize] = 0.0;
                    self.is_held[node as usize] = true;
                }
            }
            shares.push(share.unwrap_or_default());
        }
        self.shares = shares;
    }

    /// Whether dividing the polygons, cubic in their vertices up to a limit, is worth several threads.
    fn is_long_to_divide(&self) -> bool {
        let vertices = self.polygons.iter().map(|polygon| polygon.vertices.len());
        vertices.map(|n| n * n).sum::<usize>() >= PARALLEL_WORK
    }

    /// Integrals over one polygon; `None` where it cannot be divided.
    fn share(&self, division: &mut Division, index: usize) -> Option<Share> {
        let (polygon, nodes) = (&self.polygons[index], &self.polygon_nodes[index]);
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
        is_divided.then_some(share)
    }

    /// Sets one value so that twice the volume less the energy is largest.
    fn improve_node(&mut self, row: &Row) {
        let coupled = row.around.iter().zip(&row.energy);
        let slope: f64 = coupled.map(|(&n, e)| e * self.values[n as usize]).sum();
        let change = (row.pull - slope) / row.energy[4];
        let node = row.node as usize;
        if row.energy[4] > 0.0 && change.is_finite() && !self.is_held[node] {
            self.values[node] += change;
        }
    }

    /// Integrals of `v` and `abs(grad v)^2` over the squares near the wall.
    pub(super) fn integrals(&self) -> [f64; 2] {
        let at = |nodes: &[u32; 4]| {
            nodes.map(|node| self.values.get(node as usize).copied().unwrap_or(0.0))
        };
        let shares = self.shares.iter().zip(&self.polygon_nodes);
        let divided = sum_in_groups(shares.map(|(share, nodes)| share.at(at(nodes))));
        let squares = self.squares.iter().zip(&self.square_nodes);
        let whole = sum_in_groups(squares.map(|(square, nodes)| {
            let square = Square {
                corners: at(nodes),
                bubbles: square.bubbles,
            };
            [square.volume(), square.energy()]
        }));
        [divided[0] + whole[0], divided[1] + whole[1]]
    }
}

/// Row-by-row numbers of the nodes of a polygon, by corner of its square.
fn node_numbers(polygon: &Polygon) -> [u32; 4] {
    polygon.nodes().map(|node| node.map_or(NONE, |n| n as u32))
}

/// Number in [`Row::around`] of one corner of a square, second, seen from another, first.
const STEPS: [[usize; 4]; 4] = [[4, 5, 8, 7], [3, 4, 7, 6], [0, 1, 4, 3], [1, 2, 5, 4]];
