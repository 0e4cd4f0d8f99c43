//! `[source]` of a section that came out of an instrument's file: what a reader needs to repeat it.

use toml::{Table, Value};

use super::provenance::Provenance;
use super::step::Step;

/// The table: file with its hash, options as given, steps with their numbers.
pub(crate) fn source_table(
    provenance: &Provenance,
    settings: &[(String, String)],
    steps: &[Step],
) -> Table {
    let text = |s: &str| Value::String(s.to_owned());
    let mut table = Table::new();
    table.insert("file".to_owned(), text(&provenance.path));
    table.insert("sha256".to_owned(), text(&provenance.sha256));
    table.insert("kind".to_owned(), text(provenance.kind.word()));
    let bytes = i64::try_from(provenance.bytes).unwrap_or(i64::MAX);
    table.insert("bytes".to_owned(), Value::Integer(bytes));
    table.insert("encoding".to_owned(), text(provenance.encoding));
    table.insert(
        "tool".to_owned(),
        text(concat!("etchwise ", env!("CARGO_PKG_VERSION"))),
    );
    let settings: Vec<Value> = settings
        .iter()
        .map(|(option, value)| text(format!("{option} {value}").trim_end()))
        .collect();
    table.insert("options".to_owned(), Value::Array(settings));
    let steps = steps.iter().map(|step| Value::Table(step_table(step)));
    table.insert("steps".to_owned(), Value::Array(steps.collect()));
    table
}

fn step_table(step: &Step) -> Table {
    let mut table = Table::new();
    table.insert("what".to_owned(), Value::String(step.what.to_owned()));
    table.insert("text".to_owned(), Value::String(step.text.clone()));
    for &(key, value) in &step.numbers {
        if value.is_finite() && !table.contains_key(key) {
            table.insert(key.to_owned(), Value::Float(value));
        }
    }
    table
}
