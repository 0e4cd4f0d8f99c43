//! The wall shear as a table (RFC 4180): one row a point of the curve, names that end in the unit.
//!
//! A corner has two rows, one with the normal of either side. At a singular corner the shear is the mean
//! over a stated length on that side. What is not known is an empty field.

use super::csv::CsvError;
use super::document::SolveDocument;
use super::numbers::{DYN_PER_CM2, one_line};
use crate::flow::{CurvePoint, PointKind};

/// Heads of the columns.
const HEADS: [&str; 11] = [
    "loop",
    "wall",
    "arc_length_m",
    "x_m",
    "y_m",
    "nx",
    "ny",
    "shear_per_gradient_m",
    "shear_pa",
    "shear_dyn_per_cm2",
    "kind",
];

/// The curve of the wall shear as CSV text.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no name or number causes.
pub fn wall_csv(document: &SolveDocument<'_>) -> Result<String, CsvError> {
    let refused = |source| CsvError::Record {
        section: document.section_name.to_owned(),
        source,
    };
    let mut writer = csv::WriterBuilder::new()
        .terminator(csv::Terminator::CRLF)
        .from_writer(Vec::new());
    writer.write_record(HEADS).map_err(refused)?;
    for (index, along) in document.flow.wall_shear.curve.loops.iter().enumerate() {
        let walls = document
            .walls
            .map(|report| (report, along.walls_of_points(report, index)));
        for (k, point) in along.points.iter().enumerate() {
            let wall = walls
                .as_ref()
                .and_then(|(report, walls)| report.walls.get(*walls.get(k)?))
                .map_or_else(String::new, |wall| one_line(&wall.name));
            let record = record(document, index, point, wall);
            writer.write_record(record).map_err(refused)?;
        }
    }
    let unfinished = |reason: String| CsvError::Unfinished { reason };
    let bytes = writer.into_inner().map_err(|e| unfinished(e.to_string()))?;
    String::from_utf8(bytes).map_err(|e| unfinished(e.to_string()))
}

fn record(
    document: &SolveDocument<'_>,
    index: usize,
    point: &CurvePoint,
    wall: String,
) -> [String; 11] {
    let number = |value: f64| {
        if value.is_finite() {
            format!("{value:?}")
        } else {
            String::new()
        }
    };
    let pascal = document
        .operating_point
        .map(|p| p.pressure_gradient * point.shear_per_gradient);
    [
        (index + 1).to_string(),
        wall,
        number(point.arc_length),
        number(point.at[0]),
        number(point.at[1]),
        number(point.normal[0]),
        number(point.normal[1]),
        number(point.shear_per_gradient),
        pascal.map(number).unwrap_or_default(),
        pascal.map(|p| number(p / DYN_PER_CM2)).unwrap_or_default(),
        kind_word(point.kind).to_owned(),
    ]
}

fn kind_word(kind: PointKind) -> &'static str {
    match kind {
        PointKind::Regular => "regular",
        PointKind::ConvexCorner => "convex_corner",
        PointKind::SingularCorner => "singular_corner",
    }
}
