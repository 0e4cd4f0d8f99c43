//! Accuracy on request: tolerances reached, limits that stop the search, and what is refused.

use serde_json::Value;

use crate::{Folder, RECTANGLE};

/// An L of 90 by 60 um with one re-entrant corner.
const ANGLE: &str = "x_um,y_um\n0,0\n90,0\n90,30\n40,30\n40,60\n0,60\n";

fn json(folder: &Folder, options: &str, status: i32) -> Value {
    let run = folder.line(&format!("solve a.csv --json {options}"));
    assert_eq!(run.status, status, "{options}: {}", run.err);
    serde_json::from_str(&run.out).unwrap()
}

fn number(record: &Value, path: &str) -> f64 {
    record
        .pointer(path)
        .and_then(Value::as_f64)
        .unwrap_or_else(|| unreachable!("{path} in {record}"))
}

#[test]
fn a_tolerance_is_met_by_what_is_proven() {
    for (outline, tolerance, asked) in [
        (RECTANGLE, "1e-5", 1e-5),
        (RECTANGLE, "1%", 1e-2),
        (ANGLE, "0.03%", 3e-4),
        (ANGLE, "200ppm", 2e-4),
    ] {
        let folder = Folder::with("a.csv", outline);
        let record = json(&folder, &format!("--tolerance {tolerance}"), 0);
        let (low, high) = (
            number(&record, "/conductance/low"),
            number(&record, "/conductance/high"),
        );
        let best = number(&record, "/conductance/value");
        assert!(low <= best && best <= high);
        assert!(2.0 * (high - low) / (high + low) <= asked, "{tolerance}");
        assert_eq!(record["accuracy"]["met"], true);
        assert_eq!(record["accuracy"]["goal"], "proven");
        assert!((number(&record, "/accuracy/asked/value") - asked).abs() < 1e-15);
        assert!(number(&record, "/accuracy/further/work_ratio/value") > 1.0);
    }
}

#[test]
fn the_re_entrant_corner_is_named_as_what_limits() {
    let folder = Folder::with("a.csv", ANGLE);
    let record = json(&folder, "", 0);
    let limit = &record["accuracy"]["limited_by"];
    assert_eq!(limit["cause"], "re_entrant_corner");
    assert!((number(limit, "/at/0") - 40e-6).abs() < 1e-12);
    assert!((number(limit, "/at/1") - 30e-6).abs() < 1e-12);
    assert!((number(limit, "/fluid_angle/value") - 1.5 * std::f64::consts::PI).abs() < 1e-9);
    let text = folder.line("solve a.csv").out;
    assert!(text.contains("re-entrant corner of 270.0"), "{text}");
}

#[test]
fn an_estimated_tolerance_takes_a_coarser_grid() {
    let folder = Folder::with("a.csv", ANGLE);
    let estimated = json(&folder, "--tolerance 1e-4 --estimate", 0);
    let proven = json(&folder, "--tolerance 1e-4", 0);
    assert_eq!(estimated["accuracy"]["goal"], "estimated");
    assert!(
        number(&estimated, "/conductance/estimated_error")
            <= 1e-4 * number(&estimated, "/conductance/value")
    );
    let nodes = |record| number(record, "/grid/fluid_nodes/value");
    assert!(nodes(&estimated) < nodes(&proven));
    let (low, high) = (
        number(&proven, "/conductance/low"),
        number(&proven, "/conductance/high"),
    );
    let best = number(&estimated, "/conductance/value");
    assert!(low * (1.0 - 1e-4) <= best && best <= high * (1.0 + 1e-4));
}

#[test]
fn a_limit_stops_the_search_with_the_best_range_so_far() {
    let folder = Folder::with("a.csv", ANGLE);
    for (options, stop) in [
        ("--tolerance 1e-8 --max-memory 3MB", "memory"),
        ("--tolerance 1e-8 --max-seconds 0.3", "time"),
    ] {
        let record = json(&folder, options, 5);
        assert_eq!(record["accuracy"]["met"], false, "{options}");
        assert_eq!(record["accuracy"]["stopped_by"], stop);
        assert!(number(&record, "/bracket_relative_width/value") < 1e-2);
        assert!(number(&record, "/conductance/low") < number(&record, "/conductance/high"));
        assert!(number(&record, "/accuracy/further/memory/value") > 3e6);
        let warnings = record["warnings"].to_string();
        assert!(warnings.contains("accuracy_not_reached") && warnings.contains("--max-"));
    }
    let text = folder.line("solve a.csv --tolerance 1e-8 --max-memory 3MB");
    assert_eq!(text.status, 5);
    assert!(text.out.contains("NOT reached"), "{}", text.out);
}

#[test]
fn a_little_memory_gives_the_range_of_a_coarse_grid() {
    let folder = Folder::with("a.csv", ANGLE);
    for limit in ["300kB", "500kB", "1MB"] {
        let record = json(
            &folder,
            &format!("--max-memory {limit} --tolerance 1e-8"),
            5,
        );
        assert_eq!(record["accuracy"]["stopped_by"], "memory", "{limit}");
        assert!(number(&record, "/conductance/low") < number(&record, "/conductance/high"));
    }
}

#[test]
fn beside_a_corner_the_largest_shear_is_said_to_be_a_mean() {
    let folder = Folder::with("a.csv", ANGLE);
    let run = folder.line("solve a.csv --cells-across 32");
    let words: Vec<&str> = run.out.split_whitespace().collect();
    let text = words.join(" ");
    assert!(text.contains("which percentiles may exceed"), "{text}");
}

#[test]
fn a_card_that_misses_the_tolerance_says_so() {
    let folder = Folder::with("a.csv", ANGLE);
    for limit in ["--max-seconds 0.001", "--max-memory 2MB"] {
        let run = folder.line(&format!(
            "card a.csv --fluid water --temperature 25C --tolerance 1e-8 {limit}"
        ));
        assert_eq!(run.status, 5, "{limit}: {}{}", run.out, run.err);
        assert!(
            run.out.contains("accuracy_not_reached"),
            "{limit}: {}",
            run.out
        );
    }
}

#[test]
fn less_memory_than_the_coarsest_grid_needs_is_an_error_with_figures() {
    let folder = Folder::with("a.csv", ANGLE);
    let run = folder.line("solve a.csv --max-memory 1kB");
    assert_eq!(run.status, 5);
    assert!(run.out.is_empty());
    assert!(run.err.contains("bytes"), "{}", run.err);
    // What it advises is enough.
    let advice = run.err.split("raise --max-memory to ").nth(1);
    let limit = advice.and_then(|text| text.split(" or more").next());
    let limit = limit.unwrap_or_default().replace(' ', "");
    assert!(limit.ends_with("kB"), "{}", run.err);
    let record = json(&folder, &format!("--max-memory {limit}"), 5);
    assert!(number(&record, "/conductance/low") < number(&record, "/conductance/high"));
}

#[test]
fn sensitivities_take_a_tolerance_and_say_when_it_is_missed() {
    let folder = Folder::with("a.csv", ANGLE);
    let run = |options: &str| folder.line(&format!("sensitivity a.csv --no-check {options}"));
    for limit in ["--max-seconds 0.001", "--max-memory 2MB"] {
        let run = run(&format!("--tolerance 1e-8 {limit}"));
        assert_eq!(run.status, 5, "{limit}: {}{}", run.out, run.err);
        assert!(run.out.contains("accuracy_not_reached"), "{}", run.out);
    }
    let met = run("--tolerance 1%");
    assert_eq!(met.status, 0, "{}{}", met.out, met.err);
    assert!(!met.out.contains("accuracy_not_reached"), "{}", met.out);
    assert_eq!(run("--tolerance 1% --cells-across 64").status, 2);
}

#[test]
fn what_is_no_tolerance_or_limit_is_refused() {
    let folder = Folder::with("a.csv", ANGLE);
    for (options, part) in [
        ("--tolerance 0", "--tolerance"),
        ("--tolerance=-1%", "--tolerance"),
        ("--tolerance 200%", "--tolerance"),
        ("--tolerance 1e-10", "--tolerance: 1e-10 is outside"),
        ("--tolerance 1e-30%", "--tolerance: 1e-32 is outside"),
        ("--tolerance nan", "--tolerance"),
        ("--tolerance 1um", "fraction"),
        ("--tolerance 0,1%", "comma"),
        ("--max-memory 5", "unit"),
        ("--max-memory 0GB", "--max-memory"),
        ("--max-memory 5Gb", "GB"),
        ("--max-seconds 0", "--max-seconds"),
        ("--max-seconds -1", "--max-seconds: -1 is not above zero"),
        (
            "--max-seconds nan",
            "--max-seconds: NaN is not a finite number",
        ),
        (
            "--max-seconds 1e400",
            "--max-seconds: inf is not a finite number",
        ),
        (
            "--cells-across nan",
            "--cells-across: NaN is not a finite number",
        ),
        ("--cells-across -3", "-3 cells across"),
        ("--tolerance 1% --cells-across 64", "cannot be used with"),
        ("--estimate --cells-across 64", "cannot be used with"),
    ] {
        let run = folder.line(&format!("solve a.csv {options}"));
        assert_eq!(run.status, 2, "{options}: {}", run.err);
        assert!(run.err.contains(part), "{options}: {}", run.err);
        assert!(run.out.is_empty());
    }
}
