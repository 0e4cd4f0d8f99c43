//! The one document behind every output of `sensitivity`.

use super::document::SourceRecord;
use crate::flow::SectionFlow;
use crate::study::{Measure, Sensitivity, SensitivityStudy};
use crate::warning::Warning;

/// Everything an output of `sensitivity` may show.
#[derive(Debug, Clone, Copy)]
pub struct SensitivityDocument<'a> {
    /// Where the section came from; `None` for one built in code.
    pub source: Option<SourceRecord<'a>>,
    /// Name of the section.
    pub section_name: &'a str,
    /// The solved section.
    pub flow: &'a SectionFlow,
    /// What small changes of its wall do.
    pub study: &'a SensitivityStudy,
    /// Warnings that are neither in `flow` nor in `study`.
    pub warnings: &'a [Warning],
}

impl SensitivityDocument<'_> {
    /// All warnings: of the section, of the study, of the request.
    pub fn all_warnings(&self) -> Vec<Warning> {
        self.flow
            .warnings
            .iter()
            .chain(&self.study.warnings)
            .chain(self.warnings)
            .cloned()
            .collect()
    }
}

/// A change as a person would name it: one per cent, one micrometre, one degree.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Step {
    /// Name of one unit of it.
    pub(super) unit: &'static str,
    /// In units of the case.
    pub(super) size: f64,
}

impl Step {
    /// The steps in which a case is shown, the one of its own measure first.
    pub(super) fn of(case: &Sensitivity) -> Vec<Self> {
        let micrometre = |units: f64| Self {
            unit: "\u{b5}m",
            size: 1e-6 * units,
        };
        match case.measure {
            Measure::Length => vec![micrometre(1.0)],
            Measure::Angle => vec![Self {
                unit: "deg",
                size: 1_f64.to_radians(),
            }],
            Measure::Relative => {
                let mut steps = vec![Self {
                    unit: "%",
                    size: 0.01,
                }];
                steps.extend(case.reference_length.map(|length| micrometre(1.0 / length)));
                steps
            }
        }
    }
}
