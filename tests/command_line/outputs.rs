//! Where results go: streams, files, nothing half written, nothing overwritten that was read.

use std::fs;
use std::io::Read;
use std::process::Stdio;

use crate::{Folder, RECTANGLE};

#[test]
fn results_go_to_standard_output_and_talk_to_standard_error() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let run = folder.line("solve a.csv --json --picture a.png --vtk a");
    assert!(serde_json::from_str::<serde_json::Value>(&run.out).is_ok());
    assert_eq!(run.err, "wrote a.vti\nwrote a.vtp\nwrote a.png\n");
    let quiet = folder.line("solve a.csv --json --picture a.png --vtk a -q");
    assert_eq!(quiet.err, "");
    // A dot in the begin of a name stays; the extension of a viewer's file is not doubled.
    for (asked, written) in [("b.vti", "b"), ("c.VTP", "c"), ("run1.2", "run1.2")] {
        let run = folder.line(&format!("solve a.csv --json --vtk {asked}"));
        assert_eq!(
            run.err,
            format!("wrote {written}.vti\nwrote {written}.vtp\n")
        );
    }
    let file = folder.line("solve a.csv --json -o a.json");
    assert_eq!(
        (file.out.as_str(), file.err.as_str()),
        ("", "wrote a.json\n")
    );
    assert!(serde_json::from_str::<serde_json::Value>(&folder.read("a.json")).is_ok());
    // Errors are said even when quiet.
    folder
        .line("solve b.csv -q")
        .assert_error(3, &["no such file"]);
}

#[test]
fn the_wall_shear_goes_to_a_table_and_a_picture() {
    let folder = Folder::with(
        "a.toml",
        "unit = \"um\"\n[[lumen]]\nouter = [[0, 0], [100, 0], [100, 50], [50, 50], [50, 80], [0, 80]]\n\
         [[wall]]\nname = \"electrode\"\nfrom = [20, 0]\nto = [80, 0]\n",
    );
    let run =
        folder.line("solve a.toml --wall-csv a.csv --wall-picture a.svg --wall-picture a.png");
    assert_eq!(run.err, "wrote a.csv\nwrote a.svg\nwrote a.png\n");
    assert!(run.out.contains("electrode") && run.out.contains("Re-entrant corner at"));
    let table = folder.read("a.csv");
    assert!(
        table
            .lines()
            .any(|row| row.starts_with("1,electrode,") && row.ends_with("regular"))
    );
    assert_eq!(table.matches("singular_corner").count(), 2);
    assert!(folder.read("a.svg").contains("electrode"));
    folder
        .line("solve a.toml --wall-picture a.gif")
        .assert_error(2, &["does not end in .png or .svg"]);
    folder
        .line("solve a.toml --wall-csv a.toml")
        .assert_error(3, &["`a.toml` is an input file and is not overwritten"]);
}

#[test]
fn crowded_re_entrant_corners_are_one_line_and_a_mean_in_the_picture() {
    // A lid like a saw; one step in the floor stands alone.
    let teeth = (1..100).rev().map(|tooth| {
        let x = 3.0 * f64::from(tooth);
        format!("{},98\n{x},96\n", x + 1.5)
    });
    let lid: String = teeth.collect();
    let rows = format!("x_um,y_um\n0,0\n150,0\n150,-20\n300,-20\n300,100\n{lid}0,100\n");
    let folder = Folder::with("saw.csv", &rows);
    let run = folder.line("solve saw.csv --cells-across 48 --wall-picture saw.svg");
    assert_eq!(run.status, 0, "{}", run.err);
    let text = folder.read("saw.svg");
    let tree = roxmltree::Document::parse(&text).unwrap();
    let of = |node: &roxmltree::Node<'_, '_>, name: &str, value: &str| {
        node.attribute(name)
            .is_some_and(|v| v.eq_ignore_ascii_case(value))
    };
    let curve: Vec<_> = tree
        .descendants()
        .filter(|n| of(n, "stroke", "#005a9c"))
        .collect();
    assert_eq!(curve.len(), 1);
    // One path each of the crowd's line and the triangles beside the step: not one for each tooth.
    let marks = tree
        .descendants()
        .filter(|n| of(n, "fill", "#b03000"))
        .count();
    assert!((2..=4).contains(&marks), "{marks} marks");
    assert!(text.contains("99 re-entrant corners stand too close together"));
    assert!(text.contains("Triangles: re-entrant corners"));
}

#[test]
fn a_dash_is_standard_input_and_standard_output() {
    let folder = Folder::new();
    let run = folder.run_with(&["solve", "-", "--json"], RECTANGLE);
    assert_eq!(run.status, 0, "{}", run.err);
    let record: serde_json::Value = serde_json::from_str(&run.out).unwrap();
    assert_eq!(record["source"]["path"], "standard input");
    let run = folder.run_with(&["solve", "-", "-o", "-"], RECTANGLE);
    assert!(run.out.starts_with("Section"), "{}", run.out);
    let run = folder.run_with(&["check", "-"], RECTANGLE);
    assert!(run.out.contains("no problems in 4 vertices"), "{}", run.out);
    let run = folder.line("draw circle --diameter 9um -o -");
    assert!(run.out.contains("kind = \"circle\""));
    assert!(folder.names().is_empty());
}

#[test]
fn a_reader_that_goes_away_ends_the_run_quietly() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for arguments in [
        &["solve", "a.csv", "--shortcuts"][..],
        &["draw", "circle", "--diameter", "1mm", "--points"],
        &["--help"],
        &["solve", "--help"],
    ] {
        let mut child = std::process::Command::new(assert_cmd::cargo::cargo_bin!("etchwise"))
            .args(arguments)
            .current_dir(folder.0.path())
            .stdout(Stdio::piped())
            .stderr(Stdio::piped())
            .spawn()
            .unwrap();
        drop(child.stdout.take());
        let mut said = String::new();
        child
            .stderr
            .take()
            .unwrap()
            .read_to_string(&mut said)
            .unwrap();
        let status = child.wait().unwrap();
        assert_eq!(
            (said.as_str(), status.code()),
            ("", Some(0)),
            "{arguments:?}"
        );
    }
}

#[test]
fn targets_that_cannot_be_written_are_found_before_the_solve() {
    let folder = Folder::with("a.csv", RECTANGLE);
    fs::create_dir(folder.path("d")).unwrap();
    for (options, parts) in [
        ("-o d", &["`d` is a folder"][..]),
        (
            "-o no/such.txt",
            &["folder of `no/such.txt` does not exist", "create it"],
        ),
        (
            "-o a.csv",
            &["`a.csv` is an input file and is not overwritten"],
        ),
        ("-o ./d/../a.csv", &["is an input file"]),
        ("-o a.csv/x", &["cannot be written"]),
        ("--vtk no/field", &["does not exist"]),
        ("--picture d/no/x.png", &["does not exist"]),
    ] {
        let run = folder.line(&format!("solve a.csv --picture ok.png {options}"));
        run.assert_error(3, parts);
        assert_eq!(folder.names(), ["a.csv", "d"], "{options}");
        assert_eq!(folder.read("a.csv"), RECTANGLE);
    }
    for options in [
        "--picture x.png --picture x.png",
        "--picture x.png --picture ./x.png",
        "-o x.png --picture x.png",
        "--vtk x -o x.vtp",
        "--vtk x --legacy-vtk -o x.vtk",
    ] {
        let run = folder.line(&format!("solve a.csv {options}"));
        run.assert_error(2, &["two outputs", "own name"]);
        assert_eq!(folder.names(), ["a.csv", "d"], "{options}");
    }
}

#[cfg(unix)]
#[test]
fn links_are_followed_and_inputs_known_by_any_name() {
    use std::os::unix::fs::symlink;
    let folder = Folder::with("a.csv", RECTANGLE);
    symlink("a.csv", folder.path("link.csv")).unwrap();
    fs::hard_link(folder.path("a.csv"), folder.path("hard.csv")).unwrap();
    symlink("new.txt", folder.path("to_new")).unwrap();
    symlink("ring2", folder.path("ring1")).unwrap();
    symlink("ring1", folder.path("ring2")).unwrap();
    for target in ["link.csv", "hard.csv"] {
        folder
            .run(&["solve", "a.csv", "-o", target])
            .assert_error(3, &["is an input file"]);
    }
    folder
        .line("solve a.csv -o ring1")
        .assert_error(3, &["ring1"]);
    assert_eq!(folder.line("solve link.csv -o to_new").status, 0);
    assert!(folder.read("new.txt").starts_with("Section link"));
    let is_link = fs::symlink_metadata(folder.path("to_new"))
        .unwrap()
        .is_symlink();
    assert!(is_link, "the link stays");
}

#[cfg(target_os = "linux")]
#[test]
fn a_full_device_is_told_and_leaves_nothing() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder
        .line("solve a.csv --picture ok.png -o /dev/full")
        .assert_error(3, &["`/dev/full` cannot be written", "No space left"]);
    assert_eq!(folder.names(), ["a.csv"]);
}

#[test]
fn an_old_result_is_replaced_whole_or_not_at_all() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder.write("old.txt", "old");
    assert_eq!(folder.line("solve missing.csv -o old.txt").status, 3);
    assert_eq!(folder.read("old.txt"), "old");
    assert_eq!(folder.line("solve a.csv -o old.txt").status, 0);
    assert!(folder.read("old.txt").starts_with("Section a\n"));
    assert_eq!(folder.names(), ["a.csv", "old.txt"]);
}

#[test]
fn names_with_control_characters_or_of_great_length_do_no_harm() {
    let text = |name: &str| {
        format!(
            "name = \"{name}\"\nunit = \"um\"\n[[lumen]]\nouter = [[0, 0], [90, 0], [90, 50]]\n"
        )
    };
    let folder = Folder::with("a.toml", text("a\\u001b[31mb\\u202ec\\nd"));
    let run = folder.line("solve a.toml --picture a.svg");
    assert!(run.out.starts_with("Section a [31mb c d\n"), "{}", run.out);
    let table = folder.line("solve a.toml --csv");
    assert!(
        table
            .out
            .lines()
            .nth(1)
            .unwrap()
            .starts_with("a [31mb c d,")
    );
    folder.write("a.toml", text(&"n".repeat(1_000_000)));
    let run = folder.line("solve a.toml --picture a.svg --picture a.png --vtk a --legacy-vtk");
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(run.out.len() < 10_000);
}
