//! Nodal values row by row for a block of rows, and the blocks that are worked on at a time.
//!
//! The field is stored by colour; neighbours in a row, and the rows above and below, are wanted side by side.
//! Each block takes a copy of its rows and of those around it, which is small and stays near the processor.

use std::ops::Range;

use rayon::prelude::*;

use crate::grid::{Mask, PARALLEL_NODES, Run};
use crate::solve::Field;

/// Fluid nodes in a block, about. Sums are made block by block and then added in order, so that they do not
/// depend on the number of threads.
const BLOCK_NODES: usize = 16_384;
/// Rows in a block at least: the rows around it are copied as well.
const BLOCK_ROWS: i64 = 4;

/// Results of some work on each block of rows, in order of the rows.
///
/// - `first`: first row, at most 0; rows up to the last of the grid follow
/// - `work`: on some rows, with memory for [`RowValues`]
pub(super) fn by_blocks<T: Send>(
    mask: &Mask,
    first: i64,
    work: impl Fn(Range<i64>, &mut Vec<f64>) -> T + Send + Sync,
) -> Vec<T> {
    let mut blocks: Vec<Range<i64>> = Vec::new();
    let (mut from, mut nodes) = (first, 0);
    let rows = u32::try_from(mask.rows()).unwrap_or(u32::MAX);
    for row in 0..rows {
        let runs = mask.row(row).iter();
        nodes += runs.map(|run| run.len as usize).sum::<usize>();
        let end = i64::from(row) + 1;
        let is_full = nodes >= BLOCK_NODES && end - from >= BLOCK_ROWS;
        if is_full || row + 1 == rows {
            blocks.push(from..end);
            (from, nodes) = (end, 0);
        }
    }
    if mask.nodes() >= PARALLEL_NODES {
        let each = blocks.into_par_iter();
        each.map_init(Vec::new, |memory, rows| work(rows, memory))
            .collect()
    } else {
        let mut memory = Vec::new();
        let each = blocks.into_iter();
        each.map(|rows| work(rows, &mut memory)).collect()
    }
}

/// Values on the fluid nodes of some rows.
pub(super) struct RowValues<'a> {
    mask: &'a Mask,
    /// Row-by-row number of the first value.
    first: usize,
    values: &'a [f64],
}

impl<'a> RowValues<'a> {
    /// The rows of a range that the grid has.
    ///
    /// - `memory`: what it holds is overwritten
    pub(super) fn new(
        mask: &'a Mask,
        phi: &Field,
        rows: Range<i64>,
        memory: &'a mut Vec<f64>,
    ) -> Self {
        let start = |row: i64| {
            let row = usize::try_from(row).unwrap_or(0).min(mask.rows());
            mask.row_start.get(row).map_or(0, |&k| k as usize)
        };
        let runs = &mask.runs[start(rows.start)..start(rows.end)];
        let first = runs.first().map_or(0, |run| run.natural as usize);
        let count = runs.iter().map(|run| run.len as usize).sum();
        if memory.len() < count {
            memory.resize(count, 0.0);
        }
        let values = &mut memory[..count];
        for run in runs {
            let from = run.natural as usize - first;
            copy_run(&mut values[from..from + run.len as usize], run, phi);
        }
        Self {
            mask,
            first,
            values,
        }
    }

    fn run_at(&self, i: i64, j: i64) -> Option<&Run> {
        self.mask
            .run_at(u32::try_from(i).ok()?, u32::try_from(j).ok()?)
    }

    /// Values of `n` neighbouring fluid nodes of row `j` from column `i` on; `None` where one is not fluid or
    /// the wall lies between them.
    pub(super) fn line(&self, i: i64, j: i64, n: usize) -> Option<&[f64]> {
        let run = self.run_at(i, j)?;
        if usize::try_from(i64::from(run.end()) - i).ok()? < n {
            return None;
        }
        let number = run.natural as usize + (i - i64::from(run.first)) as usize;
        let from = number.checked_sub(self.first)?;
        self.values.get(from..from + n)
    }

    /// Value of node `(i, j)`, `None` outside the fluid.
    pub(super) fn at(&self, i: i64, j: i64) -> Option<f64> {
        self.line(i, j, 1)?.first().copied()
    }

    /// Values of neighbouring places of row `j` from column `i` on, `None` outside the fluid.
    pub(super) fn places<const N: usize>(&self, i: i64, j: i64) -> [Option<f64>; N] {
        if let Some(line) = self.line(i, j, N) {
            return std::array::from_fn(|k| line.get(k).copied());
        }
        let mut columns = i..;
        std::array::from_fn(|_| columns.next().and_then(|column| self.at(column, j)))
    }
}

/// The values of a run in order of its columns.
fn copy_run(values: &mut [f64], run: &Run, phi: &Field) {
    let half = |column: u32, n: u32| {
        let (colour, node) = run.node(column);
        let from = node as usize;
        phi.colour[colour as usize]
            .get(from..from + n as usize)
            .unwrap_or(&[])
    };
    let own = half(run.first, run.len.div_ceil(2));
    let other = if run.len > 1 {
        half(run.first + 1, run.len / 2)
    } else {
        &[]
    };
    let (pairs, rest) = values.as_chunks_mut();
    for ((pair, &a), &b) in pairs.iter_mut().zip(own).zip(other) {
        *pair = [a, b];
    }
    if let ([last], Some(&value)) = (rest, own.last()) {
        *last = value;
    }
}
