//! A channel of a trace as a closed section.

use super::profile::{Profile, Zone};
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

/// A channel of a trace.
#[derive(Debug, Clone, PartialEq)]
pub struct GrooveSection {
    /// Its number along the trace, from 1.
    pub number: usize,
    /// From edge to edge on the trace.
    pub zone: Zone,
    /// The closed section, m, `y` upwards.
    pub outline: Outline,
    /// The smallest and the largest section it could be.
    pub reach: Option<Reach>,
    /// The lid: its lower face over the section, from left to right.
    pub lid: Profile,
    /// The other lids that would do.
    pub lid_alternatives: Vec<LidAlternative>,
    /// What was done.
    pub steps: Vec<Step>,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
}
