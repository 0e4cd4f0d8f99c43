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
//!
//! Cost: the interior is read once ([`super::interior`]), the rest is linear in the cut cells.

use std::num::NonZeroU32;
use std::ops::Range;

use crate::geometry::Point;
use crate::grid::{Around, CutCells, EAST, Lattice, Mask, Run, WEST, cut_cells, shared_parts};
use crate::solve::Field;

use super::cell_energy::{Moments, energy, region_moments, whole_energy};
use super::cell_sides::{NodesAround, balanced_cell, plain_cell, side_towards, sign};
use super::elimination::Elimination;
use super::interior::{cells, sum_in_groups};
use super::nodal_flux::NodalFlux;
use super::row_values::{RowValues, by_blocks};
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
    let cut = cut_cells(lattice, shift).map_err(cutting)?;
    let regions = cut.regions.iter();
    let moments: Vec<Moments> = regions
        .map(|region| region_moments(cut.polygons(region)))
        .collect();
    let mut flux = Flux::new(mask, phi, &cut);
    let whole = flux.whole_cells();
    check_area(
        lattice,
        whole as f64 + moments.iter().map(|m| m.area).sum::<f64>(),
    )?;
    let shared = shared_parts(&cut).map_err(cutting)?;
    flux.set_up_sides(&shared);
    let interior = flux.whole_energy();
    flux.balance()?;
    let regions = moments.iter().enumerate();
    let [at_wall] = sum_in_groups(regions.map(|(index, m)| [energy(flux.sides_of(index), m)]));
    Ok((interior + flux.band_energy() + at_wall) * (1.0 + ROUNDING))
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

/// A side value in the band at the wall.
#[derive(Debug, Clone, Copy)]
struct Side {
    value: f64,
    weight: f64,
}

/// Place of a side value of the band.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
struct Slot(NonZeroU32);

impl Slot {
    const FIRST: Self = Self(NonZeroU32::MIN);

    fn new(index: usize) -> Self {
        Self(NonZeroU32::MIN.saturating_add(index as u32))
    }

    fn index(self) -> usize {
        self.0.get() as usize - 1
    }
}

/// Where a side value of a cell comes from.
#[derive(Debug, Clone, Copy)]
enum Source {
    Fixed(f64),
    Band(Slot),
}

/// A whole cell of the band: where its sides come from, and how these vary along themselves.
type BandCell = ([Source; 4], [f64; 4]);

/// One cell's divergence: its sides with values in the band, and what the fixed sides give.
#[derive(Debug, Clone, Copy)]
struct Equation {
    slots: [Option<Slot>; 4],
    fixed: f64,
}

impl Equation {
    /// Side values with the signs they enter with.
    fn terms(&self) -> impl Iterator<Item = (usize, f64)> {
        let sides = self.slots.into_iter().enumerate();
        sides.filter_map(|(side, slot)| Some((slot?.index(), sign(side))))
    }
}

struct Flux<'a> {
    mask: &'a Mask,
    nodal: NodalFlux<'a>,
    cut: &'a CutCells,
    /// Side values of the band; sides of regions point here.
    sides: Vec<Side>,
    region_sides: Vec<[Slot; 4]>,
    band: Vec<BandCell>,
}

/// The whole cells of some rows: energy of those away from the wall, and those of the band.
#[derive(Default)]
struct WholeRows {
    energy: f64,
    band: Vec<BandCell>,
}

impl<'a> Flux<'a> {
    fn new(mask: &'a Mask, phi: &'a Field, cut: &'a CutCells) -> Self {
        Self {
            mask,
            nodal: NodalFlux::new(mask, phi),
            cut,
            sides: Vec::new(),
            region_sides: Vec::new(),
            band: Vec::new(),
        }
    }

    /// Number of whole cells: fluid nodes whose cell the outline does not pass through.
    fn whole_cells(&self) -> usize {
        let cells = self.cut.rows.cells().iter();
        let cut = cells.filter(|&&(i, j)| self.nodal.value(i, j).is_some());
        self.mask.nodes() - cut.count()
    }

    /// Gives every side of every region its value and weight; shared sides get one value.
    fn set_up_sides(&mut self, pairs: &[[(usize, usize); 2]]) {
        let regions = &self.cut.regions;
        let mut group: Vec<usize> = (0..4 * regions.len()).collect();
        for [a, b] in pairs {
            let (x, y) = (
                root(&mut group, 4 * a.0 + a.1),
                root(&mut group, 4 * b.0 + b.1),
            );
            group[x.max(y)] = x.min(y);
        }
        let mut slot_of = vec![usize::MAX; group.len()];
        for (index, region) in regions.iter().enumerate() {
            let (i, j) = region.cell;
            let mut slots = [Slot::FIRST; 4];
            for (side, slot) in slots.iter_mut().enumerate() {
                let name = root(&mut group, 4 * index + side);
                if slot_of[name] == usize::MAX {
                    slot_of[name] = self.sides.len();
                    let parts = self.cut.sides(region).iter();
                    let length: f64 = parts.filter(|p| p.0 == side).map(|p| p.2).sum();
                    let extrapolated = (length <= 0.0).then(|| self.nodal.beyond(i, j, side));
                    self.sides.push(Side {
                        value: extrapolated
                            .flatten()
                            .unwrap_or_else(|| self.nodal.guess(i, j, side)),
                        weight: FREE_WEIGHT + length,
                    });
                }
                *slot = Slot::new(slot_of[name]);
            }
            self.region_sides.push(slots);
        }
    }

    fn sides_of(&self, region: usize) -> [f64; 4] {
        self.region_sides[region].map(|slot| self.sides[slot.index()].value)
    }

    /// The one region of a cut cell on a side that it shares with a whole cell.
    fn region_at(&self, i: i64, j: i64, side: usize) -> Option<usize> {
        let cell = self.cut.rows.find((i, j))?;
        let is_on_side = |&index: &usize| {
            self.cut
                .sides(&self.cut.regions[index])
                .iter()
                .any(|p| p.0 == side)
        };
        self.cut.rows.items(cell).find(is_on_side)
    }

    /// Energy of the whole cells away from the wall; those beside cut cells are collected in the band.
    fn whole_energy(&mut self) -> f64 {
        let mut total = 0.0;
        for rows in by_blocks(self.mask, 0, |rows, memory| self.whole_rows(rows, memory)) {
            total += rows.energy;
            self.band.extend(rows.band);
        }
        total
    }

    fn whole_rows(&self, rows: Range<i64>, memory: &mut Vec<f64>) -> WholeRows {
        let around = rows.start - 1..rows.end + 1;
        let nodes = RowValues::new(self.mask, self.nodal.phi, around, memory);
        let mut found = WholeRows::default();
        let mut near_wall = Vec::new();
        for j in rows {
            self.cut.rows.columns_around(j, &mut near_wall);
            for run in self.mask.row(j as u32) {
                self.whole_run(run, &nodes, &near_wall, &mut found);
            }
        }
        found
    }

    /// - `near_wall`: columns whose cell is cut or has a cut cell among the eight around it
    fn whole_run(
        &self,
        run: &Run,
        nodes: &RowValues,
        near_wall: &[(i64, Around)],
        found: &mut WholeRows,
    ) {
        let (first, end, j) = (
            i64::from(run.first),
            i64::from(run.end()),
            i64::from(run.row),
        );
        let mut west: Option<f64> = None;
        let mut i = first;
        let mut energy = 0.0;
        let from = near_wall.partition_point(|c| c.0 < first);
        for &(column, around) in near_wall[from..].iter().take_while(|c| c.0 < end) {
            energy += Self::stretch(nodes, i..column, j, &mut west);
            let place = (column, j, around);
            energy += self.single_cell(place, nodes, &mut west, &mut found.band);
            i = column + 1;
        }
        found.energy += energy + Self::stretch(nodes, i..end, j, &mut west);
    }

    /// Cells with whole cells all around: the balance decides each east side.
    fn stretch(nodes: &RowValues, columns: Range<i64>, j: i64, west: &mut Option<f64>) -> f64 {
        let n = (columns.end - columns.start).max(0) as usize;
        if n == 0 {
            return 0.0;
        }
        let line = |row: i64| nodes.line(columns.start - 1, row, n + 2);
        let (Some(below), Some(centre), Some(above)) = (line(j - 1), line(j), line(j + 1)) else {
            // A node taken out of the fluid nearby.
            return columns.map(|i| plain_cell(nodes, i, j, west)).sum();
        };
        let first = west.unwrap_or(centre[1] - centre[0]);
        let (energy, last) = cells([below, centre, above], first);
        *west = Some(last);
        energy
    }

    /// One cell that has cut cells around it or is cut itself; cut ones are nothing here.
    ///
    /// - `place`: column, row, and which cells around are cut
    fn single_cell(
        &self,
        (i, j, around): (i64, i64, Around),
        nodes: &RowValues,
        west: &mut Option<f64>,
        band: &mut Vec<BandCell>,
    ) -> f64 {
        if around.has(0, 0) {
            *west = None;
            return 0.0;
        }
        let cell = NodesAround::new(nodes, i, j);
        let along = cell.variations(|di, dj| around.has(di, dj));
        let sources = [(0, -1), (1, 0), (0, 1), (-1, 0)].map(|(di, dj)| {
            let own = side_towards(di, dj);
            match *west {
                Some(w) if own == WEST => Source::Fixed(w),
                _ if around.has(di, dj) => {
                    let beyond = (own + 2) % 4;
                    let region = self.region_at(i + di, j + dj, beyond);
                    region.map_or(Source::Fixed(0.0), |region| {
                        Source::Band(self.region_sides[region][beyond])
                    })
                }
                _ => Source::Fixed(cell.difference(own)),
            }
        });
        if sources
            .iter()
            .all(|source| matches!(source, Source::Fixed(_)))
        {
            let fixed = sources.map(|source| self.read(source));
            return balanced_cell(fixed, along, west);
        }
        *west = match sources[EAST] {
            Source::Fixed(east) => Some(east),
            Source::Band(_) => None,
        };
        band.push((sources, along));
        0.0
    }

    fn read(&self, source: Source) -> f64 {
        match source {
            Source::Fixed(value) => value,
            Source::Band(slot) => self.sides[slot.index()].value,
        }
    }

    fn band_energy(&self) -> f64 {
        let cells = self.band.iter();
        let energy = cells.map(|(cell, along)| whole_energy(cell.map(|s| self.read(s)), *along));
        let [sum] = sum_in_groups(energy.map(|energy| [energy]));
        sum
    }

    /// Cells of the band as lists of (side value, sign), with what the fixed sides already give.
    fn equations(&self) -> Vec<Equation> {
        let of_regions = self.region_sides.iter().map(|slots| Equation {
            slots: slots.map(Some),
            fixed: 0.0,
        });
        let of_cells = self.band.iter().map(|(cell, _)| {
            let mut equation = Equation {
                slots: [None; 4],
                fixed: 0.0,
            };
            for (side, &source) in cell.iter().enumerate() {
                match source {
                    Source::Fixed(value) => equation.fixed += sign(side) * value,
                    Source::Band(slot) => equation.slots[side] = Some(slot),
                }
            }
            equation
        });
        of_regions.chain(of_cells).collect()
    }

    /// Smallest change of the band's sides that makes every divergence -1; then checks it.
    fn balance(&mut self) -> Result<(), ProofError> {
        let equations = self.equations();
        let system = self.least_squares(&equations);
        // Twice: the second pass removes the rounding of the first.
        for _ in 0..2 {
            let mut defect: Vec<f64> = equations
                .iter()
                .map(|e| -1.0 - self.divergence(e))
                .collect();
            system.solve(&mut defect);
            for (equation, multiplier) in equations.iter().zip(defect) {
                for (slot, coefficient) in equation.terms() {
                    let side = &mut self.sides[slot];
                    side.value += coefficient * multiplier / side.weight;
                }
            }
        }
        self.check_balance(&equations)
    }

    /// The system for the multipliers of the equations: two are joined by each side they have in common.
    fn least_squares(&self, equations: &[Equation]) -> Elimination {
        // Equations at each side as a chain: the last one, and from each term to the one before.
        let mut last = vec![u32::MAX; self.sides.len()];
        let mut terms: Vec<(u32, u32, f64)> = Vec::with_capacity(4 * equations.len());
        let mut diagonal = vec![0.0; equations.len()];
        let mut pairs = Vec::with_capacity(2 * equations.len());
        for (cell, equation) in equations.iter().enumerate() {
            for (slot, coefficient) in equation.terms() {
                let weight = self.sides[slot].weight;
                diagonal[cell] += coefficient * coefficient / weight;
                let mut before = last[slot];
                while let Some(&(other, next, factor)) = terms.get(before as usize) {
                    pairs.push((other, cell as u32, coefficient * factor / weight));
                    before = next;
                }
                terms.push((cell as u32, last[slot], coefficient));
                last[slot] = terms.len() as u32 - 1;
            }
        }
        Elimination::new(diagonal, &pairs)
    }

    fn divergence(&self, equation: &Equation) -> f64 {
        let terms = equation.terms();
        equation.fixed
            + terms
                .map(|(slot, c)| c * self.sides[slot].value)
                .sum::<f64>()
    }

    /// Refuses side values whose divergence is not -1 in every cell of the band.
    fn check_balance(&self, equations: &[Equation]) -> Result<(), ProofError> {
        let largest = self
            .sides
            .iter()
            .fold(1.0, |m: f64, s| m.max(s.value.abs()));
        let worst = equations
            .iter()
            .map(|equation| (self.divergence(equation) + 1.0).abs())
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
fn root(group: &mut [usize], mut index: usize) -> usize {
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
