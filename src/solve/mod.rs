//! Multigrid solution of `-lap(phi) = 1` with `phi = 0` on the wall of a masked grid.
//!
//! Lattice units inside: the spacing of the finest grid is one, so `phi` comes out in units of the
//! spacing squared. The wall stencil is the unequal-arm one of Shortley and Weller (1938), second order in
//! the maximum norm together with the gradient at the wall. Knows nothing of channels.
//!
//! # Source
//! G. H. Shortley, R. Weller (1938), The numerical solution of Laplace's equation, J. Appl. Phys. 9, 334,
//! doi:10.1063/1.1710426. A. Brandt (1977), Multi-level adaptive solutions to boundary-value problems,
//! Math. Comp. 31, 333, doi:10.1090/S0025-5718-1977-0431719-X (nested iteration, V-cycles).

mod assembled;
mod coarsest;
mod cycle;
mod field;
mod first_guess;
mod hierarchy;
mod krylov;
mod passes;
mod row_set;
mod stencil;
mod transfer;

pub use assembled::{natural_order, poisson_matrix};
pub use cycle::{SolveControl, Solved};
pub use field::Field;
pub use hierarchy::{Grid, Hierarchy};
pub(crate) use stencil::weights;
