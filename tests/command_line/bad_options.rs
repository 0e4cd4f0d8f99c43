//! Options that are wrong: one clear error each, before any work.

use crate::{Folder, RECTANGLE};

/// Options after `solve a.csv`, and parts of the error.
type Case = (&'static str, &'static [&'static str]);

fn assert_refused(cases: &[Case]) {
    let folder = Folder::with("a.csv", RECTANGLE);
    for (options, parts) in cases {
        let run = folder.line(&format!("solve a.csv {options}"));
        // A unit that the reader refuses is told by the reader.
        let status = if *options == "--unit 0um" { 3 } else { 2 };
        run.assert_error(status, parts);
        assert_eq!(folder.names(), ["a.csv"], "{options}");
    }
}

#[test]
fn fluids_and_operating_points_without_sense_are_refused_with_what_to_type() {
    assert_refused(&[
        (
            "--viscosity 0mPa.s",
            &["--viscosity: `0mPa.s` is not above zero", "help: "],
        ),
        ("--viscosity=-1mPa.s", &["`-1mPa.s` is not above zero"]),
        ("--viscosity 1", &["`1` has no unit", "1 mPa s"]),
        (
            "--viscosity 1kPa",
            &["`kPa` is not a unit of viscosity", "mPa s"],
        ),
        ("--viscosity NaNPa.s", &["not a finite number"]),
        ("--viscosity 1e999Pa.s", &["not a finite number"]),
        ("--viscosity thick", &["does not start with a number"]),
        ("--viscosity 1,5mPa.s", &["comma"]),
        (
            "--viscosity 1mPa.s --length 0mm",
            &["--length: `0mm` is not above zero"],
        ),
        (
            "--viscosity 1mPa.s --length=-2mm",
            &["--length: `-2mm` is not above zero"],
        ),
        (
            "--viscosity 1mPa.s --length 20",
            &["--length: `20` has no unit"],
        ),
        (
            "--viscosity 1mPa.s --length 20kPa",
            &["not a unit of length"],
        ),
        (
            "--viscosity 1mPa.s --length 2mm --flow-rate 0uL/min",
            &["--flow-rate: `0uL/min` is not above zero"],
        ),
        (
            "--viscosity 1mPa.s --length 2mm --pressure-drop=-1Pa",
            &["--pressure-drop: `-1Pa` is not above zero"],
        ),
        (
            "--viscosity 1mPa.s --length 2mm --flow-rate 1uL/min --pressure-drop 1Pa",
            &["--flow-rate", "cannot be used with", "--pressure-drop"],
        ),
        (
            "--viscosity 1mPa.s --flow-rate 1uL/min",
            &["needs the length", "--length 20mm"],
        ),
        ("--length 2mm", &["needs a fluid", "--fluid water"]),
        (
            "--fluid water",
            &["depends on the temperature", "--temperature 25C"],
        ),
        ("--fluid water --temperature 25", &["`25` has no unit"]),
        (
            "--fluid water --temperature 500C",
            &["773.15 K", "253.15 to 383.15 K"],
        ),
        (
            "--fluid water --temperature=-400C",
            &["below absolute zero"],
        ),
        ("--fluid mercury", &["mercury", "water, air"]),
        (
            "--fluid water --temperature 25C --viscosity 1mPa.s",
            &["both --fluid and"],
        ),
        (
            "--fluid water --temperature 25C --gas-pressure 1bar",
            &["is for --fluid air"],
        ),
        ("--density 1000kg/m^3", &["does not make a fluid"]),
        (
            "--viscosity 1mPa.s --length 1e300m --pressure-drop 1e300Pa",
            &["outside the range of numbers"],
        ),
    ]);
}

#[test]
fn grids_inputs_and_outputs_without_sense_are_refused_with_what_to_type() {
    assert_refused(&[
        ("--cells-across 0", &["0 cells", "the least is 4"]),
        ("--cells-across=-5", &["-5 cells", "the least is 4"]),
        ("--cells-across NaN", &["NaN is not a finite number"]),
        ("--cells-across inf", &["inf is not a finite number"]),
        ("--cells-across 3.99", &["3.99 cells"]),
        ("--cells-across many", &["'many'", "--cells-across"]),
        ("--threads 0", &["1..=256"]),
        ("--threads 65535", &["1..=256"]),
        (
            "--as picture",
            &["`picture`", "section, outline, svg, trace, map or image"],
        ),
        ("--unit furlong", &["furlong"]),
        ("--unit 0um", &["0"]),
        ("--scale 1um", &["--scale is for drawings", "`outline`"]),
        ("--scale 0um", &["not positive"]),
        ("--scale 1um --unit um", &["cannot be used with"]),
        ("--csv --json", &["cannot be used with"]),
        ("--legacy-vtk", &["--vtk"]),
        ("--picture a.bmp", &["`a.bmp` does not end in .png or .svg"]),
        ("--vtk .", &["does not end in a name"]),
        ("--vtk ./", &["does not end in a name"]),
    ]);
}

#[test]
fn cells_across_may_be_any_number_from_four() {
    let folder = Folder::with("a.csv", RECTANGLE);
    for cells in ["4", "4.5", "17.3", "64"] {
        let record = folder.json(&format!("solve a.csv --json --cells-across {cells}"));
        let error = record["conductance"]["estimated_error"].as_f64().unwrap();
        let off = (crate::value(&record, "/conductance") - crate::RECTANGLE_CONDUCTANCE).abs();
        // The error is an estimate, not a bound.
        assert!(
            off < 3.0 * error,
            "{cells}: {off:e} against the estimate {error:e}"
        );
        let asked: f64 = cells.parse().unwrap();
        let used = crate::value(&record, "/grid/cells_across");
        assert!(used >= asked && used < 1.5 * asked, "{cells}: {used}");
    }
}

#[test]
fn a_unit_that_contradicts_the_file_is_refused() {
    let folder = Folder::with("a.csv", RECTANGLE);
    folder
        .line("solve a.csv --unit mm")
        .assert_error(3, &["um", "mm"]);
    assert_eq!(folder.line("solve a.csv --unit um").status, 0);
}
