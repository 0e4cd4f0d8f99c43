//! The upper bound: a balanced flux field from the nodal values.
//!
//! The cells are squares around the nodes. In a cell the field is linear, `s_x = W + (E - W) x` and
//! `s_y = S + (N - S) y`, with one value for each side, so `div s = E - W + N - S` is constant and must be
//! -1; cells that share a part of a side share its value, which makes the normal component continuous. A
//! cell cut in two by a thin wall counts as two, each with its own values. A side without fluid is shared
//! with nobody and free.
//!
//! Between whole cells the values are the differences of `phi`. The five-point scheme balances them up to
//! the residual of the solver; going along each row, the residual is passed on to the next vertical side,
//! so that whole cells balance exactly. What is left, in the cells at the wall, is put right by the
//! smallest change of the sides there (least squares, solved directly): a graph problem in which cells
//! are nodes, shared sides are edges, and free sides lead out.

use std::collections::BTreeMap;

use sprs::TriMat;

use crate::geometry::Point;
use crate::grid::{
    Colour, EAST, Lattice, Mask, NO_NODE, NORTH, Region, Run, SOUTH, WEST, WallNode, cut_cells,
    shared_parts, signed_area,
};
use crate::solve::{Field, solve_sparse};

use super::{ProofError, ROUNDING};

/// Shift of the cells against the middle between nodes, so that walls on lattice lines are nothing special.
const SHIFT: Point = [1.37e-7, 2.11e-7];
/// Largest divergence error accepted, relative to the largest side value.
const BALANCED: f64 = 1e-10;
/// Largest relative difference between the area of the pieces and that of the section.
const SAME_AREA: f64 = 1e-10;
/// Cost of changing a free side against a shared one.
const FREE_WEIGHT: f64 = 0.05;

/// Integrals over one region in cell coordinates.
#[derive(Debug, Clone, Copy)]
struct Moments {
    area: f64,
    first: Point,
    second: Point,
}

/// An upper bound for the conductance, in units of the lattice spacing to the fourth power.
///
/// - `lattice`: in units of the spacing of the grid of `mask` (edges scaled for coarser grids)
/// - `phi`: nodal values, in units of that spacing squared
pub(super) fn upper_bound(lattice: &Lattice, mask: &Mask, phi: &Field) -> Result<f64, ProofError> {
    let shift = [SHIFT[0] - 0.5, SHIFT[1] - 0.5];
    let cutting = |_| ProofError::Cutting { relative: 1.0 };
    let regions = cut_cells(lattice, shift).map_err(cutting)?;
    let moments: Vec<Moments> = regions.iter().map(region_moments).collect();
    let mut flux = Flux::new(mask, phi, &regions);
    let whole = flux.whole_cells();
    check_area(
        lattice,
        whole as f64 + moments.iter().map(|m| m.area).sum::<f64>(),
    )?;
    let pairs = shared_parts(&regions).map_err(cutting)?;
    flux.set_up_sides(&pairs);
    let interior = flux.whole_energy();
    flux.balance()?;
    let cut: f64 = moments
        .iter()
        .enumerate()
        .map(|(index, m)| energy(flux.sides_of(index), m))
        .sum();
    Ok((interior + flux.band_energy() + cut) * (1.0 + ROUNDING))
}

/// Refuses pieces that do not make up the section.
pub(super) fn check_area(lattice: &Lattice, pieces: f64) -> Result<(), ProofError> {
    let reference = lattice.edges.first().map_or([0.0; 2], |edge| edge.start);
    let section: f64 = lattice
        .edges
        .iter()
        .map(|edge| {
            let a = [edge.start[0] - reference[0], edge.start[1] - reference[1]];
            let b = [edge.end[0] - reference[0], edge.end[1] - reference[1]];
            0.5 * (a[0] * b[1] - a[1] * b[0])
        })
        .sum();
    let relative = (pieces / section - 1.0).abs();
    if relative <= SAME_AREA {
        Ok(())
    } else {
        Err(ProofError::Cutting { relative })
    }
}

fn region_moments(region: &Region) -> Moments {
    let mut m = Moments {
        area: 0.0,
        first: [0.0; 2],
        second: [0.0; 2],
    };
    for polygon in &region.boundary {
        m.area += signed_area(polygon);
        let next = polygon.iter().cycle().skip(1);
        for (a, b) in polygon.iter().zip(next) {
            let cross = a[0] * b[1] - a[1] * b[0];
            for axis in 0..2 {
                m.first[axis] += cross * (a[axis] + b[axis]) / 6.0;
                m.second[axis] +=
                    cross * (a[axis] * a[axis] + a[axis] * b[axis] + b[axis] * b[axis]) / 12.0;
            }
        }
    }
    m
}

/// Integral of `abs(s)^2` over a region with the given side values.
fn energy(sides: [f64; 4], m: &Moments) -> f64 {
    let part = |low: f64, high: f64, axis: usize| {
        let slope = high - low;
        low * low * m.area + 2.0 * low * slope * m.first[axis] + slope * slope * m.second[axis]
    };
    part(sides[WEST], sides[EAST], 0) + part(sides[SOUTH], sides[NORTH], 1)
}

/// The same over a whole cell.
fn whole_energy(sides: [f64; 4]) -> f64 {
    let part = |low: f64, high: f64| (low * low + low * high + high * high) / 3.0;
    part(sides[WEST], sides[EAST]) + part(sides[SOUTH], sides[NORTH])
}

/// Sign with which a side enters the divergence.
fn sign(side: usize) -> f64 {
    if side == EAST || side == NORTH {
        1.0
    } else {
        -1.0
    }
}

/// A side value in the band at the wall.
#[derive(Debug, Clone, Copy)]
struct Side {
    value: f64,
    weight: f64,
}

/// Where a side value of a cell comes from.
#[derive(Debug, Clone, Copy)]
enum Source {
    Fixed(f64),
    Band(usize),
}

struct Flux<'a> {
    mask: &'a Mask,
    phi: &'a Field,
    regions: &'a [Region],
    /// Nodal values row by row.
    natural: Vec<f64>,
    /// Range of regions of each cut cell, by row and column.
    cells: BTreeMap<(i64, i64), (usize, usize)>,
    /// Columns of the cut cells of each row, rising.
    cut: BTreeMap<i64, Vec<i64>>,
    /// Side values of the band; sides of regions point here.
    sides: Vec<Side>,
    region_sides: Vec<[usize; 4]>,
    /// Whole cells in the band: column, row and where their sides come from.
    band: Vec<[Source; 4]>,
}

impl<'a> Flux<'a> {
    fn new(mask: &'a Mask, phi: &'a Field, regions: &'a [Region]) -> Self {
        let mut cells = BTreeMap::new();
        for (index, region) in regions.iter().enumerate() {
            let range = cells
                .entry((region.cell.1, region.cell.0))
                .or_insert((index, index));
            range.1 = index + 1;
        }
        let mut cut: BTreeMap<i64, Vec<i64>> = BTreeMap::new();
        for &(row, column) in cells.keys() {
            cut.entry(row).or_default().push(column);
        }
        Self {
            mask,
            phi,
            regions,
            natural: phi.natural(mask),
            cells,
            cut,
            sides: Vec::new(),
            region_sides: Vec::new(),
            band: Vec::new(),
        }
    }

    fn cut_columns(&self, j: i64) -> &[i64] {
        self.cut.get(&j).map_or(&[][..], Vec::as_slice)
    }

    fn is_cut(&self, i: i64, j: i64) -> bool {
        self.cut_columns(j).binary_search(&i).is_ok()
    }

    fn value(&self, i: i64, j: i64) -> Option<f64> {
        let (i, j) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        self.phi.at(self.mask, i, j)
    }

    /// Number of whole cells: fluid nodes whose cell the outline does not pass through.
    fn whole_cells(&self) -> usize {
        let cut = self
            .cells
            .keys()
            .filter(|&&(j, i)| self.value(i, j).is_some())
            .count();
        self.mask.nodes() - cut
    }

    /// Derivative of `phi` at a side of the cell of fluid node `(i, j)`, along the axis of the side.
    fn slope_at_side(&self, i: i64, j: i64, side: usize) -> Option<f64> {
        let centre = self.value(i, j)?;
        let (low, high) =
            self.differences(i, j, centre, usize::from(side == SOUTH || side == NORTH))?;
        Some(if side == EAST || side == NORTH {
            high
        } else {
            low
        })
    }

    /// Derivatives of the unequal-arm quadratic half a cell below and above a node along one axis.
    fn differences(&self, i: i64, j: i64, centre: f64, axis: usize) -> Option<(f64, f64)> {
        let (ui, uj) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        let (colour, node) = self.mask.node_at(ui, uj)?;
        let (arms, ends) = if let Some(wall) = self.mask.wall_node(colour, node) {
            self.wall_ends(wall, colour, axis)
        } else {
            let step = if axis == 0 { (1, 0) } else { (0, 1) };
            let low = self.value(i - step.0, j - step.1)?;
            let high = self.value(i + step.0, j + step.1)?;
            ([1.0, 1.0], [low, high])
        };
        let (below, above) = ((centre - ends[0]) / arms[0], (ends[1] - centre) / arms[1]);
        let second = 2.0 * (above - below) / (arms[0] + arms[1]);
        let first = (below * arms[1] + above * arms[0]) / (arms[0] + arms[1]);
        Some((first - 0.5 * second, first + 0.5 * second))
    }

    fn wall_ends(&self, wall: &WallNode, colour: Colour, axis: usize) -> ([f64; 2], [f64; 2]) {
        let other = &self.phi.colour[colour.other() as usize];
        let end = |arm: usize| {
            if wall.neighbour[arm] == NO_NODE {
                0.0
            } else {
                other
                    .get(wall.neighbour[arm] as usize)
                    .copied()
                    .unwrap_or(0.0)
            }
        };
        let low = 2 * axis;
        ([wall.arm[low], wall.arm[low + 1]], [end(low), end(low + 1)])
    }

    /// First guess for a side of a cell, from whatever nodes are near.
    fn guess(&self, i: i64, j: i64, side: usize) -> f64 {
        let (along, across) = if side == EAST || side == WEST {
            ((1, 0), (0, 1))
        } else {
            ((0, 1), (1, 0))
        };
        let forward = if side == EAST || side == NORTH { 0 } else { -1 };
        let (a, b) = (i + forward * along.0, j + forward * along.1);
        let step = |k: i64| {
            let low = self.value(a + k * across.0, b + k * across.1)?;
            let high = self.value(a + k * across.0 + along.0, b + k * across.1 + along.1)?;
            Some(high - low)
        };
        if let Some(here) = step(0) {
            return here;
        }
        let from_nodes: Vec<f64> = [
            self.slope_at_side(a, b, if along.0 == 1 { EAST } else { NORTH }),
            self.slope_at_side(
                a + along.0,
                b + along.1,
                if along.0 == 1 { WEST } else { SOUTH },
            ),
        ]
        .into_iter()
        .flatten()
        .collect();
        if !from_nodes.is_empty() {
            return from_nodes.iter().sum::<f64>() / from_nodes.len() as f64;
        }
        let beside: Vec<f64> = [1, -1]
            .into_iter()
            .filter_map(|k| match (step(k), step(2 * k)) {
                (Some(near), Some(far)) => Some(2.0 * near - far),
                (near, _) => near,
            })
            .collect();
        if beside.is_empty() {
            0.0
        } else {
            beside.iter().sum::<f64>() / beside.len() as f64
        }
    }

    /// Gives every side of every region its value and weight; shared sides get one value.
    fn set_up_sides(&mut self, pairs: &[[(usize, usize); 2]]) {
        let mut group: Vec<usize> = (0..4 * self.regions.len()).collect();
        for [a, b] in pairs {
            let (x, y) = (
                root(&mut group, 4 * a.0 + a.1),
                root(&mut group, 4 * b.0 + b.1),
            );
            group[x.max(y)] = x.min(y);
        }
        let mut place = BTreeMap::new();
        for index in 0..self.regions.len() {
            let region = &self.regions[index];
            let (i, j) = region.cell;
            let mut slots = [0; 4];
            for (side, slot) in slots.iter_mut().enumerate() {
                let name = root(&mut group, 4 * index + side);
                *slot = *place.entry(name).or_insert(self.sides.len());
                if *slot == self.sides.len() {
                    let length: f64 = region
                        .sides
                        .iter()
                        .filter(|part| part.0 == side)
                        .map(|part| part.2)
                        .sum();
                    self.sides.push(Side {
                        value: self.guess(i, j, side),
                        weight: FREE_WEIGHT + length,
                    });
                }
            }
            self.region_sides.push(slots);
        }
    }

    fn sides_of(&self, region: usize) -> [f64; 4] {
        self.region_sides[region].map(|slot| self.sides[slot].value)
    }

    /// The one region of a cut cell on a side that it shares with a whole cell.
    fn region_at(&self, i: i64, j: i64, side: usize) -> Option<usize> {
        let &(first, end) = self.cells.get(&(j, i))?;
        (first..end).find(|&index| self.regions[index].sides.iter().any(|part| part.0 == side))
    }

    /// Energy of the whole cells away from the wall; those beside cut cells are collected in the band.
    fn whole_energy(&mut self) -> f64 {
        let mut total = 0.0;
        for run in &self.mask.runs {
            let (first, end) = (i64::from(run.first), i64::from(run.end()));
            let mut west: Option<f64> = None;
            let mut i = first;
            let mut row = 0.0;
            for special in self.beside_cut(run) {
                row += self.stretch(run, i..special, &mut west);
                row += self.single_cell(special, i64::from(run.row), &mut west);
                i = special + 1;
            }
            row += self.stretch(run, i..end, &mut west);
            total += row;
        }
        total
    }

    /// Columns of a run whose cell is cut or has a cut cell beside it, rising.
    fn beside_cut(&self, run: &Run) -> Vec<i64> {
        let j = i64::from(run.row);
        let (first, end) = (i64::from(run.first), i64::from(run.end()));
        let near = |row: i64, reach: i64| {
            let columns = self.cut_columns(row);
            let from = columns.partition_point(|&c| c < first - reach);
            columns[from..]
                .iter()
                .copied()
                .take_while(move |&c| c < end + reach)
        };
        let mut columns: Vec<i64> = near(j, 1)
            .flat_map(|c| [c - 1, c, c + 1])
            .chain(near(j - 1, 0))
            .chain(near(j + 1, 0))
            .filter(|c| (first..end).contains(c))
            .collect();
        columns.sort_unstable();
        columns.dedup();
        columns
    }

    /// Row-by-row index of a node that is certainly fluid.
    fn natural_at(&self, i: i64, j: i64) -> Option<usize> {
        let (i, j) = (u32::try_from(i).ok()?, u32::try_from(j).ok()?);
        self.mask.natural_at(i, j).map(|n| n as usize)
    }

    /// Cells with whole cells all around: the balance decides each east side.
    fn stretch(&mut self, run: &Run, cells: std::ops::Range<i64>, west: &mut Option<f64>) -> f64 {
        let (from, j) = (cells.start, i64::from(run.row));
        let n = (cells.end - from).max(0) as usize;
        let rows = [j, j - 1, j + 1].map(|row| {
            let start = self.natural_at(from, row)?;
            // The last one too must be in the same run.
            (self.natural_at(cells.end - 1, row)? == start + n - 1).then_some(start)
        });
        let (true, [Some(here), Some(below), Some(above)], true) =
            (n > 0, rows, from > i64::from(run.first))
        else {
            return cells.map(|i| self.single_cell(i, j, west)).sum();
        };
        let centre = &self.natural[here - 1..here + n];
        let (below, above) = (&self.natural[below..][..n], &self.natural[above..][..n]);
        let mut w = west.unwrap_or(centre[1] - centre[0]);
        let mut sum = 0.0;
        for k in 0..n {
            let (s, n) = (centre[k + 1] - below[k], above[k] - centre[k + 1]);
            let e = w - 1.0 - (n - s);
            sum += (s * s + s * n + n * n) + (w * w + w * e + e * e);
            w = e;
        }
        *west = Some(w);
        sum / 3.0
    }

    /// One cell that may have cut cells beside it; cut ones are nothing here.
    fn single_cell(&mut self, i: i64, j: i64, west: &mut Option<f64>) -> f64 {
        let Some(centre) = self.value(i, j).filter(|_| !self.is_cut(i, j)) else {
            *west = None;
            return 0.0;
        };
        let side = |di: i64, dj: i64, own: usize| {
            if self.is_cut(i + di, j + dj) {
                self.region_at(i + di, j + dj, (own + 2) % 4)
                    .map(|region| Source::Band(self.region_sides[region][(own + 2) % 4]))
            } else {
                self.value(i + di, j + dj)
                    .map(|v| Source::Fixed(sign(own) * (v - centre)))
            }
        };
        let sources = [
            side(0, -1, SOUTH),
            side(1, 0, EAST),
            side(0, 1, NORTH),
            west.map_or_else(|| side(-1, 0, WEST), |w| Some(Source::Fixed(w))),
        ]
        .map(|source| source.unwrap_or(Source::Fixed(0.0)));
        if let [
            Source::Fixed(south),
            Source::Fixed(_),
            Source::Fixed(north),
            Source::Fixed(w),
        ] = sources
        {
            let east = w - 1.0 - (north - south);
            *west = Some(east);
            return whole_energy([south, east, north, w]);
        }
        *west = match sources[EAST] {
            Source::Fixed(east) => Some(east),
            Source::Band(_) => None,
        };
        self.band.push(sources);
        0.0
    }

    fn read(&self, source: Source) -> f64 {
        match source {
            Source::Fixed(value) => value,
            Source::Band(slot) => self.sides[slot].value,
        }
    }

    fn band_energy(&self) -> f64 {
        self.band
            .iter()
            .map(|cell| whole_energy(cell.map(|source| self.read(source))))
            .sum()
    }

    /// Cells of the band as lists of (side value, sign), with what the fixed sides already give.
    fn equations(&self) -> Vec<(Vec<(usize, f64)>, f64)> {
        let of_regions = self.region_sides.iter().map(|slots| {
            let terms = (0..4).map(|side| (slots[side], sign(side))).collect();
            (terms, 0.0)
        });
        let of_cells = self.band.iter().map(|cell| {
            let mut terms = Vec::new();
            let mut fixed = 0.0;
            for (side, &source) in cell.iter().enumerate() {
                match source {
                    Source::Fixed(value) => fixed += sign(side) * value,
                    Source::Band(slot) => terms.push((slot, sign(side))),
                }
            }
            (terms, fixed)
        });
        of_regions.chain(of_cells).collect()
    }

    /// Smallest change of the band's sides that makes every divergence -1; then checks it.
    fn balance(&mut self) -> Result<(), ProofError> {
        let equations = self.equations();
        let n = equations.len();
        // Twice: the second pass removes the rounding of the first.
        for _ in 0..2 {
            let mut at_side: Vec<Vec<(usize, f64)>> = vec![Vec::new(); self.sides.len()];
            let mut defect = vec![0.0; n];
            for (cell, (terms, fixed)) in equations.iter().enumerate() {
                let have: f64 = terms.iter().map(|&(s, c)| c * self.sides[s].value).sum();
                defect[cell] = -1.0 - fixed - have;
                for &(slot, coefficient) in terms {
                    at_side[slot].push((cell, coefficient));
                }
            }
            let mut matrix = TriMat::new((n, n));
            for (side, cells) in self.sides.iter().zip(&at_side) {
                for &(a, ca) in cells {
                    for &(b, cb) in cells {
                        matrix.add_triplet(a, b, ca * cb / side.weight);
                    }
                }
            }
            solve_sparse(&matrix.to_csr(), &mut defect);
            for (side, cells) in self.sides.iter_mut().zip(&at_side) {
                let change: f64 = cells.iter().map(|&(cell, c)| c * defect[cell]).sum();
                side.value += change / side.weight;
            }
        }
        let largest = self
            .sides
            .iter()
            .fold(1.0, |m: f64, s| m.max(s.value.abs()));
        let worst = equations
            .iter()
            .map(|(terms, fixed)| {
                let have: f64 = terms.iter().map(|&(s, c)| c * self.sides[s].value).sum();
                (have + fixed + 1.0).abs()
            })
            .fold(
                0.0,
                |m: f64, d| if d.is_nan() { f64::INFINITY } else { m.max(d) },
            );
        if worst <= BALANCED * largest {
            Ok(())
        } else {
            Err(ProofError::Unbalanced { divergence: worst })
        }
    }
}

/// Representative of a side in the union of shared sides.
pub(super) fn root(group: &mut [usize], mut index: usize) -> usize {
    while group[index] != index {
        group[index] = group[group[index]];
        index = group[index];
    }
    index
}
