//! `etchwise card`: text, JSON against its schema, CSV in both dialects, Modelica text, and what is refused.

use serde_json::Value;

use crate::{Folder, RECTANGLE, RECTANGLE_CONDUCTANCE, assert_close, shape, value};

const WATER: &str = "--fluid water --temperature 25C --cells-across 64";
/// Viscosity of water at 298.15 K, Pa s: IAPWS SR6-08(2011), Table 8.
const VISCOSITY: f64 = 889.996_774e-6;
/// Density there, kg/m^3, same table.
const DENSITY: f64 = 997.047_013;
/// A name that means something to every language that it is written to.
const HOSTILE: &str = "a,\"b\";c\\n\\\"; end X; equation";

fn card(record: &Value) -> &Value {
    &record["cards"][0]
}

#[test]
fn the_card_of_a_rectangle_agrees_with_its_closed_forms() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json(&format!("card a.csv {WATER} --json"));
    assert_eq!(record["schema"], "etchwise-card/1");
    let card = card(&record);
    let r = value(card, "/resistance_per_length");
    assert_close(r, VISCOSITY / RECTANGLE_CONDUCTANCE, 1e-5);
    let bound = |key: &str| card["resistance_per_length"][key].as_f64().unwrap();
    let exact = VISCOSITY / RECTANGLE_CONDUCTANCE;
    assert!(bound("low") < exact && exact < bound("high"));
    let momentum = value(card, "/momentum_factor");
    assert_close(
        value(card, "/inertance_per_length"),
        DENSITY * momentum / 4e-9,
        1e-9,
    );
    assert_close(value(card, "/volume_per_length"), 4e-9, 1e-12);
    assert_close(value(card, "/wall_area_per_length"), 280e-6, 1e-12);
    assert_close(value(card, "/mean_depth"), 40e-6, 1e-12);
    let excess = 2.0 * (value(card, "/kinetic_energy_factor") - momentum);
    assert_close(value(card, "/incremental_pressure_drop"), excess, 1e-12);
    // The mean of the shear over the wall is G A / P.
    let shear = value(card, "/wall_shear_per_flow_rate/mean");
    assert_close(shear, r * 4e-9 / 280e-6, 1e-9);
    // Shah and London (1978), table of the rectangle, aspect 0.4: largest over mean shear 1.355298
    // (recomputed from the series, check values).
    let max = value(card, "/wall_shear_per_flow_rate/max");
    assert_close(max / shear, 1.355_298, 5e-4);
    let slope = |name: &str| value(card, &format!("/log_resistance_sensitivity/{name}"));
    assert_close(slope("scale"), -4.0, 1e-3);
    assert_close(slope("depth") + slope("width"), -4.0, 1e-3);
    // Laminar up to 2000: Q = Re mu P / (4 rho).
    assert_close(
        value(card, "/validity/flow_rate_high"),
        2000.0 * VISCOSITY * 280e-6 / (4.0 * DENSITY),
        1e-9,
    );
}

#[test]
fn the_law_of_temperature_gives_the_viscosity_of_the_release() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json(&format!("card a.csv {WATER} --json"));
    let law = &card(&record)["temperature_law"];
    let coefficients = law["coefficients"].as_array().unwrap();
    assert!(coefficients.len() <= 4);
    let factor = |temperature: f64| -> f64 {
        let x = value(law, "/reference_temperature") / temperature - 1.0;
        let powers = (1..).map(|k| x.powi(k));
        let terms = coefficients.iter().zip(powers);
        terms
            .map(|(c, power)| c["value"].as_f64().unwrap() * power)
            .sum::<f64>()
            .exp()
    };
    let stated = value(law, "/largest_relative_error");
    assert!(stated <= 5e-4);
    for celsius in [5.0, 10.0, 20.0, 37.0, 45.0, 60.0] {
        let temperature = 273.15 + celsius;
        let exact = etchwise::flow::Fluid::water(temperature).unwrap().viscosity;
        let error = (factor(temperature) * VISCOSITY / exact - 1.0).abs();
        assert!(error <= stated * (1.0 + 1e-6), "{celsius} C: {error}");
    }
}

#[test]
fn both_ends_of_the_temperatures_of_water_are_taken() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (options, code) in [
        (
            "--temperature -20C --temperature-range -20C..60C",
            "fluid_range",
        ),
        (
            "--temperature 110C --temperature-range 5C..110C",
            "fluid_range",
        ),
    ] {
        let record = folder.json(&format!(
            "card a.csv --fluid water {options} --cells-across 16 --json"
        ));
        let warnings = card(&record)["warnings"].as_array().unwrap();
        assert!(warnings.iter().any(|w| w["code"] == code), "{options}");
    }
}

#[test]
fn stated_uncertainties_become_one_of_the_resistance() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json(&format!(
        "card a.csv {WATER} --json --uncertainty depth=0.4um --uncertainty scale=0.5% --uncertainty viscosity=1%"
    ));
    let card = card(&record);
    let depth = value(card, "/log_resistance_sensitivity/depth") * 0.4 / 40.0;
    let expected = (depth * depth + 0.02_f64.powi(2) + 0.01_f64.powi(2)).sqrt();
    assert_close(
        value(card, "/uncertainty/of_log_resistance"),
        expected,
        1e-3,
    );
    let u = card["resistance_per_length"]["u"].as_f64().unwrap();
    assert_close(u, expected * value(card, "/resistance_per_length"), 1e-3);
    assert_eq!(card["uncertainty"]["parts"].as_array().unwrap().len(), 3);
}

/// Fields of a table by head.
fn rows(text: &str, delimiter: u8) -> Vec<std::collections::BTreeMap<String, String>> {
    let mut reader = csv::ReaderBuilder::new()
        .delimiter(delimiter)
        .from_reader(text.as_bytes());
    let rows = reader.deserialize().collect::<Result<Vec<_>, _>>();
    rows.unwrap()
}

#[test]
fn tables_read_back_to_the_numbers_of_the_json_in_both_dialects() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let other = shape("made/koh_rounded.toml");
    let line = format!("card a.csv {other} {WATER} --uncertainty depth=0.3um");
    let record = folder.json(&format!("{line} --json"));
    let plain = folder.line(&format!("{line} --csv"));
    let eu = folder.line(&format!("{line} --csv --csv-locale eu"));
    assert_eq!((plain.status, eu.status), (0, 0), "{}", plain.err);
    let body = eu.out.strip_prefix('\u{feff}').unwrap();
    let (plain, eu) = (rows(&plain.out, b','), rows(body, b';'));
    assert_eq!((plain.len(), eu.len()), (2, 2));
    for (index, (row, eu)) in plain.iter().zip(&eu).enumerate() {
        let card = &record["cards"][index];
        for (head, path) in [
            ("conductance_m4", "/conductance"),
            (
                "resistance_per_length_pa_s_per_m4",
                "/resistance_per_length",
            ),
            ("inertance_per_length_kg_per_m5", "/inertance_per_length"),
            ("temperature_law_c1_1", "/temperature_law/coefficients/0"),
            (
                "dln_resistance_per_film_1_per_m",
                "/log_resistance_sensitivity/film",
            ),
            ("flow_rate_high_m3_per_s", "/validity/flow_rate_high"),
            (
                "wall_shear_p95_per_flow_rate_pa_s_per_m3",
                "/wall_shear_per_flow_rate/percentiles/4",
            ),
        ] {
            let exact = value(card, path);
            assert_eq!(
                row[head].parse::<f64>().unwrap().to_bits(),
                exact.to_bits(),
                "{head}"
            );
            let comma = eu[head].replace(',', ".");
            assert_eq!(
                comma.parse::<f64>().unwrap().to_bits(),
                exact.to_bits(),
                "{head}"
            );
            assert!(!eu[head].contains('.'), "{head}");
        }
        assert_eq!(row["source_sha256"], card["source"]["sha256"]);
        assert_eq!(row["tool_version"], eu["tool_version"]);
    }
    // Every head of a number ends in a unit.
    let texts = [
        "name",
        "kind",
        "source_path",
        "source_sha256",
        "tool_version",
        "fluid",
        "warnings",
    ];
    let units = [
        "_k", "_pa_s", "_m3", "_m4", "_1", "_m5", "_m2", "_m", "_s", "_pa",
    ];
    for head in plain[0]
        .keys()
        .filter(|head| !texts.contains(&head.as_str()))
    {
        assert!(units.iter().any(|unit| head.ends_with(unit)), "{head}");
    }
}

/// Words of Modelica text; a string is one word that starts with a quotation mark.
fn words(text: &str) -> Vec<String> {
    let mut found = Vec::new();
    let mut rest = text.chars().peekable();
    while let Some(c) = rest.next() {
        let mut word = String::from(c);
        if c == '"' {
            loop {
                // A string that is not closed ends here.
                let c = rest.next().unwrap();
                assert_ne!(c, '\n', "a string over two lines: {word}");
                match c {
                    '\\' => word.extend(rest.next()),
                    '"' => break,
                    c => word.push(c),
                }
            }
        } else if c.is_ascii_alphanumeric() || c == '_' {
            while let Some(c) = rest.next_if(|c| c.is_ascii_alphanumeric() || "._".contains(*c)) {
                word.push(c);
            }
            if word.ends_with('e') && word.starts_with(|c: char| c.is_ascii_digit()) {
                while let Some(c) = rest.next_if(|c| c.is_ascii_digit() || *c == '-') {
                    word.push(c);
                }
            }
        } else if c.is_whitespace() {
            continue;
        }
        found.push(word);
    }
    found
}

/// Checks brackets, and that every `package`, `model` and `connector` is ended by its own name.
fn assert_closed(text: &str) {
    let words = words(text);
    let mut open = Vec::new();
    let mut brackets = 0_i32;
    for pair in words.windows(2) {
        match pair[0].as_str() {
            "package" | "model" | "connector" => open.push(pair[1].clone()),
            "end" => assert_eq!(open.pop().as_ref(), Some(&pair[1])),
            "(" => brackets += 1,
            ")" => brackets -= 1,
            ";" => assert_eq!(brackets, 0),
            _ => {}
        }
        assert!(brackets >= 0);
    }
    assert!(open.is_empty(), "{open:?}");
}

#[test]
fn model_text_is_closed_whatever_the_names_are() {
    let folder = Folder::new();
    let section = |name: &str| {
        format!(
            "name = {}\nunit = \"um\"\n[[lumen]]\nouter = [[0, 0], [100, 0], [100, 40], [0, 40]]\n",
            serde_json::to_string(name).unwrap()
        )
    };
    for (file, name) in [
        ("a.toml", HOSTILE),
        ("b.toml", "model"),
        ("c.toml", "model"),
        ("d.toml", "\u{b5}-channel\n2"),
    ] {
        folder.write(file, section(name));
    }
    let run = folder.line(
        "card a.toml b.toml c.toml d.toml --fluid water --temperature 25C --cells-across 16 --modelica cards.mo --csv -q",
    );
    assert_eq!(run.status, 0, "{}", run.err);
    let table = rows(&run.out, b',');
    assert_eq!(table.len(), 4);
    assert_eq!(table[0]["name"], HOSTILE);
    let text = folder.read("cards.mo");
    assert_closed(&text);
    let words = words(&text);
    let models: Vec<&str> = words
        .windows(2)
        .filter(|pair| pair[0] == "model")
        .map(|pair| pair[1].as_str())
        .collect();
    assert_eq!(models.len(), 4);
    assert_eq!(models[1..3], ["section_model", "section_model_2"]);
    // The numbers are those of the card.
    let record =
        folder.json("card b.toml --fluid water --temperature 25C --cells-across 16 --json");
    let r = format!("{:?}", value(card(&record), "/resistance_per_length"));
    assert!(
        text.contains(&format!("R_per_length(unit = \"Pa.s/m4\") = {r} ")),
        "{r}"
    );
}

#[test]
fn a_file_that_fails_does_not_stop_the_others_and_is_told() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder.write("broken.csv", "x_um,y_um\n0,0\n1,1\n0,1\n1,0\n");
    let run = folder.line(&format!(
        "card broken.csv a.csv missing.csv {WATER} --json -q"
    ));
    assert_eq!(run.status, 3);
    let record: Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(record["cards"].as_array().unwrap().len(), 1);
    let failed = record["failed"].as_array().unwrap();
    assert_eq!(failed.len(), 2);
    assert_eq!(failed[0]["path"], "broken.csv");
    assert!(
        run.err.contains("broken.csv") && run.err.contains("missing.csv"),
        "{}",
        run.err
    );
    // One file alone: only its error.
    folder
        .line(&format!("card broken.csv {WATER} --json"))
        .assert_error(3, &["broken.csv", "help: "]);
}

#[test]
fn what_makes_no_card_is_refused_before_any_file_is_written() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (options, parts) in [
        ("", &["a card needs a fluid", "--fluid water"][..]),
        ("--fluid water", &["--temperature"]),
        (
            "--fluid water --temperature 25C --temperature-range 30C..60C",
            &["298.15 K, is outside", "10C..40C"],
        ),
        (
            "--fluid water --temperature 25C --temperature-range 60C..5C",
            &["no range"],
        ),
        (
            "--fluid water --temperature 25C --temperature-range 5..60C",
            &["--temperature-range", "unit"],
        ),
        (
            "--fluid water --temperature 25C --temperature-range 5C",
            &["is no range"],
        ),
        (
            "--fluid water --temperature 25C --temperature-range 5C..200C",
            &["IAPWS"],
        ),
        (
            "--viscosity 1mPa.s --temperature-range 5C..60C",
            &["one temperature"],
        ),
        ("--viscosity 1mPa.s --uncertainty depth", &["has no `=`"]),
        (
            "--viscosity 1mPa.s --uncertainty depth=3",
            &["with its unit", "depth=0.3um"],
        ),
        (
            "--viscosity 1mPa.s --uncertainty depth=0um",
            &["is not above zero"],
        ),
        (
            "--viscosity 1mPa.s --uncertainty depth=1um --uncertainty depth=1%",
            &["a second time"],
        ),
        (
            "--viscosity 1mPa.s --uncertainty dpeth=1um",
            &["no `dpeth`", "depth"],
        ),
        (
            "--viscosity 1mPa.s --uncertainty film=1%",
            &["must be a length"],
        ),
        (
            "--viscosity 1mPa.s --uncertainty viscosity=1um",
            &["must be a share"],
        ),
        ("--viscosity 1mPa.s - -", &["standard input"]),
        (
            "--viscosity 1mPa.s --picture a.png",
            &["--picture", "--vary"],
        ),
        (
            "--viscosity 1mPa.s --fit-error 1%",
            &["--fit-error", "--vary"],
        ),
        ("--viscosity 1e300Pa.s", &["outside the range of numbers"]),
        ("--viscosity 1mPa.s --csv --csv-locale us", &["eu"]),
    ] {
        let line = format!("card a.csv {options} -o out.json --modelica out.mo --cells-across 16");
        folder.line(&line).assert_error(2, parts);
        assert_eq!(folder.names(), ["a.csv"], "{options}");
    }
    folder
        .line("card a.csv --viscosity 1mPa.s --modelica a.csv")
        .assert_error(3, &["a.csv", "input"]);
    folder
        .line("card a.csv --viscosity 1mPa.s --modelica -")
        .assert_error(2, &["`-` names no file"]);
    // Nothing to hand over: nothing is written.
    let run = folder.line("card no.csv none.csv --viscosity 1mPa.s -o b.json --modelica b.mo");
    assert_eq!((run.status, folder.names()), (3, vec!["a.csv".to_owned()]));
    folder
        .line("card a.csv --viscosity 1mPa.s -o b.json --modelica b.json")
        .assert_error(2, &["two outputs"]);
}
