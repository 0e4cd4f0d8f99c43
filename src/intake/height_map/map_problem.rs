//! What can be wrong with a height map.

use crate::units::{format_length, format_significant};

/// What is wrong with a height map.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum MapProblem {
    /// The container of an x3p file cannot be opened.
    #[error("the x3p container cannot be opened: {message}")]
    Container {
        /// What the reader says.
        message: String,
    },
    /// A file in the container cannot be unpacked.
    #[error("`{name}` in the x3p container cannot be unpacked: {message}")]
    Entry {
        /// Its name.
        name: String,
        /// What the reader says.
        message: String,
    },
    /// A file that the container must hold is not there.
    #[error("the x3p container holds no `{name}`")]
    EntryMissing {
        /// Its name.
        name: String,
    },
    /// A file in the container is too large.
    #[error("`{name}` in the x3p container is above the limit of {} MiB", limit >> 20)]
    EntryTooLarge {
        /// Its name.
        name: String,
        /// Limit, bytes.
        limit: u64,
    },
    /// A file in the container grows beyond measure when it is unpacked.
    #[error("`{name}` in the x3p container unpacks to more than {ratio} times its size")]
    EntryRatio {
        /// Its name.
        name: String,
        /// Largest ratio that is unpacked.
        ratio: u64,
    },
    /// The XML of an x3p file cannot be read.
    #[error("`main.xml` cannot be read: {message}")]
    Xml {
        /// What the reader says.
        message: String,
    },
    /// The XML declares entities.
    #[error("`main.xml` has a document type declaration (DTD), which is not read")]
    XmlDeclaresTypes,
    /// An element that must be there.
    #[error("`main.xml` has no `{element}`")]
    ElementMissing {
        /// The element.
        element: String,
    },
    /// An element with a value that cannot be used.
    #[error("`{element}` in `main.xml` is `{text}`; {needed} is needed")]
    ElementValue {
        /// The element.
        element: String,
        /// Its text.
        text: String,
        /// What is needed.
        needed: &'static str,
    },
    /// The header of an SDF file lacks a key.
    #[error("the SDF header has no `{key}`")]
    HeaderKeyMissing {
        /// The key.
        key: &'static str,
    },
    /// A value of an SDF header that cannot be used.
    #[error("`{key}` in the SDF header is `{text}`; {needed} is needed")]
    HeaderValue {
        /// The key.
        key: String,
        /// Its value.
        text: String,
        /// What is needed.
        needed: &'static str,
    },
    /// A line of an SDF header without a key.
    #[error("line {line} of the SDF header is `{text}`, not `key = value`")]
    HeaderLine {
        /// Line, from 1.
        line: usize,
        /// The line.
        text: String,
    },
    /// A version of SDF that is not known.
    #[error(
        "`{magic}` is not a known version of SDF; ISO-1.0, ISO-2.0 and BCR-1.0 are, after `a` or `b`"
    )]
    SdfVersion {
        /// How the file begins.
        magic: String,
    },
    /// A way of storing heights that is not read.
    #[error("the file has {what}, which is not read")]
    Unsupported {
        /// What it has.
        what: String,
    },
    /// A height that is no number.
    #[error("line {line}: `{text}` is not a height")]
    NotAHeight {
        /// Line, from 1.
        line: usize,
        /// The text.
        text: String,
    },
    /// The file ends too early.
    #[error("the file is cut off: {found} of {expected} {what}")]
    Truncated {
        /// How many there are.
        found: usize,
        /// How many there should be.
        expected: usize,
        /// Of what.
        what: &'static str,
    },
    /// There are more heights than the file declares.
    #[error("the file declares {expected} {what} and holds more: {found} were found")]
    TooMany {
        /// How many there are.
        found: usize,
        /// How many there should be.
        expected: usize,
        /// Of what.
        what: &'static str,
    },
    /// There are too many points.
    #[error("the surface has {along_x} x {along_y} points; the limit is {limit}")]
    TooManyPoints {
        /// Limit.
        limit: usize,
        /// Points along x.
        along_x: u64,
        /// Points along y.
        along_y: u64,
    },
    /// There is no point.
    #[error("the map has {along_x} x {along_y} points")]
    NoPoints {
        /// Points along x.
        along_x: u64,
        /// Points along y.
        along_y: u64,
    },
    /// No point has a height.
    #[error("none of the {points} points has a height")]
    NoHeights {
        /// Number of points.
        points: usize,
    },
    /// The file holds more than one map.
    #[error("the file holds {layers} layers, one is needed")]
    Layers {
        /// Number of layers.
        layers: u64,
    },
    /// Points that are not the points of a rectangular grid.
    #[error("the points do not lie on a rectangular grid along x and y: {reason}")]
    NotAGrid {
        /// What was found instead.
        reason: String,
    },
    /// Positions of a profile that do not rise.
    #[error("the positions of the profile neither rise nor fall throughout (point {point})")]
    PositionsNotRising {
        /// Number of the first point that is out of order, from 1.
        point: usize,
    },
    /// The size of the map makes its unit doubtful.
    #[error(
        "taken as metres, the surface is {} by {} with points every {}; maps up to 50 mm (profiles up to \
         200 mm) with points every 1 nm to 1 mm are expected",
        format_length(size[0]),
        format_length(size[1]),
        format_length(*spacing)
    )]
    ImplausibleSize {
        /// Size along x and along y, m.
        size: [f64; 2],
        /// The larger distance of neighbouring points, m.
        spacing: f64,
        /// Unit that would give a plausible map.
        likely: Option<&'static str>,
    },
    /// The heights make the unit doubtful.
    #[error(
        "taken as metres, the heights span {}, on a surface of {} by {}; 10 pm to 5 mm is expected",
        format_length(*span),
        format_length(size[0]),
        format_length(size[1])
    )]
    ImplausibleHeights {
        /// Highest less lowest height, m.
        span: f64,
        /// Size along x and along y, m.
        size: [f64; 2],
        /// Unit that would give a plausible map.
        likely: Option<&'static str>,
    },
    /// The unit stated for the file is not above zero.
    #[error("the unit stated for the file is {metres} m; it must be above zero and finite")]
    UnitNotPositive {
        /// The unit, m.
        metres: f64,
    },
    /// A spacing that is not above zero.
    #[error("points along {axis} are {metres} apart; the distance must be finite and not zero")]
    SpacingNotPositive {
        /// `x` or `y`.
        axis: &'static str,
        /// The distance, in the unit of the file.
        metres: f64,
    },
    /// The map is too small for a cut.
    #[error("the map has {along_x} x {along_y} points; a cut needs at least {needed} each way")]
    TooSmall {
        /// Points along x.
        along_x: usize,
        /// Points along y.
        along_y: usize,
        /// Points needed each way.
        needed: usize,
    },
    /// Too many points have no height.
    #[error("only {valid} of {points} points have a height, too few to find a groove")]
    TooFewHeights {
        /// Points with a height.
        valid: usize,
        /// All points.
        points: usize,
    },
    /// No direction of a groove was found.
    #[error(
        "no groove direction was found: parallel cuts explain {} % of the heights in the best \
         direction and {} % across it",
        format_significant(100.0 * along, 2),
        format_significant(100.0 * across, 2)
    )]
    NoDirection {
        /// Part of the variance explained by parallel cuts at the best direction.
        along: f64,
        /// The same at a right angle to it.
        across: f64,
    },
    /// The direction stated is not a finite angle.
    #[error("the groove direction stated is not a finite angle")]
    DirectionNotFinite,
    /// The length to average over is not above zero.
    #[error("the length to average over is {metres} m; it must be above zero and finite")]
    AverageNotPositive {
        /// The length, m.
        metres: f64,
    },
    /// A station outside the map.
    #[error(
        "a cut at station {} with {} of groove averaged does not fit into the map; stations from {} \
         to {} have a cut",
        format_length(*station),
        format_length(*average),
        format_length(*from),
        format_length(*to)
    )]
    StationOutside {
        /// The station, m.
        station: f64,
        /// Groove length averaged, m.
        average: f64,
        /// First station of the map, m.
        from: f64,
        /// Last station of the map, m.
        to: f64,
    },
}

impl MapProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::ImplausibleSize { likely, .. } | Self::ImplausibleHeights { likely, .. } => {
                match likely {
                    Some(unit) => format!(
                        "the numbers look like {unit}: state `--unit {unit}`, or `--unit m` if they \
                         are metres all the same"
                    ),
                    None => "no one unit makes x, y and heights plausible; state the right one by \
                             `--unit`, or export again in metres as the format has it"
                        .to_owned(),
                }
            }
            Self::StationOutside { from, to, .. } => format!(
                "stations count along the groove from the middle of the map; give --station from {} to \
                 {}, or a shorter --average",
                format_length(*from),
                format_length(*to)
            ),
            other => other.fixed_hint().to_owned(),
        }
    }

    /// Hints without numbers.
    fn fixed_hint(&self) -> &'static str {
        match self {
            Self::Container { .. } | Self::Entry { .. } => {
                "the file may be cut off or damaged; fetch it again, or export the surface again"
            }
            Self::EntryTooLarge { .. } | Self::EntryRatio { .. } | Self::TooManyPoints { .. } => {
                "crop the map to its channels or thin it out before exporting"
            }
            Self::XmlDeclaresTypes => "take the `<!DOCTYPE ...>` out; the standard has none",
            Self::EntryMissing { .. }
            | Self::Xml { .. }
            | Self::ElementMissing { .. }
            | Self::ElementValue { .. } => {
                "export the surface again as x3p (ISO 25178-72) or as SDF (ISO 25178-71)"
            }
            Self::HeaderKeyMissing { .. }
            | Self::HeaderValue { .. }
            | Self::HeaderLine { .. }
            | Self::SdfVersion { .. }
            | Self::NotAHeight { .. } => {
                "correct the file; ISO 25178-71 gives the keys one a line as `Key = value`, then `*`, \
                 the heights, and `*`"
            }
            Self::Unsupported { .. } => {
                "export the surface again without it: uncompressed, without check sums of the data"
            }
            Self::Truncated { .. } => "export or fetch the file again; the end is missing",
            Self::TooMany { .. } => {
                "the numbers of points in the file contradict its data; correct them or export again"
            }
            Self::NoPoints { .. } | Self::NoHeights { .. } | Self::TooFewHeights { .. } => {
                "measure or export again; nothing can be cut from it"
            }
            Self::Layers { .. } => "export one layer only",
            Self::NotAGrid { .. } => {
                "export the surface as a matrix (feature type SUR), interpolated to a regular grid"
            }
            Self::PositionsNotRising { .. } => "export the profile again with its points in order",
            Self::UnitNotPositive { .. } => "give a unit of length, such as `--unit mm`",
            Self::SpacingNotPositive { .. } => "correct the increment of that axis in the file",
            Self::TooSmall { .. } => {
                "measure a larger map, or export one row of it as a profile across the groove"
            }
            Self::NoDirection { .. } => {
                "state it by --groove-direction (angle against the x axis, anticlockwise, such as \
                 `26 deg`), or crop the map to one straight stretch of channel"
            }
            Self::DirectionNotFinite => "give an angle such as `--groove-direction \"26 deg\"`",
            Self::AverageNotPositive { .. } => "give a length such as `--average \"200 um\"`",
            Self::ImplausibleSize { .. }
            | Self::ImplausibleHeights { .. }
            | Self::StationOutside { .. } => "",
        }
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        matches!(
            self,
            Self::ImplausibleSize { .. }
                | Self::ImplausibleHeights { .. }
                | Self::NoDirection { .. }
                | Self::Layers { .. }
        )
    }
}
