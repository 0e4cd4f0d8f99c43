//! A section as read: its outline in metres and where it came from.

use std::path::Path;

use super::content_kind::{FileContent, content_of};
use super::instrument::{InstrumentOptions, Intake, read_instrument_content};
use super::limits::{MAX_FILE_BYTES, MAX_MARKUP_BYTES, check_file_size};
use super::loop_nesting::assemble;
use super::plausibility::check_size;
use super::provenance::{Provenance, SectionKind, sha256_hex};
use super::read_error::{Fault, ReadError, ReadProblem};
use super::section_reach::Reach;
use super::source_text::{SourceText, read_bytes};
use super::{outline_svg, outline_text, section_file};
use crate::geometry::nominal::NominalSpec;
use crate::geometry::{Outline, WallStretch};
use crate::units::{UnitScale, length_scale, parse_length};
use crate::warning::Warning;

/// What the caller knows about a file.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct ReadOptions {
    /// The kind of the content; found from the content when `None`.
    pub as_kind: Option<SectionKind>,
    /// Unit of bare coordinates: a unit such as `um`, or a length such as `0.16 um` for one unit.
    pub unit: Option<String>,
    /// Length of one user unit of an SVG drawing, m.
    pub svg_scale: Option<f64>,
    /// Take sections outside 10 nm to 50 mm.
    pub allow_any_size: bool,
    /// Keep coordinates that are infinite or not a number, so that [`Outline::problems`] lists them all;
    /// otherwise reading stops at the first.
    pub keep_non_finite: bool,
    /// How the file of an instrument becomes sections.
    pub instrument: InstrumentOptions,
}

/// Further tables of a section file.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Extras {
    /// `[source]`: where the section came from, as it is.
    pub source: Option<toml::Table>,
    /// `[uncertainty]`: what is known about its accuracy, as it is.
    pub uncertainty: Option<toml::Table>,
    /// `[reach]`: the smallest and the largest section it could be.
    pub reach: Option<Reach>,
}

/// A section as read.
#[derive(Debug, Clone, PartialEq)]
pub struct Section {
    /// Its name, where the file gives one.
    pub name: Option<String>,
    /// Its outline in metres, `y` upwards; loops that were drawn keep their direction and first vertex.
    pub outline: Outline,
    /// Number in the file, from 0, of each loop of the outline, in the order of [`Outline::loops`].
    pub loop_numbers: Vec<usize>,
    /// The nominal section it was made from, where it is one.
    pub nominal: Option<NominalSpec>,
    /// Stretches of wall with names, arc lengths along the oriented outline.
    pub walls: Vec<WallStretch>,
    /// Where it came from.
    pub provenance: Provenance,
    /// Further tables.
    pub extras: Extras,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
    /// How it came out of an instrument's file; empty where it was given as an outline.
    pub intake: Intake,
}

/// The unit asked for, resolved.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct UnitOption {
    /// As written.
    pub(crate) word: String,
    /// Its size.
    pub(crate) scale: UnitScale,
}

impl UnitOption {
    pub(super) fn resolve(options: &ReadOptions) -> Result<Option<Self>, ReadProblem> {
        options.unit.as_deref().map(Self::from_word).transpose()
    }

    /// The unit by its word, or by the length of one unit.
    pub(crate) fn from_word(word: &str) -> Result<Self, ReadProblem> {
        let scale = match length_scale(word.trim()) {
            Some(scale) => scale,
            None if word
                .trim()
                .starts_with(|c: char| c.is_ascii_digit() || c == '.') =>
            {
                let metres =
                    parse_length(word).map_err(|source| ReadProblem::UnitOption { source })?;
                check_scale(metres)?;
                UnitScale::from_factor(metres)
            }
            None => super::columns::known_length(word.trim())
                .map_err(|source| ReadProblem::UnitOption { source })?,
        };
        Ok(Self {
            word: word.trim().to_owned(),
            scale,
        })
    }

    /// Refuses a unit in the file that differs from the one asked for.
    pub(crate) fn must_agree(&self, unit: &str, scale: UnitScale) -> Result<(), ReadProblem> {
        if (scale.factor() / self.scale.factor() - 1.0).abs() < 1e-12 {
            return Ok(());
        }
        Err(ReadProblem::UnitConflict {
            file: unit.to_owned(),
            option: self.word.clone(),
        })
    }
}

/// Refuses a length of one unit that is zero, negative or not finite.
fn check_scale(metres: f64) -> Result<(), ReadProblem> {
    if metres.is_finite() && metres > 0.0 {
        return Ok(());
    }
    Err(ReadProblem::ScaleNotPositive { metres })
}

/// What a reader of one kind hands over.
#[derive(Debug, Default)]
pub(crate) struct Content {
    pub(crate) name: Option<String>,
    pub(crate) outline: Option<Outline>,
    /// See [`Section::loop_numbers`]; empty where the outline is in the order of the file.
    pub(crate) loop_numbers: Vec<usize>,
    pub(crate) nominal: Option<NominalSpec>,
    pub(crate) walls: Vec<WallStretch>,
    pub(crate) extras: Extras,
    /// Unit of the coordinates, for messages.
    pub(crate) unit: Option<String>,
    /// Metres per unit of the coordinates.
    pub(crate) factor: Option<f64>,
    pub(crate) notes: Vec<String>,
}

/// Reads a section from a file, or from standard input when the path is `-`.
///
/// The kind is found from the content unless the options say it.
///
/// # Errors
/// [`ReadError`] when the file cannot be read or is above a limit, when its content is wrong, or when its
/// unit or scale is missing or in doubt.
pub fn read_section(path: &Path, options: &ReadOptions) -> Result<Section, ReadError> {
    let name = if path == Path::new("-") {
        "standard input".to_owned()
    } else {
        path.display().to_string()
    };
    let bytes = read_bytes(path).map_err(|problem| ReadError::new(&name, problem))?;
    section_from_bytes(bytes, &name, options)
}

/// Reads a section from the bytes of a file; `path` is for messages and provenance.
///
/// # Errors
/// As [`read_section`].
///
/// # Examples
/// ```
/// use etchwise::intake::{ReadOptions, section_from_bytes};
/// let table = b"x_um,y_um\n0,0\n100,0\n100,50\n0,50\n".to_vec();
/// let section = section_from_bytes(table, "table.csv", &ReadOptions::default()).unwrap();
/// assert!((section.outline.area() / 5e-9 - 1.0).abs() < 1e-12);
/// ```
#[expect(
    clippy::needless_pass_by_value,
    reason = "callers hand over what they read and are done with it"
)]
pub fn section_from_bytes(
    bytes: Vec<u8>,
    path: &str,
    options: &ReadOptions,
) -> Result<Section, ReadError> {
    check_file_size(bytes.len() as u64, MAX_FILE_BYTES)
        .map_err(|problem| ReadError::new(path, problem))?;
    let content = content_of(&bytes, options.as_kind).map_err(|fault| fault.in_file(path))?;
    match content {
        FileContent::Section(kind, source) => {
            read_content((kind, source), &bytes, path, options).map_err(|fault| fault.in_file(path))
        }
        other => read_instrument_content(other, &bytes, path, options)?.only_section(),
    }
}

fn read_content(
    (kind, source): (SectionKind, SourceText),
    bytes: &[u8],
    path: &str,
    options: &ReadOptions,
) -> Result<Section, Fault> {
    let option = UnitOption::resolve(options)?;
    let (size, sha256) = (bytes.len() as u64, sha256_hex(bytes));
    if kind != SectionKind::OutlineText {
        check_file_size(size, MAX_MARKUP_BYTES)?;
    }
    let content = match kind {
        SectionKind::SectionFile => {
            section_file::read(&source.text, option.as_ref(), options.keep_non_finite)?
        }
        SectionKind::OutlineSvg => {
            let scale = options.svg_scale.or(option.map(|o| o.scale.factor()));
            scale.map_or(Ok(()), check_scale)?;
            outline_svg::read(&source.text, scale)?
        }
        _ => {
            let raw = outline_text::read(&source.text, option.as_ref(), options.keep_non_finite)?;
            let sorted = assemble(raw.loops);
            Content {
                outline: Some(sorted.outline),
                loop_numbers: sorted.loop_numbers,
                factor: option
                    .map(|o| o.scale.factor())
                    .or_else(|| crate::units::length_unit(&raw.unit)),
                unit: Some(raw.unit),
                ..Content::default()
            }
        }
    };
    let outline = content.outline.ok_or(ReadProblem::NoOutline)?;
    if !options.allow_any_size {
        check_size(&outline, content.unit.as_deref(), content.factor)?;
    }
    let loop_numbers = if content.loop_numbers.is_empty() {
        (0..outline.loops().count()).collect()
    } else {
        content.loop_numbers
    };
    let warnings = super::staircase::warning(&outline, content.nominal.is_some())
        .into_iter()
        .collect();
    Ok(Section {
        name: content.name,
        outline,
        loop_numbers,
        nominal: content.nominal,
        walls: content.walls,
        provenance: Provenance {
            path: path.to_owned(),
            sha256,
            kind,
            bytes: size,
            encoding: source.encoding,
            notes: content.notes,
        },
        extras: content.extras,
        warnings,
        intake: Intake::default(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_unit_may_be_the_length_of_one_number() {
        let read = |unit: &str| {
            let options = ReadOptions {
                unit: Some(unit.to_owned()),
                ..ReadOptions::default()
            };
            section_from_bytes(b"0 0\n100 0\n100 50.5\n".to_vec(), "t", &options)
        };
        let section = read("0.5 um").unwrap();
        assert!((section.outline.bounds().unwrap().1[0] / 50e-6 - 1.0).abs() < 1e-12);
        assert!(matches!(
            *read("furlong").unwrap_err().problem,
            ReadProblem::UnitOption { .. }
        ));
    }
}
