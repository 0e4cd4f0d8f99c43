//! What a check picture shows: how an instrument's file became a section.
//!
//! A neutral description in metres, filled in by whoever read the file. Positions run to the right, heights
//! upwards; what is not finite counts as missing. [`super::draw_check`] makes a drawing of it.

use crate::geometry::Point;

/// One picture with everything that was done between an instrument's file and a section.
///
/// # Examples
/// ```
/// use etchwise::report::{
///     CheckPicture, Curve, CurveKind, CurvePanel, Panel, PictureFormat, check_picture_bytes,
/// };
///
/// let trace = Curve {
///     points: (0..200).map(|i| [f64::from(i) * 1e-6, 2e-9 * f64::from(i % 7)]).collect(),
///     kind: CurveKind::Measured,
///     label: "as measured".to_owned(),
/// };
/// let picture = CheckPicture {
///     title: "invented trace".to_owned(),
///     panels: vec![Panel::Curves(CurvePanel {
///         title: "the trace in the file".to_owned(),
///         x_label: "position".to_owned(),
///         z_label: "height".to_owned(),
///         curves: vec![trace],
///         ..CurvePanel::default()
///     })],
///     notes: vec!["read 200 samples".to_owned()],
///     warnings: Vec::new(),
/// };
/// let svg = check_picture_bytes(&picture, PictureFormat::Svg)?;
/// assert!(svg.starts_with(b"<?xml"));
/// # Ok::<(), etchwise::report::PictureError>(())
/// ```
#[derive(Debug, Clone, Default, PartialEq)]
pub struct CheckPicture {
    /// What is shown, for example the name of the file and of the section.
    pub title: String,
    /// The panels from top to bottom.
    pub panels: Vec<Panel>,
    /// What was done, in its order; printed as a numbered list below the panels.
    pub notes: Vec<String>,
    /// What a reader must know before using the section; printed above the notes.
    pub warnings: Vec<String>,
}

/// One part of a check picture.
#[derive(Debug, Clone, PartialEq)]
pub enum Panel {
    /// Heights over positions, sections, dimensions.
    Curves(CurvePanel),
    /// A micrograph with what was found in it.
    Image(ImagePanel),
    /// A height map with what was taken out of it.
    Map(MapPanel),
}

/// Heights over positions.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct CurvePanel {
    /// Heading of the panel.
    pub title: String,
    /// What runs to the right, without a unit, which is chosen by size.
    pub x_label: String,
    /// What runs upwards, without a unit.
    pub z_label: String,
    /// Whether both axes have one scale. Where one extent is more than twelve times the other, nothing would be
    /// seen of it, and a stretch by a round factor is drawn and printed all the same.
    pub equal_scale: bool,
    /// Whether the panel is content with half the width; two such panels in a row stand side by side.
    pub half_width: bool,
    /// Lines, the later above the earlier.
    pub curves: Vec<Curve>,
    /// Stretches of positions.
    pub bands: Vec<Band>,
    /// Closed areas.
    pub regions: Vec<Region>,
    /// Single places.
    pub marks: Vec<Mark>,
    /// Lengths with arrows and numbers.
    pub dimensions: Vec<Dimension>,
}

/// A line of a [`CurvePanel`].
#[derive(Debug, Clone, PartialEq)]
pub struct Curve {
    /// Position and height, m; a value that is not finite breaks the line.
    pub points: Vec<Point>,
    /// What the line is, which decides how it is drawn.
    pub kind: CurveKind,
    /// Words for the legend; curves of one kind and label share an entry.
    pub label: String,
}

/// What a line is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[non_exhaustive]
pub enum CurveKind {
    /// Heights as the instrument gave them.
    Measured,
    /// One of several repeats.
    Repeat,
    /// Heights after corrections.
    Corrected,
    /// The line or curve that levelling takes off.
    Reference,
    /// What stands in for samples that were taken out.
    Bridge,
    /// The lower face of the lid.
    Lid,
    /// Another choice that would do as well.
    Alternative,
    /// The smallest surface that it could be.
    InnerReach,
    /// The largest surface that it could be.
    OuterReach,
}

/// A stretch of positions.
#[derive(Debug, Clone, PartialEq)]
pub struct Band {
    /// Where it begins, m.
    pub from: f64,
    /// Where it ends, m.
    pub to: f64,
    /// What it is.
    pub kind: BandKind,
    /// A word written into it where it fits, for example a number; may be empty.
    pub label: String,
}

/// What a stretch of positions is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[non_exhaustive]
pub enum BandKind {
    /// A channel, from edge to edge.
    Groove,
    /// A level stretch beside or between channels.
    Land,
    /// Where the reference line was fitted.
    Reference,
    /// A flank whose shape is that of the instrument's tip.
    TipShape,
    /// Samples that were replaced by a bridge.
    Bridged,
}

/// A closed area.
#[derive(Debug, Clone, PartialEq)]
pub struct Region {
    /// Border loops, m; a point is inside when loops around it are odd in number.
    pub loops: Vec<Vec<Point>>,
    /// What it is.
    pub kind: RegionKind,
    /// Words for the legend.
    pub label: String,
}

/// What a closed area is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[non_exhaustive]
pub enum RegionKind {
    /// The largest section that it could be.
    OuterReach,
    /// The section.
    Section,
    /// The smallest section that it could be.
    InnerReach,
    /// The lid.
    Lid,
}

/// A single place.
#[derive(Debug, Clone, PartialEq)]
pub struct Mark {
    /// Where it is, m.
    pub at: Point,
    /// What it is.
    pub kind: MarkKind,
    /// A word beside it; may be empty.
    pub label: String,
}

/// What a single place is.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
#[non_exhaustive]
pub enum MarkKind {
    /// A spike that was taken out.
    Spike,
    /// The edge of a channel.
    Edge,
    /// Any other place.
    Place,
}

/// A length between two places.
#[derive(Debug, Clone, PartialEq)]
pub struct Dimension {
    /// One end, m.
    pub from: Point,
    /// The other end, m.
    pub to: Point,
    /// What it is with its number and unit, for example `depth 23.4 um`.
    pub text: String,
}

/// A micrograph with what was found in it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct ImagePanel {
    /// Heading of the panel.
    pub title: String,
    /// Pixels across and down.
    pub size: [usize; 2],
    /// Grey values, 0 black to 255 white, row by row from the top.
    pub grey: Vec<u8>,
    /// Width and height of a pixel, m.
    pub pixel_size: [f64; 2],
    /// Where the lower left corner of the picture lies in the plane of the outlines, m.
    pub origin: Point,
    /// Outlines found.
    pub outlines: Vec<Region>,
    /// Two opposite corners of the part that was looked at, m.
    pub crop: Option<[Point; 2]>,
    /// Places from which the inside was found, m.
    pub seeds: Vec<Point>,
    /// Lengths with arrows and numbers.
    pub dimensions: Vec<Dimension>,
}

/// A height map with what was taken out of it.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct MapPanel {
    /// Heading of the panel.
    pub title: String,
    /// Points along x and along y.
    pub size: [usize; 2],
    /// Distance of neighbours along x and along y, m; the first point lies at the origin.
    pub spacing: [f64; 2],
    /// Heights, m, row by row along x, rows in the order of rising y; not finite where missing.
    pub heights: Vec<f32>,
    /// Lines along which traces were taken.
    pub cuts: Vec<Cut>,
    /// Angle of the grooves from the x axis, anticlockwise, rad.
    pub groove_direction: Option<f64>,
}

/// A line across a map along which a trace was taken.
#[derive(Debug, Clone, PartialEq)]
pub struct Cut {
    /// Where the trace begins, m.
    pub from: Point,
    /// Where it ends, m.
    pub to: Point,
    /// Width over which heights were averaged, m; zero for a single line.
    pub width: f64,
    /// A word beside it; may be empty.
    pub label: String,
}
