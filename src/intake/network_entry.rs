//! Entries of the file of a net: tables in a list, names, and values with their units.

use std::collections::HashMap;

use toml::de::{DeTable, DeValue};

use super::card_file::one_line;
use super::network_problem::NetworkProblem;
use super::read_error::{Fault, ReadProblem};
use super::source_text::place_at;
use super::toml_values::{Value, check_keys, string, wrong_type};
use crate::units::spelling::nearest;
use crate::units::{UnitError, parse_fraction};

/// Longest name, characters.
const LONGEST_NAME: usize = 200;

/// Places of names that are taken.
pub(super) struct Names {
    what: &'static str,
    places: HashMap<String, (usize, usize)>,
}

/// One `[[...]]` table.
pub(super) struct Entry<'a, 'i> {
    pub(super) text: &'a str,
    pub(super) value: &'a Value<'i>,
    pub(super) table: &'a DeTable<'i>,
    head: &'static str,
}

pub(super) fn at(text: &str, value: &Value<'_>, source: NetworkProblem) -> Fault {
    Fault::at(
        text,
        value.span().start,
        None,
        ReadProblem::Network { source },
    )
}

/// The tables of a list that must not be empty.
pub(super) fn entries<'a, 'i>(
    text: &'a str,
    table: &'a DeTable<'i>,
    key: &'static str,
    head: &'static str,
) -> Result<Vec<Entry<'a, 'i>>, Fault> {
    let Some(value) = table.get(key) else {
        let source = NetworkProblem::None { what: key };
        return Err(ReadProblem::Network { source }.into());
    };
    let expected = "a list of tables, each with its head in double brackets";
    let list = value
        .get_ref()
        .as_array()
        .ok_or_else(|| wrong_type(text, value, key, expected))?;
    if list.is_empty() {
        return Err(at(text, value, NetworkProblem::None { what: key }));
    }
    list.iter()
        .map(|value| {
            let table = value.get_ref().as_table();
            let table = table.ok_or_else(|| wrong_type(text, value, key, expected))?;
            Ok(Entry {
                text,
                value,
                table,
                head,
            })
        })
        .collect()
}

/// A name: one line, neither empty nor very long.
pub(super) fn name_of(text: &str, value: &Value<'_>) -> Result<String, Fault> {
    let name = one_line(string(text, value, "name", "a text in quotes")?);
    let found = name.trim().chars().count();
    if found == 0 || found > LONGEST_NAME {
        let limit = LONGEST_NAME;
        return Err(at(text, value, NetworkProblem::NameLength { found, limit }));
    }
    Ok(name.trim().to_owned())
}

/// A value with its unit, in quotes.
pub(super) fn measured(
    text: &str,
    value: &Value<'_>,
    key: &'static str,
    expected: &'static str,
    read: impl Fn(&str) -> Result<f64, UnitError>,
) -> Result<f64, Fault> {
    let DeValue::String(written) = value.get_ref() else {
        return Err(wrong_type(text, value, key, expected));
    };
    read(written).map_err(|source| {
        Fault::at(
            text,
            value.span().start,
            Some(key),
            ReadProblem::Unit { source },
        )
    })
}

impl Names {
    pub(super) fn new(what: &'static str) -> Self {
        Self {
            what,
            places: HashMap::new(),
        }
    }

    /// The place of a name.
    pub(super) fn find(&self, text: &str, value: &Value<'_>) -> Result<usize, Fault> {
        let name = name_of(text, value)?;
        if let Some(&(index, _)) = self.places.get(&name) {
            return Ok(index);
        }
        let mut known: Vec<&str> = self.places.keys().map(String::as_str).collect();
        known.sort_unstable();
        let source = NetworkProblem::Unknown {
            what: self.what,
            nearest: nearest(&name, &known).map(str::to_owned),
            name,
        };
        Err(at(text, value, source))
    }
}

impl<'a, 'i> Entry<'a, 'i> {
    pub(super) fn check(&self, known: &[&str]) -> Result<(), Fault> {
        check_keys(self.text, self.table, self.head, known)
    }

    pub(super) fn required(&self, key: &'static str) -> Result<&'a Value<'i>, Fault> {
        self.table.get(key).ok_or_else(|| {
            let problem = ReadProblem::MissingKey {
                key,
                table: self.head,
            };
            Fault::at(self.text, self.value.span().start, None, problem)
        })
    }

    /// The name, which nothing of the kind has yet.
    pub(super) fn own_name(&self, names: &mut Names) -> Result<String, Fault> {
        let value = self.required("name")?;
        let name = name_of(self.text, value)?;
        if let Some((_, offset)) = names.places.get(&name) {
            let source = NetworkProblem::Duplicate {
                what: names.what,
                line: place_at(self.text, *offset).line,
                name,
            };
            return Err(at(self.text, value, source));
        }
        let index = names.places.len();
        names
            .places
            .insert(name.clone(), (index, value.span().start));
        Ok(name)
    }

    /// A relative uncertainty, zero where there is none.
    pub(super) fn share(&self, key: &'static str) -> Result<f64, Fault> {
        let Some(value) = self.table.get(key) else {
            return Ok(0.0);
        };
        let share = measured(
            self.text,
            value,
            key,
            "a share in quotes, such as \"2 %\"",
            parse_fraction,
        )?;
        if (0.0..1.0).contains(&share) {
            return Ok(share);
        }
        Err(at(
            self.text,
            value,
            NetworkProblem::NotAShare {
                text: written(value),
            },
        ))
    }
}

/// A value as it stands in the file.
pub(super) fn written(value: &Value<'_>) -> String {
    value.get_ref().as_str().map(one_line).unwrap_or_default()
}
