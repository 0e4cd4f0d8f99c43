//! What can be wrong with a picture.

use super::micrograph_section::RegionFound;
use super::options::Tone;
use crate::units::{format_length, format_significant};

/// What is wrong with a picture.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MicrographProblem {
    /// The file is no picture of a kind that is read.
    #[error("the file is not a PNG, TIFF, JPEG or BMP picture")]
    NotAPicture,
    /// The file breaks off or contradicts itself.
    #[error("the {format} file cannot be decoded: {reason}")]
    Undecodable {
        /// Its format.
        format: &'static str,
        /// What the decoder met.
        reason: String,
    },
    /// A kind of pixel that is not read.
    #[error("the {format} file holds {what}, which is not read")]
    UnsupportedPixels {
        /// Its format.
        format: &'static str,
        /// What it holds.
        what: String,
    },
    /// The picture has too many pixels.
    #[error("the picture has {width} x {height} pixels; the limit is {limit} pixels")]
    TooLarge {
        /// Columns.
        width: u64,
        /// Rows.
        height: u64,
        /// Most pixels.
        limit: u64,
    },
    /// The picture is too small for a contour.
    #[error(
        "the part of the picture that is used has {width} x {height} pixels; at least {least} x {least} are needed"
    )]
    TooSmall {
        /// Columns.
        width: u32,
        /// Rows.
        height: u32,
        /// Fewest columns and rows.
        least: u32,
    },
    /// The file has several pages.
    #[error("the file has {} pages: {}", pages.len(), pages.join("; "))]
    SeveralPages {
        /// Each with its size.
        pages: Vec<String>,
    },
    /// There is no such page.
    #[error("there is no page {page}: the file has {count}")]
    NoPage {
        /// The page asked for.
        page: usize,
        /// Pages in the file.
        count: usize,
    },
    /// The text of an option has none of its forms.
    #[error("{option}: {text:?} is not {forms}")]
    OptionText {
        /// The option.
        option: &'static str,
        /// As written.
        text: String,
        /// What it may be.
        forms: &'static str,
    },
    /// A number of an option is out of its range.
    #[error("{option} is {value}, which is not {range}")]
    OptionRange {
        /// The option.
        option: &'static str,
        /// Its value with its unit.
        value: String,
        /// What it may be.
        range: &'static str,
    },
    /// A rectangle or a point leaves the picture.
    #[error(
        "{option} reaches to column {x} and row {y}, but the picture has {width} x {height} pixels"
    )]
    OutsidePicture {
        /// The option.
        option: &'static str,
        /// Past its last column.
        x: u64,
        /// Past its last row.
        y: u64,
        /// Columns of the picture.
        width: u32,
        /// Rows of the picture.
        height: u32,
    },
    /// No statement about the scale counts.
    #[error("the picture has no scale{}", listed(candidates))]
    NoScale {
        /// What was found and why it does not count.
        candidates: Vec<String>,
    },
    /// Statements about the scale contradict each other.
    #[error("the picture has scales that differ by {}{}", crate::units::format_percent(*difference, 2), listed(candidates))]
    ScaleConflict {
        /// Largest relative difference.
        difference: f64,
        /// All of them.
        candidates: Vec<String>,
    },
    /// The file states pixels that are not square, the option only one size.
    #[error("the file states pixels of {} by {}, but --scale alone stands for square ones", format_length(pixel[0]), format_length(pixel[1]))]
    NotSquare {
        /// Pixel size of the file, m.
        pixel: [f64; 2],
    },
    /// The stage was tilted, which shortens heights.
    #[error("the file states a tilt of {degrees} degrees ({source_tag}), so heights in the picture are shortened{}", if *says_corrected { "; it also says that a correction was on" } else { "" })]
    Tilted {
        /// The tilt, degrees.
        degrees: f64,
        /// Where it is stated.
        source_tag: String,
        /// Whether the file says that the instrument corrected it.
        says_corrected: bool,
    },
    /// All pixels are alike.
    #[error("the picture is uniform: every pixel used has the grey value {value}")]
    Uniform {
        /// The value.
        value: String,
    },
    /// The grey values do not part into fluid and wall.
    #[error("no wall stands out: the two halves of the grey values lie {} of their scatter apart, and {} are needed", format_significant(*separation, 2), format_significant(*needed, 2))]
    NoEdge {
        /// Distance of the means over the deviation.
        separation: f64,
        /// Smallest that is taken for two classes.
        needed: f64,
    },
    /// Fluid and wall differ by too few grey values.
    #[error("fluid and wall differ by {steps} grey steps only")]
    TooFewSteps {
        /// Steps between them.
        steps: f64,
    },
    /// A stated threshold has all pixels on one side.
    #[error(
        "the threshold {} has all pixels on one side: grey values run from {low} to {high}",
        format_significant(*threshold, 6)
    )]
    ThresholdOutside {
        /// The threshold.
        threshold: f64,
        /// Darkest value.
        low: f64,
        /// Brightest value.
        high: f64,
    },
    /// The two patches of the threshold are alike.
    #[error("the patches of --threshold have nearly the same grey value, {fluid} and {wall}")]
    PatchesAlike {
        /// Median of the first.
        fluid: f64,
        /// Median of the second.
        wall: f64,
    },
    /// The patches of the threshold contradict the tone of the fluid.
    #[error("--threshold states fluid of grey value {fluid} and wall of {wall}, but --fluid-is {}", tone.word())]
    ToneConflict {
        /// Median of the first patch.
        fluid: f64,
        /// Median of the second patch.
        wall: f64,
        /// The tone asked for.
        tone: Tone,
    },
    /// Both tones have a closed region that could be the section.
    #[error(
        "the fluid may be dark or bright: {} and {}",
        described(dark),
        described(bright)
    )]
    ToneUnclear {
        /// Largest dark region.
        dark: Box<RegionFound>,
        /// Largest bright region.
        bright: Box<RegionFound>,
    },
    /// Several regions could be the section.
    #[error("{} regions could be the section{}", regions.len(), listed(&regions.iter().map(described).collect::<Vec<_>>()))]
    SeveralRegions {
        /// The regions, the largest first.
        regions: Vec<RegionFound>,
    },
    /// No closed region is there.
    #[error("no closed {} region of at least {least} pixels is there{}", tone.map_or("dark or bright", Tone::word), cut_off.as_ref().map_or_else(String::new, |r| format!("; {} touches the border, so its wall is cut off", described(r))))]
    NoRegion {
        /// The tone, where it was settled.
        tone: Option<Tone>,
        /// Fewest pixels.
        least: u64,
        /// The largest region that is cut off.
        cut_off: Option<Box<RegionFound>>,
    },
    /// The region chosen touches the border.
    #[error(
        "{} touches the border of the part used, so its wall is cut off",
        described(region)
    )]
    RegionCutOff {
        /// The region.
        region: Box<RegionFound>,
    },
    /// The pixel asked for lies in the wall.
    #[error("the pixel {x},{y} of --region has the grey value {value}: it lies in the wall")]
    SeedInWall {
        /// Column.
        x: u32,
        /// Row.
        y: u32,
        /// Its value.
        value: f64,
    },
    /// There is no region of that number.
    #[error("there is no region {number}{}", listed(&regions.iter().map(described).collect::<Vec<_>>()))]
    NoSuchRegion {
        /// The number asked for.
        number: usize,
        /// The regions.
        regions: Vec<RegionFound>,
    },
    /// The picture has too many separate spots.
    #[error("the picture breaks up into millions of spots at the threshold")]
    TooNoisy,
    /// The section is implausibly small or large.
    #[error("the section is {} wide and {} high, outside 10 nm to 50 mm", format_length(*width), format_length(*height))]
    ImplausibleSize {
        /// Width, m.
        width: f64,
        /// Height, m.
        height: f64,
    },
}

/// `: a; b; c`, or nothing.
fn listed(items: &[String]) -> String {
    if items.is_empty() {
        return String::new();
    }
    format!(": {}", items.join("; "))
}

/// A region in words.
fn described(region: &RegionFound) -> String {
    let b = region.bounds;
    format!(
        "region {} ({}, {} pixels, {} x {} at {},{})",
        region.number,
        region.tone.word(),
        region.pixels,
        b.width,
        b.height,
        region.centre[0].floor(),
        region.centre[1].floor()
    )
}

impl MicrographProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        let text = match self {
            Self::NotAPicture | Self::Undecodable { .. } => {
                "export the picture again as PNG or TIFF, 8 or 16 bits, without lossy compression"
            }
            Self::UnsupportedPixels { .. } => {
                "export the picture as grey or RGB with 8 or 16 bits per channel"
            }
            Self::TooLarge { .. } => {
                "cut the picture to the section before, or raise the limit with --allow-large"
            }
            Self::TooSmall { .. } => "give a larger part with --crop, or a picture of finer pixels",
            Self::SeveralPages { .. } | Self::NoPage { .. } => {
                "name the page with the section: --page 1"
            }
            Self::OptionText { .. } | Self::OptionRange { .. } => "correct the option",
            Self::OutsidePicture { .. } => {
                "count columns and rows from the top left pixel of the whole picture, beginning with 0"
            }
            Self::NoScale { .. } => {
                "measure the scale bar: length over pixels, for example --scale 0.25um"
            }
            Self::ScaleConflict { .. } => {
                "measure the scale bar and say which is right, for example --scale 0.25um"
            }
            Self::NotSquare { .. } => "add the height of a pixel with --scale-y",
            Self::Tilted { .. } => {
                "give --tilt 70deg for a face square to the surface on a stage tilted so, --tilt \
                 face:20deg for a face turned away so from the view, or --tilt-corrected if heights are \
                 right as they are"
            }
            Self::Uniform { .. } => {
                "choose another part with --crop, or another --page or --channel"
            }
            Self::NoEdge { .. } => {
                "take the noise down with --denoise gauss:1.5, or state the level with --threshold \
                 VALUE or --threshold FLUID_X,FLUID_Y:WALL_X,WALL_Y"
            }
            Self::TooFewSteps { .. } => {
                "export the picture with its full depth (16 bits) or a stretched contrast"
            }
            Self::ThresholdOutside { .. } => {
                "give a level between the two, or a share of full scale such as --threshold 45%"
            }
            Self::PatchesAlike { .. } => {
                "name a point well inside the fluid, then one well inside the wall"
            }
            Self::ToneConflict { .. } => {
                "the first point of --threshold lies in the fluid, the second in the wall; leave out \
                 --fluid-is or change their order"
            }
            Self::ToneUnclear { .. } => "say which it is: --fluid-is dark or --fluid-is bright",
            Self::SeveralRegions { .. } | Self::NoSuchRegion { .. } => {
                "choose one with --region NUMBER, --region X,Y (a pixel in it) or --region largest; \
                 or cut it out with --crop"
            }
            Self::NoRegion { .. } | Self::RegionCutOff { .. } => {
                "give a picture, or a larger --crop, that has all of the wall; an open groove must be \
                 closed by its lid first"
            }
            Self::SeedInWall { .. } => {
                "name a pixel inside the section, or the other tone with --fluid-is"
            }
            Self::TooNoisy => "take the noise down with --denoise median:2",
            Self::ImplausibleSize { .. } => {
                "correct --scale, or add --allow-any-size if the size is right"
            }
        };
        text.to_owned()
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        matches!(
            self,
            Self::SeveralPages { .. }
                | Self::NoScale { .. }
                | Self::ScaleConflict { .. }
                | Self::NotSquare { .. }
                | Self::Tilted { .. }
                | Self::ToneUnclear { .. }
                | Self::SeveralRegions { .. }
                | Self::ImplausibleSize { .. }
        )
    }
}
