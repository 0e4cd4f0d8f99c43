//! Values of a TOML text with their places: types, numbers, and conversion to plain values.

use toml::Spanned;
use toml::de::{DeTable, DeValue};

use super::read_error::{Fault, ReadProblem};
use crate::units::UnitScale;
use crate::units::spelling::nearest;

/// A value with its place.
pub(crate) type Value<'i> = Spanned<DeValue<'i>>;

/// Parses a TOML text.
pub(crate) fn parse(text: &str) -> Result<Spanned<DeTable<'_>>, Fault> {
    DeTable::parse(text).map_err(|error| {
        let offset = error.span().map_or(0, |span| span.start);
        let message = error.message().to_owned();
        Fault::at(text, offset, None, ReadProblem::Toml { message })
    })
}

/// A fault at a value.
pub(crate) fn fault(text: &str, value: &Value<'_>, field: &str, problem: ReadProblem) -> Fault {
    Fault::at(text, value.span().start, Some(field), problem)
}

/// A fault about the type of a value.
pub(crate) fn wrong_type(
    text: &str,
    value: &Value<'_>,
    key: &str,
    expected: &'static str,
) -> Fault {
    let problem = ReadProblem::WrongType {
        key: key.to_owned(),
        expected,
        found: value.get_ref().type_str(),
    };
    Fault::at(text, value.span().start, None, problem)
}

/// Refuses keys that are not known, with the nearest spelling.
pub(crate) fn check_keys(
    text: &str,
    table: &DeTable<'_>,
    name: &'static str,
    known: &[&str],
) -> Result<(), Fault> {
    let Some((key, _)) = table
        .iter()
        .find(|(key, _)| !known.contains(&key.get_ref().as_ref()))
    else {
        return Ok(());
    };
    let problem = ReadProblem::UnknownKey {
        key: key.get_ref().to_string(),
        table: name,
        nearest: nearest(key.get_ref(), known).map(str::to_owned),
        known: known.join(", "),
    };
    Err(Fault::at(text, key.span().start, None, problem))
}

/// A string.
pub(crate) fn string<'a>(
    text: &str,
    value: &'a Value<'_>,
    key: &str,
    expected: &'static str,
) -> Result<&'a str, Fault> {
    value
        .get_ref()
        .as_str()
        .ok_or_else(|| wrong_type(text, value, key, expected))
}

/// A finite number in some unit, `None` when the value is not a number.
pub(crate) fn number(
    text: &str,
    value: &Value<'_>,
    field: &str,
    scale: UnitScale,
    buffer: &mut String,
) -> Result<Option<f64>, Fault> {
    let read = match value.get_ref() {
        DeValue::Float(float) => scale.read(float.as_str(), buffer),
        DeValue::Integer(integer) if integer.radix() == 10 => scale.read(integer.as_str(), buffer),
        DeValue::Integer(integer) => u64::from_str_radix(integer.as_str(), integer.radix())
            .ok()
            .map(|whole| scale.apply(whole as f64)),
        _ => return Ok(None),
    };
    match read {
        Some(number) if number.is_finite() => Ok(Some(number)),
        _ => {
            let written = text.get(value.span()).unwrap_or_default().to_owned();
            Err(fault(
                text,
                value,
                field,
                ReadProblem::NotFinite { text: written },
            ))
        }
    }
}

/// A table as plain values, for other work to read.
pub(crate) fn plain_table(text: &str, table: &DeTable<'_>) -> Result<toml::Table, Fault> {
    table
        .iter()
        .map(|(key, value)| Ok((key.get_ref().to_string(), plain(text, value)?)))
        .collect()
}

fn plain(text: &str, value: &Value<'_>) -> Result<toml::Value, Fault> {
    Ok(match value.get_ref() {
        DeValue::String(string) => toml::Value::String(string.to_string()),
        DeValue::Integer(integer) => i64::from_str_radix(integer.as_str(), integer.radix())
            .map(toml::Value::Integer)
            .map_err(|_| wrong_type(text, value, integer.as_str(), "a number of 64 bits"))?,
        DeValue::Float(_) => {
            let metre = UnitScale::from_factor(1.0);
            let number = number(text, value, "number", metre, &mut String::new())?;
            toml::Value::Float(number.unwrap_or_default())
        }
        DeValue::Boolean(boolean) => toml::Value::Boolean(*boolean),
        DeValue::Datetime(moment) => toml::Value::Datetime(*moment),
        DeValue::Array(items) => toml::Value::Array(
            items
                .iter()
                .map(|item| plain(text, item))
                .collect::<Result<_, _>>()?,
        ),
        DeValue::Table(table) => toml::Value::Table(plain_table(text, table)?),
    })
}
