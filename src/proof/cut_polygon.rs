//! The polygons of the cut squares, with feet on sides that a wall point almost touches.

use std::collections::BTreeMap;

use crate::geometry::Point;
use crate::grid::{EAST, NORTH, Region, SOUTH, WEST};

/// Distance of a wall point from a side, in cells, up to which it may get a foot.
const NEAR: f64 = 0.2;
/// How many times steeper than elsewhere in the square the velocity between them must be for a foot.
const STEEP: f64 = 3.0;
/// Corners of a cell, anticlockwise from the lower left.
const CORNERS: [Point; 4] = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]];

/// Axis along which the face lies across, and column and row of the cell to its right or above.
type Face = (usize, i64, i64);

/// Places along faces where the velocity is held at zero, rising.
pub(super) type Feet = BTreeMap<Face, Vec<f64>>;

/// A stretch of a face between two vertices: face, lower and upper end, nodes at the ends.
type Piece = (Face, f64, f64, [Option<usize>; 2]);

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
    /// Its edges that lie on sides of the square.
    fn side_pieces(&self) -> Vec<Piece> {
        let next = self.vertices.iter().cycle().skip(1);
        let edges = self.vertices.iter().zip(next);
        edges
            .filter_map(|(&(a, from_node), &(b, to_node))| {
                let is_on = |p: Point, side: usize| along_and_away(side, p).1.abs() <= 0.0;
                let side = (0..4).find(|&side| is_on(a, side) && is_on(b, side))?;
                let (from, to) = (along_and_away(side, a).0, along_and_away(side, b).0);
                let face = face(self.cell, side);
                Some(if from <= to {
                    (face, from, to, [from_node, to_node])
                } else {
                    (face, to, from, [to_node, from_node])
                })
            })
            .collect()
    }

    /// Its nodes with their places.
    pub(super) fn nodes_at(
        &self,
        number: impl Fn((i64, i64)) -> Option<usize>,
    ) -> impl Iterator<Item = (usize, (i64, i64))> {
        (0..4)
            .filter(|&corner| self.corners[corner])
            .map(|corner| corner_place(self.cell, corner))
            .filter_map(move |at| Some((number(at)?, at)))
    }
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
pub(super) fn feet(regions: &[Region], value_at: impl Fn((i64, i64)) -> Option<f64>) -> Feet {
    let mut found = Feet::new();
    for region in regions.iter().filter(|region| region.boundary.len() == 1) {
        let value = |corner: usize| {
            region.corners[corner]
                .and_then(|_| value_at(corner_place(region.cell, corner)))
                .unwrap_or(0.0)
        };
        let steepest = steepest(region, value);
        for &(side, low, length) in &region.sides {
            let [first, last] = ends(side);
            let at_end = |corner: usize, is_end: bool| if is_end { value(corner) } else { 0.0 };
            let (from, to) = (
                at_end(first, low < 1e-12),
                at_end(last, low + length > 1.0 - 1e-12),
            );
            let excess = |&p: &Point| {
                let (along, away) = along_and_away(side, p);
                let t = (along - low) / length;
                let is_beside = (1e-6..=1.0 - 1e-6).contains(&t) && (1e-12..NEAR).contains(&away);
                let slope = (from + t * (to - from)) / away;
                (is_beside && slope > STEEP * steepest).then_some((slope, along))
            };
            let worst = region
                .wall
                .iter()
                .filter_map(excess)
                .max_by(|a, b| a.0.total_cmp(&b.0));
            if let Some((_, along)) = worst {
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
fn steepest(region: &Region, value: impl Fn(usize) -> f64) -> f64 {
    let polygon = &region.boundary[0];
    let is_corner = |k: usize| region.corners.contains(&Some(k as u32));
    (0..4)
        .filter(|&corner| region.corners[corner].is_some())
        .map(|corner| {
            let p = CORNERS[corner];
            let distance = (0..polygon.len())
                .map(|k| (k, (k + 1) % polygon.len()))
                .filter(|&(k, next)| !is_corner(k) && !is_corner(next))
                .map(|(k, next)| distance_to(p, polygon[k], polygon[next]))
                .fold(f64::INFINITY, f64::min);
            value(corner) / distance.max(1e-6)
        })
        .fold(0.0, f64::max)
}

fn distance_to(p: Point, a: Point, b: Point) -> f64 {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    let square = x * x + y * y;
    let t = if square > 0.0 {
        (((p[0] - a[0]) * x + (p[1] - a[1]) * y) / square).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (a[0] + t * x - p[0]).hypot(a[1] + t * y - p[1])
}

/// All polygons: of the regions, in their order, and of whole squares with a foot on a side; sorted by row.
pub(super) fn polygons(
    regions: &[Region],
    feet: &Feet,
    number: impl Fn((i64, i64)) -> Option<usize>,
) -> Vec<Polygon> {
    let mut all: Vec<Polygon> = regions
        .iter()
        .map(|region| {
            let mut corner_of = BTreeMap::new();
            for (corner, at) in region.corners.iter().enumerate() {
                corner_of.extend(at.map(|k| (k as usize, corner)));
            }
            let node = |k: usize| {
                let corner = *corner_of.get(&k)?;
                number(corner_place(region.cell, corner))
            };
            Polygon {
                cell: region.cell,
                vertices: with_feet(region.cell, &region.boundary[0], feet, node),
                corners: region.corners.map(|c| c.is_some()),
                has_hole: region.boundary.len() > 1,
            }
        })
        .collect();
    let mut cut: Vec<(i64, i64)> = regions.iter().map(|r| r.cell).collect();
    cut.dedup();
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
        .filter(|&(column, row)| {
            cut.binary_search_by_key(&(row, column), |c| (c.1, c.0))
                .is_err()
        })
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
    let mut pieces: Vec<Piece> = polygons.iter().flat_map(Polygon::side_pieces).collect();
    pieces.sort_by(|a, b| {
        let by_face = a.0.cmp(&b.0);
        by_face.then(a.1.total_cmp(&b.1)).then(a.2.total_cmp(&b.2))
    });
    let cells: Vec<(i64, i64)> = polygons.iter().map(|p| (p.cell.1, p.cell.0)).collect();
    let is_cut = |column: i64, row: i64| cells.binary_search(&(row, column)).is_ok();
    pieces.chunk_by(|a, b| a.0 == b.0).all(|at_face| {
        let (axis, column, row) = at_face[0].0;
        let (dx, dy) = if axis == 0 { (1, 0) } else { (0, 1) };
        if is_cut(column, row) && is_cut(column - dx, row - dy) {
            at_face.len().is_multiple_of(2) && at_face.chunks(2).all(|pair| pair[0] == pair[1])
        } else {
            matches!(at_face, [(_, low, high, _)] if *low <= 0.0 && *high >= 1.0)
        }
    })
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
        let Some(side) = (0..4).find(|&side| {
            let (_, from) = along_and_away(side, a);
            let (_, to) = along_and_away(side, b);
            // Points on a side were put there to the last bit.
            from.abs() <= 0.0 && to.abs() <= 0.0
        }) else {
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
