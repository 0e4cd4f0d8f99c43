//! Machine outputs against the JSON Schemas that come with the program.

use serde_json::Value;

use crate::{Folder, RECTANGLE, shape, value};

const WATER: &str = "--fluid water --temperature 25C --cells-across 32";

/// A schema in `src/report/schemas`.
struct Schema(jsonschema::Validator);

impl Schema {
    fn of(name: &str) -> Self {
        let folder = std::path::Path::new(env!("CARGO_MANIFEST_DIR")).join("src/report/schemas");
        let text = std::fs::read_to_string(folder.join(format!("{name}.schema.json"))).unwrap();
        let schema: Value = serde_json::from_str(&text).unwrap();
        assert_eq!(
            schema["$schema"],
            "https://json-schema.org/draft/2020-12/schema"
        );
        Self(jsonschema::validator_for(&schema).unwrap())
    }

    fn is_met_by(&self, record: &Value, what: &str) {
        let errors: Vec<String> = self
            .0
            .iter_errors(record)
            .map(|error| format!("{}: {error}", error.instance_path()))
            .collect();
        assert!(errors.is_empty(), "{what}: {errors:#?}");
    }
}

#[test]
fn every_card_meets_its_schema_and_a_wrong_one_does_not() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let schema = Schema::of("card");
    let printed = folder.json("card --print-schema");
    assert_eq!(printed["title"], "etchwise-card/1");
    let reach = shape("made/stylus_groove.toml");
    for line in [
        format!("card a.csv {WATER} --json --uncertainty depth=0.3um"),
        "card a.csv --viscosity 5mPa.s --cells-across 32 --json".to_owned(),
        "card a.csv --fluid air --temperature 20C --cells-across 32 --json".to_owned(),
        format!("card a.csv {WATER} --json --film 1um"),
        format!(
            "card {reach} a.csv --viscosity 1mPa.s --density 1000kg/m^3 --cells-across 32 --json"
        ),
    ] {
        schema.is_met_by(&folder.json(&line), &line);
    }
    let mut wrong = folder.json(&format!("card a.csv {WATER} --json"));
    wrong["cards"][0]["resistance_per_length"]["unit"] = "kPa".into();
    assert!(!schema.0.is_valid(&wrong));
    wrong["cards"][0]["resistance_per_length"] =
        serde_json::json!({ "value": null, "unit": "Pa s/m^4" });
    assert!(!schema.0.is_valid(&wrong));
}

#[test]
fn a_route_and_its_card_meet_their_schemas() {
    let folder = Folder::new();
    let route = shape("routes/wafer_channel.toml");
    for fluid in [
        "--fluid water --temperature 25C --flow-rate 5uL/min",
        "--viscosity 2mPa.s --pressure-drop 10kPa",
    ] {
        let line = format!("route {route} {fluid} --cells-across 16 --json --card card.json -q");
        let run = folder.line(&line);
        assert!([0, 5].contains(&run.status), "{line}: {}", run.err);
        let record: Value = serde_json::from_str(&run.out).unwrap();
        Schema::of("route").is_met_by(&record, &line);
        let card: Value = serde_json::from_str(&folder.read("card.json")).unwrap();
        Schema::of("card").is_met_by(&card, &line);
        let card = &card["cards"][0];
        assert_eq!(card["kind"], "route");
        assert_eq!(
            card["temperature_law"].is_null(),
            fluid.contains("viscosity")
        );
    }
}

#[test]
fn response_tables_meet_their_schema() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let schema = Schema::of("response");
    for line in [
        "card rectangle --vary width=80..100um --with height=40um --fit-error 1% --fresh-points 10 --json",
        "card a.csv --vary film=0..1um --fit-error 1% --fresh-points 10 --viscosity 1mPa.s --json",
    ] {
        schema.is_met_by(&folder.json(line), line);
    }
}

/// The commands in the head of a shipped net: words behind `etchwise`, and the file that they make.
fn makers(net: &str) -> Vec<(Vec<String>, String)> {
    net.lines()
        .filter_map(|line| {
            line.trim_start_matches(['#', ' '])
                .strip_prefix("etchwise ")
        })
        .map(|line| {
            let words: Vec<String> = line.split_whitespace().map(str::to_owned).collect();
            let made = words.last().cloned().unwrap_or_default();
            (words, made)
        })
        .collect()
}

#[test]
fn shipped_cards_are_what_their_commands_make_now() {
    let net = std::fs::read_to_string(shape("networks/chip.toml")).unwrap();
    let made = makers(&net);
    assert_eq!(made.len(), 2);
    for (words, name) in made {
        let folder = Folder::new();
        let words: Vec<String> = words
            .into_iter()
            .map(|word| match word.strip_prefix("shapes/") {
                Some(file) => shape(file),
                None => word,
            })
            .collect();
        let words: Vec<&str> = words.iter().map(String::as_str).collect();
        let run = folder.run(&words);
        assert_eq!(run.status, 0, "{name}: {}", run.err);
        let fresh: Value = serde_json::from_str(&folder.read(&name)).unwrap();
        let shipped = std::fs::read_to_string(shape(&format!("networks/{name}"))).unwrap();
        let shipped: Value = serde_json::from_str(&shipped).unwrap();
        Schema::of("card").is_met_by(&shipped, &name);
        for path in [
            "/resistance_per_length",
            "/resistance",
            "/volume_per_length",
            "/volume",
            "/temperature_law/coefficients/0",
        ] {
            let [a, b] = [&fresh, &shipped].map(|all| value(&all["cards"][0], path));
            assert_eq!(a.is_nan(), b.is_nan(), "{name} {path}");
            assert!(
                a.is_nan() || (a / b - 1.0).abs() < 1e-9,
                "{name} {path}: {a} {b}"
            );
        }
        let [a, b] = [&fresh, &shipped].map(|all| all["cards"][0]["source"]["sha256"].clone());
        assert_eq!(a, b, "{name}");
    }
}

#[test]
fn nets_meet_their_schema_and_the_one_they_print_is_the_one_that_is_shipped() {
    let folder = Folder::new();
    let schema = Schema::of("network");
    for net in ["chip", "manifold"] {
        let line = format!("network {} --json", shape(&format!("networks/{net}.toml")));
        schema.is_met_by(&folder.json(&line), &line);
    }
    let printed = folder.json("network --print-schema");
    assert!(printed["$schema"].is_string());
}
