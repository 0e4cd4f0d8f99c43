//! The README says what the program does: commands, numbers, tables, files and options are checked here.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]
#![expect(
    clippy::disallowed_methods,
    reason = "the README and one source are read as text"
)]

use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use etchwise::flow::{SolveOptions, solve_outline};
use etchwise::geometry::{KindInfo, kinds, modifiers};
use etchwise::intake::{ReadOptions, read_section};

const MAIN_COMMAND: &str = "cargo run --release -- solve ";
const TEST_COMMAND: &str = "cargo test --release";

fn root() -> PathBuf {
    PathBuf::from(env!("CARGO_MANIFEST_DIR"))
}

fn readme() -> String {
    std::fs::read_to_string(root().join("README.md")).unwrap()
}

/// The lines inside the fenced `sh` blocks.
fn commands(text: &str) -> Vec<&str> {
    let mut inside = false;
    let mut found = Vec::new();
    for line in text.lines() {
        match line {
            "```sh" => inside = true,
            "```" => inside = false,
            _ if inside => found.push(line),
            _ => {}
        }
    }
    found
}

fn between<'a>(text: &'a str, begin: &str, end: &str) -> &'a str {
    assert!(text.contains(begin), "README has no `{begin}`");
    let (_, rest) = text.split_once(begin).unwrap();
    assert!(rest.contains(end), "README has no `{end}`");
    let (inside, _) = rest.split_once(end).unwrap();
    inside.trim()
}

/// Everything in single backticks, outside fenced blocks.
fn quoted(text: &str) -> Vec<&str> {
    let mut inside = false;
    text.lines()
        .filter(|line| {
            let fence = line.starts_with("```");
            inside ^= fence;
            !inside && !fence
        })
        .flat_map(|line| line.split('`').skip(1).step_by(2))
        .collect()
}

fn etchwise(arguments: &[&str]) -> Output {
    Command::new(env!("CARGO_BIN_EXE_etchwise"))
        .current_dir(root())
        .args(arguments)
        .output()
        .unwrap()
}

/// Arguments of the main command after `--`.
fn main_arguments(text: &str) -> Vec<&str> {
    let line = commands(text)[0];
    let (_, arguments) = line.split_once(" -- ").unwrap();
    arguments.split_whitespace().collect()
}

#[test]
fn the_first_two_commands_are_the_main_job_and_the_tests() {
    let text = readme();
    let commands = commands(&text);
    assert!(commands[0].starts_with(MAIN_COMMAND), "{}", commands[0]);
    assert_eq!(commands[1], TEST_COMMAND);
    let first_heading_below = text.find("\n## ").unwrap();
    assert!(text.find(TEST_COMMAND).unwrap() < first_heading_below);
    let paragraph = text.lines().nth(2).unwrap();
    assert!(paragraph.len() > 60, "the job comes first: {paragraph}");
}

#[test]
fn the_main_command_prints_what_the_session_shows() {
    let text = readme();
    let output = etchwise(&main_arguments(&text));
    assert_eq!(output.status.code(), Some(0));
    let printed = String::from_utf8(output.stdout).unwrap();
    let printed: BTreeSet<&str> = printed.lines().collect();
    let (_, session) = text.split_once("<!-- session:").unwrap();
    let session = between(session, "```text", "```");
    let missing: Vec<&str> = session
        .lines()
        .filter(|line| !line.is_empty() && !printed.contains(line))
        .collect();
    assert!(session.lines().count() > 10);
    assert!(missing.is_empty(), "not printed:\n{}", missing.join("\n"));
}

#[test]
fn the_commands_of_the_readme_are_accepted() {
    let text = readme();
    let folder = tempfile::tempdir().unwrap();
    let mut run = 0;
    for line in commands(&text) {
        let Some(arguments) = line.strip_prefix("etchwise ") else {
            continue;
        };
        let mut words: Vec<String> = arguments.split_whitespace().map(str::to_owned).collect();
        // Outputs go to a folder of their own, inputs come from the repository.
        for word in &mut words {
            if word.starts_with("shapes/") {
                *word = root().join(&*word).to_string_lossy().into_owned();
            }
        }
        let output = Command::new(env!("CARGO_BIN_EXE_etchwise"))
            .current_dir(folder.path())
            .args(&words)
            .output()
            .unwrap();
        let talk = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(0), "{line}\n{talk}");
        run += 1;
    }
    assert!(run >= 5, "only {run} commands found");
}

/// One row of the table of kinds.
fn kind_row(kind: &KindInfo) -> String {
    let parameters: Vec<String> = kind
        .parameters
        .iter()
        .map(|p| match p.default {
            None => p.name.to_owned(),
            Some(_) => format!("[{}]", p.name),
        })
        .collect();
    format!(
        "| `{}` | {} | {} |",
        kind.name,
        parameters.join(", "),
        kind.summary
    )
}

#[test]
fn the_table_of_kinds_is_that_of_the_program() {
    let text = readme();
    let rows: Vec<String> = kinds().iter().map(kind_row).collect();
    let expected = format!(
        "| kind | parameters | what it is |\n|---|---|---|\n{}",
        rows.join("\n")
    );
    let found = between(&text, "<!-- kinds: begin -->", "<!-- kinds: end -->");
    assert!(found == expected, "the table should be:\n{expected}");
    for modifier in modifiers() {
        assert!(quoted(&text).contains(&modifier.name), "{}", modifier.name);
    }
}

#[test]
fn every_exit_status_is_listed_and_no_other() {
    let text = readme();
    let section = between(&text, "\n## Exit status\n", "\n## ");
    let listed: Vec<&str> = section
        .lines()
        .filter_map(|line| line.strip_prefix("| ")?.split(" |").next())
        .filter(|cell| cell.chars().all(|c| c.is_ascii_digit()))
        .collect();
    assert_eq!(listed, ["0", "1", "2", "3", "4", "5"]);
    let help = String::from_utf8(etchwise(&["--help"]).stdout).unwrap();
    for status in listed {
        assert!(
            help.contains(&format!("\n  {status}  ")),
            "{status} is not in --help"
        );
    }
}

#[test]
fn every_warning_code_is_listed_and_no_other() {
    let source = std::fs::read_to_string(root().join("src/warning.rs")).unwrap();
    let codes: BTreeSet<&str> = source
        .lines()
        .filter_map(|line| line.trim().strip_prefix("Self::")?.split_once("=> \""))
        .map(|(_, rest)| rest.split('"').next().unwrap())
        .collect();
    assert!(codes.len() >= 10, "{codes:?}");
    let text = readme();
    let table = between(&text, "| code | warning |", "\n## ");
    let listed: BTreeSet<&str> = table
        .lines()
        .filter_map(|line| line.strip_prefix("| `")?.split('`').next())
        .collect();
    assert_eq!(listed, codes);
}

#[test]
fn every_file_and_folder_named_is_there() {
    let text = readme();
    let starts = ["shapes/", "tests/", "examples/", "benches/"];
    let mut named = BTreeSet::new();
    for word in text.split(|c: char| c.is_whitespace() || "`()|".contains(c)) {
        let word = word.trim_end_matches([',', ';', ':', '.']);
        if starts.iter().any(|start| word.starts_with(start)) {
            named.insert(word.to_owned());
        }
    }
    assert!(named.len() >= 10, "{named:?}");
    for name in &named {
        assert!(root().join(name).exists(), "{name} does not exist");
    }
    for example in [
        "one_section",
        "made_against_drawn",
        "parameter_sweep",
        "own_outline",
    ] {
        assert!(text.contains(example));
        assert!(root().join(format!("examples/{example}.rs")).exists());
    }
}

#[test]
fn every_option_named_is_one_of_the_program() {
    let text = readme();
    let mut known = BTreeSet::from(["--".to_owned(), "--release".to_owned()]);
    for name in ["path", "profile", "example", "bench", "help"] {
        known.insert(format!("--{name}"));
    }
    collect_options(&etchwise::cli::command(), &mut known);
    let quoted = quoted(&text);
    let words = commands(&text).into_iter().chain(quoted.iter().copied());
    let mut seen = 0;
    for word in words.flat_map(str::split_whitespace) {
        if word.starts_with("--") {
            seen += 1;
            assert!(known.contains(word), "{word} is not an option");
        }
    }
    assert!(seen > 20, "only {seen} options found");
}

fn collect_options(command: &clap::Command, known: &mut BTreeSet<String>) {
    for argument in command.get_arguments() {
        known.extend(argument.get_long().map(|name| format!("--{name}")));
    }
    for inner in command.get_subcommands() {
        collect_options(inner, known);
    }
}

#[test]
fn every_json_key_named_is_in_the_output() {
    let text = readme();
    let mut arguments = main_arguments(&text);
    arguments.push("--json");
    let output = etchwise(&arguments);
    let json: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let table = between(
        &text,
        "<!-- json keys: begin -->",
        "<!-- json keys: end -->",
    );
    let mut seen = 0;
    for line in table.lines() {
        let Some(keys) = line.strip_prefix("| `").and_then(|l| l.split(" |").next()) else {
            continue;
        };
        for key in keys
            .split('`')
            .filter(|part| !part.trim_matches([',', ' ']).is_empty())
        {
            let pointer = format!("/{}", key.replace('.', "/"));
            assert!(json.pointer(&pointer).is_some(), "no key {key}");
            seen += 1;
        }
    }
    assert!(seen > 30, "only {seen} keys found");
}

#[test]
fn every_sensitivity_case_and_key_named_is_in_the_output() {
    let text = readme();
    let arguments = ["sensitivity", "shapes/drawn/koh_groove.toml", "--json"];
    let output = etchwise(&arguments);
    let json: serde_json::Value = serde_json::from_slice(&output.stdout).unwrap();
    let cases = json["sensitivities"].as_array().unwrap();
    let section = between(
        &text,
        "\n## Sensitivity\n",
        "<!-- sensitivity keys: begin -->",
    );
    for case in cases {
        let name = case["name"].as_str().unwrap();
        assert!(quoted(section).contains(&name), "{name}");
    }
    let table = between(
        &text,
        "<!-- sensitivity keys: begin -->",
        "<!-- sensitivity keys: end -->",
    );
    let mut seen = 0;
    for line in table.lines().filter(|line| line.starts_with("| `")) {
        let keys = line.split(" |").next().unwrap();
        for key in quoted(keys) {
            let pointer = format!("/{}", key.replace('.', "/"));
            let is_there = json.pointer(&pointer).is_some() || cases[0].pointer(&pointer).is_some();
            assert!(is_there, "no key {key}");
            seen += 1;
        }
    }
    assert!(seen > 18, "only {seen} keys found");
}

#[test]
fn the_measured_friction_is_quoted_with_what_the_solver_says() {
    let path = Path::new("shapes/drawn/water_duct.toml");
    let section = read_section(&root().join(path), &ReadOptions::default()).unwrap();
    let flow = solve_outline(&section.outline, &SolveOptions::default())
        .unwrap()
        .flow;
    let text = readme();
    let paragraph = between(&text, "**Measured friction.**", "\n## ");
    let value = format!("{:.4}", flow.fanning_dh);
    assert!(paragraph.contains(&value), "the solver says {value}");
    // R. J. Cornish (1928), doi:10.1098/rspa.1928.0175: mean, standard deviation and range of nine readings.
    let (mean, deviation, lowest, highest) = (16.82, 0.37, 16.24, 17.42);
    for number in [mean, deviation, lowest, highest] {
        assert!(paragraph.contains(&format!("{number:.2}")), "{number}");
    }
    assert!((lowest..=highest).contains(&flow.fanning_dh));
    assert!((flow.fanning_dh - mean).abs() < deviation);
    let above = 100.0 * (flow.fanning_dh / mean - 1.0);
    assert!(
        paragraph.contains(&format!("{above:.1} % above")),
        "{above}"
    );
}
