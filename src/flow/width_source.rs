//! Where the width of the proven range comes from.
//!
//! In a cell at the wall the two fields of the proof differ by about the spacing times the second
//! derivatives of `phi`, in a whole cell by about its square times the third. The sum of the squares of these
//! says which place limits the range, and how it will narrow on a finer grid: like a band at the wall where
//! the field is smooth (measured: between `h^2.5` and `h^3`), with `h^(2 pi / omega)` near a re-entrant corner of
//! fluid angle `omega`. An indication, not a bound.

use crate::geometry::{Corner, Point};
use crate::grid::{Colour, Lattice, Mask, NO_NODE, WallNode};
use crate::solve::Field;

use super::assemble::leading_exponent;

/// Power of the spacing with which the width falls where the field is smooth, on the careful side.
pub(super) const SMOOTH: f64 = 2.5;
/// Cells along each side of a tile over which the squares are summed.
const TILE: u32 = 4;
/// Tiles around the worst one that count as one place.
const REACH: i64 = 1;
/// Excess over the mean from which a place is named.
const NAMED: f64 = 0.1;
/// Distance in cells within which a re-entrant corner is the cause.
const AT_CORNER: f64 = 10.0;
/// Cells across below which a part of the section counts as narrow.
const NARROW: u32 = 16;

/// Why one place of the section widens the proven range.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
#[non_exhaustive]
pub enum WidthCause {
    /// A corner that juts into the fluid.
    ReEntrantCorner {
        /// Its angle on the fluid side, rad.
        fluid_angle: f64,
    },
    /// A part of the section with few cells across.
    NarrowPart {
        /// Cells across there.
        cells_across: u32,
    },
    /// Some other place, where the velocity bends most.
    Bend,
    /// No place stands out.
    #[default]
    Spread,
}

/// The place that contributes most to the width of the proven range.
#[derive(Debug, Clone, Copy, PartialEq, Default)]
pub struct WidthSource {
    /// Why.
    pub cause: WidthCause,
    /// Where, m.
    pub at: Point,
    /// Its share of the width, estimated, 0 to 1.
    pub share: f64,
    /// Share of all re-entrant corners together, estimated, 0 to 1.
    pub corner_share: f64,
    /// Power of the spacing with which their part falls: `2 pi / omega` of the widest, at most 2.5.
    pub corner_exponent: f64,
}

/// Sum over one tile.
type Tile = ((u32, u32), f64);

/// The place that limits the proven range.
pub(crate) fn width_source(
    lattice: &Lattice,
    mask: &Mask,
    phi: &Field,
    corners: &[Vec<Corner>],
) -> WidthSource {
    let tiles = tiles(mask, phi);
    let total: f64 = tiles.iter().map(|t| t.1).sum();
    let worst = tiles
        .iter()
        .max_by(|a, b| a.1.total_cmp(&b.1))
        .map_or((0, 0), |t| t.0);
    let middle = |(row, column): (u32, u32)| {
        [column, row].map(|k| (f64::from(k) + 0.5) * f64::from(TILE) - 0.5)
    };
    let sharp = || corners.iter().flatten().filter(|c| c.turning < 0.0);
    let near_corners: Vec<(u32, u32)> = sharp()
        .map(|corner| {
            let [x, y] = lattice
                .coordinates(corner.at)
                .map(|v| (v + 0.5).max(0.0) as u32 / TILE);
            (y, x)
        })
        .collect();
    let share = excess(&tiles, total, &[worst]);
    let centre = middle(worst);
    let distance = |corner: &&Corner| {
        let [x, y] = lattice.coordinates(corner.at);
        (x - centre[0]).hypot(y - centre[1])
    };
    let nearest = sharp().min_by(|a, b| distance(a).total_cmp(&distance(b)));
    let across = cells_across(mask, centre);
    let (cause, at) = match nearest.filter(|corner| distance(corner) < AT_CORNER) {
        _ if share < NAMED => (WidthCause::Spread, lattice.position(centre)),
        Some(corner) => {
            let fluid_angle = corner.fluid_angle();
            (WidthCause::ReEntrantCorner { fluid_angle }, corner.at)
        }
        None if across < NARROW => (
            WidthCause::NarrowPart {
                cells_across: across,
            },
            lattice.position(centre),
        ),
        None => (WidthCause::Bend, lattice.position(centre)),
    };
    WidthSource {
        cause,
        at,
        share,
        corner_share: excess(&tiles, total, &near_corners),
        corner_exponent: leading_exponent(corners).map_or(SMOOTH, |p| p.min(SMOOTH)),
    }
}

/// Share of the tiles around given ones beyond what they would have if all tiles were alike.
fn excess(tiles: &[Tile], total: f64, around: &[(u32, u32)]) -> f64 {
    let mut chosen: Vec<usize> = around
        .iter()
        .flat_map(|&(row, column)| {
            (-REACH..=REACH).flat_map(move |j| {
                (-REACH..=REACH).filter_map(move |i| {
                    let row = u32::try_from(i64::from(row) + j).ok()?;
                    let column = u32::try_from(i64::from(column) + i).ok()?;
                    tiles.binary_search_by_key(&(row, column), |t| t.0).ok()
                })
            })
        })
        .collect();
    chosen.sort_unstable();
    chosen.dedup();
    let rest = tiles.len() - chosen.len();
    // The sum of nothing would be minus zero.
    let inside = chosen.iter().fold(0.0, |sum, &k| sum + tiles[k].1);
    if total <= 0.0 || rest == 0 {
        return 0.0;
    }
    let alike = (total - inside) / rest as f64 * chosen.len() as f64;
    ((inside - alike) / total).clamp(0.0, 1.0)
}

/// Fewest nodes in a line through a place, along rows and columns.
fn cells_across(mask: &Mask, at: Point) -> u32 {
    let [i, j] = at.map(|v| v.round().max(0.0) as u32);
    let Some(run) = (0..TILE).find_map(|k| mask.run_at(i, j.saturating_sub(TILE / 2) + k)) else {
        return 1;
    };
    let rows = u32::try_from(mask.rows()).unwrap_or(u32::MAX);
    let is_fluid = |row: &u32| mask.run_at(i, *row).is_some();
    let up = (run.row..rows).take_while(is_fluid).count();
    let down = (0..run.row).rev().take_while(is_fluid).count();
    (run.len).min((up + down) as u32) + 1
}

/// Tiles that hold fluid, in order of row and column.
struct Tiles {
    sums: Vec<Tile>,
    spans: Vec<Span>,
    /// First span of each row of tiles, and their number at the end.
    row_start: Vec<usize>,
}

/// Neighbouring tiles of a row of tiles.
struct Span {
    /// First column of tiles, and the one after the last.
    columns: [u32; 2],
    /// Place of the first one among all tiles.
    place: usize,
}

impl Tiles {
    fn new(mask: &Mask) -> Self {
        let mut found = Self {
            sums: Vec::new(),
            spans: Vec::new(),
            row_start: vec![0],
        };
        let rows = u32::try_from(mask.rows()).unwrap_or(u32::MAX);
        let mut stretches: Vec<[u32; 2]> = Vec::new();
        for row in 0..rows.div_ceil(TILE) {
            stretches.clear();
            for j in row * TILE..rows.min((row + 1) * TILE) {
                let runs = mask.row(j).iter();
                stretches.extend(runs.map(|run| [run.first / TILE, run.end().div_ceil(TILE)]));
            }
            // The runs of each line are in order already.
            stretches.sort_unstable();
            for &stretch in &stretches {
                found.add_stretch(row, stretch);
            }
            found.row_start.push(found.spans.len());
        }
        found
    }

    /// Adds tiles of a row that begin at or after the first one of the span before.
    fn add_stretch(&mut self, row: u32, [from, to]: [u32; 2]) {
        let open = self
            .row_start
            .last()
            .is_some_and(|&first| first < self.spans.len());
        let spans = self.spans.last_mut();
        let added = if let Some(span) = spans.filter(|span| open && from <= span.columns[1]) {
            let added = span.columns[1]..to.max(span.columns[1]);
            span.columns[1] = added.end;
            added
        } else {
            self.spans.push(Span {
                columns: [from, to],
                place: self.sums.len(),
            });
            from..to
        };
        self.sums.extend(added.map(|column| ((row, column), 0.0)));
    }

    /// Adds values on nodes of one row, two columns apart from column `i` on.
    fn add(&mut self, i: u32, j: u32, values: &[f64]) {
        let row = (j / TILE) as usize;
        let spans = self
            .row_start
            .get(row..row + 2)
            .and_then(|r| self.spans.get(r[0]..r[1]));
        let spans = spans.unwrap_or(&[]);
        let after = spans.partition_point(|span| span.columns[1] <= i / TILE);
        let Some(span) = spans.get(after).filter(|span| span.columns[0] <= i / TILE) else {
            return;
        };
        let first = span.columns[0];
        let Some(tiles) = self.sums.get_mut(span.place..) else {
            return;
        };
        for (k, value) in values.iter().enumerate() {
            let column = (i + 2 * k as u32) / TILE - first;
            if let Some(tile) = tiles.get_mut(column as usize) {
                tile.1 += value;
            }
        }
    }
}

/// Sums of the squares by tile, in order of row and column.
fn tiles(mask: &Mask, phi: &Field) -> Vec<Tile> {
    let mut found = Tiles::new(mask);
    // Second derivatives on the nodes of a segment, and the squares of their changes.
    let (mut second, mut squares) = (Vec::new(), Vec::new());
    for colour in [Colour::Even, Colour::Odd] {
        let own = &phi.colour[colour as usize];
        let other = &phi.colour[colour.other() as usize];
        for s in &mask.segments[colour as usize] {
            let n = s.len as usize;
            let at = |from: u32, more: usize| other.get(from as usize..from as usize + n + more);
            let (Some(centre), Some(side), Some(down), Some(up)) = (
                own.get(s.start as usize..s.start as usize + n),
                at(s.left, 1),
                at(s.down, 0),
                at(s.up, 0),
            ) else {
                continue;
            };
            second.clear();
            let lines = centre.iter().zip(side.windows(2)).zip(down.iter().zip(up));
            second.extend(lines.map(|((centre, side), (down, up))| {
                [side[0] + side[1] - 2.0 * centre, down + up - 2.0 * centre]
            }));
            squares.clear();
            squares.push(0.0);
            // The nodes of one colour are two cells apart.
            squares.extend(second.windows(2).map(|pair: &[[f64; 2]]| {
                let [dx, dy] = [0, 1].map(|axis: usize| 0.5 * (pair[1][axis] - pair[0][axis]));
                dx * dx + dy * dy
            }));
            found.add(s.i, s.j, &squares);
        }
        for w in &mask.wall[colour as usize] {
            let second = own
                .get(w.node as usize)
                .map_or([0.0; 2], |&value| at_wall(w, value, other));
            found.add(w.i, w.j, &[second[0] * second[0] + second[1] * second[1]]);
        }
    }
    found.sums
}

/// Second derivatives along both axes at a wall node.
fn at_wall(w: &WallNode, value: f64, other: &[f64]) -> [f64; 2] {
    let end = |arm: usize| {
        let node = w.neighbour[arm];
        if node == NO_NODE {
            0.0
        } else {
            other.get(node as usize).copied().unwrap_or(0.0)
        }
    };
    [0, 2].map(|low| {
        let (a, b) = (w.arm[low], w.arm[low + 1]);
        2.0 / (a + b) * ((end(low + 1) - value) / b - (value - end(low)) / a)
    })
}
