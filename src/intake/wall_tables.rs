//! The `[[wall]]` tables of a section file: names for stretches of wall.
//!
//! ```toml
//! [[wall]]
//! name = "electrode"
//! from = [10, 0]
//! to = [40, 0]
//! ```
//! `loop` is the number of the loop in the order of the file, from 1, the first where it is left out.
//! Without `from` and `to` the whole loop is meant.

use toml::de::DeTable;

use super::read_error::{Fault, ReadProblem};
use super::toml_values::{Value, check_keys, fault, number, string, wrong_type};
use crate::geometry::{NamedWall, Outline, Point, WallStretch, wall_stretches};
use crate::units::{UnitScale, parse_length};

const KEYS: [&str; 4] = ["name", "loop", "from", "to"];
const TABLES: &str = "a list of tables: [[wall]]";
const PAIR: &str = "a point: [x, y]";

/// The named walls of a section file, if there are any.
///
/// - `scale`: of bare coordinates, where the file or the caller gives one
pub(crate) fn read(
    text: &str,
    table: &DeTable<'_>,
    scale: Option<UnitScale>,
    outline: &Outline,
) -> Result<Vec<WallStretch>, Fault> {
    let Some(value) = table.get("wall") else {
        return Ok(Vec::new());
    };
    let items = value.get_ref().as_array();
    let items = items.ok_or_else(|| wrong_type(text, value, "wall", TABLES))?;
    let walls: Vec<NamedWall> = items
        .iter()
        .map(|item| wall(text, item, scale))
        .collect::<Result<_, _>>()?;
    let oriented = outline.clone().oriented();
    wall_stretches(&oriented, &walls).map_err(|(index, source)| {
        let place = items.get(index).unwrap_or(value);
        Fault::at(text, place.span().start, None, ReadProblem::Wall { source })
    })
}

fn wall(text: &str, value: &Value<'_>, scale: Option<UnitScale>) -> Result<NamedWall, Fault> {
    let table = value.get_ref().as_table();
    let table = table.ok_or_else(|| wrong_type(text, value, "wall", TABLES))?;
    check_keys(text, table, "[[wall]]", &KEYS)?;
    let missing = |key| {
        let problem = ReadProblem::MissingKey {
            key,
            table: "[[wall]]",
        };
        fault(text, value, "wall", problem)
    };
    let name = table.get("name").ok_or_else(|| missing("name"))?;
    let name = string(text, name, "name", "a name in quotes")?.to_owned();
    let loop_number = match table.get("loop") {
        None => 1,
        Some(value) => loop_number(text, value)?,
    };
    let ends = match (table.get("from"), table.get("to")) {
        (None, None) => None,
        (Some(_), None) => return Err(missing("to")),
        (None, Some(_)) => return Err(missing("from")),
        (Some(from), Some(to)) => Some([
            point(text, from, "from", scale)?,
            point(text, to, "to", scale)?,
        ]),
    };
    Ok(NamedWall {
        name,
        loop_number,
        ends,
    })
}

fn loop_number(text: &str, value: &Value<'_>) -> Result<usize, Fault> {
    let integer = value.get_ref().as_integer();
    integer
        .and_then(|i| usize::from_str_radix(i.as_str(), i.radix()).ok())
        .ok_or_else(|| wrong_type(text, value, "loop", "the number of a loop, from 1"))
}

fn point(
    text: &str,
    value: &Value<'_>,
    key: &str,
    scale: Option<UnitScale>,
) -> Result<Point, Fault> {
    let pair = value.get_ref().as_array();
    let pair = pair.ok_or_else(|| wrong_type(text, value, key, PAIR))?;
    match pair.iter().as_slice() {
        [x, y] => Ok([
            coordinate(text, x, key, scale)?,
            coordinate(text, y, key, scale)?,
        ]),
        other => {
            let found = other.len();
            Err(fault(text, value, key, ReadProblem::NotAPair { found }))
        }
    }
}

fn coordinate(
    text: &str,
    value: &Value<'_>,
    key: &str,
    scale: Option<UnitScale>,
) -> Result<f64, Fault> {
    if let Some(written) = value.get_ref().as_str() {
        return parse_length(written)
            .map_err(|source| fault(text, value, key, ReadProblem::Unit { source }));
    }
    let expected = "a number, or a length in quotes";
    let plain = UnitScale::from_factor(1.0);
    let metres = number(text, value, key, scale.unwrap_or(plain), &mut String::new())?;
    let metres = metres.ok_or_else(|| wrong_type(text, value, key, expected))?;
    if scale.is_none() {
        return Err(fault(text, value, key, ReadProblem::MissingUnit));
    }
    Ok(metres)
}
