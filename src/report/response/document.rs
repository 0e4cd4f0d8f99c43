//! The one document behind every output of a response table.

use crate::flow::Fluid;
use crate::report::document::SourceRecord;
use crate::report::numbers::{self, significant};
use crate::study::{
    ParameterUnit, ResponseOptions, ResponseParameter, ResponsePoint, ResponseTable,
};
use crate::warning::Warning;

/// Everything an output of a response table may show.
#[derive(Debug, Clone, Copy)]
pub struct ResponseDocument<'a> {
    /// Name of the section or of the nominal kind.
    pub name: &'a str,
    /// Where the section came from; `None` for a nominal kind.
    pub source: Option<SourceRecord<'a>>,
    /// Fixed parameters of a nominal kind as written; empty for a moved outline.
    pub fixed: &'a [(String, String)],
    /// The table with its formula.
    pub table: &'a ResponseTable,
    /// What was asked for.
    pub options: ResponseOptions,
    /// The fluid, when one was given.
    pub fluid: Option<&'a Fluid>,
    /// Warnings that are not in the table.
    pub warnings: &'a [Warning],
}

impl ResponseDocument<'_> {
    /// All warnings: of the section as read, of the table.
    pub fn all_warnings(&self) -> Vec<Warning> {
        let own = self.warnings.iter();
        own.chain(&self.table.warnings).cloned().collect()
    }

    /// The unit in which each parameter is shown to people.
    pub(super) fn units(&self) -> Vec<ShownUnit> {
        let parameters = self.table.parameters.iter();
        parameters.map(ShownUnit::of).collect()
    }

    /// `R' = mu / K`, Pa s/m^4.
    pub(super) fn resistance(&self, conductance: f64) -> Option<f64> {
        self.fluid.map(|fluid| fluid.viscosity / conductance)
    }

    /// Points of the table that a short table shows: at most `most` along each parameter, the ends among them.
    pub(super) fn shown_points(&self, most: usize) -> Vec<&ResponsePoint> {
        let nodes = &self.table.nodes;
        let strides: Vec<usize> = nodes
            .iter()
            .map(|&n| {
                let mut stride = 1;
                while (n - 1) / stride + 1 > most && (n - 1) % (2 * stride) == 0 {
                    stride *= 2;
                }
                stride
            })
            .collect();
        let is_shown = |flat: usize| {
            let mut rest = flat;
            nodes.iter().zip(&strides).rev().all(|(&n, &stride)| {
                let index = rest % n;
                rest /= n;
                index.is_multiple_of(stride)
            })
        };
        let points = self.table.points.iter().enumerate();
        points
            .filter(|(flat, _)| is_shown(*flat))
            .map(|(_, point)| point)
            .collect()
    }
}

/// A unit for people with its size in SI.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct ShownUnit {
    /// Its name; empty for plain numbers.
    pub(super) name: &'static str,
    /// Its size, SI.
    pub(super) size: f64,
}

impl ShownUnit {
    /// The unit that fits the range of a parameter.
    pub(super) fn of(parameter: &ResponseParameter) -> Self {
        let largest = parameter.low.abs().max(parameter.high.abs());
        let (name, size) = match parameter.unit {
            ParameterUnit::Length => numbers::fitting_unit(largest, numbers::LENGTHS),
            ParameterUnit::Angle => ("deg", 1_f64.to_radians()),
            ParameterUnit::One => ("", 1.0),
        };
        Self { name, size }
    }

    /// A value with its unit.
    pub(super) fn with(&self, value: f64, digits: usize) -> String {
        let text = format!("{} {}", significant(value / self.size, digits), self.name);
        text.trim_end().to_owned()
    }

    /// A name with the unit, as the head of a column or an axis.
    pub(super) fn head(&self, name: &str) -> String {
        if self.name.is_empty() {
            name.to_owned()
        } else {
            format!("{name} / {}", self.name)
        }
    }
}
