//! What can be wrong with a file: where it is, what it is, what to do.

use super::height_map::MapProblem;
use super::micrograph::MicrographProblem;
use super::network_problem::NetworkProblem;
use super::route_problem::RouteProblem;
use super::trace::{GrooveProblem, TableProblem, TraceProblem};
use crate::geometry::NamedWallError;
use crate::geometry::nominal::NominalError;
use crate::units::{UnitError, format_length};

/// A place in a text file, with the line it is on.
#[derive(Debug, Clone, PartialEq, Eq)]
pub struct Place {
    /// Line, from 1.
    pub line: usize,
    /// Column in characters, from 1.
    pub column: usize,
    /// The field: a column name, a key, an attribute.
    pub field: Option<String>,
    /// The line, or the part of a long line around the place.
    pub excerpt: String,
    /// Where the place is in the excerpt, characters from 0.
    pub caret: usize,
}

/// The two families of read errors; the exit status is the same, the remedy is not.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum ReadErrorKind {
    /// The file cannot be read or does not say what it must.
    Unreadable,
    /// The file is readable, but its unit or scale is missing or ambiguous.
    AmbiguousUnit,
}

/// Why a file was not read.
///
/// The message is `path:line:column: field: problem`; [`ReadError::hint`] says what to do and
/// [`ReadError::explain`] shows both with the line.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[error("{}{problem}", self.prefix())]
pub struct ReadError {
    /// Path as given.
    pub path: String,
    /// Where in the file, when it is in one place.
    pub place: Option<Box<Place>>,
    /// What is wrong.
    pub problem: Box<ReadProblem>,
}

/// What is wrong with a file.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ReadProblem {
    /// There is no such file.
    #[error("no such file")]
    NotFound,
    /// The path is a folder.
    #[error("this is a folder, not a file")]
    IsFolder,
    /// The system refused to read the file.
    #[error("cannot be read: {reason}")]
    Io {
        /// What the system said.
        reason: String,
    },
    /// The file is above the size limit.
    #[error("the file has {bytes} bytes, the limit is {limit} bytes ({} MiB)", limit >> 20)]
    FileTooLarge {
        /// Size.
        bytes: u64,
        /// Limit.
        limit: u64,
    },
    /// The section has more vertices than the limit.
    #[error("the outline has more than {limit} vertices")]
    TooManyVertices {
        /// Limit.
        limit: usize,
    },
    /// The file holds nothing.
    #[error("the file is empty")]
    Empty,
    /// The file is not text.
    #[error("the file holds binary data, not text")]
    Binary,
    /// The text is broken in the encoding it declares.
    #[error("the file begins like {encoding} text but is not valid {encoding}")]
    BrokenEncoding {
        /// Encoding by the byte order mark.
        encoding: &'static str,
    },
    /// The content is none of the known kinds.
    #[error("the content is not a section file, an outline in columns, or an SVG drawing")]
    UnknownContent,
    /// Text where a number is needed.
    #[error("`{text}` is not a number")]
    NotANumber {
        /// The text.
        text: String,
    },
    /// A number that is infinite or not a number.
    #[error("`{text}` is not a finite number")]
    NotFinite {
        /// The text.
        text: String,
    },
    /// Nothing where a number is needed.
    #[error("there is no number here")]
    EmptyField,
    /// A vertex without exactly two coordinates.
    #[error("a vertex needs two coordinates, {found} found")]
    NotAPair {
        /// Coordinates found.
        found: usize,
    },
    /// A row has another number of columns than needed.
    #[error("{found} column(s) found, {expected} needed")]
    ColumnCount {
        /// Columns found.
        found: usize,
        /// Columns needed.
        expected: usize,
    },
    /// The header does not name the coordinates.
    #[error("no `{missing}` column is named in the header")]
    Header {
        /// Name of the column that is missing.
        missing: &'static str,
    },
    /// The header has a column that is not known, or has it twice.
    #[error("the column `{name}` is not known, or is there twice")]
    HeaderColumn {
        /// Name of the column.
        name: String,
    },
    /// A comma may be a decimal mark or a separator.
    #[error("the comma in `{text}` may be a decimal mark or a separator")]
    AmbiguousDecimal {
        /// The text.
        text: String,
    },
    /// Decimal points and decimal commas in one file.
    #[error("`{text}` has another decimal mark than the numbers before it")]
    MixedDecimal {
        /// The text.
        text: String,
    },
    /// No unit for coordinates.
    #[error("the coordinates have no unit")]
    MissingUnit,
    /// The unit of the file and the unit asked for differ.
    #[error("the file gives the unit `{file}`, the option gives `{option}`")]
    UnitConflict {
        /// Unit in the file.
        file: String,
        /// Unit asked for.
        option: String,
    },
    /// A quantity or a unit that cannot be read.
    #[error("{source}")]
    Unit {
        /// What is wrong with it.
        source: UnitError,
    },
    /// The unit asked for cannot be read.
    #[error("the unit asked for: {source}")]
    UnitOption {
        /// What is wrong with it.
        source: UnitError,
    },
    /// The scale asked for is zero, negative, or not finite.
    #[error("the scale asked for is {metres} m; it must be above zero and finite")]
    ScaleNotPositive {
        /// The scale, m.
        metres: f64,
    },
    /// A loop label comes back after another one.
    #[error("loop `{label}` goes on here, but another loop came between")]
    LoopReopened {
        /// Label of the loop.
        label: String,
    },
    /// There is no vertex.
    #[error("there is no outline in the file")]
    NoOutline,
    /// The text is not TOML.
    #[error("not valid TOML: {message}")]
    Toml {
        /// What the TOML reader says.
        message: String,
    },
    /// A key that is not known.
    #[error("`{key}` is not a key of {table}")]
    UnknownKey {
        /// The key.
        key: String,
        /// Where it is.
        table: &'static str,
        /// Known key with the nearest spelling.
        nearest: Option<String>,
        /// All known keys.
        known: String,
    },
    /// A key that must be there.
    #[error("{table} has no `{key}`")]
    MissingKey {
        /// The key.
        key: &'static str,
        /// Where it should be.
        table: &'static str,
    },
    /// A value of the wrong type.
    #[error("`{key}` must be {expected}; this is of type {found}")]
    WrongType {
        /// The key.
        key: String,
        /// What it must be.
        expected: &'static str,
        /// What it is.
        found: &'static str,
    },
    /// Both a drawn outline and a nominal section.
    #[error("the section has both `[[lumen]]` and `[nominal]`")]
    TwoOutlines,
    /// A reach without sections.
    #[error("[reach] gives neither `inner` nor `outer`")]
    EmptyReach,
    /// The nominal section has no outline.
    #[error("{source}")]
    Nominal {
        /// What is wrong with it.
        source: NominalError,
    },
    /// A named wall cannot be used.
    #[error("{source}")]
    Wall {
        /// What is wrong with it.
        source: NamedWallError,
    },
    /// A section where an instrument's file is needed.
    #[error("this is a section already (read as `{kind}`), not the file of an instrument")]
    NotOfInstrument {
        /// What it is.
        kind: &'static str,
    },
    /// Something else where a trace is needed.
    #[error("this is not a trace")]
    NotATrace,
    /// Several sections where one is needed.
    #[error("there are {} channels: {}", list.len(), several(list))]
    SeveralSections {
        /// Each with its number and place.
        list: Vec<String>,
        /// Whether they come from the cuts of a height map.
        is_map: bool,
    },
    /// The text of a trace or a height map cannot be used.
    #[error("{source}")]
    Table {
        /// What is wrong with it.
        source: TableProblem,
    },
    /// A trace cannot be corrected.
    #[error("{source}")]
    Trace {
        /// What is wrong with it.
        source: TraceProblem,
    },
    /// A trace gives no section.
    #[error("{source}")]
    Groove {
        /// What is wrong with it.
        source: GrooveProblem,
    },
    /// A cut through a height map gives no section.
    #[error("{source}; the cut runs across grooves at {direction} against the x axis of the map")]
    Cut {
        /// Direction of the grooves.
        direction: String,
        /// What is wrong with it.
        source: Box<ReadProblem>,
    },
    /// A height map cannot be used.
    #[error("{source}")]
    Map {
        /// What is wrong with it.
        source: MapProblem,
    },
    /// A picture cannot be used.
    #[error("{source}")]
    Micrograph {
        /// What is wrong with it.
        source: MicrographProblem,
    },
    /// A route cannot be used.
    #[error("{source}")]
    Route {
        /// What is wrong with it.
        source: RouteProblem,
    },
    /// The file of a net, or a card that it names, cannot be used.
    #[error("{source}")]
    Network {
        /// What is wrong with it.
        source: NetworkProblem,
    },
    /// The drawing is not SVG.
    #[error("not a valid SVG drawing: {message}")]
    Svg {
        /// What the reader says.
        message: String,
    },
    /// An attribute of the drawing that cannot be read.
    #[error("`{name}` of `{element}` cannot be read from here on")]
    SvgAttribute {
        /// Name of the attribute.
        name: &'static str,
        /// Name of the element.
        element: String,
    },
    /// Something in the drawing that is not read.
    #[error("the drawing uses {what}, which is not read")]
    SvgUnsupported {
        /// What it uses.
        what: String,
    },
    /// The drawing states no scale.
    #[error("the drawing states no scale")]
    SvgNoScale,
    /// Width and height of the drawing give two scales.
    #[error(
        "the drawing's width gives {} per unit, its height {}",
        format_length(*horizontal),
        format_length(*vertical)
    )]
    SvgTwoScales {
        /// Metres per unit from the width.
        horizontal: f64,
        /// Metres per unit from the height.
        vertical: f64,
    },
    /// The section is so small or large that its unit is in doubt.
    #[error(
        "the section is {} wide and {} high; sizes from 10 nm to 50 mm are expected",
        format_length(*width),
        format_length(*height)
    )]
    ImplausibleSize {
        /// Width, m.
        width: f64,
        /// Height, m.
        height: f64,
        /// Unit that was used, where there is one.
        unit: Option<String>,
        /// Unit that would give a plausible size.
        likely: Option<&'static str>,
    },
}

impl ReadError {
    /// An error about a whole file.
    pub(crate) fn new(path: &str, problem: ReadProblem) -> Self {
        Self {
            path: path.to_owned(),
            place: None,
            problem: Box::new(problem),
        }
    }

    /// The same for a cut through a map; what the map itself says is not lost.
    ///
    /// - `direction`: of the grooves against the x axis, rad
    pub(crate) fn in_cut(self, direction: f64) -> Self {
        let problem = ReadProblem::Cut {
            direction: format!("{:.1} degrees", direction.to_degrees()),
            source: self.problem,
        };
        Self {
            problem: Box::new(problem),
            ..self
        }
    }

    /// Place before the message.
    fn prefix(&self) -> String {
        match &self.place {
            None => format!("{}: ", self.path),
            Some(place) => {
                let field = place.field.as_ref();
                let field = field.map(|name| format!("{name}: ")).unwrap_or_default();
                format!("{}:{}:{}: {field}", self.path, place.line, place.column)
            }
        }
    }

    /// Whether the file is unreadable or its unit in doubt; both end with exit status 3.
    pub fn exit_kind(&self) -> ReadErrorKind {
        let mut problem = &*self.problem;
        while let ReadProblem::Cut { source, .. } = problem {
            problem = source;
        }
        let in_doubt = match problem {
            ReadProblem::Table { source } => source.is_ambiguous(),
            ReadProblem::Trace { source } => source.is_ambiguous(),
            ReadProblem::Groove { source } => source.is_ambiguous(),
            ReadProblem::Map { source } => source.is_ambiguous(),
            ReadProblem::Micrograph { source } => source.is_ambiguous(),
            ReadProblem::AmbiguousDecimal { .. }
            | ReadProblem::MixedDecimal { .. }
            | ReadProblem::MissingUnit
            | ReadProblem::UnitConflict { .. }
            | ReadProblem::Unit {
                source:
                    UnitError::NoUnit { .. }
                    | UnitError::UnknownUnit { .. }
                    | UnitError::DestroyedCharacter { .. },
            }
            | ReadProblem::SeveralSections { .. }
            | ReadProblem::SvgNoScale
            | ReadProblem::SvgTwoScales { .. }
            | ReadProblem::ImplausibleSize { .. } => true,
            _ => false,
        };
        if in_doubt {
            ReadErrorKind::AmbiguousUnit
        } else {
            ReadErrorKind::Unreadable
        }
    }

    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        self.problem.hint()
    }

    /// The error for a terminal: message, place, the line with a caret, and the hint.
    pub fn explain(&self) -> String {
        let mut text = match &self.place {
            None => format!("error: {self}\n"),
            Some(place) => {
                let field = place.field.as_ref();
                let field = field.map(|name| format!("{name}: ")).unwrap_or_default();
                let gutter = " ".repeat(place.line.to_string().len());
                format!(
                    "error: {field}{}\n{gutter}--> {}:{}:{}\n{} | {}\n{gutter} | {}^\n",
                    self.problem,
                    self.path,
                    place.line,
                    place.column,
                    place.line,
                    place.excerpt,
                    " ".repeat(place.caret)
                )
            }
        };
        text.push_str("help: ");
        text.push_str(&self.hint());
        text.push('\n');
        text
    }
}

/// The first sections of a list, in words.
fn several(list: &[String]) -> String {
    let shown = list.iter().take(6).map(String::as_str);
    let mut text = shown.collect::<Vec<_>>().join("; ");
    if list.len() > 6 {
        text.push_str("; ...");
    }
    text
}

/// A problem with its place, before the path is known.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Fault {
    /// Where in the text.
    pub(crate) place: Option<Box<Place>>,
    /// What is wrong.
    pub(crate) problem: Box<ReadProblem>,
}

impl Fault {
    /// A problem at a byte offset of a text.
    pub(crate) fn at(text: &str, offset: usize, field: Option<&str>, problem: ReadProblem) -> Self {
        let mut place = super::source_text::place_at(text, offset);
        place.field = field.map(str::to_owned);
        Self {
            place: Some(Box::new(place)),
            problem: Box::new(problem),
        }
    }

    /// The error with its path.
    pub(crate) fn in_file(self, path: &str) -> ReadError {
        ReadError {
            path: path.to_owned(),
            place: self.place,
            problem: self.problem,
        }
    }
}

impl From<ReadProblem> for Fault {
    fn from(problem: ReadProblem) -> Self {
        Self {
            place: None,
            problem: Box::new(problem),
        }
    }
}

impl From<TableProblem> for Fault {
    fn from(source: TableProblem) -> Self {
        ReadProblem::Table { source }.into()
    }
}

impl From<TraceProblem> for Fault {
    fn from(source: TraceProblem) -> Self {
        ReadProblem::Trace { source }.into()
    }
}

impl From<GrooveProblem> for Fault {
    fn from(source: GrooveProblem) -> Self {
        ReadProblem::Groove { source }.into()
    }
}

impl From<MapProblem> for Fault {
    fn from(source: MapProblem) -> Self {
        ReadProblem::Map { source }.into()
    }
}

impl From<MicrographProblem> for Fault {
    fn from(source: MicrographProblem) -> Self {
        ReadProblem::Micrograph { source }.into()
    }
}
