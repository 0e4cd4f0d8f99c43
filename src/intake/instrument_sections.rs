//! The sections that an instrument's file gave, each with its steps, its `[source]` and its warnings.

use super::instrument::{InstrumentData, InstrumentReading, Intake, TraceReading};
use super::micrograph::MicrographSection;
use super::read_error::{ReadError, ReadProblem};
use super::section::{Extras, Section};
use super::source_table::source_table;
use super::step::Step;
use super::trace::GrooveSection;
use crate::units::format_length;
use crate::warning::Warning;

impl TraceReading {
    /// Number of sections.
    fn len(&self) -> usize {
        self.grooves.len()
    }
}

impl InstrumentReading {
    /// The traces of the file, those of the cuts for a height map.
    pub fn traces(&self) -> &[TraceReading] {
        match &self.data {
            InstrumentData::Trace(trace) => std::slice::from_ref(trace),
            InstrumentData::Map(map) => &map.traces,
            InstrumentData::Micrograph(_) => &[],
        }
    }

    /// What was done for all sections alike; the steps of every section begin with these.
    pub fn shared_steps(&self) -> Vec<&Step> {
        let cuts = match &self.data {
            InstrumentData::Map(map) => &map.cuts.steps[..],
            _ => &[],
        };
        let corrections = match self.traces() {
            [trace] => &trace.corrected.steps[..],
            _ => &[],
        };
        self.steps.iter().chain(cuts).chain(corrections).collect()
    }

    /// What to know about all sections alike; the warnings of every section begin with these.
    pub fn shared_warnings(&self) -> Vec<&Warning> {
        let cuts = match &self.data {
            InstrumentData::Map(map) => &map.cuts.warnings[..],
            _ => &[],
        };
        let corrections = match self.traces() {
            [trace] => &trace.corrected.warnings[..],
            _ => &[],
        };
        self.warnings
            .iter()
            .chain(cuts)
            .chain(corrections)
            .collect()
    }

    /// What the file says besides, key and value.
    pub fn metadata(&self) -> &[(String, String)] {
        match &self.data {
            InstrumentData::Trace(trace) => &trace.raw.metadata,
            InstrumentData::Map(map) => &map.map.metadata,
            InstrumentData::Micrograph(picture) => &picture.metadata,
        }
    }

    /// The sections, in the order of the cuts and along the trace.
    pub fn sections(&self) -> Vec<Section> {
        if let InstrumentData::Micrograph(picture) = &self.data {
            return vec![self.of_picture(picture)];
        }
        let several = self.traces().iter().map(TraceReading::len).sum::<usize>() > 1;
        let grooves = |trace: &TraceReading| {
            let of = |groove| self.of_groove(trace, groove, several);
            trace.grooves.iter().map(of).collect::<Vec<_>>()
        };
        self.traces().iter().flat_map(grooves).collect()
    }

    /// The only section.
    ///
    /// # Errors
    /// [`ReadProblem::SeveralSections`] where there are several, with the options that choose one.
    pub fn only_section(&self) -> Result<Section, ReadError> {
        let mut sections = self.sections();
        match sections.len() {
            1 => Ok(sections.swap_remove(0)),
            _ => Err(ReadError::new(
                &self.provenance.path,
                ReadProblem::SeveralSections {
                    list: self.list(),
                    is_map: matches!(self.data, InstrumentData::Map(_)),
                },
            )),
        }
    }

    /// The sections in words, for a message.
    fn list(&self) -> Vec<String> {
        let grooves = |trace: &TraceReading| {
            let cut = trace.cut.as_ref().map(|cut| format!(", {cut}"));
            let cut = cut.unwrap_or_default();
            let word = |groove: &GrooveSection| {
                format!(
                    "{}: from {} to {}{cut}",
                    groove.number,
                    format_length(groove.zone.from),
                    format_length(groove.zone.to)
                )
            };
            trace.grooves.iter().map(word).collect::<Vec<_>>()
        };
        self.traces().iter().flat_map(grooves).collect()
    }

    fn of_picture(&self, picture: &MicrographSection) -> Section {
        let steps = self.steps.clone();
        let extras = Extras {
            reach: picture.reach.clone(),
            ..Extras::default()
        };
        let made = Made {
            outline: picture.outline.clone(),
            extras,
            steps,
            warnings: self.warnings.clone(),
            alternatives: Vec::new(),
        };
        self.section(self.name.clone(), made)
    }

    fn of_groove(&self, trace: &TraceReading, groove: &GrooveSection, several: bool) -> Section {
        let number = several.then(|| format!("channel {}", groove.number));
        let parts: Vec<String> = [self.name.clone(), trace.cut.clone(), number]
            .into_iter()
            .flatten()
            .collect();
        let name = (!parts.is_empty()).then(|| parts.join(", "));
        let is_only = self.traces().len() == 1;
        // Corrections of the only trace are shared already.
        let of_trace = |count: usize| if is_only { count } else { 0 };
        let corrected = &trace.corrected;
        let own_steps = corrected.steps.iter().skip(of_trace(corrected.steps.len()));
        let own_warnings = corrected
            .warnings
            .iter()
            .skip(of_trace(corrected.warnings.len()));
        let steps = self
            .shared_steps()
            .into_iter()
            .chain(own_steps)
            .chain(&groove.steps);
        let steps: Vec<Step> = steps.cloned().collect();
        let warnings = self
            .shared_warnings()
            .into_iter()
            .chain(own_warnings)
            .chain(&groove.warnings);
        let warnings: Vec<Warning> = warnings.cloned().collect();
        let alternatives = groove
            .lid_alternatives
            .iter()
            .map(|other| (format!("--lid {}", other.lid), other.outline.clone()))
            .collect();
        let extras = Extras {
            reach: groove.reach.clone(),
            ..Extras::default()
        };
        let made = Made {
            outline: groove.outline.clone(),
            extras,
            steps,
            warnings,
            alternatives,
        };
        self.section(name, made)
    }

    fn section(&self, name: Option<String>, made: Made) -> Section {
        let source = source_table(&self.provenance, &self.settings, &made.steps);
        Section {
            name,
            loop_numbers: (0..made.outline.loops().count()).collect(),
            outline: made.outline,
            nominal: None,
            walls: Vec::new(),
            provenance: self.provenance.clone(),
            extras: Extras {
                source: Some(source),
                ..made.extras
            },
            warnings: made.warnings,
            intake: Intake {
                steps: made.steps,
                alternatives: made.alternatives,
            },
        }
    }
}

/// What was made of one channel.
struct Made {
    outline: crate::geometry::Outline,
    extras: Extras,
    steps: Vec<Step>,
    warnings: Vec<Warning>,
    alternatives: Vec<(String, Option<crate::geometry::Outline>)>,
}
