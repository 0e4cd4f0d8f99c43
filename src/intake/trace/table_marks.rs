//! Separator and decimal mark of a table, decided together on its rows; rows to fields, fields to numbers.
//!
//! Semicolons and tabs separate wherever they occur. A comma separates when it is followed by a space
//! throughout, when decimal points occur beside it, or when the column line has as many names; it is a
//! decimal mark when the rows make no sense otherwise. What stays open is an error, and so is a table whose
//! every comma may be a thousands separator.

use super::table_columns::names_columns;
use super::table_lines::{Parts, fault, is_missing, shortened, without_comment};
use super::table_options::Decimal;
use super::table_problem::TableProblem;
use crate::intake::delimited_text::{Delimiter, split};
use crate::intake::read_error::{Fault, ReadProblem};
use crate::units::UnitScale;

/// Rows looked at for the separator.
const SAMPLE_ROWS: usize = 10_000;

/// How the rows of a table are written.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Marks {
    /// Between the columns.
    pub(crate) delimiter: Delimiter,
    /// Inside the numbers.
    pub(crate) decimal: Decimal,
}

impl Marks {
    /// Splits a row without its comment; empty fields at the end are dropped.
    pub(crate) fn split<'a>(self, row: &'a str, fields: &mut Vec<&'a str>) {
        split(row, self.delimiter, fields);
        if self.delimiter == Delimiter::Spaces {
            for field in fields.iter_mut() {
                *field = field.trim_matches('"');
                if self.decimal == Decimal::Comma {
                    *field = field.trim_end_matches([',', '"']);
                }
            }
        }
    }
}

/// What the rows show.
#[derive(Debug, Default)]
#[expect(
    clippy::struct_excessive_bools,
    reason = "each is one thing that was seen in some row"
)]
struct Evidence {
    semicolon: bool,
    tab: bool,
    comma: bool,
    /// Spaces between words that are not beside another separator.
    space: bool,
    /// A comma between quotes.
    quoted_comma: bool,
    /// A comma that is not followed by a space.
    tight_comma: bool,
    /// A field between commas that holds several words.
    broken_comma_field: bool,
    /// A word between spaces that is no number with one decimal comma.
    broken_comma_word: bool,
    /// A decimal point.
    point: bool,
    /// Fewest and most commas in a row.
    fewest_commas: usize,
    most_commas: usize,
    /// Every row has four whole numbers, the second and the fourth without sign.
    four_whole: bool,
}

impl Evidence {
    fn of<'a>(rows: impl Iterator<Item = &'a str>) -> Self {
        let mut seen = Self {
            four_whole: true,
            fewest_commas: usize::MAX,
            ..Self::default()
        };
        for row in rows.take(SAMPLE_ROWS) {
            seen.look(row);
        }
        seen
    }

    fn look(&mut self, row: &str) {
        let row = row
            .trim_end_matches([',', ' ', '\t'])
            .trim_start_matches([' ', '\t']);
        let (mut quoted, mut commas) = (false, 0);
        let mut characters = row.chars().peekable();
        while let Some(c) = characters.next() {
            match c {
                '"' => quoted = !quoted,
                ',' if quoted => self.quoted_comma = true,
                ';' if !quoted => self.semicolon = true,
                '\t' if !quoted => self.tab = true,
                ',' => {
                    commas += 1;
                    self.tight_comma |= characters.peek().is_some_and(|n| !n.is_whitespace());
                }
                _ => {}
            }
        }
        self.comma |= commas > 0;
        self.point |= row.contains('.');
        self.fewest_commas = self.fewest_commas.min(commas);
        self.most_commas = self.most_commas.max(commas);
        let mut parts = 0;
        for (index, part) in row.split(',').enumerate() {
            parts = index + 1;
            let part = part.trim();
            self.broken_comma_field |= part.contains([' ', '\t']);
            let signed = index % 2 == 1 && part.starts_with(['-', '+', '\u{2212}']);
            let body = part.trim_start_matches(['-', '+', '\u{2212}']);
            self.four_whole &=
                !signed && !body.is_empty() && body.bytes().all(|b| b.is_ascii_digit());
        }
        self.four_whole &= parts == 4;
        let mut words = 0;
        for word in row.split_whitespace() {
            words += 1;
            let word = word.trim_end_matches(',');
            self.broken_comma_word |= word.contains(',') && !has_decimal_comma(word);
            self.broken_comma_word |= word.contains('.');
        }
        self.space |= words > 1;
    }
}

/// Whether a word has one comma with digits on both sides.
fn has_decimal_comma(word: &str) -> bool {
    let Some((whole, part)) = word.split_once(',') else {
        return false;
    };
    whole.ends_with(|c: char| c.is_ascii_digit())
        && part.starts_with(|c: char| c.is_ascii_digit())
        && !part.contains(',')
}

/// Decides separator and decimal mark of the data.
pub(crate) fn decide(
    text: &str,
    parts: &Parts<'_>,
    option: Option<Decimal>,
) -> Result<Marks, Fault> {
    let rows = || parts.rows(text).map(|line| without_comment(line.content));
    let seen = Evidence::of(rows());
    let marks = |delimiter, decimal| Marks { delimiter, decimal };
    let comma_then_space = seen.comma && !seen.tight_comma && !seen.quoted_comma;
    let delimiter = if seen.semicolon {
        Some(Delimiter::Semicolon)
    } else if seen.tab && !comma_then_space {
        Some(Delimiter::Tab)
    } else if seen.comma && (comma_then_space || seen.quoted_comma) {
        Some(Delimiter::Comma)
    } else if seen.comma {
        None
    } else {
        Some(Delimiter::Spaces)
    };
    if let Some(delimiter) = delimiter {
        let decimal = match option {
            Some(decimal) => decimal,
            None => decimal_between(text, parts, delimiter)?,
        };
        return Ok(marks(delimiter, decimal));
    }
    let first = parts.rows(text).next();
    let doubt = |problem: fn(String) -> TableProblem| {
        let offset = first.map_or(0, |line| line.offset);
        let content = first.map_or("", |line| line.content.trim());
        fault(text, offset, problem(shortened(content)))
    };
    let in_doubt = || doubt(|text| TableProblem::DecimalInDoubt { text });
    let by_comma = marks(Delimiter::Comma, Decimal::Point);
    let by_space = marks(Delimiter::Spaces, Decimal::Comma);
    let names = names_by_comma(parts);
    // Whole numbers whose columns do not add up may be halves of numbers with decimal commas.
    let uneven = seen.fewest_commas != seen.most_commas
        || names.is_some_and(|names| names <= seen.most_commas);
    match option {
        Some(Decimal::Point) => Ok(by_comma),
        Some(Decimal::Comma) if seen.space || seen.most_commas == 1 => Ok(by_space),
        Some(Decimal::Comma) => Err(doubt(|text| TableProblem::DecimalIsSeparator { text })),
        None if seen.four_whole && names != Some(4) => Err(in_doubt()),
        None if seen.broken_comma_word && uneven && !seen.point => Err(in_doubt()),
        None if seen.broken_comma_word => Ok(by_comma),
        None if names == Some(seen.most_commas + 1) => Ok(by_comma),
        None if seen.broken_comma_field || (names == Some(1) && !seen.space) => {
            decimal_between(text, parts, Delimiter::Spaces)?;
            Ok(by_space)
        }
        None => Err(in_doubt()),
    }
}

/// Number of names in the column line, if it separates them by commas.
fn names_by_comma(parts: &Parts<'_>) -> Option<usize> {
    let mut fields = Vec::new();
    let lines = parts.text_lines.iter().rev();
    for line in lines.filter(|line| line.offset < parts.data.start).take(2) {
        split(line.content, Delimiter::Comma, &mut fields);
        if names_columns(&fields) {
            return Some(fields.len());
        }
    }
    None
}

/// The decimal mark of numbers between a separator that is no comma, or between quotes.
fn decimal_between(text: &str, parts: &Parts<'_>, delimiter: Delimiter) -> Result<Decimal, Fault> {
    let comma_splits = marks_of(delimiter);
    let mut fields = Vec::new();
    let mut first: Option<(usize, String)> = None;
    for line in parts.rows(text) {
        if !line.content.contains(',') {
            continue;
        }
        comma_splits.split(without_comment(line.content), &mut fields);
        for field in fields.iter().filter(|field| field.contains(',')) {
            if !may_be_thousands(field) {
                return Ok(Decimal::Comma);
            }
            if first.is_none() {
                first = Some((line.offset, shortened(line.content.trim())));
            }
        }
    }
    match first {
        Some((offset, text_of_row)) => Err(fault(
            text,
            offset,
            TableProblem::DecimalInDoubt { text: text_of_row },
        )),
        None => Ok(Decimal::Point),
    }
}

fn marks_of(delimiter: Delimiter) -> Marks {
    Marks {
        delimiter,
        decimal: Decimal::Comma,
    }
}

/// Whether the comma of a number may part thousands: `1,234`, but not `0,234` or `1,23`.
fn may_be_thousands(field: &str) -> bool {
    let (whole, part) = field.split_once(',').unwrap_or_default();
    let whole = whole.trim_start_matches(['-', '+', '\u{2212}']);
    (1..=3).contains(&whole.len()) && !whole.starts_with('0') && part.len() == 3
}

/// Reads fields into SI.
#[derive(Debug)]
pub(crate) struct Numbers {
    marks: Marks,
    buffer: String,
    plain: String,
}

impl Numbers {
    pub(crate) fn new(marks: Marks) -> Self {
        Self {
            marks,
            buffer: String::new(),
            plain: String::new(),
        }
    }

    /// Reads a field; `None` for a missing value.
    pub(crate) fn read(
        &mut self,
        field: &str,
        scale: UnitScale,
    ) -> Result<Option<f64>, ReadProblem> {
        let comma = field.contains(',');
        let other = match self.marks.decimal {
            Decimal::Point => comma,
            Decimal::Comma => field.contains('.') && !is_missing(field),
        };
        if other {
            return Err(ReadProblem::MixedDecimal {
                text: shortened(field),
            });
        }
        let value = if comma || field.starts_with('\u{2212}') {
            self.plain.clear();
            let plain = |c| match c {
                ',' => '.',
                '\u{2212}' => '-',
                c => c,
            };
            self.plain.extend(field.chars().map(plain));
            scale.read(&self.plain, &mut self.buffer)
        } else {
            scale.read(field, &mut self.buffer)
        };
        match value {
            Some(value) if value.is_finite() => Ok(Some(value)),
            _ if is_missing(field) => Ok(None),
            _ => Err(ReadProblem::Table {
                source: TableProblem::NotANumber {
                    text: shortened(field),
                },
            }),
        }
    }
}

#[cfg(test)]
mod tests {
    use super::super::table_lines::take_apart;
    use super::*;

    fn decided(text: &str, option: Option<Decimal>) -> Option<(Delimiter, Decimal)> {
        let parts = take_apart(text).unwrap();
        let marks = decide(text, &parts, option).ok()?;
        Some((marks.delimiter, marks.decimal))
    }

    #[test]
    fn separator_and_decimal_mark_together() {
        use Decimal::{Comma, Point};
        for (text, delimiter, decimal) in [
            ("0.5,1.22,,\n1.0,2\n", Delimiter::Comma, Point),
            ("0,5;1,22\n", Delimiter::Semicolon, Comma),
            ("0.5;1.22\n", Delimiter::Semicolon, Point),
            ("0,5\t1,22\n", Delimiter::Tab, Comma),
            ("0.5,\t1.22\n", Delimiter::Comma, Point),
            ("0,5 1,22\n", Delimiter::Spaces, Comma),
            ("0,125 1\n7,250 2\n", Delimiter::Spaces, Comma),
            ("   1.3e+01,   1.7e+01\n", Delimiter::Comma, Point),
            ("1, 2\n3, 4\n", Delimiter::Comma, Point),
            ("1 2\n", Delimiter::Spaces, Point),
            ("x_um,z_um\n12,50\n13,60\n", Delimiter::Comma, Point),
            ("12,-50\n13,60\n", Delimiter::Comma, Point),
            ("\"0,5\",\"1,25\"\n", Delimiter::Comma, Comma),
            ("1,2,3\n", Delimiter::Comma, Point),
        ] {
            assert_eq!(decided(text, None), Some((delimiter, decimal)), "{text}");
        }
        assert_eq!(
            decided("0,5, 1,2\n", Some(Comma)),
            Some((Delimiter::Spaces, Comma))
        );
    }

    #[test]
    fn what_stays_open_is_asked() {
        for text in [
            "12,50\n13,60\n",
            "1,234;5,678\n",
            "1,234\t5,678\n",
            "1,234 5,678\n",
            "0,5,1,2\n1,0,1,3\n",
            "0,5, 1,2\n",
            "x_um,z_nm\n0,5,10\n1,10,5\n1,5,11\n",
            "0,10\n0,5,10\n1,10,5\n",
        ] {
            assert_eq!(decided(text, None), None, "{text}");
        }
        let forced = |text: &str| decided(text, Some(Decimal::Comma));
        assert_eq!(
            forced("1,234;5,678\n"),
            Some((Delimiter::Semicolon, Decimal::Comma))
        );
        assert_eq!(forced("12,50\n"), Some((Delimiter::Spaces, Decimal::Comma)));
        assert_eq!(forced("0,5,1,2\n"), None);
    }

    #[test]
    fn numbers_and_missing_values() {
        let metre = crate::units::length_scale("m").unwrap();
        let mut point = Numbers::new(Marks {
            delimiter: Delimiter::Tab,
            decimal: Decimal::Point,
        });
        assert_eq!(point.read("\u{2212}1.5", metre), Ok(Some(-1.5)));
        assert_eq!(point.read("NaN", metre), Ok(None));
        assert_eq!(point.read("", metre), Ok(None));
        assert_eq!(point.read("BAD", metre), Ok(None));
        assert!(point.read("1,5", metre).is_err());
        assert!(point.read("1.000.541", metre).is_err());
        assert!(point.read("1e999", metre).is_err());
        let mut comma = Numbers::new(marks_of(Delimiter::Tab));
        assert_eq!(comma.read("1,5e-3", metre), Ok(Some(1.5e-3)));
        assert_eq!(comma.read("1.#QNAN", metre), Ok(None));
        assert!(comma.read("1.5", metre).is_err());
    }
}
