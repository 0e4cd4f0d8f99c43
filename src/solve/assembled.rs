//! The same operator as a sparse matrix: for the coarsest grid and for cross-checks.

use sprs::{CsMat, TriMat};

use crate::grid::{ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, NO_NODE};

use super::stencil::weights;

/// Row-by-row index of every node of each colour, by storage index.
pub fn natural_order(mask: &Mask) -> [Vec<u32>; 2] {
    let mut order = [vec![0; mask.count[0]], vec![0; mask.count[1]]];
    for run in &mask.runs {
        for i in run.first..run.end() {
            let (colour, node) = run.node(i);
            order[colour as usize][node as usize] = run.natural + i - run.first;
        }
    }
    order
}

/// The operator `A` of a grid, `A phi = b`, scaled by the grid's spacing squared; rows and columns in
/// row-by-row node order ([`crate::grid::Run::natural`]).
///
/// # Examples
/// ```
/// use etchwise::{geometry::Outline, grid::{Lattice, LineCrossings, Mask}, solve::poisson_matrix};
/// let unit = Outline::single(vec![[0.0, 0.0], [1.0, 0.0], [1.0, 1.0], [0.0, 1.0]]);
/// let lattice = Lattice::new(&unit, 0.5, [0.0, 0.0]);
/// let (rows, columns) = (LineCrossings::rows(&lattice), LineCrossings::columns(&lattice));
/// let mask = Mask::new(&lattice, &rows, &columns, 1);
/// assert_eq!(poisson_matrix(&mask).get(0, 0), Some(&4.0));
/// ```
pub fn poisson_matrix(mask: &Mask) -> CsMat<f64> {
    let n = mask.nodes();
    let order = natural_order(mask);
    let mut triplets = TriMat::with_capacity((n, n), 5 * n);
    for colour in [Colour::Even, Colour::Odd] {
        let (own, other) = (&order[colour as usize], &order[colour.other() as usize]);
        let mut add = |node: u32, neighbour: [u32; 4], weight: [f64; 4], diagonal: f64| {
            let row = own[node as usize] as usize;
            triplets.add_triplet(row, row, diagonal);
            for arm in [ARM_LEFT, ARM_RIGHT, ARM_DOWN, ARM_UP] {
                if neighbour[arm] != NO_NODE {
                    let column = other[neighbour[arm] as usize] as usize;
                    triplets.add_triplet(row, column, -weight[arm]);
                }
            }
        };
        for s in &mask.segments[colour as usize] {
            for k in 0..s.len {
                let neighbour = [s.left + k, s.left + k + 1, s.down + k, s.up + k];
                add(s.start + k, neighbour, [1.0; 4], 4.0);
            }
        }
        for w in &mask.wall[colour as usize] {
            let (weight, diagonal) = weights(w);
            add(w.node, w.neighbour, weight, diagonal);
        }
    }
    triplets.to_csr()
}
