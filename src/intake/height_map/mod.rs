//! Height maps: from heights over an area to traces across its grooves.

mod map_problem;
mod map_table;
mod surface;

pub use map_problem::MapProblem;
pub use map_table::map_from_bytes;
pub use surface::HeightMap;
