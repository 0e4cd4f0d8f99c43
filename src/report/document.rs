//! The one document behind every output format.
//!
//! It borrows what the solve and the operating point say and adds only unit conversions, so that text,
//! JSON, CSV, field files and pictures cannot disagree. SI throughout.

use super::reading_document::{AlternativeRecord, StepRecord};
use crate::flow::{Fluid, OperatingPoint, SectionFlow, ShortcutRow, WallReport};
use crate::geometry::FilmReport;
use crate::measured::Estimate;
use crate::study::Reach;
use crate::warning::{Code, Warning};

/// Where the section came from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct SourceRecord<'a> {
    /// Path as given by the user.
    pub path: &'a str,
    /// SHA-256 of the bytes read, lower-case hexadecimal.
    pub sha256: &'a str,
    /// Kind of file, for example `section file`.
    pub kind: &'a str,
    /// What a reader should know about how it was read: scale, parts left out.
    pub notes: &'a [String],
}

/// The reach bracket and why the wall is not known better.
#[derive(Debug, Clone, Copy)]
pub struct ReachRecord<'a> {
    /// The bracket.
    pub reach: &'a Reach,
    /// The reason that the section file gives.
    pub reason: Option<&'a str>,
}

/// Everything an output of `solve` may show.
#[derive(Debug, Clone, Copy)]
pub struct SolveDocument<'a> {
    /// Where the section came from; `None` for one built in code.
    pub source: Option<SourceRecord<'a>>,
    /// Name of the section.
    pub section_name: &'a str,
    /// The film that was put on the section as read; the solved section is what it left.
    pub film: Option<&'a FilmReport>,
    /// The solved section.
    pub flow: &'a SectionFlow,
    /// The reach bracket, when the section file gives an inner or outer section.
    pub reach: Option<ReachRecord<'a>>,
    /// The fluid, when one was given.
    pub fluid: Option<&'a Fluid>,
    /// Channel length, m, when one was given.
    pub length: Option<f64>,
    /// The operating point, when a pressure drop or a flow rate was given.
    pub operating_point: Option<&'a OperatingPoint>,
    /// The wall shear wall by wall, where it was worked out.
    pub walls: Option<&'a WallReport>,
    /// The shortcut formulas, when they were asked for.
    pub shortcuts: Option<&'a [ShortcutRow]>,
    /// Warnings that are not already in `flow.warnings`.
    pub warnings: &'a [Warning],
    /// How the section came out of an instrument's file; empty where it was given as an outline.
    pub steps: &'a [StepRecord<'a>],
    /// What other assumptions about an instrument's file would give.
    pub alternatives: &'a [AlternativeRecord],
}

/// A factor that turns a quantity per unit of drive into a quantity with a unit.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Scale {
    /// Multiply by this.
    pub factor: f64,
    /// Unit of the product, ASCII.
    pub unit: &'static str,
}

/// The caution printed wherever a pressure appears.
const PRESSURE_CAUTION: &str = "A resistance is not a pressure rating: bonded chips and fittings can burst. \
The results hold for fully developed laminar flow in a rigid section.";

/// What to do about [`PRESSURE_CAUTION`].
const PRESSURE_ADVICE: &str = "They do not replace proof testing, local codes, the device maker's limits \
or the judgement of a qualified person.";

/// The caution wherever a pressure or a resistance is handed over.
pub(super) fn pressure_caution() -> Warning {
    Warning {
        code: Code::Caution,
        message: PRESSURE_CAUTION.to_owned(),
        advice: PRESSURE_ADVICE.to_owned(),
        numbers: Vec::new(),
    }
}

impl<'a> SolveDocument<'a> {
    /// A document with a solved section and nothing else.
    pub fn new(section_name: &'a str, flow: &'a SectionFlow) -> Self {
        Self {
            source: None,
            section_name,
            film: None,
            flow,
            reach: None,
            fluid: None,
            length: None,
            operating_point: None,
            walls: None,
            shortcuts: None,
            warnings: &[],
            steps: &[],
            alternatives: &[],
        }
    }

    /// Resistance per length `mu / K`, Pa s/m^4; `None` without a fluid.
    pub fn resistance_per_length(&self) -> Option<Estimate> {
        let k = self.flow.conductance;
        self.fluid.map(|fluid| {
            let value = fluid.viscosity / k.value;
            Estimate {
                value,
                error: (value * k.relative()).abs(),
            }
        })
    }

    /// Resistance `mu L / K`, Pa s/m^3; `None` without a fluid or a length.
    pub fn resistance(&self) -> Option<Estimate> {
        let length = self.length?;
        self.resistance_per_length().map(|r| r.scaled(length))
    }

    /// What `phi` (m^2) is multiplied by to become the axial velocity, as far as the drive is known.
    ///
    /// With an operating point `G / mu` and m/s; with a fluid alone `1 / mu` and m/s per Pa/m; with
    /// neither 1, and the product must still be multiplied by `G / mu`.
    pub fn velocity_scale(&self) -> Scale {
        match (self.fluid, self.operating_point) {
            (Some(fluid), Some(point)) => Scale {
                factor: point.pressure_gradient / fluid.viscosity,
                unit: "m/s",
            },
            (Some(fluid), None) => Scale {
                factor: 1.0 / fluid.viscosity,
                unit: "m/s per Pa/m",
            },
            (None, _) => Scale {
                factor: 1.0,
                unit: "m/s per (Pa/m)/(Pa s)",
            },
        }
    }

    /// What the shear per gradient (m) is multiplied by: `G` and Pa, or 1 and Pa per Pa/m.
    pub fn shear_scale(&self) -> Scale {
        self.operating_point.map_or(
            Scale {
                factor: 1.0,
                unit: "Pa per Pa/m",
            },
            |point| Scale {
                factor: point.pressure_gradient,
                unit: "Pa",
            },
        )
    }

    /// What the shear per gradient (m) is multiplied by to become shear per flow rate, `mu / K`,
    /// Pa s/m^4; `None` without a fluid.
    pub fn shear_per_flow_rate(&self) -> Option<f64> {
        self.resistance_per_length().map(|r| r.value)
    }

    /// Mean of `phi` over the section, `K / A`, m^2.
    pub fn mean_phi(&self) -> f64 {
        self.flow.conductance.value / self.flow.geometry.area
    }

    /// All warnings: of the section, of the request, and the caution where a pressure is shown.
    pub fn all_warnings(&self) -> Vec<Warning> {
        let mut all: Vec<Warning> = self
            .flow
            .warnings
            .iter()
            .chain(self.warnings)
            .cloned()
            .collect();
        let cautioned = all.iter().any(|w| w.code == Code::Caution);
        if self.operating_point.is_some() && !cautioned {
            all.push(pressure_caution());
        }
        all
    }
}
