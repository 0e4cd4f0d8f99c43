//! The wall shear in JSON: the whole, wall by wall, and beside singular corners.

use serde::Serialize;

use super::document::SolveDocument;
use super::json_values::{Number, Quantity, place};
use crate::flow::{PERCENTILES, SingularCorner, WallReport, WallStatistics};

/// Why walls are missing.
const NOT_WORKED_OUT: &str = "the walls were not worked out";

#[derive(Serialize)]
pub(super) struct Shear {
    mean_per_gradient: Quantity,
    max_per_gradient: Quantity,
    max_at: [Number; 2],
    singular_corners: Vec<[Number; 2]>,
    singular_length: Quantity,
    whole: Option<Wall>,
    walls: Option<Vec<Wall>>,
    singular_corner_means: Option<Vec<Corner>>,
    #[serde(skip_serializing_if = "Option::is_none")]
    absent_because: Option<&'static str>,
}

/// One wall, or all of them.
#[derive(Serialize)]
struct Wall {
    name: String,
    length: Quantity,
    max_at: [Number; 2],
    touches_singular_corner: bool,
    per_gradient: Values,
    per_flow_rate: Option<Values>,
    at_operating_point: Option<Values>,
}

/// Shear in one unit.
#[derive(Serialize)]
struct Values {
    mean: Quantity,
    min: Quantity,
    max: Quantity,
    percentiles: Vec<Percentile>,
}

#[derive(Serialize)]
struct Percentile {
    per_cent_of_length: Number,
    value: Number,
    unit: &'static str,
}

/// Mean shear on either side of a singular corner.
#[derive(Serialize)]
struct Corner {
    at: [Number; 2],
    #[serde(rename = "loop")]
    loop_number: Quantity,
    before: Side,
    after: Side,
}

#[derive(Serialize)]
struct Side {
    wall: String,
    mean_per_gradient: Quantity,
    mean_at_operating_point: Quantity,
}

impl Shear {
    pub(super) fn new(document: &SolveDocument<'_>) -> Self {
        let shear = &document.flow.wall_shear;
        let report = document.walls;
        Self {
            mean_per_gradient: Quantity::real(shear.mean_per_gradient, "m"),
            max_per_gradient: Quantity::real(shear.max_per_gradient, "m"),
            max_at: place(shear.max_at),
            singular_corners: shear.singular_corners.iter().map(|&p| place(p)).collect(),
            singular_length: Quantity::real(shear.curve.singular_length, "m"),
            whole: report.map(|r| Wall::new(document, &r.whole)),
            walls: report.map(|r| r.walls.iter().map(|w| Wall::new(document, w)).collect()),
            singular_corner_means: report.map(|r| {
                r.singular_corners
                    .iter()
                    .map(|corner| Corner::new(document, r, corner))
                    .collect()
            }),
            absent_because: report.is_none().then_some(NOT_WORKED_OUT),
        }
    }
}

impl Wall {
    fn new(document: &SolveDocument<'_>, wall: &WallStatistics) -> Self {
        Self {
            name: wall.name.clone(),
            length: Quantity::real(wall.length, "m"),
            max_at: place(wall.max_at),
            touches_singular_corner: wall.singular_sides > 0,
            per_gradient: Values::new(wall, 1.0, "m"),
            per_flow_rate: document
                .shear_per_flow_rate()
                .map(|factor| Values::new(wall, factor, "Pa s/m^3")),
            at_operating_point: document
                .operating_point
                .map(|point| Values::new(wall, point.pressure_gradient, "Pa")),
        }
    }
}

impl Values {
    fn new(wall: &WallStatistics, factor: f64, unit: &'static str) -> Self {
        let quantity = |value: f64| Quantity::real(value * factor, unit);
        Self {
            mean: quantity(wall.mean),
            min: quantity(wall.min),
            max: quantity(wall.max),
            percentiles: PERCENTILES
                .iter()
                .zip(wall.percentiles)
                .map(|(&p, value)| Percentile {
                    per_cent_of_length: Number::real(p),
                    value: Number::real(value * factor),
                    unit,
                })
                .collect(),
        }
    }
}

impl Corner {
    fn new(document: &SolveDocument<'_>, report: &WallReport, corner: &SingularCorner) -> Self {
        let side = |k: usize| {
            let wall = corner.walls.get(k).and_then(|&w| report.walls.get(w));
            let mean = corner.means.get(k).copied().unwrap_or(f64::NAN);
            let gradient = document.operating_point.map(|p| p.pressure_gradient);
            Side {
                wall: wall.map_or_else(String::new, |w| w.name.clone()),
                mean_per_gradient: Quantity::real(mean, "m"),
                mean_at_operating_point: Quantity::optional(
                    gradient.map(|g| g * mean),
                    "Pa",
                    "no pressure drop or flow rate was given",
                ),
            }
        };
        Self {
            at: place(corner.at),
            loop_number: Quantity::count(corner.loop_index + 1),
            before: side(0),
            after: side(1),
        }
    }
}
