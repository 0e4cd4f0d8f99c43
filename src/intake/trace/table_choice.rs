//! Which columns are positions and heights, and in which units.
//!
//! Names go before places. Without names the first column that rises or falls throughout is the position
//! and the next the height, a count of samples in front is passed over. Nothing is chosen among several
//! heights.

use super::table_columns::{NamedColumn, Role};
use super::table_layout::Layout;
use super::table_lines::{fault, shortened};
use super::table_marks::Numbers;
use super::table_options::TableOptions;
use super::table_plausibility::likely_unit;
use super::table_problem::{TableAxis, TableProblem};
use super::table_units::{WrittenUnit, instrument_length};
use crate::intake::delimited_text::offset_of;
use crate::intake::read_error::{Fault, ReadProblem};
use crate::intake::section::UnitOption;
use crate::units::{UnitScale, length_scale};
use crate::warning::{Code, Warning};

/// Rows looked at to see what columns without names hold.
const SAMPLE_ROWS: usize = 1000;
/// Most columns that are looked into one by one.
const MOST_COLUMNS_LOOKED_INTO: usize = 64;

/// Columns of a trace.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Choice {
    /// Column of positions; `None` when there is none.
    pub(crate) x: Option<usize>,
    /// Column of heights.
    pub(crate) z: usize,
    /// Choices that the file leaves open.
    pub(crate) warnings: Vec<Warning>,
}

/// Whether a column is called so: by its whole field or by its name without the unit, in any case.
pub(crate) fn is_called(field: &str, wanted: &str) -> bool {
    let wanted = wanted.trim();
    let same = |text: &str| text.to_lowercase() == wanted.to_lowercase();
    !wanted.is_empty() && (same(field.trim()) || same(NamedColumn::new(field).name))
}

/// The column of an option, by its name or by its number from 1.
pub(crate) fn column_asked(
    layout: &Layout<'_>,
    wanted: Option<&String>,
) -> Result<Option<usize>, Fault> {
    let Some(wanted) = wanted else {
        return Ok(None);
    };
    let by_name: Vec<usize> = (0..layout.columns.len())
        .filter(|&i| {
            layout
                .columns
                .get(i)
                .is_some_and(|c| is_called(c.field, wanted))
        })
        .collect();
    if let &[index] = by_name.as_slice() {
        return Ok(Some(index));
    }
    let number = wanted.trim().parse::<usize>().ok();
    let index = number.and_then(|n| n.checked_sub(1));
    match index.filter(|&index| by_name.is_empty() && index < layout.columns.len()) {
        Some(index) => Ok(Some(index)),
        None => Err(TableProblem::NoSuchColumn {
            name: shortened(wanted),
            known: layout.shown_columns(0..layout.columns.len()),
        }
        .into()),
    }
}

/// Chooses the columns of a trace.
pub(crate) fn choose(layout: &Layout<'_>, options: &TableOptions) -> Result<Choice, Fault> {
    let asked_x = column_asked(layout, options.x_column.as_ref())?;
    let asked_z = column_asked(layout, options.z_column.as_ref())?;
    if let (Some(x), Some(z)) = (asked_x, asked_z)
        && x == z
    {
        return Err(same_column(layout, z));
    }
    let mut choice = if layout.is_named {
        by_names(layout, asked_x, asked_z)?
    } else {
        by_places(layout, asked_x, asked_z)?
    };
    if choice.x == Some(choice.z) {
        return Err(same_column(layout, choice.z));
    }
    if asked_z.is_none()
        && let Some(column) = layout.columns.get(choice.z)
        && column.role == Role::Depth
    {
        choice.warnings.push(Warning {
            code: Code::ChoiceMade,
            message: format!(
                "the column {} is called a depth; it is read as heights, larger numbers being higher",
                column.shown(choice.z)
            ),
            advice: "if its numbers grow downwards, turn the trace over with --invert".to_owned(),
            numbers: Vec::new(),
        });
    }
    Ok(choice)
}

fn same_column(layout: &Layout<'_>, index: usize) -> Fault {
    let shown = layout.columns.get(index).map(|c| c.shown(index));
    TableProblem::SameColumn {
        name: shown.unwrap_or_default().trim_matches('`').to_owned(),
    }
    .into()
}

/// Columns by their names.
fn by_names(
    layout: &Layout<'_>,
    asked_x: Option<usize>,
    asked_z: Option<usize>,
) -> Result<Choice, Fault> {
    let with_role = |roles: &[Role]| -> Vec<usize> {
        let columns = layout.columns.iter().enumerate();
        columns
            .filter(|(index, column)| roles.contains(&column.role) && Some(*index) != asked_x)
            .map(|(index, _)| index)
            .collect()
    };
    let positions: Vec<usize> = with_role(&[Role::Position])
        .into_iter()
        .filter(|index| Some(*index) != asked_z)
        .collect();
    let x = match (asked_x, positions.as_slice()) {
        (Some(x), _) | (None, &[x]) => Some(x),
        (None, []) => None,
        (None, several) => {
            let columns = layout.shown_columns(several.iter().copied());
            return Err(TableProblem::SeveralPositions { columns }.into());
        }
    };
    let (z, passed_over) = match asked_z {
        Some(z) => (z, Vec::new()),
        None => named_height(layout, x, &with_role)?,
    };
    let x = x.or_else(|| unnamed_position(layout, z));
    let mut warnings = Vec::new();
    if !passed_over.is_empty() {
        let shown = layout.shown_columns(passed_over.iter().copied());
        let chosen = layout.columns.get(z).map(|c| c.shown(z));
        warnings.push(Warning {
            code: Code::ChoiceMade,
            message: format!(
                "the heights are taken from {}; not used: {shown}",
                chosen.unwrap_or_default()
            ),
            advice: "name the heights by --z-column".to_owned(),
            numbers: Vec::new(),
        });
    }
    Ok(Choice { x, z, warnings })
}

/// The column of heights by the names, and other columns that might have been meant.
fn named_height(
    layout: &Layout<'_>,
    x: Option<usize>,
    with_role: &impl Fn(&[Role]) -> Vec<usize>,
) -> Result<(usize, Vec<usize>), Fault> {
    let has_position = x.is_some();
    if has_position
        && with_role(&[Role::Second]).len() == 1
        && !with_role(&[Role::Height]).is_empty()
        && layout.columns.len() == 3
    {
        return Err(TableProblem::AreaNotTrace.into());
    }
    let heights = with_role(&[Role::Height, Role::Depth]);
    let seconds = with_role(&[Role::Second]);
    let perhaps = with_role(&[Role::PerhapsHeight]);
    let others: Vec<usize> = with_role(&[Role::Unknown, Role::PerhapsHeight, Role::Second])
        .into_iter()
        .filter(|i| {
            let column = layout.columns.get(*i);
            column.is_some_and(|c| {
                !matches!(c.unit, WrittenUnit::OtherQuantity(_)) && !is_all_missing(layout, *i)
            })
        })
        .collect();
    for candidates in [heights, seconds, perhaps, others.clone()] {
        match candidates.as_slice() {
            [] => {}
            &[z] => {
                let rest = others.iter().copied().filter(|i| *i != z).collect();
                return Ok((z, rest));
            }
            several => {
                let columns = layout.shown_columns(several.iter().copied());
                return Err(TableProblem::SeveralHeights { columns }.into());
            }
        }
    }
    let columns = layout.shown_columns(0..layout.columns.len());
    Err(TableProblem::NoHeightColumn { columns }.into())
}

/// Whether a column has no number in the first rows.
fn is_all_missing(layout: &Layout<'_>, index: usize) -> bool {
    layout.columns.len() <= MOST_COLUMNS_LOOKED_INTO
        && Sampled::of(layout, index)
            .values
            .iter()
            .all(Option::is_none)
}

/// A column without a known name that may hold the positions beside named heights.
fn unnamed_position(layout: &Layout<'_>, z: usize) -> Option<usize> {
    if layout.columns.len() > MOST_COLUMNS_LOOKED_INTO {
        return None;
    }
    let mut candidates = layout.columns.iter().enumerate().filter(|(index, column)| {
        *index != z
            && column.role == Role::Unknown
            && matches!(column.unit, WrittenUnit::Length(..) | WrittenUnit::None)
            && Sampled::of(layout, *index).is_ordered()
    });
    let first = candidates.next().map(|(index, _)| index);
    first.filter(|_| candidates.next().is_none())
}

/// Columns by their places.
fn by_places(
    layout: &Layout<'_>,
    asked_x: Option<usize>,
    asked_z: Option<usize>,
) -> Result<Choice, Fault> {
    let count = layout.columns.len();
    let mut warnings = Vec::new();
    let counts = count >= 3
        && asked_x.is_none()
        && asked_z != Some(1)
        && Sampled::of(layout, 0).is_index()
        && Sampled::of(layout, 1).is_ordered();
    let x = match asked_x {
        Some(x) => Some(x),
        None if count == 1 => None,
        None if counts => Some(1),
        None => Some(0),
    };
    let left: Vec<usize> = (0..count)
        .filter(|index| Some(*index) != x && !(counts && *index == 0))
        .collect();
    let z = match (asked_z, left.as_slice()) {
        (Some(z), _) | (None, &[z]) => z,
        (None, []) => 0,
        (None, several) => {
            let columns = layout.shown_columns(several.iter().copied());
            return Err(TableProblem::SeveralHeights { columns }.into());
        }
    };
    if count == 2 && asked_x.is_none() && x == Some(0) && Sampled::of(layout, 0).is_index() {
        warnings.push(Warning {
            code: Code::ChoiceMade,
            message: "the first column counts by ones and has no name; it is read as positions"
                .to_owned(),
            advice:
                "if it is the number of the sample, name the heights by `--z-column 2` and give \
                     `--x-step` after taking the column out"
                    .to_owned(),
            numbers: Vec::new(),
        });
    }
    Ok(Choice { x, z, warnings })
}

/// The first values of a column.
struct Sampled {
    values: Vec<Option<f64>>,
}

impl Sampled {
    fn of(layout: &Layout<'_>, index: usize) -> Self {
        let mut numbers = Numbers::new(layout.marks);
        let one = UnitScale::from_factor(1.0);
        let mut fields = Vec::new();
        let values = layout
            .rows()
            .take(SAMPLE_ROWS)
            .map(|line| {
                layout.fields(line, &mut fields).ok()?;
                numbers.read(fields.get(index)?, one).ok()?
            })
            .collect();
        Self { values }
    }

    fn pairs(&self) -> impl Iterator<Item = (f64, f64)> {
        let values = self.values.iter().flatten();
        values.clone().zip(values.skip(1)).map(|(a, b)| (*a, *b))
    }

    /// Whether the values rise or fall throughout; standing still is allowed.
    fn is_ordered(&self) -> bool {
        let rises = self.pairs().all(|(a, b)| a <= b);
        let falls = self.pairs().all(|(a, b)| a >= b);
        rises != falls
    }

    /// Whether the values count by ones from zero or one.
    fn is_index(&self) -> bool {
        let Some(Some(first)) = self.values.first() else {
            return false;
        };
        let counted = |(index, value): (usize, &Option<f64>)| {
            value.is_some_and(|value| value - first - index as f64 == 0.0)
        };
        (*first == 0.0 || first - 1.0 == 0.0)
            && self.values.len() > 1
            && self.values.iter().enumerate().all(counted)
    }
}

/// Whether a column counts its rows by ones from zero or one.
pub(crate) fn counts_rows(layout: &Layout<'_>, index: usize) -> bool {
    Sampled::of(layout, index).is_index()
}

/// A unit with the word for it.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct AxisUnit {
    /// As written in the file or in the option.
    pub(crate) word: String,
    /// Its size.
    pub(crate) scale: UnitScale,
    /// Where it was found, for the step.
    pub(crate) from: &'static str,
}

/// The unit asked for on one axis.
pub(crate) fn unit_asked(
    axis: TableAxis,
    options: &TableOptions,
) -> Result<Option<UnitOption>, Fault> {
    let own = match axis {
        TableAxis::Positions => options.x_unit.as_deref(),
        TableAxis::Heights => options.z_unit.as_deref(),
    };
    let Some(word) = own.or(options.unit.as_deref()) else {
        return Ok(None);
    };
    match instrument_length(word) {
        Some(scale) => Ok(Some(UnitOption {
            word: word.trim().to_owned(),
            scale,
        })),
        None => Ok(Some(UnitOption::from_word(word)?)),
    }
}

/// The unit of an axis: of its column, else of the header, else asked for; all there are must agree.
///
/// `None` when there is no unit at all.
pub(crate) fn axis_unit(
    layout: &Layout<'_>,
    axis: TableAxis,
    index: Option<usize>,
    options: &TableOptions,
) -> Result<Option<AxisUnit>, Fault> {
    let asked = unit_asked(axis, options)?;
    let column = index.and_then(|index| layout.columns.get(index));
    let unit = column.map_or(&WrittenUnit::None, |column| &column.unit);
    let at_column = |problem: ReadProblem| match column {
        Some(column) if !column.field.is_empty() => Fault::at(
            layout.text,
            offset_of(layout.text, column.field),
            None,
            problem,
        ),
        _ => problem.into(),
    };
    let header = match axis {
        TableAxis::Positions => &layout.declared.position_unit,
        TableAxis::Heights => &layout.declared.height_unit,
    };
    let table = |problem: TableProblem| ReadProblem::Table { source: problem };
    let in_file = match (unit, header, &asked) {
        (WrittenUnit::Length(word, scale), Some((other, theirs)), None)
            if !layout.declared.is_unit_shared && !is_same_unit(*scale, *theirs) =>
        {
            let problem = TableProblem::UnitConflict {
                axis,
                column: shortened(word),
                header: shortened(other),
            };
            return Err(at_column(table(problem)));
        }
        (WrittenUnit::Length(word, scale), ..) => Some(((*word).to_owned(), *scale, "column")),
        (WrittenUnit::OtherQuantity(unit), ..) => {
            let problem = TableProblem::NotALength {
                axis,
                column: column.map_or(String::new(), |c| shortened(c.field)),
                unit: (*unit).to_owned(),
            };
            return Err(at_column(table(problem)));
        }
        (_, _, Some(_)) if matches!(unit, WrittenUnit::Destroyed(_)) => None,
        (WrittenUnit::Destroyed(text), ..) => {
            let text = shortened(text);
            return Err(at_column(table(TableProblem::DestroyedUnit { axis, text })));
        }
        (_, Some((word, scale)), _) => Some((word.clone(), *scale, "header")),
        (WrittenUnit::Unknown(unit), None, None) => {
            let unit = shortened(unit);
            return Err(at_column(table(TableProblem::UnknownUnit { axis, unit })));
        }
        _ => None,
    };
    match (in_file, asked) {
        (Some((word, scale, from)), asked) => {
            if let Some(asked) = asked {
                asked.must_agree(&word, scale).map_err(at_column)?;
            }
            Ok(Some(AxisUnit { word, scale, from }))
        }
        (None, Some(asked)) => Ok(Some(AxisUnit {
            word: asked.word,
            scale: asked.scale,
            from: "option",
        })),
        (None, None) => Ok(None),
    }
}

/// Whether two units are the same length, in whatever spelling.
fn is_same_unit(a: UnitScale, b: UnitScale) -> bool {
    (a.factor() / b.factor() - 1.0).abs() <= 1e-9
}

/// The unit of bare metres, for reading numbers before their unit is known.
pub(crate) fn bare() -> UnitScale {
    length_scale("m").unwrap_or_else(|| UnitScale::from_factor(1.0))
}

/// The fault of a missing unit, with the one unit in which the numbers would be plausible.
pub(crate) fn missing_unit(layout: &Layout<'_>, axis: TableAxis, index: usize) -> Fault {
    let mut numbers = Numbers::new(layout.marks);
    let mut fields = Vec::new();
    let (mut low, mut high) = (f64::INFINITY, f64::NEG_INFINITY);
    for line in layout.rows() {
        let read = layout
            .fields(line, &mut fields)
            .ok()
            .and_then(|()| numbers.read(fields.get(index)?, bare()).ok()?);
        if let Some(value) = read {
            (low, high) = (low.min(value), high.max(value));
        }
    }
    let likely = (high > low)
        .then(|| likely_unit(axis, high - low))
        .flatten();
    let problem = TableProblem::MissingUnit { axis, likely };
    let column = layout.columns.get(index).filter(|c| !c.field.is_empty());
    let offset = match column {
        Some(column) => offset_of(layout.text, column.field),
        None => layout.data.start,
    };
    fault(layout.text, offset, problem)
}
