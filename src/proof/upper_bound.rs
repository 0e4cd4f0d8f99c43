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
use crate::grid::{EAST, Lattice, Mask, NORTH, Region, Run, SOUTH, WEST, cut_cells, shared_parts};
use crate::solve::{Field, solve_sparse};

use super::cell_energy::{Moments, energy, region_moments, whole_energy};
use super::nodal_flux::NodalFlux;
use super::{ProofError, ROUNDING};

/// Shift of the cells against the middle between nodes, so that walls on lattice lines are nothing special.
const SHIFT: Point = [1.37e-7, 2.11e-7];
/// Largest divergence error accepted, relative to the largest side value.
const BALANCED: f64 = 1e-10;
/// Largest relative difference between the area of the pieces and that of the section.
const SAME_AREA: f64 = 1e-10;
/// Cost of changing a free side against a shared one.
const FREE_WEIGHT: f64 = 1e-3;

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

/// One cell's divergence: side values with their signs, and what the fixed sides give.
type Equation = (Vec<(usize, f64)>, f64);

struct Flux<'a> {
    mask: &'a Mask,
    nodal: NodalFlux<'a>,
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
    /// Whole cells in the band: where their sides come from, and how these vary along themselves.
    band: Vec<([Source; 4], [f64; 4])>,
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
            nodal: NodalFlux { mask, phi },
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
        self.nodal.value(i, j)
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
                    let extrapolated = (length <= 0.0).then(|| self.nodal.beyond(i, j, side));
                    self.sides.push(Side {
                        value: extrapolated
                            .flatten()
                            .unwrap_or_else(|| self.nodal.guess(i, j, side)),
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

    /// Columns of a run whose cell is cut or has a cut cell among the eight around it, rising.
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
        let mut columns: Vec<i64> = (j - 1..=j + 1)
            .flat_map(|row| near(row, 1))
            .flat_map(|c| [c - 1, c, c + 1])
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
        // All eight cells around are whole, so every node around is fluid.
        let line = |start: usize| self.natural.get(start - 1..=start + n).unwrap_or(&[]);
        let (centre, below, above) = (line(here), line(below), line(above));
        if [centre, below, above].iter().any(|l| l.len() != n + 2) {
            return cells.map(|i| self.single_cell(i, j, west)).sum();
        }
        let mut w = west.unwrap_or(centre[1] - centre[0]);
        let mut sum = 0.0;
        for k in 0..n {
            let (south, north) = (centre[k + 1] - below[k + 1], above[k + 1] - centre[k + 1]);
            let east = w - 1.0 - (north - south);
            let across = |k: usize| [above[k] - centre[k], centre[k] - below[k]];
            let up = |k: usize| 0.5 * ((above[k + 1] - above[k]) - (below[k + 1] - below[k]));
            let ([nw, sw], [ne, se]) = (across(k), across(k + 2));
            let along = [0.5 * (se - sw), up(k + 1), 0.5 * (ne - nw), up(k)];
            sum += whole_energy([south, east, north, w], along);
            w = east;
        }
        *west = Some(w);
        sum
    }

    /// Variation of the flux along each side of a whole cell; none where a cut cell shares the side or a node
    /// around it is not fluid. The two cells at a side get the same value.
    fn variations(&self, i: i64, j: i64) -> [f64; 4] {
        [(0, -1), (1, 0), (0, 1), (-1, 0)].map(|(di, dj)| {
            if self.is_cut(i + di, j + dj) {
                return 0.0;
            }
            // The side between a lower or left node and the next one; the direction along it.
            let (a, b) = (i + di.min(0), j + dj.min(0));
            let (step, turn) = ((di.abs(), dj.abs()), (dj.abs(), di.abs()));
            let flux = |k: i64| {
                let (x, y) = (a + k * turn.0, b + k * turn.1);
                Some(self.value(x + step.0, y + step.1)? - self.value(x, y)?)
            };
            match (flux(1), flux(-1)) {
                (Some(above), Some(below)) => 0.5 * (above - below),
                _ => 0.0,
            }
        })
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
        let along = self.variations(i, j);
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
            return whole_energy([south, east, north, w], along);
        }
        *west = match sources[EAST] {
            Source::Fixed(east) => Some(east),
            Source::Band(_) => None,
        };
        self.band.push((sources, along));
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
            .map(|(cell, along)| whole_energy(cell.map(|source| self.read(source)), *along))
            .sum()
    }

    /// Cells of the band as lists of (side value, sign), with what the fixed sides already give.
    fn equations(&self) -> Vec<Equation> {
        let of_regions = self.region_sides.iter().map(|slots| {
            let terms = (0..4).map(|side| (slots[side], sign(side))).collect();
            (terms, 0.0)
        });
        let of_cells = self.band.iter().map(|(cell, _)| {
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
        self.check_balance(&equations)
    }

    /// Refuses side values whose divergence is not -1 in every cell of the band.
    fn check_balance(&self, equations: &[Equation]) -> Result<(), ProofError> {
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Outline;
    use crate::grid::LineCrossings;
    use crate::solve::{Hierarchy, SolveControl};

    #[test]
    fn a_flux_that_does_not_balance_is_refused() {
        let side = 10.0;
        let square = vec![[0.0, 0.0], [side, 0.0], [side, side], [0.0, side]];
        let outline = Outline::single(square).rotated(0.4, [0.0, 0.0]).oriented();
        let lattice = Lattice::new(&outline, 1.0, [0.3, 0.6]);
        let (rows, columns) = (
            LineCrossings::rows(&lattice),
            LineCrossings::columns(&lattice),
        );
        let mut hierarchy = Hierarchy::new(&lattice, &rows, &columns).unwrap();
        let control = SolveControl {
            residual: 1e-8,
            most_cycles: 50,
        };
        hierarchy.solve(control, |_, _| {});
        let (mask, phi) = hierarchy.into_finest();
        let regions = cut_cells(&lattice, [SHIFT[0] - 0.5, SHIFT[1] - 0.5]).unwrap();
        let mut flux = Flux::new(&mask, &phi, &regions);
        flux.set_up_sides(&shared_parts(&regions).unwrap());
        flux.whole_energy();
        assert!(flux.balance().is_ok());
        let equations = flux.equations();
        for slot in 0..flux.sides.len() {
            let kept = flux.sides[slot].value;
            flux.sides[slot].value += 1e-6 * (1.0 + kept.abs());
            let verdict = flux.check_balance(&equations);
            assert!(
                matches!(verdict, Err(ProofError::Unbalanced { .. })),
                "side {slot}: {verdict:?}"
            );
            flux.sides[slot].value = kept;
        }
        assert!(flux.check_balance(&equations).is_ok());
    }
}
