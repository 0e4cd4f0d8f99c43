//! From an outline to a masked square grid: which nodes are fluid, and how far their arms reach.

mod coverage;
mod crossings;
mod cut_cell;
mod lattice;
mod mask;
mod resolution;
mod runs;

pub(crate) use coverage::coverage;
pub use crossings::{Crossing, LineCrossings};
pub(crate) use cut_cell::{EAST, NORTH, Region, SOUTH, WEST, cut_cells, shared_parts, signed_area};
pub use lattice::{Lattice, WallEdge};
pub use mask::{
    ARM_DOWN, ARM_LEFT, ARM_RIGHT, ARM_UP, Colour, Mask, NO_EDGE, NO_NODE, RowStart, Run, Segment,
    WallNode,
};
pub use resolution::{BYTES_PER_NODE, LEAST_CELLS_ACROSS, ResolutionError, memory_needed, spacing};
