//! An outline in columns of text: `x` and `y`, one vertex a row.
//!
//! A header names columns and units (see [`super::columns`]); without one the unit asked for is used. A
//! blank row begins a new loop, or a column `loop` labels the loops and a column `lumen` the lumens. The
//! closing vertex may be repeated. `#` begins a comment.

use std::collections::HashSet;

use super::columns::{Columns, join_units};
use super::delimited_text::{
    Delimiter, NumberReader, Row, Rows, choose_delimiter, looks_numeric, offset_of, split,
};
use super::limits::check_vertices;
use super::loop_nesting::RawLoop;
use super::read_error::{Fault, ReadProblem};
use super::section::UnitOption;
use crate::geometry::Point;

/// Loops of an outline as read.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct RawOutline {
    /// Loops in file order, metres.
    pub(crate) loops: Vec<RawLoop>,
    /// Name of the unit, for messages.
    pub(crate) unit: String,
}

/// Reads an outline in columns; `keep_non_finite` passes infinite coordinates and NaN on.
pub(crate) fn read(
    text: &str,
    option: Option<&UnitOption>,
    keep_non_finite: bool,
) -> Result<RawOutline, Fault> {
    let delimiter = choose_delimiter(text)?;
    let mut rows = Rows::new(text).peekable();
    while rows.next_if(|row| row.content.is_empty()).is_some() {}
    let first = *rows.peek().ok_or(ReadProblem::NoOutline)?;
    let header = header(text, first, delimiter, option)?;
    let has_header = header.is_some();
    let columns = match header {
        Some(columns) => {
            rows.next();
            columns
        }
        None => Columns::without_header(option)
            .map_err(|problem| Fault::at(text, first.offset, None, problem))?,
    };
    let mut table = Table::new(text, delimiter, columns, keep_non_finite);
    let mut doubt = PairDoubt::new(!has_header && delimiter == Delimiter::Comma);
    for row in rows {
        doubt.look(row);
        table.row(row)?;
    }
    doubt.finish(text)?;
    table.finish()
}

/// The columns named by the first row; `None` when it holds numbers already.
fn header(
    text: &str,
    row: Row<'_>,
    delimiter: Delimiter,
    option: Option<&UnitOption>,
) -> Result<Option<Columns>, Fault> {
    let mut fields = Vec::new();
    split(row.content, delimiter, &mut fields);
    let numeric = |index: usize| fields.get(index).is_some_and(|field| looks_numeric(field));
    if numeric(0) {
        return Ok(None);
    }
    if numeric(1) {
        let field = fields.first().copied().unwrap_or_default();
        let problem = if field.is_empty() {
            ReadProblem::EmptyField
        } else {
            ReadProblem::NotANumber {
                text: field.to_owned(),
            }
        };
        return Err(Fault::at(text, offset_of(text, field), Some("x"), problem));
    }
    if delimiter == Delimiter::Spaces {
        join_units(row.content, &mut fields);
    }
    Columns::from_header(&fields, option)
        .map(Some)
        .map_err(|found| {
            let (index, problem) = *found;
            let field = fields.get(index).copied().unwrap_or(row.content);
            Fault::at(text, offset_of(text, field), None, problem)
        })
}

/// The loops while they are read.
struct Table<'a> {
    text: &'a str,
    delimiter: Delimiter,
    columns: Columns,
    numbers: NumberReader,
    fields: Vec<&'a str>,
    loops: Vec<RawLoop>,
    points: Vec<Point>,
    /// Lumen and loop label of the loop being read.
    labels: (&'a str, &'a str),
    closed: HashSet<(&'a str, &'a str)>,
    vertices: usize,
}

impl<'a> Table<'a> {
    fn new(text: &'a str, delimiter: Delimiter, columns: Columns, keep_non_finite: bool) -> Self {
        Self {
            text,
            delimiter,
            columns,
            numbers: NumberReader::new(delimiter, keep_non_finite),
            fields: Vec::new(),
            loops: Vec::new(),
            points: Vec::new(),
            labels: ("", ""),
            closed: HashSet::new(),
            vertices: 0,
        }
    }

    fn is_labelled(&self) -> bool {
        self.columns.loop_label.is_some()
    }

    fn row(&mut self, row: Row<'a>) -> Result<(), Fault> {
        if row.content.is_empty() {
            if !self.is_labelled() {
                self.close_loop();
            }
            return Ok(());
        }
        split(row.content, self.delimiter, &mut self.fields);
        if self.fields.len() != self.columns.count {
            let problem = ReadProblem::ColumnCount {
                found: self.fields.len(),
                expected: self.columns.count,
            };
            let extra = self.fields.get(self.columns.count).copied();
            let offset = extra.map_or(row.offset, |field| offset_of(self.text, field));
            return Err(Fault::at(self.text, offset, None, problem));
        }
        self.take_labels(row)?;
        let x = self.coordinate(self.columns.x, "x")?;
        let y = self.coordinate(self.columns.y, "y")?;
        self.points.push([x, y]);
        self.vertices += 1;
        check_vertices(self.vertices)
            .map_err(|problem| Fault::at(self.text, row.offset, None, problem))
    }

    fn coordinate(&mut self, axis: super::columns::Axis, name: &str) -> Result<f64, Fault> {
        let field = self.fields.get(axis.index).copied().unwrap_or_default();
        self.numbers
            .read(self.text, field, axis.scale)
            .map_err(|problem| {
                Fault::at(self.text, offset_of(self.text, field), Some(name), problem)
            })
    }

    /// Begins a new loop when a label changes.
    fn take_labels(&mut self, row: Row<'a>) -> Result<(), Fault> {
        let label = |index: Option<usize>| index.and_then(|i| self.fields.get(i)).copied();
        let lumen = label(self.columns.lumen_label).unwrap_or_default();
        let name = label(self.columns.loop_label).unwrap_or_default();
        if (lumen, name) == self.labels {
            return Ok(());
        }
        self.close_loop();
        let reopened = self.is_labelled() && self.closed.contains(&(lumen, name));
        self.labels = (lumen, name);
        if reopened {
            let problem = ReadProblem::LoopReopened {
                label: name.to_owned(),
            };
            let offset = if name.is_empty() {
                row.offset
            } else {
                offset_of(self.text, name)
            };
            return Err(Fault::at(self.text, offset, None, problem));
        }
        Ok(())
    }

    fn close_loop(&mut self) {
        if self.points.is_empty() {
            return;
        }
        self.closed.insert(self.labels);
        let lumen = self.columns.lumen_label.map(|_| self.labels.0.to_owned());
        let points = std::mem::take(&mut self.points);
        self.loops.push(RawLoop { points, lumen });
    }

    fn finish(mut self) -> Result<RawOutline, Fault> {
        self.close_loop();
        self.numbers.finish(self.text)?;
        if self.loops.is_empty() {
            return Err(ReadProblem::NoOutline.into());
        }
        Ok(RawOutline {
            loops: self.loops,
            unit: self.columns.unit,
        })
    }
}

/// Doubt about a table without header whose rows are all like `12,50`: two columns, or one with a decimal comma.
struct PairDoubt {
    is_open: bool,
    digits: Option<usize>,
    first: Option<(usize, String)>,
}

impl PairDoubt {
    fn new(is_open: bool) -> Self {
        Self {
            is_open,
            digits: None,
            first: None,
        }
    }

    fn look(&mut self, row: Row<'_>) {
        if !self.is_open || row.content.is_empty() {
            return;
        }
        let content = row.content.trim();
        let second = content.split_once(',').map_or("", |(_, second)| second);
        let only_digits = content.bytes().all(|b| b.is_ascii_digit() || b == b',');
        let digits = *self.digits.get_or_insert(second.len());
        self.is_open = only_digits && second.len() == digits && digits >= 2;
        if self.first.is_none() {
            self.first = Some((row.offset, content.to_owned()));
        }
    }

    fn finish(self, text: &str) -> Result<(), Fault> {
        match self.first {
            Some((offset, content)) if self.is_open => Err(Fault::at(
                text,
                offset,
                None,
                ReadProblem::AmbiguousDecimal { text: content },
            )),
            _ => Ok(()),
        }
    }
}
