//! The grids of the multigrid hierarchy, finest first.
//!
//! The geometry is looked at afresh on every grid through the same crossings. Coarsening goes on until a
//! direct solution is cheap, whatever has become of thin slots by then: a slot too narrow for a coarse node
//! is at most two cells wide one grid finer, where relaxation alone reduces its error quickly, and an
//! island that no coarse line meets is pinned to one wall node. What still converges slowly is left to the
//! Krylov acceleration.

use crate::grid::{Lattice, LineCrossings, Mask};

use super::assembled::poisson_matrix;
use super::coarsest::BandedLu;
use super::field::Field;
use super::stencil::{Source, Stencil};
use super::transfer::Transfer;

/// Largest cost `n * half_band^2` of the direct solution on the coarsest grid.
const DIRECT_COST: f64 = 2e5;
/// Nodes above which a grid is never tried for the direct solution.
const DIRECT_NODES: usize = 20_000;
/// Grids that extrapolation and its error estimate want, where the section is large enough for them.
const LEAST_GRIDS: usize = 4;
/// Most grids in a hierarchy.
const MOST_GRIDS: u32 = 24;

/// One grid with its operator and working fields.
#[derive(Debug)]
pub struct Grid {
    /// Fluid nodes and arms.
    pub mask: Mask,
    /// `phi`, or the correction during a cycle, in units of the lattice spacing squared.
    pub phi: Field,
    pub(crate) source: GridSource,
    /// Right side while the grid serves a finer one; empty on the finest.
    pub(crate) rhs: Field,
    /// Row-by-row values on their way to a finer grid; empty on the finest.
    pub(crate) natural: Vec<f64>,
    pub(crate) stencil: Stencil,
}

/// Which right side a grid is solved for.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum GridSource {
    /// That of `-lap(phi) = 1`, scaled by the grid's spacing squared.
    Uniform(f64),
    /// Its field `rhs`.
    Own,
}

impl GridSource {
    pub(crate) fn of(self, rhs: &Field) -> Source<'_> {
        match self {
            Self::Uniform(value) => Source::Uniform(value),
            Self::Own => Source::Nodal(rhs),
        }
    }
}

/// All grids, finest first, with the transfers between neighbours.
#[derive(Debug)]
pub struct Hierarchy {
    /// The grids, finest first.
    pub grids: Vec<Grid>,
    pub(crate) transfers: Vec<Transfer>,
    pub(crate) direct: BandedLu,
}

impl Grid {
    /// Memory of nodes, arms and fields, bytes.
    pub fn bytes(&self) -> usize {
        let fields: usize = [&self.phi, &self.rhs]
            .iter()
            .flat_map(|field| &field.colour)
            .map(|values| size_of_val(&values[..]))
            .sum();
        self.mask.bytes() + self.stencil.bytes() + fields + size_of_val(&self.natural[..])
    }

    /// - `serves`: whether there is a finer grid
    fn new(mask: Mask, serves: bool) -> Self {
        let empty = Field {
            colour: [Vec::new(), Vec::new()],
        };
        Self {
            phi: Field::constant(&mask, 0.0),
            source: GridSource::Uniform(f64::from(mask.stride).powi(2)),
            rhs: if serves {
                Field::constant(&mask, 0.0)
            } else {
                empty
            },
            natural: vec![0.0; if serves { mask.nodes() } else { 0 }],
            stencil: Stencil::new(&mask),
            mask,
        }
    }
}

impl Hierarchy {
    /// Builds the hierarchy for a lattice; `None` when the lattice holds no fluid node at all.
    pub fn new(lattice: &Lattice, rows: &LineCrossings, columns: &LineCrossings) -> Option<Self> {
        let finest = Mask::new(lattice, rows, columns, 1);
        if finest.nodes() == 0 {
            return None;
        }
        let mut masks = vec![finest];
        let direct = loop {
            let last = masks.last()?;
            let longest = lattice.rows.max(lattice.columns) / last.stride as usize + 1;
            if masks.len() >= LEAST_GRIDS
                && let Some(direct) = direct_if_cheap(last, longest, DIRECT_COST)
            {
                break direct;
            }
            let coarse = Mask::new(lattice, rows, columns, last.stride * 2);
            if coarse.nodes() == 0 || masks.len() as u32 == MOST_GRIDS {
                break direct_if_cheap(last, longest, f64::INFINITY)?;
            }
            masks.push(coarse);
        };
        let transfers = masks
            .windows(2)
            .map(|pair| Transfer::new(&pair[0], &pair[1]))
            .collect();
        Some(Self {
            grids: masks
                .into_iter()
                .enumerate()
                .map(|(level, mask)| Grid::new(mask, level > 0))
                .collect(),
            transfers,
            direct,
        })
    }

    /// The fluid nodes and the solution of the finest grid; the rest is dropped.
    pub fn into_finest(self) -> (Mask, Field) {
        let (mask, phi, _) = self.into_two_finest();
        (mask, phi)
    }

    /// The same with the nodes of the second grid, which has twice the spacing.
    pub(crate) fn into_two_finest(self) -> (Mask, Field, Option<Mask>) {
        let mut grids = self.grids;
        let second = (grids.len() > 1).then(|| grids.swap_remove(1).mask);
        let finest = grids.swap_remove(0);
        (finest.mask, finest.phi, second)
    }
}

/// - `longest`: rows or columns of the grid, whichever are more
fn direct_if_cheap(mask: &Mask, longest: usize, limit: f64) -> Option<BandedLu> {
    // The band is at least about as wide as the section is thick, whatever the order.
    let thickness = mask.nodes() as f64 / longest as f64;
    let hopeless = mask.nodes() as f64 * (0.5 * thickness).powi(2) > limit;
    if limit.is_finite() && (hopeless || mask.nodes() > DIRECT_NODES) {
        return None;
    }
    let matrix = poisson_matrix(mask);
    let (order, half_band) = BandedLu::plan(&matrix);
    let cost = mask.nodes() as f64 * (half_band as f64).powi(2);
    (cost <= limit).then(|| BandedLu::new(&matrix, order, half_band))
}
