//! `etchwise network`: text, JSON by its schema, CSV, files, and what is refused. The nets are invented.

use std::fs;

use serde_json::Value;

use crate::{Folder, assert_close, shape, value};

/// Two channels in series with the cards that come with the program, from 20 kPa to zero.
fn net() -> String {
    format!(
        "name = \"two in a row\"\n\
         [[card]]\nname = \"feed\"\nfile = \"{}\"\n\
         [[card]]\nname = \"drain\"\nfile = \"{}\"\n\
         [[node]]\nname = \"inlet\"\npressure = \"20 kPa\"\n\
         [[node]]\nname = \"middle\"\n\
         [[node]]\nname = \"outlet\"\npressure = \"0 Pa\"\n\
         [[channel]]\nname = \"c1\"\nfrom = \"inlet\"\nto = \"middle\"\ncard = \"feed\"\nlength = \"10 mm\"\n\
         [[channel]]\nname = \"c2\"\nfrom = \"outlet\"\nto = \"middle\"\ncard = \"drain\"\nlength = \"2 cm\"\n",
        shape("networks/feed.card.json"),
        shape("networks/drain.card.json")
    )
}

fn changed(from: &str, to: &str) -> Folder {
    assert!(net().contains(from), "{from}");
    Folder::with("net.toml", net().replacen(from, to, 1))
}

fn card(name: &str) -> Value {
    let text = fs::read_to_string(shape(&format!("networks/{name}.card.json"))).unwrap();
    let file: Value = serde_json::from_str(&text).unwrap();
    file["cards"][0].clone()
}

/// What a value breaks of a schema: the words of JSON Schema that the shipped one uses.
fn broken(root: &Value, schema: &Value, value: &Value, path: &str, out: &mut Vec<String>) {
    if let Some(name) = schema["$ref"].as_str() {
        let target = root.pointer(name.trim_start_matches('#')).unwrap();
        broken(root, target, value, path, out);
    }
    for part in schema["allOf"].as_array().into_iter().flatten() {
        broken(root, part, value, path, out);
    }
    let fits = |schema: &Value| {
        let mut found = Vec::new();
        broken(root, schema, value, path, &mut found);
        found.is_empty()
    };
    let any = schema["anyOf"].as_array();
    if any.is_some_and(|any| !any.iter().any(fits)) {
        out.push(format!("{path}: none of anyOf"));
    }
    if !schema["if"].is_null() && fits(&schema["if"]) {
        broken(root, &schema["then"], value, path, out);
    }
    let types = match &schema["type"] {
        Value::Array(types) => types.clone(),
        Value::Null => Vec::new(),
        one => vec![one.clone()],
    };
    let found = match value {
        Value::Null => "null",
        Value::Bool(_) => "boolean",
        Value::Number(_) => "number",
        Value::String(_) => "string",
        Value::Array(_) => "array",
        Value::Object(_) => "object",
    };
    if !types.is_empty() && !types.iter().any(|t| t == found) {
        out.push(format!("{path}: {found}"));
    }
    if schema.get("const").is_some_and(|only| only != value) {
        out.push(format!("{path}: {value} is not {}", schema["const"]));
    }
    let choice = schema["enum"].as_array();
    if choice.is_some_and(|choice| !choice.contains(value)) {
        out.push(format!("{path}: {value} is not of {}", schema["enum"]));
    }
    for name in schema["required"].as_array().into_iter().flatten() {
        if value.get(name.as_str().unwrap()).is_none() {
            out.push(format!("{path}: no {name}"));
        }
    }
    for (name, inner) in schema["properties"].as_object().into_iter().flatten() {
        if let Some(part) = value.get(name) {
            broken(root, inner, part, &format!("{path}/{name}"), out);
        }
    }
    let items = value.as_array().into_iter().flatten().enumerate();
    for (index, item) in items.filter(|_| !schema["items"].is_null()) {
        broken(
            root,
            &schema["items"],
            item,
            &format!("{path}/{index}"),
            out,
        );
    }
}

#[test]
fn two_channels_in_a_row_give_the_sum_of_their_resistances() {
    let folder = Folder::with("net.toml", net());
    let record = folder.json("network net.toml --json --samples 0");
    let per_length = |name: &str| value(&card(name), "/resistance_per_length");
    let sum = 0.01 * per_length("feed") + 0.02 * per_length("drain");
    let resistance = &record["equivalent_resistance"]["resistance"];
    assert_close(resistance["value"].as_f64().unwrap(), sum, 1e-13);
    let end = |end: &str, name: &str| card(name)["resistance_per_length"][end].as_f64().unwrap();
    for bound in ["low", "high"] {
        let exact = 0.01 * end(bound, "feed") + 0.02 * end(bound, "drain");
        assert_close(resistance[bound].as_f64().unwrap(), exact, 1e-12);
    }
    let flow = 2e4 / sum;
    assert_close(value(&record, "/channels/0/flow"), flow, 1e-13);
    // Given from outlet to middle, so against its direction.
    assert_close(value(&record, "/channels/1/flow"), -flow, 1e-13);
    assert_eq!(record["channels"][1]["direction"], "backward");
    let area = value(&card("drain"), "/volume_per_length");
    assert_close(
        value(&record, "/channels/1/residence_time"),
        0.02 * area / flow,
        1e-13,
    );
    let shear = value(&card("drain"), "/wall_shear_per_flow_rate/max");
    assert_close(
        value(&record, "/channels/1/wall_shear_max"),
        shear * flow,
        1e-13,
    );
    assert_eq!(record["mass_balance"]["is_kept"], true);
    assert!(value(&record, "/mass_balance/relative") < 1e-14);
}

#[test]
fn the_shipped_net_follows_its_schema_and_prints_the_same_every_time() {
    let folder = Folder::new();
    let schema: Value = serde_json::from_str(&folder.line("network --print-schema").out).unwrap();
    let net = shape("networks/manifold.toml");
    let run = folder.run(&["network", &net, "--json"]);
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    let record: Value = serde_json::from_str(&run.out).unwrap();
    let mut out = Vec::new();
    broken(&schema, &schema, &record, "", &mut out);
    assert!(out.is_empty(), "{out:?}");
    // The checker sees what is wrong.
    for (place, wrong) in [
        ("/channels/0/flow/unit", "m"),
        ("/nodes/0/given", "x"),
        ("/schema", "x"),
    ] {
        let mut spoilt = record.clone();
        *spoilt.pointer_mut(place).unwrap() = wrong.into();
        broken(&schema, &schema, &spoilt, "", &mut out);
        assert!(!out.is_empty(), "{place}");
        out.clear();
    }
    assert!(!run.out.contains("NaN") && record["schema"] == "etchwise-network/1");
    let uncertainty = &record["uncertainty"];
    assert_eq!(uncertainty["samples"]["value"], 1000);
    assert_eq!(
        uncertainty["outputs_covered"],
        uncertainty["outputs_in_all"]
    );
    assert!(value(uncertainty, "/largest_difference").abs() < 0.15);
    let one_thread = folder.run(&["network", &net, "--json", "--threads", "1"]);
    assert_eq!(one_thread.out, run.out);
    let other_seed = folder.run(&["network", &net, "--json", "--seed", "2"]);
    assert_ne!(other_seed.out, run.out);
    let text = folder.run(&["network", &net, "--ascii"]);
    assert!(text.out.is_ascii(), "{}", text.out);
    let words = text.out.split_whitespace().collect::<Vec<_>>().join(" ");
    for part in [
        "Net manifold of four branches",
        "water at 30.00 C",
        "Mass balance",
        "not a pressure rating",
    ] {
        assert!(words.contains(part), "`{part}` not in {}", text.out);
    }
}

#[test]
fn csv_has_a_row_for_each_channel_and_reads_back_in_both_dialects() {
    let folder = Folder::new();
    let net = shape("networks/manifold.toml");
    let record: Value =
        serde_json::from_str(&folder.run(&["network", &net, "--json"]).out).unwrap();
    let run = folder.run(&["network", &net, "--csv", "--nodes-csv", "nodes.csv", "-q"]);
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    let mut reader = csv::Reader::from_reader(run.out.as_bytes());
    let heads = reader.headers().unwrap().clone();
    let column = |name: &str| heads.iter().position(|head| head == name).unwrap();
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), record["channels"].as_array().unwrap().len());
    for (row, channel) in rows.iter().zip(record["channels"].as_array().unwrap()) {
        assert_eq!(row[column("name")], *channel["name"].as_str().unwrap());
        for (head, key) in [
            ("flow_m3_per_s", "/flow"),
            ("resistance_pa_s_per_m3", "/resistance"),
            ("time_constant_s", "/time_constant"),
        ] {
            let read: f64 = row[column(head)].parse().unwrap();
            assert_eq!(read.to_bits(), value(channel, key).to_bits());
        }
    }
    let nodes = folder.read("nodes.csv");
    assert!(nodes.starts_with("node,given,pressure_pa,"), "{nodes}");
    assert_eq!(
        nodes.lines().count(),
        1 + record["nodes"].as_array().unwrap().len()
    );
    let eu = folder
        .run(&["network", &net, "--csv", "--csv-locale", "eu"])
        .out;
    assert!(eu.starts_with("\u{feff}name;from;to;card;"), "{eu}");
    let first = eu.lines().nth(1).unwrap();
    let flow = first.split(';').nth(column("flow_m3_per_s")).unwrap();
    let flow: f64 = flow.replace(',', ".").parse().unwrap();
    assert_eq!(flow.to_bits(), value(&record, "/channels/0/flow").to_bits());
}

#[test]
fn the_temperature_of_the_net_moves_resistances_by_the_law_of_the_card() {
    let warm = changed("name = \"two", "temperature = \"40 C\"\nname = \"two");
    let record = warm.json("network net.toml --json --samples 0");
    let cold = Folder::with("net.toml", net()).json("network net.toml --json --samples 0");
    let law = &card("feed")["temperature_law"];
    let x = 298.15 / 313.15 - 1.0;
    let terms = law["coefficients"].as_array().unwrap().iter().zip(1..);
    let sum: f64 = terms
        .map(|(c, k)| c["value"].as_f64().unwrap() * f64::powi(x, k))
        .sum();
    let ratio = value(&record, "/channels/0/resistance") / value(&cold, "/channels/0/resistance");
    assert_close(ratio, sum.exp(), 1e-13);
    // The same flow more makes the same shear: the drop is the same.
    let shear = |r: &Value| value(r, "/channels/0/wall_shear_max");
    assert_close(shear(&record), shear(&cold), 1e-3);
    assert!(record["notes"].to_string().contains("largest error"));
    changed("name = \"two", "temperature = \"95 C\"\nname = \"two")
        .line("network net.toml")
        .assert_error(4, &["368.15 K", "`feed`", "help: make the card again"]);
}

/// What is changed to what, the place of the error, and words of it.
const WRONG: [[&str; 4]; 18] = [
    [
        "\"10 mm\"",
        "\"1e300 m\"",
        "net.toml:21:10",
        "beyond 1000 km",
    ],
    [
        "\"20 kPa\"",
        "\"1e300 Pa\"",
        "net.toml:10:12",
        "beyond 100 GPa",
    ],
    [
        "name = \"outlet\"",
        "name = \"middle\"",
        "net.toml:14:8",
        "taken by the node in line 12",
    ],
    [
        "to = \"middle\"",
        "to = \"midle\"",
        "net.toml:19:6",
        "did you mean `middle`?",
    ],
    [
        "card = \"feed\"",
        "card = \"fed\"",
        "net.toml:20:8",
        "did you mean `feed`?",
    ],
    [
        "to = \"middle\"",
        "to = \"inlet\"",
        "net.toml:19:6",
        "begins and ends at node `inlet`",
    ],
    ["\"10 mm\"", "\"0 mm\"", "net.toml:21:10", "not above zero"],
    ["\"10 mm\"", "\"10\"", "net.toml:21:10", "unit"],
    ["\"10 mm\"", "10", "net.toml:21:10", "such as \"20 mm\""],
    ["length = \"10 mm\"\n", "", "net.toml:16:1", "no `length`"],
    [
        "\"20 kPa\"",
        "\"20 kPa\"\ninflow = \"1 uL/min\"",
        "net.toml:11:10",
        "both a pressure and an inflow",
    ],
    [
        "\"10 mm\"",
        "\"10 mm\"\nspread = \"120 %\"",
        "net.toml:22:10",
        "below 100 %",
    ],
    [
        "\"10 mm\"",
        "\"10 mm\"\nparallel = 0",
        "net.toml:22:12",
        "whole number",
    ],
    [
        "\"10 mm\"",
        "\"10 mm\"\nlenght = 1",
        "net.toml:22:1",
        "did you mean `length`?",
    ],
    [
        "name = \"middle\"",
        "name = \"\"",
        "net.toml:12:8",
        "1 to 200 characters",
    ],
    ["[[node]]", "[[node]", "net.toml:8:", "not valid TOML"],
    [
        "feed.card.json",
        "none.card.json",
        "none.card.json",
        "no such file",
    ],
    [
        "[[node]]\n",
        "[[node]]\nname = \"alone\"\n[[node]]\n",
        "net.toml:9:",
        "no channel ends at node `alone`",
    ],
];

#[test]
fn nets_that_are_wrong_are_refused_with_line_and_remedy() {
    for [from, to, place, words] in WRONG {
        let run = changed(from, to).line("network net.toml");
        run.assert_error(3, &[place, words, "help: "]);
    }
    let none = net()
        .replace("pressure = \"20 kPa\"\n", "")
        .replace("pressure = \"0 Pa\"\n", "");
    let folder = Folder::with("net.toml", none);
    folder.line("network net.toml").assert_error(
        3,
        &["net.toml:9:", "no pressure is given", "`inlet` (3 nodes"],
    );
    folder
        .line("network missing.toml")
        .assert_error(3, &["no such file"]);
    let folder = Folder::with("net.toml", net());
    folder
        .line("network net.toml --samples 3")
        .assert_error(2, &["say nothing"]);
    folder
        .line("network net.toml -o net.toml")
        .assert_error(3, &["net.toml"]);
    assert_eq!(folder.read("net.toml"), net());
}

#[test]
fn cards_of_another_version_fluid_or_form_are_refused() {
    let text = fs::read_to_string(shape("networks/feed.card.json")).unwrap();
    let with_card = |card: &str| {
        let folder = Folder::with("own.json", card);
        folder.write(
            "net.toml",
            net().replace(&shape("networks/feed.card.json"), "own.json"),
        );
        folder
    };
    assert_eq!(with_card(&text).line("network net.toml").status, 0);
    for (from, to, words) in [
        ("etchwise-card/1", "etchwise-card/2", "\"etchwise-card/2\""),
        ("\"name\": \"water\"", "\"name\": \"oil\"", "is for water"),
        ("\"schema\"", "schema", "own.json:2:"),
        ("Pa s/m^4", "Pa s/m^3", "must be `Pa s/m^4`"),
        (
            "\"u\": ",
            "\"u\": 1e300, \"was\": ",
            "larger than the value",
        ),
    ] {
        assert!(text.contains(from), "{from}");
        let run = with_card(&text.replacen(from, to, 1)).line("network net.toml");
        run.assert_error(3, &[words, "help: "]);
    }
    let mut two: Value = serde_json::from_str(&text).unwrap();
    let mut other = two["cards"][0].clone();
    other["name"] = "other".into();
    two["cards"].as_array_mut().unwrap().push(other);
    let folder = with_card(&two.to_string());
    folder
        .line("network net.toml")
        .assert_error(3, &["net.toml:2:", "2 cards", "card = "]);
    let chosen = folder
        .read("net.toml")
        .replace("\"own.json\"", "\"own.json\"\ncard = \"other\"");
    folder.write("net.toml", &chosen);
    assert_eq!(folder.line("network net.toml").status, 0);
    folder.write(
        "net.toml",
        chosen.replace("card = \"other\"", "card = \"third\""),
    );
    folder
        .line("network net.toml")
        .assert_error(3, &["no card `third`", "`other`"]);
}

#[test]
fn a_route_has_its_own_length_and_one_name_stays_on_one_line() {
    let mut route: Value =
        serde_json::from_str(&fs::read_to_string(shape("networks/feed.card.json")).unwrap())
            .unwrap();
    let whole = &mut route["cards"][0];
    whole["kind"] = "route".into();
    for (name, unit, number) in [
        ("length", "m", 0.03),
        ("resistance", "Pa s/m^3", 5e13),
        ("inertance", "kg/m^4", 1e10),
        ("volume", "m^3", 9e-11),
        ("wall_area", "m^2", 6e-6),
    ] {
        whole[name] = serde_json::json!({"value": number, "unit": unit});
    }
    let folder = Folder::with("route.json", route.to_string());
    let net = net().replace(&shape("networks/feed.card.json"), "route.json");
    folder.write("net.toml", &net);
    folder
        .line("network net.toml")
        .assert_error(3, &["net.toml:21:10", "that of a route"]);
    let hostile = "inlet\\n\\u001b[2Jerror: x\\u202e,\\\"=1+1";
    let net = net
        .replace("length = \"10 mm\"\n", "")
        .replace("inlet", hostile);
    folder.write("net.toml", net);
    let record = folder.json("network net.toml --json");
    assert_close(value(&record, "/channels/0/resistance"), 5e13, 1e-15);
    assert_close(
        value(&record, "/channels/0/mean_velocity"),
        value(&record, "/channels/0/flow") / 3e-9,
        1e-13,
    );
    for line in ["network net.toml", "network net.toml --csv"] {
        let run = folder.line(line);
        assert_eq!(run.status, 0, "{}", run.err);
        assert!(!run.out.contains(['\u{1b}', '\u{202e}']), "{}", run.out);
        assert!(
            !run.out.lines().any(|l| l.starts_with("error")),
            "{}",
            run.out
        );
    }
    let csv = folder.line("network net.toml --csv").out;
    assert!(csv.contains("\"inlet  [2Jerror: x ,\"\"=1+1\""), "{csv}");
}

#[test]
fn flow_beyond_the_laminar_limit_is_printed_and_ends_with_status_4() {
    let folder = changed("\"20 kPa\"", "\"900 bar\"");
    let run = folder.line("network net.toml");
    assert_eq!(run.status, 4, "{}", run.err);
    assert!(
        run.out.contains("not_laminar") && run.out.contains("beyond: "),
        "{}",
        run.out
    );
    let run = changed("\"10 mm\"", "\"0.05 mm\"").line("network net.toml --deny-warnings -q");
    assert_eq!(run.status, 1, "{}", run.out);
    assert!(run.out.contains("entrance_length"), "{}", run.out);
}
