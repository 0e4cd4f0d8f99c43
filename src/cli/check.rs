//! `etchwise check`: every problem of an outline.

use std::fmt::Write as _;
use std::path::PathBuf;

use clap::ArgMatches;
use serde::Serialize;

use crate::geometry::{Problem, Severity};
use crate::intake::Section;

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::{read, read_options};
use super::instrument_options::say_settings;
use super::output;

/// Machine form of a check.
#[derive(Serialize)]
struct CheckRecord<'a> {
    schema: &'static str,
    tool_version: &'static str,
    source: SourceRecord<'a>,
    vertices: usize,
    accepted: bool,
    problems: Vec<ProblemRecord>,
    /// What the list does not hold.
    notes: Vec<String>,
}

#[derive(Serialize)]
struct SourceRecord<'a> {
    path: &'a str,
    sha256: &'a str,
    kind: &'a str,
    notes: &'a [String],
}

#[derive(Serialize)]
struct ProblemRecord {
    kind: &'static str,
    severity: &'static str,
    /// Which wall, in words.
    wall: String,
    /// Loops and vertices counted from 0, in the order of the file.
    #[serde(rename = "loop")]
    loop_number: usize,
    vertex: usize,
    /// `[x, y]` in metres; null where a coordinate is not finite.
    at: Option<[f64; 2]>,
    message: String,
    remedy: &'static str,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let file = matches
        .get_one::<PathBuf>("file")
        .cloned()
        .unwrap_or_default();
    let mut options = read_options(matches)?;
    options.keep_non_finite = true;
    let section = read(&file, &options)?;
    say_settings(matches);
    let problems = section.outline.problems();
    let accepted = !problems.has_errors();
    let vertices = section.outline.loops().map(|l| l.points.len()).sum();
    if matches.get_flag("json") {
        let record = CheckRecord {
            schema: "etchwise-check/1",
            tool_version: env!("CARGO_PKG_VERSION"),
            source: SourceRecord {
                path: &section.provenance.path,
                sha256: &section.provenance.sha256,
                kind: section.provenance.kind.word(),
                notes: &section.provenance.notes,
            },
            vertices,
            accepted,
            problems: problems
                .list
                .iter()
                .map(|problem| record(problem, &section))
                .collect(),
            notes: problems.notes(),
        };
        let text = serde_json::to_string_pretty(&record).map_err(|error| {
            Failure::new(
                ExitStatus::Unreadable,
                format!("the list cannot be printed: {error}"),
                "leave out --json",
            )
        })?;
        output::print(&format!("{text}\n"))?;
    } else {
        let mut text = String::new();
        for problem in &problems.list {
            let word = match problem.severity() {
                Severity::Error => "problem",
                Severity::Harmless => "harmless",
            };
            let _ = writeln!(
                text,
                "{word}: {problem}{}\n  help: {}",
                file_loop(problem, &section),
                problem.remedy()
            );
        }
        for note in problems.notes() {
            let _ = writeln!(text, "{note}");
        }
        let _ = match problems.list.len() {
            0 if accepted => writeln!(
                text,
                "{}: no problems in {vertices} vertices",
                file.display()
            ),
            n => writeln!(
                text,
                "{}: {n} problem(s) in {vertices} vertices",
                file.display()
            ),
        };
        output::print(&text)?;
    }
    Ok(if accepted {
        ExitStatus::Done
    } else {
        ExitStatus::OutsideLimit
    })
}

/// Number in the file, from 0, of the loop of a problem.
fn loop_number(problem: &Problem, section: &Section) -> usize {
    let index = problem.place.loop_index;
    section.loop_numbers.get(index).copied().unwrap_or(index)
}

/// Which loop of the file a problem is in, where there are several.
fn file_loop(problem: &Problem, section: &Section) -> String {
    if section.loop_numbers.len() < 2 {
        return String::new();
    }
    format!(" (loop {} of the file)", loop_number(problem, section) + 1)
}

fn record(problem: &Problem, section: &Section) -> ProblemRecord {
    let place = problem.place;
    ProblemRecord {
        kind: problem.code(),
        severity: match problem.severity() {
            Severity::Error => "error",
            Severity::Harmless => "harmless",
        },
        wall: place.role.to_string(),
        loop_number: loop_number(problem, section),
        vertex: place.vertex,
        at: place.at.iter().all(|x| x.is_finite()).then_some(place.at),
        message: problem.to_string(),
        remedy: problem.remedy(),
    }
}
