//! What a picture gave: the outline, and everything a person needs to check it.

use super::options::{PixelBox, Tone};
use crate::geometry::Outline;
use crate::intake::section_reach::Reach;
use crate::intake::step::Step;
use crate::warning::Warning;

/// One statement about the size of a pixel.
#[derive(Debug, Clone, PartialEq)]
pub struct ScaleCandidate {
    /// Where it is stated: `--scale`, `tag 34682 [Scan] PixelWidth`, ...
    pub source: String,
    /// Metres per pixel along x and along y.
    pub metres_per_pixel: [f64; 2],
    /// Whether it is the one that was used.
    pub used: bool,
    /// Whether it counts as a scale; a resolution for screens or printing does not.
    pub is_trusted: bool,
    /// Why it counts or not, and what it was set against.
    pub note: String,
}

/// The picture, small enough to be shown.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Preview {
    /// Columns.
    pub width: u32,
    /// Rows.
    pub height: u32,
    /// Pixels of the picture along one pixel of the preview, both ways.
    pub factor: u32,
    /// Grey values, row by row from the top: 0 for the darkest of the picture, 255 for the brightest.
    pub grey: Vec<u8>,
}

/// Grey levels of a picture, in the numbers of its file.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub struct Levels {
    /// Otsu's threshold, where it was used.
    pub otsu: Option<f64>,
    /// Level of the contour.
    pub contour: f64,
    /// Level of the fluid beside the wall.
    pub fluid: f64,
    /// Level of the wall.
    pub wall: f64,
    /// Levels of the smallest and the largest section.
    pub reach: [f64; 2],
}

/// What is known of the grey values of the part used.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct HistogramSummary {
    /// Darkest and brightest value.
    pub range: [f64; 2],
    /// Number of different values.
    pub distinct: usize,
    /// Mean of the values below and above the threshold.
    pub class_means: [f64; 2],
    /// Standard deviation of the values below and above the threshold.
    pub class_deviations: [f64; 2],
    /// Share of pixels below the threshold.
    pub share_below: f64,
    /// Counts of pixels in 64 equal steps from the darkest to the brightest value.
    pub counts: Vec<u64>,
}

/// A connected region of one tone.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct RegionFound {
    /// Its number in the list, from 1, the largest first.
    pub number: usize,
    /// Its tone.
    pub tone: Tone,
    /// Pixels in it.
    pub pixels: u64,
    /// Area, m^2.
    pub area: f64,
    /// The box around it in the whole picture.
    pub bounds: PixelBox,
    /// Centroid, pixels of the whole picture from its top left corner, y downwards.
    pub centre: [f64; 2],
    /// Whether it touches the border of the part used, so that its wall is cut off.
    pub touches_border: bool,
}

/// A closed contour, pixels of the whole picture: the origin is its top left corner, y downwards, and the
/// centre of the first pixel lies at (0.5, 0.5).
pub type PixelLoop = Vec<[f64; 2]>;

/// A section from a picture.
#[derive(Debug, Clone, PartialEq)]
pub struct MicrographSection {
    /// Its outline, m, y upwards, the origin at the lower left corner of the part used.
    pub outline: Outline,
    /// The smallest and the largest section it could be, where the edge is grey.
    pub reach: Option<Reach>,
    /// Metres per pixel along x and along y, with the correction of the tilt.
    pub metres_per_pixel: [f64; 2],
    /// Every statement about the scale.
    pub scale_candidates: Vec<ScaleCandidate>,
    /// Columns and rows of the whole picture.
    pub size: [u32; 2],
    /// The whole picture for a look.
    pub preview: Preview,
    /// The part that was used.
    pub crop: PixelBox,
    /// Tone of the fluid.
    pub fluid: Tone,
    /// Grey levels.
    pub levels: Levels,
    /// Grey values of the part used, after what was done against noise.
    pub histogram: HistogramSummary,
    /// Regions of the fluid's tone, the largest first; at most 20.
    pub regions: Vec<RegionFound>,
    /// Number of the region that is the section.
    pub region: usize,
    /// The loops of the outline, simplified as it is.
    pub contours: Vec<PixelLoop>,
    /// The loops of the smallest section, where there is a reach.
    pub inner_contours: Vec<PixelLoop>,
    /// The loops of the largest section, where there is a reach.
    pub outer_contours: Vec<PixelLoop>,
    /// Width of the edge, pixels: distance of the two reach levels from each other, averaged along the wall;
    /// `None` where one of them has no contour.
    pub edge_width: Option<f64>,
    /// What was done.
    pub steps: Vec<Step>,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
    /// What the file says besides, key and value as written.
    pub metadata: Vec<(String, String)>,
}
