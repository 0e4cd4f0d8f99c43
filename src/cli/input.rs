//! From the FILE argument to a checked section.

use std::path::Path;

use clap::ArgMatches;

use crate::geometry::{Outline, Severity};
use crate::intake::{ReadOptions, Section, read_section};
use crate::units;
use crate::warning::{Code, Warning};

use super::exit_status::ExitStatus;
use super::failure::Failure;

/// Problems shown with an outline that cannot be solved.
const PROBLEMS_SHOWN: usize = 5;

/// A section ready to solve.
pub(super) struct CheckedSection {
    pub(super) section: Section,
    pub(super) outline: Outline,
    pub(super) warnings: Vec<Warning>,
}

/// The options that say how a file is to be read.
pub(super) fn read_options(matches: &ArgMatches) -> Result<ReadOptions, Failure> {
    let mut options = ReadOptions::default();
    if let Some(kind) = matches.get_one::<String>("as") {
        options.as_kind = Some(kind.parse().map_err(|_| {
            Failure::usage(
                format!("--as: `{kind}` is not a kind of input"),
                "use section, outline or drawing",
            )
        })?);
    }
    if let Some(unit) = matches.get_one::<String>("unit") {
        if units::length_unit(unit).is_none() {
            return Err(Failure::usage(
                format!("--unit: `{unit}` is not a unit of length"),
                "use m, mm, um, nm, inch or mil",
            ));
        }
        options.unit = Some(unit.clone());
    }
    if let Some(text) = matches.get_one::<String>("scale") {
        let scale = units::parse_length(text).map_err(|e| Failure::option("scale", &e))?;
        if scale <= 0.0 {
            return Err(Failure::usage(
                format!("--scale: {text} is not positive"),
                "give the length of one drawing unit, for example `1 um`",
            ));
        }
        options.svg_scale = Some(scale);
    }
    options.allow_any_size = matches.get_flag("any-size");
    Ok(options)
}

/// Reads a file and refuses an outline with problems.
pub(super) fn checked_section(
    path: &Path,
    options: &ReadOptions,
) -> Result<CheckedSection, Failure> {
    let section = read_section(path, options)?;
    let problems = section.outline.problems();
    let errors: Vec<_> = problems
        .iter()
        .filter(|problem| problem.severity() == Severity::Error)
        .collect();
    if let Some(first) = errors.first() {
        let mut text = format!(
            "{}: the outline has {} problem(s)",
            path.display(),
            errors.len()
        );
        for problem in errors.iter().take(PROBLEMS_SHOWN) {
            text.push_str(&format!("\n  {problem}"));
        }
        let help = format!(
            "{}; `etchwise check {}` lists all problems",
            first.remedy(),
            path.display()
        );
        return Err(Failure::new(ExitStatus::Unreadable, text, &help));
    }
    let (outline, dropped) = section.outline.clone().without_duplicate_vertices();
    let mut warnings = section.warnings.clone();
    if dropped > 0 {
        warnings.push(Warning {
            code: Code::DuplicateVerticesRemoved,
            message: format!("{dropped} vertices that repeat the one before were dropped"),
            advice: "nothing to do: the outline is the same without them".to_owned(),
            numbers: vec![("vertices", dropped as f64)],
        });
    }
    Ok(CheckedSection {
        section,
        outline,
        warnings,
    })
}
