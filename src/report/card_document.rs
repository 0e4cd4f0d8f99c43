//! The one document behind every output of `card`.

use super::document::{ReachRecord, SourceRecord, pressure_caution};
use crate::flow::{Fluid, SectionFlow};
use crate::study::SectionCard;
use crate::warning::{Code, Warning};

/// One card with what it rests on.
#[derive(Debug, Clone, Copy)]
pub struct CardRecord<'a> {
    /// Name of the section.
    pub name: &'a str,
    /// Where the section came from; `None` for one built in code.
    pub source: Option<SourceRecord<'a>>,
    /// The fluid at the reference temperature.
    pub fluid: &'a Fluid,
    /// The solved section.
    pub flow: &'a SectionFlow,
    /// The reach bracket, when the section file gives an inner or outer section.
    pub reach: Option<ReachRecord<'a>>,
    /// The coefficients.
    pub card: &'a SectionCard,
    /// Warnings that are not in `flow`.
    pub warnings: &'a [Warning],
}

/// A file that gave no card.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct FailedCard<'a> {
    /// Path as given by the user.
    pub path: &'a str,
    /// Why, as printed.
    pub reason: &'a str,
}

/// Everything an output of `card` may show.
#[derive(Debug, Clone, Copy)]
pub struct CardDocument<'a> {
    /// The cards in the order of their files.
    pub cards: &'a [CardRecord<'a>],
    /// Files that gave none.
    pub failed: &'a [FailedCard<'a>],
    /// What was typed and what is in force, name and value.
    pub settings: &'a [(String, String)],
}

impl CardRecord<'_> {
    /// All warnings: of the section, of the request, and the cautions of every card.
    pub fn all_warnings(&self) -> Vec<Warning> {
        let mut all: Vec<Warning> = self
            .flow
            .warnings
            .iter()
            .chain(self.warnings)
            .cloned()
            .collect();
        all.push(Warning {
            code: Code::Caution,
            message: "The card holds for a rigid section: channels in soft elastomers widen under pressure, and \
                      their resistance then falls with it."
                .to_owned(),
            advice: "For soft walls measure the section under pressure, or the resistance at the pressure of use."
                .to_owned(),
            numbers: Vec::new(),
        });
        all.push(pressure_caution());
        all
    }

    /// Reach of the resistance per length, Pa s/m^4: the values at the largest and the smallest section.
    pub fn resistance_reach(&self) -> Option<(f64, f64)> {
        let reach = self.reach?.reach;
        let mu = self.fluid.viscosity;
        Some((mu / reach.high()?, mu / reach.low()?))
    }
}
