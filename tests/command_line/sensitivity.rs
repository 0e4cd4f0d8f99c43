//! `etchwise sensitivity`: text, JSON, CSV, files, and what is refused.

use serde_json::Value;

use crate::{Folder, RECTANGLE, assert_close, value};

/// The case of that name.
fn case<'a>(record: &'a Value, name: &str) -> &'a Value {
    let cases = record["sensitivities"].as_array().unwrap();
    cases.iter().find(|case| case["name"] == name).unwrap()
}

#[test]
fn text_names_every_case_says_what_moves_and_how_it_was_checked() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let run = folder.line("sensitivity a.csv --ascii --verbose");
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    assert!(run.out.is_ascii());
    // However wide the columns are.
    let out = run.out.split_whitespace().collect::<Vec<_>>().join(" ");
    for part in [
        "scale +1 % +4.000 % -4.000 %",
        "depth +1 um +6.66",
        "wall_angle +1 deg",
        "lid_gap: the lid, all walls facing up, rises as one piece",
        "K, new solves",
        "depth and width together dlnK = ",
        "moving the whole section",
        "K(q) = K (1 + a q + b q^2/2)",
    ] {
        assert!(out.contains(part), "`{part}` not in:\n{}", run.out);
    }
    let plain = folder.line("sensitivity a.csv --no-check");
    assert!(!plain.out.contains("off by        +/-"), "{}", plain.out);
    assert!(plain.out.contains("(--no-check)"), "{}", plain.out);
    let hasty = folder.line("sensitivity a.csv --max-seconds 1e-9");
    assert_eq!(hasty.status, 5, "{}", hasty.err);
    assert!(
        hasty.out.contains("would end after --max-seconds"),
        "{}",
        hasty.out
    );
    let patient = folder.line("sensitivity a.csv --max-seconds 1e300");
    assert_eq!(patient.status, 0, "{}", patient.err);
    assert!(patient.out.contains("off by"), "{}", patient.out);
}

#[test]
fn json_has_every_number_with_its_unit_and_the_check() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let record = folder.json("sensitivity a.csv --json");
    assert_eq!(record["schema"], "etchwise-sensitivity/1");
    let depth = case(&record, "depth");
    let dln = value(depth, "/dln_conductance");
    assert_close(value(depth, "/dln_resistance"), -dln, 1e-15);
    // The depth is 40 um.
    assert_close(
        value(depth, "/dln_conductance_per_micrometre"),
        dln / 40.0,
        1e-12,
    );
    assert_close(value(depth, "/check/dln_conductance"), dln, 1e-3);
    assert!(value(depth, "/check/relative_difference").abs() < 1e-3);
    assert_eq!(depth["check"]["second_order"]["unit"], "1");
    let film = case(&record, "film");
    assert_eq!(film["change_unit"], "m");
    assert_eq!(film["dln_conductance"]["unit"], "1/m");
    assert_eq!(film["check"]["second_order"]["unit"], "1/m^2");
    let k = value(&record, "/conductance");
    assert_close(
        value(film, "/d_conductance"),
        k * value(film, "/dln_conductance"),
        1e-12,
    );
    let angle = case(&record, "wall_angle");
    assert_close(
        value(angle, "/dln_conductance_per_degree"),
        value(angle, "/dln_conductance").to_radians(),
        1e-12,
    );
    assert!(angle["dln_conductance_per_micrometre"]["absent_because"].is_string());
    assert_close(
        value(&record, "/identities/depth_and_width/computed"),
        4.0,
        2e-4,
    );
    let plain = folder.json("sensitivity a.csv --json --no-check");
    assert!(case(&plain, "film")["check"].is_null());
    assert!(case(&plain, "film")["check_absent_because"].is_string());
    assert!(plain["check_grid"].is_null());
    assert!(plain["absent_because"]["check_grid"].is_string());
}

#[test]
fn results_do_not_depend_on_the_number_of_threads() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let one = folder.line("sensitivity a.csv --csv --threads 1 --cells-across 32");
    let two = folder.line("sensitivity a.csv --csv --threads 2 --cells-across 32");
    assert_eq!(one.out, two.out);
}

#[test]
fn csv_has_one_row_for_each_case_also_for_those_that_are_not_there() {
    let folder = Folder::with("v.csv", "x_um,y_um\n0,0\n50,-60\n100,0\n");
    let run = folder.line("sensitivity v.csv --csv --no-check");
    assert_eq!(run.status, 0, "{}", run.err);
    let mut reader = csv::Reader::from_reader(run.out.as_bytes());
    let heads = reader.headers().unwrap().clone();
    let column = |name: &str| heads.iter().position(|head| head == name).unwrap();
    let (name, dln, reason) = (
        column("case"),
        column("dln_conductance_per_change"),
        column("absent_because"),
    );
    let rows: Vec<csv::StringRecord> = reader.records().map(Result::unwrap).collect();
    assert_eq!(rows.len(), 11);
    for row in &rows {
        let is_absent = &row[name] == "floor";
        assert_eq!(row[dln].parse::<f64>().is_ok(), !is_absent, "{row:?}");
        let expected = if is_absent {
            "45 degrees"
        } else {
            "not asked for"
        };
        assert!(row[reason].contains(expected), "{row:?}");
    }
}

#[test]
fn a_wall_named_in_the_section_file_has_a_case_of_its_own() {
    let file = "unit = \"um\"\n[[lumen]]\nouter = [[0,0],[100,0],[100,40],[0,40]]\n\
                [[wall]]\nname = \"heated\"\nfrom = [0, 0]\nto = [100, 0]\n";
    let folder = Folder::with("a.toml", file);
    let record = folder.json("sensitivity a.toml --json --no-check");
    assert_close(
        value(case(&record, "wall heated"), "/dln_conductance"),
        value(case(&record, "floor"), "/dln_conductance"),
        1e-12,
    );
}

#[test]
fn wall_and_pictures_are_written_beside_the_result() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let run =
        folder.line("sensitivity a.csv --no-check --json --vtk w --picture a.svg --picture a.png");
    assert_eq!(
        (run.status, run.err.as_str()),
        (0, "wrote w.vtp\nwrote a.svg\nwrote a.png\n")
    );
    assert_eq!(folder.names(), ["a.csv", "a.png", "a.svg", "w.vtp"]);
    let wall = folder.read("w.vtp");
    for array in ["wall_shear", "sensitivity", "normal"] {
        assert!(wall.contains(&format!("Name=\"{array}\"")), "{array}");
    }
    let picture = folder.read("a.svg");
    for part in [
        "sensitivity of the conductance",
        "largest",
        "change of K in %",
        "20 \u{b5}m",
    ] {
        assert!(picture.contains(part), "{part}");
    }
}

#[test]
fn a_re_entrant_corner_is_warned_of() {
    let folder = Folder::with("l.csv", "x_um,y_um\n0,0\n80,0\n80,40\n40,40\n40,80\n0,80\n");
    let run = folder.line("sensitivity l.csv --no-check --deny-warnings");
    assert_eq!(run.status, 1, "{}", run.err);
    assert!(
        run.out
            .contains("sensitivity_singular: the local sensitivity has no bound")
    );
}

#[test]
fn wrong_use_ends_with_one_clear_error() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (line, status, parts) in [
        ("a.csv --fluid water", 2, &["--fluid"][..]),
        ("a.csv --csv --json", 2, &["cannot be used with"]),
        ("a.csv --cells-across 2", 2, &["the least is 4"]),
        ("a.csv --picture a.bmp", 2, &[".png or .svg"]),
        ("a.csv --vtk .", 2, &["does not end in a name"]),
        ("a.csv -o a.csv", 3, &["is an input file"]),
        ("b.csv", 3, &["no such file"]),
    ] {
        folder
            .line(&format!("sensitivity {line}"))
            .assert_error(status, parts);
        assert_eq!(folder.names(), ["a.csv"], "{line}");
    }
    let bow_tie = Folder::with("x.csv", "x_um,y_um\n0,0\n10,10\n10,0\n0,10\n");
    bow_tie
        .line("sensitivity x.csv")
        .assert_error(3, &["cannot be used"]);
}
