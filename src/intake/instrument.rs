//! From the file of an instrument to its sections: which reader, which steps, what is left to decide.

use std::path::{Path, PathBuf};

use super::content_kind::{FileContent, content_of};
use super::height_map::{
    CutOptions, HeightMap, MapCuts, SurfaceContent, SurfaceFormat, cut, read_map_table,
    read_surface,
};
use super::limits::{MAX_FILE_BYTES, check_file_size};
use super::micrograph::{MicrographOptions, MicrographSection, read_micrograph};
use super::plausibility::check_size;
use super::provenance::{Provenance, SectionKind, sha256_hex};
use super::read_error::{Fault, ReadError, ReadProblem};
use super::section::{ReadOptions, UnitOption};
use super::source_text::{SourceText, read_bytes};
use super::step::Step;
use super::trace::{
    CorrectedTrace, CorrectionOptions, GrooveSection, RawTrace, SectionOptions, TableOptions,
    correct, read_trace_table, sections,
};
use crate::geometry::Outline;
use crate::units::format_length;
use crate::warning::Warning;

/// How the file of an instrument becomes sections.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct InstrumentOptions {
    /// Columns and units of a table.
    pub table: TableOptions,
    /// Corrections of a trace.
    pub corrections: CorrectionOptions,
    /// Channels of a trace.
    pub sections: SectionOptions,
    /// Cuts through a height map.
    pub cuts: CutOptions,
    /// A picture.
    pub micrograph: MicrographOptions,
    /// Further traces of the same line.
    pub repeats: Vec<PathBuf>,
    /// Trace of the other half of a bonded pair.
    pub lid_trace: Option<PathBuf>,
    /// Name of the section.
    pub name: Option<String>,
    /// The options as they were given, for `[source]`: name and value.
    pub settings: Vec<(String, String)>,
}

/// A trace with its channels.
#[derive(Debug, Clone, PartialEq)]
pub struct TraceReading {
    /// As the instrument wrote it.
    pub raw: RawTrace,
    /// After its corrections.
    pub corrected: CorrectedTrace,
    /// Its channels.
    pub grooves: Vec<GrooveSection>,
    /// Which cut of a height map it is, for names and messages.
    pub cut: Option<String>,
}

/// A height map with its cuts.
#[derive(Debug, Clone, PartialEq)]
pub struct MapReading {
    /// As the instrument wrote it.
    pub map: HeightMap,
    /// Where it was cut.
    pub cuts: MapCuts,
    /// The traces of the cuts.
    pub traces: Vec<TraceReading>,
}

/// What the file held.
#[derive(Debug, Clone, PartialEq)]
#[non_exhaustive]
pub enum InstrumentData {
    /// A trace.
    Trace(Box<TraceReading>),
    /// A height map.
    Map(Box<MapReading>),
    /// A picture.
    Micrograph(Box<MicrographSection>),
}

/// What came of the file of an instrument.
#[derive(Debug, Clone, PartialEq)]
pub struct InstrumentReading {
    /// Where it came from.
    pub provenance: Provenance,
    /// What it held.
    pub data: InstrumentData,
    /// How it was read: steps for the whole file.
    pub steps: Vec<Step>,
    /// What to know about the whole file.
    pub warnings: Vec<Warning>,
    /// The options as they were given.
    pub(super) settings: Vec<(String, String)>,
    pub(super) name: Option<String>,
}

/// How a section came out of an instrument's file.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Intake {
    /// All steps, in order.
    pub steps: Vec<Step>,
    /// The same section under other assumptions: option as typed, outline where there is one.
    pub alternatives: Vec<(String, Option<Outline>)>,
}

/// Reads the file of an instrument, or standard input when the path is `-`.
///
/// A height map is shown to `see_map` as it was read, before grooves are looked for: its heights are of use
/// even where none is found.
///
/// # Errors
/// [`ReadError`] when the file cannot be read, holds something else, or leaves a unit, a scale or a choice open.
pub fn read_instrument(
    path: &Path,
    options: &ReadOptions,
    see_map: &mut dyn FnMut(&HeightMap),
) -> Result<InstrumentReading, ReadError> {
    let name = if path == Path::new("-") {
        "standard input".to_owned()
    } else {
        path.display().to_string()
    };
    let bytes = read_bytes(path).map_err(|problem| ReadError::new(&name, problem))?;
    read_bytes_seeing_map(&bytes, &name, options, see_map)
}

/// Reads the bytes of an instrument's file; `path` is for messages and provenance.
///
/// # Errors
/// As [`read_instrument`].
pub fn instrument_from_bytes(
    bytes: &[u8],
    path: &str,
    options: &ReadOptions,
) -> Result<InstrumentReading, ReadError> {
    read_bytes_seeing_map(bytes, path, options, &mut |_| {})
}

/// Reads the bytes of an instrument's file and shows a height map as it was read.
fn read_bytes_seeing_map(
    bytes: &[u8],
    path: &str,
    options: &ReadOptions,
    see_map: &mut dyn FnMut(&HeightMap),
) -> Result<InstrumentReading, ReadError> {
    check_file_size(bytes.len() as u64, MAX_FILE_BYTES)
        .map_err(|problem| ReadError::new(path, problem))?;
    let content = content_of(bytes, options.as_kind).map_err(|fault| fault.in_file(path))?;
    let reader = Reader {
        bytes,
        path,
        options,
    };
    reader.read(content, see_map)
}

/// Reads an instrument's file of which it is known what it holds.
pub(crate) fn read_instrument_content(
    content: FileContent,
    bytes: &[u8],
    path: &str,
    options: &ReadOptions,
) -> Result<InstrumentReading, ReadError> {
    Reader {
        bytes,
        path,
        options,
    }
    .read(content, &mut |_| {})
}

/// A trace, a map or a picture that was read but not yet worked on.
enum Raw {
    Trace(RawTrace, Vec<Warning>),
    Map(HeightMap, Vec<Warning>),
}

/// One file on its way.
struct Reader<'a> {
    bytes: &'a [u8],
    path: &'a str,
    options: &'a ReadOptions,
}

impl Reader<'_> {
    fn read(
        &self,
        content: FileContent,
        see_map: &mut dyn FnMut(&HeightMap),
    ) -> Result<InstrumentReading, ReadError> {
        let options = &self.options.instrument;
        let (kind, encoding, raw) = match content {
            FileContent::Section(kind, _) => {
                let problem = ReadProblem::NotOfInstrument { kind: kind.word() };
                return Err(ReadError::new(self.path, problem));
            }
            FileContent::Picture => {
                let section = read_micrograph(self.bytes, &options.micrograph)
                    .map_err(|source| self.fault(source))?;
                let (steps, warnings) = (section.steps.clone(), section.warnings.clone());
                let data = InstrumentData::Micrograph(Box::new(section));
                return Ok(self.reading(
                    SectionKind::Micrograph,
                    "binary",
                    data,
                    (steps, warnings),
                ));
            }
            FileContent::Trace(source) => {
                (SectionKind::Trace, source.encoding, self.table(&source)?)
            }
            FileContent::Map(source) => (
                SectionKind::HeightMap,
                source.encoding,
                self.map_table(&source)?,
            ),
            FileContent::Surface(format) => self.surface(format)?,
        };
        match raw {
            Raw::Trace(raw, warnings) => {
                let steps = raw.steps.clone();
                let trace = self.trace(raw, None)?;
                let data = InstrumentData::Trace(Box::new(trace));
                Ok(self.reading(kind, encoding, data, (steps, warnings)))
            }
            Raw::Map(map, warnings) => {
                see_map(&map);
                let steps = map.steps.clone();
                let data = InstrumentData::Map(Box::new(self.map(map)?));
                Ok(self.reading(kind, encoding, data, (steps, warnings)))
            }
        }
    }

    fn fault(&self, problem: impl Into<Fault>) -> ReadError {
        problem.into().in_file(self.path)
    }

    fn table(&self, source: &SourceText) -> Result<Raw, ReadError> {
        let (raw, warnings) = read_trace_table(&source.text, &self.options.instrument.table)
            .map_err(|fault| fault.in_file(self.path))?;
        Ok(Raw::Trace(raw, warnings))
    }

    fn map_table(&self, source: &SourceText) -> Result<Raw, ReadError> {
        let (map, warnings) = read_map_table(&source.text, &self.options.instrument.table)
            .map_err(|fault| fault.in_file(self.path))?;
        Ok(Raw::Map(map, warnings))
    }

    fn surface(
        &self,
        format: SurfaceFormat,
    ) -> Result<(SectionKind, &'static str, Raw), ReadError> {
        let unit = UnitOption::resolve(self.options)
            .map_err(|problem| ReadError::new(self.path, problem))?;
        let unit = unit.map(|unit| unit.scale.factor());
        let (content, warnings) =
            read_surface(self.bytes, format, unit).map_err(|source| self.fault(source))?;
        Ok(match content {
            SurfaceContent::Map(map) => (SectionKind::HeightMap, "binary", Raw::Map(map, warnings)),
            SurfaceContent::Profile(raw) => {
                (SectionKind::Trace, "binary", Raw::Trace(raw, warnings))
            }
        })
    }

    /// Corrects a trace and closes its channels.
    fn trace(&self, raw: RawTrace, cut: Option<String>) -> Result<TraceReading, ReadError> {
        let options = &self.options.instrument;
        let repeats: Vec<RawTrace> = options
            .repeats
            .iter()
            .map(|path| self.further_trace(path))
            .collect::<Result<_, _>>()?;
        let corrected =
            correct(&raw, &repeats, &options.corrections).map_err(|source| self.fault(source))?;
        let mut how = options.sections.clone();
        if let Some(path) = &options.lid_trace {
            let lid = self.further_trace(path)?;
            let lid = correct(&lid, &[], &options.corrections)
                .map_err(|source| Fault::from(source).in_file(&path.display().to_string()))?;
            how.lid_trace = Some(Box::new(lid));
        }
        let grooves = sections(&corrected, &how).map_err(|source| self.fault(source))?;
        if !self.options.allow_any_size {
            for groove in &grooves {
                check_size(&groove.outline, None, None)
                    .map_err(|p| ReadError::new(self.path, p))?;
            }
        }
        Ok(TraceReading {
            raw,
            corrected,
            grooves,
            cut,
        })
    }

    /// A trace in a file of its own.
    fn further_trace(&self, path: &Path) -> Result<RawTrace, ReadError> {
        let name = path.display().to_string();
        let bytes = read_bytes(path).map_err(|problem| ReadError::new(&name, problem))?;
        let content =
            content_of(&bytes, Some(SectionKind::Trace)).map_err(|fault| fault.in_file(&name))?;
        let reader = Reader {
            bytes: &bytes,
            path: &name,
            options: self.options,
        };
        let raw = match content {
            FileContent::Trace(source) => reader.table(&source)?,
            FileContent::Surface(format) => reader.surface(format)?.2,
            _ => return Err(ReadError::new(&name, ReadProblem::NotATrace)),
        };
        match raw {
            Raw::Trace(raw, _) => Ok(raw),
            Raw::Map(..) => Err(ReadError::new(&name, ReadProblem::NotATrace)),
        }
    }

    /// Cuts a height map; every cut is a trace.
    fn map(&self, map: HeightMap) -> Result<MapReading, ReadError> {
        let mut cuts =
            cut(&map, &self.options.instrument.cuts).map_err(|source| self.fault(source))?;
        let several = cuts.cuts.len() > 1;
        let mut traces = Vec::new();
        for cut in &mut cuts.cuts {
            let name = several.then(|| format!("station {}", format_length(cut.station)));
            let trace = self.trace(std::mem::take(&mut cut.trace), name);
            traces.push(trace.map_err(|error| error.in_cut(cuts.direction))?);
        }
        Ok(MapReading { map, cuts, traces })
    }

    fn reading(
        &self,
        kind: SectionKind,
        encoding: &'static str,
        data: InstrumentData,
        (steps, warnings): (Vec<Step>, Vec<Warning>),
    ) -> InstrumentReading {
        InstrumentReading {
            provenance: Provenance {
                path: self.path.to_owned(),
                sha256: sha256_hex(self.bytes),
                kind,
                bytes: self.bytes.len() as u64,
                encoding,
                notes: Vec::new(),
            },
            data,
            steps,
            warnings,
            settings: self.options.instrument.settings.clone(),
            name: self.options.instrument.name.clone(),
        }
    }
}
