//! Height maps from delimited text: a matrix of heights, or a list of points `x y z` on a grid.
//!
//! A matrix takes the distance of its points from the options, else from the width and the height in its
//! header over the number of columns and rows, else from positions written along its first row and column.
//! Its first row lies at `y = 0`. A list of points may come in any order; places without a point are missing.

use super::surface::HeightMap;
use crate::intake::delimited_text::offset_of;
use crate::intake::read_error::{Fault, ReadError};
use crate::intake::step::Step;
use crate::intake::trace::table::{
    AxisUnit, KeptLength, Layout, Line, Numbers, Role, axis_unit, bare, check_span, check_step,
    cut_warning, fault, lists_points, missing_unit, table_text,
};
use crate::intake::trace::{TableAxis, TableOptions, TableProblem};
use crate::units::{UnitScale, format_length};
use crate::warning::{Code, Warning};

/// Fewest heights of a map.
const FEWEST_HEIGHTS: usize = 4;
/// How far a position may lie off its place on the grid, against the distance of neighbours.
const OFF_GRID: f64 = 0.2;
/// Places of a grid for each point listed above which it is no grid.
const PLACES_PER_POINT: usize = 4;

/// Reads a height map from the bytes of a text file; `path` is for messages.
///
/// # Errors
/// [`ReadError`] when the text is no table, its numbers are wrong, a limit is passed, or a unit, the distance of
/// the points or the decimal mark is missing or in doubt.
///
/// # Examples
/// ```
/// use etchwise::intake::{TableOptions, map_from_bytes};
/// let table = b"# Width: 4 um\n# Height: 1 um\n# Value units: nm\n1 2 3 4\n5 6 7 8\n".to_vec();
/// let (map, _) = map_from_bytes(table, "map.txt", &TableOptions::default()).unwrap();
/// assert_eq!((map.size, map.spacing), ([4, 2], [1e-6, 0.5e-6]));
/// assert_eq!(map.heights[7], 8e-9);
/// ```
pub fn map_from_bytes(
    bytes: Vec<u8>,
    path: &str,
    options: &TableOptions,
) -> Result<(HeightMap, Vec<Warning>), ReadError> {
    table_text(bytes)
        .and_then(|text| read_map_table(&text, options))
        .map_err(|fault| fault.in_file(path))
}

/// Reads a height map from decoded text.
pub(crate) fn read_map_table(
    text: &str,
    options: &TableOptions,
) -> Result<(HeightMap, Vec<Warning>), Fault> {
    check_step(options.x_step)?;
    check_step(options.y_step)?;
    let layout = Layout::of(text, options)?;
    let says_line = layout.columns.len() < 3
        || layout
            .columns
            .iter()
            .any(|column| column.role == Role::Index);
    if says_line && !(layout.declared.width.is_some() && layout.declared.height.is_some()) {
        return Err(TableProblem::TraceNotArea.into());
    }
    let (mut map, height_unit) = if lists_points(&layout) {
        points(&layout, options)?
    } else {
        matrix(&layout, options)?
    };
    let missing = map.heights.iter().filter(|z| z.is_nan()).count();
    if missing == map.heights.len() {
        return Err(TableProblem::NoHeights.into());
    }
    if missing > 0 {
        let text = format!(
            "{missing} of {} heights are missing in the file",
            map.heights.len()
        );
        let numbers = [("missing_heights", missing as f64)];
        map.steps.push(Step::new("missing", text).with(&numbers));
    }
    if !options.allow_any_size {
        check_ranges(&map, &height_unit)?;
    }
    let mut warnings: Vec<Warning> = cut_warning(&layout).into_iter().collect();
    if let Some(count) = layout.count
        && count != map.heights.len()
        && count != layout.data.rows
    {
        warnings.push(Warning {
            code: Code::FileDefect,
            message: format!(
                "the file says {count} samples, it holds {}; the data are used",
                map.heights.len()
            ),
            advice: "check that the file is complete".to_owned(),
            numbers: vec![
                ("declared", count as f64),
                ("found", map.heights.len() as f64),
            ],
        });
    }
    map.metadata = layout.metadata;
    Ok((map, warnings))
}

/// The plausibility stop on both lengths and on the heights.
fn check_ranges(map: &HeightMap, height_unit: &AxisUnit) -> Result<(), TableProblem> {
    for (count, spacing) in map.size.into_iter().zip(map.spacing) {
        check_span(TableAxis::Positions, count as f64 * spacing, "m", 1.0)?;
    }
    let finite = map.heights.iter().filter(|z| z.is_finite());
    let (low, high) = finite.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), z| {
        (low.min(*z), high.max(*z))
    });
    let factor = height_unit.scale.factor();
    check_span(TableAxis::Heights, high - low, &height_unit.word, factor)
}

/// The unit of the heights, or the fault of its absence.
fn height_unit(
    layout: &Layout<'_>,
    index: Option<usize>,
    options: &TableOptions,
) -> Result<AxisUnit, Fault> {
    axis_unit(layout, TableAxis::Heights, index, options)?
        .ok_or_else(|| missing_unit(layout, TableAxis::Heights, index.unwrap_or(0)))
}

/// Reads a matrix of heights.
fn matrix(layout: &Layout<'_>, options: &TableOptions) -> Result<(HeightMap, AxisUnit), Fault> {
    layout.check_samples(layout.columns.len())?;
    let axes = Axes::of(layout, options)?;
    let unit = height_unit(layout, None, options)?;
    let skipped = usize::from(axes.is_some());
    let size = [
        layout.columns.len().saturating_sub(skipped),
        layout.data.rows.saturating_sub(skipped),
    ];
    let found = size[0].saturating_mul(size[1]);
    if size[0] < 2 || size[1] < 2 || found < FEWEST_HEIGHTS {
        let needed = FEWEST_HEIGHTS;
        return Err(TableProblem::TooFewSamples { found, needed }.into());
    }
    let mut heights = Vec::with_capacity(found);
    let mut numbers = Numbers::new(layout.marks);
    let mut fields = Vec::new();
    for line in layout.rows().skip(skipped) {
        layout.fields(line, &mut fields)?;
        for index in skipped..layout.columns.len() {
            let z = height(layout, line, &fields, index, &mut numbers, unit.scale)?;
            heights.push(z);
        }
    }
    let (spacing, spacing_text) = spacing(layout, options, size, axes)?;
    let steps = vec![
        Step::new(
            "columns",
            format!(
                "a matrix of {} columns along x and {} rows along y, the first row at y = 0",
                size[0], size[1]
            ),
        ),
        Step::new("units", format!("heights in {} ({})", unit.word, unit.from)),
        Step::new("positions", spacing_text)
            .with(&[("x_step_m", spacing[0]), ("y_step_m", spacing[1])]),
    ];
    let map = HeightMap {
        size,
        spacing,
        heights,
        steps,
        ..HeightMap::default()
    };
    Ok((map, unit))
}

/// One height of a row, NaN where it is missing.
fn height(
    layout: &Layout<'_>,
    line: Line<'_>,
    fields: &[&str],
    index: usize,
    numbers: &mut Numbers,
    scale: UnitScale,
) -> Result<f64, Fault> {
    let field = fields.get(index).copied().unwrap_or_default();
    match numbers.read(field, scale) {
        Ok(value) => Ok(value.unwrap_or(f64::NAN)),
        Err(problem) => {
            let offset = if field.is_empty() {
                line.offset
            } else {
                offset_of(layout.text, field)
            };
            Err(Fault::at(layout.text, offset, None, problem))
        }
    }
}

/// Distances of the points along x and y, and how they were found.
fn spacing(
    layout: &Layout<'_>,
    options: &TableOptions,
    size: [usize; 2],
    axes: Option<Axes>,
) -> Result<([f64; 2], String), Fault> {
    let from_length = |length: &Option<KeptLength>, count: usize, option| match length {
        Some(KeptLength::Metres(metres, _)) => Ok(Some(*metres / count as f64)),
        Some(KeptLength::Destroyed(text)) => {
            let text = text.clone();
            Err(TableProblem::DestroyedLength { text, option })
        }
        None => Ok(None),
    };
    let declared = &layout.declared;
    let along = |asked: Option<f64>, axis: Option<f64>, length, count, option| {
        Ok::<_, TableProblem>(match (asked, axis) {
            (Some(step), _) => Some((step, "asked for")),
            (None, Some(step)) => Some((step, "from the positions along the edge")),
            (None, None) => from_length(length, count, option)?.map(|step| {
                (
                    step,
                    "from the length in the header over the number of points",
                )
            }),
        })
    };
    let axis = axes.map(|axes| axes.steps);
    let x = along(
        options.x_step,
        axis.map(|a| a[0]),
        &declared.width,
        size[0],
        "--x-step",
    )?;
    let y = along(
        options.y_step,
        axis.map(|a| a[1]),
        &declared.height,
        size[1],
        "--y-step",
    )?;
    let missing = |direction, option| TableProblem::NoSpacing { direction, option };
    let (x, x_from) = x.ok_or_else(|| missing("x", "--x-step"))?;
    let (y, y_from) = y.ok_or_else(|| missing("y", "--y-step"))?;
    let text = format!(
        "points are {} apart along x ({x_from}) and {} along y ({y_from})",
        format_length(x),
        format_length(y)
    );
    Ok(([x, y], text))
}

/// Positions along the first row and the first column of a matrix: their steps, m.
struct Axes {
    steps: [f64; 2],
}

impl Axes {
    /// Axes are there when the corner is empty and first row and first column rise or fall evenly.
    fn of(layout: &Layout<'_>, options: &TableOptions) -> Result<Option<Self>, Fault> {
        let mut numbers = Numbers::new(layout.marks);
        let mut fields = Vec::new();
        let mut row = Vec::new();
        let mut column = Vec::new();
        for (number, line) in layout.rows().enumerate() {
            if layout.fields(line, &mut fields).is_err() {
                return Ok(None);
            }
            let mut read = |index: usize| {
                let field = fields.get(index).copied().unwrap_or_default();
                numbers.read(field, bare()).ok().flatten()
            };
            if number > 0 {
                column.push(read(0));
                continue;
            }
            if read(0).is_some() {
                return Ok(None);
            }
            row.extend((1..layout.columns.len()).map(read));
        }
        let (Some(x), Some(y)) = (even_step(&row), even_step(&column)) else {
            return Ok(None);
        };
        let unit = axis_unit(layout, TableAxis::Positions, None, options)?
            .ok_or_else(|| missing_unit(layout, TableAxis::Positions, 0))?;
        Ok(Some(Self {
            steps: [unit.scale.apply(x.abs()), unit.scale.apply(y.abs())],
        }))
    }
}

/// The step of evenly rising or falling values; `None` when they are not.
fn even_step(values: &[Option<f64>]) -> Option<f64> {
    let values: Vec<f64> = values.iter().copied().collect::<Option<_>>()?;
    let (first, last) = (values.first()?, values.last()?);
    let intervals = values.len().checked_sub(1).filter(|n| *n > 0)? as f64;
    let step = (last - first) / intervals;
    let even = values
        .iter()
        .enumerate()
        .all(|(index, v)| (v - (first + index as f64 * step)).abs() <= OFF_GRID * step.abs());
    (even && step != 0.0).then_some(step)
}

/// Reads a list of points.
fn points(layout: &Layout<'_>, options: &TableOptions) -> Result<(HeightMap, AxisUnit), Fault> {
    layout.check_samples(3)?;
    let by_role = |role: Role, otherwise: usize| {
        let found = layout.columns.iter().position(|column| column.role == role);
        if layout.is_named {
            found.unwrap_or(otherwise)
        } else {
            otherwise
        }
    };
    let places = [by_role(Role::Position, 0), by_role(Role::Second, 1)];
    let z_place = by_role(Role::Height, 2);
    let mut scales = Vec::new();
    for index in places {
        let unit = axis_unit(layout, TableAxis::Positions, Some(index), options)?
            .ok_or_else(|| missing_unit(layout, TableAxis::Positions, index))?;
        scales.push(unit);
    }
    let unit = height_unit(layout, Some(z_place), options)?;
    let count = layout.data.rows;
    let mut coordinates = [Vec::with_capacity(count), Vec::with_capacity(count)];
    let mut heights = Vec::with_capacity(count);
    let mut numbers = Numbers::new(layout.marks);
    let mut fields = Vec::new();
    for line in layout.rows() {
        layout.fields(line, &mut fields)?;
        for ((index, scale), values) in places.iter().zip(&scales).zip(&mut coordinates) {
            let value = height(layout, line, &fields, *index, &mut numbers, scale.scale)?;
            if value.is_nan() {
                return Err(fault(
                    layout.text,
                    line.offset,
                    TableProblem::PointWithoutPlace,
                ));
            }
            values.push(value);
        }
        heights.push(height(
            layout,
            line,
            &fields,
            z_place,
            &mut numbers,
            unit.scale,
        )?);
    }
    let [x, y] = &coordinates;
    let grid = [Grid::of(x, "x")?, Grid::of(y, "y")?];
    let map = on_grid(layout, grid, [x, y], &heights)?;
    let steps = vec![
        Step::new(
            "columns",
            format!(
                "{count} points on a grid of {} by {} places, {} apart along x and {} along y",
                grid[0].count,
                grid[1].count,
                format_length(grid[0].step),
                format_length(grid[1].step)
            ),
        )
        .with(&[("x_step_m", grid[0].step), ("y_step_m", grid[1].step)]),
        Step::new(
            "units",
            format!(
                "x in {} ({}), y in {} ({}), heights in {} ({})",
                scales[0].word,
                scales[0].from,
                scales[1].word,
                scales[1].from,
                unit.word,
                unit.from
            ),
        ),
    ];
    Ok((HeightMap { steps, ..map }, unit))
}

/// Heights of points at their places.
fn on_grid(
    layout: &Layout<'_>,
    grid: [Grid; 2],
    coordinates: [&[f64]; 2],
    heights: &[f64],
) -> Result<HeightMap, Fault> {
    let size = [grid[0].count, grid[1].count];
    let places = size[0].saturating_mul(size[1]);
    if places > heights.len().saturating_mul(PLACES_PER_POINT) {
        let direction = "x and y";
        let reason = format!("{} points for {places} places", heights.len());
        return Err(TableProblem::NotALattice { direction, reason }.into());
    }
    if places < FEWEST_HEIGHTS {
        let (found, needed) = (places, FEWEST_HEIGHTS);
        return Err(TableProblem::TooFewSamples { found, needed }.into());
    }
    let mut values = vec![f64::NAN; places];
    let mut taken = vec![false; places];
    let pairs = coordinates[0].iter().zip(coordinates[1]);
    for (number, ((x, y), z)) in pairs.zip(heights).enumerate() {
        let at = grid[1].place(*y) * size[0] + grid[0].place(*x);
        if let (Some(value), Some(seen)) = (values.get_mut(at), taken.get_mut(at)) {
            if *seen {
                let line = layout.rows().nth(number).map_or(0, |line| line.offset);
                return Err(fault(layout.text, line, TableProblem::RepeatedPoint));
            }
            (*value, *seen) = (*z, true);
        }
    }
    Ok(HeightMap {
        size,
        spacing: [grid[0].step, grid[1].step],
        heights: values,
        ..HeightMap::default()
    })
}

/// Evenly spaced places along one direction.
#[derive(Debug, Clone, Copy)]
struct Grid {
    origin: f64,
    step: f64,
    count: usize,
}

impl Grid {
    /// The grid of coordinates: the step is the median distance of neighbouring values, made to fit the
    /// whole range.
    fn of(values: &[f64], direction: &'static str) -> Result<Self, TableProblem> {
        let fails = |reason: &str| TableProblem::NotALattice {
            direction,
            reason: reason.to_owned(),
        };
        let mut sorted = values.to_vec();
        sorted.sort_by(f64::total_cmp);
        let (Some(&low), Some(&high)) = (sorted.first(), sorted.last()) else {
            return Err(fails("there is no point"));
        };
        if high <= low {
            return Err(fails("all points have the same position"));
        }
        // Rounding parts equal positions by less than a millionth of the range.
        let alike = (high - low) * 1e-6;
        let mut gaps: Vec<f64> = sorted
            .windows(2)
            .map(|pair| pair[1] - pair[0])
            .filter(|gap| *gap > alike)
            .collect();
        gaps.sort_by(f64::total_cmp);
        let median = gaps.get(gaps.len() / 2).copied().unwrap_or(high - low);
        let intervals = ((high - low) / median).round().max(1.0);
        if intervals >= values.len() as f64 {
            return Err(fails("there are fewer points than places"));
        }
        let grid = Self {
            origin: low,
            step: (high - low) / intervals,
            count: intervals as usize + 1,
        };
        let off = |x: &&f64| {
            let places = (**x - grid.origin) / grid.step;
            (places - places.round()).abs() > OFF_GRID
        };
        match sorted.iter().find(off) {
            Some(x) => Err(fails(&format!(
                "{} is off the grid of step {}",
                format_length(*x),
                format_length(grid.step)
            ))),
            None => Ok(grid),
        }
    }

    /// The place of a coordinate, from 0.
    fn place(&self, x: f64) -> usize {
        let place = ((x - self.origin) / self.step).round().max(0.0) as usize;
        place.min(self.count - 1)
    }
}

#[cfg(test)]
#[path = "map_table_tests.rs"]
mod tests;
