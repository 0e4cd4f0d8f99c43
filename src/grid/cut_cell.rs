//! Square cells cut by the outline: the connected fluid regions inside each.
//!
//! The outline is followed loop by loop and cut where it leaves a cell, which gives every cell its chains.
//! Inside a cell the end of one chain is joined along the cell's sides, anticlockwise, to the start of the
//! next, which gives the regions: the fluid lies to the left of every chain. A cell with a thin wall
//! through it has two regions. Two cells see the same crossing points, to the last bit.

use std::collections::BTreeMap;

use crate::geometry::Point;

use super::lattice::Lattice;

/// Sides of a cell, anticlockwise from the lower one.
pub(crate) const SOUTH: usize = 0;
/// See [`SOUTH`].
pub(crate) const EAST: usize = 1;
/// See [`SOUTH`].
pub(crate) const NORTH: usize = 2;
/// See [`SOUTH`].
pub(crate) const WEST: usize = 3;

/// Column and row of a cell; cell `(c, r)` spans `c..c+1` by `r..r+1`, shifted by the shift of the cutting.
pub(crate) type CellIndex = (i64, i64);

/// A stretch of outline inside one cell.
#[derive(Debug, Clone)]
struct Chain {
    /// Position of start and end around the cell, 0 to 4 from the lower left corner anticlockwise.
    start: f64,
    end: f64,
    points: Vec<Point>,
}

/// A connected fluid region of a cell.
#[derive(Debug, Clone)]
pub(crate) struct Region {
    /// The cell it is in.
    pub(crate) cell: CellIndex,
    /// Boundary polygons in cell coordinates (0 to 1), fluid on the left: the outer one, then holes.
    pub(crate) boundary: Vec<Vec<Point>>,
    /// Points of the outline on its boundary, cell coordinates.
    pub(crate) wall: Vec<Point>,
    /// Parts of the cell's sides it lies on: side, lower end of the part along it and its length.
    pub(crate) sides: Vec<(usize, f64, f64)>,
    /// Where in the outer boundary polygon the corners of the cell stand that it holds; corners
    /// anticlockwise from the lower left.
    pub(crate) corners: [Option<u32>; 4],
}

/// Why the outline could not be cut.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct CutFailed;

/// All regions of all cells that the outline passes through, in the order of the cells.
///
/// - `shift`: of the cells against the lattice nodes, lattice units
pub(crate) fn cut_cells(lattice: &Lattice, shift: Point) -> Result<Vec<Region>, CutFailed> {
    let mut chains: BTreeMap<CellIndex, Vec<Chain>> = BTreeMap::new();
    let mut closed: BTreeMap<CellIndex, Vec<Vec<Point>>> = BTreeMap::new();
    for pair in lattice.loop_starts.windows(2) {
        let points: Vec<Point> = lattice.edges[pair[0]..pair[1]]
            .iter()
            .map(|edge| [edge.start[0] - shift[0], edge.start[1] - shift[1]])
            .collect();
        follow(&points, &mut chains, &mut closed)?;
    }
    let mut regions = Vec::new();
    for (&cell, list) in &mut chains {
        let first = regions.len();
        join(cell, list, &mut regions)?;
        for hole in closed.remove(&cell).into_iter().flatten() {
            place_hole(&mut regions[first..], &hole)?;
        }
    }
    // What is left lies in cells that nothing else passes through.
    for (cell, loops) in closed {
        place_lone_loops(cell, loops, &mut regions)?;
    }
    regions.sort_by_key(|region| (region.cell.1, region.cell.0));
    Ok(regions)
}

/// Where an edge leaves a cell: parameter along the edge, side, and the point.
fn exit(a: Point, b: Point, cell: CellIndex) -> Option<(f64, usize, Point)> {
    let mut first: Option<(f64, usize, Point)> = None;
    for (axis, low, high, index) in [(0, WEST, EAST, cell.0), (1, SOUTH, NORTH, cell.1)] {
        let step = b[axis] - a[axis];
        let (line, side) = if step > 0.0 {
            (index as f64 + 1.0, high)
        } else {
            (index as f64, low)
        };
        let leaves = if step > 0.0 {
            b[axis] >= line
        } else {
            b[axis] < line
        };
        if step == 0.0 || !leaves {
            continue;
        }
        let t = ((line - a[axis]) / step).clamp(0.0, 1.0);
        let mut at = [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])];
        at[axis] = line;
        if first.is_none_or(|(before, ..)| t < before) {
            first = Some((t, side, at));
        }
    }
    first
}

fn step(cell: CellIndex, side: usize) -> CellIndex {
    match side {
        SOUTH => (cell.0, cell.1 - 1),
        EAST => (cell.0 + 1, cell.1),
        NORTH => (cell.0, cell.1 + 1),
        _ => (cell.0 - 1, cell.1),
    }
}

/// The side of the next cell through which it is entered.
fn entered(side: usize) -> usize {
    (side + 2) % 4
}

/// Position around a cell of a point on one of its sides.
fn around(cell: CellIndex, side: usize, at: Point) -> f64 {
    let (x, y) = (
        (at[0] - cell.0 as f64).clamp(0.0, 1.0),
        (at[1] - cell.1 as f64).clamp(0.0, 1.0),
    );
    side as f64
        + match side {
            SOUTH => x,
            EAST => y,
            NORTH => 1.0 - x,
            _ => 1.0 - y,
        }
}

/// Cuts one loop into chains.
fn follow(
    points: &[Point],
    chains: &mut BTreeMap<CellIndex, Vec<Chain>>,
    closed: &mut BTreeMap<CellIndex, Vec<Vec<Point>>>,
) -> Result<(), CutFailed> {
    let n = points.len();
    let Some(&origin) = points.first() else {
        return Ok(());
    };
    let mut cell = (origin[0].floor() as i64, origin[1].floor() as i64);
    let first_cell = cell;
    let mut open: Vec<Point> = Vec::new();
    let mut start: Option<f64> = None;
    // What comes before the first crossing belongs to the last chain.
    let mut lead: Option<(f64, Vec<Point>)> = None;
    for k in 0..n {
        let (a, b) = (points[k], points[(k + 1) % n]);
        open.push(a);
        let mut guard = 0_u64;
        while let Some((_, side, at)) = exit(a, b, cell) {
            open.push(at);
            let end = around(cell, side, at);
            let done = std::mem::take(&mut open);
            match start {
                None => lead = Some((end, done)),
                Some(start) => chains.entry(cell).or_default().push(Chain {
                    start,
                    end,
                    points: done,
                }),
            }
            cell = step(cell, side);
            start = Some(around(cell, entered(side), at));
            open.push(at);
            guard += 1;
            if guard > 40_000_000 {
                return Err(CutFailed);
            }
        }
    }
    match (start, lead) {
        (Some(start), Some((end, lead))) => {
            if cell != first_cell {
                return Err(CutFailed);
            }
            open.extend(lead);
            chains.entry(cell).or_default().push(Chain {
                start,
                end,
                points: open,
            });
        }
        _ => closed.entry(cell).or_default().push(open),
    }
    Ok(())
}

/// Joins the chains of one cell to regions.
fn join(cell: CellIndex, chains: &mut [Chain], regions: &mut Vec<Region>) -> Result<(), CutFailed> {
    chains.sort_by(|a, b| a.start.total_cmp(&b.start));
    let base = [cell.0 as f64, cell.1 as f64];
    let local = |p: &Point| [p[0] - base[0], p[1] - base[1]];
    let mut used = vec![false; chains.len()];
    for first in 0..chains.len() {
        if used[first] {
            continue;
        }
        let mut region = Region {
            cell,
            boundary: vec![Vec::new()],
            wall: Vec::new(),
            sides: Vec::new(),
            corners: [None; 4],
        };
        let mut current = first;
        loop {
            if used[current] {
                return Err(CutFailed);
            }
            used[current] = true;
            let chain = &chains[current];
            region.wall.extend(chain.points.iter().map(local));
            region.boundary[0].extend(chain.points.iter().map(local));
            let after = chains.partition_point(|c| c.start < chain.end);
            let next = if after == chains.len() { 0 } else { after };
            let until = chains[next].start + if after == chains.len() { 4.0 } else { 0.0 };
            walk_sides(&mut region, chain.end, until);
            current = next;
            if current == first {
                break;
            }
        }
        regions.push(region);
    }
    Ok(())
}

/// Adds the sides from one position around the cell to a later one.
fn walk_sides(region: &mut Region, from: f64, until: f64) {
    const CORNERS: [Point; 4] = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]];
    let mut at = from;
    while at < until {
        let side = at.floor();
        let end = until.min(side + 1.0);
        let low = match side as usize % 4 {
            SOUTH | EAST => at - side,
            _ => 1.0 - (end - side),
        };
        region.sides.push((side as usize % 4, low, end - at));
        at = end;
        if at < until {
            let corner = (side as usize + 1) % 4;
            region.corners[corner] = Some(region.boundary[0].len() as u32);
            region.boundary[0].push(CORNERS[corner]);
        }
    }
}

/// Puts a loop that crosses no line into the region that surrounds it.
fn place_hole(regions: &mut [Region], hole: &[Point]) -> Result<(), CutFailed> {
    let Some(&probe) = hole.first() else {
        return Ok(());
    };
    for region in regions {
        let base = [region.cell.0 as f64, region.cell.1 as f64];
        let local = |p: &Point| [p[0] - base[0], p[1] - base[1]];
        if contains(&region.boundary[0], local(&probe)) {
            region.wall.extend(hole.iter().map(local));
            region.boundary.push(hole.iter().map(local).collect());
            return Ok(());
        }
    }
    Err(CutFailed)
}

/// Loops in a cell that no chain passes through: islands in a whole cell.
///
/// A lumen as small as a cell is not handled.
fn place_lone_loops(
    cell: CellIndex,
    loops: Vec<Vec<Point>>,
    regions: &mut Vec<Region>,
) -> Result<(), CutFailed> {
    let mut region = Region {
        cell,
        boundary: vec![vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]],
        wall: Vec::new(),
        sides: (0..4).map(|side| (side, 0.0, 1.0)).collect(),
        corners: [Some(0), Some(1), Some(2), Some(3)],
    };
    for points in loops {
        if signed_area(&points) > 0.0 {
            return Err(CutFailed);
        }
        place_hole(std::slice::from_mut(&mut region), &points)?;
    }
    regions.push(region);
    Ok(())
}

/// Area of a polygon, positive when it turns anticlockwise.
pub(crate) fn signed_area(points: &[Point]) -> f64 {
    let next = points.iter().cycle().skip(1);
    points
        .iter()
        .zip(next)
        .map(|(a, b)| 0.5 * (a[0] * b[1] - a[1] * b[0]))
        .sum()
}

/// Whether a point lies inside a polygon (even-odd).
fn contains(polygon: &[Point], p: Point) -> bool {
    let next = polygon.iter().cycle().skip(1);
    polygon.iter().zip(next).fold(false, |inside, (a, b)| {
        let crosses = (a[1] > p[1]) != (b[1] > p[1])
            && p[0] < a[0] + (p[1] - a[1]) * (b[0] - a[0]) / (b[1] - a[1]);
        inside != crosses
    })
}

/// Pairs of regions that share a part of a side, each given as region and side.
///
/// A side whose other cell holds no region belongs to a whole cell or to the solid; it is in no pair.
pub(crate) fn shared_parts(regions: &[Region]) -> Result<Vec<[(usize, usize); 2]>, CutFailed> {
    /// Axis, and column and row of the cell beyond the side.
    type Face = (usize, i64, i64);
    /// Lower end, region and side of each part, for the two cells at a face.
    type Parts = [Vec<(f64, usize, usize)>; 2];
    let mut faces: BTreeMap<Face, Parts> = BTreeMap::new();
    for (index, region) in regions.iter().enumerate() {
        let (column, row) = region.cell;
        for &(side, low, _) in &region.sides {
            let (face, which) = match side {
                SOUTH => ((1, column, row), 1),
                NORTH => ((1, column, row + 1), 0),
                WEST => ((0, column, row), 1),
                _ => ((0, column + 1, row), 0),
            };
            faces.entry(face).or_default()[which].push((low, index, side));
        }
    }
    let mut pairs = Vec::new();
    for [below, above] in faces.values_mut() {
        if below.is_empty() || above.is_empty() {
            continue;
        }
        if below.len() != above.len() {
            return Err(CutFailed);
        }
        for parts in [&mut *below, &mut *above] {
            parts.sort_by(|a, b| a.0.total_cmp(&b.0));
        }
        for (a, b) in below.iter().zip(above.iter()) {
            pairs.push([(a.1, a.2), (b.1, b.2)]);
        }
    }
    Ok(pairs)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::{Loop, Lumen, Outline};

    fn total_area(regions: &[Region]) -> f64 {
        regions
            .iter()
            .flat_map(|r| &r.boundary)
            .map(|b| signed_area(b))
            .sum()
    }

    #[test]
    fn the_regions_of_a_ring_have_the_area_of_its_cut_cells() {
        let circle = |r: f64| {
            Loop::new(
                (0..400)
                    .map(|k| {
                        let t = std::f64::consts::TAU * f64::from(k) / 400.0;
                        [r * t.cos(), r * t.sin()]
                    })
                    .collect(),
            )
        };
        let ring = Outline {
            lumens: vec![Lumen {
                outer: circle(10.3),
                islands: vec![circle(4.1)],
            }],
        }
        .oriented();
        let lattice = Lattice::new(&ring, 1.0, [0.3, 0.6]);
        let regions = cut_cells(&lattice, [0.5, 0.5]).unwrap();
        let pairs = shared_parts(&regions).unwrap();
        assert!(pairs.len() > regions.len() / 2);
        // Whole cells make up the rest.
        let rest = ring.area() - total_area(&regions);
        assert!((rest - rest.round()).abs() < 1e-9, "{rest}");
        assert!(rest > 100.0);
    }

    #[test]
    fn a_thin_wall_parts_a_cell_in_two() {
        let half = |x0: f64, x1: f64| Lumen {
            outer: Loop::new(vec![[x0, 0.0], [x1, 0.0], [x1, 6.0], [x0, 6.0]]),
            islands: Vec::new(),
        };
        let parted = Outline {
            lumens: vec![half(0.0, 3.5), half(3.52, 7.0)],
        }
        .oriented();
        let lattice = Lattice::new(&parted, 1.0, [0.25, 0.25]);
        let regions = cut_cells(&lattice, [0.0, 0.0]).unwrap();
        let twice = regions
            .windows(2)
            .filter(|p| p[0].cell == p[1].cell)
            .count();
        assert!(twice >= 5, "{twice}");
        assert!(shared_parts(&regions).is_ok());
    }
}
