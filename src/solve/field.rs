//! One number for every fluid node of a grid, stored by colour.

use crate::grid::{Colour, Mask};

use super::row_set::Row;

/// Values on the fluid nodes of one grid; indices as in [`Mask`].
#[derive(Debug, Clone, PartialEq)]
pub struct Field {
    /// Values of the even and the odd nodes.
    pub colour: [Vec<f64>; 2],
}

impl Field {
    /// The same value on every node of a grid.
    pub fn constant(mask: &Mask, value: f64) -> Self {
        Self {
            colour: [vec![value; mask.count[0]], vec![value; mask.count[1]]],
        }
    }

    /// Value of node `(i, j)`, `None` outside the fluid.
    pub fn at(&self, mask: &Mask, i: u32, j: u32) -> Option<f64> {
        let (colour, node) = mask.node_at(i, j)?;
        self.colour[colour as usize].get(node as usize).copied()
    }

    /// One row of one colour; rows beyond the lattice are empty.
    pub(super) fn row(&self, mask: &Mask, colour: Colour, row: usize) -> Row<'_> {
        let c = colour as usize;
        let Some([at, next]) = row.checked_add(2).and_then(|end| mask.starts.get(row..end)) else {
            return Row::EMPTY;
        };
        let range = at.node[c] as usize..next.node[c] as usize;
        Row::new(&self.colour[c][range], at.node[c])
    }

    /// The rows of one colour below, at and above a row.
    pub(super) fn around(&self, mask: &Mask, colour: Colour, row: usize) -> [Row<'_>; 3] {
        [row.wrapping_sub(1), row, row + 1].map(|row| self.row(mask, colour, row))
    }

    /// A copy with every value multiplied.
    pub(crate) fn scaled(&self, factor: f64) -> Self {
        let times = |values: &Vec<f64>| values.iter().map(|v| factor * v).collect();
        let [even, odd] = &self.colour;
        Self {
            colour: [times(even), times(odd)],
        }
    }

    /// Adds `factor` times another field of the same grid.
    pub(crate) fn add_scaled(&mut self, factor: f64, other: &Self) {
        for (part, add) in self.colour.iter_mut().zip(&other.colour) {
            for (value, a) in part.iter_mut().zip(add) {
                *value += factor * a;
            }
        }
    }

    /// Sum of products with another field of the same grid.
    pub(crate) fn dot(&self, other: &Self) -> f64 {
        self.colour
            .iter()
            .zip(&other.colour)
            .map(|(a, b)| a.iter().zip(b).map(|(x, y)| x * y).sum::<f64>())
            .sum()
    }

    /// Row-by-row values, in the order of [`crate::grid::Run::natural`].
    pub fn natural(&self, mask: &Mask) -> Vec<f64> {
        let mut values = vec![0.0; mask.nodes()];
        self.write_natural(mask, &mut values);
        values
    }

    /// Writes the row-by-row values into a slice of matching length.
    pub(crate) fn write_natural(&self, mask: &Mask, values: &mut [f64]) {
        for run in &mask.runs {
            let from = run.natural as usize;
            let target = &mut values[from..from + run.len as usize];
            for (step, column) in [run.first, run.first + 1].into_iter().enumerate() {
                if column >= run.end() {
                    continue;
                }
                let (colour, node) = run.node(column);
                let source = &self.colour[colour as usize][node as usize..];
                for (value, &s) in target[step..].iter_mut().step_by(2).zip(source) {
                    *value = s;
                }
            }
        }
    }

    /// Reads row-by-row values.
    pub(crate) fn read_natural(&mut self, mask: &Mask, values: &[f64]) {
        for run in &mask.runs {
            let from = run.natural as usize;
            let source = &values[from..from + run.len as usize];
            for (step, column) in [run.first, run.first + 1].into_iter().enumerate() {
                if column >= run.end() {
                    continue;
                }
                let (colour, node) = run.node(column);
                let target = &mut self.colour[colour as usize][node as usize..];
                for (value, &s) in target.iter_mut().zip(source[step..].iter().step_by(2)) {
                    *value = s;
                }
            }
        }
    }
}
