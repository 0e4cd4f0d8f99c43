//! What came of the file of an instrument: its steps and its sections, before anything more is solved.
//!
//! The layer of commands fills it in; nothing here knows of traces, maps or pictures.

use super::document::SourceRecord;
use crate::geometry::Outline;
use crate::measured::Estimate;
use crate::warning::Warning;

/// One thing that was decided or done.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct StepRecord<'a> {
    /// What kind of step.
    pub what: &'a str,
    /// The sentence.
    pub text: &'a str,
    /// Its numbers: key, ending in the unit, and value.
    pub numbers: &'a [(&'static str, f64)],
}

/// One number of a section.
#[derive(Debug, Clone, PartialEq)]
pub struct MeasureRecord {
    /// Key for machines.
    pub key: &'static str,
    /// Name for people.
    pub label: &'static str,
    /// Value, SI.
    pub value: Option<f64>,
    /// Its unit: `m`, `m^2`, `rad` or `1`.
    pub unit: &'static str,
    /// Why there is none.
    pub absent_because: &'static str,
}

/// The same section under another assumption.
#[derive(Debug, Clone, PartialEq)]
pub struct AlternativeRecord {
    /// The assumption, as its option is typed: `--lid left`.
    pub option: String,
    /// Conductance, m^4, or why there is none.
    pub conductance: Result<Estimate, String>,
    /// Conductance over that of the section as taken, less 1.
    pub relative_change: Option<f64>,
}

/// Conductance of a section, and of the two it lies between.
#[derive(Debug, Clone, PartialEq)]
pub struct ConductanceRecord {
    /// Best value, m^4.
    pub value: Estimate,
    /// Proven range for the outline as given, m^4.
    pub proven: Option<[f64; 2]>,
    /// Proven low value of the inner and high value of the outer section, m^4.
    pub within_reach: Option<[f64; 2]>,
}

/// One section that the file gave.
#[derive(Debug, Clone)]
pub struct SectionRecord<'a> {
    /// Its number along the trace or of the cut, from 1.
    pub number: usize,
    /// Its name.
    pub name: &'a str,
    /// Its outline, m.
    pub outline: &'a Outline,
    /// Its numbers.
    pub measures: Vec<MeasureRecord>,
    /// Its conductance; `None` where it was not asked for.
    pub conductance: Option<ConductanceRecord>,
    /// Why the wall is not known better, where a reach is given.
    pub reach_reason: Option<&'a str>,
    /// What other assumptions would give.
    pub alternatives: Vec<AlternativeRecord>,
    /// What was done for it alone.
    pub steps: Vec<StepRecord<'a>>,
    /// What to know about it.
    pub warnings: &'a [Warning],
}

/// Everything that outputs of `trace`, `map` and `image` may show.
#[derive(Debug, Clone)]
pub struct ReadingDocument<'a> {
    /// Name and version of the JSON form.
    pub schema: &'static str,
    /// The file.
    pub source: SourceRecord<'a>,
    /// What the file says besides, key and value.
    pub metadata: &'a [(String, String)],
    /// Settings in force: option and value.
    pub settings: &'a [(String, String)],
    /// What was decided and done for the whole file.
    pub steps: Vec<StepRecord<'a>>,
    /// Its sections.
    pub sections: Vec<SectionRecord<'a>>,
    /// What to know about the whole file.
    pub warnings: Vec<&'a Warning>,
}
