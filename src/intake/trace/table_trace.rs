//! A trace from delimited text, in any dialect that says what it is.
//!
//! The header is kept as it is; names of columns go before their places; units come from the column line,
//! the header or the options and are never guessed. A missing height stays in the trace as NaN; a row
//! without a position is left out and counted. Positions are used as given, turned round when they fall, and
//! rebuilt only where their rounding explains their unevenness.

use super::profile::{Profile, RawTrace};
use super::table_choice::{Choice, axis_unit, choose, counts_rows, missing_unit};
use super::table_columns::Role;
use super::table_keys::{KeptLength, tip_radius};
use super::table_kind::{is_area, outline_doubt};
use super::table_layout::Layout;
use super::table_lines::{Line, fault};
use super::table_marks::Numbers;
use super::table_options::{Decimal, TableOptions};
use super::table_plausibility::check_span;
use super::table_positions::{OrderWatch, RoundingWatch, compare, rebuild};
use super::table_problem::{TableAxis, TableProblem};
use super::table_units::WrittenUnit;
use crate::intake::delimited_text::{Delimiter, offset_of};
use crate::intake::limits::{MAX_FILE_BYTES, check_file_size};
use crate::intake::read_error::{Fault, ReadError, ReadProblem};
use crate::intake::source_text::SourceText;
use crate::intake::step::Step;
use crate::units::{UnitScale, format_length};
use crate::warning::{Code, Warning};

/// Fewest samples of a trace.
const FEWEST_SAMPLES: usize = 3;
/// Samples below which the choice between a length over samples and over steps is worth a warning.
const FEW_SAMPLES: usize = 100;

/// Reads a trace from the bytes of a text file; `path` is for messages.
///
/// # Errors
/// [`ReadError`] when the text is no table, its numbers or their order are wrong, a limit is passed, or a
/// unit, a column or the decimal mark is missing or in doubt.
///
/// # Examples
/// ```
/// use etchwise::intake::{TableOptions, trace_from_bytes};
/// let table = b"Lateral um,Raw nm\n0.0,5\n0.5,6\n1.0,NaN\n".to_vec();
/// let (trace, warnings) = trace_from_bytes(table, "scan.csv", &TableOptions::default()).unwrap();
/// assert_eq!(trace.profile.x, [0.0, 0.5e-6, 1e-6]);
/// assert_eq!(trace.profile.z[1], 6e-9);
/// assert!(trace.profile.z[2].is_nan() && warnings.is_empty());
/// ```
pub fn trace_from_bytes(
    bytes: Vec<u8>,
    path: &str,
    options: &TableOptions,
) -> Result<(RawTrace, Vec<Warning>), ReadError> {
    table_text(bytes)
        .and_then(|text| read_trace_table(&text, options))
        .map_err(|fault| fault.in_file(path))
}

/// The text of a table from the bytes of a file.
pub(crate) fn table_text(bytes: Vec<u8>) -> Result<String, Fault> {
    check_file_size(bytes.len() as u64, MAX_FILE_BYTES)?;
    let text = SourceText::decode(bytes)?.text;
    if text.trim().is_empty() {
        return Err(ReadProblem::Empty.into());
    }
    Ok(text)
}

/// Reads a trace from decoded text.
pub(crate) fn read_trace_table(
    text: &str,
    options: &TableOptions,
) -> Result<(RawTrace, Vec<Warning>), Fault> {
    let layout = Layout::of(text, options)?;
    layout.check_samples(2)?;
    check_step(options.x_step)?;
    if options.x_column.is_none() && options.z_column.is_none() && is_area(&layout) {
        return Err(TableProblem::AreaNotTrace.into());
    }
    let choice = choose(&layout, options)?;
    let units = Units::of(&layout, &choice, options)?;
    let samples = Samples::read(&layout, &units)?;
    let mut reading = Reading {
        steps: layout_steps(&layout, &units, &samples),
        warnings: layout_warnings(&layout, &samples),
        layout: &layout,
        options,
    };
    reading.warnings.extend(choice.warnings.iter().cloned());
    reading.warnings.extend(outline_doubt(&layout));
    reading.warnings.extend(shared_unit(&units));
    let profile = reading.profile(samples, &units)?;
    let (tip, tip_step) = tip_radius(&layout.metadata, layout.marks.decimal);
    reading.steps.extend(tip_step);
    if !options.allow_any_size {
        check_ranges(&profile, &units)?;
    }
    let Reading {
        steps, warnings, ..
    } = reading;
    let trace = RawTrace {
        profile,
        metadata: layout.metadata,
        tip_radius: tip,
        steps,
    };
    Ok((trace, warnings))
}

/// The warning that one unit of the header is taken for positions and heights.
fn shared_unit(units: &Units) -> Option<Warning> {
    let unit = units.shared.as_ref()?;
    Some(Warning {
        code: Code::ChoiceMade,
        message: format!("the header gives one unit, {unit}; it is taken for positions and heights"),
        advice: "give units by --x-unit and --z-unit after correcting the header, if one of them differs"
            .to_owned(),
        numbers: Vec::new(),
    })
}

/// Refuses a distance of samples that is no length.
pub(crate) fn check_step(step: Option<f64>) -> Result<(), TableProblem> {
    match step {
        Some(metres) if !(metres.is_finite() && metres > 0.0) => {
            Err(TableProblem::StepNotPositive { metres })
        }
        _ => Ok(()),
    }
}

/// Columns with their units.
struct Units {
    /// Column and unit of positions; `None` when they are built from a step.
    x: Option<(usize, UnitScale, String)>,
    /// Column and unit of heights.
    z: (usize, UnitScale, String),
    /// Where the units were found.
    from: String,
    /// The unit of the header that is taken for both.
    shared: Option<String>,
}

impl Units {
    fn of(layout: &Layout<'_>, choice: &Choice, options: &TableOptions) -> Result<Self, Fault> {
        // A count of samples is no position; with a step given, unnamed positions without unit are one.
        let x = choice.x.filter(|&index| {
            let column = layout.columns.get(index);
            let is_bare = column.is_none_or(|c| c.field.is_empty() && c.unit == WrittenUnit::None);
            let is_index = column.is_some_and(|c| c.role == Role::Index)
                || (options.x_step.is_some()
                    && options.x_column.is_none()
                    && is_bare
                    && counts_rows(layout, index));
            !is_index
        });
        let x_unit = match x {
            Some(_) => axis_unit(layout, TableAxis::Positions, x, options)?,
            None => None,
        };
        let z_unit = axis_unit(layout, TableAxis::Heights, Some(choice.z), options)?;
        let z = choice.z;
        let shared = match (&x_unit, &z_unit) {
            (Some(x), Some(z)) if x.from == "header" && z.from == "header" => {
                layout.declared.is_unit_shared.then(|| z.word.clone())
            }
            _ => None,
        };
        match (x, x_unit, z_unit) {
            (Some(x), Some(x_unit), Some(z_unit)) => Ok(Self {
                from: format!(
                    "positions in {} ({}), heights in {} ({})",
                    x_unit.word, x_unit.from, z_unit.word, z_unit.from
                ),
                shared,
                x: Some((x, x_unit.scale, x_unit.word)),
                z: (z, z_unit.scale, z_unit.word),
            }),
            (None, _, Some(z_unit)) => Ok(Self {
                from: format!("heights in {} ({})", z_unit.word, z_unit.from),
                shared,
                x: None,
                z: (z, z_unit.scale, z_unit.word),
            }),
            (Some(x), None, _) => Err(missing_unit(layout, TableAxis::Positions, x)),
            (_, _, None) => Err(missing_unit(layout, TableAxis::Heights, z)),
        }
    }
}

/// Samples as read.
struct Samples {
    /// Positions, m, in the order of the file; empty when there are none.
    x: Vec<f64>,
    z: Vec<f64>,
    order: OrderWatch,
    rounding: RoundingWatch,
    /// Rows without a position, left out.
    without_position: usize,
    missing_heights: usize,
}

impl Samples {
    fn read(layout: &Layout<'_>, units: &Units) -> Result<Self, Fault> {
        let has_x = units.x.is_some();
        if layout.columns.len() == 1 && layout.data.blanks > 0 {
            // A line between every two rows is a matter of line ends; any other may be a missing height.
            if layout.data.blanks + 1 != layout.data.rows {
                return Err(fault(
                    layout.text,
                    first_blank(layout),
                    TableProblem::BlankWithin,
                ));
            }
        }
        let mut samples = Self {
            x: Vec::with_capacity(if has_x { layout.data.rows } else { 0 }),
            z: Vec::with_capacity(layout.data.rows),
            order: OrderWatch::default(),
            rounding: RoundingWatch::default(),
            without_position: 0,
            missing_heights: 0,
        };
        let mut numbers = Numbers::new(layout.marks);
        let mut fields = Vec::new();
        for line in layout.rows() {
            layout.fields(line, &mut fields)?;
            samples.row(layout, units, line, &fields, &mut numbers)?;
        }
        let found = samples.z.len();
        if found < FEWEST_SAMPLES {
            let needed = FEWEST_SAMPLES;
            return Err(TableProblem::TooFewSamples { found, needed }.into());
        }
        if samples.missing_heights == found {
            return Err(TableProblem::NoHeights.into());
        }
        Ok(samples)
    }

    fn row(
        &mut self,
        layout: &Layout<'_>,
        units: &Units,
        line: Line<'_>,
        fields: &[&str],
        numbers: &mut Numbers,
    ) -> Result<(), Fault> {
        let field = |index: usize| fields.get(index).copied().unwrap_or_default();
        let at = |field: &str| match field {
            "" => line.offset,
            _ => offset_of(layout.text, field),
        };
        let wrong =
            |field: &str, problem: ReadProblem| Fault::at(layout.text, at(field), None, problem);
        if let Some((index, scale, _)) = &units.x {
            let written = field(*index);
            let read = numbers.read(written, *scale);
            let Some(x) = read.map_err(|problem| wrong(written, problem))? else {
                self.without_position += 1;
                return Ok(());
            };
            self.order
                .take(x, written, at(written))
                .map_err(|problem| fault(layout.text, at(written), problem))?;
            self.rounding.take(written);
            self.x.push(x);
        }
        let written = field(units.z.0);
        let read = numbers.read(written, units.z.1);
        let z = read.map_err(|problem| wrong(written, problem))?;
        self.missing_heights += usize::from(z.is_none());
        self.z.push(z.unwrap_or(f64::NAN));
        Ok(())
    }
}

/// The byte offset of the first blank line between rows.
fn first_blank(layout: &Layout<'_>) -> usize {
    use super::table_lines::{LineKind, Lines, line_kind};
    Lines::between(layout.text, layout.data.start, layout.data.end)
        .find(|line| line_kind(line.content) == LineKind::Blank)
        .map_or(layout.data.start, |line| line.offset)
}

fn layout_steps(layout: &Layout<'_>, units: &Units, samples: &Samples) -> Vec<Step> {
    let mut steps = Vec::new();
    let shown = |index: usize| {
        layout
            .columns
            .get(index)
            .map(|c| c.shown(index))
            .unwrap_or_default()
    };
    let separator = match layout.marks.delimiter {
        Delimiter::Comma => "commas",
        Delimiter::Semicolon => "semicolons",
        Delimiter::Tab => "tabs",
        Delimiter::Spaces => "spaces",
    };
    let decimal = match layout.marks.decimal {
        Decimal::Point => "decimal points",
        Decimal::Comma => "decimal commas",
    };
    let columns = match &units.x {
        Some((x, ..)) => format!(
            "positions from {}, heights from {}",
            shown(*x),
            shown(units.z.0)
        ),
        None => format!("heights from {}", shown(units.z.0)),
    };
    steps.push(
        Step::new(
            "columns",
            format!(
                "{} rows, {separator} between columns, {decimal}; {columns}",
                layout.data.rows
            ),
        )
        .with(&[("rows", layout.data.rows as f64)]),
    );
    steps.push(Step::new("units", units.from.clone()));
    if let Some(count) = layout.count_line {
        let text =
            format!("the line `{count}` above the data is the number of samples, not one of them");
        steps.push(Step::new("columns", text));
    }
    if layout.rows_left_out > 0 {
        steps.push(Step::new(
            "columns",
            format!(
                "{} row(s) of numbers above the data belong to another block and were left out",
                layout.rows_left_out
            ),
        ));
    }
    if samples.missing_heights > 0 {
        let text = format!(
            "{} of {} heights are missing in the file",
            samples.missing_heights,
            samples.z.len()
        );
        let numbers = [("missing_heights", samples.missing_heights as f64)];
        steps.push(Step::new("missing", text).with(&numbers));
    }
    steps
}

/// The warning about a last line that was left out.
pub(crate) fn cut_warning(layout: &Layout<'_>) -> Option<Warning> {
    let offset = layout.cut_line?;
    let line = crate::intake::source_text::place_at(layout.text, offset).line;
    Some(Warning {
        code: Code::FileDefect,
        message: format!("the last line, {line}, is cut off and was left out"),
        advice: "check that the file is complete".to_owned(),
        numbers: vec![("line", line as f64)],
    })
}

fn layout_warnings(layout: &Layout<'_>, samples: &Samples) -> Vec<Warning> {
    let mut warnings: Vec<Warning> = cut_warning(layout).into_iter().collect();
    if let (Some(count), 1) = (layout.count_line, layout.columns.len()) {
        warnings.push(Warning {
            code: Code::ChoiceMade,
            message: format!(
                "the first number, {count}, is the number of those below it; it is read as their count"
            ),
            advice: "if it is a height, put a line of text with its unit above it".to_owned(),
            numbers: vec![("count", count as f64)],
        });
    }
    if samples.without_position > 0 {
        warnings.push(Warning {
            code: Code::FileDefect,
            message: format!(
                "{} row(s) without a position were left out",
                samples.without_position
            ),
            advice: "export the trace again; only heights may be missing".to_owned(),
            numbers: vec![("rows", samples.without_position as f64)],
        });
    }
    warnings
}

/// Steps and warnings while positions are made.
struct Reading<'a> {
    layout: &'a Layout<'a>,
    options: &'a TableOptions,
    steps: Vec<Step>,
    warnings: Vec<Warning>,
}

impl Reading<'_> {
    /// Positions and heights in rising order.
    fn profile(&mut self, samples: Samples, units: &Units) -> Result<Profile, Fault> {
        let count = samples.z.len() + samples.without_position;
        let Some((_, scale, _)) = &units.x else {
            return self.built(samples.z);
        };
        let Samples {
            mut x,
            mut z,
            order,
            rounding,
            ..
        } = samples;
        if order.falls() {
            x.reverse();
            z.reverse();
            self.steps.push(Step::new(
                "positions",
                "positions fall in the file; the samples were put into rising order",
            ));
        }
        let largest = x.iter().fold(0.0_f64, |most, x| most.max(x.abs()));
        let quantum = scale.apply(rounding.quantum(largest / scale.factor()));
        let rebuilt = if samples.without_position == 0 {
            rebuild(&mut x, quantum, &self.layout.declared)
        } else {
            None
        };
        match (rebuilt, order.repeated) {
            (Some((step, warning)), _) => {
                self.steps.push(step);
                self.warnings.push(warning);
            }
            (None, Some((offset, text))) => {
                let problem = TableProblem::RepeatedPosition { text };
                return Err(fault(self.layout.text, offset, problem));
            }
            (None, None) => {}
        }
        self.warnings
            .extend(compare(&x, count, self.layout.count, &self.layout.declared));
        self.check_step_asked(&x)?;
        Ok(Profile { x, z })
    }

    /// Refuses a step asked for that contradicts the positions.
    fn check_step_asked(&self, x: &[f64]) -> Result<(), TableProblem> {
        let (Some(option), Some(first), Some(last)) = (self.options.x_step, x.first(), x.last())
        else {
            return Ok(());
        };
        let file = (last - first) / (x.len().max(2) - 1) as f64;
        if (file / option - 1.0).abs() > 0.01 {
            return Err(TableProblem::StepConflict { file, option });
        }
        Ok(())
    }

    /// Positions from a step: asked for, in the header, or from the declared length.
    fn built(&mut self, z: Vec<f64>) -> Result<Profile, Fault> {
        let declared = &self.layout.declared;
        let steps = (z.len().max(2) - 1) as f64;
        let (step, from) = match (self.options.x_step, &declared.step, &declared.width) {
            (Some(step), ..) => (step, "the distance of samples asked for"),
            (None, Some(KeptLength::Metres(step, _)), _) => {
                (*step, "the distance of samples in the header")
            }
            (None, _, Some(KeptLength::Metres(length, _))) => (
                *length / steps,
                "the length in the header over the number of steps",
            ),
            (None, Some(KeptLength::Destroyed(text)), _)
            | (None, None, Some(KeptLength::Destroyed(text))) => {
                let (text, option) = (text.clone(), "--x-step");
                return Err(TableProblem::DestroyedLength { text, option }.into());
            }
            (None, None, None) => return Err(TableProblem::NoPositions.into()),
        };
        let x: Vec<f64> = (0..z.len()).map(|index| index as f64 * step).collect();
        let text = format!(
            "the table has no positions; they were built {} apart from {from}",
            format_length(step)
        );
        self.steps
            .push(Step::new("positions", text.clone()).with(&[("step_m", step)]));
        let by_length = from.starts_with("the length");
        if by_length && z.len() < FEW_SAMPLES {
            self.warnings.push(Warning {
                code: Code::ChoiceMade,
                message: format!(
                    "{text}; if the length counts a step for each sample they are {} apart",
                    format_length(step * steps / z.len() as f64)
                ),
                advice: "give the distance of the samples by --x-step".to_owned(),
                numbers: vec![("step_m", step)],
            });
        }
        self.warnings
            .extend(compare(&x, z.len(), self.layout.count, declared));
        Ok(Profile { x, z })
    }
}

/// The plausibility stop on positions and heights.
fn check_ranges(profile: &Profile, units: &Units) -> Result<(), TableProblem> {
    let range = |values: &[f64]| {
        let finite = values.iter().filter(|v| v.is_finite());
        let (low, high) = finite.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
            (low.min(*v), high.max(*v))
        });
        high - low
    };
    let (x_word, x_factor) = match &units.x {
        Some((_, scale, word)) => (word.as_str(), scale.factor()),
        None => ("m", 1.0),
    };
    check_span(TableAxis::Positions, range(&profile.x), x_word, x_factor)?;
    let (_, scale, word) = &units.z;
    check_span(TableAxis::Heights, range(&profile.z), word, scale.factor())
}
