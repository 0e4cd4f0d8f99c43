//! Which column is which, and in which unit: the header of an outline in columns.
//!
//! A coordinate column begins with `x`, or with `y` or `z` for the height, and may name its unit in any of
//! the forms `x_um`, `x (um)`, `x [um]`, `x/um`, `x um`.

use super::delimited_text::offset_of;
use super::read_error::ReadProblem;
use super::section::UnitOption;
use crate::units::{Quantity, UnitError, UnitScale, length_scale};

/// A column by its place and unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Axis {
    /// Place in the row, from 0.
    pub(crate) index: usize,
    /// Unit.
    pub(crate) scale: UnitScale,
}

/// Columns of an outline.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct Columns {
    pub(crate) x: Axis,
    pub(crate) y: Axis,
    /// Place of the loop label.
    pub(crate) loop_label: Option<usize>,
    /// Place of the lumen label.
    pub(crate) lumen_label: Option<usize>,
    /// Columns in a row.
    pub(crate) count: usize,
    /// Name of the unit, for messages.
    pub(crate) unit: String,
}

/// Meaning of one header field.
#[derive(Debug, PartialEq)]
enum Meaning<'a> {
    X(&'a str),
    Y(&'a str),
    Loop,
    Lumen,
}

impl Columns {
    /// Columns of a table without a header: x, then y, in the unit asked for.
    pub(crate) fn without_header(option: Option<&UnitOption>) -> Result<Self, ReadProblem> {
        let option = option.ok_or(ReadProblem::MissingUnit)?;
        let axis = |index| Axis {
            index,
            scale: option.scale,
        };
        Ok(Self {
            x: axis(0),
            y: axis(1),
            loop_label: None,
            lumen_label: None,
            count: 2,
            unit: option.word.clone(),
        })
    }

    /// Columns by a header; a problem comes with the index of its field.
    pub(crate) fn from_header(
        fields: &[&str],
        option: Option<&UnitOption>,
    ) -> Result<Self, Box<(usize, ReadProblem)>> {
        let (mut x, mut y, mut loop_label, mut lumen_label) = (None, None, None, None);
        let mut unit = String::new();
        for (index, field) in fields.iter().enumerate() {
            let unknown = || {
                let name = (*field).to_owned();
                Box::new((index, ReadProblem::HeaderColumn { name }))
            };
            let mut axis = |text: &str| -> Result<Axis, Box<(usize, ReadProblem)>> {
                let scale =
                    axis_scale(text, option).map_err(|problem| Box::new((index, problem)))?;
                unit = match option {
                    Some(option) if text.is_empty() => option.word.clone(),
                    _ => text.to_owned(),
                };
                Ok(Axis { index, scale })
            };
            let twice = match meaning(field).ok_or_else(unknown)? {
                Meaning::X(text) => x.replace(axis(text)?).is_some(),
                Meaning::Y(text) => y.replace(axis(text)?).is_some(),
                Meaning::Loop => loop_label.replace(index).is_some(),
                Meaning::Lumen => lumen_label.replace(index).is_some(),
            };
            if twice {
                return Err(unknown());
            }
        }
        let missing = |missing| Box::new((0, ReadProblem::Header { missing }));
        Ok(Self {
            x: x.ok_or_else(|| missing("x"))?,
            y: y.ok_or_else(|| missing("y"))?,
            loop_label,
            lumen_label,
            count: fields.len(),
            unit,
        })
    }
}

/// What a header field means, with the text of its unit.
fn meaning(field: &str) -> Option<Meaning<'_>> {
    let field = field.trim();
    if field.eq_ignore_ascii_case("loop") {
        return Some(Meaning::Loop);
    }
    if field.eq_ignore_ascii_case("lumen") {
        return Some(Meaning::Lumen);
    }
    let mut characters = field.chars();
    let letter = characters.next()?;
    let rest = characters.as_str();
    if rest.starts_with(char::is_alphanumeric) {
        return None;
    }
    let unit = rest.trim_matches(|c: char| {
        c.is_whitespace() || matches!(c, '_' | '(' | ')' | '[' | ']' | '/' | ':' | '"')
    });
    match letter {
        'x' | 'X' => Some(Meaning::X(unit)),
        'y' | 'Y' | 'z' | 'Z' => Some(Meaning::Y(unit)),
        _ => None,
    }
}

/// The scale of a column from its unit and the unit asked for, which must agree.
fn axis_scale(unit: &str, option: Option<&UnitOption>) -> Result<UnitScale, ReadProblem> {
    if unit.is_empty() {
        return option.map(|o| o.scale).ok_or(ReadProblem::MissingUnit);
    }
    let scale = known_length(unit).map_err(|source| ReadProblem::Unit { source })?;
    if let Some(option) = option {
        option.must_agree(unit, scale)?;
    }
    Ok(scale)
}

/// The scale of a unit of length by its name.
pub(crate) fn known_length(unit: &str) -> Result<UnitScale, UnitError> {
    if unit.contains('\u{fffd}') {
        return Err(UnitError::DestroyedCharacter {
            text: unit.to_owned(),
        });
    }
    length_scale(unit).ok_or_else(|| UnitError::UnknownUnit {
        unit: unit.to_owned(),
        quantity: Quantity::Length.name(),
        known: Quantity::Length.known_units().to_owned(),
    })
}

/// Joins the words of a header whose columns are separated by spaces: `x (um) y (um)`.
pub(crate) fn join_units<'a>(content: &'a str, words: &mut Vec<&'a str>) {
    let mut joined: Vec<&'a str> = Vec::with_capacity(words.len());
    for &word in words.iter() {
        let belongs = word.starts_with(['(', '[', '/']) || length_scale(word).is_some();
        let axis = joined.last().filter(|last| {
            belongs && matches!(meaning(last), Some(Meaning::X("") | Meaning::Y("")))
        });
        let whole = axis.and_then(|last| {
            let start = offset_of(content, last);
            content.get(start..offset_of(content, word) + word.len())
        });
        match whole {
            Some(whole) => {
                joined.pop();
                joined.push(whole);
            }
            None => joined.push(word),
        }
    }
    *words = joined;
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn units_in_every_form() {
        for field in [
            "x_um",
            "x (um)",
            "x [\u{b5}m]",
            "X/um",
            "x um",
            "x(\u{3bc}m)",
            "x: micron",
        ] {
            let columns = Columns::from_header(&[field, "z_mm"], None).unwrap();
            assert!((columns.x.scale.factor() - 1e-6).abs() < 1e-20, "{field}");
            assert!((columns.y.scale.factor() - 1e-3).abs() < 1e-15);
        }
        let swapped = Columns::from_header(&["loop", "y_um", "x_um"], None).unwrap();
        assert_eq!(
            (swapped.x.index, swapped.y.index, swapped.loop_label),
            (2, 1, Some(0))
        );
    }

    #[test]
    fn what_a_header_must_not_be() {
        let problem = |fields: &[&str]| *Columns::from_header(fields, None).unwrap_err();
        assert!(matches!(
            problem(&["x", "y_um"]),
            (0, ReadProblem::MissingUnit)
        ));
        assert!(matches!(
            problem(&["x_um", "y_ft"]),
            (1, ReadProblem::Unit { .. })
        ));
        assert!(matches!(
            problem(&["x_um"]),
            (0, ReadProblem::Header { missing: "y" })
        ));
        assert!(matches!(
            problem(&["x_um", "y_um", "z_um"]),
            (2, ReadProblem::HeaderColumn { .. })
        ));
        assert!(matches!(
            problem(&["year", "x_um"]),
            (0, ReadProblem::HeaderColumn { .. })
        ));
        let destroyed = problem(&["x (\u{fffd}m)", "y_um"]).1;
        assert!(matches!(
            destroyed,
            ReadProblem::Unit {
                source: UnitError::DestroyedCharacter { .. }
            }
        ));
    }

    #[test]
    fn spaced_headers_are_joined() {
        let content = "x (um) y [mm] loop";
        let mut words: Vec<&str> = content.split_whitespace().collect();
        join_units(content, &mut words);
        assert_eq!(words, ["x (um)", "y [mm]", "loop"]);
    }
}
