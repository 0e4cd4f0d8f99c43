//! Exact share of each lattice cell that is fluid.
//!
//! Every piece of outline inside a row of cells adds the area to its right, cell by cell, and a running
//! sum along the row turns that into coverage (Green's theorem, cell by cell). Cost: pieces of outline per
//! cell plus one pass over the cells.

use super::lattice::WallEdge;

/// Fluid share of the cells of a lattice, row by row from the bottom.
///
/// - `edges`: closed loops in units of the cell size, fluid on the left
/// - `columns`, `rows`: cells `(c, r)` cover `c..c+1` by `r..r+1`; all edges must lie inside
pub(crate) fn coverage(
    edges: impl Iterator<Item = WallEdge>,
    columns: usize,
    rows: usize,
) -> Vec<f64> {
    // One spare column takes what lies right of the last cell.
    let width = columns + 1;
    let mut share = vec![0.0; width * rows];
    for edge in edges {
        add_edge(&mut share, width, rows, edge);
    }
    let mut cells = Vec::with_capacity(columns * rows);
    for row in share.chunks_exact(width) {
        let mut sum = 0.0;
        cells.extend(row[..columns].iter().map(|step| {
            sum += step;
            sum.clamp(0.0, 1.0)
        }));
    }
    cells
}

fn add_edge(share: &mut [f64], width: usize, rows: usize, edge: WallEdge) {
    let (a, b) = (edge.start, edge.end);
    let rise = b[1] - a[1];
    let (low, high) = (a[1].min(b[1]), a[1].max(b[1]));
    if low.total_cmp(&high).is_eq() {
        return;
    }
    let x_at = |y: f64| a[0] + (y - a[1]) * ((b[0] - a[0]) / rise);
    let last_row = (high.ceil() as usize).min(rows);
    for row in low.max(0.0) as usize..last_row {
        let (from, to) = (low.max(row as f64), high.min(row as f64 + 1.0));
        if from < to {
            let cells = &mut share[row * width..(row + 1) * width];
            let signed = -rise.signum() * (to - from);
            add_piece(cells, x_at(from), x_at(to), signed);
        }
    }
}

/// One piece inside a row: `height` with sign, from `x0` to `x1`.
fn add_piece(cells: &mut [f64], x0: f64, x1: f64, height: f64) {
    let limit = cells.len() as f64 - 1.0;
    let (left, right) = (x0.min(x1).clamp(0.0, limit), x0.max(x1).clamp(0.0, limit));
    let mut from = left;
    let mut column = left as usize;
    loop {
        let to = right.min(column as f64 + 1.0);
        let part = if right > left {
            height * (to - from) / (right - left)
        } else {
            height
        };
        let inside = column as f64 + 1.0 - 0.5 * (from + to);
        if let Some(cell) = cells.get_mut(column) {
            *cell += part * inside;
        }
        if let Some(next) = cells.get_mut(column + 1) {
            *next += part * (1.0 - inside);
        }
        if to >= right {
            return;
        }
        from = to;
        column += 1;
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_triangle_covers_its_cells_exactly() {
        let p = [[0.0, 0.0], [2.0, 0.0], [0.0, 2.0]];
        let edges = (0..3).map(|k| WallEdge {
            start: p[k],
            end: p[(k + 1) % 3],
            loop_index: 0,
        });
        let cells = coverage(edges, 3, 2);
        let expected = [1.0, 0.5, 0.0, 0.5, 0.0, 0.0];
        for (cell, exact) in cells.iter().zip(expected) {
            assert!((cell - exact).abs() < 1e-14, "{cells:?}");
        }
    }
}
