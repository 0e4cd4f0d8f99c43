//! The part of the text that gives the wall shear wall by wall.

use super::document::SolveDocument;
use super::numbers::{self, significant, with_unit};
use super::table::{Align, Table, paragraph};
use crate::flow::{WallReport, WallStatistics};

/// Blanks before every line below the heading.
const INDENT: usize = 2;
/// Singular corners that are listed.
const CORNERS_SHOWN: usize = 6;
/// Length that stands for a flow rate of one microlitre per minute, m^3/s.
const MICROLITRE_PER_MINUTE: f64 = 1e-9 / 60.0;

/// The table of walls with what belongs to it; `None` where the walls were not worked out.
pub(super) fn walls(document: &SolveDocument<'_>) -> Option<String> {
    let report = document.walls?;
    let point = document.operating_point;
    let factor = document.shear_scale().factor;
    let heading = if point.is_some() {
        "Wall shear by wall, Pa, with the mean and the largest in dyn/cm\u{b2} as well"
    } else {
        "Wall shear by wall per pressure gradient, m (times Pa/m gives Pa)"
    };
    let mut align = vec![Align::Left, Align::Left];
    align.extend([Align::Right; 9]);
    let mut table = Table::new(&align);
    let mut head = vec![
        "wall", "length", "mean", "least", "5 %", "median", "95 %", "largest",
    ];
    if point.is_some() {
        head.extend(["dyn/cm\u{b2}: mean", "largest"]);
    }
    table.row(head);
    for wall in report.walls.iter().chain([&report.whole]) {
        table.row(row(wall, factor, point.is_some()));
    }
    let mut out = format!("{heading}\n{}", table.print(INDENT));
    out.push_str(&paragraph("  ", &definition(report)));
    if let Some(line) = per_flow_rate(document, report) {
        out.push_str(&paragraph("  ", &line));
    }
    for line in corners(document, report) {
        out.push_str(&paragraph("  ", &line));
    }
    Some(out)
}

fn row(wall: &WallStatistics, factor: f64, with_dyn: bool) -> Vec<String> {
    let shear = |value: f64| significant(value * factor, 4);
    let [five, _, median, _, ninety_five] = wall.percentiles;
    let mark = if wall.singular_sides > 0 { " *" } else { "" };
    let mut cells = vec![
        format!("{}{mark}", short_name(&wall.name)),
        with_unit(wall.length, numbers::LENGTHS, 4),
    ];
    cells.extend([wall.mean, wall.min, five, median, ninety_five, wall.max].map(shear));
    if with_dyn {
        cells.extend([wall.mean, wall.max].map(|v| shear(v / numbers::DYN_PER_CM2)));
    }
    cells
}

/// A name for a table: one line, cut where it is long.
pub(super) fn short_name(name: &str) -> String {
    const LONGEST: usize = 24;
    let name = numbers::one_line(name);
    if name.chars().count() <= LONGEST {
        return name;
    }
    let cut: String = name.chars().take(LONGEST - 3).collect();
    format!("{cut}...")
}

fn definition(report: &WallReport) -> String {
    let directions = "lid, floor, left and right are the walls whose outward normal points that way \
                      within 45\u{b0}, islands included; p % of a wall's length has no more shear than \
                      its p % value";
    if report.singular_corners.is_empty() {
        format!("{directions}.")
    } else {
        format!(
            "{directions}; * touches a re-entrant corner: the largest value there is a mean beside it, \
             which percentiles may exceed."
        )
    }
}

/// Shear per flow rate, which needs a viscosity.
fn per_flow_rate(document: &SolveDocument<'_>, report: &WallReport) -> Option<String> {
    let per_flow = document.shear_per_flow_rate()?;
    let of = |value: f64| {
        format!(
            "{} Pa per m\u{b3}/s ({} Pa per \u{b5}L/min)",
            significant(value * per_flow, 4),
            significant(value * per_flow * MICROLITRE_PER_MINUTE, 4)
        )
    };
    Some(format!(
        "Per flow rate: mean {}, largest {}.",
        of(report.whole.mean),
        of(report.whole.max)
    ))
}

/// Mean shear beside the singular corners.
fn corners(document: &SolveDocument<'_>, report: &WallReport) -> Vec<String> {
    let scale = document.shear_scale();
    let flow = document.flow;
    let extent = [flow.geometry.width, flow.geometry.height];
    let length = flow.wall_shear.curve.singular_length;
    let mut lines: Vec<String> = report
        .singular_corners
        .iter()
        .take(CORNERS_SHOWN)
        .map(|corner| {
            let [before, after] = corner.means.map(|m| significant(m * scale.factor, 4));
            let [first, second] = corner
                .walls
                .map(|w| report.walls.get(w).map_or_else(String::new, |s| short_name(&s.name)));
            format!(
                "Re-entrant corner at {}: no bound; mean over {} (0.05 Dh), or half the way to the next \
                 corner if that is less, beside it {before} {unit} ({first}) and {after} {unit} ({second}).",
                numbers::place(corner.at, extent, 4),
                with_unit(length, numbers::LENGTHS, 4),
                unit = scale.unit,
            )
        })
        .collect();
    let more = report.singular_corners.len().saturating_sub(CORNERS_SHOWN);
    if more > 0 {
        lines.push(format!(
            "And {more} more re-entrant corner{}; --json lists them all.",
            if more == 1 { "" } else { "s" }
        ));
    }
    lines
}
