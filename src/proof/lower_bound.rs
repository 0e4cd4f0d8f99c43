//! The lower bound: an admissible velocity from the nodal values.
//!
//! Lattice squares are split into two triangles, on which `w` is linear between the values of its corners;
//! `v` is the positive part of `w` inside the section and zero outside. `v` is continuous and vanishes on
//! the wall if `w <= 0` at every point of the wall in every triangle, and since `w` is linear there it is
//! enough to look at the vertices of the outline and its crossings with the sides of the triangles.
//! Corners in the fluid have the nodal value; corners beyond the wall start at zero and are lowered until
//! that holds. A square cut in two by a thin wall counts as two, and a corner beyond the wall has a value of
//! its own for each fluid region that sees it: regions that share a part of a side share its two corners.

use std::collections::BTreeMap;

use crate::geometry::Point;
use crate::grid::{EAST, Lattice, Mask, NORTH, Region, cut_cells, shared_parts, signed_area};
use crate::solve::Field;

use super::upper_bound::{check_area, root};
use super::{ProofError, ROUNDING};

/// Shift of the triangles against the nodes, so that walls on lattice lines are nothing special. Smaller
/// than the distance below which a node counts as wall.
const SHIFT: Point = [1.37e-7, 2.11e-7];
/// Corners of a cell, anticlockwise from the lower left.
const CORNERS: [Point; 4] = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]];
/// Corners of the two triangles of a cell: below and above the diagonal.
const TRIANGLES: [[usize; 3]; 2] = [[0, 1, 2], [0, 2, 3]];
/// Least share of the corners beyond the wall in a wall point for them to be lowered because of it.
const LEAST_SHARE: f64 = 1e-3;

/// A lower bound for the conductance; arguments and unit as in [`super::upper_bound`].
pub(super) fn lower_bound(lattice: &Lattice, mask: &Mask, phi: &Field) -> Result<f64, ProofError> {
    let cutting = |_| ProofError::Cutting { relative: 1.0 };
    let regions = cut_cells(lattice, SHIFT).map_err(cutting)?;
    let pairs = shared_parts(&regions).map_err(cutting)?;
    let mut velocity = Velocity::new(mask, phi, &regions, &pairs);
    velocity.lower();
    let (mut volume, mut energy, whole) = velocity.whole_squares();
    let areas: f64 = regions
        .iter()
        .flat_map(|region| &region.boundary)
        .map(|polygon| signed_area(polygon))
        .sum();
    check_area(lattice, areas + whole as f64)?;
    for (index, region) in regions.iter().enumerate() {
        for triangle in 0..2 {
            let (v, e) = velocity.cut_triangle(index, region, triangle);
            volume += v;
            energy += e;
        }
    }
    if energy > 0.0 {
        Ok(volume * volume / energy * (1.0 - ROUNDING))
    } else {
        Ok(0.0)
    }
}

/// A corner value of one or more regions.
#[derive(Debug, Clone, Copy)]
struct CornerValue {
    value: f64,
    /// The node, where the corner lies in the fluid.
    node: Option<(i64, i64)>,
}

struct Velocity<'a> {
    mask: &'a Mask,
    phi: &'a Field,
    regions: &'a [Region],
    corners: Vec<CornerValue>,
    region_corners: Vec<[usize; 4]>,
    /// Columns of cut cells of each row, rising.
    cut: BTreeMap<i64, Vec<i64>>,
    /// Nodes in the fluid whose value had to be lowered, with the new value.
    lowered: BTreeMap<(i64, i64), f64>,
    /// Their columns by row.
    lowered_columns: BTreeMap<i64, Vec<i64>>,
    /// Corner values that belong to a node in the fluid.
    slots_of: BTreeMap<(i64, i64), Vec<usize>>,
}

impl<'a> Velocity<'a> {
    fn new(
        mask: &'a Mask,
        phi: &'a Field,
        regions: &'a [Region],
        pairs: &[[(usize, usize); 2]],
    ) -> Self {
        let mut group: Vec<usize> = (0..4 * regions.len()).collect();
        for [a, b] in pairs {
            // The first of a pair has the side to its east or north.
            let (first, second) = if a.1 == EAST || a.1 == NORTH {
                (a, b)
            } else {
                (b, a)
            };
            let joined = if first.1 == EAST {
                [(1, 0), (2, 3)]
            } else {
                [(3, 0), (2, 1)]
            };
            for (x, y) in joined {
                let x = root(&mut group, 4 * first.0 + x);
                let y = root(&mut group, 4 * second.0 + y);
                group[x.max(y)] = x.min(y);
            }
        }
        let mut velocity = Self {
            mask,
            phi,
            regions,
            corners: Vec::new(),
            region_corners: Vec::new(),
            cut: BTreeMap::new(),
            lowered: BTreeMap::new(),
            lowered_columns: BTreeMap::new(),
            slots_of: BTreeMap::new(),
        };
        let mut place = BTreeMap::new();
        for (index, region) in regions.iter().enumerate() {
            let row = velocity.cut.entry(region.cell.1).or_default();
            if row.last() != Some(&region.cell.0) {
                row.push(region.cell.0);
            }
            let mut slots = [0; 4];
            for (corner, slot) in slots.iter_mut().enumerate() {
                let name = root(&mut group, 4 * index + corner);
                *slot = *place.entry(name).or_insert_with(|| {
                    velocity.corners.push(CornerValue {
                        value: 0.0,
                        node: None,
                    });
                    velocity.corners.len() - 1
                });
                if region.corners[corner] {
                    let node = (
                        region.cell.0 + i64::from(corner == 1 || corner == 2),
                        region.cell.1 + i64::from(corner >= 2),
                    );
                    velocity.corners[*slot] = CornerValue {
                        value: velocity.node_value(node),
                        node: Some(node),
                    };
                    let known = velocity.slots_of.entry(node).or_default();
                    if !known.contains(slot) {
                        known.push(*slot);
                    }
                }
            }
            velocity.region_corners.push(slots);
        }
        velocity
    }

    /// Value of a lattice node in the fluid, zero where it counts as wall.
    fn node_value(&self, (i, j): (i64, i64)) -> f64 {
        match (u32::try_from(i), u32::try_from(j)) {
            (Ok(i), Ok(j)) => self.phi.at(self.mask, i, j).unwrap_or(0.0),
            _ => 0.0,
        }
    }

    /// Lowers corner values until `w <= 0` on the wall. Lowering never undoes what was reached before.
    ///
    /// Crossings with the sides of triangles come first: each concerns two corners only, so none is lowered
    /// for the sake of another. What the vertices between them still need is little.
    fn lower(&mut self) {
        self.lower_where(|share| share.iter().any(|l| l.abs() < 1e-9));
        self.lower_where(|_| true);
    }

    fn lower_where(&mut self, chosen: impl Fn([f64; 3]) -> bool) {
        for index in 0..self.regions.len() {
            let region = &self.regions[index];
            for triangle in 0..2 {
                for polygon in &region.boundary {
                    for p in below_diagonal(polygon, triangle) {
                        let is_corner = CORNERS.iter().zip(region.corners).any(|(c, held)| {
                            held && c[0].total_cmp(&p[0]).is_eq() && c[1].total_cmp(&p[1]).is_eq()
                        });
                        if !is_corner && chosen(shares(triangle, p)) {
                            self.lower_at(index, triangle, p);
                        }
                    }
                }
            }
        }
    }

    fn lower_at(&mut self, index: usize, triangle: usize, p: Point) {
        let slots = TRIANGLES[triangle].map(|corner| self.region_corners[index][corner]);
        let share = shares(triangle, p);
        let value: f64 = slots
            .iter()
            .zip(share)
            .map(|(&slot, l)| l * self.corners[slot].value)
            .sum();
        if value <= 0.0 {
            return;
        }
        let beyond: f64 = slots
            .iter()
            .zip(share)
            .filter(|&(&slot, _)| self.corners[slot].node.is_none())
            .map(|(_, l)| l * l)
            .sum();
        // The smallest change that does it, if possible of corners beyond the wall; a little more than
        // needed, for rounding.
        let only_beyond = beyond >= LEAST_SHARE * LEAST_SHARE;
        let all: f64 = share.iter().map(|l| l * l).sum();
        let scale = value / if only_beyond { beyond } else { all } * (1.0 + 1e-12);
        for (slot, l) in slots.into_iter().zip(share) {
            let change = scale * l;
            match self.corners[slot].node {
                None => self.corners[slot].value -= change,
                Some(_) if only_beyond => {}
                Some(node) => self.lower_node(node, self.corners[slot].value - change),
            }
        }
    }

    /// Sets a node in the fluid to a lower value wherever it is a corner.
    fn lower_node(&mut self, node: (i64, i64), value: f64) {
        if self.lowered.insert(node, value).is_none() {
            self.lowered_columns.entry(node.1).or_default().push(node.0);
        }
        for &slot in self.slots_of.get(&node).into_iter().flatten() {
            self.corners[slot].value = value;
        }
    }

    /// Integrals of `v` and `abs(grad v)^2` over the squares that the wall does not cut, and their number.
    fn whole_squares(&self) -> (f64, f64, usize) {
        let natural = self.phi.natural(self.mask);
        let (mut volume, mut energy, mut count) = (0.0, 0.0, 0);
        for row in -1..i64::try_from(self.mask.rows()).unwrap_or(i64::MAX) {
            let special = self.special_squares(row);
            let (mut v, mut e) = (0.0, 0.0);
            for (from, to) in self.candidate_squares(row) {
                let mut i = from;
                let begin = special.partition_point(|&c| c < from);
                let inside = special[begin..].iter().copied().take_while(|&c| c < to);
                for stop in inside.chain([to]) {
                    let (dv, de) = self.plain_squares(&natural, i..stop, row);
                    v += dv;
                    e += de;
                    count += (stop - i) as usize;
                    if stop < to && !self.is_cut(stop, row) {
                        let (dv, de) = self.single_square(stop, row);
                        v += dv;
                        e += de;
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

    fn is_cut(&self, i: i64, row: i64) -> bool {
        self.cut
            .get(&row)
            .is_some_and(|columns| columns.binary_search(&i).is_ok())
    }

    /// Columns of a row of squares that are cut or have a lowered corner, rising.
    fn special_squares(&self, row: i64) -> Vec<i64> {
        let mut columns: Vec<i64> = self.cut.get(&row).cloned().unwrap_or_default();
        for j in [row, row + 1] {
            let lowered = self.lowered_columns.get(&j);
            columns.extend(lowered.into_iter().flatten().flat_map(|&i| [i - 1, i]));
        }
        columns.sort_unstable();
        columns.dedup();
        columns
    }

    /// Squares in the fluid without lowered corners.
    fn plain_squares(
        &self,
        natural: &[f64],
        squares: std::ops::Range<i64>,
        row: i64,
    ) -> (f64, f64) {
        let n = (squares.end - squares.start).max(0) as usize;
        if n == 0 {
            return (0.0, 0.0);
        }
        let line = |j: i64| {
            let j = u32::try_from(j).ok()?;
            let from = u32::try_from(squares.start).ok()?;
            let start = self.mask.natural_at(from, j)? as usize;
            let last = self.mask.natural_at(from + n as u32, j)? as usize;
            (last == start + n)
                .then(|| natural.get(start..=last))
                .flatten()
        };
        let (Some(below), Some(above)) = (line(row), line(row + 1)) else {
            return squares
                .map(|i| self.single_square(i, row))
                .fold((0.0, 0.0), |(v, e), (dv, de)| (v + dv, e + de));
        };
        let (mut volume, mut steps) = (0.0, 0.0);
        for k in 0..n {
            let (a, b, c, d) = (below[k], below[k + 1], above[k + 1], above[k]);
            volume += 2.0 * (a + c) + (b + d);
            let (s, e, n, w) = (b - a, c - b, c - d, d - a);
            steps += (s * s + e * e) + (n * n + w * w);
        }
        (volume / 6.0, 0.5 * steps)
    }

    fn single_square(&self, i: i64, row: i64) -> (f64, f64) {
        whole_square([
            self.value_at(i, row),
            self.value_at(i + 1, row),
            self.value_at(i + 1, row + 1),
            self.value_at(i, row + 1),
        ])
    }

    fn value_at(&self, i: i64, j: i64) -> f64 {
        match self.lowered.get(&(i, j)) {
            Some(&value) => value,
            None => self.node_value((i, j)),
        }
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

    /// Integrals of `v` and `abs(grad v)^2` over one triangle of a region.
    fn cut_triangle(&self, index: usize, region: &Region, triangle: usize) -> (f64, f64) {
        let values = self.region_corners[index].map(|slot| self.corners[slot].value);
        positive_part(values, region.boundary.iter().map(Vec::as_slice), triangle)
    }
}

/// Integrals of `v` and `abs(grad v)^2` over a square in the fluid with the given corner values.
fn whole_square(corners: [f64; 4]) -> (f64, f64) {
    let [a, b, c, d] = corners;
    if corners.iter().all(|&w| w >= 0.0) {
        let volume = (a + b + c) / 6.0 + (a + c + d) / 6.0;
        let steps = (b - a).powi(2) + (c - b).powi(2) + (c - d).powi(2) + (d - a).powi(2);
        return (volume, 0.5 * steps);
    }
    let square = || std::iter::once(&CORNERS[..]);
    let (v0, e0) = positive_part(corners, square(), 0);
    let (v1, e1) = positive_part(corners, square(), 1);
    (v0 + v1, e0 + e1)
}

/// Integrals of the positive part of `w` and of its squared gradient over one triangle of polygons.
fn positive_part<'a>(
    corners: [f64; 4],
    polygons: impl Iterator<Item = &'a [Point]>,
    triangle: usize,
) -> (f64, f64) {
    let [a, b, c, d] = corners;
    // w = a + gx x + gy y.
    let (gx, gy) = if triangle == 0 {
        (b - a, c - b)
    } else {
        (c - d, d - a)
    };
    let w = |p: Point| a + gx * p[0] + gy * p[1];
    let (mut area, mut first) = (0.0, [0.0; 2]);
    for polygon in polygons {
        let part = keep(&below_diagonal(polygon, triangle), w);
        let next = part.iter().cycle().skip(1);
        for (p, q) in part.iter().zip(next) {
            let cross = p[0] * q[1] - p[1] * q[0];
            area += 0.5 * cross;
            first[0] += cross * (p[0] + q[0]) / 6.0;
            first[1] += cross * (p[1] + q[1]) / 6.0;
        }
    }
    if area <= 0.0 {
        return (0.0, 0.0);
    }
    (
        a * area + gx * first[0] + gy * first[1],
        (gx * gx + gy * gy) * area,
    )
}

/// Shares of the three corners of a triangle in a point of it.
fn shares(triangle: usize, p: Point) -> [f64; 3] {
    if triangle == 0 {
        [1.0 - p[0], p[0] - p[1], p[1]]
    } else {
        [1.0 - p[1], p[0], p[1] - p[0]]
    }
}

/// The part of a polygon in one triangle of its cell.
fn below_diagonal(polygon: &[Point], triangle: usize) -> Vec<Point> {
    keep(polygon, |p| {
        if triangle == 0 {
            p[0] - p[1]
        } else {
            p[1] - p[0]
        }
    })
}

/// The part of a polygon where a linear function is not negative (Sutherland and Hodgman 1974, Commun. ACM
/// 17, 32). Parts that fall apart stay joined along the cut, which integrals do not notice.
fn keep(polygon: &[Point], f: impl Fn(Point) -> f64) -> Vec<Point> {
    let mut kept = Vec::with_capacity(polygon.len() + 2);
    let next = polygon.iter().cycle().skip(1);
    for (&p, &q) in polygon.iter().zip(next) {
        let (fp, fq) = (f(p), f(q));
        if fp >= 0.0 {
            kept.push(p);
        }
        if (fp >= 0.0) != (fq >= 0.0) {
            let t = fp / (fp - fq);
            kept.push([p[0] + t * (q[0] - p[0]), p[1] + t * (q[1] - p[1])]);
        }
    }
    kept
}
