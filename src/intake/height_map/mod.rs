//! Height maps: from heights over an area to traces across its grooves.

mod map_problem;
mod surface;

pub use map_problem::MapProblem;
pub use surface::HeightMap;
