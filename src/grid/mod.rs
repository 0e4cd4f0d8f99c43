//! From an outline to a masked square grid: which nodes are fluid, and how far their arms reach.

mod cell_rows;
mod coverage;
mod crossings;
mod cut_cell;
mod lattice;
mod mask;
mod resolution;
mod runs;
mod turns;

/// Fluid nodes below which all work on a grid stays on one thread: starting threads takes some milliseconds, as
/// long as the whole solve of such a grid.
pub(crate) const PARALLEL_NODES: usize = 100_000;

pub(crate) use cell_rows::{Around, CellRows};
pub(crate) use coverage::coverage;
pub use crossings::{Crossing, LineCrossings};
pub(crate) use cut_cell::{
    CORNERS, CellIndex, CutCells, EAST, NORTH, Region, SOUTH, WEST, cut_cells, exit_from_cell,
    next_cell, opposite_side, position_around, shared_parts,
};
pub use lattice::{Lattice, WallEdge};
pub use mask::{
    ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, NO_EDGE, NO_NODE, RowStart, Run, Segment,
    WallNode,
};
pub use resolution::{BYTES_PER_NODE, LEAST_CELLS_ACROSS, ResolutionError, memory_needed, spacing};
pub(crate) use turns::next_start;
