//! A channel of a trace as a closed section.

use super::profile::{Profile, Zone};
use super::trench_numbers::TrenchNumbers;
use crate::geometry::Outline;
use crate::intake::section_reach::Reach;
use crate::intake::step::Step;
use crate::warning::Warning;

/// Another lid that the trace would allow as well, for its effect on the result.
#[derive(Debug, Clone, PartialEq)]
pub struct LidAlternative {
    /// Its name as on the command line: `both`, `left`, `right`, `fit`.
    pub lid: &'static str,
    /// The section under it, m; `None` where there is none (the lid would cut the floor, say).
    pub outline: Option<Outline>,
}

/// A flank that shows the tip, or may show it.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TipFlank {
    /// From its first to its last touched sample, m.
    pub zone: Zone,
    /// Its angle against the level, rad.
    pub angle: f64,
    /// Whether nothing level was touched between two flanks.
    pub is_bottomless: bool,
}

/// A channel of a trace.
#[derive(Debug, Clone, PartialEq)]
pub struct GrooveSection {
    /// Its number along the trace, from 1.
    pub number: usize,
    /// From edge to edge on the trace.
    pub zone: Zone,
    /// The closed section, m, `y` upwards; positions are those of the trace.
    pub outline: Outline,
    /// The smallest and the largest section it could be; each side lies in the next exactly. `None` where
    /// every flank was touched, or where the floor was not, so that one of the two is not known.
    pub reach: Option<Reach>,
    /// The lid: its lower face over the section, from left to right.
    pub lid: Profile,
    /// The other lids that would do, where they make a difference.
    pub lid_alternatives: Vec<LidAlternative>,
    /// The surface over the groove and the lands its levels come from: as read, or with the tip taken back.
    pub surface: Profile,
    /// Whether each sample of `surface` was touched for sure, as far as tip and flanks are known.
    pub is_touched: Vec<bool>,
    /// Flanks that show the tip.
    pub flanks: Vec<TipFlank>,
    /// Widths, depths and angles of the section's walls.
    pub numbers: TrenchNumbers,
    /// What was done.
    pub steps: Vec<Step>,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
}
