//! A section as read: its outline in metres and where it came from.

use std::path::Path;

use super::limits::{MAX_FILE_BYTES, MAX_MARKUP_BYTES, check_file_size};
use super::loop_nesting::assemble;
use super::plausibility::check_size;
use super::provenance::{Provenance, SectionKind, sha256_hex};
use super::read_error::{Fault, ReadError, ReadProblem};
use super::section_reach::Reach;
use super::source_text::{SourceText, read_bytes};
use super::{delimited_text, outline_svg, outline_text, section_file};
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
    fn resolve(options: &ReadOptions) -> Result<Option<Self>, ReadProblem> {
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
pub fn section_from_bytes(
    bytes: Vec<u8>,
    path: &str,
    options: &ReadOptions,
) -> Result<Section, ReadError> {
    read_content(bytes, path, options).map_err(|fault| fault.in_file(path))
}

fn read_content(bytes: Vec<u8>, path: &str, options: &ReadOptions) -> Result<Section, Fault> {
    check_file_size(bytes.len() as u64, MAX_FILE_BYTES)?;
    let option = UnitOption::resolve(options)?;
    let (size, sha256) = (bytes.len() as u64, sha256_hex(&bytes));
    let source = SourceText::decode(bytes)?;
    if source.text.trim().is_empty() {
        return Err(ReadProblem::Empty.into());
    }
    let kind = match options.as_kind {
        Some(kind) => kind,
        None => kind_of(&source.text)?,
    };
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
        SectionKind::OutlineText => {
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
    })
}

/// The kind of a text by its first line that is not a comment.
///
/// `<` begins a drawing; `[table]` or `key =` a section file; a row of numbers, or a header with a row of
/// numbers anywhere below, is an outline in columns.
fn kind_of(text: &str) -> Result<SectionKind, Fault> {
    if text.trim_start().starts_with('<') {
        return Ok(SectionKind::OutlineSvg);
    }
    let mut rows = delimited_text::Rows::new(text).filter(|row| !row.content.trim().is_empty());
    let Some(first) = rows.next() else {
        return Err(ReadProblem::NoOutline.into());
    };
    let line = first.content.trim();
    let numeric = |row: delimited_text::Row<'_>| delimited_text::looks_numeric(row.content.trim());
    if is_toml_line(line) {
        return Ok(SectionKind::SectionFile);
    }
    let lower = line.trim_start_matches('"').to_lowercase();
    let header = ["x", "y", "z", "loop", "lumen"]
        .iter()
        .any(|word| lower.starts_with(word));
    if numeric(first) || header || rows.take(20).any(numeric) {
        return Ok(SectionKind::OutlineText);
    }
    Err(Fault::at(
        text,
        first.offset,
        None,
        ReadProblem::UnknownContent,
    ))
}

/// Whether a line is a table head or begins with a key and an equals sign.
fn is_toml_line(line: &str) -> bool {
    if let Some(rest) = line.strip_prefix('[') {
        return rest.starts_with(|c: char| c == '[' || c.is_ascii_alphabetic());
    }
    let key = line.split('=').next().unwrap_or_default().trim_end();
    let bare = |c: char| c.is_ascii_alphanumeric() || matches!(c, '_' | '-' | '.' | '"');
    line.contains('=')
        && key.starts_with(|c: char| c.is_ascii_alphabetic() || c == '"')
        && key.chars().all(bare)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn kinds_are_found_from_the_content() {
        for (text, kind) in [
            ("# c\n\nname = \"a\"\n", SectionKind::SectionFile),
            ("[nominal]\n", SectionKind::SectionFile),
            ("[[lumen]]\n", SectionKind::SectionFile),
            ("# c\nx_um,y_um\n1,2\n", SectionKind::OutlineText),
            ("\"x (um)\";\"y (um)\"\n1;2\n", SectionKind::OutlineText),
            ("1 2\n3 4\n", SectionKind::OutlineText),
            ("width;depth\n3;4\n", SectionKind::OutlineText),
            ("\n<?xml version=\"1.0\"?><svg/>", SectionKind::OutlineSvg),
        ] {
            assert_eq!(kind_of(text), Ok(kind), "{text}");
        }
        assert!(kind_of("hello\nworld\n").is_err());
        assert!(kind_of("# only a comment\n").is_err());
    }

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
