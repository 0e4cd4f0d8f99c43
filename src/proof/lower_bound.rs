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
//!
//! Cost: the interior is read once ([`super::interior`]); near the wall the work is linear in the cut squares and
//! the vertices of the outline ([`super::near_wall`]).

use std::ops::Range;

use crate::grid::{Around, CellRows, Lattice, Mask, cut_cells};
use crate::solve::Field;

use super::cut_polygon::{agree, feet, polygons};
use super::interior::{bubble, squares};
use super::near_wall::{NONE, NearWall, WholeSquare};
use super::row_values::{RowValues, by_blocks};
use super::square_energy::Square;
use super::upper_bound::check_area;
use super::{ProofError, ROUNDING};

/// Shift of the squares against the nodes, so that walls on lattice lines are nothing special. Smaller
/// than the distance below which a node counts as wall.
const SHIFT: [f64; 2] = [1.37e-7, 2.11e-7];

/// A lower bound for the conductance; arguments and unit as in [`super::upper_bound`].
pub(super) fn lower_bound(lattice: &Lattice, mask: &Mask, phi: &Field) -> Result<f64, ProofError> {
    let cut = cut_cells(lattice, SHIFT).map_err(|_| ProofError::Cutting { relative: 1.0 })?;
    let value_at =
        |(i, j): (i64, i64)| phi.at(mask, u32::try_from(i).ok()?, u32::try_from(j).ok()?);
    let number = |(i, j): (i64, i64)| natural_at(mask, i, j).map(|n| n as usize);
    let feet = feet(&cut, value_at);
    let polygons = polygons(&cut, &feet, number);
    if !agree(&polygons) {
        return Err(ProofError::Discontinuous);
    }
    // Whole squares that are divided because of a foot.
    let foot_squares = polygons.len() - cut.regions.len();
    let divided = CellRows::new(polygons.iter().map(|polygon| polygon.cell));
    let whole = WholeSquares::new(mask, phi, &divided);
    check_area(lattice, cut.area() + (whole.count + foot_squares) as f64)?;
    let near_wall = NearWall::new(mask, phi, &polygons, &whole.near_wall).improved();
    let [volume, energy] = near_wall.integrals();
    let (volume, energy) = (whole.volume + volume, whole.energy + energy);
    if energy > 0.0 {
        Ok(volume * volume / energy * (1.0 - ROUNDING))
    } else {
        Ok(0.0)
    }
}

/// The squares that the wall does not cut.
#[derive(Default)]
struct WholeSquares {
    /// Their number.
    count: usize,
    /// Integral of `v` over those with whole squares all around.
    volume: f64,
    /// Integral of `abs(grad v)^2` over these.
    energy: f64,
    /// The others.
    near_wall: Vec<WholeSquare>,
}

/// Squares that are done one by one when one of them lacks a node.
const FEW: usize = 4;

impl WholeSquares {
    /// - `divided`: squares that are divided
    fn new(mask: &Mask, phi: &Field, divided: &CellRows) -> Self {
        let mut all = Self::default();
        for rows in by_blocks(mask, -1, |rows, memory| {
            Self::of_rows((mask, phi), divided, rows, memory)
        }) {
            all.count += rows.count;
            all.volume += rows.volume;
            all.energy += rows.energy;
            all.near_wall.extend(rows.near_wall);
        }
        all
    }

    fn of_rows(
        (mask, phi): (&Mask, &Field),
        divided: &CellRows,
        rows: Range<i64>,
        memory: &mut Vec<f64>,
    ) -> Self {
        let nodes = RowValues::new(mask, phi, rows.start - 1..rows.end + 2, memory);
        let mut found = Self::default();
        let (mut spans, mut near_wall) = (Vec::new(), Vec::new());
        for row in rows {
            squares_with_fluid(mask, row, &mut spans);
            divided.columns_around(row, &mut near_wall);
            let mut special = near_wall.as_slice();
            for &(from, to) in &spans {
                special = &special[special.partition_point(|s| s.0 < from)..];
                let mut i = from;
                while let Some((&(column, around), rest)) =
                    special.split_first().filter(|s| s.0.0 < to)
                {
                    found.add_plain(&nodes, i..column, row);
                    if !around.has(0, 0) {
                        found
                            .near_wall
                            .push(near_square(mask, &nodes, (column, row, around)));
                        found.count += 1;
                    }
                    (i, special) = (column + 1, rest);
                }
                found.add_plain(&nodes, i..to, row);
            }
        }
        found
    }

    /// Adds squares with whole squares all around.
    fn add_plain(&mut self, nodes: &RowValues, columns: Range<i64>, row: i64) {
        let n = (columns.end - columns.start).max(0) as usize;
        if n == 0 {
            return;
        }
        self.count += n;
        let line = |j: i64| nodes.line(columns.start - 1, j, n + 3);
        if let (Some(r0), Some(r1), Some(r2), Some(r3)) =
            (line(row - 1), line(row), line(row + 1), line(row + 2))
        {
            let [volume, energy] = squares([r0, r1, r2, r3]);
            self.volume += volume;
            self.energy += energy;
            return;
        }
        if n > FEW {
            // The wall runs along a lattice line somewhere: by halves until the places are found.
            let middle = i64::midpoint(columns.start, columns.end);
            self.count -= n;
            self.add_plain(nodes, columns.start..middle, row);
            self.add_plain(nodes, middle..columns.end, row);
            return;
        }
        // A node taken out of the fluid nearby.
        for i in columns {
            let square = square(nodes, i, row, |_, _| false);
            self.volume += square.volume();
            self.energy += square.energy();
        }
    }
}

/// A whole square with divided ones around it.
///
/// - `place`: column, row, and which squares around are divided
fn near_square(mask: &Mask, nodes: &RowValues, place: (i64, i64, Around)) -> WholeSquare {
    let (i, j, around) = place;
    let corners = [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)];
    WholeSquare {
        nodes: corners.map(|(i, j)| natural_at(mask, i, j).unwrap_or(NONE)),
        bubbles: square(nodes, i, j, |di, dj| around.has(di, dj)).bubbles,
    }
}

/// A whole square with the nodal values as they are. A side has a bubble where both its squares are whole
/// and four nodes in line are fluid.
fn square(nodes: &RowValues, i: i64, j: i64, is_divided: impl Fn(i64, i64) -> bool) -> Square {
    let rows: [[Option<f64>; 4]; 4] = [-1, 0, 1, 2].map(|dj| nodes.places(i - 1, j + dj));
    let bubble_of = |four: [Option<f64>; 4], beyond: (i64, i64)| match four {
        [Some(a), Some(b), Some(c), Some(d)] if !is_divided(beyond.0, beyond.1) => {
            bubble([a, b, c, d])
        }
        _ => 0.0,
    };
    let corner = |column: usize, row: usize| rows[row][column].unwrap_or(0.0);
    Square {
        corners: [corner(1, 1), corner(2, 1), corner(2, 2), corner(1, 2)],
        bubbles: [
            bubble_of(rows[1], (0, -1)),
            bubble_of(rows.map(|row| row[2]), (1, 0)),
            bubble_of(rows[2], (0, 1)),
            bubble_of(rows.map(|row| row[1]), (-1, 0)),
        ],
    }
}

/// Squares of a row with at least one fluid node, as disjoint ranges of columns in order.
fn squares_with_fluid(mask: &Mask, row: i64, spans: &mut Vec<(i64, i64)>) {
    spans.clear();
    let runs = |j: i64| u32::try_from(j).map_or(&[][..], |j| mask.row(j));
    let (mut low, mut high) = (runs(row), runs(row + 1));
    loop {
        let run = match (low.first(), high.first()) {
            (Some(a), Some(b)) if a.first <= b.first => take_first(&mut low),
            (Some(_), None) => take_first(&mut low),
            _ => take_first(&mut high),
        };
        let Some(run) = run else {
            return;
        };
        let (from, to) = (i64::from(run.first) - 1, i64::from(run.end()));
        match spans.last_mut() {
            Some(last) if from <= last.1 => last.1 = last.1.max(to),
            _ => spans.push((from, to)),
        }
    }
}

fn take_first<'a, T>(list: &mut &'a [T]) -> Option<&'a T> {
    let (first, rest) = list.split_first()?;
    *list = rest;
    Some(first)
}

/// Row-by-row number of the fluid node `(i, j)`.
fn natural_at(mask: &Mask, i: i64, j: i64) -> Option<u32> {
    mask.natural_at(u32::try_from(i).ok()?, u32::try_from(j).ok()?)
}
