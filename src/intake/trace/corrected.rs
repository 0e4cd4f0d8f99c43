//! A trace after its corrections, with all that was changed.

use super::profile::{Profile, Zone};
use crate::intake::step::Step;
use crate::warning::Warning;

/// Why samples were changed.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
#[non_exhaustive]
pub enum ChangeKind {
    /// A spike or a grain of dust.
    Spike,
    /// The instrument gave no height.
    Missing,
}

/// Samples that were bridged.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Change {
    /// Why.
    pub kind: ChangeKind,
    /// From the last sample before to the first one after.
    pub zone: Zone,
    /// Number of samples bridged.
    pub samples: usize,
    /// Largest height above (negative: below) the bridge, m; zero for missing points.
    pub size: f64,
}

/// A trace after its corrections.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct CorrectedTrace {
    /// Positions and heights before levelling, m: joined from repeats, turned over and unshrunk where
    /// asked, without bridges.
    pub raw: Profile,
    /// Levelled, bridged and, where asked, filtered; the reference zones lie at zero. No NaN inside.
    pub profile: Profile,
    /// Height of the reference line that was taken off, m, one for each sample of `profile`.
    pub reference: Vec<f64>,
    /// Zones the reference line was fitted to.
    pub reference_zones: Vec<Zone>,
    /// Lands: the level stretches beside and between channels, found or stated.
    pub lands: Vec<Zone>,
    /// Root mean square distance of the reference zones from the reference line, m.
    pub reference_rms: f64,
    /// Whether heights were turned over: a tip then touched what is now the inside of the wall.
    pub inverted: bool,
    /// Share by which lengths along the trace and heights were made smaller; the tip touched the
    /// measured size.
    pub shrinkage: [f64; 2],
    /// Samples that were bridged.
    pub changes: Vec<Change>,
    /// What was done.
    pub steps: Vec<Step>,
    /// What a reader of results must know.
    pub warnings: Vec<Warning>,
}
