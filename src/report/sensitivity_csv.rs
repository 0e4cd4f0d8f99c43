//! The CSV view of the sensitivity study (RFC 4180): one header row, one row a case.
//!
//! Changes are in the unit of the column `change_unit`; what is absent is an empty field.

use super::csv::{CsvError, number, table};
use super::numbers::one_line;
use super::sensitivity_document::SensitivityDocument;
use crate::study::{FirstOrderRange, Sensitivity};

/// Names of the columns.
const HEADS: [&str; 16] = [
    "section",
    "source_sha256",
    "conductance_m4",
    "case",
    "change_unit",
    "dln_conductance_per_change",
    "dln_resistance_per_change",
    "dln_conductance_per_um",
    "d_conductance_m4_per_change",
    "check_step_change",
    "check_dln_conductance_per_change",
    "check_relative_difference_1",
    "check_second_order_per_change2",
    "first_order_up_to_for_conductance_change",
    "first_order_up_to_for_resistance_change",
    "absent_because",
];

/// One row for each case, also for those that the section does not have.
///
/// # Errors
/// [`CsvError`] when the writer refuses, which no section name or number causes.
pub fn sensitivity_csv(document: &SensitivityDocument<'_>) -> Result<String, CsvError> {
    let front = [
        one_line(document.section_name),
        document
            .source
            .map_or(String::new(), |s| s.sha256.to_owned()),
        number(document.flow.conductance.value),
    ];
    let cases = document.study.cases.iter().map(fields);
    let absent = document.study.absent.iter().map(|none| {
        let mut row = vec![String::new(); HEADS.len() - front.len()];
        if let [name, .., reason] = &mut row[..] {
            name.clone_from(&none.name);
            reason.clone_from(&none.reason);
        }
        row
    });
    let rows = cases
        .chain(absent)
        .map(|row| front.iter().cloned().chain(row).collect());
    table(&HEADS, rows, document.section_name)
}

fn fields(case: &Sensitivity) -> Vec<String> {
    let check = case.check.as_ref().ok();
    vec![
        case.name.clone(),
        case.measure.unit().to_owned(),
        number(case.relative),
        number(-case.relative),
        number(case.per_metre().map(|v| v * 1e-6)),
        number(case.conductance),
        number(check.map(|c| c.step)),
        number(check.map(|c| c.first_order)),
        number(case.check_difference()),
        number(check.map(|c| c.second_order)),
        number(check.and_then(|c| up_to(c.reach_for_conductance()))),
        number(check.and_then(|c| up_to(c.reach_for_resistance()))),
        case.check
            .as_ref()
            .err()
            .map_or(String::new(), ToString::to_string),
    ]
}

fn up_to(reach: FirstOrderRange) -> Option<f64> {
    match reach {
        FirstOrderRange::UpTo(change) => Some(change),
        FirstOrderRange::AtLeast(_) => None,
    }
}
