//! Dialects of trace tables, one after another; every file here is invented.

#![expect(clippy::float_cmp, reason = "written digits are rounded once")]

use std::fmt::Write as _;

use super::table_kind::{TableKind, table_kind};
use super::table_options::{Decimal, TableOptions};
use super::table_problem::{TableAxis, TableProblem};
use super::table_trace::{read_trace_table, trace_from_bytes};
use super::{RawTrace, TableProblem as Problem};
use crate::intake::read_error::{Fault, ReadProblem};
use crate::warning::{Code, Warning};

fn with(text: &str, change: impl Fn(&mut TableOptions)) -> Result<(RawTrace, Vec<Warning>), Fault> {
    let mut options = TableOptions::default();
    change(&mut options);
    read_trace_table(text, &options)
}

fn trace(text: &str) -> RawTrace {
    with(text, |_| {})
        .unwrap_or_else(|fault| panic!("{fault:?}: {text}"))
        .0
}

fn problem(text: &str) -> Problem {
    table_problem(with(text, |_| {}).unwrap_err())
}

fn table_problem(fault: Fault) -> Problem {
    match *fault.problem {
        ReadProblem::Table { source } => source,
        other => panic!("{other:?}"),
    }
}

fn line_of(text: &str) -> usize {
    with(text, |_| {}).unwrap_err().place.unwrap().line
}

/// The trace all good tables below hold: three samples half a micrometre apart, 10, 20 and -15 nm high.
fn is_the_trace(trace: &RawTrace, text: &str) {
    let near = |found: &[f64], wanted: [f64; 3]| {
        found.len() == 3 && found.iter().zip(wanted).all(|(a, b)| (a - b).abs() < 1e-18)
    };
    assert!(
        near(&trace.profile.x, [0.0, 0.5e-6, 1e-6]),
        "{text}: {:?}",
        trace.profile.x
    );
    assert!(
        near(&trace.profile.z, [1e-8, 2e-8, -1.5e-8]),
        "{text}: {:?}",
        trace.profile.z
    );
}

#[test]
fn one_trace_in_many_dialects() {
    for text in [
        "x_um,z_nm\n0,10\n0.5,20\n1,-15\n",
        "Lateral um,Raw Nanometer,\r\n0.0,10.00,,\r\n0.5,20.00,,\r\n1.0,-15.00,,\r\r\n",
        "Lateral um,Raw Micrometer\r0.0,0.010\r0.5,0.020\r1.0,-0.015\r",
        "Weg [\u{b5}m];H\u{f6}he [nm]\n0;10,0\n0,5;20,0\n1;-15,0\n",
        "Distance (microns)\tHauteur (nanom\u{e8}tres)\n0,0\t10\n0,5\t20\n1,0\t-15\n",
        "\u{4f4d}\u{7f6e}(\u{3bc}m),\u{9ad8}\u{3055}(nm)\n0,10\n0.5,20\n1,-15\n",
        "z in \u{b5}m,x in \u{b5}m\n0.01,0\n0.02,0.5\n-0.015,1\n",
        "index,x in \u{b5}m,y in \u{b5}m\n0,0,0.01\n1,0.5,0.02\n2,1,-0.015\n",
        "um nm\n3\n   0.0e+00,   1.0e+01\n   5.0e-01,   2.0e+01\n   1.0e+00,  -1.5e+01\n",
        "  x (um)   z (nm)\n  0.0  10\n  0.5  20\n  1.0  -15\n",
        "x (um) z (nm)\n0 10\n0.5 20\n1 -15 # last\n",
        "Position,Height\n\u{b5}m,nm\n0,10\n0.5,20\n1,-15\n",
        "Time (s),Scan position (mm),Height (\u{c5}),Force\n0,0,100,\n1,0.0005,200,\n2,0.001,-150,\n",
        "\"x_um\",\"z_nm\"\n\"0,0\",\"10,0\"\n\"0,5\",\"20\"\n\"1\",\"-15\"\n",
        "Position um,Height kA\n0,0.1\n0.5,0.2\n1,-0.15\n",
        "x_um,z_nm\n\n0,10\n\n0.5,20\n# a comment\n1,\u{2212}15\n\n",
        "X Units,um\nZ Units,nm\n0,10\n0.5,20\n1,-15\n",
    ] {
        is_the_trace(&trace(text), text);
    }
}

#[test]
fn encodings_come_decoded() {
    let text = "x in \u{b5}m,z in nm\r\n0,10\r\n0.5,20\r\n1,-15\r\n";
    let mut wide = vec![0xff, 0xfe];
    wide.extend(text.encode_utf16().flat_map(u16::to_le_bytes));
    let latin: Vec<u8> = text
        .chars()
        .map(|c| u8::try_from(u32::from(c)).unwrap())
        .collect();
    let marked = format!("\u{feff}{text}").into_bytes();
    for bytes in [wide, latin, marked] {
        let (trace, _) = trace_from_bytes(bytes, "scan.csv", &TableOptions::default()).unwrap();
        is_the_trace(&trace, "encoded");
    }
}

const SCAN: &str = "Scan Parameters\r\n\r\nScan Type,Standard\r\nStylus,Radius: 4.0 \u{b5}m\r\n\
    Length,1.0 um\r\nResolution,0.500 um/sample\r\n\r\nAnalytical Results\r\n\r\n\
    Function,Position,Result\r\nRa,0.4 um,0.00525 um\r\nSkew,0.4 um,6.9\r\n\r\nScan Data\r\n\r\n\
    Lateral um,Raw Nanometer,\r\n0.0,10,,\r\n0.5,20,,\r\n1.0,-15,,\r\n\r\r\n";

#[test]
fn a_header_of_several_blocks_is_kept() {
    let (trace, warnings) = with(SCAN, |_| {}).unwrap();
    is_the_trace(&trace, SCAN);
    assert_eq!(trace.tip_radius, Some(4e-6));
    let keys: Vec<&str> = trace.metadata.iter().map(|(key, _)| key.as_str()).collect();
    assert_eq!(
        keys,
        [
            "Scan Parameters",
            "Scan Type",
            "Stylus",
            "Length",
            "Resolution",
            "Analytical Results",
            "Function",
            "Ra",
            "Skew",
            "Scan Data"
        ]
    );
    assert_eq!(trace.metadata[2].1, "Radius: 4.0 \u{b5}m");
    assert!(warnings.is_empty());
    assert_eq!(table_kind(SCAN), Some(TableKind::Trace));
}

#[test]
fn destroyed_signs_stop_only_where_they_are_needed() {
    let in_header = SCAN.replace('\u{b5}', "\u{fffd}");
    let read = trace(&in_header);
    assert_eq!(read.tip_radius, None);
    assert!(
        read.steps
            .iter()
            .any(|step| step.what == "tip" && step.text.contains("destroyed"))
    );
    let in_column = "Lateral \u{fffd}m,Raw nm\n0,10\n0.5,20\n1,-15\n";
    let fault = problem(in_column);
    assert!(matches!(
        fault,
        TableProblem::DestroyedUnit {
            axis: TableAxis::Positions,
            ..
        }
    ));
    assert!(fault.hint().contains("--x-unit um") && fault.is_ambiguous());
    let (read, _) = with(in_column, |o| o.x_unit = Some("um".to_owned())).unwrap();
    is_the_trace(&read, in_column);
    let step_lost = "Resolution: 0.5 \u{fffd}m\nHeight (nm)\n10\n20\n-15\n";
    assert!(problem(step_lost).hint().contains("--x-step"));
    let (read, _) = with(step_lost, |o| o.x_step = Some(0.5e-6)).unwrap();
    is_the_trace(&read, step_lost);
}

#[test]
fn units_are_never_guessed() {
    let bare = "x,z\n0,10\n0.5,20\n1,-15\n";
    let fault = with(bare, |_| {}).unwrap_err();
    assert_eq!(fault.place.as_ref().unwrap().line, 1);
    let missing = table_problem(fault);
    assert!(missing.hint().contains("--x-unit um --z-unit nm") && missing.is_ambiguous());
    let (read, _) = with(bare, |o| {
        o.unit = Some("nm".to_owned());
        o.x_unit = Some("um".to_owned());
    })
    .unwrap();
    is_the_trace(&read, bare);
    assert!(matches!(
        problem("x_um,z\n0,10\n0.5,20\n1,-15\n"),
        TableProblem::MissingUnit {
            axis: TableAxis::Heights,
            ..
        }
    ));
    let metres = "0 1.1e-08\n2e-08 1.2e-08\n4e-08 1.4e-08\n4e-05 1.1e-08\n";
    assert!(matches!(
        problem(metres),
        TableProblem::MissingUnit {
            likely: Some("m"),
            ..
        }
    ));
    // The file names two units for one column.
    let both = problem("x (um),z (um) [nm]\n0,1\n1,2\n2,3\n");
    assert!(
        matches!(&both, TableProblem::UnknownUnit { unit, .. } if unit == "(um) [nm]"),
        "{both:?}"
    );
    let rows = "x_um,z_um\n0,1\n1,2\n2,3\n";
    let conflict = problem(&format!("z unit: nm\n{rows}"));
    assert!(
        matches!(&conflict, TableProblem::UnitConflict { header, .. } if header == "nm"),
        "{conflict:?}"
    );
    assert!(conflict.is_ambiguous() && conflict.hint().contains("--z-unit um"));
    assert!(with(&format!("z unit: micron\n{rows}"), |_| {}).is_ok());
    assert!(
        with(&format!("z unit: nm\n{rows}"), |o| o.z_unit =
            Some("um".to_owned()))
        .is_ok()
    );
    assert!(matches!(
        problem("x (ft),z (nm)\n0,1\n1,2\n2,3\n"),
        TableProblem::UnknownUnit { .. }
    ));
    let conflict = with("x_um,z_nm\n0,1\n1,2\n2,3\n", |o| {
        o.z_unit = Some("um".to_owned());
    });
    assert!(matches!(
        *conflict.unwrap_err().problem,
        ReadProblem::UnitConflict { .. }
    ));
    let wrong = with(bare, |o| o.unit = Some("furlong".to_owned()));
    assert!(matches!(
        *wrong.unwrap_err().problem,
        ReadProblem::UnitOption { .. }
    ));
    let (read, warnings) = with("Unit: nm\n0;10\n500;20\n1000;-15\n", |_| {}).unwrap();
    is_the_trace(&read, "one unit");
    assert!(
        warnings
            .iter()
            .any(|warning| warning.message.contains("one unit"))
    );
    let volts = with("x_um,Signal (mV)\n0,1\n1,2\n2,3\n", |o| {
        o.z_column = Some("signal".to_owned());
        o.z_unit = Some("um".to_owned());
    });
    assert!(matches!(
        table_problem(volts.unwrap_err()),
        TableProblem::NotALength { .. }
    ));
}

#[test]
fn implausible_ranges_stop() {
    let text = "x_m,z_m\n0,10\n500,20\n1000,-15\n";
    let stop = problem(text);
    assert!(matches!(
        stop,
        TableProblem::Implausible {
            axis: TableAxis::Positions,
            ..
        }
    ));
    assert!(stop.hint().contains("--allow-any-size") && stop.is_ambiguous());
    let (read, _) = with(text, |o| o.allow_any_size = true).unwrap();
    assert_eq!(read.profile.x[2], 1000.0);
    let micro = "x_um,z_um\n0,1.1e-08\n2e-08,1.2e-08\n4e-05,1.1e-08\n";
    assert!(problem(micro).hint().contains("`m`"));
    let deep = "x_um,z_m\n0,0\n10,1\n20,2\n";
    assert!(matches!(
        problem(deep),
        TableProblem::Implausible {
            axis: TableAxis::Heights,
            ..
        }
    ));
}

#[test]
fn missing_heights_stay_and_missing_positions_go() {
    for mark in ["", "NaN", "BAD", "***", "-", "inf", "#N/A", "1.#QNAN"] {
        let text = format!("x_um;z_nm\n0;1\n1;{mark}\n2;3\n");
        let (read, warnings) = with(&text, |_| {}).unwrap();
        assert!(
            read.profile.z[1].is_nan() && read.profile.z.len() == 3,
            "{mark}"
        );
        assert!(
            read.steps.iter().any(|step| step.what == "missing"),
            "{mark}"
        );
        assert!(warnings.is_empty(), "{mark}: {warnings:?}");
    }
    let (read, warnings) = with("x_um;z_nm\n0;1\nNaN;2\n2;3\n3;4\n", |_| {}).unwrap();
    assert_eq!(read.profile.x.len(), 3);
    assert_eq!(warnings[0].code, Code::FileDefect);
    assert_eq!(
        problem("x_um;z_nm\n0;-\n1;-\n2;-\n"),
        TableProblem::NoHeights
    );
}

#[test]
fn positions_fall_or_stand_or_go_back() {
    let (read, _) = with("x_um,z_nm\n1,-15\n0.5,20\n0,10\n", |_| {}).unwrap();
    is_the_trace(&read, "falling");
    assert!(read.steps.iter().any(|step| step.text.contains("fall")));
    let back = "x_um,z_nm\n0,1\n1,2\n2,3\n1.5,4\n3,5\n";
    assert_eq!(line_of(back), 5);
    assert!(matches!(problem(back), TableProblem::BackAndForth { .. }));
    let twice = "x_um,z_nm\n0,1\n1,2\n1,3\n40,4\n";
    assert_eq!(line_of(twice), 4);
    assert!(matches!(
        problem(twice),
        TableProblem::RepeatedPosition { .. }
    ));
}

#[test]
fn coarsely_rounded_positions_are_rebuilt() {
    let mut text = "Length,24.0 um\nLateral um,Raw nm\n".to_owned();
    for index in 0..100 {
        let x = (f64::from(index) * 2.4).round() / 10.0;
        writeln!(text, "{x:.1},{}", index % 7).unwrap();
    }
    let (read, warnings) = with(&text, |_| {}).unwrap();
    assert_eq!(warnings.len(), 1);
    assert_eq!(warnings[0].code, Code::PositionsRebuilt);
    for (index, x) in read.profile.x.iter().enumerate() {
        assert!((x - index as f64 * 0.24e-6).abs() < 1e-15);
    }
}

#[test]
fn tables_without_positions_need_a_step() {
    let column = "Height (nm)\n10\n20\n-15\n";
    assert_eq!(problem(column), TableProblem::NoPositions);
    assert_eq!(table_kind(column), Some(TableKind::Trace));
    let (read, _) = with(column, |o| o.x_step = Some(0.5e-6)).unwrap();
    is_the_trace(&read, column);
    for text in [
        "Resolution: 0.5 um/sample\nHeight (nm)\n10\n20\n-15\n",
        "dx = 0,5 \u{b5}m\nHeight (nm)\n10\n20\n-15\n",
        "Length: 1 um\nHeight (nm)\n10\n20\n-15\n",
        "Resolution: 500 nm\nIndex,Height (nm)\n1,10\n2,20\n3,-15\n",
    ] {
        is_the_trace(&trace(text), text);
    }
    let bare = "0 10\n1 20\n2 -15\n";
    let (read, _) = with(bare, |o| {
        o.x_step = Some(0.5e-6);
        o.z_unit = Some("nm".to_owned());
    })
    .unwrap();
    is_the_trace(&read, bare);
    let conflict = with("x_um,z_nm\n0,1\n1,2\n2,3\n", |o| o.x_step = Some(0.5e-6));
    assert!(matches!(
        table_problem(conflict.unwrap_err()),
        TableProblem::StepConflict { .. }
    ));
    let zero = with(column, |o| o.x_step = Some(-1.0));
    assert!(matches!(
        table_problem(zero.unwrap_err()),
        TableProblem::StepNotPositive { .. }
    ));
    let counted = "Length: 1 um\nHeight (nm)\n3\n10\n20\n-15\n";
    let (read, warnings) = with(counted, |_| {}).unwrap();
    is_the_trace(&read, counted);
    assert!(
        warnings
            .iter()
            .any(|warning| warning.message.contains("count"))
    );
    let blank = "Length: 1 um\nHeight (nm)\n10\n\n20\n-15\n";
    assert_eq!(
        (problem(blank), line_of(blank)),
        (TableProblem::BlankWithin, 4)
    );
    let leading = "Length: 1.5 um\nHeight (nm)\nNaN\n10\n20\n-15\n";
    assert_eq!(trace(leading).profile.z.len(), 4);
}

#[test]
fn columns_are_chosen_by_name_or_number() {
    let text = "x_um,left_nm,right_nm\n0,1,10\n0.5,2,20\n1,3,-15\n";
    let several = problem(text);
    assert!(several.to_string().contains("2 `left_nm`, 3 `right_nm`"));
    assert!(several.hint().contains("--z-column") && several.is_ambiguous());
    for name in ["3", "right", "RIGHT_NM"] {
        let (read, _) = with(text, |o| o.z_column = Some(name.to_owned())).unwrap();
        is_the_trace(&read, name);
    }
    for name in ["4", "0", "middle", ""] {
        let missing = with(text, |o| o.z_column = Some(name.to_owned()));
        assert!(matches!(
            table_problem(missing.unwrap_err()),
            TableProblem::NoSuchColumn { .. }
        ));
    }
    let same = with(text, |o| {
        o.x_column = Some("1".to_owned());
        o.z_column = Some("x".to_owned());
    });
    assert!(matches!(
        table_problem(same.unwrap_err()),
        TableProblem::SameColumn { .. }
    ));
    let swapped = "10;0\n20;0,5\n-15;1\n";
    let (read, _) = with(swapped, |o| {
        o.x_column = Some("2".to_owned());
        o.z_column = Some("1".to_owned());
        o.x_unit = Some("um".to_owned());
        o.z_unit = Some("nm".to_owned());
    })
    .unwrap();
    is_the_trace(&read, swapped);
    let (_, warnings) = with("x_um,Height nm,Gauge um\n0,1,2\n1,2,3\n2,3,4\n", |_| {}).unwrap();
    assert_eq!(warnings[0].code, Code::ChoiceMade);
    let (_, warnings) = with("x_um,depth_um\n0,1\n1,2\n2,3\n", |_| {}).unwrap();
    assert!(warnings[0].message.contains("depth"));
    assert!(matches!(
        problem("x_um,position_um,z_um\n0,1,2\n1,2,3\n2,3,4\n"),
        TableProblem::SeveralPositions { .. }
    ));
    assert_eq!(
        problem("x_um,y_um,z_um\n0,1,2\n1,2,3\n2,3,4\n"),
        TableProblem::AreaNotTrace
    );
}

#[test]
fn decimal_commas_in_doubt_are_asked() {
    let text = "1,234;5,678\n2,345;6,789\n3,456;7,891\n";
    let fault = problem(text);
    assert!(matches!(fault, TableProblem::DecimalInDoubt { .. }));
    assert!(fault.hint().contains("--decimal comma") && fault.is_ambiguous());
    let (read, _) = with(text, |o| {
        o.decimal = Some(Decimal::Comma);
        o.unit = Some("um".to_owned());
    })
    .unwrap();
    assert!((read.profile.x[0] - 1.234e-6).abs() < 1e-18);
    let thousands = "x_um;z_nm\n1.000.541;1\n1.000.542;2\n";
    assert!(matches!(
        problem(thousands),
        TableProblem::NotANumber { .. }
    ));
    let mixed = with("x_um;z_nm\n0,5;1\n1.5;2\n2,5;3\n", |_| {}).unwrap_err();
    assert!(matches!(*mixed.problem, ReadProblem::MixedDecimal { .. }));
}

#[test]
fn broken_tables_name_the_line() {
    assert_eq!(problem("a letter\nto a friend\n"), TableProblem::NoNumbers);
    assert_eq!(line_of("x_um,z_nm\n0,1\nabc,2\n2,3\n3,4\n"), 3);
    assert_eq!(line_of("x_um,z_nm\n0,1\n1,2x\n2,3\n3,4\n"), 3);
    assert_eq!(line_of("x_um,z_nm\n0,1\n1,2\n2,3\n3,4x\n"), 5);
    assert_eq!(line_of("x_um,z_nm\n0.0,1\n1,2,3\n2,3\n3,4\n"), 3);
    assert_eq!(
        problem("x;z\n0 um;1 nm\n1 um;2 nm\n"),
        TableProblem::NoNumbers
    );
    assert_eq!(line_of("x_um z_nm\n0 1\n1\n2 3\n3 4\n"), 3);
    assert!(matches!(
        problem("x_um,z_nm\n0,1\n1,2\n"),
        TableProblem::TooFewSamples { found: 2, .. }
    ));
    let (read, warnings) = with("x_um,z_nm\n0,1\n1,2\n2,3\n3", |_| {}).unwrap();
    assert_eq!(read.profile.x.len(), 3);
    assert!(warnings[0].message.contains("line, 5, is cut off"));
    let footer = "x_um,z_nm\n0,1\n1,2\n2,3\n\nEnd of scan\n";
    assert_eq!(trace(footer).metadata.len(), 1);
}

#[test]
fn header_and_data_may_differ() {
    let (_, warnings) = with(
        "Length,5.0 um\nResolution,0.800 um/sample\nPoints,9\nLateral um,Raw nm\n0,1\n1,2\n2,3\n",
        |_| {},
    )
    .unwrap();
    assert_eq!(warnings.len(), 3);
    assert!(
        warnings
            .iter()
            .all(|warning| warning.code == Code::FileDefect)
    );
}

#[test]
fn kinds_of_tables() {
    let rows = |count: usize, row: fn(usize) -> String| -> String {
        (0..count).map(row).collect::<Vec<String>>().join("\n")
    };
    let rising = rows(12, |i| format!("{i} {}", i % 3));
    let few = rows(6, |i| format!("{i} {}", i % 3));
    let points = rows(12, |i| format!("{} {} 5", i / 4, i % 4));
    for (text, kind) in [
        (rising.as_str(), Some(TableKind::Trace)),
        (few.as_str(), Some(TableKind::Outline)),
        (
            "x_um,y_um\n0,0\n10,0\n10,5\n0,5\n",
            Some(TableKind::Outline),
        ),
        ("0,0\n10,0\n10,5\n0,5\n", Some(TableKind::Outline)),
        ("loop,x_um,y_um\na,0,0\na,1,0\na,1,1\n", None),
        (
            "x_um,y_um,loop\n0,0,1\n1,0,1\n1,1,1\n",
            Some(TableKind::Outline),
        ),
        ("Lateral um,Raw nm\n0,1\n1,2\n2,1\n", Some(TableKind::Trace)),
        ("x_um,z_nm\n0,1\n1,2\n2,1\n", Some(TableKind::Trace)),
        ("x_um,z_um\n0,1\n1,2\n2,1\n", Some(TableKind::Outline)),
        ("0 1\n1 NaN\n2 1\n", Some(TableKind::Trace)),
        ("1\n2\n3\n", Some(TableKind::Trace)),
        (points.as_str(), Some(TableKind::Points)),
        ("1 5 3 2\n4 1 2 2\n0 1 5 5\n", Some(TableKind::Matrix)),
        (
            "# Width: 3 um\n# Height: 2 um\n1 2 3\n2 3 4\n",
            Some(TableKind::Matrix),
        ),
        ("name = \"a section\"\nunit = \"um\"\n", None),
        ("", None),
        ("<svg/>", None),
    ] {
        assert_eq!(table_kind(text), kind, "{text}");
    }
    let (_, warnings) = with(&rising, |o| o.unit = Some("um".to_owned())).unwrap();
    assert!(warnings.iter().any(|w| w.advice.contains("--as outline")));
}
