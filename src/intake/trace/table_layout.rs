//! The layout of a table: header, names and units of its columns, separator, decimal mark, rows.

use std::collections::BTreeMap;

use super::table_columns::{NamedColumn, are_units, names_columns, spaced_names};
use super::table_keys::{Declared, is_unit_key, key_and_value};
use super::table_lines::{
    Line, Parts, Run, TextLine, fault, is_missing, rows, take_apart, without_comment,
};
use super::table_marks::{Marks, decide};
use super::table_options::TableOptions;
use super::table_problem::TableProblem;
use super::table_units::{WrittenUnit, split_unit};
use crate::intake::delimited_text::{Delimiter, split};
use crate::intake::read_error::Fault;

/// Most samples in a table.
pub(crate) const MOST_SAMPLES: usize = 20_000_000;
/// Rows looked at for the number of columns.
const SAMPLE_ROWS: usize = 1000;

/// A table before its numbers are read.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Layout<'a> {
    /// The whole text.
    pub(crate) text: &'a str,
    /// Separator and decimal mark.
    pub(crate) marks: Marks,
    /// The data, without a count above it.
    pub(crate) data: Run,
    /// Columns, with names where there is a column line.
    pub(crate) columns: Vec<NamedColumn<'a>>,
    /// Whether there is a column line.
    pub(crate) is_named: bool,
    /// Number of samples by a count above the data or by the header.
    pub(crate) count: Option<usize>,
    /// The count that stood above the data.
    pub(crate) count_line: Option<usize>,
    /// Keys and values in file order.
    pub(crate) metadata: Vec<(String, String)>,
    /// What the header says of lengths and units.
    pub(crate) declared: Declared,
    /// A last line that is cut off: its byte offset.
    pub(crate) cut_line: Option<usize>,
    /// Rows of numbers above the data that belong to another block.
    pub(crate) rows_left_out: usize,
}

impl<'a> Layout<'a> {
    /// Finds the layout.
    pub(crate) fn of(text: &'a str, options: &TableOptions) -> Result<Self, Fault> {
        let mut parts = take_apart(text)?;
        let marks = decide(text, &parts, options.decimal)?;
        let count_line = take_count(text, &mut parts, marks);
        let mut cut_line = parts.cut_line.map(|line| line.offset);
        let width = usual_width(text, &parts, marks);
        if let Some(offset) = short_last_line(text, &parts, marks, width) {
            parts.data.end = offset;
            parts.data.rows = parts.data.rows.saturating_sub(1);
            cut_line = Some(offset);
        }
        let head = Head::of(&parts, marks, width, options);
        let metadata: Vec<(String, String)> = parts
            .text_lines
            .iter()
            .filter(|line| !head.lines.contains(&line.offset))
            .map(|line| key_and_value(*line))
            .collect();
        let declared = Declared::of(&metadata, marks.decimal);
        Ok(Self {
            text,
            marks,
            data: parts.data,
            is_named: head.is_named,
            columns: head.columns,
            count: count_line.or(declared.count),
            count_line,
            declared,
            metadata,
            cut_line,
            rows_left_out: parts.rows_left_out,
        })
    }

    /// The rows of the data.
    pub(crate) fn rows(&self) -> impl Iterator<Item = Line<'a>> + use<'a> {
        rows(self.text, self.data)
    }

    /// Splits a row into fields; a row with more than the table has is a fault, and so is one with fewer
    /// where separators are spaces.
    pub(crate) fn fields(&self, line: Line<'a>, fields: &mut Vec<&'a str>) -> Result<(), Fault> {
        self.marks.split(without_comment(line.content), fields);
        let expected = self.columns.len();
        let separated = self.marks.delimiter != Delimiter::Spaces
            && (fields.len() > 1 || without_comment(line.content).contains([',', ';', '\t']));
        if fields.len() > expected || (fields.len() < expected && !separated) {
            let found = fields.len();
            let problem = TableProblem::RowLength { found, expected };
            return Err(fault(self.text, line.offset, problem));
        }
        Ok(())
    }

    /// Refuses more samples than the limit, before anything is stored.
    pub(crate) fn check_samples(&self, per_row: usize) -> Result<(), Fault> {
        let found = self.data.rows.saturating_mul(per_row);
        if found <= MOST_SAMPLES {
            return Ok(());
        }
        let limit = MOST_SAMPLES;
        Err(TableProblem::TooManySamples { found, limit }.into())
    }

    /// Names of columns for messages, by their places.
    pub(crate) fn shown_columns(&self, places: impl ExactSizeIterator<Item = usize>) -> String {
        const MOST_SHOWN: usize = 12;
        let more = places.len().saturating_sub(MOST_SHOWN);
        let mut shown: Vec<String> = places
            .take(MOST_SHOWN)
            .filter_map(|index| {
                let column = self.columns.get(index)?;
                Some(match column.field {
                    "" => column.shown(index),
                    _ => format!("{} {}", index + 1, column.shown(index)),
                })
            })
            .collect();
        if more > 0 {
            shown.push(format!("and {more} more"));
        }
        shown.join(", ")
    }
}

/// Takes a count of samples off the top of the data.
///
/// Above several columns it is a whole number alone in the first row; above a single column it must be the
/// number of rows that follow.
fn take_count(text: &str, parts: &mut Parts<'_>, marks: Marks) -> Option<usize> {
    let mut rows = parts.rows(text);
    let (first, second) = (rows.next()?, rows.next()?);
    let mut fields = Vec::new();
    marks.split(without_comment(first.content), &mut fields);
    let &[count] = fields.as_slice() else {
        return None;
    };
    let count: usize = count.parse().ok()?;
    let separated = first.content.trim_end().ends_with([',', ';']);
    marks.split(without_comment(second.content), &mut fields);
    let is_count = match fields.len() {
        0 => false,
        1 => count >= 3 && count == parts.data.rows - 1,
        _ => !separated,
    };
    if !is_count {
        return None;
    }
    parts.data.start = first.next;
    parts.data.rows -= 1;
    Some(count)
}

/// The number of fields most of the first rows have; of two equally frequent the larger.
fn usual_width(text: &str, parts: &Parts<'_>, marks: Marks) -> usize {
    let mut fields = Vec::new();
    let mut widths: BTreeMap<usize, usize> = BTreeMap::new();
    for line in parts.rows(text).take(SAMPLE_ROWS) {
        marks.split(without_comment(line.content), &mut fields);
        *widths.entry(fields.len().max(1)).or_default() += 1;
    }
    widths
        .into_iter()
        .max_by_key(|(width, rows)| (*rows, *width))
        .map_or(1, |(width, _)| width)
}

/// The byte offset of a last row that has no line end and fewer fields than the others.
fn short_last_line(text: &str, parts: &Parts<'_>, marks: Marks, width: usize) -> Option<usize> {
    if parts.data.end < text.len() || parts.data.rows < 2 || text.ends_with(['\n', '\r']) {
        return None;
    }
    let start = text.rfind(['\n', '\r'])? + 1;
    let mut fields = Vec::new();
    marks.split(without_comment(text.get(start..)?), &mut fields);
    (!fields.is_empty() && fields.len() < width).then_some(start)
}

/// The column line and the unit line.
struct Head<'a> {
    columns: Vec<NamedColumn<'a>>,
    is_named: bool,
    /// Byte offsets of the lines used.
    lines: Vec<usize>,
}

impl<'a> Head<'a> {
    fn of(parts: &Parts<'a>, marks: Marks, width: usize, options: &TableOptions) -> Self {
        const LINES_LOOKED_AT: usize = 3;
        let (mut names, mut units): (Option<Vec<&str>>, Option<Vec<&str>>) = (None, None);
        let mut lines = Vec::new();
        let above = parts.text_lines.iter().rev();
        for line in above
            .filter(|line| line.offset < parts.data.start)
            .take(LINES_LOOKED_AT)
        {
            let Some(fields) = name_fields(*line, marks, width) else {
                break;
            };
            if units.is_none() && are_units(&fields) {
                units = Some(fields);
            } else if (names_columns(&fields) && !is_unit_key(*line)) || asked_for(&fields, options)
            {
                names = Some(fields);
            } else {
                break;
            }
            lines.push(line.offset);
            if names.is_some() {
                break;
            }
        }
        let is_named = names.is_some();
        let named = names.unwrap_or_default();
        let units = units.unwrap_or_default();
        // A named column beyond the widest row is there, with every value missing.
        let count = match marks.delimiter {
            Delimiter::Spaces => width,
            _ => width.max(named.len()),
        };
        let columns = (0..count)
            .map(|index| {
                let mut column = NamedColumn::new(named.get(index).copied().unwrap_or_default());
                let below = units
                    .get(index)
                    .map_or(WrittenUnit::None, |unit| split_unit(unit).1);
                if column.unit == WrittenUnit::None {
                    column.unit = below;
                }
                column
            })
            .collect();
        Self {
            columns,
            is_named,
            lines,
        }
    }
}

/// The fields of a line that may name columns, `None` when their number does not fit.
fn name_fields(line: TextLine<'_>, marks: Marks, width: usize) -> Option<Vec<&str>> {
    if is_missing(line.content) {
        return None;
    }
    if marks.delimiter == Delimiter::Spaces {
        // A comment such as `Value units: m` is a key and a value, however many words it has.
        let is_key = line.is_comment && line.content.contains([':', '=']);
        return if is_key {
            None
        } else {
            spaced_names(line.content, width)
        };
    }
    let mut fields = Vec::new();
    split(line.content, marks.delimiter, &mut fields);
    if fields.len() < 2 && width >= 2 {
        return spaced_names(line.content, width);
    }
    Some(fields)
}

/// Whether a field is a column asked for by name.
fn asked_for(fields: &[&str], options: &TableOptions) -> bool {
    [&options.x_column, &options.z_column]
        .into_iter()
        .flatten()
        .any(|wanted| {
            fields
                .iter()
                .any(|field| !field.is_empty() && super::table_choice::is_called(field, wanted))
        })
}
