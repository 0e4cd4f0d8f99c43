//! One test for each exit status.

use crate::{Folder, RECTANGLE, shape};

#[test]
fn status_0_when_done() {
    let run = Folder::with("a.csv", RECTANGLE).line("solve a.csv");
    assert_eq!((run.status, run.err.as_str()), (0, ""));
    assert!(run.out.starts_with("Section a\n"));
}

#[test]
fn status_1_when_outside_a_limit() {
    let folder = Folder::with("a.csv", "x_um,y_um\n0,0\n100,40\n100,0\n0,40\n");
    let run = folder.line("check a.csv");
    assert_eq!(run.status, 1);
    assert!(run.out.contains("crosses"), "{}", run.out);
    let run = folder.run(&["solve", &shape("made/drie_trench.toml"), "--deny-warnings"]);
    assert_eq!(run.status, 1, "{}", run.err);
    assert!(run.out.contains("shear_singular"), "{}", run.out);
}

/// A caution alone denies nothing.
#[test]
fn denying_warnings_is_about_warnings_and_not_cautions() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let run = folder.line(
        "solve a.csv --deny-warnings --fluid water --temperature 25C --length 20mm \
         --flow-rate 5uL/min",
    );
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(run.out.contains("caution"));
}

#[test]
fn status_2_on_wrong_usage() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder
        .line("solve a.csv --flowrate 5uL/min")
        .assert_error(2, &["--flowrate", "similar argument", "--flow-rate"]);
    assert_eq!(folder.line("").status, 2);
    assert_eq!(folder.line("solve").status, 2);
    assert_eq!(folder.line("sovle a.csv").status, 2);
}

#[test]
fn status_3_when_the_input_cannot_be_read_or_its_unit_is_in_doubt() {
    let folder = Folder::with("a.csv", "0,0\n100,0\n100,50.5\n");
    folder
        .line("solve missing.csv")
        .assert_error(3, &["missing.csv: no such file", "help: "]);
    folder
        .line("solve a.csv")
        .assert_error(3, &["have no unit", "--> a.csv:1:1", "--unit um"]);
}

#[test]
fn status_4_when_the_flow_is_not_laminar() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let line =
        "solve a.csv --viscosity 1mPa.s --density 1000kg/m^3 --length 20mm --flow-rate 1L/min";
    let run = folder.line(line);
    assert_eq!(run.status, 4, "{}", run.err);
    assert!(run.out.contains("not_laminar"), "{}", run.out);
    let slow = folder.line(&line.replace("1L/min", "5uL/min"));
    assert_eq!(slow.status, 0, "{}", slow.err);
}

#[test]
fn status_4_when_the_section_is_too_thin_for_any_grid() {
    let folder = Folder::with("a.csv", "x_m,y_m\n0,0\n1,0\n1,1e-10\n0,1e-10\n");
    folder
        .line("solve a.csv --allow-any-size")
        .assert_error(4, &["1.000e-10 m across", "1.000e0 m", "help: "]);
}

#[test]
fn status_5_when_the_grid_would_not_fit_into_memory() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder.line("solve a.csv --cells-across 1e9").assert_error(
        5,
        &[
            "1000000000 cells",
            "bytes",
            "limit",
            "help: use --cells-across ",
        ],
    );
    let run = folder.line("solve a.csv --cells-across 1e6");
    let fits = run.err.split("--cells-across ").nth(1).unwrap();
    let fits: f64 = fits.split_whitespace().next().unwrap().parse().unwrap();
    assert!(fits > 1000.0 && fits < 1e6, "{fits}");
}
