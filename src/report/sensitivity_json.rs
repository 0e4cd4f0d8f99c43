//! The JSON view of the sensitivity study: SI, no number without its unit, no NaN, absence with a reason.

use std::collections::BTreeMap;

use serde::Serialize;

use super::json::{Grid, Source, WarningView};
use super::json_values::{Bracketed, Number, Quantity, place, pretty};
use super::sensitivity_document::SensitivityDocument;
use crate::measured::Estimate;
use crate::study::{Check, FirstOrderRange, Measure, SECOND_ORDER_SHARE, Sensitivity};

/// Name and version of this contract.
pub const SENSITIVITY_SCHEMA: &str = "etchwise-sensitivity/1";

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn sensitivity_json(document: &SensitivityDocument<'_>) -> Result<String, serde_json::Error> {
    pretty(&Root::new(document))
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    name: &'a str,
    source: Option<Source<'a>>,
    conductance: Bracketed,
    sensitivities: Vec<Case<'a>>,
    absent_cases: Vec<Absent<'a>>,
    identities: Identities,
    singular_corners: Vec<[Number; 2]>,
    grid: Grid,
    check_grid: Option<CheckGrid>,
    warnings: Vec<WarningView>,
    absent_because: BTreeMap<&'static str, &'static str>,
}

impl<'a> Root<'a> {
    fn new(document: &SensitivityDocument<'a>) -> Self {
        let (flow, study) = (document.flow, document.study);
        let mut absent_because = BTreeMap::new();
        if document.source.is_none() {
            absent_because.insert(
                "source",
                "the section was built in code, not read from a file",
            );
        }
        if study.check_grid.is_none() {
            absent_because.insert("check_grid", "nothing was solved again");
        }
        let corners = &flow.wall_shear.singular_corners;
        Self {
            schema: SENSITIVITY_SCHEMA,
            tool_version: env!("CARGO_PKG_VERSION"),
            name: document.section_name,
            source: document.source.map(Source::new),
            conductance: Quantity::bracketed(flow),
            sensitivities: study.cases.iter().map(Case::new).collect(),
            absent_cases: study
                .absent
                .iter()
                .map(|none| Absent {
                    name: &none.name,
                    definition: &none.definition,
                    reason: &none.reason,
                })
                .collect(),
            identities: Identities {
                depth_and_width: Identity {
                    formula: "dlnK/dln(depth) + dlnK/dln(width) = 4",
                    computed: Quantity::real(study.stretch_sum, "1"),
                    exact: 4.0,
                },
                shift_x: Identity::shift(study.shift[0]),
                shift_y: Identity::shift(study.shift[1]),
            },
            singular_corners: corners.iter().map(|&p| place(p)).collect(),
            grid: Grid::new(flow),
            check_grid: study.check_grid.map(|(cells, k)| CheckGrid {
                cells_across: Quantity::real(cells, "1"),
                conductance: Quantity::real(k, "m^4"),
            }),
            warnings: WarningView::all(document.all_warnings()),
            absent_because,
        }
    }
}

#[derive(Serialize)]
struct Absent<'a> {
    name: &'a str,
    definition: &'a str,
    reason: &'a str,
}

#[derive(Serialize)]
struct Identities {
    depth_and_width: Identity,
    shift_x: Identity,
    shift_y: Identity,
}

#[derive(Serialize)]
struct Identity {
    formula: &'static str,
    computed: Quantity,
    exact: f64,
}

impl Identity {
    fn shift(computed: f64) -> Self {
        Self {
            formula: "dK of moving the whole section over dK of an over-etch as large = 0",
            computed: Quantity::real(computed, "1"),
            exact: 0.0,
        }
    }
}

#[derive(Serialize)]
struct CheckGrid {
    cells_across: Quantity,
    conductance: Quantity,
}

/// Unit of the change and what follows from it: its inverse, its inverse square, `K` per unit.
struct Units {
    change: &'static str,
    inverse: &'static str,
    inverse_square: &'static str,
    conductance: &'static str,
}

impl Units {
    fn of(measure: Measure) -> Self {
        let (inverse, inverse_square, conductance) = match measure {
            Measure::Relative => ("1", "1", "m^4"),
            Measure::Length => ("1/m", "1/m^2", "m^4/m"),
            Measure::Angle => ("1/rad", "1/rad^2", "m^4/rad"),
        };
        Self {
            change: measure.unit(),
            inverse,
            inverse_square,
            conductance,
        }
    }
}

#[derive(Serialize)]
struct Case<'a> {
    name: &'a str,
    definition: &'a str,
    change_unit: &'static str,
    dln_conductance: Quantity,
    dln_resistance: Quantity,
    dln_conductance_per_micrometre: Quantity,
    dln_resistance_per_micrometre: Quantity,
    dln_conductance_per_degree: Quantity,
    dln_resistance_per_degree: Quantity,
    d_conductance: Quantity,
    check: Option<CheckView>,
    #[serde(skip_serializing_if = "Option::is_none")]
    check_absent_because: Option<String>,
}

impl<'a> Case<'a> {
    fn new(case: &'a Sensitivity) -> Self {
        let units = Units::of(case.measure);
        let per_micrometre = |sign: f64| {
            Quantity::optional(
                case.per_metre().map(|v| sign * v * 1e-6),
                "1/um",
                "the change is not the length of one part of the section",
            )
        };
        let is_angle = case.measure == Measure::Angle;
        let per_degree = |sign: f64| {
            Quantity::optional(
                is_angle.then(|| sign * case.relative * 1_f64.to_radians()),
                "1/deg",
                "the change is not an angle",
            )
        };
        Self {
            name: &case.name,
            definition: &case.definition,
            change_unit: units.change,
            dln_conductance: Quantity::real(case.relative, units.inverse),
            dln_resistance: Quantity::real(-case.relative, units.inverse),
            dln_conductance_per_micrometre: per_micrometre(1.0),
            dln_resistance_per_micrometre: per_micrometre(-1.0),
            dln_conductance_per_degree: per_degree(1.0),
            dln_resistance_per_degree: per_degree(-1.0),
            d_conductance: Quantity::real(case.conductance, units.conductance),
            check: case
                .check
                .as_ref()
                .ok()
                .map(|check| CheckView::new(case, check, &units)),
            check_absent_because: case.check.as_ref().err().map(ToString::to_string),
        }
    }
}

#[derive(Serialize)]
struct CheckView {
    step: Quantity,
    dln_conductance: Quantity,
    relative_difference: Quantity,
    second_order: Quantity,
    second_order_share: Quantity,
    first_order_up_to_for_conductance: Quantity,
    first_order_up_to_for_resistance: Quantity,
    largest_change: Quantity,
}

impl CheckView {
    fn new(case: &Sensitivity, check: &Check, units: &Units) -> Self {
        let limit = |reach: FirstOrderRange| match reach {
            FirstOrderRange::UpTo(change) => Quantity::real(change, units.change),
            FirstOrderRange::AtLeast(change) => Quantity {
                low: Some(Number::real(change)),
                ..Quantity::optional(
                    None,
                    units.change,
                    "at least `low`; there the section has changed too much, or the second-order term is lost \
                     in the numerical error of the new solves",
                )
            },
        };
        Self {
            step: Quantity::real(check.step, units.change),
            dln_conductance: Quantity::estimate(
                Estimate {
                    value: check.first_order,
                    error: check.first_order_error,
                },
                units.inverse,
            ),
            relative_difference: Quantity::optional(
                case.check_difference().filter(|v| v.is_finite()),
                "1",
                "no wall moves along its normal",
            ),
            second_order: Quantity::estimate(
                Estimate {
                    value: check.second_order,
                    error: check.second_order_error,
                },
                units.inverse_square,
            ),
            second_order_share: Quantity::real(SECOND_ORDER_SHARE, "1"),
            first_order_up_to_for_conductance: limit(check.reach_for_conductance()),
            first_order_up_to_for_resistance: limit(check.reach_for_resistance()),
            largest_change: Quantity::real(check.largest_change, units.change),
        }
    }
}
