//! The outline cut at the sides of the cells around the nodes, and the fluid regions of the cut cells.
//!
//! Every loop is followed once; where it leaves a cell a chain ends and the next begins. Inside a cell the end
//! of one chain is joined along the sides, anticlockwise, to the start of the next, with the fluid on the
//! left. Unlike the cutting of the proof, a chain knows its loop and its arc lengths.

use crate::geometry::Point;
use crate::grid::{
    CORNERS, CellIndex, Lattice, NORTH, exit_from_cell, next_cell, next_start, opposite_side,
    position_around,
};

use super::wall_path::WallPath;

/// Shift of the cells against the middle between nodes, so that walls on lattice lines are nothing special.
const SHIFT: Point = [1.37e-7 - 0.5, 2.11e-7 - 0.5];
/// Column and row of a cell, those of the node in its middle.
pub(super) type Cell = CellIndex;

/// A stretch of one loop inside one cell.
#[derive(Debug, Clone, Copy)]
pub(super) struct Chain {
    pub(super) cell: Cell,
    pub(super) loop_index: usize,
    /// Arc lengths of its ends, m; past the first vertex the second is larger than the loop is long.
    pub(super) from: f64,
    pub(super) to: f64,
    /// Positions of its ends around the cell, 0 to 4 from the lower left corner anticlockwise.
    start: f64,
    end: f64,
    /// What it gives to the area of its region, by the shoelace formula in cell coordinates.
    area: f64,
}

/// A part of a side of a cell that lies in the fluid.
#[derive(Debug, Clone, Copy)]
pub(super) struct SidePart {
    pub(super) side: usize,
    /// Ends along the side, from -1/2 to 1/2.
    pub(super) ends: [f64; 2],
    /// Place on the wall, as loop and arc length, where it ends there.
    pub(super) walls: [Option<(usize, f64)>; 2],
}

impl SidePart {
    /// A whole side.
    pub(super) fn whole(side: usize) -> Self {
        Self {
            side,
            ends: [-0.5, 0.5],
            walls: [None; 2],
        }
    }
}

/// A connected fluid region of a cell.
#[derive(Debug)]
pub(super) struct Region<'a> {
    pub(super) chains: Vec<&'a Chain>,
    /// Area, squared spacings.
    pub(super) area: f64,
    pub(super) sides: Vec<SidePart>,
}

/// The chains of all loops, by cell and position; loops that stay in one cell have none.
pub(super) fn chains(lattice: &Lattice, paths: &[&WallPath]) -> Vec<Chain> {
    let mut found = Vec::new();
    for (loop_index, (pair, path)) in lattice.loop_starts.windows(2).zip(paths).enumerate() {
        let points: Vec<Point> = lattice.edges[pair[0]..pair[1]]
            .iter()
            .map(|edge| [edge.start[0] - SHIFT[0], edge.start[1] - SHIFT[1]])
            .collect();
        follow(&points, (loop_index, path), &mut found);
    }
    found.sort_unstable_by(|a, b| {
        (a.cell.1, a.cell.0)
            .cmp(&(b.cell.1, b.cell.0))
            .then(a.start.total_cmp(&b.start))
    });
    found
}

/// Cuts one loop into chains.
fn follow(points: &[Point], (loop_index, path): (usize, &WallPath), found: &mut Vec<Chain>) {
    let Some(&origin) = points.first() else {
        return;
    };
    let arcs = path.vertices();
    let first = found.len();
    let mut open = Chain {
        cell: (origin[0].floor() as i64, origin[1].floor() as i64),
        loop_index,
        from: 0.0,
        to: 0.0,
        start: f64::NAN,
        end: 0.0,
        area: 0.0,
    };
    let cross = |cell: Cell, p: Point, q: Point| {
        let base = [cell.0 as f64, cell.1 as f64];
        0.5 * ((p[0] - base[0]) * (q[1] - base[1]) - (q[0] - base[0]) * (p[1] - base[1]))
    };
    for (k, &a) in points.iter().enumerate() {
        let b = points[(k + 1) % points.len()];
        let mut last = a;
        while let Some((t, side, at)) = exit_from_cell(a, b, open.cell) {
            open.area += cross(open.cell, last, at);
            open.to = arcs[k] + t * (arcs[k + 1] - arcs[k]);
            open.end = position_around(open.cell, side, at);
            found.push(open);
            let cell = next_cell(open.cell, side);
            open = Chain {
                cell,
                from: open.to,
                start: position_around(cell, opposite_side(side), at),
                area: 0.0,
                ..open
            };
            last = at;
        }
        open.area += cross(open.cell, last, b);
    }
    // What came before the first crossing belongs to the last chain.
    if let Some(lead) = found.get_mut(first) {
        lead.from = open.from;
        lead.to += path.length();
        lead.start = open.start;
        lead.area += open.area;
    }
}

/// The regions of one cell from its chains in order; `None` where they do not close.
pub(super) fn regions(chains: &[Chain]) -> Option<Vec<Region<'_>>> {
    let mut used = vec![false; chains.len()];
    let mut found = Vec::new();
    for first in 0..chains.len() {
        if used[first] {
            continue;
        }
        let mut region = Region {
            chains: Vec::new(),
            area: 0.0,
            sides: Vec::new(),
        };
        let mut current = first;
        loop {
            if std::mem::replace(&mut used[current], true) {
                return None;
            }
            let chain = &chains[current];
            region.chains.push(chain);
            region.area += chain.area;
            let is_solid = || chains[0].area <= 0.0 && chains[0].to > chains[0].from;
            let after = next_start(chains, |c| [c.start, c.end], chain.end, is_solid);
            let (next, turn) = if after == chains.len() {
                (0, 4.0)
            } else {
                (after, 0.0)
            };
            region.walk_sides(chain, &chains[next], turn);
            current = next;
            if current == first {
                break;
            }
        }
        found.push(region);
    }
    Some(found)
}

/// The point at a position around a cell.
fn point_around(position: f64) -> Point {
    let side = position.floor();
    let (a, b) = (CORNERS[side as usize % 4], CORNERS[(side as usize + 1) % 4]);
    let t = position - side;
    [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]
}

impl Region<'_> {
    /// Adds the sides from the end of one chain to the start of the next.
    fn walk_sides(&mut self, from: &Chain, next: &Chain, turn: f64) {
        let (mut at, until) = (from.end, next.start + turn);
        while at < until {
            let side = at.floor();
            let end = until.min(side + 1.0);
            let (p, q) = (point_around(at), point_around(end));
            self.area += 0.5 * (p[0] * q[1] - q[0] * p[1]);
            let mut part = SidePart {
                side: side as usize % 4,
                ends: [at - side - 0.5, end - side - 0.5],
                walls: [
                    (at <= from.end).then_some((from.loop_index, from.to)),
                    (end >= until).then_some((next.loop_index, next.from)),
                ],
            };
            // Along the upper and the left side the way round the cell runs backwards.
            if part.side >= NORTH {
                part.ends = [-part.ends[1], -part.ends[0]];
                part.walls.reverse();
            }
            self.sides.push(part);
            at = end;
        }
    }
}
