//! Contour lines of a lattice by marching squares, joined to polylines.
//!
//! Method: each cell with corners on both sides of the level gets one segment, or two at a saddle, where
//! the mean of the corners decides which corners are joined. Positions are in lattice units, `[i, j]`.

use std::collections::BTreeMap;

use crate::geometry::Point;

/// A polyline; closed when its first and last point agree.
pub(crate) type Polyline = Vec<Point>;

/// A grid edge: 2 times the node index, plus 1 for the edge going up from it.
type EdgeId = usize;

/// A lattice of values, row by row.
#[derive(Debug, Clone, Copy)]
pub(crate) struct Lattice<'a> {
    /// Values, `values[j * columns + i]`.
    pub(crate) values: &'a [f64],
    /// Nodes along x.
    pub(crate) columns: usize,
    /// Nodes along y.
    pub(crate) rows: usize,
}

impl Lattice<'_> {
    /// The value of a node; zero outside.
    pub(crate) fn at(&self, i: usize, j: usize) -> f64 {
        if i >= self.columns {
            return 0.0;
        }
        self.values
            .get(j * self.columns + i)
            .copied()
            .unwrap_or(0.0)
    }

    /// Bilinear value at a position in lattice units; outside, the nearest point of the lattice counts.
    pub(crate) fn bilinear(&self, x: f64, y: f64) -> f64 {
        let cell = |v: f64, nodes: usize| {
            let v = v.clamp(0.0, nodes.saturating_sub(1) as f64);
            let low = (v.floor() as usize).min(nodes.saturating_sub(2));
            (low, v - low as f64)
        };
        let (i, s) = cell(x, self.columns);
        let (j, t) = cell(y, self.rows);
        let low = self.at(i, j) * (1.0 - s) + self.at(i + 1, j) * s;
        let high = self.at(i, j + 1) * (1.0 - s) + self.at(i + 1, j + 1) * s;
        low * (1.0 - t) + high * t
    }
}

/// The contour lines at `level`.
pub(crate) fn contour(lattice: &Lattice<'_>, level: f64) -> Vec<Polyline> {
    let mut segments: Vec<[EdgeId; 2]> = Vec::new();
    for j in 0..lattice.rows.saturating_sub(1) {
        for i in 0..lattice.columns.saturating_sub(1) {
            segments.extend(cell_segments(lattice, i, j, level).into_iter().flatten());
        }
    }
    join(&segments)
        .into_iter()
        .map(|line| {
            line.into_iter()
                .map(|e| crossing(lattice, e, level))
                .collect()
        })
        .collect()
}

/// Up to two segments of a cell, each a pair of crossed edges.
fn cell_segments(
    lattice: &Lattice<'_>,
    i: usize,
    j: usize,
    level: f64,
) -> [Option<[EdgeId; 2]>; 2] {
    let corners = [(i, j), (i + 1, j), (i + 1, j + 1), (i, j + 1)].map(|(a, b)| lattice.at(a, b));
    let above = corners.map(|v| v > level);
    let node = j * lattice.columns + i;
    // Bottom, right, top, left.
    let edges = [
        2 * node,
        2 * (node + 1) + 1,
        2 * (node + lattice.columns),
        2 * node + 1,
    ];
    let [b, r, t, l] = edges;
    let [p, q, s, u] = above;
    if p == s && q == u && p != q {
        let middle = corners.iter().sum::<f64>() / 4.0 > level;
        // With the middle on the side of p the corners q and u are cut off, else p and s.
        return if middle == p {
            [Some([b, r]), Some([t, l])]
        } else {
            [Some([b, l]), Some([r, t])]
        };
    }
    let mut crossed = [(p != q, b), (q != s, r), (s != u, t), (u != p, l)]
        .into_iter()
        .filter_map(|(cut, edge)| cut.then_some(edge));
    match (crossed.next(), crossed.next()) {
        (Some(first), Some(second)) => [Some([first, second]), None],
        _ => [None, None],
    }
}

/// Where the level crosses an edge, in lattice units.
fn crossing(lattice: &Lattice<'_>, edge: EdgeId, level: f64) -> Point {
    let (node, up) = (edge / 2, edge % 2 == 1);
    let (i, j) = (node % lattice.columns, node / lattice.columns);
    let (di, dj) = if up { (0, 1) } else { (1, 0) };
    let (a, b) = (lattice.at(i, j), lattice.at(i + di, j + dj));
    let share = ((level - a) / (b - a)).clamp(0.0, 1.0);
    [i as f64 + share * di as f64, j as f64 + share * dj as f64]
}

/// Segments joined end to end: open lines first, then the closed ones.
fn join(segments: &[[EdgeId; 2]]) -> Vec<Vec<EdgeId>> {
    let mut at_edge: BTreeMap<EdgeId, Vec<usize>> = BTreeMap::new();
    for (s, ends) in segments.iter().enumerate() {
        for &end in ends {
            at_edge.entry(end).or_default().push(s);
        }
    }
    let mut used = vec![false; segments.len()];
    let ends = at_edge
        .iter()
        .filter(|(_, s)| s.len() == 1)
        .map(|(&e, _)| e);
    let starts: Vec<EdgeId> = ends.chain(segments.iter().map(|s| s[0])).collect();
    let mut lines = Vec::new();
    for start in starts {
        let line = follow(start, segments, &at_edge, &mut used);
        if line.len() > 1 {
            lines.push(line);
        }
    }
    lines
}

/// Walks from an edge over unused segments until there is none.
fn follow(
    start: EdgeId,
    segments: &[[EdgeId; 2]],
    at_edge: &BTreeMap<EdgeId, Vec<usize>>,
    used: &mut [bool],
) -> Vec<EdgeId> {
    let mut line = vec![start];
    let mut here = start;
    while let Some(&next) = at_edge
        .get(&here)
        .and_then(|list| list.iter().find(|&&s| used.get(s) == Some(&false)))
    {
        if let Some(flag) = used.get_mut(next) {
            *flag = true;
        }
        let Some(&[a, b]) = segments.get(next) else {
            break;
        };
        here = if a == here { b } else { a };
        line.push(here);
    }
    line
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_contour_of_a_paraboloid_is_one_closed_circle() {
        let n = 41;
        let c = 20.0;
        let values: Vec<f64> = (0..n * n)
            .map(|k| {
                let (x, y) = ((k % n) as f64 - c, (k / n) as f64 - c);
                400.0 - x * x - y * y
            })
            .collect();
        let lattice = Lattice {
            values: &values,
            columns: n,
            rows: n,
        };
        let lines = contour(&lattice, 300.0);
        assert_eq!(lines.len(), 1);
        assert_eq!(lines[0].first(), lines[0].last());
        for p in &lines[0] {
            let r = (p[0] - c).hypot(p[1] - c);
            // Linear interpolation over a unit edge is off by at most 2/8 (second derivative -2), the slope is 20.
            assert!((r - 10.0).abs() < 0.25 / 20.0 * 1.02, "{r}");
        }
        assert!((lattice.bilinear(20.0, 25.0) - 375.0).abs() < 1e-12);
        assert!((lattice.bilinear(20.5, 20.0) - 399.5).abs() < 1e-12);
    }

    #[test]
    fn a_saddle_gives_two_lines_that_do_not_cross_and_an_open_contour_ends_at_the_border() {
        let values = [1.0, 0.0, 0.0, 1.0];
        let lattice = Lattice {
            values: &values,
            columns: 2,
            rows: 2,
        };
        let low = contour(&lattice, 0.4);
        assert_eq!(low.len(), 2);
        // The middle (0.5) is above, so each line cuts off one of the low corners (1, 0) and (0, 1).
        for line in &low {
            let side = line.iter().map(|p| p[0] - p[1]).sum::<f64>();
            let extent = line.iter().map(|p| (p[0] - p[1]).abs()).fold(0.0, f64::max);
            assert!(side.abs() > 1.0 && extent <= 1.0, "{line:?}");
        }
    }
}
