//! The text a person reads, and sections that try the program hard.

use std::f64::consts::PI;
use std::fmt::Write as _;
use std::time::{Duration, Instant};

use crate::{Folder, RECTANGLE, RECTANGLE_CONDUCTANCE, assert_close, shape, value};

/// Three significant digits for every number with a point, a mark for what depends on the solver's course.
fn rounded(text: &str) -> String {
    let mut out = String::new();
    for line in text.lines() {
        let course = [
            "K, proven",
            "estimated error",
            "the worst to",
            "residual",
            "sha256",
        ];
        let cut = course
            .iter()
            .filter_map(|word| line.find(word).map(|at| at + word.len()))
            .min();
        let line = cut.and_then(|at| line.get(..at)).unwrap_or(line);
        let words: Vec<String> = line.split(' ').map(round_word).collect();
        let _ = writeln!(out, "{}", words.join(" "));
    }
    out
}

fn round_word(word: &str) -> String {
    match word.parse::<f64>() {
        Ok(number) if word.contains('.') => format!("{number:.2e}"),
        _ => word.to_owned(),
    }
}

#[test]
fn the_text_for_a_rectangle_is_as_kept() {
    let folder = Folder::new();
    folder.write(
        "rectangle.toml",
        std::fs::read(shape("drawn/rectangle_100x40.toml")).unwrap(),
    );
    let run = folder.line(
        "solve rectangle.toml --ascii --cells-across 64 --fluid water --temperature 25C \
         --length 20mm --flow-rate 5uL/min",
    );
    assert_eq!(run.status, 0, "{}", run.err);
    assert!(run.out.is_ascii());
    let found = rounded(&run.out);
    let kept = include_str!("rectangle.txt");
    assert_eq!(found, kept, "\n{found}");
}

#[test]
fn the_trace_goes_to_standard_error_and_adds_up() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let plain = folder.line("solve a.csv --json --quiet");
    let traced = folder.line("solve a.csv --json --quiet --trace");
    assert_eq!((traced.status, plain.err.as_str()), (0, ""));
    assert!(traced.out.starts_with('{') && !traced.out.contains("Cost of"));
    for stage in [
        "crossings",
        "grids and transfers",
        "solve",
        "proof",
        "wall shear",
    ] {
        let stage = format!("  {stage} ");
        assert!(traced.err.contains(&stage), "{stage}: {}", traced.err);
    }
    // The table of the grids: the nodes of the finest one are those of the result, and memory is above the field's.
    let json: serde_json::Value = serde_json::from_str(&traced.out).unwrap();
    let nodes = value(&json, "/grid/fluid_nodes");
    let (_, grids) = traced.err.split_once("fluid nodes").unwrap();
    let finest: Vec<f64> = grids
        .lines()
        .nth(1)
        .unwrap()
        .split_whitespace()
        .map(|word| word.parse().unwrap())
        .collect();
    assert!((finest[0] - nodes).abs() < 0.5, "{finest:?}");
    assert!(finest[5] > 8.0 && finest[5] < 100.0, "{finest:?}");
    assert!(grids.lines().count() > 3);
}

#[test]
fn the_text_has_every_part_that_was_asked_for() {
    let folder = Folder::with("a.csv", RECTANGLE);
    let plain = folder.line("solve a.csv").out;
    let full = folder.line("solve a.csv --shortcuts --verbose").out;
    for part in [
        "Geometry",
        "Conductance K",
        "Fanning",
        "Darcy",
        "sqrt(A)",
        "Evidence",
    ] {
        assert!(plain.contains(part), "{part}");
    }
    assert!(!plain.contains("Shortcut") && full.contains("parallel plates"));
    assert!(full.lines().count() > plain.lines().count() + 20);
}

#[test]
fn a_drawing_says_its_scale() {
    let run = Folder::new().run(&["solve", &shape("outlines/moulded_channel.svg"), "--ascii"]);
    assert!(
        run.out.contains("note: scale 1.000 um per user unit"),
        "{}",
        run.out
    );
}

fn conductance(rows: &str) -> f64 {
    let folder = Folder::with("a.csv", format!("x_um,y_um\n{rows}"));
    let begin = Instant::now();
    let record = folder.json("solve a.csv --json --allow-any-size");
    assert!(begin.elapsed() < Duration::from_secs(200));
    value(&record, "/conductance")
}

fn rectangle_at(x: f64, y: f64, width: f64, height: f64) -> String {
    let (right, top) = (x + width, y + height);
    format!("{x},{y}\n{right},{y}\n{right},{top}\n{x},{top}\n")
}

/// Area of the circle of n segments is left to the solver: 1e-4 covers 1000 segments.
fn circle(x: f64, y: f64, radius: f64, count: u32) -> String {
    let mut rows = String::new();
    for i in 0..count {
        let (sin, cos) = (2.0 * PI * f64::from(i) / f64::from(count)).sin_cos();
        let _ = writeln!(rows, "{},{}", x + radius * cos, y + radius * sin);
    }
    rows
}

#[test]
fn a_kilometre_from_the_origin_nothing_changes() {
    assert_close(
        conductance(&rectangle_at(0.0, 0.0, 100.0, 40.0)),
        RECTANGLE_CONDUCTANCE,
        1e-4,
    );
    assert_close(
        conductance(&rectangle_at(1e9, -1e9, 100.0, 40.0)),
        RECTANGLE_CONDUCTANCE,
        1e-4,
    );
}

#[test]
fn duplicate_vertices_and_a_closing_vertex_change_nothing() {
    let rows = "0,0\n0,0\n100,0\n100,0\n100,0\n100,40\n0,40\n0,0\n0,0\n";
    assert_close(conductance(rows), RECTANGLE_CONDUCTANCE, 1e-4);
    let folder = Folder::with("a.csv", format!("x_um,y_um\n{rows}"));
    let record = folder.json("solve a.csv --json");
    assert_eq!(record["warnings"][0]["code"], "duplicate_vertices_removed");
}

/// The limit of a slender rectangle: w h^3 / 12 (1 - 0.630 h/w), first term of the Fourier series.
#[test]
fn slender_rectangles_up_to_a_thousand_to_one() {
    for ratio in [20.0, 100.0, 1000.0] {
        let exact = ratio / 12.0 * (1.0 - 0.630_247_7 / ratio) * 1e-24;
        assert_close(
            conductance(&rectangle_at(0.0, 0.0, ratio, 1.0)),
            exact,
            1e-4,
        );
    }
}

/// Circle: K = pi r^4 / 8 (Hagen-Poiseuille), lumens add.
#[test]
fn lumens_of_very_different_size_add() {
    let mut rows = String::new();
    let mut exact = 0.0;
    for i in 0..20_u32 {
        let radius = if i % 2 == 0 { 5.0 } else { 15.0 };
        let _ = writeln!(rows, "{}", circle(40.0 * f64::from(i), 0.0, radius, 400));
        exact += PI * (radius * 1e-6).powi(4) / 8.0;
    }
    assert_close(conductance(&rows), exact, 3e-4);
}

/// An island of no thickness to speak of in the middle halves a plate channel: K falls to about a quarter.
#[test]
fn an_island_thinner_than_any_cell_is_a_wall() {
    let plate = rectangle_at(0.0, 0.0, 100.0, 10.0);
    let sheet = rectangle_at(0.001, 5.0, 99.998, 1e-6);
    let one = conductance(&rectangle_at(0.0, 0.0, 100.0, 5.0));
    let divided = conductance(&format!("{plate}\n{sheet}"));
    assert_close(divided, 2.0 * one, 2e-3);
    assert!(divided < 0.3 * conductance(&plate));
}

#[test]
fn hundreds_of_islands_are_solved() {
    let mut rows = rectangle_at(0.0, 0.0, 1000.0, 40.0);
    for i in 0..200_u32 {
        let y = if i % 2 == 0 { 12.0 } else { 28.0 };
        let _ = write!(rows, "\n{}", circle(8.0 + 4.92 * f64::from(i), y, 2.0, 12));
    }
    let folder = Folder::with("a.csv", format!("x_um,y_um\n{rows}"));
    let record = folder.json("solve a.csv --json --cells-across 16");
    let islands = &record["section"]["islands"]["value"];
    assert_eq!(islands.as_u64(), Some(200));
    let k = value(&record, "/conductance");
    assert!(k > 0.0 && k < conductance(&rectangle_at(0.0, 0.0, 1000.0, 40.0)));
}

#[test]
fn a_million_vertices_are_read_checked_and_solved() {
    let folder = Folder::with(
        "a.csv",
        format!("x_um,y_um\n{}", circle(0.0, 0.0, 50.0, 1_000_000)),
    );
    let begin = Instant::now();
    let record = folder.json("solve a.csv --json");
    assert!(begin.elapsed() < Duration::from_secs(200));
    assert_close(
        value(&record, "/conductance"),
        PI * 50e-6_f64.powi(4) / 8.0,
        1e-4,
    );
}
