//! An error on its way to the terminal: `error: ...`, the place in the file, `help: ...`.

use std::fmt::Write as _;

use crate::flow::{FlowError, FluidError, OperatingPointError};
use crate::geometry::{FilmError, NominalError};
use crate::grid::ResolutionError;
use crate::intake::ReadError;
use crate::report::{PictureError, VtkError, WriteError};
use crate::study::{ReachError, RouteError};
use crate::units::UnitError;

use super::exit_status::ExitStatus;
use super::output;

/// What to print and with which status to end.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(super) struct Failure {
    pub(super) status: ExitStatus,
    /// Message, place and help as lines.
    pub(super) text: String,
}

impl Failure {
    pub(super) fn new(status: ExitStatus, message: impl std::fmt::Display, help: &str) -> Self {
        let mut text = format!("error: {message}");
        if !help.is_empty() {
            let _ = write!(text, "\nhelp: {help}");
        }
        Self { status, text }
    }

    pub(super) fn usage(message: impl std::fmt::Display, help: &str) -> Self {
        Self::new(ExitStatus::Usage, message, help)
    }

    /// A value of an option that cannot be read.
    pub(super) fn option(option: &str, error: &UnitError) -> Self {
        Self::usage(format!("--{option}: {error}"), &error.hint())
    }

    /// The same with what it is about before the message.
    pub(super) fn of(self, what: &str) -> Self {
        let text = match self.text.strip_prefix("error: ") {
            Some(rest) => format!("error: {what}: {rest}"),
            None => self.text,
        };
        Self { text, ..self }
    }

    /// A result that has no text form.
    pub(super) fn not_printed(error: impl std::fmt::Display) -> Self {
        Self::new(
            ExitStatus::Unreadable,
            format!("the result cannot be printed: {error}"),
            "",
        )
    }

    pub(super) fn print(&self) {
        output::talk(&self.text);
    }
}

impl From<ReadError> for Failure {
    fn from(error: ReadError) -> Self {
        Self {
            status: ExitStatus::Unreadable,
            text: error.explain(),
        }
    }
}

impl From<FlowError> for Failure {
    fn from(error: FlowError) -> Self {
        let status = match &error {
            FlowError::Resolution(ResolutionError::TooCoarse { .. }) => ExitStatus::Usage,
            FlowError::Resolution(ResolutionError::TooThin { .. }) => ExitStatus::OutsideValidity,
            FlowError::NoArea { .. } => ExitStatus::Unreadable,
            _ => ExitStatus::NotSolved,
        };
        Self::new(status, &error, &error.hint())
    }
}

impl From<FilmError> for Failure {
    fn from(error: FilmError) -> Self {
        let status = match error {
            FilmError::NotPositive { .. } | FilmError::TooThin { .. } => ExitStatus::Usage,
            FilmError::Failed { .. } => ExitStatus::NotSolved,
            _ => ExitStatus::OutsideValidity,
        };
        Self::new(status, &error, error.hint())
    }
}

impl From<ReachError> for Failure {
    fn from(error: ReachError) -> Self {
        match &error {
            ReachError::Flow { error: inner, .. } => {
                let status = Self::from(inner.clone()).status;
                Self::new(status, &error, &error.hint())
            }
            _ => Self::new(ExitStatus::Unreadable, &error, &error.hint()),
        }
    }
}

impl From<RouteError> for Failure {
    fn from(error: RouteError) -> Self {
        let status = match &error {
            RouteError::Flow { error, .. } => Self::from(error.clone()).status,
            _ => ExitStatus::Unreadable,
        };
        Self::new(status, &error, &error.hint())
    }
}

impl From<NominalError> for Failure {
    fn from(error: NominalError) -> Self {
        Self::usage(&error, &error.hint())
    }
}

impl From<FluidError> for Failure {
    fn from(error: FluidError) -> Self {
        Self::usage(&error, &error.hint())
    }
}

impl From<OperatingPointError> for Failure {
    fn from(error: OperatingPointError) -> Self {
        Self::usage(&error, &error.hint())
    }
}

impl From<WriteError> for Failure {
    fn from(error: WriteError) -> Self {
        let status = match error {
            WriteError::NamedTwice { .. } | WriteError::IsDash => ExitStatus::Usage,
            _ => ExitStatus::Unreadable,
        };
        Self::new(status, &error, "")
    }
}

impl From<PictureError> for Failure {
    fn from(error: PictureError) -> Self {
        Self::usage(&error, "")
    }
}

impl From<VtkError> for Failure {
    fn from(error: VtkError) -> Self {
        Self::new(
            ExitStatus::Unreadable,
            &error,
            "write the field without --vtk and report this",
        )
    }
}
