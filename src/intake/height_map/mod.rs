//! Height maps: from heights over an area to traces across its grooves.
//!
//! [`surface_format()`] tells the kind of file, [`read_surface`] reads it into a [`HeightMap`] in metres (or
//! a trace, where it has one row), and [`cut()`] levels the map, finds the direction of its groove and gives
//! traces at a right angle to it.

mod container;
mod cut;
mod cut_lines;
#[cfg(test)]
mod cut_tests;
mod file_defects;
mod groove_direction;
mod groove_profile;
mod levelling;
mod listed_points;
mod map_blocks;
mod map_problem;
mod map_table;
mod sdf;
mod sdf_binary;
#[cfg(test)]
mod sdf_tests;
mod sdf_text;
#[cfg(test)]
mod spoilt_bytes;
mod stored_number;
mod surface;
mod surface_content;
mod surface_format;
mod surface_size;
mod x3p;
mod x3p_description;
mod x3p_points;
#[cfg(test)]
mod x3p_tests;

pub use cut::{CutOptions, MapCut, MapCuts, cut};
pub use map_problem::MapProblem;
pub use map_table::map_from_bytes;
pub(crate) use map_table::read_map_table;
pub use surface::{HeightMap, MAX_MAP_POINTS, heights_csv};
pub use surface_content::{SurfaceContent, read_surface};
pub use surface_format::{SurfaceFormat, surface_format};
