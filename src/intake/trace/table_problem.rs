//! What can be wrong with the text of a trace or a height map.

use crate::units::format_length;

/// The two quantities of a trace, for messages.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum TableAxis {
    /// Positions along the line.
    Positions,
    /// Heights.
    Heights,
}

impl TableAxis {
    /// Its name in messages.
    pub fn name(self) -> &'static str {
        match self {
            Self::Positions => "positions",
            Self::Heights => "heights",
        }
    }

    /// The option that gives its unit.
    pub fn unit_option(self) -> &'static str {
        match self {
            Self::Positions => "--x-unit",
            Self::Heights => "--z-unit",
        }
    }

    /// The unit shown as an example in messages.
    fn example(self) -> &'static str {
        match self {
            Self::Positions => "um",
            Self::Heights => "nm",
        }
    }
}

impl std::fmt::Display for TableAxis {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.name())
    }
}

/// What is wrong with the text of a trace or a height map.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TableProblem {
    /// There are no numbers in rows.
    #[error("the text holds no rows of numbers")]
    NoNumbers,
    /// Text stands between rows of numbers.
    #[error("`{text}` stands between rows of numbers")]
    TextWithin {
        /// The text.
        text: String,
    },
    /// More lines of text than a header has.
    #[error("there are more than {limit} lines that are not numbers")]
    TooMuchText {
        /// Limit.
        limit: usize,
    },
    /// A line is too long.
    #[error("a line has {bytes} bytes, the limit is {limit} bytes")]
    LongLine {
        /// Length.
        bytes: usize,
        /// Limit.
        limit: usize,
    },
    /// There are too many samples.
    #[error("the table holds {found} samples, the limit is {limit}")]
    TooManySamples {
        /// Samples found.
        found: usize,
        /// Limit.
        limit: usize,
    },
    /// A trace or a map of too few samples.
    #[error("{found} sample(s) found, at least {needed} needed")]
    TooFewSamples {
        /// Samples found.
        found: usize,
        /// Samples needed.
        needed: usize,
    },
    /// A comma may be a decimal mark or a separator.
    #[error("the commas in `{text}` may be decimal marks or separators")]
    DecimalInDoubt {
        /// The text.
        text: String,
    },
    /// Commas are the only marks between columns and are also said to be decimal marks.
    #[error("`{text}` has no other separator than the comma, which is said to be the decimal mark")]
    DecimalIsSeparator {
        /// The text.
        text: String,
    },
    /// Text where a number is needed.
    #[error("`{text}` is not a number")]
    NotANumber {
        /// The text.
        text: String,
    },
    /// A row has another number of columns than the others.
    #[error("{found} column(s) found, the other rows have {expected}")]
    RowLength {
        /// Columns found.
        found: usize,
        /// Columns of the other rows.
        expected: usize,
    },
    /// A blank line inside a single column of heights.
    #[error("a blank line stands inside a single column of heights")]
    BlankWithin,
    /// No unit for one axis.
    #[error("the {axis} have no unit")]
    MissingUnit {
        /// Which axis.
        axis: TableAxis,
        /// The one unit in which the numbers would be plausible, where there is only one.
        likely: Option<&'static str>,
    },
    /// The sign in a unit was destroyed.
    #[error("a character of the unit `{text}` of the {axis} was destroyed by a change of encoding")]
    DestroyedUnit {
        /// Which axis.
        axis: TableAxis,
        /// The unit as written.
        text: String,
    },
    /// A length that is needed has a destroyed unit.
    #[error("a character of the unit in `{text}` was destroyed by a change of encoding")]
    DestroyedLength {
        /// The value as written.
        text: String,
        /// The option that gives the length instead.
        option: &'static str,
    },
    /// A unit that is not read.
    #[error("`{unit}`, the unit of the {axis}, is not a unit of length that is read")]
    UnknownUnit {
        /// Which axis.
        axis: TableAxis,
        /// The unit as written.
        unit: String,
    },
    /// The column line and the header name different units.
    #[error("the unit of the {axis} is `{column}` in the column line and `{header}` in the header")]
    UnitConflict {
        /// Which axis.
        axis: TableAxis,
        /// Unit of the column.
        column: String,
        /// Unit of the header.
        header: String,
    },
    /// A column of another quantity.
    #[error("the column `{column}` is in `{unit}`, which is no length, and cannot be the {axis}")]
    NotALength {
        /// Which axis.
        axis: TableAxis,
        /// The column.
        column: String,
        /// Its unit.
        unit: String,
    },
    /// The column asked for is not there.
    #[error("there is no column `{name}`; there are {known}")]
    NoSuchColumn {
        /// Name or number asked for.
        name: String,
        /// Columns there are.
        known: String,
    },
    /// Positions and heights from one column.
    #[error("positions and heights cannot both be the column `{name}`")]
    SameColumn {
        /// The column.
        name: String,
    },
    /// Several columns may be the heights.
    #[error("several columns may hold the heights: {columns}")]
    SeveralHeights {
        /// The columns.
        columns: String,
    },
    /// Several columns may be the positions.
    #[error("several columns may hold the positions: {columns}")]
    SeveralPositions {
        /// The columns.
        columns: String,
    },
    /// No column may be the heights.
    #[error("no column of heights is named; there are {columns}")]
    NoHeightColumn {
        /// The columns.
        columns: String,
    },
    /// The table has no positions and no step.
    #[error("the table has heights but no positions, and nothing says the distance of the samples")]
    NoPositions,
    /// The step asked for is zero, negative or not finite.
    #[error("the distance of samples asked for is {metres} m; it must be above zero and finite")]
    StepNotPositive {
        /// The step, m.
        metres: f64,
    },
    /// The step asked for contradicts the positions.
    #[error(
        "the positions are {} apart, the distance asked for is {}",
        format_length(*file),
        format_length(*option)
    )]
    StepConflict {
        /// Mean distance of the positions, m.
        file: f64,
        /// The step asked for, m.
        option: f64,
    },
    /// The positions go back and forth.
    #[error("the positions go back here, from {before} to {here}")]
    BackAndForth {
        /// Position before, as written.
        before: String,
        /// Position here, as written.
        here: String,
    },
    /// The same position twice.
    #[error("the position {text} is there twice, and rounding does not explain it")]
    RepeatedPosition {
        /// Position as written.
        text: String,
    },
    /// Every height is missing.
    #[error("every height is missing")]
    NoHeights,
    /// The range of positions or heights is implausible.
    #[error(
        "the {axis} span {}; from {} to {} is expected",
        format_length(*span),
        format_length(*smallest),
        format_length(*largest)
    )]
    Implausible {
        /// Which axis.
        axis: TableAxis,
        /// Range, m.
        span: f64,
        /// Smallest plausible range, m.
        smallest: f64,
        /// Largest plausible range, m.
        largest: f64,
        /// Unit that was used.
        unit: String,
        /// The one unit that would be plausible, where there is only one.
        likely: Option<&'static str>,
    },
    /// Heights over an area where a trace is asked for.
    #[error("the table holds heights over an area, not along a line")]
    AreaNotTrace,
    /// A trace where heights over an area are asked for.
    #[error("the table holds heights along a line, not over an area")]
    TraceNotArea,
    /// A matrix without the distance of its points.
    #[error("nothing says the distance of the points along {direction}")]
    NoSpacing {
        /// `x` or `y`.
        direction: &'static str,
        /// The option that gives it.
        option: &'static str,
    },
    /// Points that lie on no rectangular grid.
    #[error("the points lie on no rectangular grid along {direction}: {reason}")]
    NotALattice {
        /// `x` or `y`.
        direction: &'static str,
        /// What is wrong with the grid.
        reason: String,
    },
    /// A point without its place.
    #[error("a point has no place")]
    PointWithoutPlace,
    /// A place of the grid has two heights.
    #[error("two points lie at the same place")]
    RepeatedPoint,
}

impl TableProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::MissingUnit { axis, likely } => {
                let seen = likely.map_or(String::new(), |unit| {
                    format!("; of the common units only `{unit}` gives a plausible size")
                });
                format!(
                    "add `--x-unit um --z-unit nm` with the units of the file, or write the unit of the {axis} \
                     in the column line, such as `x_um,z_nm`{seen}"
                )
            }
            Self::DestroyedUnit { axis, .. } | Self::UnknownUnit { axis, .. } => format!(
                "say which unit it is: add `{} {}`, or another of m, cm, mm, um, nm, pm, A, in, mil",
                axis.unit_option(),
                axis.example()
            ),
            Self::UnitConflict { axis, column, .. } => format!(
                "add `{} {column}` if the column line is right; else correct the unit in the column line",
                axis.unit_option()
            ),
            Self::DestroyedLength { option, .. } => {
                format!("give the length itself: add `{option} \"0.5 um\"`")
            }
            Self::NotALength { .. } | Self::NoSuchColumn { .. } | Self::SameColumn { .. } => {
                "choose by `--x-column` and `--z-column`, each with a name or a number from 1"
                    .to_owned()
            }
            Self::SeveralHeights { .. } | Self::NoHeightColumn { .. } => {
                "say which one by `--z-column`, with its name or its number from 1".to_owned()
            }
            Self::SeveralPositions { .. } => {
                "say which one by `--x-column`, with its name or its number from 1".to_owned()
            }
            Self::NoSpacing { option, .. } => {
                format!("add `{option} \"0.5 um\"` with the distance of neighbouring points")
            }
            Self::Implausible {
                axis, unit, likely, ..
            } => {
                let change = likely.map_or("check the unit and the numbers".to_owned(), |likely| {
                    format!(
                        "the unit `{unit}` may be wrong; with `{likely}` ({} {likely}) the size is plausible",
                        axis.unit_option()
                    )
                });
                format!("{change}; or allow it with --allow-any-size")
            }
            other => other.fixed_hint().to_owned(),
        }
    }

    /// Hints without words of their own.
    fn fixed_hint(&self) -> &'static str {
        match self {
            Self::NoNumbers => {
                "give one sample a line, position and height, with or without lines of text above; \
                 units belong in the column line, not behind each number"
            }
            Self::TextWithin { .. } => {
                "correct the line, or keep one table in the file; a missing value is written NaN"
            }
            Self::TooMuchText { .. } => "cut the file down to one table and its header",
            Self::LongLine { .. } => {
                "check the line ends of the file; it may be no table of numbers"
            }
            Self::TooManySamples { .. } => "cut the file down to the part that matters",
            Self::TooFewSamples { .. } => "check that the file is complete",
            Self::DecimalInDoubt { .. } => {
                "add `--decimal comma` or `--decimal point`; where commas do both, export the file \
                 again with semicolons or tabs between the columns"
            }
            Self::DecimalIsSeparator { .. } => {
                "export the file again with semicolons or tabs between the columns, or leave \
                 `--decimal comma` out"
            }
            Self::NotANumber { .. } => {
                "write a plain number without thousands separators; a missing value is written NaN"
            }
            Self::RowLength { .. } => {
                "correct the row; if its commas are decimal marks add `--decimal comma`; thousands \
                 separators are not read"
            }
            Self::BlankWithin => "take the line out, or write NaN where a height is missing",
            Self::NoPositions => {
                "add `--x-step \"0.5 um\"` with the distance of the samples, or name the positions by \
                 `--x-column`"
            }
            Self::StepNotPositive { .. } => "give a length such as `--x-step \"0.5 um\"`",
            Self::StepConflict { .. } => {
                "leave `--x-step` out, or correct the unit of the positions by `--x-unit`"
            }
            Self::BackAndForth { .. } => {
                "keep one pass in the file; or name the positions by `--x-column`; a closed section is \
                 read with `--as outline`"
            }
            Self::RepeatedPosition { .. } => {
                "keep one height for each position, or export positions with more decimals"
            }
            Self::NoHeights => "name the heights by `--z-column`, or check the measurement",
            Self::AreaNotTrace => {
                "read it as a height map, or name two of its columns by `--x-column` and `--z-column`"
            }
            Self::TraceNotArea => "read it as a trace",
            Self::NotALattice { .. } => "export the map on its rectangular grid",
            Self::PointWithoutPlace => "write numbers for x and y; only a height may be missing",
            Self::RepeatedPoint => "keep one height for each place",
            _ => "correct the file",
        }
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        matches!(
            self,
            Self::DecimalInDoubt { .. }
                | Self::DecimalIsSeparator { .. }
                | Self::MissingUnit { .. }
                | Self::DestroyedUnit { .. }
                | Self::DestroyedLength { .. }
                | Self::UnknownUnit { .. }
                | Self::UnitConflict { .. }
                | Self::NotALength { .. }
                | Self::SeveralHeights { .. }
                | Self::SeveralPositions { .. }
                | Self::NoHeightColumn { .. }
                | Self::NoPositions
                | Self::StepConflict { .. }
                | Self::Implausible { .. }
                | Self::NoSpacing { .. }
        )
    }
}
