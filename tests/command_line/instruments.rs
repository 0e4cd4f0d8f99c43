//! Files of instruments: traces, height maps and pictures, straight to a result and by way of section files.

use serde_json::Value;

use crate::{Folder, value};

/// An upright channel, 100 um by 30 um, between level lands.
fn groove(names: &str, unit: f64) -> String {
    let rows = (0..300).map(|k| {
        let z = if k > 100 && k < 200 {
            -30.0 * unit
        } else {
            0.0
        };
        format!("{k},{z}\n")
    });
    format!("{names}\n{}", rows.collect::<String>())
}

fn json(text: &str) -> Value {
    serde_json::from_str(text).unwrap()
}

/// A number without a unit of its own.
fn bound(result: &Value, path: &str) -> f64 {
    result.pointer(path).and_then(Value::as_f64).unwrap()
}

fn shipped(name: &str) -> String {
    format!("{}/shapes/{name}", env!("CARGO_MANIFEST_DIR"))
}

#[test]
fn a_trace_is_solved_as_its_section_is() {
    let folder = Folder::with("a.csv", groove("x_um,z_nm", 1e3));
    let direct = folder.line("solve a.csv --json --quiet");
    assert_eq!(direct.status, 0, "{}", direct.err);
    let written = folder.line("trace a.csv -o a.toml --quiet --no-solve");
    assert_eq!(written.status, 0, "{}", written.err);
    let solved = folder.line("solve a.toml --json --quiet");
    let (direct, solved) = (json(&direct.out), json(&solved.out));
    let k = value(&direct, "/conductance");
    assert!((value(&solved, "/conductance") / k - 1.0).abs() < 1e-9);
    // Area of the trapezoid that a wall between two samples makes.
    assert!((value(&direct, "/section/area") / 2970e-12 - 1.0).abs() < 1e-6);
    assert_eq!(direct.pointer("/source/kind"), Some(&Value::from("trace")));
    let steps = direct["steps"].as_array().unwrap();
    for what in ["units", "lands", "levelling", "lid"] {
        assert!(steps.iter().any(|step| step["what"] == what), "{what}");
    }
    let file = std::fs::read_to_string(folder.path("a.toml")).unwrap();
    let sha = direct["source"]["sha256"].as_str().unwrap();
    assert!(file.contains(sha) && file.contains("levelling"), "{file}");
}

#[test]
fn a_section_file_goes_through_a_pipe() {
    let folder = Folder::with("a.csv", groove("x_um,z_um", 1.0));
    let run = folder.line("trace a.csv -o - --no-solve");
    assert_eq!(run.status, 0);
    assert!(
        run.out.starts_with("name = ") && run.err.contains("1. columns"),
        "{}",
        run.out
    );
}

#[test]
fn no_unit_is_guessed_and_no_choice_made_in_silence() {
    let mut two = groove("x_um,z_um", 1.0);
    for line in groove("x_um,z_um", 1.0).lines().skip(1) {
        let (x, z) = line.split_once(',').unwrap();
        two.extend([
            &(x.parse::<f64>().unwrap() + 300.0).to_string(),
            ",",
            z,
            "\n",
        ]);
    }
    let folder = Folder::with("bare.csv", groove("x,z", 1.0));
    std::fs::write(folder.path("two.csv"), two).unwrap();
    std::fs::write(folder.path("a.csv"), groove("x_um,z_um", 1.0)).unwrap();
    for (line, status, parts) in [
        ("solve bare.csv", 3, &["no unit", "--x-unit um"][..]),
        ("solve a.csv --x-unit mm", 3, &["`um`", "`mm`"]),
        ("solve two.csv", 3, &["2 channels", "--groove 1"]),
        ("solve two.csv --groove 9", 3, &["no groove 9"]),
        ("trace a.csv --crop 0,0,9,9", 2, &["--crop", "no meaning"]),
        ("trace a.csv --tip-radius -1um", 2, &["--tip-radius"]),
        ("trace a.csv --z-unit furlong", 2, &["furlong", "um"]),
        ("trace a.csv -o a.csv", 3, &["a.csv", "input"]),
        (
            "solve a.csv --repeat bare.csv -o bare.csv",
            3,
            &["bare.csv", "input"],
        ),
        ("image a.csv --scale 1um", 3, &["PNG"]),
        ("trace a.csv --level-on 5um..1um", 2, &["--level-on"]),
    ] {
        let run = folder.line(line);
        run.assert_error(status, parts);
        let has_remedy = run.err.contains("help: ") || run.err.contains("; name another");
        assert!(has_remedy, "{line}: {}", run.err);
    }
    assert_eq!(folder.line("solve two.csv --groove 2 --quiet").status, 0);
}

#[test]
fn lids_on_lands_of_different_height_are_compared() {
    let rows = (0..300).map(|k| match k {
        0..=100 => format!("{k},0\n"),
        101..200 => format!("{k},-30\n"),
        _ => format!("{k},-2\n"),
    });
    let folder = Folder::with("a.csv", format!("x_um,z_um\n{}", rows.collect::<String>()));
    let solved = |film: &str| {
        let line = format!("solve a.csv --level none --json --quiet {film}");
        json(&folder.line(&line).out)
    };
    let change = |result: &Value, option: &str| {
        let others = result["alternatives"].as_array().unwrap();
        let row = others.iter().find(|row| row["option"] == option).unwrap();
        value(row, "/relative_change")
    };
    let result = solved("");
    let [left, right] = ["--lid left", "--lid right"].map(|option| change(&result, option));
    assert!(left > 0.05 && right < -0.05, "{left} {right}");
    // A film leaves less depth, of which the same difference is a larger share.
    let filmed = solved("--film 3um");
    let [thin_left, thin_right] = ["--lid left", "--lid right"].map(|o| change(&filmed, o));
    assert!(thin_left > 1.05 * left, "{thin_left} {left}");
    assert!(thin_right < 1.05 * right, "{thin_right} {right}");
    let warnings = result["warnings"].as_array().unwrap();
    assert!(warnings.iter().any(|w| w["code"] == "lands_differ"));
}

#[test]
fn every_channel_of_a_mould_gets_a_file_and_the_picture_shows_them() {
    let folder = Folder::new();
    let mould = shipped("traces/mould_ridges.csv");
    let run = folder.run(&[
        "trace",
        &mould,
        "--invert",
        "--json",
        "--quiet",
        "-o",
        "m.toml",
        "--picture",
        "m.svg",
    ]);
    assert_eq!(run.status, 0, "{}", run.err);
    let result = json(&run.out);
    let sections = result["sections"].as_array().unwrap();
    assert_eq!(sections.len(), 3);
    // Heights as the file was made up, within the drift it was given.
    for (section, depth) in sections.iter().zip([30.0, 29.2, 31.1]) {
        let found = value(section, "/measures/step_height") * 1e6;
        assert!((found - depth).abs() < 0.3, "{found} {depth}");
        assert!(bound(section, "/conductance/low") <= bound(section, "/conductance/high"));
    }
    for name in ["m-1.toml", "m-2.toml", "m-3.toml"] {
        assert_eq!(folder.run(&["check", name]).status, 0, "{name}");
    }
    let picture = std::fs::read_to_string(folder.path("m.svg")).unwrap();
    assert!(picture.contains("<svg") && picture.contains("grooves (3)"));
}

#[test]
fn a_flank_that_shows_the_tip_gives_a_reach_around_the_truth() {
    let folder = Folder::new();
    let trench = shipped("traces/deep_trench.csv");
    let run = folder.run(&[
        "solve",
        &trench,
        "--tip-radius",
        "1um",
        "--tip-angle",
        "60deg",
        "--json",
        "--quiet",
    ]);
    assert_eq!(run.status, 0, "{}", run.err);
    let result = json(&run.out);
    // 100 um by 50 um upright, as the file was made up; K of the rectangle by the series, White (2006), equation
    // 3-48 (from memory): a b^3 / 12 (1 - 0.63 b / a + 0.052 (b / a)^5), within 0.1 %.
    let truth = 100e-6 * 50e-6_f64.powi(3) / 12.0 * (1.0 - 0.63 * 0.5 + 0.052 * 0.5_f64.powi(5));
    let low = bound(&result, "/reach/conductance/low");
    let high = bound(&result, "/reach/conductance/high");
    assert!(
        low < truth && truth < 1.001 * high,
        "{low:e} {truth:e} {high:e}"
    );
    assert!(low < 0.6 * truth && high < 1.05 * truth);
}

#[test]
fn maps_and_pictures_of_the_shipped_kind_come_out_as_they_were_made() {
    let folder = Folder::new();
    let map = shipped("maps/etched_glass.sdf");
    let result = json(
        &folder
            .run(&["map", &map, "--json", "--quiet", "--no-solve"])
            .out,
    );
    let depth = value(&result, "/sections/0/measures/floor_depth");
    assert!((depth / 18e-6 - 1.0).abs() < 2e-3, "{depth}");
    let turned = result["steps"]
        .as_array()
        .unwrap()
        .iter()
        .find(|s| s["what"] == "direction");
    assert!(turned.unwrap()["text"].as_str().unwrap().contains("20.0"));
    let picture = shipped("pictures/etched_section.png");
    let result = json(
        &folder
            .run(&["image", &picture, "--json", "--quiet", "--no-solve"])
            .out,
    );
    // Flat floor of 60 um between quarter circles of 38 um.
    let area = 60.0 * 38.0 + std::f64::consts::FRAC_PI_2 * 38.0_f64.powi(2);
    let found = value(&result, "/sections/0/section/area") * 1e12;
    assert!((found / area - 1.0).abs() < 2e-3, "{found} {area}");
}

#[test]
fn heights_of_a_map_without_a_groove_are_written_all_the_same() {
    let rows = "1.5 1.5 1.5 1.5 1.5 1.5 1.5 1.5 1.5 1.5\n".repeat(12);
    let head = "# Width: 100 um\n# Height: 100 um\n# Value units: um\n";
    let folder = Folder::with("flat.txt", format!("{head}{rows}"));
    let run = folder.line("map flat.txt --heights h.csv --no-solve");
    assert_eq!(run.status, 3, "{}", run.err);
    assert!(run.err.contains("no groove direction"), "{}", run.err);
    let table = std::fs::read_to_string(folder.path("h.csv")).unwrap();
    assert_eq!(table.lines().count(), 12);
    for number in table.lines().flat_map(|line| line.split(',')) {
        assert!((number.parse::<f64>().unwrap() - 1.5e-6).abs() < 1e-18);
    }
}

#[test]
fn a_cut_that_gives_no_section_says_how_the_grooves_of_its_map_run() {
    // One step and no more: the groove goes on beyond the map.
    let row = format!("{}{}\n", "1 ".repeat(30), "4 ".repeat(30));
    let head = "# Width: 60 um\n# Height: 40 um\n# Value units: um\n";
    let folder = Folder::with("step.txt", format!("{head}{}", row.repeat(40)));
    let run = folder.line("map step.txt");
    assert_eq!(run.status, 3, "{}", run.err);
    let words = "the cut runs across grooves at 90.0 degrees against the x axis";
    assert!(run.err.contains(words), "{}", run.err);
    assert!(run.err.contains("help: "), "{}", run.err);
}

#[test]
fn a_single_spike_on_a_land_is_listed_and_no_warning() {
    let spoilt = groove("x_um,z_um", 1.0).replace("\n50,0\n", "\n50,4\n");
    let folder = Folder::with("a.csv", spoilt);
    let run = folder.line("trace a.csv --json --quiet --no-solve --deny-warnings --picture a.svg");
    assert_eq!(run.status, 0, "{}{}", run.out, run.err);
    let result = json(&run.out);
    let steps = result["steps"].as_array().unwrap();
    let bridge = steps.iter().find(|step| step["what"] == "bridge").unwrap();
    assert!((bound(bridge, "/numbers/from_m") - 49e-6).abs() < 1e-12);
    assert!((bound(bridge, "/numbers/size_m") - 4e-6).abs() < 1e-12);
    let text = bridge["text"].as_str().unwrap();
    assert!(text.contains("spike of 1 sample(s), 4.000"), "{text}");
    assert!(
        folder
            .line("trace a.csv --no-solve")
            .out
            .contains("from 49.00")
    );
    // The same samples missing on the wall may move the section.
    let spoilt = groove("x_um,z_um", 1.0).replace("\n100,0\n", "\n100,nan\n");
    let folder = Folder::with("a.csv", spoilt);
    let run = folder.line("trace a.csv --no-solve --deny-warnings");
    assert_eq!(run.status, 1, "{}", run.err);
    assert!(run.out.contains("samples_bridged"), "{}", run.out);
}

#[test]
fn settings_are_told_on_standard_error_only() {
    let folder = Folder::with("a.csv", groove("x_um,z_um", 1.0));
    let run = folder.line("solve a.csv --json --quiet --show-settings --cutoff 8um");
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(
        run.err.contains("--cutoff") && run.err.contains("8um") && run.err.contains("not given")
    );
    json(&run.out);
}
