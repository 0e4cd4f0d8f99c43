//! The direction of imports between the folders of `src`, who touches files, and how long files get.
//!
//! The sources are read as text: comments and string literals are taken out, then every path that starts
//! with `crate::` or climbs to the crate root with `super::` is set against the table. The scanner is tested on
//! its own, so that a scanner that finds nothing cannot pass.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]
#![expect(clippy::disallowed_methods, reason = "sources are read as text")]

use std::collections::{BTreeMap, BTreeSet};
use std::path::{Path, PathBuf};

/// Folders and files directly under `src`, each with the others it may use.
const ALLOWED: [(&str, &[&str]); 12] = [
    ("units", &[]),
    ("measured", &[]),
    ("warning", &["units", "measured"]),
    ("geometry", &["units"]),
    ("intake", &["geometry", "units", "measured", "warning"]),
    ("grid", &["geometry", "warning"]),
    ("solve", &["grid"]),
    ("proof", &["solve", "grid", "geometry"]),
    (
        "flow",
        &[
            "proof", "solve", "grid", "geometry", "units", "measured", "warning",
        ],
    ),
    (
        "study",
        &["flow", "proof", "geometry", "units", "measured", "warning"],
    ),
    (
        "report",
        &[
            "study", "flow", "solve", "grid", "geometry", "units", "measured", "warning",
        ],
    ),
    (
        "cli",
        &[
            "report", "study", "flow", "solve", "grid", "intake", "geometry", "units", "measured",
            "warning",
        ],
    ),
];

/// Test code of `solve` builds its grids from outlines.
const ALLOWED_IN_TESTS: [(&str, &str); 1] = [("solve", "geometry")];

/// Longest source file, lines.
const LONGEST_FILE: usize = 600;

/// Words of code that reads files, and of code that writes them.
const READING: [&str; 6] = [
    "fs::read(",
    "File::open",
    "read_to_end",
    "read_to_string",
    "read_dir",
    "stdin",
];
const WRITING: [&str; 8] = [
    "fs::write",
    "File::create",
    "OpenOptions",
    "create_dir",
    "fs::rename",
    "remove_file",
    "remove_dir",
    "fs::copy",
];

/// One file of `src`.
struct Source {
    /// Path under `src`, with forward slashes.
    name: String,
    /// Code without comments and string literals, up to the inline test module.
    code: String,
    /// The inline test module, or all of a file that holds tests only.
    test_code: String,
    lines: usize,
}

fn sources() -> Vec<Source> {
    let root = Path::new(env!("CARGO_MANIFEST_DIR")).join("src");
    let mut files = Vec::new();
    collect(&root, &mut files);
    files.sort();
    files
        .iter()
        .map(|path| {
            let text = std::fs::read_to_string(path).unwrap();
            let name = path.strip_prefix(&root).unwrap().to_string_lossy();
            source(&name.replace('\\', "/"), &text)
        })
        .collect()
}

fn collect(folder: &Path, files: &mut Vec<PathBuf>) {
    for entry in std::fs::read_dir(folder).unwrap() {
        let path = entry.unwrap().path();
        if path.is_dir() {
            collect(&path, files);
        } else if path.extension().is_some_and(|e| e == "rs") {
            files.push(path);
        }
    }
}

fn source(name: &str, text: &str) -> Source {
    let bare = without_comments_and_strings(text);
    let tests_only = name
        .trim_end_matches(".rs")
        .split('/')
        .any(|part| part == "tests" || part.ends_with("_tests"));
    let (code, test_code) = if tests_only {
        ("", bare.as_str())
    } else {
        match bare.find("#[cfg(test)]\nmod tests {") {
            Some(at) => bare.split_at(at),
            None => (bare.as_str(), ""),
        }
    };
    Source {
        name: name.to_owned(),
        code: code.to_owned(),
        test_code: test_code.to_owned(),
        lines: text.lines().count(),
    }
}

/// The text with comments and the insides of string and character literals left out, line ends kept.
fn without_comments_and_strings(text: &str) -> String {
    let letters: Vec<char> = text.chars().collect();
    let starts = |at: usize, what: &str| {
        what.chars()
            .enumerate()
            .all(|(k, c)| letters.get(at + k) == Some(&c))
    };
    let mut kept = String::new();
    let mut at = 0;
    while at < letters.len() {
        let hashes = letters[at..]
            .iter()
            .skip(1)
            .take_while(|&&c| c == '#')
            .count();
        if starts(at, "//") {
            while at < letters.len() && letters[at] != '\n' {
                at += 1;
            }
        } else if letters[at] == 'r' && letters.get(at + 1 + hashes) == Some(&'"') {
            let end = format!("\"{}", "#".repeat(hashes));
            at += 2 + hashes;
            while at < letters.len() && !starts(at, &end) {
                at += 1;
            }
            at += end.len();
        } else if letters[at] == '"' {
            at += 1;
            while at < letters.len() && letters[at] != '"' {
                at += if letters[at] == '\\' { 2 } else { 1 };
            }
            at += 1;
        } else if starts(at, "'\"'") || starts(at, "'\\\"'") {
            at += if letters[at + 1] == '\\' { 4 } else { 3 };
        } else {
            kept.push(letters[at]);
            at += 1;
        }
    }
    kept
}

/// The folder or file directly under `src` that a source belongs to.
fn layer(name: &str) -> &str {
    name.split('/').next().unwrap().trim_end_matches(".rs")
}

/// Names directly under the crate root that the code of a file uses, by `crate::` or by `super::`.
fn imports(name: &str, code: &str) -> BTreeSet<String> {
    // Steps of `super` that lead from this file's module to the root.
    let parts = name.split('/').count();
    let depth = if name.ends_with("/mod.rs") {
        parts - 1
    } else {
        parts
    };
    let words = words(code);
    let mut found = BTreeSet::new();
    let mut at = 0;
    while at < words.len() {
        let follows_path = at > 0 && words[at - 1] == "::";
        if words[at] == "crate" && words.get(at + 1) == Some(&"::") && !follows_path {
            names_after(&words, at + 2, &mut found);
        } else if words[at] == "super" && !follows_path {
            let mut climbed = 0;
            while words.get(at) == Some(&"super") && words.get(at + 1) == Some(&"::") {
                climbed += 1;
                at += 2;
            }
            if climbed >= depth {
                names_after(&words, at, &mut found);
            }
            if climbed > 0 {
                continue;
            }
        }
        at += 1;
    }
    found
}

/// Identifiers and the signs that matter for paths.
fn words(code: &str) -> Vec<&str> {
    let mut words = Vec::new();
    let mut rest = code;
    while let Some(first) = rest.chars().next() {
        let identifier = |c: char| c.is_alphanumeric() || c == '_';
        let length = if identifier(first) {
            rest.find(|c| !identifier(c)).unwrap_or(rest.len())
        } else if rest.starts_with("::") {
            2
        } else {
            first.len_utf8()
        };
        let (word, after) = rest.split_at(length);
        if !first.is_whitespace() {
            words.push(word);
        }
        rest = after;
    }
    words
}

/// The name at a place, or the first names of every member of a `{...}` group there.
fn names_after(words: &[&str], at: usize, found: &mut BTreeSet<String>) {
    if words.get(at) != Some(&"{") {
        found.extend(words.get(at).map(|&w| w.to_owned()));
        return;
    }
    let (mut level, mut expected) = (0, true);
    for &word in &words[at..] {
        match word {
            "{" => level += 1,
            "}" => level -= 1,
            "," if level == 1 => expected = true,
            name if level == 1 && expected => {
                found.insert(name.to_owned());
                expected = false;
            }
            _ => {}
        }
        if level == 0 {
            return;
        }
    }
}

#[test]
fn imports_go_one_way() {
    let allowed: BTreeMap<&str, &[&str]> = ALLOWED.into_iter().collect();
    let mut wrong = Vec::new();
    let mut seen = BTreeSet::new();
    let sources = sources();
    assert!(sources.len() > 80, "only {} files found", sources.len());
    for source in &sources {
        let own = layer(&source.name);
        if own == "lib" || own == "main" {
            continue;
        }
        let Some(may_use) = allowed.get(own) else {
            wrong.push(format!("{own} is not in the table of layers"));
            continue;
        };
        for (code, in_tests) in [(&source.code, false), (&source.test_code, true)] {
            for used in imports(&source.name, code) {
                let known = allowed.contains_key(used.as_str());
                let excepted = in_tests && ALLOWED_IN_TESTS.contains(&(own, used.as_str()));
                if known && used != own && !may_use.contains(&used.as_str()) && !excepted {
                    wrong.push(format!("{} uses {used}", source.name));
                }
                seen.insert((own.to_owned(), used));
            }
        }
    }
    assert!(
        wrong.is_empty(),
        "against the direction of imports:\n{}",
        wrong.join("\n")
    );
    for (own, used) in [
        ("intake", "geometry"),
        ("solve", "grid"),
        ("flow", "solve"),
        ("report", "flow"),
        ("cli", "report"),
    ] {
        assert!(
            seen.contains(&(own.to_owned(), used.to_owned())),
            "the scanner did not see {own} use {used}"
        );
    }
}

#[test]
fn only_intake_reads_and_only_report_writes_files() {
    let mut wrong = Vec::new();
    let (mut reads, mut writes) = (0, 0);
    for source in sources() {
        let own = layer(&source.name);
        for word in READING.iter().filter(|word| source.code.contains(**word)) {
            reads += 1;
            if own != "intake" {
                wrong.push(format!("{}: {word} outside intake", source.name));
            }
        }
        for word in WRITING.iter().filter(|word| source.code.contains(**word)) {
            writes += 1;
            if own != "report" {
                wrong.push(format!("{}: {word} outside report", source.name));
            }
        }
        if source.code.contains("std::fs") && own != "intake" && own != "report" {
            wrong.push(format!(
                "{}: std::fs outside intake and report",
                source.name
            ));
        }
    }
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
    assert!(
        reads > 0 && writes > 0,
        "the scanner found no file access at all"
    );
}

#[test]
fn only_cli_prints_or_exits() {
    let words = [
        "println!",
        "eprintln!",
        "print!",
        "process::exit",
        "env::var",
        "env::args",
    ];
    let wrong: Vec<String> = sources()
        .iter()
        .filter(|source| !["cli", "main"].contains(&layer(&source.name)))
        .flat_map(|source| {
            let found = words.iter().filter(|word| source.code.contains(**word));
            found.map(|word| format!("{}: {word}", source.name))
        })
        .collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn no_file_is_too_long_to_read() {
    let wrong: Vec<String> = sources()
        .iter()
        .filter(|source| source.lines > LONGEST_FILE)
        .map(|source| format!("{}: {} lines", source.name, source.lines))
        .collect();
    assert!(wrong.is_empty(), "{}", wrong.join("\n"));
}

#[test]
fn the_scanner_sees_every_way_to_import() {
    let found = |name: &str, code: &str| {
        let source = source(name, code);
        let all: Vec<String> = imports(name, &source.code).into_iter().collect();
        all.join(" ")
    };
    assert_eq!(found("grid/mask.rs", "use crate::flow::Peak;"), "flow");
    assert_eq!(
        found("grid/mask.rs", "use crate::{flow::{Peak, Fluid}, units};"),
        "flow units"
    );
    assert_eq!(
        found("grid/mask.rs", "fn f() -> crate::cli::ExitStatus"),
        "cli"
    );
    assert_eq!(found("grid/mask.rs", "use super::super::report;"), "report");
    assert_eq!(
        found("grid/mod.rs", "use super::report::to_text;"),
        "report"
    );
    assert_eq!(found("grid/mask.rs", "use super::lattice::Lattice;"), "");
    assert_eq!(
        found(
            "a/b/c.rs",
            "use super::super::lid; use super::super::super::flow;"
        ),
        "flow"
    );
    assert_eq!(
        found(
            "grid/mask.rs",
            "// crate::flow\n/// [`crate::flow`]\nlet s = \"crate::flow\";"
        ),
        ""
    );
    let split = source(
        "grid/mask.rs",
        "use crate::units;\n#[cfg(test)]\nmod tests {\nuse crate::flow;\n}",
    );
    assert!(!split.code.contains("flow") && split.test_code.contains("crate::flow"));
}
