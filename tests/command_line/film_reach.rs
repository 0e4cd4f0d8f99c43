//! A film on the walls and the reach bracket, as the program tells of them.

use serde_json::Value;

use crate::{Folder, RECTANGLE, RECTANGLE_CONDUCTANCE, assert_close, shape, value};

/// A rectangle whose depth is known to lie between two others.
const WITH_REACH: &str = r#"
name = "r"
unit = "um"
[[lumen]]
outer = [[0, 0], [100, 0], [100, 40], [0, 40]]
[reach]
reason = "floor not seen."
[[reach.inner]]
outer = [[0, 1], [100, 1], [100, 40], [0, 40]]
[[reach.outer]]
outer = [[0, -1], [100, -1], [100, 40], [0, 40]]
"#;

/// A dumbbell with a neck 4 um wide, micrometres.
const DUMBBELL: &str =
    "x_um,y_um\n0,0\n40,0\n40,18\n60,18\n60,0\n100,0\n100,40\n60,40\n60,22\n40,22\n40,40\n0,40\n";

fn rectangle(width: f64, height: f64) -> String {
    format!("x_um,y_um\n0,0\n{width},0\n{width},{height}\n0,{height}\n")
}

#[test]
fn a_film_on_a_rectangle_leaves_the_smaller_rectangle() {
    let folder = Folder::with("r.csv", RECTANGLE);
    folder.write("s.csv", rectangle(99.0, 39.0));
    let filmed = folder.json("solve r.csv --json --film 0.5um --cells-across 64");
    let drawn = folder.json("solve s.csv --json --cells-across 64");
    let k = |record: &Value| value(record, "/conductance");
    assert_close(k(&filmed), k(&drawn), 1e-9);
    let film = &filmed["film"];
    assert_close(value(&filmed, "/film/thickness"), 0.5e-6, 1e-12);
    assert_eq!(film["on"], "all");
    assert_close(value(&filmed, "/film/area_before"), 4e-9, 1e-12);
    assert_close(value(&filmed, "/section/area"), 99e-6 * 39e-6, 1e-12);
    assert_eq!(film["lumens_before"]["value"], 1);
    assert!(drawn["film"].is_null());
    assert!(drawn["absent_because"]["film"].is_string());
    // On the floor the depth alone is less.
    folder.write("t.csv", rectangle(100.0, 39.5));
    let floor = folder.json("solve r.csv --json --film 0.5um --film-on floor --cells-across 64");
    let drawn = folder.json("solve t.csv --json --cells-across 64");
    assert_close(k(&floor), k(&drawn), 1e-9);
    assert_eq!(floor["film"]["on"], "floor");
}

#[test]
fn the_text_tells_what_the_film_did() {
    let folder = Folder::with("d.csv", DUMBBELL);
    let run = folder.line("solve d.csv --film 3um --ascii --cells-across 32");
    assert_eq!(run.status, 0, "{}", run.err);
    for words in [
        "Film of 3.000 um on all walls; everything below is of the section that remains",
        "1 before, 2 after",
        "1 split",
        "% less",
    ] {
        assert!(run.out.contains(words), "{words}\n{}", run.out);
    }
    let csv = folder.line("solve d.csv --film 3um --csv --cells-across 32");
    let mut reader = csv::Reader::from_reader(csv.out.as_bytes());
    let heads = reader.headers().unwrap().clone();
    let row = reader.records().next().unwrap().unwrap();
    let of = |name: &str| &row[heads.iter().position(|h| h == name).unwrap()];
    assert_eq!(of("film_on"), "all");
    assert_close(of("film_thickness_m").parse().unwrap(), 3e-6, 1e-12);
    assert_close(of("area_before_film_m2").parse().unwrap(), 3280e-12, 1e-12);
    assert_eq!(of("conductance_reach_low_m4"), "");
}

#[test]
fn a_film_that_closes_the_section_or_is_absurd_is_refused() {
    let folder = Folder::with("r.csv", RECTANGLE);
    let closed = folder.line("solve r.csv --film 20um");
    assert_eq!(closed.status, 4);
    assert!(
        closed
            .err
            .contains("the film closes the section: the largest circle that fits has radius 20 um, the film is 20 um thick"),
        "{}",
        closed.err
    );
    for (line, status, words) in [
        ("solve r.csv --film 1000m", 4, "closes the section"),
        ("solve r.csv --film 1e300m", 4, "closes the section"),
        (
            "solve r.csv --film 1e300m --film-on lid",
            4,
            "closes the section",
        ),
        ("solve r.csv --film 0um", 2, "not above zero"),
        ("solve r.csv --film=-1um", 2, "not above zero"),
        ("solve r.csv --film 0.5", 2, "unit"),
        ("solve r.csv --film nanum", 2, "--film"),
        ("solve r.csv --film 1e-9nm", 2, "below the rounding"),
        ("solve r.csv --film-on floor", 2, "--film"),
        ("solve r.csv --film 1um --film-on wall", 2, "floor"),
    ] {
        let run = folder.line(line);
        assert_eq!(run.status, status, "{line}: {}", run.err);
        assert!(run.err.contains(words), "{line}: {}", run.err);
    }
    // A diamond has no floor within 45 degrees but for its corners.
    folder.write("d.csv", "x_um,y_um\n0,0\n10,30\n0,60\n-10,30\n");
    let run = folder.line("solve d.csv --film 1um --film-on floor");
    assert_eq!(run.status, 4);
    assert!(
        run.err.contains("no wall of the section faces up"),
        "{}",
        run.err
    );
}

#[test]
fn the_reach_bracket_lies_between_the_proven_values_of_its_neighbours() {
    let folder = Folder::with("r.toml", WITH_REACH);
    let line = "solve r.toml --json --viscosity 1mPa.s --length 20mm --cells-across 64";
    let record = folder.json(line);
    let (low, high) = (
        record["reach"]["conductance"]["low"].as_f64().unwrap(),
        record["reach"]["conductance"]["high"].as_f64().unwrap(),
    );
    for (height, bound) in [(39.0, low), (41.0, high)] {
        folder.write("s.csv", rectangle(100.0, height));
        let drawn = folder.json("solve s.csv --json --cells-across 64");
        assert_close(value(&drawn, "/conductance"), bound, 1e-3);
        let side = if height < 40.0 { "inner" } else { "outer" };
        let area = value(&record, &format!("/reach/{side}/area"));
        assert_close(area, 100e-6 * height * 1e-6, 1e-12);
    }
    let k = value(&record, "/conductance");
    assert_close(k, RECTANGLE_CONDUCTANCE, 1e-5);
    assert!(low < record["conductance"]["low"].as_f64().unwrap());
    assert!(high > record["conductance"]["high"].as_f64().unwrap());
    let width = value(&record, "/reach/relative_width");
    assert_close(width, 2.0 * (high - low) / (high + low), 1e-12);
    let resistance = &record["reach"]["resistance"];
    assert_close(resistance["high"].as_f64().unwrap(), 2e-5 / low, 1e-12);
    assert_close(resistance["low"].as_f64().unwrap(), 2e-5 / high, 1e-12);
    assert_eq!(record["reach"]["reason"], "floor not seen.");
    let text = folder.line("solve r.toml --ascii --cells-across 32").out;
    for words in [
        "Reach: the smallest and the largest section it could be",
        "K, inner section, proven",
        "K within reach",
        "Reason given: floor not seen.",
    ] {
        assert!(text.contains(words), "{words}\n{text}");
    }
}

#[test]
fn without_a_reach_the_reason_is_told_and_one_side_may_be_the_section_itself() {
    let folder = Folder::with("r.csv", RECTANGLE);
    let record = folder.json("solve r.csv --json --cells-across 16");
    assert!(record["reach"].is_null());
    assert!(record["absent_because"]["reach"].is_string());
    let (one_sided, _) = WITH_REACH.split_once("[[reach.outer]]").unwrap();
    folder.write("one.toml", one_sided);
    let record = folder.json("solve one.toml --json --cells-across 16");
    assert_eq!(record["reach"]["inner"]["is_given"], true);
    assert_eq!(record["reach"]["outer"]["is_given"], false);
    assert_eq!(
        record["reach"]["conductance"]["high"],
        record["conductance"]["high"]
    );
}

#[test]
fn sections_in_the_wrong_order_end_with_the_place() {
    let swapped = WITH_REACH
        .replace("reach.inner", "reach.x")
        .replace("reach.outer", "reach.inner")
        .replace("reach.x", "reach.outer");
    let folder = Folder::with("r.toml", swapped);
    let run = folder.line("solve r.toml");
    assert_eq!(run.status, 3);
    assert!(
        run.err
            .contains("the inner section is not inside the section:"),
        "{}",
        run.err
    );
    assert!(run.err.contains(" um\nhelp: "), "{}", run.err);
    folder.write("o.toml", WITH_REACH.replace("[100, -1]", "[100, 1]"));
    let run = folder.line("solve o.toml");
    assert_eq!(run.status, 3);
    assert!(
        run.err.contains(
            "the section is not inside the outer section: its outer loop of lumen 1 crosses"
        ),
        "{}",
        run.err
    );
    // An outline of the reach that crosses itself.
    folder.write(
        "x.toml",
        WITH_REACH.replace("[[0, 1], [100, 1]", "[[100, 1], [0, 1]"),
    );
    let run = folder.line("solve x.toml");
    assert_eq!(run.status, 3);
    assert!(
        run.err.contains("reach.inner: the outline cannot be used"),
        "{}",
        run.err
    );
}

#[test]
fn a_film_goes_on_all_three_sections() {
    let folder = Folder::with("r.toml", WITH_REACH);
    for on in ["all", "floor", "lid"] {
        let line = format!("solve r.toml --json --film 2um --film-on {on} --cells-across 32");
        let record = folder.json(&line);
        let area = |path: &str| value(&record, path);
        let (inner, own, outer) = (
            area("/reach/inner/area"),
            area("/section/area"),
            area("/reach/outer/area"),
        );
        assert!(inner < own && own < outer);
        let width = if on == "all" { 96e-6 } else { 100e-6 };
        assert_close(outer - inner, 2e-6 * width, 1e-3);
    }
    let shipped = shape("made/stylus_groove.toml");
    let run = folder.run(&["solve", &shipped, "--film", "1um", "--json"]);
    assert_eq!(run.status, 0, "{}", run.err);
}
