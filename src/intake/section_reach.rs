//! `[reach]` of a section file: the smallest and the largest section that the wall could be.
//!
//! ```toml
//! [reach]
//! reason = "flanks steeper than the stylus"
//! [[reach.inner]]
//! outer = [[1, 0], [99, 0], [99, 50], [1, 50]]
//! [reach.outer.nominal]
//! kind = "rectangle"
//! width = "101 um"
//! height = "51 um"
//! ```
//! Each of `inner` and `outer` is a list of lumens in the form of `[[lumen]]`, or a nominal section; one of
//! the two may be missing.

use toml::de::{DeTable, DeValue};

use super::read_error::{Fault, ReadProblem};
use super::section_file::{Coordinates, LumenList, nominal_outline};
use super::toml_values::{Value, check_keys, fault, string, wrong_type};
use crate::geometry::Outline;
use crate::geometry::nominal::NominalSpec;

/// Keys of `[reach]`.
const REACH_KEYS: [&str; 3] = ["reason", "inner", "outer"];

/// One of the two sections of [`Reach`].
#[derive(Debug, Clone, PartialEq)]
pub struct ReachSection {
    /// Its outline, m.
    pub outline: Outline,
    /// The nominal section it was made from, where it is one.
    pub nominal: Option<NominalSpec>,
}

/// The sections between which the true one lies; at least one of them is given.
#[derive(Debug, Clone, PartialEq)]
pub struct Reach {
    /// The smallest it could be; `None` for the section itself.
    pub inner: Option<ReachSection>,
    /// The largest it could be; `None` for the section itself.
    pub outer: Option<ReachSection>,
    /// Why the wall is not known better.
    pub reason: Option<String>,
}

/// Reads `[reach]`.
pub(super) fn read(
    text: &str,
    value: &Value<'_>,
    coordinates: &mut Coordinates<'_>,
) -> Result<Reach, Fault> {
    let table = value
        .get_ref()
        .as_table()
        .ok_or_else(|| wrong_type(text, value, "reach", "a table: [reach]"))?;
    check_keys(text, table, "[reach]", &REACH_KEYS)?;
    let reason = match table.get("reason") {
        Some(value) => Some(string(text, value, "reason", "a text in quotes")?.to_owned()),
        None => None,
    };
    let mut side = |key: &str, list: LumenList| match table.get(key) {
        Some(value) => section(text, value, list, coordinates).map(Some),
        None => Ok(None),
    };
    let inner = side("inner", LumenList::INNER)?;
    let outer = side("outer", LumenList::OUTER)?;
    if inner.is_none() && outer.is_none() {
        return Err(fault(text, value, "reach", ReadProblem::EmptyReach));
    }
    Ok(Reach {
        inner,
        outer,
        reason,
    })
}

fn section(
    text: &str,
    value: &Value<'_>,
    list: LumenList,
    coordinates: &mut Coordinates<'_>,
) -> Result<ReachSection, Fault> {
    let nominal_of = |table: &DeTable<'_>| table.get("nominal").is_some();
    match value.get_ref() {
        DeValue::Table(table) if nominal_of(table) => {
            check_keys(text, table, list.head, &["nominal"])?;
            let (outline, spec) = table
                .get("nominal")
                .map(|value| nominal_outline(text, value))
                .transpose()?
                .ok_or(ReadProblem::NoOutline)?;
            Ok(ReachSection {
                outline,
                nominal: Some(spec),
            })
        }
        _ => Ok(ReachSection {
            outline: Outline {
                lumens: coordinates.lumens(value, list)?,
            },
            nominal: None,
        }),
    }
}
