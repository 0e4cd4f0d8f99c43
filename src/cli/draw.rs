//! `etchwise draw`: nominal sections from process parameters.

use std::collections::BTreeMap;
use std::fmt::Write as _;

use clap::ArgMatches;

use crate::geometry::{
    NominalError, NominalSpec, Outline, ParameterInfo, Quantity, SpecValue, kinds, modifiers,
};
use crate::intake::{Extras, to_toml};
use crate::report::{check_target, write_file};

use super::exit_status::ExitStatus;
use super::failure::Failure;
use super::output;

pub(super) fn run(matches: &ArgMatches) -> Result<ExitStatus, Failure> {
    let Some((kind, matches)) = matches.subcommand() else {
        return Err(Failure::usage(
            "no kind of section was given",
            "type `etchwise draw --help` for the kinds",
        ));
    };
    super::set_threads(matches)?;
    let target = output::target(matches);
    let target = target.as_deref();
    if let Some(path) = target {
        check_target(path, &[])?;
    }
    let spec = spec(kind, matches).map_err(failure)?;
    let outline = spec.outline().map_err(failure)?;
    let name = matches.get_one::<String>("name").cloned();
    let is_table = target
        .and_then(|path| path.extension())
        .is_some_and(|extension| extension.eq_ignore_ascii_case("csv"));
    let text = if matches.get_flag("json") {
        json(&spec, &outline)?
    } else if is_table {
        csv(&outline)
    } else {
        let nominal = (!matches.get_flag("points")).then_some(spec);
        to_toml(
            name.as_deref(),
            &outline,
            nominal.as_ref(),
            &Extras::default(),
        )
    };
    match target {
        Some(path) => {
            write_file(path, text.as_bytes(), &[])?;
            if !matches.get_flag("quiet") {
                output::talk(&format!(
                    "wrote {}: area {:.6} um^2, wetted perimeter {:.6} um",
                    path.display(),
                    outline.area() * 1e12,
                    outline.wetted_perimeter() * 1e6
                ));
            }
        }
        None => output::print(&text)?,
    }
    Ok(ExitStatus::Done)
}

/// The typed options as a nominal section.
fn spec(kind: &str, matches: &ArgMatches) -> Result<NominalSpec, NominalError> {
    let parameters = kinds()
        .iter()
        .find(|info| info.name == kind)
        .map_or(&[][..], |info| info.parameters);
    let mut values = BTreeMap::new();
    for info in parameters.iter().chain(modifiers()) {
        let typed: Vec<&String> = matches
            .get_many::<String>(info.name)
            .into_iter()
            .flatten()
            .collect();
        if let Some(value) = value(info, &typed)? {
            values.insert(info.name.to_owned(), value);
        }
    }
    Ok(NominalSpec {
        kind: kind.to_owned(),
        values,
    })
}

fn value(info: &ParameterInfo, typed: &[&String]) -> Result<Option<SpecValue>, NominalError> {
    let Some(first) = typed.first() else {
        return Ok(None);
    };
    Ok(Some(match info.quantity {
        Quantity::Spec => nested(first)?,
        Quantity::SpecList => {
            let mut members = Vec::new();
            for text in typed {
                match nested(text)? {
                    SpecValue::List(list) => members.extend(list),
                    one => members.push(one),
                }
            }
            SpecValue::List(members)
        }
        _ => SpecValue::Text((*first).clone()),
    }))
}

/// A section with or without its brackets, or a list of sections.
fn nested(text: &str) -> Result<SpecValue, NominalError> {
    if text.trim_start().starts_with(['(', '[']) {
        text.parse()
    } else {
        text.parse().map(SpecValue::Spec)
    }
}

/// An error of the section, its advice written as an option.
fn failure(error: NominalError) -> Failure {
    match &error {
        NominalError::Missing {
            parameter, example, ..
        }
        | NominalError::BareNumber {
            parameter, example, ..
        }
        | NominalError::Unit {
            parameter, example, ..
        }
        | NominalError::NotReadable {
            parameter, example, ..
        } => {
            let option = parameter.replace('_', "-");
            let help = format!("write for example --{option} \"{example}\"");
            Failure::usage(&error, &help)
        }
        _ => error.into(),
    }
}

/// Outline in columns of text, micrometres, one loop after the other.
fn csv(outline: &Outline) -> String {
    let mut text = String::from("x_um,y_um,loop,lumen\n");
    let mut index = 0;
    for (lumen_index, lumen) in outline.lumens.iter().enumerate() {
        for wall in std::iter::once(&lumen.outer).chain(&lumen.islands) {
            for [x, y] in &wall.points {
                let _ = writeln!(text, "{},{},{index},{lumen_index}", x * 1e6, y * 1e6);
            }
            index += 1;
        }
    }
    text
}

/// Machine form: what was drawn and its outline in metres.
fn json(spec: &NominalSpec, outline: &Outline) -> Result<String, Failure> {
    let lumens: Vec<_> = outline
        .lumens
        .iter()
        .map(|lumen| {
            let islands: Vec<_> = lumen.islands.iter().map(|i| &i.points).collect();
            serde_json::json!({ "outer": lumen.outer.points, "islands": islands })
        })
        .collect();
    let quantity = |value: f64, unit: &str| serde_json::json!({ "value": value, "unit": unit });
    let record = serde_json::json!({
        "schema": "etchwise-draw/1",
        "tool_version": env!("CARGO_PKG_VERSION"),
        "kind": spec.kind,
        "area": quantity(outline.area(), "m^2"),
        "wetted_perimeter": quantity(outline.wetted_perimeter(), "m"),
        "lumens": lumens,
    });
    serde_json::to_string_pretty(&record)
        .map(|text| text + "\n")
        .map_err(|error| {
            Failure::new(
                ExitStatus::Unreadable,
                format!("the outline cannot be printed: {error}"),
                "leave out --json",
            )
        })
}
