//! The JSON view of what came of an instrument's file: SI, no number without its unit, no NaN.

use std::collections::BTreeMap;

use serde::Serialize;

use super::json::{Source, WarningView};
use super::json_values::{Number, Quantity, place, pretty};
use super::reading_document::{
    AlternativeRecord, ConductanceRecord, MeasureRecord, ReadingDocument, SectionRecord, StepRecord,
};
use crate::geometry::{Loop, Outline};

/// The document as pretty-printed JSON with a closing line feed.
///
/// # Errors
/// The error of the serialiser; it has no cause in the data, since keys are text and numbers finite.
pub fn reading_json(document: &ReadingDocument<'_>) -> Result<String, serde_json::Error> {
    let root = Root {
        schema: document.schema,
        tool_version: env!("CARGO_PKG_VERSION"),
        source: Source::new(document.source),
        metadata: document.metadata,
        settings: document.settings,
        steps: document.steps.iter().map(StepView::new).collect(),
        sections: document.sections.iter().map(SectionView::new).collect(),
        warnings: document
            .warnings
            .iter()
            .map(|w| WarningView::new((*w).clone()))
            .collect(),
    };
    pretty(&root)
}

#[derive(Serialize)]
struct Root<'a> {
    schema: &'static str,
    tool_version: &'static str,
    source: Source<'a>,
    metadata: &'a [(String, String)],
    settings: &'a [(String, String)],
    steps: Vec<StepView<'a>>,
    sections: Vec<SectionView<'a>>,
    warnings: Vec<WarningView>,
}

/// One step of a reading.
#[derive(Serialize)]
pub(super) struct StepView<'a> {
    what: &'a str,
    text: &'a str,
    numbers: BTreeMap<&'static str, Number>,
}

impl<'a> StepView<'a> {
    pub(super) fn new(step: &StepRecord<'a>) -> Self {
        let number = |&(key, value): &(&'static str, f64)| (key, Number::real(value));
        Self {
            what: step.what,
            text: step.text,
            numbers: step.numbers.iter().map(number).collect(),
        }
    }
}

#[derive(Serialize)]
struct SectionView<'a> {
    number: usize,
    name: &'a str,
    section: SizeView,
    measures: BTreeMap<&'static str, Quantity>,
    conductance: Option<ConductanceView>,
    reach_reason: Option<&'a str>,
    alternatives: Vec<AlternativeView<'a>>,
    outline: OutlineView,
    steps: Vec<StepView<'a>>,
    warnings: Vec<WarningView>,
}

impl<'a> SectionView<'a> {
    fn new(section: &'a SectionRecord<'a>) -> Self {
        let measure = |m: &MeasureRecord| {
            let quantity = Quantity::optional(m.value, m.unit, m.absent_because);
            (m.key, quantity)
        };
        Self {
            number: section.number,
            name: section.name,
            section: SizeView::new(section.outline),
            measures: section.measures.iter().map(measure).collect(),
            conductance: section.conductance.as_ref().map(ConductanceView::new),
            reach_reason: section.reach_reason,
            alternatives: section
                .alternatives
                .iter()
                .map(AlternativeView::new)
                .collect(),
            outline: OutlineView::new(section.outline),
            steps: section.steps.iter().map(StepView::new).collect(),
            warnings: section
                .warnings
                .iter()
                .cloned()
                .map(WarningView::new)
                .collect(),
        }
    }
}

#[derive(Serialize)]
struct SizeView {
    area: Quantity,
    wetted_perimeter: Quantity,
    hydraulic_diameter: Quantity,
    width: Quantity,
    height: Quantity,
    lumens: usize,
    islands: usize,
}

impl SizeView {
    fn new(outline: &Outline) -> Self {
        let (low, high) = outline.bounds().unwrap_or_default();
        let (area, perimeter) = (outline.area(), outline.wetted_perimeter());
        Self {
            area: Quantity::real(area, "m^2"),
            wetted_perimeter: Quantity::real(perimeter, "m"),
            hydraulic_diameter: Quantity::real(4.0 * area / perimeter, "m"),
            width: Quantity::real(high[0] - low[0], "m"),
            height: Quantity::real(high[1] - low[1], "m"),
            lumens: outline.lumens.len(),
            islands: outline.lumens.iter().map(|l| l.islands.len()).sum(),
        }
    }
}

#[derive(Serialize)]
struct ConductanceView {
    #[serde(flatten)]
    quantity: Quantity,
    within_reach: Option<Quantity>,
}

impl ConductanceView {
    fn new(record: &ConductanceRecord) -> Self {
        let bounds = record.proven.map(|[low, high]| (low, high));
        let value = || Quantity::estimate(record.value, "m^4");
        Self {
            quantity: value().between(bounds),
            within_reach: record
                .within_reach
                .map(|[low, high]| value().between(Some((low, high)))),
        }
    }
}

/// A section under another assumption.
#[derive(Serialize)]
pub(super) struct AlternativeView<'a> {
    option: &'a str,
    conductance: Quantity,
    relative_change: Quantity,
}

impl<'a> AlternativeView<'a> {
    pub(super) fn new(record: &'a AlternativeRecord) -> Self {
        let reason = record.conductance.as_ref().err().map_or("", String::as_str);
        Self {
            option: &record.option,
            conductance: match &record.conductance {
                Ok(estimate) => Quantity::estimate(*estimate, "m^4"),
                Err(reason) => Quantity::optional(None, "m^4", reason),
            },
            relative_change: Quantity::optional(record.relative_change, "1", reason),
        }
    }
}

#[derive(Serialize)]
struct OutlineView {
    unit: &'static str,
    lumens: Vec<LumenView>,
}

#[derive(Serialize)]
struct LumenView {
    outer: Vec<[Number; 2]>,
    islands: Vec<Vec<[Number; 2]>>,
}

impl OutlineView {
    fn new(outline: &Outline) -> Self {
        let points = |wall: &Loop| wall.points.iter().map(|&p| place(p)).collect();
        Self {
            unit: "m",
            lumens: outline
                .lumens
                .iter()
                .map(|lumen| LumenView {
                    outer: points(&lumen.outer),
                    islands: lumen.islands.iter().map(points).collect(),
                })
                .collect(),
        }
    }
}
