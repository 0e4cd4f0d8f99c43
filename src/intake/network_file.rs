//! The file of a net (TOML): cards, nodes and channels.
//!
//! ```toml
//! name = "manifold"
//! temperature = "30 C"
//! [[card]]
//! name = "feed"
//! file = "feed.card.json"
//! common = "2 %"
//! [[node]]
//! name = "inlet"
//! pressure = "20 kPa"
//! [[node]]
//! name = "outlet"
//! pressure = "0 Pa"
//! [[channel]]
//! name = "c1"
//! from = "inlet"
//! to = "outlet"
//! card = "feed"
//! length = "20 mm"
//! ```
//! Files of cards are relative to the folder of the net. Every name is there once among its kind.

use std::collections::HashMap;
use std::path::{Path, PathBuf};

use toml::de::{DeTable, DeValue};

use super::card_file::{CardContent, CardFluid, CardKind, cards};
use super::limits::{MAX_MARKUP_BYTES, check_file_size};
use super::network_entry::{Entry, Names, at, entries, measured, name_of, written};
use super::network_problem::NetworkProblem;
use super::provenance::sha256_hex;
use super::read_error::{Fault, ReadError, ReadProblem};
use super::source_text::{SourceText, place_at, read_bytes};
use super::toml_values::{Value, check_keys, parse, string};
use crate::units::{parse_flow_rate, parse_length, parse_pressure, parse_temperature};

/// Most channels side by side.
const MOST_PARALLEL: i64 = 1_000_000;
/// Largest pressure, Pa, inflow, m^3/s, and length, m, that are no slip of the unit.
const MOST_PRESSURE: f64 = 1e11;
const MOST_INFLOW: f64 = 1e3;
const MOST_LENGTH: f64 = 1e6;
/// Relative difference up to which two properties of a fluid are the same.
const SAME_PROPERTY: f64 = 1e-6;
/// Difference up to which two temperatures are the same, K.
const SAME_TEMPERATURE: f64 = 1e-6;

/// A card as a net names it.
#[derive(Debug, Clone, PartialEq)]
pub struct NetworkFileCard {
    /// Name in the net.
    pub name: String,
    /// Path of its file.
    pub path: PathBuf,
    /// Hash of its file.
    pub sha256: String,
    /// Further standard relative uncertainty that its channels have in common.
    pub common: f64,
    /// The card.
    pub content: CardContent,
}

/// What is given at a node.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum NetworkFileCondition {
    /// Pa.
    Pressure(f64),
    /// m^3/s.
    Inflow(f64),
    /// Nothing: channels only meet.
    Free,
}

/// A node.
#[derive(Debug, Clone, PartialEq)]
pub struct NetworkFileNode {
    /// Name.
    pub name: String,
    /// What is given there.
    pub condition: NetworkFileCondition,
    /// Its place in the text, bytes.
    offset: usize,
}

/// A channel, its ends and its card by their places.
#[derive(Debug, Clone, PartialEq)]
pub struct NetworkFileChannel {
    /// Name.
    pub name: String,
    /// Node where it begins.
    pub from: usize,
    /// Node where it ends.
    pub to: usize,
    /// Card.
    pub card: usize,
    /// m.
    pub length: Option<f64>,
    /// Equal channels side by side.
    pub parallel: u32,
    /// Standard relative uncertainty of each.
    pub spread: f64,
}

/// A net as its file gives it.
#[derive(Debug, Clone, PartialEq)]
pub struct NetworkFile {
    /// Path as given.
    pub path: String,
    /// Hash of the file.
    pub sha256: String,
    /// Name.
    pub name: Option<String>,
    /// K.
    pub temperature: Option<f64>,
    /// Cards.
    pub cards: Vec<NetworkFileCard>,
    /// Nodes.
    pub nodes: Vec<NetworkFileNode>,
    /// Channels.
    pub channels: Vec<NetworkFileChannel>,
    text: String,
}

impl NetworkFile {
    /// Line of a node, from 1.
    pub fn node_line(&self, index: usize) -> Option<usize> {
        let node = self.nodes.get(index)?;
        Some(place_at(&self.text, node.offset).line)
    }
}

/// Reads the file of a net and the cards that it names; `-` is standard input, with cards relative to the current folder.
///
/// # Errors
/// [`ReadError`] for a file that cannot be read or is above a limit, and for content that is no net: unknown keys and
/// names, names twice, values without a unit, cards of another version or of different fluids.
pub fn read_network(path: &Path) -> Result<NetworkFile, ReadError> {
    let is_stdin = path == Path::new("-");
    let shown = if is_stdin {
        "standard input".to_owned()
    } else {
        path.display().to_string()
    };
    let folder = if is_stdin { None } else { path.parent() };
    let bytes = limited_bytes(path).map_err(|problem| ReadError::new(&shown, problem))?;
    let sha256 = sha256_hex(&bytes);
    let source = SourceText::decode(bytes).map_err(|problem| ReadError::new(&shown, problem))?;
    let reader = Reader {
        text: &source.text,
        path: &shown,
        folder: folder.unwrap_or(Path::new("")),
    };
    let found = reader.read(sha256)?;
    Ok(NetworkFile {
        text: source.text,
        ..found
    })
}

fn limited_bytes(path: &Path) -> Result<Vec<u8>, ReadProblem> {
    let bytes = read_bytes(path)?;
    check_file_size(bytes.len() as u64, MAX_MARKUP_BYTES)?;
    Ok(bytes)
}

/// One net on its way.
struct Reader<'a> {
    text: &'a str,
    path: &'a str,
    folder: &'a Path,
}

impl Reader<'_> {
    fn in_file(&self, fault: Fault) -> ReadError {
        fault.in_file(self.path)
    }

    fn read(&self, sha256: String) -> Result<NetworkFile, ReadError> {
        let document = parse(self.text).map_err(|fault| self.in_file(as_net(fault)))?;
        let table = document.get_ref();
        let text = self.text;
        let top = ["name", "temperature", "card", "node", "channel"];
        check_keys(text, table, "the file of a net", &top).map_err(|f| self.in_file(f))?;
        let whole = |key: &str| table.get(key);
        let name = whole("name").map(|value| name_of(text, value)).transpose();
        let name = name.map_err(|fault| self.in_file(fault))?;
        let temperature = whole("temperature")
            .map(|value| {
                measured(
                    text,
                    value,
                    "temperature",
                    "a temperature in quotes, such as \"30 C\"",
                    parse_temperature,
                )
            })
            .transpose()
            .map_err(|fault| self.in_file(fault))?;
        let mut taken = Names::new("card");
        let cards = self.cards(table, &mut taken)?;
        let of_cards = taken;
        let mut of_nodes = Names::new("node");
        let nodes = entries(text, table, "node", "[[node]]")
            .and_then(|list| list.iter().map(|e| node(e, &mut of_nodes)).collect())
            .map_err(|fault| self.in_file(fault))?;
        let mut of_channels = Names::new("channel");
        let channels = entries(text, table, "channel", "[[channel]]")
            .and_then(|list| {
                let mut read = Vec::with_capacity(list.len());
                for entry in &list {
                    read.push(channel(
                        entry,
                        &cards,
                        [&of_cards, &of_nodes],
                        &mut of_channels,
                    )?);
                }
                Ok(read)
            })
            .map_err(|fault| self.in_file(fault))?;
        Ok(NetworkFile {
            path: self.path.to_owned(),
            sha256,
            name,
            temperature,
            cards,
            nodes,
            channels,
            text: String::new(),
        })
    }

    /// Reads every card, each file once.
    fn cards(
        &self,
        table: &DeTable<'_>,
        names: &mut Names,
    ) -> Result<Vec<NetworkFileCard>, ReadError> {
        let list = entries(self.text, table, "card", "[[card]]").map_err(|f| self.in_file(f))?;
        let mut files: HashMap<PathBuf, (String, Vec<CardContent>)> = HashMap::new();
        let mut found: Vec<NetworkFileCard> = Vec::with_capacity(list.len());
        for entry in &list {
            entry
                .check(&["name", "file", "card", "common"])
                .map_err(|fault| self.in_file(fault))?;
            let name = entry.own_name(names).map_err(|fault| self.in_file(fault))?;
            let path = self.card_path(entry).map_err(|fault| self.in_file(fault))?;
            if !files.contains_key(&path) {
                let read = card_file(&path)?;
                files.insert(path.clone(), read);
            }
            let Some((sha256, contents)) = files.get(&path) else {
                continue;
            };
            let content = chosen(entry, contents).map_err(|fault| self.in_file(fault))?;
            if let Some(first) = found.first() {
                same_fluid(entry, (&name, content), first).map_err(|fault| self.in_file(fault))?;
            }
            let common = entry.share("common").map_err(|fault| self.in_file(fault))?;
            found.push(NetworkFileCard {
                name,
                path,
                sha256: sha256.clone(),
                common,
                content: content.clone(),
            });
        }
        Ok(found)
    }

    fn card_path(&self, entry: &Entry<'_, '_>) -> Result<PathBuf, Fault> {
        let value = entry.required("file")?;
        let file = string(self.text, value, "file", "a path in quotes")?;
        if file == "-" {
            return Err(at(self.text, value, NetworkProblem::StandardInput));
        }
        Ok(self.folder.join(file))
    }
}

/// A fault of the TOML reader as one of a net.
fn as_net(fault: Fault) -> Fault {
    match *fault.problem {
        ReadProblem::Toml { message } => Fault {
            problem: Box::new(ReadProblem::Network {
                source: NetworkProblem::Toml { message },
            }),
            ..fault
        },
        problem => Fault {
            problem: Box::new(problem),
            ..fault
        },
    }
}

fn card_file(path: &Path) -> Result<(String, Vec<CardContent>), ReadError> {
    let shown = path.display().to_string();
    let bytes = limited_bytes(path).map_err(|problem| ReadError::new(&shown, problem))?;
    let sha256 = sha256_hex(&bytes);
    let contents = cards(bytes).map_err(|fault| fault.in_file(&shown))?;
    Ok((sha256, contents))
}

/// The card of a file that an entry means.
fn chosen<'c>(
    entry: &Entry<'_, '_>,
    contents: &'c [CardContent],
) -> Result<&'c CardContent, Fault> {
    let names = || contents.iter().map(|card| card.name.clone()).collect();
    let Some(value) = entry.table.get("card") else {
        return match contents {
            [only] => Ok(only),
            _ => Err(at(
                entry.text,
                entry.value,
                NetworkProblem::SeveralCards { names: names() },
            )),
        };
    };
    let name = name_of(entry.text, value)?;
    let mut meant = contents.iter().filter(|card| card.name == name);
    match (meant.next(), meant.next()) {
        (Some(card), None) => Ok(card),
        _ => Err(at(
            entry.text,
            value,
            NetworkProblem::NoSuchCard {
                name,
                names: names(),
            },
        )),
    }
}

/// Refuses a card whose fluid is not that of the first one.
fn same_fluid(
    entry: &Entry<'_, '_>,
    (name, content): (&str, &CardContent),
    first: &NetworkFileCard,
) -> Result<(), Fault> {
    let (a, b) = (&first.content.fluid, &content.fluid);
    let is_near = |a: f64, b: f64| (a - b).abs() <= SAME_PROPERTY * a.abs().max(b.abs());
    let is_same = match (a.temperature, b.temperature) {
        // At other temperatures the properties differ as they should.
        (Some(one), Some(other)) if (one - other).abs() > SAME_TEMPERATURE => true,
        (one, other) => {
            one.is_some() == other.is_some()
                && is_near(a.viscosity, b.viscosity)
                && match (a.density, b.density) {
                    (Some(one), Some(other)) => is_near(one, other),
                    (one, other) => one == other,
                }
        }
    };
    if a.name == b.name && is_same {
        return Ok(());
    }
    let words = |fluid: &CardFluid| format!("{} of {:.6e} Pa s", fluid.name, fluid.viscosity);
    Err(at(
        entry.text,
        entry.value,
        NetworkProblem::Fluids {
            card: name.to_owned(),
            fluid: words(b),
            first: first.name.clone(),
            first_fluid: words(a),
        },
    ))
}

fn node(entry: &Entry<'_, '_>, names: &mut Names) -> Result<NetworkFileNode, Fault> {
    entry.check(&["name", "pressure", "inflow"])?;
    let name = entry.own_name(names)?;
    let text = entry.text;
    let condition = match (entry.table.get("pressure"), entry.table.get("inflow")) {
        (None, None) => NetworkFileCondition::Free,
        (Some(value), None) => {
            let wanted = "a pressure in quotes, such as \"20 kPa\"";
            let pressure = measured(text, value, "pressure", wanted, parse_pressure)?;
            within(text, value, pressure, MOST_PRESSURE, "100 GPa")?;
            NetworkFileCondition::Pressure(pressure)
        }
        (None, Some(value)) => {
            let wanted = "a flow rate in quotes, such as \"2 uL/min\"";
            let inflow = measured(text, value, "inflow", wanted, parse_flow_rate)?;
            within(text, value, inflow, MOST_INFLOW, "1000 m^3/s")?;
            NetworkFileCondition::Inflow(inflow)
        }
        (Some(_), Some(value)) => return Err(at(text, value, NetworkProblem::TwoConditions)),
    };
    Ok(NetworkFileNode {
        name,
        condition,
        offset: entry.required("name")?.span().start,
    })
}

fn channel(
    entry: &Entry<'_, '_>,
    cards: &[NetworkFileCard],
    [of_cards, of_nodes]: [&Names; 2],
    names: &mut Names,
) -> Result<NetworkFileChannel, Fault> {
    entry.check(&["name", "from", "to", "card", "length", "parallel", "spread"])?;
    let text = entry.text;
    let name = entry.own_name(names)?;
    let from = of_nodes.find(text, entry.required("from")?)?;
    let end = entry.required("to")?;
    let to = of_nodes.find(text, end)?;
    if from == to {
        let node = name_of(text, end)?;
        return Err(at(text, end, NetworkProblem::SelfLoop { node }));
    }
    let card = of_cards.find(text, entry.required("card")?)?;
    let parallel = match entry.table.get("parallel") {
        None => 1,
        Some(value) => {
            whole_number(value).ok_or_else(|| at(text, value, NetworkProblem::Parallel))?
        }
    };
    Ok(NetworkFileChannel {
        name,
        from,
        to,
        card,
        length: length(entry, cards.get(card))?,
        parallel,
        spread: entry.share("spread")?,
    })
}

/// Refuses a value beyond anything that a channel can have: a slip of the unit or of the exponent.
fn within(
    text: &str,
    value: &Value<'_>,
    found: f64,
    most: f64,
    limit: &'static str,
) -> Result<(), Fault> {
    if found.abs() <= most {
        return Ok(());
    }
    let written = written(value);
    let problem = NetworkProblem::TooLarge {
        text: written,
        limit,
    };
    Err(at(text, value, problem))
}

fn whole_number(value: &Value<'_>) -> Option<u32> {
    let DeValue::Integer(integer) = value.get_ref() else {
        return None;
    };
    i64::from_str_radix(integer.as_str(), integer.radix())
        .ok()
        .filter(|n| (1..=MOST_PARALLEL).contains(n))
        .and_then(|n| u32::try_from(n).ok())
}

fn length(entry: &Entry<'_, '_>, card: Option<&NetworkFileCard>) -> Result<Option<f64>, Fault> {
    let text = entry.text;
    let kind = card.map(|card| card.content.kind);
    let name = || card.map(|card| card.name.clone()).unwrap_or_default();
    match (entry.table.get("length"), kind) {
        (Some(value), Some(CardKind::Route)) => Err(at(
            text,
            value,
            NetworkProblem::LengthRefused { card: name() },
        )),
        (Some(value), _) => {
            let length = measured(
                text,
                value,
                "length",
                "a length in quotes, such as \"20 mm\"",
                parse_length,
            )?;
            within(text, value, length, MOST_LENGTH, "1000 km")?;
            if length > 0.0 {
                Ok(Some(length))
            } else {
                let written = written(value);
                Err(at(
                    text,
                    value,
                    NetworkProblem::NotPositive { text: written },
                ))
            }
        }
        (None, Some(CardKind::Route)) => Ok(None),
        (None, _) => Err(at(
            text,
            entry.value,
            NetworkProblem::LengthNeeded { card: name() },
        )),
    }
}
