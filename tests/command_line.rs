//! The real program: help, messages, exit statuses, keys of the machine output, files. Each run has a folder
//! of its own.
#![expect(
    clippy::unwrap_used,
    clippy::disallowed_methods,
    reason = "tests read and write files of their own and may fail loudly"
)]

#[path = "command_line/accuracy.rs"]
mod accuracy;
#[path = "command_line/answers.rs"]
mod answers;
#[path = "command_line/bad_input.rs"]
mod bad_input;
#[path = "command_line/bad_options.rs"]
mod bad_options;
#[path = "command_line/card.rs"]
mod card;
#[path = "command_line/check.rs"]
mod check;
#[path = "command_line/draw.rs"]
mod draw;
#[path = "command_line/film_reach.rs"]
mod film_reach;
#[path = "command_line/help.rs"]
mod help;
#[path = "command_line/instruments.rs"]
mod instruments;
#[path = "command_line/json_contract.rs"]
mod json_contract;
#[path = "command_line/network.rs"]
mod network;
#[path = "command_line/outputs.rs"]
mod outputs;
#[path = "command_line/response.rs"]
mod response;
#[path = "command_line/route.rs"]
mod route;
#[path = "command_line/schemas.rs"]
mod schemas;
#[path = "command_line/sensitivity.rs"]
mod sensitivity;
#[path = "command_line/shipped.rs"]
mod shipped;
#[path = "command_line/statuses.rs"]
mod statuses;

use std::fs;
use std::path::{Path, PathBuf};

use serde_json::Value;

/// A rectangle of 100 um by 40 um.
const RECTANGLE: &str = "x_um,y_um\n0,0\n100,0\n100,40\n0,40\n";
/// Conductance of a rectangle of 100 um by 40 um, m^4. Computed reference: the Fourier series of the velocity
/// (Boussinesq 1868), `w h^3/12 (1 - 192 h/(pi^5 w) sum of tanh(n pi w/(2 h))/n^5, odd n)`, to n = 3999.
const RECTANGLE_CONDUCTANCE: f64 = 3.989_841_195e-19;

/// What a run left behind.
struct Run {
    status: i32,
    out: String,
    err: String,
}

/// A fresh folder with the program run in it.
struct Folder(tempfile::TempDir);

impl Folder {
    fn new() -> Self {
        Self(tempfile::tempdir().unwrap())
    }

    /// A folder that holds one file.
    fn with(name: &str, content: impl AsRef<[u8]>) -> Self {
        let folder = Self::new();
        folder.write(name, content);
        folder
    }

    fn path(&self, name: &str) -> PathBuf {
        self.0.path().join(name)
    }

    fn write(&self, name: &str, content: impl AsRef<[u8]>) {
        fs::write(self.path(name), content).unwrap();
    }

    fn read(&self, name: &str) -> String {
        fs::read_to_string(self.path(name)).unwrap()
    }

    /// Names of everything in the folder, sorted.
    fn names(&self) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(self.0.path())
            .unwrap()
            .map(|entry| entry.unwrap().file_name().to_string_lossy().into_owned())
            .collect();
        names.sort();
        names
    }

    fn run(&self, arguments: &[&str]) -> Run {
        self.run_with(arguments, "")
    }

    fn run_with(&self, arguments: &[&str], input: &str) -> Run {
        let output = assert_cmd::Command::new(assert_cmd::cargo::cargo_bin!("etchwise"))
            .args(arguments)
            .current_dir(self.0.path())
            .write_stdin(input)
            .timeout(std::time::Duration::from_mins(1))
            .output()
            .unwrap();
        let run = Run {
            status: output.status.code().unwrap_or(-1),
            out: String::from_utf8(output.stdout).unwrap(),
            err: String::from_utf8(output.stderr).unwrap(),
        };
        assert!(!run.err.contains("panicked"), "{arguments:?}: {}", run.err);
        run
    }

    /// Runs a line of words separated by blanks.
    fn line(&self, line: &str) -> Run {
        self.run(&line.split_whitespace().collect::<Vec<_>>())
    }

    /// Runs a line that must succeed and print one JSON object.
    fn json(&self, line: &str) -> Value {
        let run = self.line(line);
        assert_eq!(run.status, 0, "{line}: {}", run.err);
        serde_json::from_str(&run.out).unwrap()
    }
}

impl Run {
    /// One error with advice, nothing on standard output.
    fn assert_error(&self, status: i32, parts: &[&str]) {
        assert_eq!(self.status, status, "{}", self.err);
        assert_eq!(self.out, "", "{}", self.err);
        assert!(self.err.starts_with("error: "), "{}", self.err);
        assert_eq!(self.err.matches("error: ").count(), 1, "{}", self.err);
        for part in parts {
            assert!(self.err.contains(part), "`{part}` not in: {}", self.err);
        }
    }
}

/// The number of a quantity.
fn value(document: &Value, path: &str) -> f64 {
    let found = document.pointer(path).unwrap_or(&Value::Null);
    found["value"].as_f64().unwrap_or(f64::NAN)
}

fn assert_close(a: f64, b: f64, tolerance: f64) {
    let off = (a / b - 1.0).abs();
    assert!(off <= tolerance, "{a} against {b}: {off:.2e} off");
}

/// Every section file and outline that comes with the program.
fn shapes() -> Vec<PathBuf> {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes");
    let mut paths = Vec::new();
    for kind in ["drawn", "made", "outlines"] {
        for entry in fs::read_dir(folder.join(kind)).unwrap() {
            paths.push(entry.unwrap().path());
        }
    }
    paths.sort();
    paths
}

fn shape(name: &str) -> String {
    let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("shapes");
    folder.join(name).to_string_lossy().into_owned()
}
