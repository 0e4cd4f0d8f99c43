//! What the crate stands on: every licence permissive, every second version of a package known.
//!
//! `cargo tree` lists what is built for this machine (normal, build and development dependencies) from
//! the lock file, without a network.

#![expect(clippy::unwrap_used, reason = "a test stops at the first surprise")]

use std::collections::{BTreeMap, BTreeSet};
use std::process::Command;

/// Licences that ask for no more than their text and the notice to be kept. SPDX names.
const PERMISSIVE: [&str; 12] = [
    "0BSD",
    "Apache-2.0",
    "Apache-2.0 WITH LLVM-exception",
    "BSD-2-Clause",
    "BSD-3-Clause",
    "BSL-1.0",
    "CC0-1.0",
    "ISC",
    "MIT",
    "MIT-0",
    "Unicode-3.0",
    "Zlib",
];

/// Packages that come in more than one version, and why that cannot be helped.
const KNOWN_DUPLICATES: [(&str, &str); 3] = [
    (
        "getrandom",
        "jsonschema's hash maps are a version behind tempfile; tests only",
    ),
    ("miniz_oxide", "png and flate2 are at different versions"),
    (
        "syn",
        "serde's derive macros are a version ahead of the others",
    ),
];

/// One package that is built.
#[derive(Debug, PartialEq, Eq, PartialOrd, Ord)]
struct Package {
    name: String,
    version: String,
    licence: String,
}

fn packages() -> BTreeSet<Package> {
    let output = Command::new(env!("CARGO"))
        .current_dir(env!("CARGO_MANIFEST_DIR"))
        .args([
            "tree",
            "--locked",
            "--offline",
            "--edges",
            "normal,build,dev",
        ])
        .args(["--prefix", "none", "--format", "{p}|{l}"])
        .output()
        .unwrap();
    assert!(
        output.status.success(),
        "cargo tree: {}",
        String::from_utf8_lossy(&output.stderr)
    );
    let text = String::from_utf8(output.stdout).unwrap();
    text.lines()
        .map(|line| {
            let (package, licence) = line.split_once('|').unwrap();
            let mut words = package.split_whitespace();
            Package {
                name: words.next().unwrap().to_owned(),
                version: words.next().unwrap().to_owned(),
                // A package shown before is marked with a star.
                licence: licence.trim_end_matches("(*)").trim().to_owned(),
            }
        })
        .collect()
}

/// Whether a licence expression can be met with permissive licences alone.
///
/// Grammar: `OR` (or the old `/`) of `AND` of licences or bracketed expressions; `AND` binds tighter.
fn is_permissive(expression: &str) -> bool {
    let spaced = expression
        .replace('/', " OR ")
        .replace('(', " ( ")
        .replace(')', " ) ");
    let words: Vec<&str> = spaced.split_whitespace().collect();
    let mut next = 0;
    let holds = alternatives(&words, &mut next);
    holds && next == words.len()
}

fn alternatives(words: &[&str], next: &mut usize) -> bool {
    let mut any = conjunction(words, next);
    while words.get(*next) == Some(&"OR") {
        *next += 1;
        let one = conjunction(words, next);
        any |= one;
    }
    any
}

fn conjunction(words: &[&str], next: &mut usize) -> bool {
    let mut all = licence(words, next);
    while words.get(*next) == Some(&"AND") {
        *next += 1;
        let one = licence(words, next);
        all &= one;
    }
    all
}

fn licence(words: &[&str], next: &mut usize) -> bool {
    let Some(&word) = words.get(*next) else {
        return false;
    };
    *next += 1;
    if word == "(" {
        let holds = alternatives(words, next);
        let closed = words.get(*next) == Some(&")");
        *next += 1;
        return holds && closed;
    }
    let mut name = word.to_owned();
    if words.get(*next) == Some(&"WITH") {
        name = format!("{word} WITH {}", words.get(*next + 1).unwrap_or(&""));
        *next += 2;
    }
    PERMISSIVE.contains(&name.as_str())
}

#[test]
fn every_package_can_be_used_under_a_permissive_licence() {
    let packages = packages();
    assert!(
        packages.len() > 60,
        "only {} packages listed",
        packages.len()
    );
    let refused: Vec<&Package> = packages
        .iter()
        .filter(|package| !is_permissive(&package.licence))
        .collect();
    assert!(refused.is_empty(), "{refused:#?}");
}

#[test]
fn packages_in_two_versions_are_the_known_ones() {
    let mut versions: BTreeMap<String, BTreeSet<String>> = BTreeMap::new();
    for package in packages() {
        versions
            .entry(package.name)
            .or_default()
            .insert(package.version);
    }
    let twice: Vec<_> = versions.iter().filter(|(_, v)| v.len() > 1).collect();
    let names: Vec<&str> = twice.iter().map(|(name, _)| name.as_str()).collect();
    let known: Vec<&str> = KNOWN_DUPLICATES.iter().map(|&(name, _)| name).collect();
    assert_eq!(names, known, "{twice:#?}");
}

#[test]
fn licence_expressions_are_read_as_written() {
    for good in [
        "MIT",
        "MIT OR GPL-3.0-only",
        "GPL-3.0-only/MIT",
        "LGPL-2.1 OR Apache-2.0 OR MIT",
        "(MIT OR Apache-2.0) AND Unicode-3.0",
        "Apache-2.0 WITH LLVM-exception",
    ] {
        assert!(is_permissive(good), "{good}");
    }
    for bad in [
        "",
        "LGPL-2.1",
        "MIT AND GPL-3.0-only",
        "(MIT OR Apache-2.0) AND MPL-2.0",
        "GPL-2.0 WITH Classpath-exception-2.0",
        "(MIT",
    ] {
        assert!(!is_permissive(bad), "{bad}");
    }
}
