//! What the caller knows about a picture, and how its outline is to be taken.

/// Most pixels of a picture that are read without asking: 200 megapixels.
pub const LARGEST_PIXELS: u64 = 200_000_000;

/// How the section's face stood to the view.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Tilt {
    /// The stage was tilted by this angle, rad, and the face is square to the surface of the sample: heights
    /// appear times the sine of the angle and are divided by it. At 90 degrees the face is seen head-on.
    Stage(f64),
    /// The face was turned away from the view by this angle, rad: heights appear times its cosine and are
    /// divided by it. At 0 the face is seen head-on.
    Face(f64),
    /// The heights of the picture were corrected already, or the face was seen head-on.
    Corrected,
}

/// Which values of a coloured picture are used.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum Channel {
    /// The mean of red, green and blue.
    #[default]
    Grey,
    /// Red only.
    Red,
    /// Green only.
    Green,
    /// Blue only.
    Blue,
}

/// Whether the fluid's part of the picture is darker or brighter than the wall.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Tone {
    /// The fluid is darker than the wall.
    Dark,
    /// The fluid is brighter than the wall.
    Bright,
}

impl Tone {
    /// The word of `--fluid-is`.
    pub fn word(self) -> &'static str {
        match self {
            Self::Dark => "dark",
            Self::Bright => "bright",
        }
    }

    /// The other tone.
    #[must_use]
    pub fn other(self) -> Self {
        match self {
            Self::Dark => Self::Bright,
            Self::Bright => Self::Dark,
        }
    }
}

/// A rectangle of pixels of the whole picture, its origin at the top left corner.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct PixelBox {
    /// First column.
    pub x: u32,
    /// First row, counted downwards.
    pub y: u32,
    /// Number of columns.
    pub width: u32,
    /// Number of rows.
    pub height: u32,
}

/// Where the grey level of the wall comes from.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub enum Threshold {
    /// Otsu's method parts fluid and wall; the contour is taken half-way between the medians of the two
    /// beside the wall, where the grey of an edge pixel is half fluid and half wall.
    #[default]
    Otsu,
    /// A grey value as the file counts it: 0 to 255, 0 to 65535, or the file's own numbers.
    Value(f64),
    /// A share of full scale, 0 to 1.
    Share(f64),
    /// Half-way between the median of a patch in the fluid and one in the wall, in this order.
    Walls(PixelBox, PixelBox),
}

/// What is done against noise before the contour is taken.
#[derive(Debug, Clone, Copy, Default, PartialEq)]
pub enum Denoise {
    /// Nothing.
    #[default]
    None,
    /// The median over a square of this radius, pixels, 1 to 10.
    Median(u32),
    /// A Gaussian of this standard deviation, pixels, up to 20.
    Gaussian(f64),
}

/// Which region of the picture is the section.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum Region {
    /// The only one of its size that does not touch the border; reading stops if there are several.
    #[default]
    Only,
    /// The largest that does not touch the border.
    Largest,
    /// The one with this pixel, column and row from the top left of the whole picture.
    Seed(u32, u32),
    /// The one with this number in the list of regions, from 1.
    Number(usize),
}

/// What the caller knows about a picture.
#[derive(Debug, Clone, PartialEq)]
pub struct MicrographOptions {
    /// Metres per pixel along x (`--scale`); also along y without `scale_y`.
    pub scale: Option<f64>,
    /// Metres per pixel along y (`--scale-y`).
    pub scale_y: Option<f64>,
    /// How the face stood to the view (`--tilt`, `--tilt-corrected`).
    pub tilt: Option<Tilt>,
    /// Part of the picture that is used: x, y, width, height, pixels (`--crop`).
    pub crop: Option<[u32; 4]>,
    /// Page of the file, from 1 (`--page`).
    pub page: Option<usize>,
    /// Values of a coloured picture (`--channel`).
    pub channel: Channel,
    /// Tone of the fluid (`--fluid-is`); found where it is clear when `None`.
    pub fluid: Option<Tone>,
    /// Grey level of the wall (`--threshold`).
    pub threshold: Threshold,
    /// What is done against noise (`--denoise`).
    pub denoise: Denoise,
    /// Which region is the section (`--region`).
    pub region: Region,
    /// Islands below this area are filled, m^2 (`--islands-above`); 30 pixels when `None`.
    pub smallest_island: Option<f64>,
    /// Largest distance of the outline from the contour, m (`--simplify`); 0.05 pixels when `None`.
    pub simplify: Option<f64>,
    /// Levels of the smallest and largest section between wall (0) and fluid (1), lower first
    /// (`--reach-levels`).
    pub reach_levels: [f64; 2],
    /// Take sections outside 10 nm to 50 mm.
    pub allow_any_size: bool,
    /// Most pixels that are read (`--allow-large` raises it).
    pub largest_pixels: u64,
}

impl Default for MicrographOptions {
    fn default() -> Self {
        Self {
            scale: None,
            scale_y: None,
            tilt: None,
            crop: None,
            page: None,
            channel: Channel::default(),
            fluid: None,
            threshold: Threshold::default(),
            denoise: Denoise::default(),
            region: Region::default(),
            smallest_island: None,
            simplify: None,
            reach_levels: [0.2, 0.8],
            allow_any_size: false,
            largest_pixels: LARGEST_PIXELS,
        }
    }
}
