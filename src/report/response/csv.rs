//! The CSV view of a response table (RFC 4180): one header row, one row a point of the table, units in the heads.

use super::document::ResponseDocument;
use crate::report::csv::{CsvError, number, table};
use crate::report::numbers::one_line;
use crate::study::ParameterUnit;

/// One row for each point of the table, the last parameter running fastest.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no name or number causes.
pub fn response_csv(document: &ResponseDocument<'_>) -> Result<String, CsvError> {
    let parameters = &document.table.parameters;
    let mut heads = vec!["section".to_owned()];
    heads.extend(parameters.iter().map(|p| {
        let unit = match p.unit {
            ParameterUnit::Length => "m",
            ParameterUnit::Angle => "rad",
            ParameterUnit::One => "1",
        };
        format!("{}_{unit}", one_line(&p.name).replace(' ', "_"))
    }));
    let fixed = [
        "conductance_m4",
        "conductance_low_m4",
        "conductance_high_m4",
        "conductance_estimated_error_m4",
        "conductance_fit_m4",
        "relative_difference_1",
    ];
    heads.extend(fixed.map(str::to_owned));
    if document.fluid.is_some() {
        let resistances = [
            "resistance_per_length_Pa_s_per_m4",
            "resistance_per_length_fit_Pa_s_per_m4",
        ];
        heads.extend(resistances.map(str::to_owned));
    }
    let name = one_line(document.name);
    let rows = document.table.points.iter().map(|point| {
        let proven = point.proven.as_ref().ok();
        let mut row = vec![name.clone()];
        row.extend(point.values.iter().map(|&v| number(v)));
        row.extend([
            number(point.conductance.value),
            number(proven.map(|p| p[0])),
            number(proven.map(|p| p[1])),
            number(point.conductance.error),
            number(point.fitted),
            number(point.relative_difference()),
        ]);
        if document.fluid.is_some() {
            row.push(number(document.resistance(point.conductance.value)));
            row.push(number(document.resistance(point.fitted)));
        }
        row
    });
    let heads: Vec<&str> = heads.iter().map(String::as_str).collect();
    table(&heads, rows, document.name)
}
