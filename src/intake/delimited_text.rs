//! Rows, columns and numbers of a text table: what the readers of outlines need.
//!
//! The delimiter is a semicolon, a tab, a comma or spaces, decided on the first thousand rows. Decimal
//! commas are read between semicolons only. Thousands separators are never applied.

use super::read_error::{Fault, ReadProblem};
use super::source_text::line_end;
use crate::units::UnitScale;

/// Rows looked at to decide the delimiter.
const SAMPLE_ROWS: usize = 1000;

/// What separates the columns.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Delimiter {
    Comma,
    Semicolon,
    Tab,
    Spaces,
}

/// A line of the table without its comment.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Row<'a> {
    /// Byte offset of the content in the text.
    pub(crate) offset: usize,
    /// The content; empty for a blank line.
    pub(crate) content: &'a str,
}

/// Lines of a table; lines that hold only a comment are left out.
#[derive(Debug, Clone)]
pub(crate) struct Rows<'a> {
    text: &'a str,
    next: usize,
}

impl<'a> Rows<'a> {
    pub(crate) fn new(text: &'a str) -> Self {
        Self { text, next: 0 }
    }
}

impl<'a> Iterator for Rows<'a> {
    type Item = Row<'a>;

    fn next(&mut self) -> Option<Row<'a>> {
        while self.next < self.text.len() {
            let offset = self.next;
            let (end, next) = line_end(self.text, offset);
            self.next = next;
            let line = self.text.get(offset..end).unwrap_or_default();
            let (content, comment) = match line.find('#') {
                Some(mark) => (line.get(..mark).unwrap_or_default(), true),
                None => (line, false),
            };
            let blank = content
                .bytes()
                .all(|b| matches!(b, b' ' | b'\t' | b',' | b';'));
            if blank && comment {
                continue;
            }
            let content = if blank { "" } else { content };
            return Some(Row { offset, content });
        }
        None
    }
}

/// Whether a field begins like a number.
pub(crate) fn looks_numeric(field: &str) -> bool {
    let body = field.trim_matches(['"', ' ']);
    let body = body.trim_start_matches(['-', '+', '\u{2212}']);
    let lower = body.get(..3).unwrap_or_default().to_ascii_lowercase();
    body.starts_with(|c: char| c.is_ascii_digit() || c == '.') || lower == "nan" || lower == "inf"
}

/// Decides the delimiter; a comma that may be a decimal mark is a fault.
pub(crate) fn choose_delimiter(text: &str) -> Result<Delimiter, Fault> {
    let rows = || Rows::new(text).filter(|row| !row.content.is_empty());
    let data = || {
        rows()
            .take(SAMPLE_ROWS)
            .filter(|row| looks_numeric(row.content.trim_start()))
    };
    let first = data().next().or_else(|| rows().next());
    let has = |c: char| data().chain(first).any(|row| row.content.contains(c));
    if has(';') {
        return Ok(Delimiter::Semicolon);
    }
    if has('\t') {
        return Ok(Delimiter::Tab);
    }
    if !has(',') {
        return Ok(Delimiter::Spaces);
    }
    for row in data() {
        let spaced = row.content.split(',').any(|field| {
            let field = field.trim();
            field.contains(' ') && !field.contains(|c: char| c.is_alphabetic())
        });
        if spaced {
            let text_of_row = row.content.trim().to_owned();
            return Err(Fault::at(
                text,
                row.offset,
                None,
                ReadProblem::AmbiguousDecimal { text: text_of_row },
            ));
        }
    }
    Ok(Delimiter::Comma)
}

/// Splits a row into its fields; empty fields at the end are dropped, a mark between quotes does not split.
pub(crate) fn split<'a>(content: &'a str, delimiter: Delimiter, fields: &mut Vec<&'a str>) {
    fields.clear();
    let by = |mark: char, fields: &mut Vec<&'a str>| {
        let bare = |field: &'a str| field.trim().trim_matches('"');
        if content.contains('"') {
            let mut quoted = false;
            let ends = |c: char| {
                quoted ^= c == '"';
                c == mark && !quoted
            };
            fields.extend(content.split(ends).map(bare));
        } else {
            fields.extend(content.split(mark).map(bare));
        }
    };
    match delimiter {
        Delimiter::Comma => by(',', fields),
        Delimiter::Semicolon => by(';', fields),
        Delimiter::Tab => by('\t', fields),
        Delimiter::Spaces => fields.extend(content.split_whitespace()),
    }
    while fields.last().is_some_and(|field| field.is_empty()) {
        fields.pop();
    }
}

/// Byte offset of a field in the text it was cut from.
pub(crate) fn offset_of(text: &str, field: &str) -> usize {
    (field.as_ptr() as usize).saturating_sub(text.as_ptr() as usize)
}

/// Reads the numbers of one table and watches its decimal mark.
#[derive(Debug)]
pub(crate) struct NumberReader {
    delimiter: Delimiter,
    keep_non_finite: bool,
    point_seen: bool,
    /// Offset and text of the first decimal comma.
    comma_seen: Option<(usize, String)>,
    /// Whether some comma cannot be a thousands separator.
    comma_proven: bool,
    buffer: String,
    plain: String,
}

impl NumberReader {
    pub(crate) fn new(delimiter: Delimiter, keep_non_finite: bool) -> Self {
        Self {
            delimiter,
            keep_non_finite,
            point_seen: false,
            comma_seen: None,
            comma_proven: false,
            buffer: String::new(),
            plain: String::new(),
        }
    }

    /// Reads one field into SI.
    pub(crate) fn read(
        &mut self,
        text: &str,
        field: &str,
        scale: UnitScale,
    ) -> Result<f64, ReadProblem> {
        let comma = field.contains(',');
        if comma {
            self.note_comma(text, field)?;
        } else if self.delimiter == Delimiter::Semicolon && field.contains('.') {
            if self.comma_seen.is_some() {
                return Err(ReadProblem::MixedDecimal {
                    text: field.to_owned(),
                });
            }
            self.point_seen = true;
        }
        let value = if comma || field.starts_with('\u{2212}') {
            self.plain = field.replace(',', ".").replace('\u{2212}', "-");
            scale.read(&self.plain, &mut self.buffer)
        } else {
            scale.read(field, &mut self.buffer)
        };
        match value {
            Some(value) if value.is_finite() || self.keep_non_finite => Ok(value),
            Some(_) => Err(ReadProblem::NotFinite {
                text: field.to_owned(),
            }),
            None if field.is_empty() => Err(ReadProblem::EmptyField),
            None => Err(ReadProblem::NotANumber {
                text: field.to_owned(),
            }),
        }
    }

    fn note_comma(&mut self, text: &str, field: &str) -> Result<(), ReadProblem> {
        let owned = || field.to_owned();
        if self.delimiter != Delimiter::Semicolon {
            return Err(ReadProblem::AmbiguousDecimal { text: owned() });
        }
        if self.point_seen || field.contains('.') || field.matches(',').count() > 1 {
            return Err(ReadProblem::MixedDecimal { text: owned() });
        }
        let (whole, part) = field.split_once(',').unwrap_or_default();
        let whole = whole.trim_start_matches(['-', '+', '\u{2212}']);
        let like_thousands =
            (1..=3).contains(&whole.len()) && !whole.starts_with('0') && part.len() == 3;
        self.comma_proven |= !like_thousands;
        if self.comma_seen.is_none() {
            self.comma_seen = Some((offset_of(text, field), owned()));
        }
        Ok(())
    }

    /// Refuses a table whose every comma may be a thousands separator.
    pub(crate) fn finish(self, text: &str) -> Result<(), Fault> {
        match self.comma_seen {
            Some((offset, field)) if !self.comma_proven => Err(Fault::at(
                text,
                offset,
                None,
                ReadProblem::AmbiguousDecimal { text: field },
            )),
            _ => Ok(()),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn delimiters_are_chosen_on_the_rows() {
        for (text, delimiter) in [
            ("x_um,y_um\n1,2\n", Delimiter::Comma),
            ("1, 2\n3, 4\n", Delimiter::Comma),
            ("x;y\n1,5;2\n", Delimiter::Semicolon),
            ("x\ty\n1\t2\n", Delimiter::Tab),
            ("1 2\n", Delimiter::Spaces),
            ("x_um,y_um\n", Delimiter::Comma),
        ] {
            assert_eq!(choose_delimiter(text), Ok(delimiter), "{text}");
        }
        let fault = choose_delimiter("1,5 2,5\n").unwrap_err();
        assert!(matches!(
            *fault.problem,
            ReadProblem::AmbiguousDecimal { .. }
        ));
    }

    #[test]
    fn a_mark_between_quotes_does_not_split() {
        let mut fields = Vec::new();
        split("\"1,5\", 2,\"a,b\",", Delimiter::Comma, &mut fields);
        assert_eq!(fields, ["1,5", "2", "a,b"]);
    }

    #[test]
    fn blank_and_comment_lines() {
        let rows: Vec<&str> = Rows::new("# a\n1,2 # b\n,,\n\n3,4")
            .map(|r| r.content)
            .collect();
        assert_eq!(rows, ["1,2 ", "", "", "3,4"]);
    }

    #[test]
    fn decimal_commas_need_proof() {
        let read = |text: &str| {
            let mut reader = NumberReader::new(Delimiter::Semicolon, false);
            let metre = crate::units::length_scale("m").unwrap();
            let values: Result<Vec<f64>, _> = text
                .split(';')
                .map(|f| reader.read(text, f, metre))
                .collect();
            values.map(|v| (v, reader.finish(text).is_ok()))
        };
        assert_eq!(read("1,5;2"), Ok((vec![1.5, 2.0], true)));
        assert_eq!(read("0,500;1,234"), Ok((vec![0.5, 1.234], true)));
        assert_eq!(read("\u{2212}1,5"), Ok((vec![-1.5], true)));
        assert!(!read("1,234;2,345").unwrap().1);
        assert!(matches!(
            read("1,5;2.5"),
            Err(ReadProblem::MixedDecimal { .. })
        ));
        assert!(matches!(
            read("1.000,5"),
            Err(ReadProblem::MixedDecimal { .. })
        ));
        assert!(matches!(
            read("1.000.541"),
            Err(ReadProblem::NotANumber { .. })
        ));
        assert!(matches!(read("1;;2"), Err(ReadProblem::EmptyField)));
    }
}
