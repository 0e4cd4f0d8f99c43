//! The machine output of `solve`: keys, units, no number that is not finite, a reason for every absence.

use serde_json::{Map, Value};

use crate::{Folder, RECTANGLE, RECTANGLE_CONDUCTANCE, assert_close, shape, value};

/// Keys that are numbers, with their units.
const QUANTITIES: [(&str, &str); 28] = [
    ("/section/area", "m^2"),
    ("/section/wetted_perimeter", "m"),
    ("/section/hydraulic_diameter", "m"),
    ("/section/width", "m"),
    ("/section/height", "m"),
    ("/section/lumens", "1"),
    ("/section/islands", "1"),
    ("/conductance", "m^4"),
    ("/poiseuille/fanning_dh", "1"),
    ("/poiseuille/darcy_dh", "1"),
    ("/poiseuille/fanning_sqrt_area", "1"),
    ("/peak_to_mean_velocity", "1"),
    ("/momentum_factor", "1"),
    ("/kinetic_energy_factor", "1"),
    ("/wall_shear/mean_per_gradient", "m"),
    ("/wall_shear/max_per_gradient", "m"),
    ("/grid/spacing", "m"),
    ("/grid/fluid_nodes", "1"),
    ("/grid/cells_across", "1"),
    ("/solver/cycles", "1"),
    ("/solver/residual", "1"),
    ("/solver/seconds", "s"),
    ("/fluid/viscosity", "Pa s"),
    ("/fluid/density", "kg/m^3"),
    ("/fluid/temperature", "K"),
    ("/resistance_per_length", "Pa s/m^4"),
    ("/resistance", "Pa s/m^3"),
    ("/operating_point/reynolds_dh", "1"),
];
/// Keys of the operating point with their units.
const POINT: [(&str, &str); 7] = [
    ("flow_rate", "m^3/s"),
    ("pressure_drop", "Pa"),
    ("mean_velocity", "m/s"),
    ("wall_shear_max", "Pa"),
    ("wall_shear_mean", "Pa"),
    ("residence_time", "s"),
    ("entrance_length", "m"),
];
/// What needs a fluid or an operating point.
const ON_REQUEST: [&str; 5] = [
    "fluid",
    "resistance_per_length",
    "resistance",
    "operating_point",
    "shortcuts",
];
const WITH_EVERYTHING: &str = "--json --shortcuts --fluid water --temperature 25C --length 20mm \
     --flow-rate 5uL/min --cells-across 24";

/// Every object with a value has a unit; every null has a reason beside it or at the top.
fn assert_sound(object: &Map<String, Value>, reasons: &Map<String, Value>, path: &str) {
    if object.contains_key("value") {
        assert!(object["unit"].is_string(), "{path}");
    }
    for (key, value) in object {
        let here = format!("{path}/{key}");
        match value {
            Value::Null => {
                let beside = object.contains_key("absent_because")
                    || object.contains_key("bracket_absent_because");
                assert!(beside || reasons.contains_key(key), "{here} has no reason");
            }
            Value::Number(number) => assert!(number.as_f64().unwrap().is_finite()),
            Value::Object(inner) => assert_sound(inner, reasons, &here),
            Value::Array(items) => {
                for item in items.iter().filter_map(Value::as_object) {
                    assert_sound(item, reasons, &here);
                }
            }
            _ => {}
        }
    }
}

fn assert_whole(record: &Value) {
    let reasons = record["absent_because"].as_object().unwrap();
    assert_sound(record.as_object().unwrap(), reasons, "");
    assert!(!record.to_string().contains("NaN"));
    assert!(record["conductance"]["low"].is_null() && record["conductance"]["high"].is_null());
    assert!(record["conductance"]["bracket_absent_because"].is_string());
}

#[test]
fn every_key_of_the_contract_is_there_with_its_unit() {
    let folder = Folder::new();
    for name in [
        "drawn/annulus.toml",
        "made/koh_rounded.toml",
        "made/two_lumens.toml",
        "outlines/moulded_channel.svg",
        "outlines/plasma_etch.csv",
    ] {
        let record = folder.json(&format!("solve {} {WITH_EVERYTHING}", shape(name)));
        assert_eq!(record["schema"], "etchwise/1");
        assert_eq!(record["tool_version"], env!("CARGO_PKG_VERSION"));
        let source = &record["source"];
        assert!(source["path"].as_str().unwrap().ends_with(name));
        assert_eq!(source["sha256"].as_str().unwrap().len(), 64);
        assert!(["section", "outline", "svg"].contains(&source["kind"].as_str().unwrap()));
        let is_drawing = name.ends_with("svg");
        assert_ne!(source["notes"].as_array().unwrap().is_empty(), is_drawing);
        for (path, unit) in QUANTITIES {
            let quantity = record.pointer(path).unwrap_or(&Value::Null);
            assert!(quantity["value"].is_number(), "{name} {path}: {quantity}");
            assert_eq!(quantity["unit"], unit, "{name} {path}");
        }
        for (key, unit) in POINT {
            let quantity = &record["operating_point"][key];
            assert!(quantity["value"].is_number(), "{name} {key}: {quantity}");
            assert_eq!(quantity["unit"], unit, "{name} {key}");
        }
        assert_eq!(record["wall_shear"]["max_at"].as_array().unwrap().len(), 2);
        assert!(record["solver"]["converged"].is_boolean());
        assert!(!record["identities"].as_object().unwrap().is_empty());
        assert!(!record["shortcuts"].as_array().unwrap().is_empty());
        for warning in record["warnings"].as_array().unwrap() {
            assert!(warning["code"].is_string() && warning["message"].is_string());
        }
        assert_whole(&record);
    }
}

#[test]
fn the_numbers_belong_together() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json(
        &format!("solve a.csv {WITH_EVERYTHING} --cells-across 128")
            .replace(" --cells-across 24", ""),
    );
    let of = |path: &str| value(&record, path);
    let (k, area) = (of("/conductance"), of("/section/area"));
    let dh = of("/section/hydraulic_diameter");
    let perimeter = of("/section/wetted_perimeter");
    assert_close(k, RECTANGLE_CONDUCTANCE, 1e-5);
    assert_close(dh, 4.0 * area / perimeter, 1e-12);
    assert_close(
        of("/poiseuille/fanning_dh"),
        dh * dh * area / (2.0 * k),
        1e-12,
    );
    assert_close(
        of("/poiseuille/darcy_dh"),
        4.0 * of("/poiseuille/fanning_dh"),
        1e-12,
    );
    assert_close(of("/wall_shear/mean_per_gradient"), area / perimeter, 1e-2);
    let (mu, length) = (of("/fluid/viscosity"), 20e-3);
    assert_close(of("/resistance_per_length"), mu / k, 1e-12);
    assert_close(of("/resistance"), mu * length / k, 1e-12);
    let rate = 5e-9 / 60.0;
    let point = |key: &str| of(&format!("/operating_point/{key}"));
    assert_close(point("flow_rate"), rate, 1e-12);
    assert_close(point("pressure_drop"), rate * mu * length / k, 1e-12);
    assert_close(point("mean_velocity"), rate / area, 1e-12);
    assert_close(point("residence_time"), area * length / rate, 1e-12);
    let reynolds = of("/fluid/density") * rate / area * dh / mu;
    assert_close(point("reynolds_dh"), reynolds, 1e-12);
    // The same point from its pressure drop.
    let drop = point("pressure_drop");
    let back = folder.json(&format!(
        "solve a.csv --json --cells-across 128 --fluid water --temperature 25C --length 20mm --pressure-drop {drop}Pa"
    ));
    assert_close(value(&back, "/operating_point/flow_rate"), rate, 1e-9);
}

#[test]
fn what_was_not_asked_for_is_null_with_a_reason() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json("solve a.csv --json");
    assert_whole(&record);
    for key in ON_REQUEST {
        let found = &record[key];
        let reason = if found.is_null() {
            &record["absent_because"][key]
        } else {
            assert!(found["value"].is_null(), "{key}");
            &found["absent_because"]
        };
        assert!(reason.is_string(), "{key}: {found}");
    }
    let record =
        folder.json("solve a.csv --json --viscosity 1mPa.s --length 1cm --flow-rate 1uL/s");
    assert_whole(&record);
    let reynolds = &record["operating_point"]["reynolds_dh"];
    assert!(reynolds["value"].is_null() && reynolds["absent_because"].is_string());
}

#[test]
fn the_same_input_gives_the_same_output_with_any_number_of_threads() {
    let folder = Folder::new();
    let file = shape("drawn/posts.toml");
    let run = |threads: &str| {
        let mut record = folder.json(&format!(
            "solve {file} {WITH_EVERYTHING} --threads {threads} --vtk t{threads} --picture t{threads}.png"
        ));
        let seconds = record.pointer_mut("/solver/seconds/value").unwrap();
        *seconds = Value::Null;
        record
    };
    let one = run("1");
    for threads in ["1", "2", "5"] {
        assert_eq!(run(threads), one, "{threads} threads");
        for ending in [".vti", ".vtp", ".png"] {
            let bytes = |t: &str| std::fs::read(folder.path(&format!("t{t}{ending}"))).unwrap();
            assert!(bytes(threads) == bytes("1"), "{threads} threads, {ending}");
        }
    }
    let text = |threads: &str| {
        folder
            .line(&format!("solve {file} --threads {threads}"))
            .out
    };
    assert_eq!(text("2"), text("1"));
}
