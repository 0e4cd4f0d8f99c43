//! Square cells cut by the outline: the connected fluid regions inside each.
//!
//! The outline is followed loop by loop and cut where it leaves a cell, which gives every cell its chains.
//! Inside a cell the end of one chain is joined along the cell's sides, anticlockwise, to the start of the
//! next, which gives the regions: the fluid lies to the left of every chain. A cell with a thin wall
//! through it has two regions. Two cells see the same crossing points, to the last bit.
//!
//! Cost: vertices of the outline plus cut cells; chains are sorted into rows by counting, and points, sides and
//! regions stand in one array each.

use std::ops::Range;

use crate::geometry::Point;

use super::cell_rows::CellRows;
use super::lattice::Lattice;
use super::turns::next_start;

/// Sides of a cell, anticlockwise from the lower one.
pub(crate) const SOUTH: usize = 0;
/// See [`SOUTH`].
pub(crate) const EAST: usize = 1;
/// See [`SOUTH`].
pub(crate) const NORTH: usize = 2;
/// See [`SOUTH`].
pub(crate) const WEST: usize = 3;
/// Corners of a cell in its own coordinates, anticlockwise from the lower left.
pub(crate) const CORNERS: [Point; 4] = [[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]];

/// Column and row of a cell; cell `(c, r)` spans `c..c+1` by `r..r+1`, shifted by the shift of the cutting.
pub(crate) type CellIndex = (i64, i64);

/// A part of a cell's side: side, lower end of the part along it and its length.
pub(crate) type SidePart = (usize, f64, f64);

/// A stretch of outline inside one cell.
#[derive(Debug, Clone)]
struct Chain {
    cell: CellIndex,
    /// Position of start and end around the cell, 0 to 4 from the lower left corner anticlockwise.
    start: f64,
    end: f64,
    /// Its points, in [`Pieces::points`].
    points: Range<usize>,
}

/// The outline cut at the sides of the cells.
#[derive(Debug, Default)]
struct Pieces {
    points: Vec<Point>,
    chains: Vec<Chain>,
    /// Loops that leave no cell, with their points.
    closed: Vec<(CellIndex, Range<usize>)>,
}

/// A connected fluid region of a cell.
#[derive(Debug, Clone)]
pub(crate) struct Region {
    /// The cell it is in.
    pub(crate) cell: CellIndex,
    boundary: Range<usize>,
    sides: Range<usize>,
    /// Where in the outer boundary polygon the corners of the cell stand that it holds; corners
    /// anticlockwise from the lower left.
    pub(crate) corners: [Option<u32>; 4],
    /// Loops of solid inside it, fluid on the left.
    pub(crate) holes: Vec<Vec<Point>>,
}

/// All regions of all cells that the outline passes through.
#[derive(Debug, Clone)]
pub(crate) struct CutCells {
    /// The regions, in order of row and column.
    pub(crate) regions: Vec<Region>,
    /// The cells with their regions.
    pub(crate) rows: CellRows,
    points: Vec<Point>,
    sides: Vec<SidePart>,
}

impl CutCells {
    /// Outer boundary polygon of a region in cell coordinates (0 to 1), fluid on the left.
    pub(crate) fn boundary(&self, region: &Region) -> &[Point] {
        &self.points[region.boundary.clone()]
    }

    /// Outer boundary and holes of a region.
    pub(crate) fn polygons<'a>(&'a self, region: &'a Region) -> impl Iterator<Item = &'a [Point]> {
        let holes = region.holes.iter().map(Vec::as_slice);
        std::iter::once(self.boundary(region)).chain(holes)
    }

    /// Parts of the cell's sides that a region lies on.
    pub(crate) fn sides(&self, region: &Region) -> &[SidePart] {
        &self.sides[region.sides.clone()]
    }

    /// Area of all regions.
    pub(crate) fn area(&self) -> f64 {
        let polygons = self.regions.iter().flat_map(|region| self.polygons(region));
        polygons.map(signed_area).sum()
    }
}

/// Why the outline could not be cut.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct CutFailed;

/// All regions of all cells that the outline passes through, in the order of the cells.
///
/// - `shift`: of the cells against the lattice nodes, lattice units
pub(crate) fn cut_cells(lattice: &Lattice, shift: Point) -> Result<CutCells, CutFailed> {
    let mut pieces = Pieces::default();
    pieces.points.reserve(2 * lattice.edges.len());
    let mut corners: Vec<Point> = Vec::new();
    for pair in lattice.loop_starts.windows(2) {
        let edges = lattice.edges[pair[0]..pair[1]].iter();
        corners.clear();
        corners.extend(edges.map(|edge| [edge.start[0] - shift[0], edge.start[1] - shift[1]]));
        pieces.follow(&corners)?;
    }
    let mut chains = by_row(&pieces.chains);
    pieces.closed.sort_by_key(|(cell, _)| (cell.1, cell.0));
    let mut joined = Joined::with_capacity(chains.len(), pieces.points.len());
    let mut closed = pieces.closed.iter().peekable();
    for list in chains.chunk_by_mut(|a, b| a.cell == b.cell) {
        let (column, row) = list[0].cell;
        while let Some(lone) = closed.next_if(|c| (c.0.1, c.0.0) < (row, column)) {
            joined.add_lone_loop(lone.0, &pieces.points[lone.1.clone()])?;
        }
        let first = joined.regions.len();
        joined.add_cell(list, &pieces.points)?;
        while let Some(hole) = closed.next_if(|c| c.0 == (column, row)) {
            joined.place_hole(first, &pieces.points[hole.1.clone()])?;
        }
    }
    for lone in closed {
        joined.add_lone_loop(lone.0, &pieces.points[lone.1.clone()])?;
    }
    Ok(CutCells {
        rows: CellRows::new(joined.regions.iter().map(|region| region.cell)),
        regions: joined.regions,
        points: joined.points,
        sides: joined.sides,
    })
}

/// Chains in order of row, column and start.
fn by_row(chains: &[Chain]) -> Vec<Chain> {
    let lowest = chains.iter().map(|c| c.cell.1).min().unwrap_or(0);
    let highest = chains.iter().map(|c| c.cell.1).max().unwrap_or(lowest);
    let row = |chain: &Chain| (chain.cell.1 - lowest) as usize;
    let mut next = vec![0; (highest - lowest) as usize + 2];
    for chain in chains {
        next[row(chain) + 1] += 1;
    }
    for k in 1..next.len() {
        next[k] += next[k - 1];
    }
    let mut order = vec![0_u32; chains.len()];
    for (index, chain) in chains.iter().enumerate() {
        order[next[row(chain)]] = index as u32;
        next[row(chain)] += 1;
    }
    let mut sorted: Vec<Chain> = order.iter().map(|&k| chains[k as usize].clone()).collect();
    for in_row in sorted.chunk_by_mut(|a, b| a.cell.1 == b.cell.1) {
        in_row.sort_by(|a, b| a.cell.0.cmp(&b.cell.0).then(a.start.total_cmp(&b.start)));
    }
    sorted
}

/// Where an edge leaves a cell: parameter along the edge, side, and the point.
pub(crate) fn exit_from_cell(a: Point, b: Point, cell: CellIndex) -> Option<(f64, usize, Point)> {
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

/// The cell beyond a side.
pub(crate) fn next_cell(cell: CellIndex, side: usize) -> CellIndex {
    match side {
        SOUTH => (cell.0, cell.1 - 1),
        EAST => (cell.0 + 1, cell.1),
        NORTH => (cell.0, cell.1 + 1),
        _ => (cell.0 - 1, cell.1),
    }
}

/// The side of the next cell through which it is entered.
pub(crate) fn opposite_side(side: usize) -> usize {
    (side + 2) % 4
}

/// Position around a cell of a point on one of its sides.
pub(crate) fn position_around(cell: CellIndex, side: usize, at: Point) -> f64 {
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

impl Pieces {
    /// Cuts one loop into chains.
    fn follow(&mut self, corners: &[Point]) -> Result<(), CutFailed> {
        let n = corners.len();
        let Some(&origin) = corners.first() else {
            return Ok(());
        };
        let first_cell = (origin[0].floor() as i64, origin[1].floor() as i64);
        let mut cell = first_cell;
        let mut from = self.points.len();
        let mut start: Option<f64> = None;
        // What comes before the first crossing belongs to the last chain.
        let mut lead: Option<(f64, Range<usize>)> = None;
        for k in 0..n {
            let (a, b) = (corners[k], corners[(k + 1) % n]);
            self.points.push(a);
            let mut guard = 0_u64;
            while let Some((_, side, at)) = exit_from_cell(a, b, cell) {
                self.points.push(at);
                let end = position_around(cell, side, at);
                let points = from..self.points.len();
                match start {
                    None => lead = Some((end, points)),
                    Some(start) => self.chains.push(Chain {
                        cell,
                        start,
                        end,
                        points,
                    }),
                }
                cell = next_cell(cell, side);
                start = Some(position_around(cell, opposite_side(side), at));
                from = self.points.len();
                self.points.push(at);
                guard += 1;
                if guard > 40_000_000 {
                    return Err(CutFailed);
                }
            }
        }
        let (Some(start), Some((end, lead))) = (start, lead) else {
            self.closed.push((cell, from..self.points.len()));
            return Ok(());
        };
        if cell != first_cell {
            return Err(CutFailed);
        }
        self.points.extend_from_within(lead);
        self.chains.push(Chain {
            cell,
            start,
            end,
            points: from..self.points.len(),
        });
        Ok(())
    }
}

/// Regions as they are put together.
struct Joined {
    regions: Vec<Region>,
    points: Vec<Point>,
    sides: Vec<SidePart>,
    /// Which chains of the cell at hand are in a region.
    used: Vec<bool>,
}

impl Joined {
    fn with_capacity(chains: usize, points: usize) -> Self {
        Self {
            regions: Vec::with_capacity(chains),
            points: Vec::with_capacity(points + 4 * chains),
            sides: Vec::with_capacity(4 * chains),
            used: Vec::new(),
        }
    }

    /// Joins the chains of one cell, in order of their start, to regions.
    fn add_cell(&mut self, chains: &[Chain], points: &[Point]) -> Result<(), CutFailed> {
        let cell = chains[0].cell;
        self.used.clear();
        self.used.resize(chains.len(), false);
        for first in 0..chains.len() {
            if self.used[first] {
                continue;
            }
            let (from, first_side) = (self.points.len(), self.sides.len());
            let mut corners = [None; 4];
            let mut current = first;
            loop {
                if self.used[current] {
                    return Err(CutFailed);
                }
                self.used[current] = true;
                let chain = &chains[current];
                let inside = points[chain.points.clone()].iter();
                self.points.extend(inside.map(|p| local(cell, p)));
                let is_solid = || is_solid_sliver(&chains[0], points);
                let after = next_start(chains, |c| [c.start, c.end], chain.end, is_solid);
                let next = if after == chains.len() { 0 } else { after };
                let until = chains[next].start + if after == chains.len() { 4.0 } else { 0.0 };
                self.walk_sides(from, chain.end, until, &mut corners);
                current = next;
                if current == first {
                    break;
                }
            }
            self.regions.push(Region {
                cell,
                boundary: from..self.points.len(),
                sides: first_side..self.sides.len(),
                corners,
                holes: Vec::new(),
            });
        }
        Ok(())
    }

    /// Adds the sides from one position around the cell to a later one to the region whose points begin at
    /// `first`.
    fn walk_sides(&mut self, first: usize, from: f64, until: f64, corners: &mut [Option<u32>; 4]) {
        let mut at = from;
        while at < until {
            let side = at.floor();
            let end = until.min(side + 1.0);
            let low = match side as usize % 4 {
                SOUTH | EAST => at - side,
                _ => 1.0 - (end - side),
            };
            self.sides.push((side as usize % 4, low, end - at));
            at = end;
            if at < until {
                let corner = (side as usize + 1) % 4;
                corners[corner] = Some((self.points.len() - first) as u32);
                self.points.push(CORNERS[corner]);
            }
        }
    }

    /// Puts a loop that crosses no line into the one of the last regions, from `first` on, that surrounds it.
    fn place_hole(&mut self, first: usize, hole: &[Point]) -> Result<(), CutFailed> {
        let Some(probe) = hole.first() else {
            return Ok(());
        };
        for region in &mut self.regions[first..] {
            let boundary = &self.points[region.boundary.clone()];
            if contains(boundary, local(region.cell, probe)) {
                let points = hole.iter().map(|p| local(region.cell, p));
                region.holes.push(points.collect());
                return Ok(());
            }
        }
        Err(CutFailed)
    }

    /// A loop in a cell that no chain passes through: an island in a whole cell.
    ///
    /// A lumen as small as a cell is not handled.
    fn add_lone_loop(&mut self, cell: CellIndex, points: &[Point]) -> Result<(), CutFailed> {
        if signed_area(points) > 0.0 {
            return Err(CutFailed);
        }
        if self.regions.last().is_none_or(|region| region.cell != cell) {
            let (from, first_side) = (self.points.len(), self.sides.len());
            self.points.extend(CORNERS);
            self.sides.extend((0..4).map(|side| (side, 0.0, 1.0)));
            self.regions.push(Region {
                cell,
                boundary: from..from + 4,
                sides: first_side..first_side + 4,
                corners: [Some(0), Some(1), Some(2), Some(3)],
                holes: Vec::new(),
            });
        }
        self.place_hole(self.regions.len() - 1, points)
    }
}

/// Whether a chain that ends where it starts goes round something solid in its cell; one that only touches a side
/// does not.
fn is_solid_sliver(chain: &Chain, points: &[Point]) -> bool {
    let points: Vec<Point> = points[chain.points.clone()]
        .iter()
        .map(|p| local(chain.cell, p))
        .collect();
    let extent = |p: &Point| (p[0] - points[0][0]).abs() + (p[1] - points[0][1]).abs();
    signed_area(&points) <= 0.0 && points.iter().any(|p| extent(p) > 0.0)
}

/// A point in the coordinates of a cell.
fn local(cell: CellIndex, p: &Point) -> Point {
    [p[0] - cell.0 as f64, p[1] - cell.1 as f64]
}

/// Area of a polygon, positive when it turns anticlockwise.
pub(crate) fn signed_area(points: &[Point]) -> f64 {
    let Some(mut a) = points.last() else {
        return 0.0;
    };
    let mut twice = 0.0;
    for b in points {
        twice += a[0] * b[1] - a[1] * b[0];
        a = b;
    }
    0.5 * twice
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
pub(crate) fn shared_parts(cut: &CutCells) -> Result<Vec<[(usize, usize); 2]>, CutFailed> {
    // Lower end and region of each part of a side of one cell.
    let parts_on = |side: usize, cell: usize, parts: &mut Vec<(f64, usize)>| {
        parts.clear();
        for index in cut.rows.items(cell) {
            let on_side = cut
                .sides(&cut.regions[index])
                .iter()
                .filter(|p| p.0 == side);
            parts.extend(on_side.map(|part| (part.1, index)));
        }
        parts.sort_by(|a, b| a.0.total_cmp(&b.0));
    };
    let (mut here, mut beyond) = (Vec::new(), Vec::new());
    let mut pairs = Vec::with_capacity(2 * cut.regions.len());
    for (cell, neighbours) in cut.rows.neighbours().into_iter().enumerate() {
        for (side, neighbour) in [EAST, NORTH].into_iter().zip(neighbours) {
            let Some(neighbour) = neighbour else {
                continue;
            };
            parts_on(side, cell, &mut here);
            parts_on(opposite_side(side), neighbour, &mut beyond);
            if here.is_empty() || beyond.is_empty() {
                continue;
            }
            if here.len() != beyond.len() {
                return Err(CutFailed);
            }
            let both = here.iter().zip(&beyond);
            pairs.extend(both.map(|(a, b)| [(a.1, side), (b.1, opposite_side(side))]));
        }
    }
    Ok(pairs)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::{Loop, Lumen, Outline};

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
        let cut = cut_cells(&lattice, [0.5, 0.5]).unwrap();
        let pairs = shared_parts(&cut).unwrap();
        assert!(pairs.len() > cut.regions.len() / 2);
        // Whole cells make up the rest.
        let rest = ring.area() - cut.area();
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
        let cut = cut_cells(&lattice, [0.0, 0.0]).unwrap();
        let pairs = cut.regions.windows(2);
        let twice = pairs.filter(|p| p[0].cell == p[1].cell).count();
        assert!(twice >= 5, "{twice}");
        assert!(shared_parts(&cut).is_ok());
    }

    #[test]
    fn slivers_that_end_on_a_node_are_cut_though_their_walls_cross_a_side_at_one_place() {
        // Knives of solid from each side, thinner than what can be told apart just above their tips.
        let thin = 2e-8;
        let mut side = [
            [0.0, 0.0],
            [8.0, 0.0],
            [8.0 + thin, 5.0],
            [8.0 + 2.0 * thin, 0.0],
        ];
        let mut points = Vec::new();
        for _ in 0..4 {
            points.extend(side);
            side = side.map(|[x, y]| [20.0 - y, x]);
        }
        let outline = Outline::single(points).oriented();
        for offset in [[0.0, 0.0], [thin, thin], [1.0 - thin, 1.0 - thin]] {
            let lattice = Lattice::new(&outline, 1.0, offset);
            for shift in [
                [0.0, 0.0],
                [1.37e-7, 2.11e-7],
                [1.37e-7 - 0.5, 2.11e-7 - 0.5],
            ] {
                let cut = cut_cells(&lattice, shift).unwrap();
                assert!(shared_parts(&cut).is_ok(), "{offset:?} {shift:?}");
                let rest = outline.area() - cut.area();
                assert!(
                    (rest - rest.round()).abs() < 1e-9,
                    "{offset:?} {shift:?} {rest}"
                );
            }
        }
    }
}
