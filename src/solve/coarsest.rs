//! Direct solution on the coarsest grid: banded LU after a bandwidth-reducing order.
//!
//! The matrix of the five-point scheme with unequal arms is an irreducibly diagonally dominant M-matrix
//! on every connected part, so elimination without pivoting is stable (a classical result for M-matrices;
//! common practice, no page looked up). Order: breadth first from a node of least degree, reversed
//! (E. Cuthill, J. `McKee` 1969, Reducing the bandwidth of sparse symmetric matrices, Proc. 24th ACM National
//! Conference, 157, doi:10.1145/800195.805928).

use sprs::CsMat;

/// A factorised coarsest operator.
#[derive(Debug, Clone)]
pub(crate) struct BandedLu {
    order: Vec<usize>,
    half_band: usize,
    /// Row `r` holds columns `r - half_band ..= r + half_band`.
    rows: Vec<f64>,
}

impl BandedLu {
    /// Order and half bandwidth that a matrix would get; cost of the factor is about `n * half_band^2`.
    pub(crate) fn plan(matrix: &CsMat<f64>) -> (Vec<usize>, usize) {
        let order = breadth_first_order(matrix);
        let mut place = vec![0; order.len()];
        for (position, &node) in order.iter().enumerate() {
            place[node] = position;
        }
        let half_band = matrix
            .iter()
            .map(|(_, (r, c))| place[r].abs_diff(place[c]))
            .max()
            .unwrap_or(0);
        (order, half_band)
    }

    pub(crate) fn new(matrix: &CsMat<f64>, order: Vec<usize>, half_band: usize) -> Self {
        let n = order.len();
        let width = 2 * half_band + 1;
        let mut place = vec![0; n];
        for (position, &node) in order.iter().enumerate() {
            place[node] = position;
        }
        let mut rows = vec![0.0; n * width];
        for (&value, (r, c)) in matrix {
            rows[place[r] * width + place[c] + half_band - place[r]] = value;
        }
        for pivot in 0..n {
            let last = (pivot + half_band).min(n - 1);
            let diagonal = rows[pivot * width + half_band];
            let (upper, lower) = rows.split_at_mut((pivot + 1) * width);
            let source = &upper[pivot * width + half_band + 1..][..last - pivot];
            for row in pivot + 1..=last {
                let start = (row - pivot - 1) * width + half_band - (row - pivot);
                let factor = lower[start] / diagonal;
                if factor != 0.0 {
                    lower[start] = factor;
                    for (target, s) in lower[start + 1..].iter_mut().zip(source) {
                        *target -= factor * s;
                    }
                }
            }
        }
        Self {
            order,
            half_band,
            rows,
        }
    }

    /// Solves for a right side in the matrix's own order, in place.
    pub(crate) fn solve(&self, values: &mut [f64]) {
        let n = self.order.len();
        let (band, width) = (self.half_band, 2 * self.half_band + 1);
        let mut x: Vec<f64> = self.order.iter().map(|&node| values[node]).collect();
        for row in 0..n {
            let first = row.saturating_sub(band);
            let factors = &self.rows[row * width + first + band - row..][..row - first];
            let sum: f64 = factors.iter().zip(&x[first..row]).map(|(f, v)| f * v).sum();
            x[row] -= sum;
        }
        for row in (0..n).rev() {
            let last = (row + band).min(n - 1);
            let above = &self.rows[row * width + band + 1..][..last - row];
            let sum: f64 = above.iter().zip(&x[row + 1..]).map(|(f, v)| f * v).sum();
            x[row] = (x[row] - sum) / self.rows[row * width + band];
        }
        for (&node, value) in self.order.iter().zip(x) {
            values[node] = value;
        }
    }
}

/// Reversed breadth-first order over all connected parts.
fn breadth_first_order(matrix: &CsMat<f64>) -> Vec<usize> {
    let n = matrix.rows();
    let degree = |node: usize| matrix.outer_view(node).map_or(0, |row| row.nnz());
    let mut starts: Vec<usize> = (0..n).collect();
    starts.sort_by_key(|&node| degree(node));
    let mut seen = vec![false; n];
    let mut order = Vec::with_capacity(n);
    for start in starts {
        if seen[start] {
            continue;
        }
        seen[start] = true;
        let mut next = order.len();
        order.push(start);
        while next < order.len() {
            let Some(row) = matrix.outer_view(order[next]) else {
                break;
            };
            next += 1;
            for (node, _) in row.iter() {
                if !seen[node] {
                    seen[node] = true;
                    order.push(node);
                }
            }
        }
    }
    order.reverse();
    order
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::geometry::Outline;
    use crate::grid::{Lattice, LineCrossings, Mask};
    use crate::solve::poisson_matrix;

    #[test]
    fn the_banded_factor_agrees_with_a_dense_one() {
        let slanted = Outline::single(vec![[0.0, 0.0], [9.3, 1.7], [8.1, 7.9], [2.2, 6.4]]);
        let lattice = Lattice::new(&slanted, 1.0, [0.3, 0.6]);
        let (rows, columns) = (
            LineCrossings::rows(&lattice),
            LineCrossings::columns(&lattice),
        );
        let mask = Mask::new(&lattice, &rows, &columns, 1);
        let matrix = poisson_matrix(&mask);
        let n = mask.nodes();
        assert!(n > 30);
        let mut dense = nalgebra::DMatrix::<f64>::zeros(n, n);
        for (&value, (r, c)) in &matrix {
            dense[(r, c)] = value;
        }
        let rhs = nalgebra::DVector::from_fn(n, |r, _| 1.0 + (r as f64).sin());
        let exact = dense.lu().solve(&rhs).unwrap();
        let (order, band) = BandedLu::plan(&matrix);
        let mut x = rhs.as_slice().to_vec();
        BandedLu::new(&matrix, order, band).solve(&mut x);
        for (a, b) in x.iter().zip(exact.iter()) {
            assert!((a - b).abs() < 1e-12 * exact.amax());
        }
    }
}
