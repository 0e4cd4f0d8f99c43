//! Where the outline crosses the lattice lines.
//!
//! Each outline edge is visited once per axis; cost is the number of edges plus the number of crossings.
//! An edge meets the line at `c` when `min <= c < max` of its two ends, the same rule for rows and
//! columns, so a vertex on a line is counted once and the crossings of a line come in pairs.

use super::lattice::Lattice;

/// One crossing of the outline with a lattice line.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Crossing {
    /// Position along the line, lattice units.
    pub at: f64,
    /// Index of the outline edge in [`Lattice::edges`].
    pub edge: u32,
}

/// Crossings of all parallel lattice lines of one axis, sorted along each line.
#[derive(Debug, Clone)]
pub struct LineCrossings {
    starts: Vec<usize>,
    items: Vec<Crossing>,
}

impl LineCrossings {
    /// Crossings with the horizontal lines `y = 0, 1, ...`; positions are x.
    pub fn rows(lattice: &Lattice) -> Self {
        Self::collect(lattice, 1, lattice.rows)
    }

    /// Crossings with the vertical lines `x = 0, 1, ...`; positions are y.
    pub fn columns(lattice: &Lattice) -> Self {
        Self::collect(lattice, 0, lattice.columns)
    }

    /// Number of lines.
    pub fn lines(&self) -> usize {
        self.starts.len() - 1
    }

    /// Number of crossings of all lines.
    pub(super) fn count(&self) -> usize {
        self.items.len()
    }

    /// Crossings of one line in rising order.
    pub fn line(&self, index: usize) -> &[Crossing] {
        &self.items[self.starts[index]..self.starts[index + 1]]
    }

    fn collect(lattice: &Lattice, across: usize, lines: usize) -> Self {
        let mut starts = vec![0_usize; lines + 1];
        for edge in &lattice.edges {
            for line in span(edge.start[across], edge.end[across], lines) {
                starts[line + 1] += 1;
            }
        }
        for line in 0..lines {
            starts[line + 1] += starts[line];
        }
        let mut next = starts.clone();
        let empty = Crossing { at: 0.0, edge: 0 };
        let mut items = vec![empty; starts[lines]];
        for (index, edge) in lattice.edges.iter().enumerate() {
            let (from, to) = (edge.start, edge.end);
            let met = span(from[across], to[across], lines);
            if met.is_empty() {
                // As most edges of outlines with many vertices.
                continue;
            }
            let slope = (to[1 - across] - from[1 - across]) / (to[across] - from[across]);
            let (low, high) = (
                from[1 - across].min(to[1 - across]),
                from[1 - across].max(to[1 - across]),
            );
            for line in met {
                items[next[line]] = Crossing {
                    // Clamped: on a nearly parallel edge rounding must not leave the edge.
                    at: (from[1 - across] + (line as f64 - from[across]) * slope).clamp(low, high),
                    edge: index as u32,
                };
                next[line] += 1;
            }
        }
        for line in 0..lines {
            items[starts[line]..starts[line + 1]]
                .sort_unstable_by(|a, b| a.at.total_cmp(&b.at).then(a.edge.cmp(&b.edge)));
        }
        Self { starts, items }
    }
}

/// Lines `c` with `min(a, b) <= c < max(a, b)`, clipped to `0..lines`.
fn span(a: f64, b: f64, lines: usize) -> std::ops::Range<usize> {
    let (a, b) = (line_from(a), line_from(b));
    a.min(b).min(lines)..a.max(b).min(lines)
}

/// The first line not below a place.
fn line_from(at: f64) -> usize {
    let whole = at as i64;
    whole
        .saturating_add(i64::from((whole as f64) < at))
        .max(0)
        .unsigned_abs() as usize
}

/// The largest whole number not above a place in the lattice. `f64::floor` is a call into a library on processors
/// that every x86-64 program must reckon with, which shows where it is made for every vertex.
pub(super) fn rounded_down(at: f64) -> f64 {
    let whole = at as i64 as f64;
    if whole > at { whole - 1.0 } else { whole }
}

/// The least whole number not below a place in the lattice.
pub(super) fn rounded_up(at: f64) -> f64 {
    let whole = at as i64 as f64;
    if whole < at { whole + 1.0 } else { whole }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Outline;

    #[test]
    fn rounding_agrees_with_that_of_the_library() {
        for at in [
            0.0,
            0.25,
            1.0,
            1.5,
            3.999_999_999,
            -1e-9,
            -0.5,
            -2.0,
            -2.5,
            1e9 + 0.5,
        ] {
            assert!((rounded_down(at) - at.floor()).abs() <= 0.0, "{at}");
            assert!((rounded_up(at) - at.ceil()).abs() <= 0.0, "{at}");
        }
    }

    #[test]
    fn crossings_of_a_diamond_come_in_pairs_and_in_place() {
        let diamond = Outline::single(vec![[2.0, 0.0], [4.0, 2.0], [2.0, 4.0], [0.0, 2.0]]);
        let lattice = Lattice::new(&diamond, 1.0, [0.0, 0.0]);
        let rows = LineCrossings::rows(&lattice);
        let at: Vec<f64> = rows.line(1).iter().map(|c| c.at).collect();
        assert_eq!(at, [1.0, 3.0]);
        assert!((0..rows.lines()).all(|line| rows.line(line).len().is_multiple_of(2)));
    }
}
