//! The two passes of a cycle over one grid: down with smoothing, residual and restriction, up with
//! interpolation and smoothing.
//!
//! Each reads and writes the field once: rows follow each other at a distance of one, so that all that is done to a
//! row is done while it is in cache. On several threads the rows are cut into strips ([`super::row_set`]); what
//! lies at their seams is done after them. No value depends on how the rows are cut.

use std::ops::Range;

use rayon::prelude::*;

use crate::grid::{Colour, Mask, PARALLEL_NODES};

use super::first_guess::guess_row;
use super::hierarchy::{Grid, GridSource};
use super::row_set::{Row, RowSet};
use super::stencil::{Source, Stencil};
use super::transfer::Transfer;

/// Strips per thread, so that a thread that is held up does not hold up the other.
const STRIPS_PER_THREAD: usize = 2;
/// Fewest rows of a strip.
const LEAST_ROWS: usize = 16;

/// What a pass down starts from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Start {
    /// The values as they are.
    Present,
    /// Zero, whatever the values are.
    Zero,
}

/// What interpolated values do to those that are there.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Lift {
    /// Add to them.
    Correct,
    /// Take their place, as a first guess at the solution.
    Replace,
}

/// Everything about a grid that a pass only reads.
#[derive(Clone, Copy)]
struct Operator<'a> {
    mask: &'a Mask,
    stencil: &'a Stencil,
    source: Source<'a>,
    transfer: &'a Transfer,
}

impl Operator<'_> {
    fn relax(self, colour: Colour, row: usize, own: &mut RowSet, other: &RowSet) {
        let (target, around) = (own.owned_mut(), other.around(row));
        self.stencil
            .relax_row(self.mask, (colour, row), target, around, self.source);
    }

    /// What a sweep does at a row of a strip: its even nodes, then the odd ones of the row before.
    fn sweep(self, (strip, row): (Range<usize>, usize), even: &mut RowSet, odd: &mut RowSet) {
        if strip.contains(&row) {
            self.relax(Colour::Even, row, even, odd);
        }
        if row > strip.start && odd.owns(row - 1) {
            self.relax(Colour::Odd, row - 1, odd, even);
        }
    }

    /// Residual of the even nodes of a row.
    fn residual(self, row: usize, even: &RowSet, odd: &RowSet, out: &mut [f64]) -> Left {
        let phi = even.owned();
        let around = odd.around(row);
        self.stencil.residual_row(
            self.mask,
            (Colour::Even, row),
            (phi, around),
            self.source,
            out,
        );
        Left::of(phi.from(self.mask.starts[row].node[0], out.len()), out)
    }

    fn even_nodes(self, row: usize) -> Range<usize> {
        let starts = &self.mask.starts;
        starts[row].node[0] as usize..starts[row + 1].node[0] as usize
    }
}

/// What the iteration has left over, summed over even nodes.
#[derive(Debug, Clone, Copy, Default)]
pub(super) struct Left {
    /// Squares of `phi` times the residual.
    residual: f64,
    /// Squares of `phi`.
    phi: f64,
}

impl Left {
    /// In eight partial sums, which the compiler can keep in vectors.
    fn of(phi: &[f64], residual: &[f64]) -> Self {
        let mut sums = [[0.0; 8]; 2];
        let (phi_eights, phi_rest) = phi.as_chunks::<8>();
        let (eights, rest) = residual.as_chunks::<8>();
        for (p, r) in phi_eights.iter().zip(eights) {
            for k in 0..8 {
                sums[0][k] += (p[k] * r[k]) * (p[k] * r[k]);
                sums[1][k] += p[k] * p[k];
            }
        }
        for (k, (p, r)) in phi_rest.iter().zip(rest).enumerate() {
            sums[0][k] += (p * r) * (p * r);
            sums[1][k] += p * p;
        }
        let [residual, phi] = sums.map(|s| s.iter().sum());
        Self { residual, phi }
    }

    /// Root mean square of the residual, weighted with `phi`.
    pub(super) fn root_mean_square(self) -> f64 {
        if self.phi > 0.0 {
            (self.residual / self.phi).sqrt()
        } else {
            0.0
        }
    }
}

fn sum<'a>(rows: impl IntoIterator<Item = &'a Left>) -> Left {
    rows.into_iter().fold(Left::default(), |sum, row| Left {
        residual: sum.residual + row.residual,
        phi: sum.phi + row.phi,
    })
}

/// First rows of all strips but the first: even, and so many nodes apart.
fn seams(mask: &Mask) -> Vec<usize> {
    // Asking for the number of threads starts them: small grids do without.
    if mask.nodes() < PARALLEL_NODES || rayon::current_num_threads() == 1 {
        return Vec::new();
    }
    let strips = STRIPS_PER_THREAD * rayon::current_num_threads();
    let mut seams = Vec::new();
    let mut last = 0;
    for strip in 1..strips {
        let node = (mask.nodes() * strip / strips) as u32;
        let row = mask.starts.partition_point(|start| start.natural < node) & !1;
        if row >= last + LEAST_ROWS && row + LEAST_ROWS <= mask.rows() {
            seams.push(row);
            last = row;
        }
    }
    seams
}

/// Residuals of the even nodes of the last three rows.
struct Ring {
    rows: [Vec<f64>; 3],
}

impl Ring {
    fn new(operator: Operator) -> Self {
        let longest = operator.mask.longest_row as usize;
        Self {
            rows: std::array::from_fn(|_| vec![0.0; longest]),
        }
    }

    fn row_mut(&mut self, operator: Operator, row: usize) -> &mut [f64] {
        &mut self.rows[row % 3][..operator.even_nodes(row).len()]
    }

    /// The rows below, at and above a coarse row; those beyond the lattice are empty.
    fn around(&self, operator: Operator, coarse: usize) -> [Row<'_>; 3] {
        [(2 * coarse).wrapping_sub(1), 2 * coarse, 2 * coarse + 1].map(|row| {
            if row >= operator.mask.rows() {
                return Row::EMPTY;
            }
            let nodes = operator.even_nodes(row);
            Row::new(&self.rows[row % 3][..nodes.len()], nodes.start as u32)
        })
    }
}

/// The coarse rows that a strip fills.
struct CoarseRows<'a> {
    mask: &'a Mask,
    rhs: [RowSet<'a>; 2],
    natural: Vec<f64>,
}

impl CoarseRows<'_> {
    fn restrict(&mut self, operator: Operator, row: usize, residual: [Row; 3]) {
        let (at, next) = (&self.mask.starts[row], &self.mask.starts[row + 1]);
        self.natural
            .resize((next.natural - at.natural) as usize, 0.0);
        operator
            .transfer
            .restrict_row(row, residual, at.natural, &mut self.natural);
        let [even, odd] = &mut self.rhs;
        let mut targets = [even.row_mut(row), odd.row_mut(row)];
        self.mask.split_row(row, &self.natural, &mut targets);
    }
}

/// One strip of the pass down.
struct DownStrip<'a> {
    operator: Operator<'a>,
    rows: Range<usize>,
    start: Start,
    even: RowSet<'a>,
    odd: RowSet<'a>,
    coarse: CoarseRows<'a>,
    /// What is left over in each row of the strip.
    left: &'a mut [Left],
}

impl DownStrip<'_> {
    fn run(&mut self) {
        let (first, end) = (self.rows.start, self.rows.end);
        let is_first = first == 0;
        let is_last = end == self.operator.mask.rows();
        let residuals = if is_first { 0 } else { first + 2 }..if is_last { end } else { end - 2 };
        let restricted = if is_first { 0 } else { first / 2 + 2 }..if is_last {
            self.coarse.mask.rows()
        } else {
            end / 2 - 1
        };
        let mut ring = Ring::new(self.operator);
        self.clear(first);
        for row in first..end + 2 {
            self.clear(row + 1);
            let strip = (first..end, row);
            self.operator.sweep(strip, &mut self.even, &mut self.odd);
            let Some(ready) = row.checked_sub(2).filter(|r| residuals.contains(r)) else {
                continue;
            };
            let out = ring.row_mut(self.operator, ready);
            self.left[ready - first] = self.operator.residual(ready, &self.even, &self.odd, out);
            let is_complete = !ready.is_multiple_of(2) || ready + 1 == self.operator.mask.rows();
            if is_complete && restricted.contains(&(ready / 2)) {
                let around = ring.around(self.operator, ready / 2);
                self.coarse.restrict(self.operator, ready / 2, around);
            }
        }
    }

    fn clear(&mut self, row: usize) {
        if self.start == Start::Zero && self.odd.owns(row) {
            self.odd.row_mut(row).fill(0.0);
        }
    }
}

/// Smooths, and hands what is left over to the coarser grid as its right side.
pub(super) fn descend(
    fine: &mut Grid,
    coarse: &mut Grid,
    transfer: &Transfer,
    start: Start,
) -> Left {
    let operator = Operator {
        mask: &fine.mask,
        stencil: &fine.stencil,
        source: fine.source.of(&fine.rhs),
        transfer,
    };
    coarse.source = GridSource::Own;
    let starts = &fine.mask.starts;
    let seams = seams(&fine.mask);
    let [even, odd] = &mut fine.phi.colour;
    if start == Start::Zero {
        let mut rows = RowSet::whole(starts, Colour::Odd, odd);
        for &seam in &seams {
            rows.row_mut(seam - 1).fill(0.0);
            rows.row_mut(seam).fill(0.0);
        }
    }
    let mut left = vec![Left::default(); fine.mask.rows()];
    run_down(operator, start, [even, odd], coarse, (&seams, &mut left));
    let even = RowSet::whole(starts, Colour::Even, even);
    let mut odd = RowSet::whole(starts, Colour::Odd, odd);
    let [coarse_even, coarse_odd] = &mut coarse.rhs.colour;
    let mut coarse_rows = CoarseRows {
        mask: &coarse.mask,
        rhs: [
            RowSet::whole(&coarse.mask.starts, Colour::Even, coarse_even),
            RowSet::whole(&coarse.mask.starts, Colour::Odd, coarse_odd),
        ],
        natural: Vec::new(),
    };
    for &seam in &seams {
        for row in [seam - 1, seam] {
            operator.relax(Colour::Odd, row, &mut odd, &even);
        }
    }
    let mut ring = Ring::new(operator);
    for &seam in &seams {
        for (row, left) in left.iter_mut().enumerate().take(seam + 4).skip(seam - 3) {
            let out = ring.row_mut(operator, row);
            *left = operator.residual(row, &even, &odd, out);
            if !row.is_multiple_of(2) && row > seam - 3 {
                let around = ring.around(operator, row / 2);
                coarse_rows.restrict(operator, row / 2, around);
            }
        }
    }
    sum(&left)
}

/// All strips of the pass down.
fn run_down(
    operator: Operator,
    start: Start,
    [even, odd]: [&mut [f64]; 2],
    coarse: &mut Grid,
    (seams, left): (&[usize], &mut [Left]),
) {
    let (starts, coarse_starts) = (&operator.mask.starts, &coarse.mask.starts);
    let evens = RowSet::split(starts, Colour::Even, even, seams, false);
    let odds = RowSet::split(starts, Colour::Odd, odd, seams, true);
    let coarse_seams: Vec<usize> = seams.iter().map(|row| row / 2).collect();
    let [coarse_even, coarse_odd] = &mut coarse.rhs.colour;
    let coarse_evens = RowSet::split(
        coarse_starts,
        Colour::Even,
        coarse_even,
        &coarse_seams,
        false,
    );
    let coarse_odds = RowSet::split(coarse_starts, Colour::Odd, coarse_odd, &coarse_seams, false);
    let mut strips = Vec::with_capacity(seams.len() + 1);
    let (mut rest, mut first) = (left, 0);
    let ends = seams.iter().copied().chain([operator.mask.rows()]);
    let parts = evens
        .into_iter()
        .zip(odds)
        .zip(coarse_evens.into_iter().zip(coarse_odds));
    for (end, ((even, odd), (coarse_even, coarse_odd))) in ends.zip(parts) {
        let (own, tail) = rest.split_at_mut(end - first);
        strips.push(DownStrip {
            operator,
            rows: first..end,
            start,
            even,
            odd,
            coarse: CoarseRows {
                mask: &coarse.mask,
                rhs: [coarse_even, coarse_odd],
                natural: Vec::new(),
            },
            left: own,
        });
        (rest, first) = (tail, end);
    }
    in_parallel(&mut strips, DownStrip::run);
}

fn in_parallel<T: Send>(strips: &mut [T], run: impl Fn(&mut T) + Sync + Send) {
    if let [only] = strips {
        run(only);
    } else {
        strips.par_iter_mut().for_each(run);
    }
}

/// Residual of a grid as in [`super::Solved::residual`].
///
/// - `colours`: those that have one: after a sweep over the odd nodes only the even ones
pub(super) fn residual_of(grid: &Grid, colours: &[Colour]) -> f64 {
    let source = grid.source.of(&grid.rhs);
    let fields = [0, 1].map(|c| Row::new(&grid.phi.colour[c], 0));
    let of_rows = |rows: Range<usize>| {
        let mut residual = Vec::new();
        rows.flat_map(|row| colours.iter().map(move |&colour| (colour, row)))
            .map(|(colour, row)| {
                let (starts, c) = (&grid.mask.starts, colour as usize);
                let first = starts[row].node[c];
                residual.resize((starts[row + 1].node[c] - first) as usize, 0.0);
                let out = &mut residual[..];
                let phi = (fields[c], [fields[1 - c]; 3]);
                grid.stencil
                    .residual_row(&grid.mask, (colour, row), phi, source, out);
                Left::of(fields[c].from(first, out.len()), out)
            })
            .collect::<Vec<Left>>()
    };
    let mut ends = seams(&grid.mask);
    ends.push(grid.mask.rows());
    let firsts = std::iter::once(0).chain(ends.iter().copied());
    let mut strips: Vec<(Range<usize>, Vec<Left>)> = firsts
        .zip(&ends)
        .map(|(first, &end)| (first..end, Vec::new()))
        .collect();
    in_parallel(&mut strips, |strip| strip.1 = of_rows(strip.0.clone()));
    let left = strips.iter().flat_map(|strip| &strip.1);
    sum(left).root_mean_square() / f64::from(grid.mask.stride).powi(2)
}

/// One strip of the pass up.
struct UpStrip<'a> {
    operator: Operator<'a>,
    lifted: Lifted<'a>,
    rows: Range<usize>,
    even: RowSet<'a>,
    odd: RowSet<'a>,
}

/// Values of the coarser grid on their way up.
#[derive(Clone, Copy)]
struct Lifted<'a> {
    mask: &'a Mask,
    coarse: &'a [f64],
    lift: Lift,
}

impl Lifted<'_> {
    fn row(self, operator: Operator, row: usize, odd: &mut RowSet) {
        let target = odd.row_mut(row);
        match self.lift {
            Lift::Replace => guess_row(operator.mask, self.mask, self.coarse, row, target),
            Lift::Correct => {
                let first = operator.mask.starts[row].node[Colour::Odd as usize];
                operator
                    .transfer
                    .prolong_row(row, self.coarse, first, target);
            }
        }
    }
}

impl UpStrip<'_> {
    fn run(&mut self) {
        let (first, end) = (self.rows.start, self.rows.end);
        self.lift(first);
        for row in first..=end {
            self.lift(row + 1);
            let strip = (first..end, row);
            self.operator.sweep(strip, &mut self.even, &mut self.odd);
        }
    }

    fn lift(&mut self, row: usize) {
        if self.odd.owns(row) {
            self.lifted.row(self.operator, row, &mut self.odd);
        }
    }
}

/// Interpolates the values of the coarser grid to the odd nodes, and smooths.
pub(super) fn ascend(fine: &mut Grid, coarse: &mut Grid, transfer: &Transfer, lift: Lift) {
    coarse.phi.write_natural(&coarse.mask, &mut coarse.natural);
    let lifted = Lifted {
        mask: &coarse.mask,
        coarse: &coarse.natural,
        lift,
    };
    let operator = Operator {
        mask: &fine.mask,
        stencil: &fine.stencil,
        source: fine.source.of(&fine.rhs),
        transfer,
    };
    let starts = &fine.mask.starts;
    let seams = seams(&fine.mask);
    let [even, odd] = &mut fine.phi.colour;
    let mut whole = RowSet::whole(starts, Colour::Odd, odd);
    for &seam in &seams {
        lifted.row(operator, seam - 1, &mut whole);
        lifted.row(operator, seam, &mut whole);
    }
    let evens = RowSet::split(starts, Colour::Even, even, &seams, false);
    let odds = RowSet::split(starts, Colour::Odd, odd, &seams, true);
    let firsts = std::iter::once(0).chain(seams.iter().copied());
    let ends = seams.iter().copied().chain([fine.mask.rows()]);
    let mut strips: Vec<UpStrip> = firsts
        .zip(ends)
        .zip(evens.into_iter().zip(odds))
        .map(|((first, end), (even, odd))| UpStrip {
            operator,
            lifted,
            rows: first..end,
            even,
            odd,
        })
        .collect();
    in_parallel(&mut strips, UpStrip::run);
    drop(strips);
    let even = RowSet::whole(starts, Colour::Even, even);
    let mut odd = RowSet::whole(starts, Colour::Odd, odd);
    for &seam in &seams {
        for row in [seam - 1, seam] {
            operator.relax(Colour::Odd, row, &mut odd, &even);
        }
    }
}
