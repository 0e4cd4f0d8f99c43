//! Micrographs: from a picture of a section to its outline, below the pixel size.
//!
//! A PNG, TIFF, JPEG or BMP becomes grey values; the size of a pixel comes from the option or the file,
//! never from a guess. Otsu's method (1979) parts fluid and wall, the connected region that is the section is
//! chosen, and its contour is taken where the grey is half-way between fluid and wall (marching squares), with
//! fewer vertices within 0.05 pixels (Douglas, Peucker 1973) at the same area. A grey edge gives the smallest and
//! the largest section the wall leaves room for. Pixels have their origin at the top left corner of the
//! whole picture; sections are in metres, `y` upwards.

mod contour;
mod data_bar;
mod decode;
mod denoise;
#[cfg(test)]
mod file_tests;
mod grey;
mod grey_edge;
mod levels;
mod micrograph_problem;
mod micrograph_section;
mod notes;
mod option_text;
mod options;
mod outline_of_loops;
mod prepare;
mod read;
#[cfg(test)]
mod read_tests;
#[cfg(test)]
mod refusal_tests;
mod region_choice;
mod regions;
mod scale;
mod section_contour;
mod simplify;
#[cfg(test)]
mod test_pictures;
mod tiff_picture;
mod tiff_tags;
mod vendor_text;
mod wall_levels;

pub use decode::is_picture;
pub use micrograph_problem::MicrographProblem;
pub use micrograph_section::{
    HistogramSummary, Levels, MicrographSection, PixelLoop, Preview, RegionFound, ScaleCandidate,
};
pub use options::{
    Channel, Denoise, LARGEST_PIXELS, MicrographOptions, PixelBox, Region, Threshold, Tilt, Tone,
};
pub use read::read_micrograph;
