//! The route file (TOML): a channel as segments in series, each with stations along it.
//!
//! ```toml
//! name = "feed line"
//! [[segment]]
//! name = "taper"
//! [[segment.station]]
//! at = "0 mm"
//! nominal = { kind = "rectangle", width = "1 mm", height = "50 um" }
//! [[segment.station]]
//! at = "5 mm"
//! section = "measured_at_5mm.toml"
//! [[segment]]
//! name = "outlet"
//! length = "12 mm"
//! section = "outlet.toml"
//! parallel = 4
//! ```
//! A segment has stations, or one `section` (or `nominal`) and a `length`, or `[[segment.branch]]` tables of
//! which each has either. Positions count from anywhere: a branch begins at its first station and ends at its
//! last. Paths are relative to the route file. A section named twice is read once. Also: `interpolation`
//! (a word of [`INTERPOLATION_WORDS`]) and `spread`, relative standard uncertainty of K.

use std::path::{Path, PathBuf};

use toml::de::{DeTable, DeValue};

use super::limits::{MAX_FILE_BYTES, MAX_MARKUP_BYTES, check_file_size};
use super::provenance::sha256_hex;
use super::read_error::{Fault, ReadError, ReadProblem};
use super::route_problem::{MAX_PARALLEL, MAX_SPREAD, RouteProblem};
use super::section::{ReadOptions, Section, read_section};
use super::section_file::nominal_outline;
use super::source_text::{SourceText, read_bytes};
use super::toml_values::{Value, check_keys, fault, parse, string, wrong_type};
use crate::geometry::Outline;
use crate::geometry::nominal::NominalSpec;
use crate::units::{parse_fraction, parse_length};

/// Stations that a route may have where nothing else is said.
pub const MAX_STATIONS: usize = 500;
/// Shortest way between two stations, m.
const LEAST_METRES: f64 = 1e-9;
/// Farthest position, m.
const MOST_METRES: f64 = 1e3;
/// The rules of interpolation between stations, as route files write them.
pub const INTERPOLATION_WORDS: [&str; 6] = [
    "automatic",
    "dimensions",
    "cube_root",
    "fourth_root",
    "conductance",
    "resistance",
];

const TOP_KEYS: [&str; 4] = ["name", "interpolation", "spread", "segment"];
const SEGMENT_KEYS: [&str; 9] = [
    "name",
    "interpolation",
    "spread",
    "parallel",
    "length",
    "section",
    "nominal",
    "station",
    "branch",
];
const BRANCH_KEYS: [&str; 7] = [
    "name",
    "interpolation",
    "spread",
    "length",
    "section",
    "nominal",
    "station",
];
const STATION_KEYS: [&str; 3] = ["at", "section", "nominal"];
const SEGMENTS: &str = "a list of tables: [[segment]]";
const BRANCHES: &str = "a list of tables: [[segment.branch]]";
const STATIONS: &str = "a list of tables: [[segment.station]]";

/// A route as read, lengths in metres.
#[derive(Debug, Clone, PartialEq)]
pub struct RouteFile {
    /// Its name, where the file gives one.
    pub name: Option<String>,
    /// Path as given.
    pub path: String,
    /// SHA-256 of the bytes of the route file.
    pub sha256: String,
    /// In series, in the direction of flow.
    pub segments: Vec<FileSegment>,
    /// Every section that a station names, once.
    pub sections: Vec<FileSection>,
}

/// One segment: branches beside each other.
#[derive(Debug, Clone, PartialEq)]
pub struct FileSegment {
    /// Name, unique in the route.
    pub name: String,
    /// Its branches; one where nothing branches.
    pub branches: Vec<FileBranch>,
}

/// A branch, or several equal ones.
#[derive(Debug, Clone, PartialEq)]
pub struct FileBranch {
    /// Name, unique in the segment; empty for the only branch of a segment.
    pub name: String,
    /// How many equal ones there are.
    pub count: usize,
    /// Word of the rule of interpolation, one of [`INTERPOLATION_WORDS`], where one is given.
    pub interpolation: Option<String>,
    /// Relative standard uncertainty of K of each, where one is given.
    pub spread: Option<f64>,
    /// At least two, positions rising.
    pub stations: Vec<FileStation>,
}

/// A place with a section.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct FileStation {
    /// Position, m.
    pub at: f64,
    /// Index into [`RouteFile::sections`].
    pub section: usize,
}

/// A section of a route.
#[derive(Debug, Clone, PartialEq)]
pub enum FileSection {
    /// Of a file of its own.
    File {
        /// As the route file writes it.
        written: String,
        /// Where it was read.
        path: PathBuf,
        /// What was read.
        section: Box<Section>,
    },
    /// Nominal dimensions in the route file.
    Nominal {
        /// The dimensions.
        spec: NominalSpec,
        /// Its outline.
        outline: Outline,
    },
}

impl FileSection {
    /// Its outline as read.
    pub fn outline(&self) -> &Outline {
        match self {
            Self::File { section, .. } => &section.outline,
            Self::Nominal { outline, .. } => outline,
        }
    }

    /// Its nominal dimensions, where it has them.
    pub fn nominal(&self) -> Option<&NominalSpec> {
        match self {
            Self::File { section, .. } => section.nominal.as_ref(),
            Self::Nominal { spec, .. } => Some(spec),
        }
    }

    /// Its path as written, or its kind.
    pub fn label(&self) -> &str {
        match self {
            Self::File { written, .. } => written,
            Self::Nominal { spec, .. } => &spec.kind,
        }
    }
}

impl RouteFile {
    /// The section files that were read.
    pub fn section_paths(&self) -> impl Iterator<Item = &Path> {
        self.sections.iter().filter_map(|section| match section {
            FileSection::File { path, .. } => Some(path.as_path()),
            FileSection::Nominal { .. } => None,
        })
    }
}

/// Reads a route file and the section files that it names, or standard input for `-`.
///
/// - `most_stations`: more are refused, before any section file is read
///
/// # Errors
/// [`ReadError`] with line and key when the file cannot be read or says something impossible, and where a
/// section file cannot be used.
pub fn read_route(path: &Path, most_stations: usize) -> Result<RouteFile, ReadError> {
    let name = if path == Path::new("-") {
        "standard input".to_owned()
    } else {
        path.display().to_string()
    };
    let bytes = read_bytes(path).map_err(|problem| ReadError::new(&name, problem))?;
    let folder = path.parent().unwrap_or(Path::new("")).to_owned();
    route_from_bytes(bytes, &name, &folder, most_stations)
}

/// Reads a route from the bytes of its file.
///
/// - `path`: for messages
/// - `folder`: section files are relative to it
///
/// # Errors
/// As [`read_route`].
pub fn route_from_bytes(
    bytes: Vec<u8>,
    path: &str,
    folder: &Path,
    most_stations: usize,
) -> Result<RouteFile, ReadError> {
    let whole = |problem| ReadError::new(path, problem);
    check_file_size(bytes.len() as u64, MAX_MARKUP_BYTES.min(MAX_FILE_BYTES)).map_err(whole)?;
    let sha256 = sha256_hex(&bytes);
    let source = SourceText::decode(bytes).map_err(whole)?;
    if source.text.trim().is_empty() {
        let source = RouteProblem::Empty;
        return Err(whole(ReadProblem::Route { source }));
    }
    let mut reader = Reader {
        text: &source.text,
        folder,
        most_stations,
        stations: 0,
        sections: Vec::new(),
    };
    let (name, segments) = reader.route().map_err(|fault| fault.in_file(path))?;
    Ok(RouteFile {
        name,
        path: path.to_owned(),
        sha256,
        segments,
        sections: reader.sections,
    })
}

/// What a table passes on to the tables in it.
#[derive(Clone, Default)]
struct Inherited {
    interpolation: Option<String>,
    spread: Option<f64>,
}

struct Reader<'a> {
    text: &'a str,
    folder: &'a Path,
    most_stations: usize,
    stations: usize,
    sections: Vec<FileSection>,
}

impl Reader<'_> {
    fn refuse(&self, value: &Value<'_>, field: &str, source: RouteProblem) -> Fault {
        fault(self.text, value, field, ReadProblem::Route { source })
    }

    fn route(&mut self) -> Result<(Option<String>, Vec<FileSegment>), Fault> {
        let document = parse(self.text)?;
        let table = document.get_ref();
        check_keys(self.text, table, "a route file", &TOP_KEYS)?;
        let name = match table.get("name") {
            Some(value) => Some(string(self.text, value, "name", "a text in quotes")?.to_owned()),
            None => None,
        };
        let inherited = self.inherited(table, &Inherited::default())?;
        let Some(value) = table.get("segment") else {
            let source = RouteProblem::Empty;
            return Err(ReadProblem::Route { source }.into());
        };
        let items = self.list(value, "segment", SEGMENTS)?;
        if items.is_empty() {
            return Err(self.refuse(value, "segment", RouteProblem::Empty));
        }
        self.count_stations(&items)?;
        let mut segments: Vec<FileSegment> = Vec::with_capacity(items.len());
        for (item, table) in items {
            check_keys(self.text, table, "[[segment]]", &SEGMENT_KEYS)?;
            let name = self.name(item, table, "[[segment]]")?;
            if segments.iter().any(|other| other.name == name) {
                let problem = RouteProblem::SameName {
                    name,
                    of: "segments",
                };
                return Err(self.refuse(table.get("name").unwrap_or(item), "name", problem));
            }
            let inherited = self.inherited(table, &inherited)?;
            let branches = self.branches(item, table, &inherited)?;
            segments.push(FileSegment { name, branches });
        }
        Ok((name, segments))
    }

    /// Refuses too many stations before any file is read for them.
    fn count_stations(&mut self, segments: &[(&Value<'_>, &DeTable<'_>)]) -> Result<(), Fault> {
        for (_, table) in segments {
            let inner = table.get("branch").and_then(|v| v.get_ref().as_array());
            let inner = inner.into_iter().flat_map(|branches| branches.iter());
            let tables = inner.filter_map(|v| v.get_ref().as_table());
            for table in std::iter::once(*table).chain(tables) {
                let Some(value) = table.get("station") else {
                    continue;
                };
                let found = value.get_ref().as_array().map_or(0, |array| array.len());
                self.stations += found;
                if self.stations > self.most_stations {
                    let limit = self.most_stations;
                    let problem = RouteProblem::TooManyStations { limit };
                    return Err(self.refuse(value, "station", problem));
                }
            }
        }
        Ok(())
    }

    fn list<'v, 'i>(
        &self,
        value: &'v Value<'i>,
        key: &str,
        expected: &'static str,
    ) -> Result<Vec<(&'v Value<'i>, &'v DeTable<'i>)>, Fault> {
        let wrong = |v: &Value<'_>| wrong_type(self.text, v, key, expected);
        let items = value.get_ref().as_array().ok_or_else(|| wrong(value))?;
        items
            .iter()
            .map(|item| Ok((item, item.get_ref().as_table().ok_or_else(|| wrong(item))?)))
            .collect()
    }

    fn name(
        &self,
        item: &Value<'_>,
        table: &DeTable<'_>,
        head: &'static str,
    ) -> Result<String, Fault> {
        let value = table.get("name").ok_or_else(|| {
            let problem = ReadProblem::MissingKey {
                key: "name",
                table: head,
            };
            fault(self.text, item, "name", problem)
        })?;
        let name = string(self.text, value, "name", "a name in quotes")?.trim();
        if name.is_empty() {
            return Err(self.refuse(value, "name", RouteProblem::NoName));
        }
        Ok(name.to_owned())
    }

    fn inherited(&self, table: &DeTable<'_>, from: &Inherited) -> Result<Inherited, Fault> {
        let mut found = from.clone();
        if let Some(value) = table.get("interpolation") {
            let word = string(self.text, value, "interpolation", "a word in quotes")?;
            if !INTERPOLATION_WORDS.contains(&word) {
                let problem = RouteProblem::Interpolation {
                    word: word.to_owned(),
                    known: INTERPOLATION_WORDS.join(", "),
                };
                return Err(self.refuse(value, "interpolation", problem));
            }
            found.interpolation = Some(word.to_owned());
        }
        if let Some(value) = table.get("spread") {
            let expected = "a share in quotes, such as \"5 %\"";
            let word = string(self.text, value, "spread", expected)?;
            let spread = parse_fraction(word).map_err(|source| {
                fault(self.text, value, "spread", ReadProblem::Unit { source })
            })?;
            if !(0.0..=MAX_SPREAD).contains(&spread) {
                return Err(self.refuse(value, "spread", RouteProblem::Spread { spread }));
            }
            found.spread = Some(spread);
        }
        Ok(found)
    }

    fn branches(
        &mut self,
        item: &Value<'_>,
        table: &DeTable<'_>,
        inherited: &Inherited,
    ) -> Result<Vec<FileBranch>, Fault> {
        let Some(value) = table.get("branch") else {
            let count = self.parallel(table)?;
            let branch = self.branch((item, table), "segment", String::new(), inherited)?;
            return Ok(vec![FileBranch { count, ..branch }]);
        };
        for second in ["parallel", "length", "section", "nominal", "station"] {
            if let Some(value) = table.get(second) {
                let first = "branch";
                let problem = RouteProblem::Both { first, second };
                return Err(self.refuse(value, second, problem));
            }
        }
        let mut branches: Vec<FileBranch> = Vec::new();
        for (item, table) in self.list(value, "branch", BRANCHES)? {
            check_keys(self.text, table, "[[segment.branch]]", &BRANCH_KEYS)?;
            let name = self.name(item, table, "[[segment.branch]]")?;
            if branches.iter().any(|other| other.name == name) {
                let of = "branches of one segment";
                let problem = RouteProblem::SameName { name, of };
                return Err(self.refuse(table.get("name").unwrap_or(item), "name", problem));
            }
            let inherited = self.inherited(table, inherited)?;
            branches.push(self.branch((item, table), "branch", name, &inherited)?);
        }
        if branches.is_empty() {
            return Err(self.refuse(value, "branch", RouteProblem::NoBranch));
        }
        Ok(branches)
    }

    fn parallel(&self, table: &DeTable<'_>) -> Result<usize, Fault> {
        let Some(value) = table.get("parallel") else {
            return Ok(1);
        };
        let count = match value.get_ref() {
            DeValue::Integer(whole) => u64::from_str_radix(whole.as_str(), whole.radix()).ok(),
            _ => None,
        };
        count
            .and_then(|count| usize::try_from(count).ok())
            .filter(|count| (1..=MAX_PARALLEL).contains(count))
            .ok_or_else(|| self.refuse(value, "parallel", RouteProblem::Parallel))
    }

    /// A branch by its stations, or by one section and a length.
    fn branch(
        &mut self,
        (item, table): (&Value<'_>, &DeTable<'_>),
        field: &str,
        name: String,
        inherited: &Inherited,
    ) -> Result<FileBranch, Fault> {
        let stations = if let Some(value) = table.get("station") {
            for second in ["length", "section", "nominal"] {
                if let Some(value) = table.get(second) {
                    let first = "station";
                    let problem = RouteProblem::Both { first, second };
                    return Err(self.refuse(value, second, problem));
                }
            }
            self.stations(value)?
        } else {
            let Some(value) = table.get("length") else {
                let (first, second) = ("station", "length");
                let problem = RouteProblem::Neither { first, second };
                return Err(self.refuse(item, field, problem));
            };
            let length = self.length(value, "length")?;
            if length <= 0.0 {
                return Err(self.refuse(value, "length", RouteProblem::NotPositive { length }));
            }
            if length < LEAST_METRES {
                return Err(self.refuse(value, "length", RouteProblem::Outside { length }));
            }
            let section = self.section(item, table, field)?;
            [0.0, length].map(|at| FileStation { at, section }).to_vec()
        };
        Ok(FileBranch {
            name,
            count: 1,
            interpolation: inherited.interpolation.clone(),
            spread: inherited.spread,
            stations,
        })
    }

    fn length(&self, value: &Value<'_>, key: &str) -> Result<f64, Fault> {
        let expected = "a length with its unit in quotes, such as \"5 mm\"";
        let written = string(self.text, value, key, expected)?;
        let length = parse_length(written)
            .map_err(|source| fault(self.text, value, key, ReadProblem::Unit { source }))?;
        if length.abs() > MOST_METRES {
            return Err(self.refuse(value, key, RouteProblem::Outside { length }));
        }
        Ok(length)
    }

    fn stations(&mut self, value: &Value<'_>) -> Result<Vec<FileStation>, Fault> {
        let mut stations: Vec<FileStation> = Vec::new();
        let items = self.list(value, "station", STATIONS)?;
        for (index, (item, table)) in items.iter().enumerate() {
            check_keys(self.text, table, "[[segment.station]]", &STATION_KEYS)?;
            let at_value = table.get("at").ok_or_else(|| {
                let problem = ReadProblem::MissingKey {
                    key: "at",
                    table: "[[segment.station]]",
                };
                fault(self.text, item, "station", problem)
            })?;
            let at = self.length(at_value, "at")?;
            let number = index + 1;
            if let Some(before) = stations.last().map(|station| station.at) {
                if at < before {
                    let problem = RouteProblem::OutOfOrder { number, at, before };
                    return Err(self.refuse(at_value, "at", problem));
                }
                if at - before < LEAST_METRES {
                    return Err(self.refuse(
                        at_value,
                        "at",
                        RouteProblem::SamePlace { number, at },
                    ));
                }
            }
            let section = self.section(item, table, "station")?;
            stations.push(FileStation { at, section });
        }
        if stations.len() < 2 {
            return Err(self.refuse(value, "station", RouteProblem::OneStation));
        }
        Ok(stations)
    }

    /// Index of the section that a table names; read on first sight.
    fn section(
        &mut self,
        item: &Value<'_>,
        table: &DeTable<'_>,
        field: &str,
    ) -> Result<usize, Fault> {
        let (first, second) = ("section", "nominal");
        match (table.get(first), table.get(second)) {
            (Some(_), Some(value)) => {
                Err(self.refuse(value, second, RouteProblem::Both { first, second }))
            }
            (None, None) => Err(self.refuse(item, field, RouteProblem::Neither { first, second })),
            (Some(value), None) => self.section_of_file(value),
            (None, Some(value)) => {
                let (outline, spec) = nominal_outline(self.text, value)?;
                let same = |s: &FileSection| matches!(s, FileSection::Nominal { spec: other, .. } if *other == spec);
                if let Some(index) = self.sections.iter().position(same) {
                    return Ok(index);
                }
                self.sections.push(FileSection::Nominal { spec, outline });
                Ok(self.sections.len() - 1)
            }
        }
    }

    fn section_of_file(&mut self, value: &Value<'_>) -> Result<usize, Fault> {
        let written = string(
            self.text,
            value,
            "section",
            "the path of a section file in quotes",
        )?;
        if written == "-" {
            return Err(self.refuse(value, "section", RouteProblem::StandardInput));
        }
        let path = self.folder.join(written);
        let same =
            |s: &FileSection| matches!(s, FileSection::File { path: other, .. } if *other == path);
        if let Some(index) = self.sections.iter().position(same) {
            return Ok(index);
        }
        let section = read_section(&path, &ReadOptions::default()).map_err(|error| {
            let problem = RouteProblem::Section {
                message: error.to_string(),
                hint: error.hint(),
            };
            self.refuse(value, "section", problem)
        })?;
        self.sections.push(FileSection::File {
            written: written.to_owned(),
            path,
            section: Box::new(section),
        });
        Ok(self.sections.len() - 1)
    }
}
