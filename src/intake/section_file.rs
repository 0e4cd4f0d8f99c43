//! The section file (TOML): a drawn outline with its unit, or a nominal section with its dimensions.
//!
//! ```toml
//! name = "inlet"
//! unit = "um"
//! [[lumen]]
//! outer = [[0, 0], [100, 0], [100, 50], [0, 50]]
//! islands = [[[40, 20], [60, 20], [60, 30], [40, 30]]]
//! ```
//! or
//! ```toml
//! [nominal]
//! kind = "rectangle"
//! width = "100 um"
//! height = "50 um"
//! ```
//! A coordinate may also be a length such as `"1 mil"`. `[[wall]]` tables name stretches of wall
//! (module `wall_tables`). `[source]` and `[uncertainty]` are kept for other work; `[reach]` (see
//! `section_reach`) gives the smallest and largest section it could be; any other key is an error.

use std::collections::BTreeMap;

use toml::de::{DeArray, DeTable, DeValue};

use super::columns::known_length;
use super::limits::check_vertices;
use super::read_error::{Fault, ReadProblem};
use super::section::{Content, Extras, UnitOption};
use super::section_reach;
use super::toml_values::{
    Value, check_keys, fault, number, parse, plain_table, string, wrong_type,
};
use super::wall_tables;
use crate::geometry::nominal::{NominalSpec, SpecValue};
use crate::geometry::{Loop, Lumen, Outline, Point};
use crate::units::{UnitError, UnitScale, parse_length};

/// Keys at the top of a section file.
const TOP_KEYS: [&str; 8] = [
    "name",
    "unit",
    "lumen",
    "nominal",
    "wall",
    "source",
    "uncertainty",
    "reach",
];
/// Keys of a lumen.
const LUMEN_KEYS: [&str; 2] = ["outer", "islands"];

/// Reads a section file; `keep_non_finite` passes infinite coordinates and NaN on.
pub(crate) fn read(
    text: &str,
    option: Option<&UnitOption>,
    keep_non_finite: bool,
) -> Result<Content, Fault> {
    let document = parse(text)?;
    let table = document.get_ref();
    check_keys(text, table, "a section file", &TOP_KEYS)?;
    let name = match table.get("name") {
        Some(value) => Some(string(text, value, "name", "a text in quotes")?.to_owned()),
        None => None,
    };
    let (unit, scale) = unit(text, table, option)?;
    let mut coordinates = Coordinates::new(text, scale, keep_non_finite);
    let (outline, nominal) = match (table.get("lumen"), table.get("nominal")) {
        (Some(_), Some(value)) => {
            return Err(fault(text, value, "nominal", ReadProblem::TwoOutlines));
        }
        (Some(value), None) => {
            let lumens = coordinates.lumens(value, LumenList::SECTION)?;
            (Outline { lumens }, None)
        }
        (None, Some(value)) => {
            let (outline, spec) = nominal_outline(text, value)?;
            (outline, Some(spec))
        }
        (None, None) => return Err(ReadProblem::NoOutline.into()),
    };
    let walls = if keep_non_finite {
        // Places on an outline with such coordinates mean nothing.
        Vec::new()
    } else {
        wall_tables::read(text, table, scale, &outline)?
    };
    let extras = extras(text, table, &mut coordinates)?;
    let bare = nominal.is_none();
    let notes = match option {
        Some(option) if nominal.is_some() => vec![format!(
            "the unit `{}` was not needed: every dimension names its own",
            option.word
        )],
        _ => Vec::new(),
    };
    Ok(Content {
        name,
        outline: Some(outline),
        loop_numbers: Vec::new(),
        nominal,
        walls,
        extras,
        unit: unit.filter(|_| bare),
        factor: scale.filter(|_| bare).map(UnitScale::factor),
        notes,
    })
}

/// Name and size of the unit of bare coordinates.
fn unit(
    text: &str,
    table: &DeTable<'_>,
    option: Option<&UnitOption>,
) -> Result<(Option<String>, Option<UnitScale>), Fault> {
    let Some(value) = table.get("unit") else {
        return Ok((option.map(|o| o.word.clone()), option.map(|o| o.scale)));
    };
    let name = string(
        text,
        value,
        "unit",
        "a unit of length in quotes, such as \"um\"",
    )?;
    let at = |problem| fault(text, value, "unit", problem);
    let scale = known_length(name).map_err(|source| at(ReadProblem::Unit { source }))?;
    if let Some(option) = option {
        option.must_agree(name, scale).map_err(at)?;
    }
    Ok((Some(name.to_owned()), Some(scale)))
}

/// A nominal section: its outline and its dimensions.
pub(super) fn nominal_outline(
    text: &str,
    value: &Value<'_>,
) -> Result<(Outline, NominalSpec), Fault> {
    let table = value
        .get_ref()
        .as_table()
        .ok_or_else(|| wrong_type(text, value, "nominal", "a table: [nominal]"))?;
    let spec = spec(text, value, table)?;
    let outline = spec
        .outline()
        .map_err(|source| fault(text, value, "nominal", ReadProblem::Nominal { source }))?;
    Ok((outline.oriented(), spec))
}

/// `[reach]`, and the tables kept for other work.
fn extras(
    text: &str,
    table: &DeTable<'_>,
    coordinates: &mut Coordinates<'_>,
) -> Result<Extras, Fault> {
    let kept = |key: &str| match table.get(key) {
        None => Ok(None),
        Some(value) => {
            let inner = value.get_ref().as_table();
            let inner = inner.ok_or_else(|| wrong_type(text, value, key, "a table"))?;
            plain_table(text, inner).map(Some)
        }
    };
    Ok(Extras {
        source: kept("source")?,
        uncertainty: kept("uncertainty")?,
        reach: table
            .get("reach")
            .map(|value| section_reach::read(text, value, coordinates))
            .transpose()?,
    })
}

/// Which list of lumens is being read, for messages.
#[derive(Clone, Copy)]
pub(super) struct LumenList {
    key: &'static str,
    /// Head of one of its tables.
    pub(super) head: &'static str,
    expected: &'static str,
    /// Before the number of the lumen.
    prefix: &'static str,
}

impl LumenList {
    const SECTION: Self = Self {
        key: "lumen",
        head: "[[lumen]]",
        expected: "a list of tables: [[lumen]]",
        prefix: "",
    };
    pub(super) const INNER: Self = Self {
        key: "inner",
        head: "[[reach.inner]]",
        expected: "a list of tables, [[reach.inner]], or a nominal section, [reach.inner.nominal]",
        prefix: "reach.inner, ",
    };
    pub(super) const OUTER: Self = Self {
        key: "outer",
        head: "[[reach.outer]]",
        expected: "a list of tables, [[reach.outer]], or a nominal section, [reach.outer.nominal]",
        prefix: "reach.outer, ",
    };
}

/// Reads drawn lumens.
pub(super) struct Coordinates<'a> {
    text: &'a str,
    scale: Option<UnitScale>,
    keep_non_finite: bool,
    buffer: String,
    vertices: usize,
}

/// Which loop is being read, for messages.
#[derive(Clone, Copy)]
struct Which {
    list: LumenList,
    lumen: usize,
    /// Number of the island, `None` for the outer loop.
    island: Option<usize>,
}

impl Which {
    fn vertex(self, vertex: usize) -> String {
        let (prefix, lumen) = (self.list.prefix, self.lumen);
        match self.island {
            None => format!("{prefix}lumen {lumen}, outer, vertex {vertex}"),
            Some(island) => format!("{prefix}lumen {lumen}, island {island}, vertex {vertex}"),
        }
    }
}

impl<'a> Coordinates<'a> {
    fn new(text: &'a str, scale: Option<UnitScale>, keep_non_finite: bool) -> Self {
        Self {
            text,
            scale,
            keep_non_finite,
            buffer: String::new(),
            vertices: 0,
        }
    }

    fn array<'v, 'i>(
        &self,
        value: &'v Value<'i>,
        key: &str,
        expected: &'static str,
    ) -> Result<&'v DeArray<'i>, Fault> {
        let array = value.get_ref().as_array();
        array.ok_or_else(|| wrong_type(self.text, value, key, expected))
    }

    pub(super) fn lumens(
        &mut self,
        value: &Value<'_>,
        list: LumenList,
    ) -> Result<Vec<Lumen>, Fault> {
        let LumenList { key, expected, .. } = list;
        let items = self.array(value, key, expected)?;
        if items.is_empty() {
            return Err(fault(self.text, value, key, ReadProblem::NoOutline));
        }
        let mut lumens = Vec::with_capacity(items.len());
        for (index, item) in items.iter().enumerate() {
            let table = item.get_ref().as_table();
            let table = table.ok_or_else(|| wrong_type(self.text, item, key, expected))?;
            lumens.push(self.lumen(item, table, (list, index + 1))?);
        }
        Ok(lumens)
    }

    fn lumen(
        &mut self,
        value: &Value<'_>,
        table: &DeTable<'_>,
        (list, lumen): (LumenList, usize),
    ) -> Result<Lumen, Fault> {
        check_keys(self.text, table, list.head, &LUMEN_KEYS)?;
        let outer = table.get("outer").ok_or_else(|| {
            let problem = ReadProblem::MissingKey {
                key: "outer",
                table: list.head,
            };
            fault(self.text, value, list.key, problem)
        })?;
        let which = |island| Which {
            list,
            lumen,
            island,
        };
        let outer = self.wall(outer, "outer", which(None))?;
        let mut islands = Vec::new();
        if let Some(value) = table.get("islands") {
            let items = self.array(value, "islands", "a list of loops: [[[x, y], ...], ...]")?;
            for (index, item) in items.iter().enumerate() {
                islands.push(self.wall(item, "islands", which(Some(index + 1)))?);
            }
        }
        Ok(Lumen { outer, islands })
    }

    fn wall(&mut self, value: &Value<'_>, key: &str, which: Which) -> Result<Loop, Fault> {
        let expected = if which.island.is_some() {
            "a list of loops: [[[x, y], ...], ...]"
        } else {
            "a list of vertices: [[x, y], ...]"
        };
        let items = self.array(value, key, expected)?;
        self.vertices += items.len();
        check_vertices(self.vertices)?;
        let mut points = Vec::with_capacity(items.len());
        for (index, item) in items.iter().enumerate() {
            let pair = self.array(item, key, expected)?;
            points.push(self.vertex(item, pair, which, index + 1)?);
        }
        Ok(Loop::new(points))
    }

    fn vertex(
        &mut self,
        value: &Value<'_>,
        pair: &DeArray<'_>,
        which: Which,
        index: usize,
    ) -> Result<Point, Fault> {
        match pair.iter().as_slice() {
            [x, y] => Ok([
                self.coordinate(x, which, index)?,
                self.coordinate(y, which, index)?,
            ]),
            other => {
                let problem = ReadProblem::NotAPair { found: other.len() };
                Err(fault(self.text, value, &which.vertex(index), problem))
            }
        }
    }

    fn coordinate(&mut self, value: &Value<'_>, which: Which, index: usize) -> Result<f64, Fault> {
        let at = |problem| fault(self.text, value, &which.vertex(index), problem);
        if let Some(written) = value.get_ref().as_str() {
            return match parse_length(written) {
                Err(UnitError::NotFinite { .. }) if self.keep_non_finite => Ok(f64::NAN),
                read => read.map_err(|source| at(ReadProblem::Unit { source })),
            };
        }
        let is_number = matches!(value.get_ref(), DeValue::Float(_) | DeValue::Integer(_));
        let scale = match self.scale {
            Some(scale) => scale,
            None if is_number => return Err(at(ReadProblem::MissingUnit)),
            None => UnitScale::from_factor(1.0),
        };
        let field = || which.vertex(index);
        match value.get_ref() {
            // The common case, without building the text of the field.
            DeValue::Float(float) => {
                if let Some(metres) = scale
                    .read(float.as_str(), &mut self.buffer)
                    .filter(|metres| metres.is_finite() || self.keep_non_finite)
                {
                    return Ok(metres);
                }
            }
            DeValue::Integer(_) => {}
            _ => {
                return Err(wrong_type(
                    self.text,
                    value,
                    &field(),
                    "a number, or a length in quotes",
                ));
            }
        }
        let metres = number(self.text, value, &field(), scale, &mut self.buffer)?;
        metres.ok_or_else(|| wrong_type(self.text, value, &field(), "a number"))
    }
}

/// The dimensions of a nominal section.
fn spec(text: &str, value: &Value<'_>, table: &DeTable<'_>) -> Result<NominalSpec, Fault> {
    let Some(kind) = table.get("kind") else {
        let problem = ReadProblem::MissingKey {
            key: "kind",
            table: "[nominal]",
        };
        return Err(fault(text, value, "nominal", problem));
    };
    let kind = string(
        text,
        kind,
        "kind",
        "a kind in quotes, such as \"rectangle\"",
    )?
    .to_owned();
    let mut values = BTreeMap::new();
    for (key, value) in table {
        let key = key.get_ref().to_string();
        if key != "kind" {
            let value = spec_value(text, value, &key)?;
            values.insert(key, value);
        }
    }
    Ok(NominalSpec { kind, values })
}

fn spec_value(text: &str, value: &Value<'_>, key: &str) -> Result<SpecValue, Fault> {
    match value.get_ref() {
        DeValue::String(written) => Ok(SpecValue::Text(written.to_string())),
        DeValue::Table(table) => spec(text, value, table).map(SpecValue::Spec),
        DeValue::Array(items) => items
            .iter()
            .map(|item| spec_value(text, item, key))
            .collect::<Result<_, _>>()
            .map(SpecValue::List),
        _ => {
            let plain = UnitScale::from_factor(1.0);
            number(text, value, key, plain, &mut String::new())?
                .map(SpecValue::Number)
                .ok_or_else(|| {
                    wrong_type(
                        text,
                        value,
                        key,
                        "a dimension in quotes, a number, or a list",
                    )
                })
        }
    }
}
