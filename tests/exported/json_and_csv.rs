//! The machine formats: contract, units, absence, exact numbers.

use std::collections::BTreeSet;

use etchwise::flow::SectionFlow;
use etchwise::report::{SolveDocument, to_csv, to_json};
use serde_json::Value;

use crate::report_samples::{Sample, warning};
use crate::{close, sample};

fn json(document: &SolveDocument<'_>) -> Value {
    serde_json::from_str(&to_json(document).unwrap()).unwrap()
}

fn number(value: &Value, path: &str) -> f64 {
    value
        .pointer(path)
        .and_then(|v| v["value"].as_f64())
        .unwrap_or_else(|| panic!("no number at {path}"))
}

/// Path in the JSON, exact value, unit.
type Row = (&'static str, f64, &'static str);

fn section_rows(flow: &SectionFlow) -> Vec<Row> {
    vec![
        ("/section/area", flow.geometry.area, "m^2"),
        (
            "/section/wetted_perimeter",
            flow.geometry.wetted_perimeter,
            "m",
        ),
        (
            "/section/hydraulic_diameter",
            flow.geometry.hydraulic_diameter,
            "m",
        ),
        ("/section/width", flow.geometry.width, "m"),
        ("/section/height", flow.geometry.height, "m"),
        ("/section/lumens", 1.0, "1"),
        ("/section/islands", 0.0, "1"),
        ("/conductance", flow.conductance.value, "m^4"),
        ("/poiseuille/fanning_dh", flow.fanning_dh, "1"),
        ("/poiseuille/darcy_dh", flow.darcy_dh, "1"),
        ("/poiseuille/fanning_sqrt_area", flow.fanning_sqrt_area, "1"),
        ("/peak_to_mean_velocity", flow.peak.to_mean.value, "1"),
        ("/peak/phi", flow.peak.phi, "m^2"),
        ("/momentum_factor", flow.momentum_factor.value, "1"),
        (
            "/kinetic_energy_factor",
            flow.kinetic_energy_factor.value,
            "1",
        ),
        (
            "/wall_shear/mean_per_gradient",
            flow.wall_shear.mean_per_gradient,
            "m",
        ),
        (
            "/wall_shear/max_per_gradient",
            flow.wall_shear.max_per_gradient,
            "m",
        ),
        ("/grid/spacing", flow.grid.spacing, "m"),
        ("/grid/fluid_nodes", flow.grid.fluid_nodes as f64, "1"),
        ("/grid/cells_across", flow.grid.cells_across, "1"),
        ("/solver/cycles", 2.0, "1"),
        ("/solver/residual", flow.solver.residual, "1"),
        ("/solver/seconds", flow.solver.seconds, "s"),
    ]
}

fn operation_rows(sample: &Sample) -> Vec<Row> {
    let flow = &sample.flow;
    vec![
        ("/fluid/temperature", 293.15, "K"),
        ("/fluid/viscosity", 1.0016e-3, "Pa s"),
        ("/fluid/density", 998.2, "kg/m^3"),
        (
            "/resistance_per_length",
            1.0016e-3 / flow.conductance.value,
            "Pa s/m^4",
        ),
        (
            "/resistance",
            1.0016e-3 / flow.conductance.value * 0.02,
            "Pa s/m^3",
        ),
        (
            "/operating_point/flow_rate",
            sample.point.flow_rate,
            "m^3/s",
        ),
        ("/operating_point/pressure_drop", 1000.0, "Pa"),
        (
            "/operating_point/mean_velocity",
            sample.point.mean_velocity,
            "m/s",
        ),
        (
            "/operating_point/reynolds_dh",
            sample.point.reynolds_dh.unwrap(),
            "1",
        ),
        (
            "/operating_point/wall_shear_max",
            sample.point.wall_shear_max,
            "Pa",
        ),
        (
            "/operating_point/wall_shear_mean",
            sample.point.wall_shear_mean,
            "Pa",
        ),
        (
            "/operating_point/residence_time",
            sample.point.residence_time,
            "s",
        ),
        (
            "/operating_point/entrance_length",
            sample.point.entrance_length.unwrap(),
            "m",
        ),
    ]
}

#[test]
fn json_keeps_the_contract_with_units_and_every_digit() {
    let sample = sample();
    let all = json(&sample.full());
    assert_eq!(all["schema"], "etchwise/1");
    assert_eq!(all["source"]["path"], "sections/sample.toml");
    let flow = &sample.flow;
    for (path, expected, unit) in section_rows(flow)
        .into_iter()
        .chain(operation_rows(&sample))
    {
        assert_eq!(number(&all, path).to_bits(), expected.to_bits(), "{path}");
        assert_eq!(all.pointer(path).unwrap()["unit"], unit, "{path}");
    }
    assert_eq!(all["solver"]["converged"], true);
    assert_eq!(all["identities"]["rellich"]["holds"], true);
    assert_eq!(
        all["shortcuts"][1]["resistance_error"]["value"],
        Value::Null
    );
    assert_eq!(all["warnings"][0]["code"], "caution");
}

#[test]
fn json_says_why_something_is_absent() {
    let mut sample = sample();
    let full = json(&sample.bare());
    let proven = sample.flow.bracket.unwrap();
    assert_eq!(full["conductance"]["low"].as_f64(), Some(proven.low));
    assert_eq!(full["conductance"]["high"].as_f64(), Some(proven.high));
    let width = full["bracket_relative_width"]["value"].as_f64().unwrap();
    close(width, proven.relative_width(), 1e-12);
    sample.flow.bracket = Err(etchwise::proof::ProofError::Unbalanced { divergence: 1.0 });
    let bare = json(&sample.bare());
    for part in ["source", "fluid", "operating_point", "shortcuts"] {
        assert_eq!(bare[part], Value::Null);
        assert!(bare["absent_because"][part].is_string(), "{part}");
    }
    for quantity in [
        "resistance_per_length",
        "resistance",
        "bracket_relative_width",
    ] {
        assert_eq!(bare[quantity]["value"], Value::Null);
        assert!(bare[quantity]["absent_because"].is_string(), "{quantity}");
    }
    let k = &bare["conductance"];
    assert_eq!((&k["low"], &k["high"]), (&Value::Null, &Value::Null));
    assert!(k["bracket_absent_because"].is_string());
    assert_eq!(
        k["estimated_error"].as_f64(),
        Some(sample.flow.conductance.error)
    );
}

#[test]
fn json_never_holds_a_number_that_is_not_finite_and_warnings_carry_their_numbers() {
    let mut sample = sample();
    sample.flow.wall_shear.max_per_gradient = f64::INFINITY;
    sample.flow.peak.at = [f64::NAN, 0.0];
    sample.flow.momentum_factor.error = f64::NAN;
    sample.flow.warnings.push(warning());
    let text = to_json(&sample.full()).unwrap();
    let all: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(all["wall_shear"]["max_per_gradient"]["value"], Value::Null);
    assert!(all["wall_shear"]["max_per_gradient"]["absent_because"].is_string());
    assert_eq!(all["peak"]["at"][0], Value::Null);
    assert_eq!(all["momentum_factor"]["estimated_error"], Value::Null);
    assert_eq!(all["warnings"][0]["angle_deg"], 270.0);
    assert_eq!(all["warnings"][0]["shear_pa"], Value::Null);
    assert_eq!(
        text,
        to_json(&sample.full()).unwrap(),
        "same input, same bytes"
    );
}

// CSV.

#[test]
fn csv_has_unit_ended_names_and_reads_back_exactly_whatever_the_name() {
    let mut sample = sample();
    sample.name = "die 3, \"north\"\nwafer".to_owned();
    let text = to_csv(&[sample.full(), sample.bare()]).unwrap();
    assert!(text.ends_with("\r\n"));
    let mut reader = csv::Reader::from_reader(text.as_bytes());
    let names: Vec<String> = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 2);
    let words: BTreeSet<&str> = [
        "section",
        "source_path",
        "source_sha256",
        "source_kind",
        "film_on",
        "fluid",
        "solver_converged",
        "warnings",
    ]
    .into();
    let units = [
        "_m",
        "_m2",
        "_m4",
        "_1",
        "_k",
        "_pa",
        "_pa_s",
        "_s",
        "_kg_per_m3",
        "_m_per_s",
        "_m3_per_s",
        "_pa_per_m",
        "_pa_s_per_m3",
        "_pa_s_per_m4",
    ];
    for name in names.iter().filter(|n| !words.contains(n.as_str())) {
        assert!(
            units.iter().any(|u| name.ends_with(u)),
            "{name} does not end in a unit"
        );
    }
    let cell = |row: usize, name: &str| &rows[row][names.iter().position(|n| n == name).unwrap()];
    // A line break in a name would break tables read line by line.
    assert_eq!(*cell(0, "section"), sample.name.replace('\n', " "));
    let k: f64 = cell(0, "conductance_m4").parse().unwrap();
    assert_eq!(k.to_bits(), sample.flow.conductance.value.to_bits());
    let r: f64 = cell(0, "resistance_pa_s_per_m3").parse().unwrap();
    close(r, 1.0016e-3 * 0.02 / k, 1e-14);
    assert_eq!(cell(0, "warnings"), "caution");
    assert_eq!(cell(1, "resistance_pa_s_per_m3"), "");
    assert_eq!(cell(1, "warnings"), "");
    assert_eq!(
        names.iter().collect::<BTreeSet<_>>().len(),
        names.len(),
        "no name twice"
    );
}
