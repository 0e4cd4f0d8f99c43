//! What a file holds, by its content alone.

use super::delimited_text::{Row, Rows, looks_numeric};
use super::height_map::{SurfaceFormat, surface_format};
use super::micrograph::is_picture;
use super::provenance::SectionKind;
use super::read_error::{Fault, ReadProblem};
use super::source_text::SourceText;
use super::trace::{TableKind, table_kind};

/// Fewest rows of a table that is taken for a trace or a map without being asked to.
const SMALL_TABLE: usize = 12;

/// What is in a file, decoded where it is text.
#[derive(Debug)]
pub(crate) enum FileContent {
    /// A section file, an outline in columns, or a drawing.
    Section(SectionKind, SourceText),
    /// A trace in columns.
    Trace(SourceText),
    /// A height map in columns.
    Map(SourceText),
    /// A surface or a profile in a format of its own.
    Surface(SurfaceFormat),
    /// A picture.
    Picture,
}

/// Finds out what a file holds.
///
/// - `as_kind`: what the user says it is; for a trace or a height map the form is still found from the content
pub(crate) fn content_of(bytes: &[u8], as_kind: Option<SectionKind>) -> Result<FileContent, Fault> {
    match as_kind {
        Some(SectionKind::Micrograph) => Ok(FileContent::Picture),
        Some(SectionKind::Trace) => Ok(match surface_format(bytes) {
            Some(format) => FileContent::Surface(format),
            None => FileContent::Trace(decoded(bytes)?),
        }),
        Some(SectionKind::HeightMap) => Ok(match surface_format(bytes) {
            Some(format) => FileContent::Surface(format),
            None => FileContent::Map(decoded(bytes)?),
        }),
        Some(kind) => Ok(FileContent::Section(kind, decoded(bytes)?)),
        None if is_picture(bytes) => Ok(FileContent::Picture),
        None => match surface_format(bytes) {
            Some(format) => Ok(FileContent::Surface(format)),
            None => text_content(decoded(bytes)?),
        },
    }
}

/// The text of a file that holds something.
fn decoded(bytes: &[u8]) -> Result<SourceText, Fault> {
    let source = SourceText::decode(bytes.to_vec())?;
    if source.text.trim().is_empty() {
        return Err(ReadProblem::Empty.into());
    }
    Ok(source)
}

/// The kind of a text.
///
/// `<` begins a drawing; `[table]` or `key = value` a section file; tables of numbers are told apart by their
/// columns, see [`table_kind`].
fn text_content(source: SourceText) -> Result<FileContent, Fault> {
    let text = &source.text;
    if text.trim_start().starts_with('<') {
        return Ok(FileContent::Section(SectionKind::OutlineSvg, source));
    }
    let mut rows = Rows::new(text).filter(|row| !row.content.trim().is_empty());
    let first = rows.next();
    if first.is_some_and(|row| is_toml_line(row.content.trim())) {
        return Ok(FileContent::Section(SectionKind::SectionFile, source));
    }
    match table_kind(text) {
        // So few rows may as well be a polygon with a mistake in it, which its own reader names.
        Some(TableKind::Trace | TableKind::Matrix | TableKind::Points) if is_small(text) => {}
        Some(TableKind::Trace) => return Ok(FileContent::Trace(source)),
        Some(TableKind::Matrix | TableKind::Points) => return Ok(FileContent::Map(source)),
        Some(TableKind::Outline) => {
            return Ok(FileContent::Section(SectionKind::OutlineText, source));
        }
        None => {}
    }
    let Some(first) = first else {
        return Err(ReadProblem::NoOutline.into());
    };
    let numeric = |row: Row<'_>| looks_numeric(row.content.trim());
    let lower = first.content.trim().trim_start_matches('"').to_lowercase();
    let header = ["x", "y", "z", "loop", "lumen"]
        .iter()
        .any(|word| lower.starts_with(word));
    if numeric(first) || header || rows.take(20).any(numeric) {
        return Ok(FileContent::Section(SectionKind::OutlineText, source));
    }
    Err(Fault::at(
        text,
        first.offset,
        None,
        ReadProblem::UnknownContent,
    ))
}

/// Whether a table has fewer than a dozen rows and nothing but column names above them.
fn is_small(text: &str) -> bool {
    let lines = text.lines().map(str::trim).filter(|line| !line.is_empty());
    let rows = lines.clone().filter(|line| looks_numeric(line)).count();
    let above = lines.take_while(|line| !looks_numeric(line)).count();
    rows < SMALL_TABLE && above <= 1
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
            let found = content_of(text.as_bytes(), None);
            assert!(
                matches!(found, Ok(FileContent::Section(found, _)) if found == kind),
                "{text}"
            );
        }
        assert!(content_of(b"hello\nworld\n", None).is_err());
        assert!(content_of(b"# only a comment\n", None).is_err());
    }
}
