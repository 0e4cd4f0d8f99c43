//! The polygons of the cut squares, with feet on sides that a wall point almost touches.

use std::cmp::Ordering;
use std::collections::BTreeMap;

use crate::geometry::Point;
use crate::grid::{CORNERS, CellRows, CutCells, EAST, NORTH, Region, SOUTH, WEST};

/// Distance of a wall point from a side, in cells, up to which it may get a foot.
const NEAR: f64 = 0.2;
/// How many times steeper than elsewhere in the square the velocity between them must be for a foot.
const STEEP: f64 = 3.0;

/// Axis along which the face lies across, and column and row of the cell to its right or above.
type Face = (usize, i64, i64);

/// Places along faces where the velocity is held at zero, rising.
pub(super) type Feet = BTreeMap<Face, Vec<f64>>;

/// A stretch of a side between two vertices.
#[derive(Debug, Clone, Copy)]
struct Piece {
    side: usize,
    /// Lower and upper end.
    ends: [f64; 2],
    /// Nodes at these.
    nodes: [Option<usize>; 2],
}

impl Piece {
    fn new(
        side: usize,
        (a, from): (Point, Option<usize>),
        (b, to): (Point, Option<usize>),
    ) -> Self {
        let ends = [along_and_away(side, a).0, along_and_away(side, b).0];
        if ends[0] <= ends[1] {
            Self {
                side,
                ends,
                nodes: [from, to],
            }
        } else {
            Self {
                side,
                ends: [ends[1], ends[0]],
                nodes: [to, from],
            }
        }
    }

    fn order(&self, other: &Self) -> Ordering {
        let by_low = self.ends[0].total_cmp(&other.ends[0]);
        by_low.then(self.ends[1].total_cmp(&other.ends[1]))
    }

    fn is_whole_side(&self) -> bool {
        self.ends[0] <= 0.0 && self.ends[1] >= 1.0
    }
}

/// One fluid region of a cut square as a polygon.
#[derive(Debug, Clone)]
pub(super) struct Polygon {
    /// Column and row of the square.
    pub(super) cell: (i64, i64),
    /// Vertices anticlockwise in cell coordinates, with the number of the node where there is one.
    pub(super) vertices: Vec<(Point, Option<usize>)>,
    /// Corners of the square it holds.
    corners: [bool; 4],
    /// Whether something solid lies inside it.
    pub(super) has_hole: bool,
}

impl Polygon {
    /// Row-by-row numbers of its nodes, by corner of the square.
    pub(super) fn nodes(&self) -> [Option<usize>; 4] {
        let mut nodes = [None; 4];
        for &(at, node) in self.vertices.iter().filter(|vertex| vertex.1.is_some()) {
            let corner = corner_at(at);
            nodes[corner] = node.filter(|_| self.corners[corner]);
        }
        nodes
    }

    /// Adds its edges that lie on sides of the square.
    fn add_side_pieces(&self, pieces: &mut Vec<Piece>) {
        let Some(mut before) = self.vertices.last().copied() else {
            return;
        };
        for &vertex in &self.vertices {
            if let Some(side) = common_side(before.0, vertex.0) {
                pieces.push(Piece::new(side, before, vertex));
            }
            before = vertex;
        }
    }
}

/// Which corner of a square a node of it is at.
pub(super) fn corner_at(at: Point) -> usize {
    match (at[0] > 0.5, at[1] > 0.5) {
        (false, false) => 0,
        (true, false) => 1,
        (true, true) => 2,
        (false, true) => 3,
    }
}

/// The side on which both ends of an edge lie; points on a side were put there to the last bit.
fn common_side(a: Point, b: Point) -> Option<usize> {
    let is_both =
        |axis: usize, line: f64| (a[axis] - line).abs() <= 0.0 && (b[axis] - line).abs() <= 0.0;
    [(1, 0.0), (0, 1.0), (1, 1.0), (0, 0.0)]
        .iter()
        .position(|&(axis, line)| is_both(axis, line))
}

/// Column and row of a corner of a square.
fn corner_place(cell: (i64, i64), corner: usize) -> (i64, i64) {
    (
        cell.0 + i64::from(corner == 1 || corner == 2),
        cell.1 + i64::from(corner >= 2),
    )
}

fn face(cell: (i64, i64), side: usize) -> Face {
    match side {
        SOUTH => (1, cell.0, cell.1),
        NORTH => (1, cell.0, cell.1 + 1),
        WEST => (0, cell.0, cell.1),
        _ => (0, cell.0 + 1, cell.1),
    }
}

/// Position along a side, and distance from it, of a point in cell coordinates.
fn along_and_away(side: usize, p: Point) -> (f64, f64) {
    match side {
        SOUTH => (p[0], p[1]),
        EAST => (p[1], 1.0 - p[0]),
        NORTH => (p[0], 1.0 - p[1]),
        _ => (p[1], p[0]),
    }
}

/// Corners at the lower and the upper end of a side.
fn ends(side: usize) -> [usize; 2] {
    match side {
        SOUTH => [0, 1],
        EAST => [1, 2],
        NORTH => [3, 2],
        _ => [0, 3],
    }
}

/// Feet on the sides of cut squares: where the velocity along a side would be far too large for a wall
/// point beside it.
pub(super) fn feet(cut: &CutCells, value_at: impl Fn((i64, i64)) -> Option<f64>) -> Feet {
    let mut found = Feet::new();
    for region in cut.regions.iter().filter(|region| region.holes.is_empty()) {
        let boundary = cut.boundary(region);
        let near =
            |p: &Point| (0..4).any(|side| (1e-12..NEAR).contains(&along_and_away(side, *p).1));
        if !boundary.iter().any(near) {
            continue;
        }
        let values: [f64; 4] = std::array::from_fn(|corner| {
            region.corners[corner]
                .and_then(|_| value_at(corner_place(region.cell, corner)))
                .unwrap_or(0.0)
        });
        let is_wall = |k: &usize| !region.corners.contains(&Some(*k as u32));
        let mut limit: Option<f64> = None;
        for &(side, low, length) in cut.sides(region) {
            let [first, last] = ends(side);
            let at_end = |corner: usize, is_end: bool| if is_end { values[corner] } else { 0.0 };
            let (from, to) = (
                at_end(first, low < 1e-12),
                at_end(last, low + length > 1.0 - 1e-12),
            );
            let slope = |k: usize| {
                let (along, away) = along_and_away(side, boundary[k]);
                if !(1e-12..NEAR).contains(&away) {
                    return None;
                }
                let t = (along - low) / length;
                let is_beside = (1e-6..=1.0 - 1e-6).contains(&t);
                is_beside.then_some(((from + t * (to - from)) / away, along))
            };
            let worst = (0..boundary.len())
                .filter_map(|k| Some((k, slope(k)?)))
                .filter(|(k, _)| is_wall(k))
                .map(|(_, found)| found)
                .max_by(|a, b| a.0.total_cmp(&b.0));
            let Some((slope, along)) = worst else {
                continue;
            };
            let limit = *limit.get_or_insert_with(|| STEEP * steepest(region, boundary, values));
            if slope > limit {
                found
                    .entry(face(region.cell, side))
                    .or_default()
                    .push(along);
            }
        }
    }
    for places in found.values_mut() {
        places.sort_by(f64::total_cmp);
        places.dedup();
    }
    found
}

/// Largest ratio of a corner's value to its distance from the wall of its region.
fn steepest(region: &Region, boundary: &[Point], values: [f64; 4]) -> f64 {
    let is_corner = |k: usize| region.corners.contains(&Some(k as u32));
    let mut least = [f64::INFINITY; 4];
    for k in 0..boundary.len() {
        let next = (k + 1) % boundary.len();
        if is_corner(k) || is_corner(next) {
            continue;
        }
        for (corner, least) in least.iter_mut().enumerate() {
            if region.corners[corner].is_some() {
                let distance = square_distance_to(CORNERS[corner], boundary[k], boundary[next]);
                *least = least.min(distance);
            }
        }
    }
    let corners = (0..4).filter(|&corner| region.corners[corner].is_some());
    corners
        .map(|corner| values[corner] / least[corner].sqrt().max(1e-6))
        .fold(0.0, f64::max)
}

fn square_distance_to(p: Point, a: Point, b: Point) -> f64 {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    let square = x * x + y * y;
    let t = if square > 0.0 {
        (((p[0] - a[0]) * x + (p[1] - a[1]) * y) / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    let away = [a[0] + t * x - p[0], a[1] + t * y - p[1]];
    away[0] * away[0] + away[1] * away[1]
}

/// All polygons: of the regions, in their order, and of whole squares with a foot on a side; sorted by row.
pub(super) fn polygons(
    cut: &CutCells,
    feet: &Feet,
    number: impl Fn((i64, i64)) -> Option<usize>,
) -> Vec<Polygon> {
    let of_region = |region: &Region| {
        let node = |k: usize| {
            let corner = region.corners.iter().position(|&at| at == Some(k as u32))?;
            number(corner_place(region.cell, corner))
        };
        Polygon {
            cell: region.cell,
            vertices: with_feet(region.cell, cut.boundary(region), feet, node),
            corners: region.corners.map(|c| c.is_some()),
            has_hole: !region.holes.is_empty(),
        }
    };
    let mut all: Vec<Polygon> = cut.regions.iter().map(of_region).collect();
    if feet.is_empty() {
        return all;
    }
    let mut touched: Vec<(i64, i64)> = feet
        .keys()
        .flat_map(|&(axis, column, row)| {
            let before = if axis == 0 {
                (column - 1, row)
            } else {
                (column, row - 1)
            };
            [(column, row), before]
        })
        .filter(|&cell| cut.rows.find(cell).is_none())
        .collect();
    touched.sort_unstable();
    touched.dedup();
    all.extend(touched.into_iter().map(|cell| {
        let node = |corner: usize| number(corner_place(cell, corner));
        Polygon {
            cell,
            vertices: with_feet(cell, &CORNERS, feet, node),
            corners: [true; 4],
            has_hole: false,
        }
    }));
    all.sort_by_key(|polygon| (polygon.cell.1, polygon.cell.0));
    all
}

/// Whether the two squares at every side divide it alike, so that the velocity is continuous there.
///
/// Along a side the velocity is linear between the vertices of the polygons. A side with a polygon on one side
/// only belongs to a whole square, or to the solid, and must be undivided.
pub(super) fn agree(polygons: &[Polygon]) -> bool {
    let rows = CellRows::new(polygons.iter().map(|polygon| polygon.cell));
    // Pieces of each square, by side and along it.
    let mut pieces: Vec<Piece> = Vec::with_capacity(4 * polygons.len());
    let mut starts: Vec<[usize; 5]> = Vec::with_capacity(rows.cells().len());
    let mut of_cell = Vec::new();
    for cell in 0..rows.cells().len() {
        of_cell.clear();
        for polygon in &polygons[rows.items(cell)] {
            polygon.add_side_pieces(&mut of_cell);
        }
        let mut ends = [pieces.len(); 5];
        for side in 0..4 {
            pieces.extend(of_cell.iter().filter(|piece| piece.side == side));
            ends[side + 1] = pieces.len();
            pieces[ends[side]..].sort_by(Piece::order);
        }
        starts.push(ends);
    }
    let on_side = |cell: usize, side: usize| &pieces[starts[cell][side]..starts[cell][side + 1]];
    let is_undivided = |cell: usize, side: usize| match on_side(cell, side) {
        [] => true,
        [piece] => piece.is_whole_side(),
        _ => false,
    };
    let alike = |a: &Piece, b: &Piece| (a.ends, a.nodes) == (b.ends, b.nodes);
    let mut is_shared = vec![[false; 4]; rows.cells().len()];
    for (cell, neighbours) in rows.neighbours().into_iter().enumerate() {
        for (side, neighbour) in [EAST, NORTH].into_iter().zip(neighbours) {
            let Some(neighbour) = neighbour else {
                continue;
            };
            let opposite = (side + 2) % 4;
            let (here, beyond) = (on_side(cell, side), on_side(neighbour, opposite));
            if here.len() != beyond.len() || here.iter().zip(beyond).any(|(a, b)| !alike(a, b)) {
                return false;
            }
            is_shared[cell][side] = true;
            is_shared[neighbour][opposite] = true;
        }
    }
    (0..is_shared.len())
        .all(|cell| (0..4).all(|side| is_shared[cell][side] || is_undivided(cell, side)))
}

/// The polygon with the feet on its sides as further vertices.
fn with_feet(
    cell: (i64, i64),
    polygon: &[Point],
    feet: &Feet,
    node: impl Fn(usize) -> Option<usize>,
) -> Vec<(Point, Option<usize>)> {
    let n = polygon.len();
    let mut vertices = Vec::with_capacity(n);
    for k in 0..n {
        let (a, b) = (polygon[k], polygon[(k + 1) % n]);
        vertices.push((a, node(k)));
        if feet.is_empty() {
            continue;
        }
        let Some(side) = common_side(a, b) else {
            continue;
        };
        let (from, to) = (along_and_away(side, a).0, along_and_away(side, b).0);
        let places = feet.get(&face(cell, side)).map_or(&[][..], Vec::as_slice);
        let (low, high) = (from.min(to), from.max(to));
        let between = |&&s: &&f64| low < s && s < high;
        let mut on_side: Vec<f64> = places.iter().filter(between).copied().collect();
        if from > to {
            on_side.reverse();
        }
        vertices.extend(on_side.into_iter().map(|s| {
            let at = match side {
                SOUTH => [s, 0.0],
                EAST => [1.0, s],
                NORTH => [s, 1.0],
                _ => [0.0, s],
            };
            (at, None)
        }));
    }
    vertices
}

#[cfg(test)]
mod tests {
    use super::*;

    fn square(cell: (i64, i64), foot: Option<f64>) -> Polygon {
        let place = foot.map(|s| ((0, 1, 0), vec![s]));
        Polygon {
            cell,
            vertices: with_feet(cell, &CORNERS, &place.into_iter().collect(), |corner| {
                Some((corner_place(cell, corner).0 + 10 * corner_place(cell, corner).1) as usize)
            }),
            corners: [true; 4],
            has_hole: false,
        }
    }

    #[test]
    fn squares_that_divide_their_side_differently_are_seen() {
        let pair = |a, b| [square((0, 0), a), square((1, 0), b)];
        assert!(agree(&pair(None, None)));
        assert!(agree(&pair(Some(0.4), Some(0.4))));
        assert!(!agree(&pair(Some(0.4), None)));
        assert!(!agree(&pair(None, Some(0.4))));
        assert!(!agree(&pair(Some(0.4), Some(0.5))));
        // A foot on a side whose other square is whole.
        assert!(!agree(&[square((0, 0), Some(0.4))]));
    }
}
