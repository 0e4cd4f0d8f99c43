//! From the FILE argument to a checked section.

use std::fmt::Write as _;
use std::path::{Path, PathBuf};

use clap::ArgMatches;

use crate::geometry::Outline;
use crate::intake::{Provenance, ReadOptions, Section, SectionKind, read_section};
use crate::report::SourceRecord;
use crate::units;
use crate::warning::{Code, Warning};

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::instrument_arguments::is_for;
use super::instrument_options::{check_unit, instrument};

/// Problems shown with an outline that cannot be solved.
const PROBLEMS_SHOWN: usize = 5;

/// A section ready to solve.
pub(super) struct CheckedSection {
    pub(super) section: Section,
    pub(super) outline: Outline,
    pub(super) warnings: Vec<Warning>,
}

/// The FILE argument.
pub(super) fn file(matches: &ArgMatches) -> PathBuf {
    matches
        .get_one::<PathBuf>("file")
        .cloned()
        .unwrap_or_default()
}

/// Every file that is read, so that none is written over.
pub(super) fn files_read<'a>(file: &'a Path, options: &'a ReadOptions) -> Vec<&'a Path> {
    let how = &options.instrument;
    let further = how.repeats.iter().chain(&how.lid_trace);
    std::iter::once(file)
        .chain(further.map(PathBuf::as_path))
        .collect()
}

/// The section's own name, or that of its file.
pub(super) fn section_name(section: &Section, file: &Path) -> String {
    section.name.clone().unwrap_or_else(|| {
        file.file_stem().map_or_else(
            || "section".to_owned(),
            |s| s.to_string_lossy().into_owned(),
        )
    })
}

/// Where a section came from, for the outputs.
pub(super) fn source_record(provenance: &Provenance) -> SourceRecord<'_> {
    SourceRecord {
        path: &provenance.path,
        sha256: &provenance.sha256,
        kind: provenance.kind.word(),
        notes: &provenance.notes,
    }
}

/// The options that say how a file is to be read.
pub(super) fn read_options(matches: &ArgMatches) -> Result<ReadOptions, Failure> {
    let mut options = ReadOptions::default();
    if let Some(kind) = matches.get_one::<String>("as") {
        options.as_kind = Some(SectionKind::from_word(kind).ok_or_else(|| {
            Failure::usage(
                format!("--as: `{kind}` is not a kind of input"),
                "use section, outline, svg, trace, map or image",
            )
        })?);
    }
    if let Some(unit) = matches.get_one::<String>("unit") {
        check_unit("unit", unit)?;
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
    options.allow_any_size = matches.get_flag("allow-any-size");
    options.instrument = instrument(matches, &options)?;
    Ok(options)
}

/// Reads a file; a scale for drawings must be of use.
pub(super) fn read(path: &Path, options: &ReadOptions) -> Result<Section, Failure> {
    let section = read_section(path, options)?;
    let kind = section.provenance.kind;
    let has_scale = matches!(kind, SectionKind::OutlineSvg | SectionKind::Micrograph);
    if options.svg_scale.is_some() && !has_scale {
        return Err(Failure::usage(
            format!(
                "--scale is for drawings and pictures, and {} was read as `{kind}`",
                section.provenance.path
            ),
            "leave it out; --unit names the unit of coordinates without one",
        ));
    }
    refuse_foreign_options(options, &section.provenance)?;
    Ok(section)
}

/// Refuses options that mean nothing for what was read.
pub(super) fn refuse_foreign_options(
    options: &ReadOptions,
    provenance: &Provenance,
) -> Result<(), Failure> {
    let kind = provenance.kind.word();
    let typed = options.instrument.settings.iter().map(|(name, _)| name);
    let mut foreign = typed.filter(|name| !is_for(name.trim_start_matches('-'), kind));
    match foreign.next() {
        None => Ok(()),
        Some(name) => Err(Failure::usage(
            format!(
                "{name} has no meaning here: {} was read as `{kind}`",
                provenance.path
            ),
            "leave it out, or say by --as what the file is",
        )),
    }
}

/// Refuses an outline with problems; `name` says whose it is, `advice` follows the remedy.
pub(super) fn refuse_problems(outline: &Outline, name: &str, advice: &str) -> Result<(), Failure> {
    let problems = outline.problems();
    if !problems.has_errors() {
        return Ok(());
    }
    let errors: Vec<_> = problems.errors().collect();
    let mut text = format!("{name}: the outline cannot be used");
    for problem in errors.iter().take(PROBLEMS_SHOWN) {
        let _ = write!(text, "\n  {problem}");
    }
    if errors.len() > PROBLEMS_SHOWN {
        let _ = write!(text, "\n  and {} more", errors.len() - PROBLEMS_SHOWN);
    }
    let remedy = errors.first().map_or("", |problem| problem.remedy());
    let help = format!("{remedy}{advice}");
    Err(Failure::new(ExitStatus::Unreadable, text, &help))
}

/// Reads a file and refuses an outline with problems.
pub(super) fn checked_section(
    path: &Path,
    options: &ReadOptions,
) -> Result<CheckedSection, Failure> {
    let section = read(path, options)?;
    let advice = format!("; `etchwise check {}` lists all problems", path.display());
    checked(section, &path.display().to_string(), &advice)
}

/// Refuses an outline with problems; `name` says whose it is, `advice` follows the remedy.
pub(super) fn checked(
    section: Section,
    name: &str,
    advice: &str,
) -> Result<CheckedSection, Failure> {
    refuse_problems(&section.outline, name, advice)?;
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
