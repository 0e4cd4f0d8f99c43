//! What a text table is: an outline, a trace, or heights over an area.
//!
//! Only what is sure is said. A table is a trace when its header or its columns say so, or when its
//! positions rise or fall throughout over twelve rows or more; an outline when its header names loops, or when
//! an outline can be read from it and its positions go back and forth or are fewer than twelve.

use super::table_choice::counts_rows;
use super::table_columns::{NamedColumn, Role};
use super::table_layout::Layout;
use super::table_marks::Numbers;
use super::table_options::{Decimal, TableOptions};
use super::table_units::WrittenUnit;
use crate::intake::columns::Columns;
use crate::intake::read_error::ReadProblem;
use crate::units::UnitScale;
use crate::warning::{Code, Warning};

/// Rows from which positions that rise or fall throughout make a trace.
const TRACE_FROM_ROWS: usize = 12;
/// Smallest part of the places of a grid that a list of points must fill.
const FILLED_GRID: f64 = 0.5;
/// Columns of a list of points.
const COLUMNS_OF_POINTS: usize = 3;

/// What a text table is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum TableKind {
    /// Vertices of a closed section.
    Outline,
    /// Heights along a line.
    Trace,
    /// Heights over an area, row by row.
    Matrix,
    /// Heights over an area, a point a row.
    Points,
}

/// The kind of a text table; `None` for other text and for tables that could be several things.
///
/// # Examples
/// ```
/// use etchwise::intake::{TableKind, table_kind};
/// assert_eq!(table_kind("Lateral um,Raw nm\n0,5\n1,6\n2,6\n"), Some(TableKind::Trace));
/// assert_eq!(table_kind("x_um,y_um\n0,0\n100,0\n100,50\n0,50\n"), Some(TableKind::Outline));
/// assert_eq!(table_kind("a letter"), None);
/// ```
pub fn table_kind(text: &str) -> Option<TableKind> {
    let of = |decimal| {
        let options = TableOptions {
            decimal,
            ..TableOptions::default()
        };
        Layout::of(text, &options).map(|layout| kind_of(&layout))
    };
    match of(None) {
        Ok(kind) => kind,
        Err(fault) if is_decimal_doubt(&fault.problem) => {
            // The outline reader asks about the comma itself; a trace is one when either mark makes it one.
            let point = of(Some(Decimal::Point)).ok().flatten();
            let comma = of(Some(Decimal::Comma)).ok().flatten();
            match (point, comma) {
                (Some(TableKind::Outline), _) => Some(TableKind::Outline),
                (a, b) if a == b => a,
                (Some(kind), None) | (None, Some(kind)) => Some(kind),
                _ => None,
            }
        }
        Err(_) => None,
    }
}

fn is_decimal_doubt(problem: &ReadProblem) -> bool {
    use super::table_problem::TableProblem;
    matches!(
        problem,
        ReadProblem::Table {
            source: TableProblem::DecimalInDoubt { .. }
        }
    )
}

fn kind_of(layout: &Layout<'_>) -> Option<TableKind> {
    let roles: Vec<Role> = layout.columns.iter().map(|column| column.role).collect();
    let has = |role: Role| roles.contains(&role);
    if has(Role::Label) {
        return Some(TableKind::Outline);
    }
    let declared = &layout.declared;
    let has_area = declared.width.is_some() && declared.height.is_some();
    match (roles.len(), layout.is_named) {
        (1, _) => Some(TableKind::Trace),
        (2, _) => two_columns(layout),
        (COLUMNS_OF_POINTS, true)
            if has(Role::Position) && has(Role::Second) && has(Role::Height) =>
        {
            points(layout).then_some(TableKind::Points)
        }
        (_, true) if has(Role::Position) || has(Role::Height) || has(Role::Index) => {
            Some(TableKind::Trace)
        }
        (_, _) if has_area => Some(TableKind::Matrix),
        (COLUMNS_OF_POINTS, _) if points(layout) => Some(TableKind::Points),
        _ => {
            let order = Order::of(layout, usize::from(counts_rows(layout, 0)));
            if order.is_monotone() && layout.data.rows >= TRACE_FROM_ROWS {
                Some(TableKind::Trace)
            } else if order.is_monotone() && counts_rows(layout, 0) {
                None
            } else {
                Some(TableKind::Matrix)
            }
        }
    }
}

/// A table of two columns: trace or outline.
fn two_columns(layout: &Layout<'_>) -> Option<TableKind> {
    if says_trace(layout) {
        return Some(TableKind::Trace);
    }
    let is_outline = outline_can_be_read(layout);
    let x = layout
        .columns
        .iter()
        .position(|column| column.role == Role::Position)
        .unwrap_or(0);
    let order = Order::of(layout, x);
    let is_trace = order.is_monotone() && layout.data.rows >= TRACE_FROM_ROWS;
    if is_trace || (order.is_monotone() && (!is_outline || order.is_missing_heights)) {
        Some(TableKind::Trace)
    } else {
        is_outline.then_some(TableKind::Outline)
    }
}

/// Whether header or names say that the table is a trace.
fn says_trace(layout: &Layout<'_>) -> bool {
    let mut units = layout
        .columns
        .iter()
        .filter_map(|column| match column.unit {
            WrittenUnit::Length(_, scale) => Some(scale.factor()),
            _ => None,
        });
    let units_differ = match (units.next(), units.next()) {
        (Some(a), Some(b)) => (a / b - 1.0).abs() > 1e-9,
        _ => false,
    };
    let plain = |column: &NamedColumn<'_>| {
        ["x", "y", "z"]
            .iter()
            .any(|name| name.eq_ignore_ascii_case(column.name))
    };
    let has_scan_names = layout.columns.iter().any(|column| {
        !plain(column)
            && matches!(
                column.role,
                Role::Position | Role::Height | Role::PerhapsHeight | Role::Depth | Role::Index
            )
    });
    layout.declared.is_scan || units_differ || (layout.is_named && has_scan_names)
}

/// Whether the outline reader takes the column line, units aside.
fn outline_can_be_read(layout: &Layout<'_>) -> bool {
    if !layout.is_named {
        return true;
    }
    let fields: Vec<&str> = layout.columns.iter().map(|column| column.field).collect();
    match Columns::from_header(&fields, None) {
        Ok(_) => true,
        Err(found) => matches!(found.1, ReadProblem::MissingUnit),
    }
}

/// The order of one column.
struct Order {
    rises: bool,
    falls: bool,
    is_missing_heights: bool,
}

impl Order {
    fn of(layout: &Layout<'_>, index: usize) -> Self {
        let mut order = Self {
            rises: true,
            falls: true,
            is_missing_heights: false,
        };
        let one = UnitScale::from_factor(1.0);
        let mut numbers = Numbers::new(layout.marks);
        let mut fields = Vec::new();
        let mut last: Option<f64> = None;
        for line in layout.rows() {
            if layout.fields(line, &mut fields).is_err() {
                continue;
            }
            let value = fields
                .get(index)
                .and_then(|field| numbers.read(field, one).ok()?);
            let Some(value) = value else {
                continue;
            };
            order.is_missing_heights |= fields
                .iter()
                .any(|field| super::table_lines::is_missing(field));
            if let Some(last) = last {
                order.rises &= value >= last;
                order.falls &= value <= last;
            }
            last = Some(value);
            if !order.rises && !order.falls {
                break;
            }
        }
        order
    }

    fn is_monotone(&self) -> bool {
        self.rises != self.falls
    }
}

/// Whether a table holds heights over an area.
pub(crate) fn is_area(layout: &Layout<'_>) -> bool {
    layout.columns.len() >= COLUMNS_OF_POINTS
        && matches!(kind_of(layout), Some(TableKind::Matrix | TableKind::Points))
}

/// The warning that a table read as a trace could be a closed section as well: two plain columns, and
/// nothing in the file that says what they are.
pub(crate) fn outline_doubt(layout: &Layout<'_>) -> Option<Warning> {
    let open = layout.columns.len() == 2
        && !says_trace(layout)
        && outline_can_be_read(layout)
        && layout
            .columns
            .iter()
            .all(|column| column.role != Role::Height);
    open.then(|| Warning {
        code: Code::ChoiceMade,
        message: "nothing in the file says whether it is a trace or the outline of a section; it is read as a \
                  trace because its positions rise or fall throughout"
            .to_owned(),
        advice: "read it with `--as outline` if it is the outline of a section".to_owned(),
        numbers: Vec::new(),
    })
}

/// Whether a table of heights over an area lists points rather than rows.
pub(crate) fn lists_points(layout: &Layout<'_>) -> bool {
    matches!(kind_of(layout), Some(TableKind::Points))
        || (layout.is_named
            && layout.columns.len() == COLUMNS_OF_POINTS
            && [Role::Position, Role::Second, Role::Height]
                .iter()
                .all(|role| layout.columns.iter().any(|column| column.role == *role)))
}

/// Whether the first two columns place points on a grid that is filled at least by half.
fn points(layout: &Layout<'_>) -> bool {
    let rows = layout.data.rows;
    let distinct = |index: usize| {
        let one = UnitScale::from_factor(1.0);
        let mut numbers = Numbers::new(layout.marks);
        let mut fields = Vec::new();
        let mut values: Vec<f64> = layout
            .rows()
            .filter_map(|line| {
                layout.fields(line, &mut fields).ok()?;
                numbers.read(fields.get(index)?, one).ok()?
            })
            .collect();
        values.sort_by(f64::total_cmp);
        values.dedup();
        values.len()
    };
    let place = |role: Role, otherwise: usize| {
        let named = layout.columns.iter().position(|c| c.role == role);
        named.unwrap_or(otherwise)
    };
    let (nx, ny) = (
        distinct(place(Role::Position, 0)),
        distinct(place(Role::Second, 1)),
    );
    nx >= 2
        && ny >= 2
        && rows >= 4
        && rows <= nx.saturating_mul(ny)
        && rows as f64 >= FILLED_GRID * nx as f64 * ny as f64
}
