//! Every shipped section file makes a sound outline and says what it is.

use std::path::PathBuf;

use super::super::{NominalSpec, SpecValue, kinds};
use super::assert_sound;
use crate::geometry::{Loop, Lumen, Outline, Point};

/// The parsed section files of a folder under `shapes/`, by name, with their text.
fn section_files(folder: &str) -> Vec<(String, String, toml::Table)> {
    let path: PathBuf = [env!("CARGO_MANIFEST_DIR"), "shapes", folder]
        .iter()
        .collect();
    let mut files: Vec<_> = std::fs::read_dir(&path)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|e| e == "toml"))
        .collect();
    files.sort();
    files
        .into_iter()
        .map(|path| {
            #[expect(
                clippy::disallowed_methods,
                reason = "a test reads the shipped files itself"
            )]
            let text = std::fs::read_to_string(&path).unwrap();
            let table = text.parse().unwrap();
            (
                path.file_name().unwrap().to_string_lossy().into_owned(),
                text,
                table,
            )
        })
        .collect()
}

/// A table as a nominal section.
fn spec(table: &toml::Table) -> NominalSpec {
    let mut values = std::collections::BTreeMap::new();
    for (name, value) in table.iter().filter(|(name, _)| *name != "kind") {
        values.insert(name.clone(), spec_value(value));
    }
    NominalSpec {
        kind: table["kind"].as_str().unwrap().to_owned(),
        values,
    }
}

fn spec_value(value: &toml::Value) -> SpecValue {
    match value {
        toml::Value::String(text) => SpecValue::Text(text.clone()),
        toml::Value::Integer(number) => SpecValue::Number(*number as f64),
        toml::Value::Float(number) => SpecValue::Number(*number),
        toml::Value::Table(table) => SpecValue::Spec(spec(table)),
        toml::Value::Array(members) => SpecValue::List(members.iter().map(spec_value).collect()),
        other => panic!("{other} is no value of a section"),
    }
}

/// A list of points in micrometres as a loop in metres.
fn wall(value: &toml::Value) -> Loop {
    let number = |v: &toml::Value| {
        let plain = v.as_integer().map(|n| n as f64);
        v.as_float().or(plain).unwrap() * 1e-6
    };
    let point = |v: &toml::Value| -> Point { [number(&v[0]), number(&v[1])] };
    Loop::new(value.as_array().unwrap().iter().map(point).collect())
}

#[test]
fn every_drawn_section_makes_a_sound_outline() {
    let files = section_files("drawn");
    assert!(files.len() >= 16, "{} files", files.len());
    let mut seen = std::collections::BTreeSet::new();
    for (file, text, table) in &files {
        assert!(text.starts_with("# "), "{file} has no comment");
        assert!(!table["name"].as_str().unwrap().is_empty(), "{file}");
        let spec = spec(table["nominal"].as_table().unwrap());
        let outline = spec
            .outline()
            .unwrap_or_else(|e| panic!("{file}: {e}; {}", e.hint()));
        assert_sound(&outline, file);
        seen.insert(spec.kind);
    }
    assert!(
        seen.iter()
            .all(|kind| kinds().iter().any(|info| info.name == kind))
    );
    assert!(seen.len() >= 12, "{seen:?}");
}

#[test]
fn every_outline_as_made_is_sound_and_says_that_it_is_invented() {
    let files = section_files("made");
    assert!(files.len() >= 8, "{} files", files.len());
    let (mut islands, mut lumens) = (0, 0);
    for (file, text, table) in &files {
        let comment = text.lines().next().unwrap();
        assert!(
            comment.starts_with("# ") && comment.contains("invented wafer"),
            "{file}"
        );
        assert_eq!(table["unit"].as_str(), Some("um"), "{file}");
        let made: Vec<Lumen> = table["lumen"]
            .as_array()
            .unwrap()
            .iter()
            .map(|lumen| Lumen {
                outer: wall(&lumen["outer"]),
                islands: lumen
                    .get("islands")
                    .and_then(toml::Value::as_array)
                    .map_or_else(Vec::new, |list| list.iter().map(wall).collect()),
            })
            .collect();
        let outline = Outline { lumens: made }.oriented();
        let vertices: usize = outline.loops().map(|l| l.points.len()).sum();
        assert!(
            (60..=400).contains(&vertices),
            "{file}: {vertices} vertices"
        );
        assert_sound(&outline, file);
        islands += outline
            .lumens
            .iter()
            .map(|l| l.islands.len())
            .sum::<usize>();
        lumens = lumens.max(outline.lumens.len());
    }
    assert_eq!((islands, lumens), (1, 2));
}
