//! The lower bound: an admissible velocity from the nodal values.
//!
//! In lattice squares that the wall does not cut, `v` is bilinear with a bubble on each side
//! ([`super::square_energy`]): exact for a quadratic `phi`, so that the interior costs next to nothing. Squares
//! cut by the wall are divided into triangles between nodes in the fluid and points of the wall
//! ([`super::triangulation`]), with `v = 0` on the wall and linear in each; a square cut in two by a thin wall
//! has two such polygons. Along the side of a cut square `v` is linear between the nodes and the crossings
//! with the wall, seen from both its squares alike, so `v` is continuous.
//!
//! A wall point close to a side where `v` would be large gets a foot there, at which `v = 0` for both squares;
//! a polygon that cannot be divided (an island inside one square) has its nodes set to zero. The values of the
//! nodes beside the wall are then made the best possible for their triangles, one by one. None of this
//! touches the validity: that needs continuity and the zero on the wall only.

use std::collections::{BTreeMap, BTreeSet};

use crate::grid::{Lattice, Mask, Region, cut_cells, signed_area};
use crate::solve::Field;

use super::cut_polygon::{Feet, Polygon, agree, feet, polygons};
use super::square_energy::{STIFFNESS, Square};
use super::triangulation::{Triangle, Vertex, triangulate};
use super::upper_bound::check_area;
use super::{ProofError, ROUNDING};

/// Shift of the squares against the nodes, so that walls on lattice lines are nothing special. Smaller
/// than the distance below which a node counts as wall.
const SHIFT: [f64; 2] = [1.37e-7, 2.11e-7];
/// Rounds of dividing and improving.
const ROUNDS: usize = 2;
/// Times each value is improved in a round.
const SWEEPS: usize = 3;

/// A lower bound for the conductance; arguments and unit as in [`super::upper_bound`].
pub(super) fn lower_bound(lattice: &Lattice, mask: &Mask, phi: &Field) -> Result<f64, ProofError> {
    let regions = cut_cells(lattice, SHIFT).map_err(|_| ProofError::Cutting { relative: 1.0 })?;
    let areas: f64 = regions
        .iter()
        .flat_map(|region| &region.boundary)
        .map(|polygon| signed_area(polygon))
        .sum();
    let mut velocity = Velocity::new(mask, phi, &regions);
    if !agree(&velocity.polygons) {
        return Err(ProofError::Discontinuous);
    }
    velocity.improve();
    let (volume, energy, whole) = velocity.whole_squares();
    check_area(lattice, areas + (whole + velocity.foot_squares) as f64)?;
    let (volume, energy) = velocity.with_cut_squares(volume, energy);
    if energy > 0.0 {
        Ok(volume * volume / energy * (1.0 - ROUNDING))
    } else {
        Ok(0.0)
    }
}

/// A node beside the wall, whose value may be improved.
struct BandNode {
    /// Row-by-row number.
    node: usize,
    /// Its triangles, and which corner of each it is.
    triangles: Vec<(usize, usize)>,
    /// Its squares that the wall does not cut.
    squares: Vec<WholeSquare>,
}

/// A square that the wall does not cut, by the numbers of its nodes.
struct WholeSquare {
    nodes: [Option<usize>; 4],
    bubbles: [f64; 4],
    /// Which corner the node at hand is.
    corner: usize,
}

struct Velocity<'a> {
    mask: &'a Mask,
    /// Nodal values row by row, from which the bubbles are taken.
    phi: Vec<f64>,
    /// Nodal values row by row, as improved.
    values: Vec<f64>,
    polygons: Vec<Polygon>,
    /// Whole squares that are divided because of a foot.
    foot_squares: usize,
    /// Columns of the divided squares of each row, rising.
    cut: BTreeMap<i64, Vec<i64>>,
    /// Nodes held at zero.
    held: BTreeSet<usize>,
    triangles: Vec<Triangle>,
}

impl<'a> Velocity<'a> {
    fn new(mask: &'a Mask, phi: &Field, regions: &[Region]) -> Self {
        let phi = phi.natural(mask);
        let node_at = |at: (i64, i64)| natural_at(mask, at);
        let value_at = |at: (i64, i64)| node_at(at).and_then(|n| phi.get(n).copied());
        let feet: Feet = feet(regions, value_at);
        let polygons = polygons(regions, &feet, node_at);
        let mut cut: BTreeMap<i64, Vec<i64>> = BTreeMap::new();
        for polygon in &polygons {
            let row = cut.entry(polygon.cell.1).or_default();
            if row.last() != Some(&polygon.cell.0) {
                row.push(polygon.cell.0);
            }
        }
        Self {
            mask,
            values: phi.clone(),
            phi,
            foot_squares: polygons.len() - regions.len(),
            polygons,
            cut,
            held: BTreeSet::new(),
            triangles: Vec::new(),
        }
    }

    /// Divides the cut squares and improves the values of their nodes, a few times in turn.
    fn improve(&mut self) {
        for _ in 0..ROUNDS {
            self.divide();
            let band = self.band_nodes();
            for _ in 0..SWEEPS {
                for node in &band {
                    self.improve_node(node);
                }
            }
        }
    }

    /// Divides every polygon; the nodes of those that cannot be divided are set to zero and held there, after
    /// which they need no division.
    fn divide(&mut self) {
        self.triangles.clear();
        for index in 0..self.polygons.len() {
            let polygon = &self.polygons[index];
            let vertices = polygon.vertices.iter().map(|&(at, node)| Vertex {
                at,
                node: node.filter(|n| !self.held.contains(n)),
                value: node.map_or(0.0, |n| self.values[n]),
            });
            let divided = if polygon.has_hole {
                None
            } else {
                triangulate(vertices.collect())
            };
            match divided {
                Some(triangles) => self.triangles.extend(triangles),
                None => {
                    for &(_, node) in &self.polygons[index].vertices {
                        if let Some(n) = node {
                            self.values[n] = 0.0;
                            self.held.insert(n);
                        }
                    }
                }
            }
        }
    }

    fn band_nodes(&self) -> Vec<BandNode> {
        let mut corners: Vec<(usize, usize, usize)> = self
            .triangles
            .iter()
            .enumerate()
            .flat_map(|(t, triangle)| {
                (0..3).filter_map(move |k| triangle.nodes[k].map(|node| (node, t, k)))
            })
            .filter(|(node, ..)| !self.held.contains(node))
            .collect();
        corners.sort_unstable();
        let mut places: Vec<(usize, (i64, i64))> = self
            .polygons
            .iter()
            .flat_map(|polygon| polygon.nodes_at(|at| natural_at(self.mask, at)))
            .collect();
        places.sort_unstable();
        places.dedup();
        corners
            .chunk_by(|a, b| a.0 == b.0)
            .filter_map(|chunk| {
                let node = chunk.first()?.0;
                let place = places.binary_search_by_key(&node, |p| p.0).ok()?;
                Some(BandNode {
                    node,
                    triangles: chunk.iter().map(|&(_, t, k)| (t, k)).collect(),
                    squares: self.squares_around(places[place].1),
                })
            })
            .collect()
    }

    fn squares_around(&self, (i, j): (i64, i64)) -> Vec<WholeSquare> {
        [(i, j), (i - 1, j), (i - 1, j - 1), (i, j - 1)]
            .into_iter()
            .enumerate()
            .filter(|&(_, (column, row))| !self.is_cut(column, row))
            .map(|(corner, (column, row))| WholeSquare {
                nodes: corner_nodes(self.mask, column, row),
                bubbles: self.bubbles(column, row),
                corner,
            })
            .collect()
    }

    fn values_of(&self, triangle: &Triangle) -> [f64; 3] {
        triangle
            .nodes
            .map(|node| node.map_or(0.0, |n| self.values[n]))
    }

    /// Sets one value so that twice the volume less the energy is largest.
    fn improve_node(&mut self, node: &BandNode) {
        let (mut pull, mut stiffness) = (0.0, 0.0);
        for &(t, corner) in &node.triangles {
            let triangle = &self.triangles[t];
            pull += triangle.weight() - triangle.half_slope(self.values_of(triangle), corner);
            stiffness += triangle.stiffness(corner);
        }
        for square in &node.squares {
            let now = Square {
                corners: square.nodes.map(|n| n.map_or(0.0, |n| self.values[n])),
                bubbles: square.bubbles,
            };
            pull += 0.25 - now.half_slope(square.corner);
            stiffness += STIFFNESS;
        }
        if stiffness > 0.0 && (pull / stiffness).is_finite() {
            self.values[node.node] += pull / stiffness;
        }
    }

    /// Adds the divided squares to integrals of `v` and `abs(grad v)^2`.
    fn with_cut_squares(&self, volume: f64, energy: f64) -> (f64, f64) {
        self.triangles.iter().fold((volume, energy), |(v, e), t| {
            let values = self.values_of(t);
            (v + t.volume(values), e + t.energy(values))
        })
    }

    /// Integrals of `v` and `abs(grad v)^2` over the squares that the wall does not cut, and their number.
    fn whole_squares(&self) -> (f64, f64, usize) {
        let (mut volume, mut energy, mut count) = (0.0, 0.0, 0);
        for row in -1..i64::try_from(self.mask.rows()).unwrap_or(i64::MAX) {
            let special = self.special_squares(row);
            let (mut v, mut e) = (0.0, 0.0);
            for (from, to) in self.candidate_squares(row) {
                let mut i = from;
                let begin = special.partition_point(|&c| c < from);
                let inside = special[begin..].iter().copied().take_while(|&c| c < to);
                for stop in inside.chain([to]) {
                    let (dv, de) = self.plain_squares(i..stop, row);
                    v += dv;
                    e += de;
                    count += (stop - i) as usize;
                    if stop < to && !self.is_cut(stop, row) {
                        let square = self.square(stop, row);
                        v += square.volume();
                        e += square.energy();
                        count += 1;
                    }
                    i = stop + 1;
                }
            }
            volume += v;
            energy += e;
        }
        (volume, energy, count)
    }

    fn cut_columns(&self, row: i64) -> &[i64] {
        self.cut.get(&row).map_or(&[][..], Vec::as_slice)
    }

    fn is_cut(&self, i: i64, row: i64) -> bool {
        self.cut_columns(row).binary_search(&i).is_ok()
    }

    /// Columns of a row of squares that are divided or have a divided one among the eight around, rising.
    fn special_squares(&self, row: i64) -> Vec<i64> {
        let mut columns: Vec<i64> = (row - 1..=row + 1)
            .flat_map(|r| self.cut_columns(r))
            .flat_map(|&c| [c - 1, c, c + 1])
            .collect();
        columns.sort_unstable();
        columns.dedup();
        columns
    }

    /// Squares with whole squares all around.
    fn plain_squares(&self, squares: std::ops::Range<i64>, row: i64) -> (f64, f64) {
        let n = (squares.end - squares.start).max(0) as usize;
        if n == 0 {
            return (0.0, 0.0);
        }
        // Nodes from one before the first square to two after it, in one stretch of memory.
        let line = |j: i64| {
            let start = natural_at(self.mask, (squares.start - 1, j))?;
            let last = natural_at(self.mask, (squares.end + 1, j))?;
            let line = self.phi.get(start..=last)?;
            (line.len() == n + 3).then_some(line)
        };
        let (Some(r0), Some(r1), Some(r2), Some(r3)) =
            (line(row - 1), line(row), line(row + 1), line(row + 2))
        else {
            return squares
                .map(|i| self.square(i, row))
                .fold((0.0, 0.0), |(v, e), s| (v + s.volume(), e + s.energy()));
        };
        let (mut volume, mut energy) = (0.0, 0.0);
        for k in 0..n {
            let across = |line: &[f64]| bubble([line[k], line[k + 1], line[k + 2], line[k + 3]]);
            let up = |k: usize| bubble([r0[k], r1[k], r2[k], r3[k]]);
            let square = Square {
                corners: [r1[k + 1], r1[k + 2], r2[k + 2], r2[k + 1]],
                bubbles: [across(r1), up(k + 2), across(r2), up(k + 1)],
            };
            volume += square.volume();
            energy += square.energy();
        }
        (volume, energy)
    }

    /// A square that the wall does not cut.
    fn square(&self, i: i64, j: i64) -> Square {
        let nodes = corner_nodes(self.mask, i, j);
        Square {
            corners: nodes.map(|node| node.map_or(0.0, |n| self.values[n])),
            bubbles: self.bubbles(i, j),
        }
    }

    /// Bubbles of a whole square. A side has one where both its squares are whole and four nodes in line are
    /// fluid.
    fn bubbles(&self, i: i64, j: i64) -> [f64; 4] {
        let bubble_of = |at: (i64, i64), step: (i64, i64), beyond: (i64, i64)| {
            if self.is_cut(beyond.0, beyond.1) {
                return 0.0;
            }
            let four = [-1, 0, 1, 2].map(|k| {
                let n = natural_at(self.mask, (at.0 + k * step.0, at.1 + k * step.1))?;
                self.phi.get(n).copied()
            });
            match four {
                [Some(a), Some(b), Some(c), Some(d)] => bubble([a, b, c, d]),
                _ => 0.0,
            }
        };
        [
            bubble_of((i, j), (1, 0), (i, j - 1)),
            bubble_of((i + 1, j), (0, 1), (i + 1, j)),
            bubble_of((i, j + 1), (1, 0), (i, j + 1)),
            bubble_of((i, j), (0, 1), (i - 1, j)),
        ]
    }

    /// Squares of a row with at least one fluid node, as disjoint ranges of columns.
    fn candidate_squares(&self, row: i64) -> Vec<(i64, i64)> {
        let mut spans: Vec<(i64, i64)> = [row, row + 1]
            .into_iter()
            .filter_map(|j| u32::try_from(j).ok())
            .flat_map(|j| self.mask.row(j))
            .map(|run| (i64::from(run.first) - 1, i64::from(run.end())))
            .collect();
        spans.sort_unstable();
        let mut merged: Vec<(i64, i64)> = Vec::new();
        for (from, to) in spans {
            match merged.last_mut() {
                Some(last) if from <= last.1 => last.1 = last.1.max(to),
                _ => merged.push((from, to)),
            }
        }
        merged
    }
}

/// Row-by-row numbers of the corners of a square, anticlockwise from the lower left.
fn corner_nodes(mask: &Mask, i: i64, j: i64) -> [Option<usize>; 4] {
    [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)].map(|at| natural_at(mask, at))
}

/// Row-by-row number of the fluid node `(i, j)`.
fn natural_at(mask: &Mask, (i, j): (i64, i64)) -> Option<usize> {
    let (i, j) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
    mask.natural_at(i, j).map(|n| n as usize)
}

/// What the cubic through four equally spaced values has in the middle beyond the mean of the inner two.
fn bubble([a, b, c, d]: [f64; 4]) -> f64 {
    (b + c - a - d) / 16.0
}
