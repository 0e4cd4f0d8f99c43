//! Two values between which the conductance of the outline as given lies, whatever the solver did.
//!
//! *Above* (complementary energy; W. Prager, J. L. Synge 1947, Quart. Appl. Math. 5, 241): every square
//! integrable field `s` with `div s = -1` in the section obeys `K <= integral of abs(s)^2`. Proof: with the
//! exact `phi`, `integral of s . grad(phi) = integral of phi = K` because `phi` vanishes on the wall, and
//! `K = integral of abs(grad phi)^2`; so `0 <= integral of abs(s - grad phi)^2 = integral of abs(s)^2 - K`.
//! Nothing is asked of `s` at the wall, and nothing of the solver. See `upper_bound`.
//!
//! *Below* (Ritz): every `v` with square integrable gradient that vanishes on the wall obeys
//! `K >= (integral of v)^2 / integral of abs(grad v)^2`. Proof: `integral of v = integral of
//! grad(phi) . grad(v)`, then the inequality of Cauchy and Schwarz. See `lower_bound`.
//!
//! *Why the fields qualify.* `s` is given cell by cell; its divergence is exactly -1 inside each, and the normal
//! component is the same from both cells at every part of a side that is fluid, which together is `div s = -1` in
//! the section. Where a thin wall cuts a cell, each part has values of its own. `v` is continuous (linear or a
//! parabola between the same values from both squares along every side), zero at every point of the wall, and
//! zero outside. That the fields are good near the wall makes the range narrow; it is not needed for it to hold.
//!
//! Both are post-processing of the nodal values and cost one pass over the nodes, in blocks of rows that are
//! shared out over threads on large grids and added up in order. The outline is cut exactly; that the pieces
//! make up the section is checked, and so are the divergence of `s` in every piece at the wall, the agreement
//! of `v` along every side, and the order of the two values: a bound that is not checked is none. Rounding:
//! the integrals are sums of up to 1e8 terms of one sign, added in groups, rows and blocks (relative error below
//! 1e-12 in the worst order), and divergences off by 1e-10 of the largest side value change `K` by less than
//! 1e-10 of itself per cell they occur in; the bounds are widened by `ROUNDING`, far below any gap that a grid
//! can reach. The outline counts as given in double precision; crossings with grid lines are rounded once, by
//! parts in 1e16 of the coordinates.

mod cell_energy;
mod cell_sides;
mod cut_polygon;
mod elimination;
mod interior;
mod lower_bound;
mod near_wall;
mod nodal_flux;
mod numbering;
mod row_values;
mod square_energy;
mod triangulation;
mod upper_bound;

use crate::grid::{Lattice, Mask, PARALLEL_NODES};
use crate::solve::Field;

/// Relative amount by which bounds are widened for rounding: sums of up to 1e8 terms of one sign, added in groups.
const ROUNDING: f64 = 1e-11;

/// Nodes whose bounds take about as long as one edge of the outline, counted low.
const EDGE_IN_NODES: usize = 10;

/// Why there is no bound.
#[derive(Debug, Clone, Copy, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ProofError {
    /// The outline could not be cut into pieces that make up the section.
    #[error("the outline could not be cut into cells (area of the pieces off by {relative:.1e})")]
    Cutting {
        /// Relative difference of the areas.
        relative: f64,
    },
    /// A small island takes up flux that its cell cannot account for.
    #[error("an island lies between the grid lines, so that the flux cannot be balanced around it")]
    Unbalanced {
        /// Largest divergence left, relative to what it must be.
        divergence: f64,
    },
    /// Two squares beside each other disagree on the velocity along their common side.
    #[error("the velocity of the lower bound is not continuous across a grid line")]
    Discontinuous,
    /// The lower bound came out above the upper one, so one of them is wrong.
    #[error("the bounds contradict each other ({low:.6e} and {high:.6e})")]
    Contradiction {
        /// Lower bound.
        low: f64,
        /// Upper bound.
        high: f64,
    },
}

/// Two proven values with the conductance of the outline between them.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Bracket {
    /// Proven lower bound.
    pub low: f64,
    /// Proven upper bound.
    pub high: f64,
}

impl Bracket {
    /// Width against the middle.
    pub fn relative_width(&self) -> f64 {
        2.0 * (self.high - self.low) / (self.high + self.low)
    }

    /// Both bounds times a positive factor.
    #[must_use]
    pub fn scaled(&self, factor: f64) -> Self {
        Self {
            low: self.low * factor,
            high: self.high * factor,
        }
    }
}

/// Whether bounds on this grid take long enough for a second thread.
pub(crate) fn is_long(lattice: &Lattice, mask: &Mask) -> bool {
    mask.nodes() + EDGE_IN_NODES * lattice.edges.len() >= PARALLEL_NODES
}

/// The bracket for nodal values `phi`, in units of the lattice spacing to the fourth power.
///
/// It holds for any nodal values; good ones make it narrow.
///
/// # Errors
/// [`ProofError`] when the outline could not be cut, or the flux not be balanced, exactly enough.
pub fn bracket(lattice: &Lattice, mask: &Mask, phi: &Field) -> Result<Bracket, ProofError> {
    let low = || lower_bound::lower_bound(lattice, mask, phi);
    let high = || upper_bound::upper_bound(lattice, mask, phi);
    let (low, high) = if is_long(lattice, mask) {
        rayon::join(low, high)
    } else {
        (low(), high())
    };
    let (low, high) = (low?, high?);
    if low <= high {
        Ok(Bracket { low, high })
    } else {
        Err(ProofError::Contradiction { low, high })
    }
}
