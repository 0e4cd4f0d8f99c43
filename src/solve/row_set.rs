//! Rows of one colour, as passes over a grid see them.
//!
//! A pass that does several things to each row keeps the rows it works on in cache. To run it on several
//! threads, the rows are cut into strips of neighbouring rows. Each strip owns its even rows and its odd rows
//! but the first and the last: those two, on the two sides of a seam, would need even rows of both strips, so
//! they rest until all strips are done, and until then every strip may read them.

use std::ops::Range;

use crate::grid::{Colour, RowStart};

/// Values of one row or more to read, and the storage index of the first.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Row<'a> {
    values: &'a [f64],
    first: usize,
}

impl<'a> Row<'a> {
    /// A row without nodes, beyond the lattice.
    pub(crate) const EMPTY: Row<'static> = Row {
        values: &[],
        first: 0,
    };

    #[inline]
    pub(crate) fn new(values: &'a [f64], first: u32) -> Self {
        Self {
            values,
            first: first as usize,
        }
    }

    /// `len` values from a storage index on; they must be there.
    #[inline]
    pub(crate) fn from(self, index: u32, len: usize) -> &'a [f64] {
        &self.values[index as usize - self.first..][..len]
    }

    /// One value, zero where there is no such node.
    #[inline]
    pub(crate) fn at(self, index: u32) -> f64 {
        let offset = (index as usize).wrapping_sub(self.first);
        self.values.get(offset).copied().unwrap_or(0.0)
    }
}

/// Consecutive rows of one colour that a strip may write, and the rows at its seams that it may read.
#[derive(Debug)]
pub(crate) struct RowSet<'a> {
    starts: &'a [RowStart],
    colour: Colour,
    owned: Range<usize>,
    values: &'a mut [f64],
    /// Storage index of the first of them.
    first: usize,
    seams: Vec<(usize, Row<'a>)>,
}

impl<'a> RowSet<'a> {
    /// All rows of a grid.
    pub(crate) fn whole(starts: &'a [RowStart], colour: Colour, values: &'a mut [f64]) -> Self {
        Self {
            starts,
            colour,
            owned: 0..starts.len() - 1,
            values,
            first: 0,
            seams: Vec::new(),
        }
    }

    /// Cuts all rows into strips at the given rows.
    ///
    /// - `seams`: first rows of the second and all further strips, at least four rows apart from each other
    ///   and from the ends
    /// - `resting`: whether the rows on both sides of a seam belong to nobody
    pub(crate) fn split(
        starts: &'a [RowStart],
        colour: Colour,
        values: &'a mut [f64],
        seams: &[usize],
        resting: bool,
    ) -> Vec<Self> {
        let node = |row: usize| starts[row].node[colour as usize];
        let rest = usize::from(resting);
        let mut strips: Vec<Self> = Vec::with_capacity(seams.len() + 1);
        let (mut left, mut first) = (values, 0);
        let mut before: Vec<(usize, Row)> = Vec::new();
        for &seam in seams {
            let owned = first..seam - rest;
            let (own, tail) = left.split_at_mut((node(owned.end) - node(owned.start)) as usize);
            let (at_seam, tail) = tail.split_at_mut((node(seam + rest) - node(owned.end)) as usize);
            let at_seam = &*at_seam;
            let (low, high) = at_seam.split_at((node(seam) - node(owned.end)) as usize);
            let mut here = Vec::new();
            if resting {
                here.push((seam - 1, Row::new(low, node(seam - 1))));
                here.push((seam, Row::new(high, node(seam))));
            }
            let mut around = before;
            around.extend(here.iter().copied());
            strips.push(Self {
                starts,
                colour,
                first: node(owned.start) as usize,
                owned,
                values: own,
                seams: around,
            });
            (left, first, before) = (tail, seam + rest, here);
        }
        strips.push(Self {
            starts,
            colour,
            owned: first..starts.len() - 1,
            values: left,
            first: node(first) as usize,
            seams: before,
        });
        strips
    }

    /// Whether the strip may write a row.
    #[inline]
    pub(crate) fn owns(&self, row: usize) -> bool {
        self.owned.contains(&row)
    }

    #[inline]
    fn node(&self, row: usize) -> usize {
        self.starts[row].node[self.colour as usize] as usize
    }

    /// All rows that the strip may write, to read.
    #[inline]
    pub(crate) fn owned(&self) -> Row<'_> {
        Row {
            values: self.values,
            first: self.first,
        }
    }

    /// All rows that the strip may write, and the storage index of their first value.
    #[inline]
    pub(crate) fn owned_mut(&mut self) -> (&mut [f64], usize) {
        (self.values, self.first)
    }

    /// Values that hold a row; none for rows beyond the lattice.
    fn row(&self, row: usize) -> Row<'_> {
        if self.owns(row) {
            return self.owned();
        }
        let seam = self.seams.iter().find(|(at, _)| *at == row);
        seam.map_or(Row::EMPTY, |(_, row)| *row)
    }

    /// Values that hold the rows below, at and above a row.
    #[inline]
    pub(crate) fn around(&self, row: usize) -> [Row<'_>; 3] {
        if self.seams.is_empty() || (self.owned.start < row && row + 1 < self.owned.end) {
            return [self.owned(); 3];
        }
        [
            self.row(row.wrapping_sub(1)),
            self.row(row),
            self.row(row + 1),
        ]
    }

    /// One row to write.
    #[inline]
    pub(crate) fn row_mut(&mut self, row: usize) -> &mut [f64] {
        let (from, to) = (self.node(row), self.node(row + 1));
        &mut self.values[from - self.first..to - self.first]
    }
}
