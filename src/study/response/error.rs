//! What can be wrong with a response table that was asked for; each error says what to type instead.

use crate::flow::FlowError;
use crate::geometry::{FilmError, NominalError};
use crate::units::UnitError;

/// Most parameters varied at once.
pub const MOST_PARAMETERS: usize = 3;

/// Why there is no response table.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ResponseError {
    /// No parameter is varied.
    #[error("no parameter is varied")]
    NothingVaried,
    /// Too many parameters are varied.
    #[error("{count} parameters are varied, and a table has at most {MOST_PARAMETERS}")]
    TooMany {
        /// How many.
        count: usize,
    },
    /// A text is not a parameter with a range.
    #[error("`{text}` is not a parameter with a range")]
    NotARange {
        /// The text.
        text: String,
    },
    /// A range cannot be read.
    #[error("the range of `{parameter}`: {source}")]
    Unit {
        /// The parameter.
        parameter: String,
        /// A range as it could be written.
        example: &'static str,
        /// What is wrong.
        source: UnitError,
    },
    /// A relative change is written neither in per cent nor as a length.
    #[error("`{parameter}={range}` is not a relative change")]
    NotRelative {
        /// The parameter.
        parameter: String,
        /// The range as written.
        range: String,
    },
    /// A range is empty or reversed.
    #[error("the range `{range}` of `{parameter}` {problem}")]
    EmptyRange {
        /// The parameter.
        parameter: String,
        /// The range as written.
        range: String,
        /// `is empty` or `is reversed`.
        problem: &'static str,
    },
    /// A parameter is varied twice.
    #[error("`{parameter}` is varied twice")]
    Twice {
        /// The parameter.
        parameter: String,
    },
    /// A parameter is fixed and varied.
    #[error("`{parameter}` is both varied and fixed")]
    FixedAndVaried {
        /// The parameter.
        parameter: String,
    },
    /// The section has no such parameter.
    #[error("{owner} has no parameter `{parameter}` to vary")]
    UnknownParameter {
        /// The kind or the section.
        owner: String,
        /// The parameter as written.
        parameter: String,
        /// The nearest spelling, where one is near.
        nearest: Option<String>,
        /// All that can be varied.
        known: String,
    },
    /// A wall motion that this section does not have.
    #[error("`{parameter}` moves nothing here: {reason}")]
    NoMotion {
        /// The case.
        parameter: String,
        /// Why.
        reason: String,
        /// All that can be varied.
        known: String,
    },
    /// A parameter that is no measure.
    #[error("`{parameter}` is {quantity}, which has no range")]
    NotAMeasure {
        /// The parameter.
        parameter: String,
        /// What it is.
        quantity: String,
    },
    /// A film cannot be thinner than none.
    #[error("the range `{range}` of `film` begins below zero")]
    NegativeFilm {
        /// The range as written.
        range: String,
    },
    /// A section within the ranges cannot be made.
    #[error("at {place}: {source}")]
    Point {
        /// The values of the parameters.
        place: String,
        /// What is wrong there.
        source: Box<PointError>,
    },
    /// The fit could not be worked out.
    #[error("the least-squares fit failed: {reason}")]
    Fit {
        /// What failed.
        reason: &'static str,
    },
}

/// What is wrong with one section of the table.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum PointError {
    /// The nominal section.
    #[error(transparent)]
    Nominal(#[from] NominalError),
    /// The moved outline.
    #[error("the moved outline crosses or touches itself")]
    Crossed,
    /// The film.
    #[error(transparent)]
    Film(#[from] FilmError),
    /// The solve.
    #[error("the section was not solved: {0}")]
    Flow(#[from] FlowError),
    /// The solver stopped before its residual was reached.
    #[error("the solver stopped early")]
    Unfinished,
}

impl ResponseError {
    /// What to try, one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::NothingVaried => {
                "name a parameter and its range, for example --vary depth=20..40um".to_owned()
            }
            Self::TooMany { .. } => {
                "fix the others, or make tables for several values of them".to_owned()
            }
            Self::NotARange { .. } => {
                "write NAME=LOW..HIGH with a unit, for example --vary depth=20..40um".to_owned()
            }
            Self::Unit {
                parameter,
                example,
                source,
            } => match source {
                UnitError::NoUnit { .. } => {
                    format!("write the unit, for example --vary {parameter}={example}")
                }
                _ => format!(
                    "write for example --vary {parameter}={example}; {}",
                    source.hint()
                ),
            },
            Self::NotRelative { parameter, .. } if parameter == "scale" => {
                "write it in per cent, for example --vary scale=-2..2%".to_owned()
            }
            Self::NotRelative { parameter, .. } => format!(
                "write it in per cent or as a change of length: --vary {parameter}=-5..5% or --vary \
                 {parameter}=-2..2um"
            ),
            Self::EmptyRange { parameter, .. } => format!(
                "write the smaller value first and a larger one after it, for example --vary \
                 {parameter}=20..40um"
            ),
            Self::Twice { .. } => "give one range for each parameter".to_owned(),
            Self::FixedAndVaried { parameter } => {
                format!("leave out --with {parameter}=..., or do not vary it")
            }
            Self::UnknownParameter { nearest, known, .. } => match nearest {
                Some(near) => format!("did you mean `{near}`? To vary: {known}"),
                None => format!("to vary: {known}"),
            },
            Self::NoMotion { known, .. } => format!("to vary: {known}"),
            Self::NotAMeasure { parameter, .. } => {
                format!(
                    "fix it with --with {parameter}=..., and vary a length, an angle or a ratio"
                )
            }
            Self::NegativeFilm { .. } => {
                "begin at 0um; walls that recede are --vary over_etch=0..2um".to_owned()
            }
            Self::Point { source, .. } => source.hint(),
            Self::Fit { .. } => "narrow the ranges".to_owned(),
        }
    }
}

impl PointError {
    /// What to try, one sentence.
    fn hint(&self) -> String {
        match self {
            Self::Nominal(error) => match error {
                NominalError::Missing {
                    parameter, example, ..
                } => format!("add --with \"{parameter}={example}\""),
                NominalError::Unit {
                    parameter, example, ..
                }
                | NominalError::NotReadable {
                    parameter, example, ..
                }
                | NominalError::BareNumber {
                    parameter, example, ..
                } => format!("write for example --with \"{parameter}={example}\""),
                NominalError::OutOfRange { .. }
                | NominalError::PostMeets { .. }
                | NominalError::PostOutside { .. }
                | NominalError::NoArea { .. } => format!(
                    "{}; change the range or the fixed value so that this place is left out",
                    error.hint()
                ),
                _ => error.hint(),
            },
            Self::Crossed => {
                "narrow the ranges: so large a motion closes or crosses the walls".to_owned()
            }
            Self::Film(error) => format!("{}; lower the high end of its range", error.hint()),
            Self::Flow(error) => format!("{}, or narrow the ranges", error.hint()),
            Self::Unfinished => "narrow the ranges, or simplify the outline".to_owned(),
        }
    }
}
