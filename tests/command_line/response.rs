//! `etchwise card ... --vary`: text, JSON against its schema, CSV, pictures, and what is refused.

use serde_json::Value;

use crate::{Folder, RECTANGLE, assert_close, value};

const KOH: &str =
    "card koh_groove --vary depth=20..30um --vary opening=80..120um --fresh-points 20";

/// Whether a value is as its schema says: the keywords that the shipped schema uses.
fn valid(root: &Value, schema: &Value, found: &Value, place: &str) -> Result<(), String> {
    let fail = |what: &str| Err(format!("{place}: {what}: {found}"));
    let each = |key: &str| schema[key].as_array().into_iter().flatten();
    if let Some(name) = schema["$ref"].as_str() {
        let target = root.pointer(name.trim_start_matches('#')).unwrap();
        return valid(root, target, found, place);
    }
    if !schema["const"].is_null() && schema["const"] != *found {
        return fail("not the constant");
    }
    if schema["enum"].is_array() && !each("enum").any(|v| v == found) {
        return fail("not in the list");
    }
    if schema["anyOf"].is_array() && !each("anyOf").any(|s| valid(root, s, found, place).is_ok()) {
        return fail("none of the forms");
    }
    let kinds: Vec<&str> = match &schema["type"] {
        Value::String(one) => vec![one],
        list => list
            .as_array()
            .into_iter()
            .flatten()
            .filter_map(Value::as_str)
            .collect(),
    };
    let is_kind = |kind: &&str| match *kind {
        "object" => found.is_object(),
        "array" => found.is_array(),
        "string" => found.is_string(),
        "number" => found.is_number(),
        "integer" => found.is_u64() || found.is_i64(),
        "boolean" => found.is_boolean(),
        _ => found.is_null(),
    };
    if !kinds.is_empty() && !kinds.iter().any(is_kind) {
        return fail("another type");
    }
    for key in each("required").filter_map(Value::as_str) {
        if found.get(key).is_none() {
            return fail(&format!("no `{key}`"));
        }
    }
    for (key, inner) in found.as_object().into_iter().flatten() {
        let own = schema["properties"]
            .get(key)
            .or(schema.get("additionalProperties"));
        if let Some(own) = own {
            valid(root, own, inner, &format!("{place}/{key}"))?;
        }
    }
    for (index, inner) in found.as_array().into_iter().flatten().enumerate() {
        if let Some(items) = schema.get("items") {
            valid(root, items, inner, &format!("{place}/{index}"))?;
        }
    }
    Ok(())
}

fn schema() -> Value {
    serde_json::from_str(include_str!(
        "../../src/report/schemas/response.schema.json"
    ))
    .unwrap()
}

/// The formula as a reader of the JSON would evaluate it: `K` at some values of the parameters.
fn evaluated(record: &Value, values: &[f64]) -> f64 {
    let parameters = record["parameters"].as_array().unwrap();
    let scaled: Vec<f64> = parameters
        .iter()
        .zip(values)
        .map(|(p, &v)| {
            let number = |key: &str| p[key].as_f64().unwrap();
            let v = if p["variable"] == "logarithm" {
                v.ln()
            } else {
                v
            };
            (v - number("variable_middle")) / number("variable_half_width")
        })
        .collect();
    let terms = record["formula"]["terms"].as_array().unwrap();
    let sum: f64 = terms
        .iter()
        .map(|term| {
            let exponents = term["exponents"].as_array().unwrap();
            let factors = exponents
                .iter()
                .zip(&scaled)
                .map(|(n, t)| (n.as_f64().unwrap() * t.clamp(-1.0, 1.0).acos()).cos());
            value(term, "/coefficient") * factors.product::<f64>()
        })
        .sum();
    sum.exp()
}

fn numbers(list: &Value) -> Vec<f64> {
    list.as_array()
        .unwrap()
        .iter()
        .map(|v| v.as_f64().unwrap())
        .collect()
}

#[test]
fn json_is_as_its_schema_says_and_its_formula_gives_the_table() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let schema = schema();
    for line in [
        format!("{KOH} --json --fluid water --temperature 25C"),
        "card a.csv --vary film=0..2um --fresh-points 10 --json".to_owned(),
        "card trapezoid --vary left_angle=80..88deg --with top_width=60um --with depth=30um --with \
         right_angle=90deg --fresh-points 10 --json"
            .to_owned(),
    ] {
        let record = folder.json(&line);
        assert_eq!(valid(&schema, &schema, &record, ""), Ok(()), "{line}");
        for point in record["table"].as_array().unwrap() {
            let k = evaluated(&record, &numbers(&point["values"]));
            assert_close(k, value(point, "/conductance_fit"), 1e-9);
            assert!(value(point, "/relative_difference").abs() <= 1e-3);
            let conductance = &point["conductance"];
            let [low, high] = ["low", "high"].map(|key| conductance[key].as_f64().unwrap());
            assert!(low < high && low <= conductance["value"].as_f64().unwrap());
        }
        let check = numbers(&record["formula"]["check_values"]);
        assert_close(
            evaluated(&record, &check),
            value(&record, "/formula/check_conductance"),
            1e-9,
        );
        let errors = &record["errors"];
        assert_close(
            value(errors, "/stated_error"),
            value(errors, "/fit_error_fresh_largest").max(value(errors, "/fit_error_table_largest"))
                + value(errors, "/numerical_error_largest"),
            1e-12,
        );
    }
    let mut broken = folder.json("card a.csv --vary film=0..2um --fresh-points 10 --json");
    broken["table"][0]["values"][0] = Value::Null;
    assert!(valid(&schema, &schema, &broken, "").is_err());
}

#[test]
fn resistance_comes_with_a_fluid_and_its_bounds_turn_round() {
    let folder = Folder::new();
    let record = folder.json(&format!("{KOH} --json --viscosity 1mPa.s"));
    let point = &record["table"][0];
    let k = value(point, "/conductance");
    assert_close(value(point, "/resistance_per_length"), 1e-3 / k, 1e-12);
    let resistance = &point["resistance_per_length"];
    assert_close(
        resistance["high"].as_f64().unwrap(),
        1e-3 / point["conductance"]["low"].as_f64().unwrap(),
        1e-12,
    );
    let plain = folder.json(&format!("{KOH} --json"));
    assert!(plain["table"][0].get("resistance_per_length").is_none());
    assert!(plain["absent_because"]["fluid"].is_string());
}

#[test]
fn csv_has_the_numbers_of_the_json_and_a_unit_in_every_head() {
    let hostile = "name = \"a, \\\"b\\\"\\n=c\"\nunit = \"um\"\n[[lumen]]\nouter = [[0, 0], [100, 0], [100, -50], \
                   [0, -50]]\n";
    let folder = Folder::with("a.toml", hostile);
    let line = "card a.toml --vary over-etch=0..1um --vary width=-2..2% --fresh-points 10";
    let record = folder.json(&format!("{line} --json"));
    let run = folder.line(&format!("{line} --csv"));
    assert_eq!(run.status, 0, "{}", run.err);
    let mut reader = csv::Reader::from_reader(run.out.as_bytes());
    let heads = reader.headers().unwrap().clone();
    assert_eq!(&heads[1], "over_etch_m");
    assert_eq!(&heads[2], "width_1");
    assert!(
        heads
            .iter()
            .skip(1)
            .all(|h| h.ends_with("_m") || h.ends_with("_1") || h.ends_with("_m4"))
    );
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    let points = record["table"].as_array().unwrap();
    assert_eq!(rows.len(), points.len());
    for (row, point) in rows.iter().zip(points) {
        assert_eq!(&row[0], "a, \"b\" =c");
        let read: Vec<f64> = (1..9).map(|k| row[k].parse().unwrap()).collect();
        let mut expected = numbers(&point["values"]);
        for key in ["value", "low", "high", "estimated_error"] {
            expected.push(point["conductance"][key].as_f64().unwrap());
        }
        expected.push(value(point, "/conductance_fit"));
        expected.push(value(point, "/relative_difference"));
        let same = read
            .iter()
            .zip(&expected)
            .all(|(a, b)| a.to_bits() == b.to_bits());
        assert!(same, "{read:?} {expected:?}");
    }
}

#[test]
fn text_says_ranges_errors_trends_formula_and_the_ban_on_going_outside() {
    let folder = Folder::new();
    let run = folder.line(&format!("{KOH} --ascii --fluid water --temperature 25C"));
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    assert!(run.out.is_ascii());
    let out = run.out.split_whitespace().collect::<Vec<_>>().join(" ");
    for part in [
        "depth 20.000 um to 30.000 um",
        "20 points, asked 0.10 %: reached",
        "stated error of the formula",
        "inside the ranges only",
        "K rises with depth, as it must",
        "a = (ln(depth / m) + ",
        "T(n+1)(t) = 2 t Tn(t) - T(n-1)(t)",
        "To check a copy: at depth = 24.49490 um, opening = 97.97959 um",
        "R' / (Pa s/m^4)",
    ] {
        assert!(out.contains(part), "`{part}` not in:\n{}", run.out);
    }
    let same = |threads: &str| folder.line(&format!("{KOH} --csv --threads {threads}")).out;
    assert_eq!(same("1"), same("2"));
}

#[test]
fn pictures_are_written_for_one_two_and_three_parameters() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (name, varied, part) in [
        ("one.svg", "--vary film=0..2um", "conductance K"),
        (
            "two.svg",
            "--vary film=0..2um --vary depth=-2..2um",
            "depth / \u{b5}m",
        ),
        (
            "three.svg",
            "--vary film=0..2um --vary depth=-2..2um --vary floor=0..1um",
            "floor = 1.000 \u{b5}m",
        ),
    ] {
        let run = folder.line(&format!(
            "card a.csv {varied} --fresh-points 10 --picture {name} -q"
        ));
        assert_eq!((run.status, run.err.as_str()), (0, ""), "{name}");
        let text = folder.read(name);
        let document = roxmltree::Document::parse(&text).unwrap();
        let texts: Vec<&str> = document.descendants().filter_map(|n| n.text()).collect();
        assert!(texts.iter().any(|t| t.contains(part)), "{part} {texts:?}");
        assert!(texts.iter().any(|t| t.contains("inside the ranges only")));
    }
    let run = folder.line(&format!("{KOH} --picture map.png -q"));
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(
        std::fs::read(folder.path("map.png"))
            .unwrap()
            .starts_with(b"\x89PNG")
    );
}

/// Runs each line with files to write: one error with its status and advice, and no file.
fn assert_refused(lines: &[(&str, i32, &[&str])]) {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (words, status, parts) in lines {
        let run = folder.line(&format!("card {words} --picture out.png -o out.txt"));
        run.assert_error(*status, parts);
        assert_eq!(folder.names(), ["a.csv"], "{words}");
    }
}

#[test]
fn kinds_without_such_a_table_are_refused_with_what_to_type_and_leave_no_file() {
    let koh = |words: &str| format!("koh_groove --with opening=100um {words}");
    let lines = [
        (
            koh("--vary depth=40..20um"),
            2,
            &["reversed", "smaller value first"][..],
        ),
        (koh("--vary depth=20..20um"), 2, &["is empty"]),
        (
            koh("--vary depth=20..40"),
            2,
            &["no unit", "--vary depth=20..40um"],
        ),
        (koh("--vary depth=20um"), 2, &["NAME=LOW..HIGH"]),
        (
            koh("--vary dpeth=20..40um"),
            2,
            &["no parameter `dpeth`", "did you mean `depth`"],
        ),
        (
            koh("--vary depth=2..4um --vary depth=2..4um"),
            2,
            &["varied twice"],
        ),
        (
            koh("--vary opening=90..99um"),
            2,
            &["both varied and fixed", "--with opening"],
        ),
        (
            koh("--vary depth=0..40um"),
            2,
            &["at depth = 0 um", "must be above 0"],
        ),
        (
            koh("--vary depth=2..4um --with lid_sga=1um"),
            2,
            &["lid_sag"],
        ),
        (
            koh("--vary depth=20..40um --fit-error 50%"),
            2,
            &["--fit-error", "0.2"],
        ),
        (koh("--vary depth=20..40um --picture a.gif"), 2, &["a.gif"]),
    ];
    let lines: Vec<(&str, i32, &[&str])> =
        lines.iter().map(|(w, s, p)| (w.as_str(), *s, *p)).collect();
    assert_refused(&lines);
    assert_refused(&[
        (
            "koh_groove --vary depth=20..40um",
            2,
            &["needs `opening`", "--with \"opening=100 um\""],
        ),
        (
            "regular_polygon --with side=9um --vary sides=3..6",
            2,
            &["whole number", "no range"],
        ),
        (
            "koh_grove --vary depth=20..40um",
            3,
            &["no such file", "`koh_groove`"],
        ),
        (
            "drie_trench --vary depth=60..90um --vary top_width=30..40um --vary taper=88..90deg --vary bow=0..1um",
            2,
            &["4 parameters", "at most 3"],
        ),
    ]);
}

#[test]
fn outlines_without_such_a_table_are_refused_with_what_to_type_and_leave_no_file() {
    assert_refused(&[
        (
            "a.csv --vary film=0..30um",
            4,
            &["at film = 30 um", "closes the section"],
        ),
        (
            "a.csv --vary depth=-50..1um",
            4,
            &["crosses", "narrow the ranges"],
        ),
        ("a.csv --vary film=-1..1um", 2, &["below zero", "over_etch"]),
        ("a.csv --vary depth=-1..1", 2, &["no unit", "depth=-2..2um"]),
        ("a.csv --vary scale=-1..1um", 2, &["scale=-2..2%"]),
        ("a.csv --vary flim=0..1um", 2, &["did you mean `film`"]),
        (
            "a.csv --vary depth=-1..1um --with depth=3um",
            2,
            &["--with", "leave it out"],
        ),
    ]);
}

#[test]
fn a_fit_that_is_not_reached_ends_with_status_five_and_shows_the_best() {
    let folder = Folder::new();
    let half = "(koh_groove opening=100um depth=40um)";
    let (lower, upper) = (format!("lower={half}"), format!("upper={half}"));
    let words = [
        "card",
        "bonded_halves",
        "--with",
        &lower,
        "--with",
        &upper,
        "--vary",
        "offset=-1000..1000um",
        "--fresh-points",
        "20",
        "--fit-error",
        "1%",
        "--json",
    ];
    let run = folder.run(&words);
    assert_eq!(run.status, 5, "{}", run.err);
    let record: Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(valid(&schema(), &schema(), &record, ""), Ok(()));
    assert_eq!(record["errors"]["fit_error_met"], false);
    let codes: Vec<&str> = record["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .map(|w| w["code"].as_str().unwrap())
        .collect();
    assert_eq!(codes, ["fit_not_reached", "shape_changes"]);
}
