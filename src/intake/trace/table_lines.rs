//! The lines of a table: which hold numbers, which hold text, and where the data lies.
//!
//! The data is the longest run of lines that hold nothing but numbers and marks for missing values;
//! blank lines and comments do not end a run.

use super::table_problem::TableProblem;
use crate::intake::read_error::{Fault, ReadProblem};
use crate::intake::source_text::line_end;

/// Longest line that is read, bytes.
const LONGEST_LINE_BYTES: usize = 4 << 20;
/// Most lines of text around the data.
const MOST_TEXT_LINES: usize = 100_000;
/// Rows of numbers before the data that may be a block of results, such as a table of roughness values.
const MOST_ROWS_OF_A_BLOCK: usize = 11;

/// Marks for a missing value, lower case.
const MISSING: [&str; 30] = [
    "nan",
    "-nan",
    "+nan",
    "nan(ind)",
    "-nan(ind)",
    "bad",
    "***",
    "**",
    "*",
    "---",
    "--",
    "-",
    "inf",
    "+inf",
    "-inf",
    "infinity",
    "-infinity",
    "n/a",
    "na",
    "#n/a",
    "null",
    "none",
    "missing",
    "void",
    "1.#qnan",
    "-1.#qnan",
    "-1.#ind",
    "1.#inf",
    "-1.#inf",
    "\u{221e}",
];

/// A line without its line end.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Line<'a> {
    /// Byte offset in the text.
    pub(crate) offset: usize,
    /// Byte offset of the next line.
    pub(crate) next: usize,
    /// Its content.
    pub(crate) content: &'a str,
}

/// The lines of a text.
#[derive(Debug, Clone)]
pub(crate) struct Lines<'a> {
    text: &'a str,
    next: usize,
    end: usize,
}

impl<'a> Lines<'a> {
    /// Lines from one byte offset up to another.
    pub(crate) fn between(text: &'a str, from: usize, to: usize) -> Self {
        Self {
            text,
            next: from,
            end: to.min(text.len()),
        }
    }
}

impl<'a> Iterator for Lines<'a> {
    type Item = Line<'a>;

    fn next(&mut self) -> Option<Line<'a>> {
        if self.next >= self.end {
            return None;
        }
        let offset = self.next;
        let (end, next) = line_end(self.text, offset);
        self.next = next;
        Some(Line {
            offset,
            next,
            content: self.text.get(offset..end).unwrap_or_default(),
        })
    }
}

/// What a line holds.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum LineKind {
    /// Nothing but separators.
    Blank,
    /// A comment.
    Comment,
    /// Something that is not a number.
    Text,
    /// Numbers, perhaps with missing values among them: how many of both.
    Numbers(usize),
    /// Marks for missing values only.
    Missing,
}

/// The line without a comment behind its numbers.
pub(crate) fn without_comment(content: &str) -> &str {
    if !content.contains('#') {
        return content;
    }
    let spaced = content
        .match_indices('#')
        .map(|(at, _)| at)
        .find(|&at| at > 0 && content.get(..at).is_some_and(|c| c.ends_with([' ', '\t'])));
    match spaced {
        Some(at) => content.get(..at).unwrap_or(content),
        None => content,
    }
}

/// The text of a comment without its mark, `None` when the line is none.
pub(crate) fn comment_text(content: &str) -> Option<&str> {
    let trimmed = content.trim();
    if is_missing(trimmed) {
        return None;
    }
    ["#", "%", "//"]
        .into_iter()
        .find_map(|mark| trimmed.strip_prefix(mark))
        .map(|rest| rest.trim_start_matches(['#', '%', '/']).trim())
}

/// Whether a field is a mark for a missing value; an empty field is one too.
pub(crate) fn is_missing(field: &str) -> bool {
    field.is_empty() || (field.len() <= 9 && MISSING.contains(&field.to_lowercase().as_str()))
}

/// Whether a text is a number with decimal points: digits, a sign, an exponent. Several points pass, so
/// that the error about them can name the place.
pub(crate) fn is_number(text: &str) -> bool {
    let body = text.strip_prefix(['-', '+', '\u{2212}']).unwrap_or(text);
    let (digits, exponent) = match body.split_once(['e', 'E']) {
        Some((digits, exponent)) => (digits, Some(exponent)),
        None => (body, None),
    };
    let whole = |part: &str| !part.is_empty() && part.bytes().all(|b| b.is_ascii_digit());
    digits.bytes().any(|b| b.is_ascii_digit())
        && digits.bytes().all(|b| b.is_ascii_digit() || b == b'.')
        && exponent.is_none_or(|e| whole(e.strip_prefix(['-', '+']).unwrap_or(e)))
}

/// Whether a line begins like a number.
fn begins_like_number(content: &str) -> bool {
    let body = content.trim_start_matches([' ', '\t', '"', ',', ';', '-', '+', '\u{2212}', '.']);
    body.starts_with(|c: char| c.is_ascii_digit())
}

/// How many numbers a line holds that is made of ASCII numbers and separators only; `None` for any other,
/// which is looked at more closely. Most lines of a table are plain.
fn plain_numbers(content: &str) -> Option<usize> {
    let separates = |byte: u8| matches!(byte, b' ' | b'\t' | b',' | b';');
    let (mut numbers, mut digits, mut last) = (0, false, b' ');
    for &byte in content.as_bytes() {
        let starts = separates(last);
        // A word may end after a digit, or after a point behind digits.
        let ends = digits && (last.is_ascii_digit() || last == b'.');
        match byte {
            b'0'..=b'9' => {
                numbers += usize::from(!digits);
                digits = true;
            }
            byte if separates(byte) => {
                if !starts && !ends {
                    return None;
                }
                digits = false;
            }
            b'-' | b'+' if starts || matches!(last, b'e' | b'E') => {}
            b'.' if starts || ends || matches!(last, b'-' | b'+') => {}
            b'e' | b'E' if ends => {}
            _ => return None,
        }
        last = byte;
    }
    let ended = separates(last) || (digits && (last.is_ascii_digit() || last == b'.'));
    (ended && numbers > 0).then_some(numbers)
}

/// What a line holds, whatever its separator and its decimal mark.
pub(crate) fn line_kind(content: &str) -> LineKind {
    if let Some(numbers) = plain_numbers(content) {
        return LineKind::Numbers(numbers);
    }
    let separators = |c: char| matches!(c, ' ' | '\t' | ',' | ';' | '"' | '\u{a0}');
    if content.trim_matches(separators).is_empty() {
        return LineKind::Blank;
    }
    if comment_text(content).is_some() {
        return LineKind::Comment;
    }
    let (mut numbers, mut missing) = (0, 0);
    for word in without_comment(content).split(separators) {
        if word.is_empty() {
            continue;
        }
        if is_number(word) {
            numbers += 1;
        } else if is_missing(word) {
            missing += 1;
        } else {
            return LineKind::Text;
        }
    }
    if numbers > 0 {
        LineKind::Numbers(numbers + missing)
    } else {
        LineKind::Missing
    }
}

/// A run of rows.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct Run {
    /// Byte offset of the first row.
    pub(crate) start: usize,
    /// Byte offset behind the last row.
    pub(crate) end: usize,
    /// Rows.
    pub(crate) rows: usize,
    /// Blank lines between its rows.
    pub(crate) blanks: usize,
    /// Words in its first row.
    words: usize,
    /// Whether a blank line follows it.
    blank_after: bool,
}

/// A table taken apart into data and text.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Parts<'a> {
    /// The data.
    pub(crate) data: Run,
    /// Lines of text and comments, in file order; comments without their mark.
    pub(crate) text_lines: Vec<TextLine<'a>>,
    /// A last line that is cut off, left out of the data.
    pub(crate) cut_line: Option<Line<'a>>,
    /// Rows of numbers above the data that belong to another block.
    pub(crate) rows_left_out: usize,
}

impl Parts<'_> {
    /// The rows of the data; blank lines and comments are left out.
    pub(crate) fn rows<'a>(&self, text: &'a str) -> impl Iterator<Item = Line<'a>> + use<'a> {
        rows(text, self.data)
    }
}

/// The rows of a run; blank lines and comments are left out.
pub(crate) fn rows(text: &str, run: Run) -> impl Iterator<Item = Line<'_>> {
    Lines::between(text, run.start, run.end).filter(|line| {
        // Most lines begin with a digit, a sign or a space and need no closer look.
        let plain = line
            .content
            .trim_start_matches([' ', '\t'])
            .starts_with(|c: char| c.is_ascii_digit() || c == '-' || c == '.');
        plain || !matches!(line_kind(line.content), LineKind::Blank | LineKind::Comment)
    })
}

/// A line of text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) struct TextLine<'a> {
    /// Byte offset of the line.
    pub(crate) offset: usize,
    /// The text, trimmed.
    pub(crate) content: &'a str,
    /// Whether it is a comment.
    pub(crate) is_comment: bool,
}

/// Takes a table apart.
pub(crate) fn take_apart(text: &str) -> Result<Parts<'_>, Fault> {
    let mut text_lines = Vec::new();
    let mut runs: Vec<Run> = Vec::new();
    let mut cut_line = None;
    // Whether the last run may go on, and blank lines since its last row.
    let (mut open, mut blanks) = (false, 0);
    // Rows of missing values right above: where they start and how many there are.
    let mut missing_above: Option<(usize, usize)> = None;
    for line in Lines::between(text, 0, text.len()) {
        check_length(text, line)?;
        let kind = line_kind(line.content);
        let is_last = line.offset + line.content.len() == text.len();
        match (kind, runs.last_mut()) {
            (LineKind::Blank, run) => {
                blanks += 1;
                if let Some(run) = run.filter(|_| open) {
                    run.blank_after = true;
                }
            }
            (LineKind::Numbers(_) | LineKind::Missing, Some(run)) if open => {
                run.end = line.next;
                run.rows += 1;
                run.blanks += blanks;
                run.blank_after = false;
                blanks = 0;
            }
            (LineKind::Numbers(words), _) => {
                let (start, above) = missing_above.take().unwrap_or((line.offset, 0));
                runs.push(Run {
                    start,
                    end: line.next,
                    rows: above + 1,
                    blanks: 0,
                    words,
                    blank_after: false,
                });
                (open, blanks) = (true, 0);
            }
            // A word such as NaN is a missing value; a line of dashes may be drawn under a header.
            (LineKind::Missing, _) if line.content.contains(char::is_alphabetic) => {
                let (start, above) = missing_above.unwrap_or((line.offset, 0));
                missing_above = Some((start, above + 1));
                continue;
            }
            (LineKind::Text, Some(_)) if is_last && begins_like_number(line.content) => {
                cut_line = Some(line);
            }
            (kind, _) => {
                let is_comment = kind == LineKind::Comment;
                let content = comment_text(line.content).unwrap_or_else(|| line.content.trim());
                text_lines.push(TextLine {
                    offset: line.offset,
                    content,
                    is_comment,
                });
                open &= is_comment;
            }
        }
        missing_above = None;
        if text_lines.len() > MOST_TEXT_LINES {
            let limit = MOST_TEXT_LINES;
            return Err(TableProblem::TooMuchText { limit }.into());
        }
    }
    let (data, rows_left_out) = choose_data(text, &runs, &text_lines)?;
    Ok(Parts {
        data,
        text_lines,
        cut_line,
        rows_left_out,
    })
}

fn check_length(text: &str, line: Line<'_>) -> Result<(), Fault> {
    let bytes = line.content.len();
    if bytes <= LONGEST_LINE_BYTES {
        return Ok(());
    }
    let problem = TableProblem::LongLine {
        bytes,
        limit: LONGEST_LINE_BYTES,
    };
    Err(fault(text, line.offset, problem))
}

/// The longest run, and the number of rows in short blocks before it; a run that may belong to the data
/// but is parted from it by text is a fault.
fn choose_data(
    text: &str,
    runs: &[Run],
    text_lines: &[TextLine<'_>],
) -> Result<(Run, usize), Fault> {
    let data = runs
        .iter()
        .rev()
        .max_by_key(|run| run.rows)
        .copied()
        .ok_or(TableProblem::NoNumbers)?;
    let mut left_out = 0;
    let text_after = |offset: usize| {
        text_lines
            .iter()
            .find(|t| !t.is_comment && t.offset >= offset)
    };
    for run in runs.iter().filter(|run| run.start != data.start) {
        let is_block = run.start < data.start
            && run.rows <= MOST_ROWS_OF_A_BLOCK
            && run.rows * 2 <= data.rows
            && (run.blank_after || run.words != data.words);
        if !is_block {
            return Err(stands_between(text, text_after(run.end.min(data.end))));
        }
        left_out += run.rows;
    }
    let broken = text_after(data.end).filter(|line| begins_like_number(line.content));
    match broken {
        Some(_) => Err(stands_between(text, broken)),
        None => Ok((data, left_out)),
    }
}

/// The fault of a line of text between rows.
fn stands_between(text: &str, line: Option<&TextLine<'_>>) -> Fault {
    match line {
        Some(line) => {
            let shown = shortened(line.content);
            let problem = if begins_like_number(line.content) {
                TableProblem::NotANumber { text: shown }
            } else {
                TableProblem::TextWithin { text: shown }
            };
            fault(text, line.offset, problem)
        }
        None => TableProblem::NoNumbers.into(),
    }
}

/// A text short enough for a message.
pub(crate) fn shortened(text: &str) -> String {
    const LONGEST: usize = 40;
    if text.chars().nth(LONGEST).is_none() {
        return text.to_owned();
    }
    let mut short: String = text.chars().take(LONGEST).collect();
    short.push_str("...");
    short
}

/// A problem of a table at a byte offset.
pub(crate) fn fault(text: &str, offset: usize, problem: TableProblem) -> Fault {
    Fault::at(text, offset, None, ReadProblem::Table { source: problem })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_by_what_they_hold() {
        for (line, kind) in [
            ("", LineKind::Blank),
            (" ,;\t", LineKind::Blank),
            ("# text", LineKind::Comment),
            ("% 1 2", LineKind::Comment),
            ("1,2", LineKind::Numbers(2)),
            ("1,5;2,5", LineKind::Numbers(4)),
            ("-1.5e-07\tNaN", LineKind::Numbers(2)),
            ("0.5,1.22,, # note", LineKind::Numbers(2)),
            ("3;#N/A", LineKind::Numbers(2)),
            ("\"1,5\",\"2\"", LineKind::Numbers(3)),
            ("***", LineKind::Missing),
            ("NaN BAD", LineKind::Missing),
            ("-----", LineKind::Text),
            ("1.5e", LineKind::Text),
            ("x,z", LineKind::Text),
            ("Ra,468.0 um", LineKind::Text),
            ("2031-05-04", LineKind::Text),
            ("1.000.541", LineKind::Numbers(1)),
            (" +1. -.5e+3,2E5", LineKind::Numbers(3)),
            ("1 .", LineKind::Text),
            ("1 e5", LineKind::Text),
            ("1e+", LineKind::Text),
        ] {
            assert_eq!(line_kind(line), kind, "{line}");
        }
    }

    #[test]
    fn a_short_block_before_the_data_is_not_the_data() {
        let text = "Results\nNr;Ra\n1;0.4\n\nScan\nx_um;z_nm\n0;1\n1;2\n2;3\n";
        let parts = take_apart(text).unwrap();
        assert_eq!((parts.data.rows, parts.rows_left_out), (3, 1));
        let broken = "0;1\nabc;2\n2;3\n3;4\n4;5\n";
        let fault = take_apart(broken).unwrap_err();
        assert_eq!(fault.place.unwrap().line, 2);
    }

    #[test]
    fn a_cut_last_line_is_set_aside() {
        let parts = take_apart("x z\n0 1\n1 2\n2 3.1e").unwrap();
        assert_eq!(
            (parts.data.rows, parts.cut_line.map(|l| l.offset)),
            (2, Some(12))
        );
        assert!(take_apart("0 1\n1 2\n2 3.1e\n").is_err());
    }
}
