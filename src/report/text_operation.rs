//! The parts of the text that need a fluid, a length, an operating point or the shortcut formulas.

use super::document::SolveDocument;
use super::numbers::{self, per_cent, significant, with_unit};
use super::table::{Table, paragraph};
use super::text::{part, shear_place, value_table};
use crate::flow::{Drive, Fluid, OperatingPoint, ShortcutRow};
use crate::measured::Estimate;

/// The parts that apply to this document, in order.
pub(super) fn parts(document: &SolveDocument<'_>) -> Vec<String> {
    let fluid = document.fluid.map(|f| resistance(document, f));
    let point = document
        .operating_point
        .map(|p| operating_point(document, p));
    let shortcuts = document.shortcuts.map(|rows| shortcuts(document, rows));
    fluid.into_iter().chain(point).chain(shortcuts).collect()
}

fn resistance(document: &SolveDocument<'_>, fluid: &Fluid) -> String {
    let mut table = value_table();
    table.row([
        "viscosity".to_owned(),
        format!("{} Pa s", significant(fluid.viscosity, 6)),
        format!("{} mPa s", significant(fluid.viscosity * 1e3, 5)),
    ]);
    if let Some(density) = fluid.density {
        table.row([
            "density".to_owned(),
            format!("{} kg/m\u{b3}", significant(density, 6)),
        ]);
    }
    if let Some(r) = document.resistance_per_length() {
        table.row(resistance_row(
            "resistance per length R' = mu / K",
            r,
            "Pa s/m^4",
            "mbar min/\u{b5}L per mm",
            1e-3,
        ));
    }
    if let (Some(r), Some(length)) = (document.resistance(), document.length) {
        table.row([
            "length L".to_owned(),
            format!("{} m", significant(length, 6)),
            with_unit(length, numbers::LENGTHS, 5),
        ]);
        table.row(resistance_row(
            "resistance R = mu L / K",
            r,
            "Pa s/m\u{b3}",
            "mbar min/\u{b5}L",
            1.0,
        ));
    }
    let name = numbers::one_line(&fluid.name);
    let heading = match fluid.temperature {
        Some(kelvin) => format!(
            "Fluid {name} at {} K ({} \u{b0}C)",
            significant(kelvin, 5),
            significant(kelvin - 273.15, 4)
        ),
        None => format!("Fluid {name}"),
    };
    let source = format!("properties: {}", numbers::one_line(&fluid.source));
    format!("{}{}", part(&heading, &table), paragraph("  ", &source))
}

/// A resistance in SI and in mbar min/uL times `length_unit`.
fn resistance_row(label: &str, r: Estimate, si: &str, unit: &str, length_unit: f64) -> [String; 3] {
    let converted = r.value * length_unit / numbers::MBAR_MIN_PER_UL;
    [
        label.to_owned(),
        format!("{} {si}", significant(r.value, 6)),
        format!("{} {unit}", significant(converted, 5)),
    ]
}

fn operating_point(document: &SolveDocument<'_>, point: &OperatingPoint) -> String {
    let si = |v: f64, unit: &str| format!("{} {unit}", significant(v, 6));
    let mut table = value_table();
    let pressure = with_unit(point.pressure_drop, numbers::PRESSURES, 5);
    let mbar = significant(point.pressure_drop / numbers::MBAR, 5);
    table.row([
        "pressure drop".to_owned(),
        si(point.pressure_drop, "Pa"),
        format!("{pressure}, {mbar} mbar"),
    ]);
    table.row([
        "pressure gradient".to_owned(),
        si(point.pressure_gradient, "Pa/m"),
        format!("{} kPa/m", significant(point.pressure_gradient / 1e3, 5)),
    ]);
    let scaled: [(&str, f64, &str, &[numbers::Unit]); 3] = [
        (
            "flow rate",
            point.flow_rate,
            "m\u{b3}/s",
            numbers::FLOW_RATES,
        ),
        (
            "mean velocity",
            point.mean_velocity,
            "m/s",
            numbers::VELOCITIES,
        ),
        (
            "peak velocity",
            point.peak_velocity,
            "m/s",
            numbers::VELOCITIES,
        ),
    ];
    for (label, value, unit, units) in scaled {
        table.row([
            label.to_owned(),
            si(value, unit),
            with_unit(value, units, 5),
        ]);
    }
    if let Some(row) = proven_rows(document, point) {
        table.row(row);
    }
    shear_rows(&mut table, document, point);
    table.row([
        "residence time A L / Q".to_owned(),
        si(point.residence_time, "s"),
        with_unit(point.residence_time, numbers::TIMES, 5),
    ]);
    inertia_rows(&mut table, point);
    part("Operating point", &table)
}

/// The proven range of what was not given: the flow rate or the pressure drop.
fn proven_rows(document: &SolveDocument<'_>, point: &OperatingPoint) -> Option<[String; 3]> {
    let flow = document.flow;
    let (label, unit, bounds) = match point.drive {
        Drive::PressureDrop(_) => (
            "flow rate, proven",
            "m\u{b3}/s",
            point.flow_bounds(flow, point.flow_rate),
        ),
        Drive::FlowRate(_) => (
            "pressure drop, proven",
            "Pa",
            point.pressure_bounds(flow, point.pressure_drop),
        ),
    };
    let (low, high) = bounds?;
    Some([
        label.to_owned(),
        format!("{} to {} {unit}", significant(low, 6), significant(high, 6)),
        format!("{} wide", per_cent(2.0 * (high - low) / (high + low))),
    ])
}

fn shear_rows(table: &mut Table, document: &SolveDocument<'_>, point: &OperatingPoint) {
    for (label, value) in [
        ("wall shear, mean", point.wall_shear_mean),
        ("wall shear, largest", point.wall_shear_max),
    ] {
        table.row([
            label.to_owned(),
            format!("{} Pa", significant(value, 5)),
            format!(
                "{} dyn/cm\u{b2}",
                significant(value / numbers::DYN_PER_CM2, 5)
            ),
        ]);
    }
    table.row(shear_place(document.flow));
}

/// Reynolds number and entrance length, or why they are missing.
fn inertia_rows(table: &mut Table, point: &OperatingPoint) {
    let unknown = || "not available: the density is not known".to_owned();
    table.row([
        "Reynolds number on Dh".to_owned(),
        point
            .reynolds_dh
            .map_or_else(unknown, |v| significant(v, 4)),
    ]);
    match point.entrance_length {
        Some(length) => table.row([
            "entrance length".to_owned(),
            format!("{} m", significant(length, 3)),
            with_unit(length, numbers::LENGTHS, 3),
        ]),
        None => table.row(["entrance length".to_owned(), unknown()]),
    }
}

fn shortcuts(document: &SolveDocument<'_>, rows: &[ShortcutRow]) -> String {
    let best = document.flow.conductance.value;
    let heading = format!(
        "Shortcut formulas: error of their resistance against the solved one (K = {} m^4)",
        significant(best, 5)
    );
    let width = rows
        .iter()
        .map(|r| r.name.chars().count())
        .max()
        .unwrap_or(0);
    let mut out = format!("{heading}\n");
    for row in rows {
        let verdict = row.resistance_error.map_or_else(
            || "does not apply".to_owned(),
            |e| format!("{} %", signed(100.0 * e)),
        );
        let conductance = row
            .conductance
            .map_or_else(String::new, |k| format!("  K = {} m^4", significant(k, 5)));
        let fill = " ".repeat(width - row.name.chars().count());
        out.push_str(format!("  {}{fill}  {verdict:>14}{conductance}", row.name).trim_end());
        out.push('\n');
        for (label, text) in [
            ("", row.remark.as_str()),
            ("range: ", row.range),
            ("source: ", row.source),
        ] {
            if !text.is_empty() {
                out.push_str(&paragraph("      ", &format!("{label}{text}")));
            }
        }
    }
    out
}

/// Three digits with the sign always shown.
fn signed(value: f64) -> String {
    let text = significant(value, 3);
    if value > 0.0 {
        format!("+{text}")
    } else {
        text
    }
}
