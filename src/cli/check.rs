//! `etchwise check`: every problem of an outline.

use std::path::PathBuf;

use clap::ArgMatches;
use serde::Serialize;

use crate::geometry::{Problem, Severity};
use crate::intake::read_section;

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::input::read_options;
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
    /// Why the list may not be complete.
    incomplete: Option<String>,
}

#[derive(Serialize)]
struct SourceRecord<'a> {
    path: &'a str,
    sha256: &'a str,
    kind: &'a str,
}

#[derive(Serialize)]
struct ProblemRecord {
    kind: &'static str,
    severity: &'static str,
    #[serde(rename = "loop")]
    loop_index: usize,
    vertex: Option<usize>,
    /// `[x, y]` in metres.
    at: Option<[f64; 2]>,
    message: String,
    remedy: String,
}

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    super::set_threads(matches)?;
    let file = matches.get_one::<PathBuf>("file").cloned().unwrap_or_default();
    let options = read_options(matches)?;
    let section = read_section(&file, &options)?;
    let problems = section.outline.problems();
    let accepted = !problems.iter().any(|p| p.severity() == Severity::Error);
    let vertices = section.outline.loops().map(|l| l.points.len()).sum();
    if matches.get_flag("json") {
        let record = CheckRecord {
            schema: "etchwise-check/1",
            tool_version: env!("CARGO_PKG_VERSION"),
            source: SourceRecord {
                path: &section.provenance.path,
                sha256: &section.provenance.sha256,
                kind: section.provenance.kind.as_str(),
            },
            vertices,
            accepted,
            problems: problems.iter().map(record).collect(),
            incomplete: problems.incomplete(),
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
        for problem in problems.iter() {
            let word = match problem.severity() {
                Severity::Error => "problem",
                Severity::Harmless => "harmless",
            };
            text.push_str(&format!("{word}: {problem}\n  help: {}\n", problem.remedy()));
        }
        if let Some(reason) = problems.incomplete() {
            text.push_str(&format!("{reason}\n"));
        }
        text.push_str(&match problems.iter().count() {
            0 => format!("{}: no problems in {vertices} vertices\n", file.display()),
            n => format!("{}: {n} problem(s) in {vertices} vertices\n", file.display()),
        });
        output::print(&text)?;
    }
    Ok(if accepted {
        ExitStatus::Done
    } else {
        ExitStatus::OutsideLimit
    })
}

fn record(problem: &Problem) -> ProblemRecord {
    ProblemRecord {
        kind: problem.kind_name(),
        severity: match problem.severity() {
            Severity::Error => "error",
            Severity::Harmless => "harmless",
        },
        loop_index: problem.loop_index(),
        vertex: problem.vertex(),
        at: problem.at().filter(|at| at.iter().all(|x| x.is_finite())),
        message: problem.to_string(),
        remedy: problem.remedy(),
    }
}
