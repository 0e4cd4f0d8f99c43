//! Files that are wrong, empty, huge or hostile: one clear error each, and soon.

use std::fmt::Write as _;
use std::fs;
use std::time::{Duration, Instant};

use crate::Folder;

/// No bad file may keep a person waiting longer than this.
const PATIENCE: Duration = Duration::from_secs(20);

fn refused(name: &str, content: impl AsRef<[u8]>, parts: &[&str]) {
    let folder = Folder::with(name, content);
    let begin = Instant::now();
    let run = folder.run(&["solve", name, "-o", "result.txt", "--vtk", "field"]);
    run.assert_error(3, &[parts, &["help: "]].concat());
    assert!(begin.elapsed() < PATIENCE, "{name}");
    assert!(run.err.len() < 5000, "{name}: {} bytes", run.err.len());
    assert_eq!(folder.names(), [name], "no partial file");
    let plain = run.err.chars().all(|c| c == '\n' || !c.is_control());
    assert!(plain, "{name}: control characters");
}

#[test]
fn tables_that_cannot_be_read() {
    for (content, parts) in [
        ("", &["the file is empty"][..]),
        ("\n\n\n", &["the file is empty"]),
        ("x_um\n1\n2\n3\n", &["no `y` column", "--> a.csv:1:1"]),
        ("0\n1\n2\n", &["a.csv:1"]),
        ("0,0\n100,0\n100,50.5\n", &["no unit", "--unit um"]),
        (
            "x_furlong,y_furlong\n0,0\n",
            &["`furlong` is not a unit of length"],
        ),
        (
            "x_um,y_um\n0,0\n100,zero\n",
            &["y: `zero` is not a number", "--> a.csv:3:5"],
        ),
        (
            "x_um,y_um\n0,0\n100,NaN\n",
            &["y: `NaN` is not a finite number", "--> a.csv:3:5"],
        ),
        ("x_um,y_um\n0,0\n100,\n", &["a.csv:3"]),
        ("x_um,y_um\n0,0\n1,2,3\n", &["3 column(s)", "a.csv:3"]),
        ("x_um,y_um\n0,0\n0x10,3\n", &["`0x10` is not a number"]),
        ("x_\u{1b}[31mred,y_um\n0,0\n", &["not a unit of length"]),
        ("hello\nworld\n", &["a.csv:1:1"]),
    ] {
        refused("a.csv", content, parts);
    }
}

#[test]
fn outlines_that_enclose_nothing() {
    for (rows, part) in [
        ("0,0\n", "1 different vertices"),
        ("0,0\n100,0\n", "2 different vertices"),
        ("0,0\n50,50\n100,100\n", "lie on one line"),
        ("0,0\n1e-320,0\n0,1e-320\n", "at least 3 are needed"),
        ("0,0\n100,40\n100,0\n0,40\n", "crosses"),
        (
            "0,0\n50,50\n100,0\n100,99\n50,50\n0,99\n",
            "is the same point as vertex 2",
        ),
        (
            "0,0\n100,0\n100,50\n50,50\n50,90\n50,50\n0,50\n",
            "doubles back",
        ),
    ] {
        let content = format!("x_um,y_um\n{rows}");
        refused("a.csv", content, &[part, "`etchwise check a.csv`"]);
    }
    let nested =
        "unit=\"um\"\n[[lumen]]\nouter=[[0,0],[9,0],[9,9]]\n[[lumen]]\nouter=[[6,2],[7,2],[7,3]]\n";
    refused("a.toml", nested, &["lies in the fluid of lumen 1"]);
}

#[test]
fn sizes_that_no_channel_has() {
    for (side, part) in [
        ("1e300", "10^294 m"),
        ("1e-300", "10^-306 m"),
        ("1e9", "1.000 km"),
    ] {
        let content = format!("x_um,y_um\n0,0\n{side},0\n{side},{side}\n0,{side}\n");
        refused(
            "a.csv",
            content,
            &[part, "10 nm to 50 mm", "--allow-any-size"],
        );
    }
    let meant_um = "x_mm,y_mm\n0,0\n100,0\n100,40\n0,40\n";
    refused(
        "a.csv",
        meant_um,
        &["100.0 mm wide", "with `um` the size is plausible"],
    );
}

#[test]
fn binary_deep_and_endless_files() {
    refused("a.dat", [0_u8; 10_000], &["binary data"]);
    let noise: Vec<u8> = (0..50_000_u32)
        .map(|i| (i.wrapping_mul(2_654_435_761) >> 24) as u8)
        .collect();
    refused("b.dat", noise, &["binary data"]);
    let deep = format!("a = {}{}", "[".repeat(100_000), "]".repeat(100_000));
    refused("deep.toml", deep, &["not valid TOML"]);
    let tables = format!("[{}]\nx = 1\n", vec!["a"; 50_000].join("."));
    refused("tables.toml", tables, &["not valid TOML"]);
    let specs = format!(
        "[nominal]\nkind = \"bonded_halves\"\nlower = {}1{}\n",
        "{kind = \"bonded_halves\", lower = ".repeat(60),
        "}".repeat(60)
    );
    refused("specs.toml", specs, &["nested"]);
    let root = "<svg width=\"1mm\" height=\"1mm\" viewBox=\"0 0 100 100\">";
    let groups = format!(
        "{root}{}{}</svg>",
        "<g>".repeat(50_000),
        "</g>".repeat(50_000)
    );
    refused("groups.svg", groups, &["nested more than 200 deep"]);
    let mut bomb = "<!DOCTYPE svg [<!ENTITY a0 \"0 0 \">".to_owned();
    for i in 1..20 {
        let inner = format!("&a{};", i - 1).repeat(10);
        let _ = write!(bomb, "<!ENTITY a{i} \"{inner}\">");
    }
    let _ = write!(bomb, "]>{root}<path d=\"M &a19;\"/></svg>");
    refused("bomb.svg", bomb, &["not a valid SVG drawing"]);
    let digits = format!("x_um,y_um\n0,0\n{},two\n", "1".repeat(3_000_000));
    refused("digits.csv", digits, &["digits.csv:3:"]);
    let columns = format!("x_um,y_um\n{}\n", "1,".repeat(500_000));
    refused("columns.csv", columns, &["column(s)"]);
}

#[test]
fn a_file_of_ten_gigabytes_is_refused_by_its_size() {
    let folder = Folder::new();
    let file = fs::File::create(folder.path("a.csv")).unwrap();
    file.set_len(10 << 30).unwrap();
    let begin = Instant::now();
    folder.line("solve a.csv").assert_error(
        3,
        &["10737418240 bytes", "limit is 536870912 bytes", "help: "],
    );
    assert!(begin.elapsed() < Duration::from_secs(5));
}

#[test]
fn folders_missing_files_and_empty_standard_input() {
    let folder = Folder::new();
    fs::create_dir(folder.path("d")).unwrap();
    folder
        .line("solve d")
        .assert_error(3, &["d: this is a folder", "help: "]);
    folder
        .line("solve no.csv")
        .assert_error(3, &["no.csv: no such file", "help: "]);
    folder
        .line("solve -")
        .assert_error(3, &["standard input: the file is empty", "help: "]);
    folder
        .line("check -")
        .assert_error(3, &["standard input: the file is empty", "help: "]);
}

/// A star of 20,001 points whose edges all cross each other.
#[test]
fn hostile_stars_end_soon() {
    let mut rows = "x_um,y_um\n".to_owned();
    for i in 0..20_001_u32 {
        let turn = f64::from(i) * 10_000.0 / 20_001.0;
        let (y, x) = (std::f64::consts::TAU * turn.fract()).sin_cos();
        let _ = writeln!(rows, "{},{}", 50.0 * x, 50.0 * y);
    }
    let folder = Folder::with("a.csv", &rows);
    let begin = Instant::now();
    let run = folder.line("check a.csv");
    assert_eq!(run.status, 1);
    assert!(
        run.out.contains("was cut off"),
        "says that there may be more"
    );
    refused("a.csv", &rows, &["crosses", "more"]);
    assert!(begin.elapsed() < PATIENCE);
}
