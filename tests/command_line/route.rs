//! `etchwise route`: outputs, schema, files for viewers, bad route files.

use serde_json::Value;

use crate::Folder;

/// Two segments, coarse enough for a quick solve.
const ROUTE: &str = r#"
name = "chip"
[[segment]]
name = "taper"
[[segment.station]]
at = "1 mm"
nominal = { kind = "rectangle", width = "100 um", height = "40 um" }
[[segment.station]]
at = "3 mm"
nominal = { kind = "rectangle", width = "100 um", height = "30 um" }
[[segment]]
name = "fork"
spread = "5 %"
[[segment.branch]]
name = "left"
length = "4 mm"
section = "section.toml"
[[segment.branch]]
name = "right"
length = "5 mm"
section = "section.toml"
"#;
const SECTION: &str = "unit = \"um\"\n[[lumen]]\nouter = [[0, 0], [60, 0], [60, -30], [0, -30]]\n";
const COARSE: &str = "--cells-across 16";
const WATER: &str = "--fluid water --temperature 25C --flow-rate 5uL/min";

fn folder(route: &str) -> Folder {
    let folder = Folder::with("route.toml", route);
    folder.write("section.toml", SECTION);
    folder
}

/// Whether a value meets a schema made of the words that ours uses.
fn meets(value: &Value, schema: &Value, root: &Value, place: &str) {
    if let Some(reference) = schema["$ref"].as_str() {
        let target = root.pointer(reference.trim_start_matches('#')).unwrap();
        return meets(value, target, root, place);
    }
    if let Some(constant) = schema.get("const") {
        assert_eq!(value, constant, "{place}");
    }
    if let Some(list) = schema["enum"].as_array() {
        assert!(list.contains(value), "{place}: {value}");
    }
    let kind = match value {
        Value::Null => "null",
        Value::Bool(_) => "boolean",
        Value::Number(n) if n.is_u64() => "integer",
        Value::Number(_) => "number",
        Value::String(_) => "string",
        Value::Array(_) => "array",
        Value::Object(_) => "object",
    };
    let fits = |t: &Value| t == kind || (t == "number" && kind == "integer");
    match &schema["type"] {
        Value::Null => {}
        Value::Array(types) => assert!(types.iter().any(fits), "{place}: {kind}"),
        one => assert!(fits(one), "{place}: {kind}, not {one}"),
    }
    if let Some(object) = value.as_object() {
        for key in schema["required"].as_array().into_iter().flatten() {
            assert!(object.contains_key(key.as_str().unwrap()), "{place}: {key}");
        }
        for (key, inner) in object {
            let known = schema["properties"].get(key);
            if let Some(schema) = known.or(schema.get("additionalProperties")) {
                meets(inner, schema, root, &format!("{place}/{key}"));
            }
        }
    }
    for (index, inner) in value.as_array().into_iter().flatten().enumerate() {
        if let Some(schema) = schema.get("items") {
            meets(inner, schema, root, &format!("{place}/{index}"));
        }
    }
}

#[test]
fn the_json_meets_its_schema_with_and_without_a_flow() {
    let folder = folder(ROUTE);
    let schema: Value = serde_json::from_str(etchwise::report::ROUTE_JSON_SCHEMA).unwrap();
    let plain = folder.json(&format!("route route.toml --json {COARSE}"));
    let flowing = folder.json(&format!("route route.toml --json {COARSE} {WATER}"));
    for json in [&plain, &flowing] {
        meets(json, &schema, &schema, "");
    }
    assert!(plain["resistance"]["value"].is_null() && plain["fluid"].is_null());
    let integral = flowing["integral"]["value"].as_f64().unwrap();
    let mu = flowing["fluid"]["viscosity"]["value"].as_f64().unwrap();
    let resistance = flowing["resistance"]["value"].as_f64().unwrap();
    assert!((resistance / (mu * integral) - 1.0).abs() < 1e-12);
    assert!(flowing["resistance"]["low"].as_f64().unwrap() < resistance);
    let share = flowing["segments"][1]["branches"][0]["flow_share"]["value"]
        .as_f64()
        .unwrap();
    assert!((share - 5.0 / 9.0).abs() < 1e-9);
    // A wrong kind of value is noticed.
    let mut broken = plain.clone();
    broken["integral"]["unit"] = Value::Null;
    let noticed = std::panic::catch_unwind(|| meets(&broken, &schema, &schema, ""));
    assert!(noticed.is_err());
}

#[test]
fn the_csv_holds_the_numbers_of_the_json_and_every_head_its_unit() {
    let folder = folder(ROUTE);
    let json = folder.json(&format!("route route.toml --json {COARSE} {WATER}"));
    let run = folder.line(&format!("route route.toml --csv {COARSE} {WATER}"));
    let mut reader = csv::Reader::from_reader(run.out.as_bytes());
    let heads: Vec<String> = reader
        .headers()
        .unwrap()
        .iter()
        .map(str::to_owned)
        .collect();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    let at = |row: &csv::StringRecord, head: &str| {
        row[heads.iter().position(|h| h == head).unwrap()].to_owned()
    };
    let segments = json["segments"].as_array().unwrap();
    let branches = segments
        .iter()
        .flat_map(|s| s["branches"].as_array().unwrap());
    let points: Vec<&Value> = branches
        .flat_map(|b| b["points"].as_array().unwrap())
        .collect();
    assert_eq!(points.len(), rows.len());
    for (point, row) in points.iter().zip(&rows) {
        for (key, head) in [
            ("position", "position_m"),
            ("conductance", "conductance_m4"),
            ("pressure", "pressure_pa"),
            ("wall_shear_max", "wall_shear_max_pa"),
        ] {
            let expected = point[key]["value"].as_f64().unwrap();
            assert_eq!(
                at(row, head).parse::<f64>().unwrap().to_bits(),
                expected.to_bits()
            );
        }
    }
    let units = ["_m", "_m2", "_m3", "_m4", "_1", "_pa", "_s"];
    let words = [
        "route",
        "segment",
        "branch",
        "section",
        "interpolation_to_next",
    ];
    for head in &heads {
        let has_unit = units.iter().any(|unit| head.ends_with(unit));
        assert!(has_unit || words.contains(&head.as_str()), "{head}");
    }
}

#[test]
fn the_card_carries_resistance_spread_and_volume() {
    let folder = folder(ROUTE);
    let run = folder.line(&format!(
        "route route.toml --card card.json {COARSE} {WATER}"
    ));
    assert_eq!(run.status, 0, "{}", run.err);
    let root: Value = serde_json::from_str(&folder.read("card.json")).unwrap();
    assert_eq!(root["schema"], "etchwise-card/1");
    let card = &root["cards"][0];
    assert_eq!(card["kind"], "route");
    assert_eq!(card["resistance"]["unit"], "Pa s/m^3");
    for key in ["low", "high", "u", "value"] {
        assert!(card["resistance"][key].as_f64().unwrap() > 0.0, "{key}");
    }
    for key in ["length", "inertance", "volume", "wall_area"] {
        assert!(card[key]["value"].as_f64().unwrap() > 0.0, "{key}");
    }
    assert!(card["temperature_law"]["coefficients"].is_array());
    // Only the shape of the sections is left to say about.
    assert!(card["log_resistance_sensitivity"]["depth"]["absent_because"].is_string());
    let run = folder.line("route route.toml --card other.json");
    assert_eq!(run.status, 2, "{}", run.err);
}

#[test]
fn files_for_viewers_come_for_every_flow_rate_with_units() {
    let folder = folder(ROUTE);
    let line = format!("route route.toml {COARSE} {WATER} --flow-rate 10uL/min --vtk view --quiet");
    assert_eq!(folder.line(&line).status, 0);
    let collection = folder.read("view.pvd");
    for file in ["view-1.vtu", "view-1.vtp", "view-2.vtu", "view-2.vtp"] {
        assert!(collection.contains(&format!("file=\"{file}\"")), "{file}");
    }
    let fluid = folder.read("view-2.vtu");
    for name in ["velocity", "phi", "pressure", "fluid_fraction", "parallel"] {
        assert!(fluid.contains(&format!("Name=\"{name}\"")), "{name}");
    }
    for unit in ["m/s", "m^2", "Pa"] {
        assert!(
            fluid.contains(&format!(">{unit}</InformationKey>")),
            "{unit}"
        );
    }
    assert!(folder.read("view-1.vtp").contains("wall_shear"));
    let run = folder.line("route route.toml --vtk view");
    assert_eq!(run.status, 2, "{}", run.err);
    assert!(run.err.contains("--flow-rate"), "{}", run.err);
}

#[test]
fn pictures_and_text_are_written() {
    let folder = folder(ROUTE);
    let run = folder.line(&format!(
        "route route.toml {COARSE} {WATER} --picture p.svg --picture p.png --ascii"
    ));
    assert_eq!(run.status, 0, "{}", run.err);
    let svg = folder.read("p.svg");
    assert!(svg.contains("pressure above the outlet") && svg.contains("branches of segment fork"));
    for words in [
        "Route chip",
        "R, proven",
        "largest wall shear",
        "fork",
        "not a pressure rating",
    ] {
        assert!(run.out.contains(words), "{words}:\n{}", run.out);
    }
    assert!(run.out.is_ascii());
}

#[test]
fn hostile_names_stay_text_in_every_output() {
    let name = r#"=cmd|'/c'!A1\u001b[2J<b>&\",x"#;
    let route = ROUTE
        .replace("chip", name)
        .replace("\"left\"", &format!("\"{name}\""));
    let folder = folder(&route);
    let line =
        format!("route route.toml {COARSE} {WATER} --picture p.svg --card c.json --vtk v&<x>");
    let run = folder.line(&line);
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(!run.out.contains('\u{1b}') && !run.err.contains('\u{1b}'));
    let svg = folder.read("p.svg");
    assert!(!svg.contains("<b>") && !svg.contains('\u{1b}'));
    assert!(roxmltree::Document::parse(&svg).is_ok());
    let collection = folder.read("v&<x>.pvd");
    let collection = roxmltree::Document::parse(&collection).unwrap();
    let mut files = collection.descendants().filter_map(|n| n.attribute("file"));
    assert_eq!(files.next(), Some("v&<x>.vtu"));
    let card: Value = serde_json::from_str(&folder.read("c.json")).unwrap();
    assert!(
        card["cards"][0]["name"]
            .as_str()
            .unwrap()
            .contains("<b>&\",x")
    );
    let csv = folder.line(&format!("route route.toml --csv {COARSE}"));
    let mut reader = csv::Reader::from_reader(csv.out.as_bytes());
    assert!(reader.records().all(|row| row.unwrap().len() == 26));
    assert!(!csv.out.contains('\u{1b}'));
}

fn constant(rest: &str) -> String {
    format!("[[segment]]\nname = \"s\"\n{rest}\n")
}

fn stations(positions: &[&str]) -> String {
    let station =
        |at: &&str| format!("[[segment.station]]\nat = {at}\nsection = \"section.toml\"\n");
    constant(&positions.iter().map(station).collect::<String>())
}

const GOOD: &str = "length = \"1 mm\"\nsection = \"section.toml\"";

/// Every file ends with status 3, all the words in its message, and nothing on standard output.
fn refused(cases: &[(String, &[&str])]) {
    for (text, words) in cases {
        let folder = folder(text);
        let run = folder.line("route route.toml");
        assert_eq!(run.status, 3, "{text}\n{}", run.err);
        for word in *words {
            assert!(run.err.contains(word), "{word}\n{text}\n{}", run.err);
        }
        assert!(
            run.err.contains("help: ") && run.out.is_empty(),
            "{}",
            run.err
        );
    }
}

#[test]
fn stations_and_lengths_that_cannot_be_name_the_line_and_the_key() {
    refused(&[
        (
            stations(&["\"5 mm\"", "\"2 mm\""]),
            &["route.toml:7", "at:", "before station 1"],
        ),
        (stations(&["\"2 mm\"", "\"2 mm\""]), &["both at", "two"]),
        (
            stations(&["5", "6"]),
            &["route.toml:4", "length with its unit"],
        ),
        (stations(&["\"5\"", "\"6\""]), &["route.toml:4", "unit"]),
        (stations(&["\"1 mm\""]), &["one station"]),
        (
            constant("length = \"0 mm\"\nsection = \"section.toml\""),
            &["route.toml:3", "above zero"],
        ),
        (
            constant("length = \"-1 mm\"\nsection = \"section.toml\""),
            &["above zero"],
        ),
        (
            constant("length = \"1e9 m\"\nsection = \"section.toml\""),
            &["route.toml:3", "1 km"],
        ),
        (
            constant("section = \"section.toml\""),
            &["neither `station` nor `length`"],
        ),
    ]);
}

#[test]
fn sections_that_cannot_be_read_name_the_line_and_the_file() {
    refused(&[
        (
            constant("length = \"1 mm\""),
            &["neither `section` nor `nominal`"],
        ),
        (
            constant("length = \"1 mm\"\nsection = \"none.toml\""),
            &["route.toml:4", "none.toml", "no such file"],
        ),
        (
            constant("length = \"1 mm\"\nsection = \"route.toml\""),
            &["route.toml:4", "section file"],
        ),
        (constant("length = \"1 mm\"\nsection = \"-\""), &["`-`"]),
        (
            constant("length = \"1 mm\"\nnominal = { kind = \"rectangle\", width = \"1 um\" }"),
            &["route.toml:4", "height"],
        ),
    ]);
}

#[test]
fn names_counts_and_words_that_cannot_be_name_the_line_and_the_key() {
    let with = |line: &str| constant(&[GOOD, line].join("\n"));
    refused(&[
        (String::new(), &["no segment"]),
        (constant("branch = []"), &["no branch"]),
        ("name = \"x\"\n".to_owned(), &["no segment"]),
        ("segment = []\n".to_owned(), &["no segment", "route.toml:1"]),
        (format!("[[segment]]\n{GOOD}\n"), &["no `name`"]),
        (
            with(&constant(GOOD)),
            &["route.toml:6", "`s` is used for two segments"],
        ),
        (with("parallel = 0"), &["`parallel`", "1 to 10000"]),
        (with("spread = \"90 %\""), &["spread", "0.5"]),
        (with("spread = 0.05"), &["spread", "quotes"]),
        (
            with("interpolation = \"linear\""),
            &["interpolation", "cube_root"],
        ),
        (
            with("lenght = \"1 mm\""),
            &["lenght", "did you mean `length`"],
        ),
        (
            with("[[segment.station]]\nat = \"0 mm\""),
            &["both `station` and `length`"],
        ),
    ]);
}

#[test]
fn a_section_file_with_problems_is_named() {
    let folder = folder(ROUTE);
    let crossed = "unit = \"um\"\n[[lumen]]\nouter = [[0, 0], [60, 30], [60, 0], [0, 30]]\n";
    folder.write("section.toml", crossed);
    let run = folder.line("route route.toml");
    assert_eq!(run.status, 3, "{}", run.err);
    assert!(
        run.err.contains("section.toml: the outline cannot be used"),
        "{}",
        run.err
    );
    folder.write("section.toml", SECTION.replace("unit = \"um\"\n", ""));
    let run = folder.line("route route.toml");
    assert_eq!(run.status, 3, "{}", run.err);
    assert!(
        run.err.contains("no unit") && run.err.contains("section.toml"),
        "{}",
        run.err
    );
}

#[test]
fn too_many_stations_are_refused_unless_allowed() {
    let mut text = "[[segment]]\nname = \"s\"\n".to_owned();
    for k in 0..600 {
        let station = [
            "[[segment.station]]\nat = \"",
            &k.to_string(),
            " mm\"\nsection = \"section.toml\"\n",
        ];
        text.extend(station);
    }
    let folder = folder(&text);
    let run = folder.line("route route.toml");
    assert_eq!(run.status, 3, "{}", run.err);
    assert!(
        run.err.contains("500") && run.err.contains("--max-stations"),
        "{}",
        run.err
    );
    let run = folder.line(&format!("route route.toml --max-stations 600 {COARSE}"));
    assert_eq!(run.status, 0, "{}", run.err);
}

#[test]
fn options_are_checked_and_inputs_are_not_written_over() {
    let folder = folder(ROUTE);
    for (line, words) in [
        ("route route.toml --flow-rate 5uL/min", "needs a fluid"),
        (
            "route route.toml --fluid water --temperature 25C --flow-rate 0uL/min",
            "above zero",
        ),
        ("route route.toml --spread 70%", "0.5"),
        ("route route.toml --max-stations 1", "max-stations"),
        ("route route.toml --sections-between 64", "sections-between"),
    ] {
        let run = folder.line(line);
        assert_eq!(run.status, 2, "{line}: {}", run.err);
        assert!(run.err.contains(words), "{line}: {}", run.err);
    }
    let run = folder.line("route route.toml -o section.toml");
    assert_eq!(run.status, 3, "{}", run.err);
    assert!(run.err.contains("input file"), "{}", run.err);
    assert_eq!(folder.read("section.toml"), SECTION);
    let run = folder.run_with(&["route", "-", "--cells-across", "16"], ROUTE);
    assert_eq!(run.status, 0, "{}", run.err);
}

#[test]
fn fast_flow_ends_with_status_4() {
    let folder = folder(ROUTE);
    let line =
        format!("route route.toml {COARSE} --fluid water --temperature 25C --flow-rate 20mL/min");
    let run = folder.line(&line);
    assert_eq!(run.status, 4, "{}", run.err);
    assert!(run.out.contains("not_laminar: Segment "), "{}", run.out);
}
