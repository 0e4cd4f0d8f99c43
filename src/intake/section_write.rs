//! The text of a section file for a section; reading it gives the same section, bit by bit.
//!
//! Drawn outlines are written in micrometres. The shortest decimal that names a coordinate in metres is
//! moved by six places, so nothing is rounded.

use std::fmt::Write as _;

use super::section::Extras;
use super::section_reach::{Reach, ReachSection};
use crate::geometry::nominal::{NominalSpec, SpecValue};
use crate::geometry::{Loop, Outline};

/// Power of ten from metres to the unit of a written file.
const METRES_TO_MICROMETRES: i32 = 6;

/// A section as the text of a section file.
///
/// - `nominal`: when given, its dimensions are written instead of the vertices of `outline`
/// - `extras`: further tables of the file the section was read from
///
/// # Examples
/// ```
/// use etchwise::intake::{ReadOptions, section_from_bytes, to_toml};
/// let table = b"x_mm,y_mm\n0,0\n0.1,0\n0.1,0.07\n".to_vec();
/// let options = ReadOptions::default();
/// let section = section_from_bytes(table, "table.csv", &options).unwrap();
/// let text = to_toml(None, &section.outline, None, &section.extras);
/// assert!(text.contains("[100, 70]"));
/// let again = section_from_bytes(text.into_bytes(), "again.toml", &options).unwrap();
/// assert_eq!(again.outline, section.outline);
/// ```
pub fn to_toml(
    name: Option<&str>,
    outline: &Outline,
    nominal: Option<&NominalSpec>,
    extras: &Extras,
) -> String {
    let mut text = String::new();
    if let Some(name) = name {
        line(
            &mut text,
            &format!("name = {}", toml::Value::String(name.to_owned())),
        );
    }
    let drawn_reach = extras
        .reach
        .iter()
        .flat_map(sides)
        .any(|(_, side)| side.nominal.is_none());
    if nominal.is_none() || drawn_reach {
        line(&mut text, "unit = \"um\"");
    }
    match nominal {
        Some(spec) => {
            let mut top = toml::Table::new();
            top.insert("nominal".to_owned(), toml::Value::Table(spec_table(spec)));
            text.push('\n');
            text.push_str(&top.to_string());
        }
        None => write_lumens(&mut text, outline, "lumen"),
    }
    let mut kept = toml::Table::new();
    for (key, table) in [
        ("source", &extras.source),
        ("uncertainty", &extras.uncertainty),
    ] {
        if let Some(table) = table {
            kept.insert(key.to_owned(), toml::Value::Table(table.clone()));
        }
    }
    if !kept.is_empty() {
        text.push('\n');
        text.push_str(&kept.to_string());
    }
    if let Some(reach) = &extras.reach {
        write_reach(&mut text, reach);
    }
    text
}

/// The sections of a reach that are given, with their keys.
fn sides(reach: &Reach) -> impl Iterator<Item = (&'static str, &ReachSection)> {
    let sides = [("inner", &reach.inner), ("outer", &reach.outer)];
    sides
        .into_iter()
        .filter_map(|(key, side)| Some((key, side.as_ref()?)))
}

fn write_reach(text: &mut String, reach: &Reach) {
    line(text, "\n[reach]");
    if let Some(reason) = &reach.reason {
        line(
            text,
            &format!("reason = {}", toml::Value::String(reason.clone())),
        );
    }
    for (key, side) in sides(reach) {
        match &side.nominal {
            None => write_lumens(text, &side.outline, &format!("reach.{key}")),
            Some(spec) => {
                let mut top = spec_table(spec);
                for name in ["nominal", key, "reach"] {
                    let inside = toml::Value::Table(std::mem::take(&mut top));
                    top.insert(name.to_owned(), inside);
                }
                text.push('\n');
                text.push_str(&top.to_string());
            }
        }
    }
}

fn line(text: &mut String, content: &str) {
    text.push_str(content);
    text.push('\n');
}

fn write_lumens(text: &mut String, outline: &Outline, table: &str) {
    for lumen in &outline.lumens {
        line(text, &format!("\n[[{table}]]"));
        text.push_str("outer = ");
        write_loop(text, &lumen.outer, "");
        text.push('\n');
        if !lumen.islands.is_empty() {
            line(text, "islands = [");
            for island in &lumen.islands {
                text.push_str("  ");
                write_loop(text, island, "  ");
                line(text, ",");
            }
            line(text, "]");
        }
    }
}

fn write_loop(text: &mut String, wall: &Loop, indent: &str) {
    line(text, "[");
    for point in &wall.points {
        let [x, y] = point.map(|metres| shifted_decimal(metres, METRES_TO_MICROMETRES));
        // Writing to a String cannot fail.
        let _ = writeln!(text, "{indent}  [{x}, {y}],");
    }
    text.push_str(indent);
    text.push(']');
}

/// The shortest decimal of a value times a power of ten, exactly.
fn shifted_decimal(value: f64, shift: i32) -> String {
    let written = format!("{value:e}");
    let (mantissa, exponent) = written.split_once('e').unwrap_or((&written, "0"));
    let (sign, mantissa) = match mantissa.strip_prefix('-') {
        Some(rest) => ("-", rest),
        None => ("", mantissa),
    };
    let digits: String = mantissa.chars().filter(char::is_ascii_digit).collect();
    let exponent = exponent.parse::<i32>().unwrap_or(0) + shift;
    if digits == "0" {
        return format!("{sign}0");
    }
    let last = i32::try_from(digits.len()).unwrap_or(i32::MAX) - 1;
    if !(-6..=15).contains(&exponent) {
        return format!("{sign}{mantissa}e{exponent}");
    }
    let whole_digits = usize::try_from(exponent + 1).unwrap_or(0);
    if exponent >= last {
        return format!("{sign}{digits:0<whole_digits$}");
    }
    if exponent < 0 {
        let zeros = "0".repeat(usize::try_from(-exponent - 1).unwrap_or(0));
        return format!("{sign}0.{zeros}{digits}");
    }
    let (whole, part) = digits.split_at(whole_digits);
    format!("{sign}{whole}.{part}")
}

fn spec_table(spec: &NominalSpec) -> toml::Table {
    let mut table = toml::Table::new();
    table.insert("kind".to_owned(), toml::Value::String(spec.kind.clone()));
    for (key, value) in &spec.values {
        table.insert(key.clone(), spec_value(value));
    }
    table
}

fn spec_value(value: &SpecValue) -> toml::Value {
    match value {
        SpecValue::Text(text) => toml::Value::String(text.clone()),
        SpecValue::Number(number) => toml::Value::Float(*number),
        SpecValue::Spec(spec) => toml::Value::Table(spec_table(spec)),
        SpecValue::List(items) => toml::Value::Array(items.iter().map(spec_value).collect()),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn decimals_are_moved_exactly() {
        for (value, text) in [
            (3e-5, "30"),
            (1e-4, "100"),
            (1.25e-6, "1.25"),
            (-1.25e-8, "-0.0125"),
            (0.0, "0"),
            (-0.0, "-0"),
            (2.999_999_999_999_999_7e-5, "29.999999999999997"),
            (1.0, "1000000"),
            (1.5e20, "1.5e26"),
            (1.5e-20, "1.5e-14"),
        ] {
            assert_eq!(shifted_decimal(value, 6), text);
        }
    }

    proptest::proptest! {
        #[test]
        fn a_moved_decimal_reads_back_to_the_same_bits(mantissa in -1.0_f64..1.0, exponent in -12_i32..2) {
            let value = mantissa * 10.0_f64.powi(exponent);
            let scale = crate::units::length_scale("um").unwrap();
            let back = scale.read(&shifted_decimal(value, 6), &mut String::new()).unwrap();
            proptest::prop_assert_eq!(back.to_bits(), value.to_bits());
        }
    }
}
