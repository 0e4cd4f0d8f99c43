//! What can be wrong with a trace when it is corrected.

use super::correction_options::MAX_BOW;
use super::scan::NO_RELIEF;
use crate::units::{format_length, format_percent};

/// Fewest samples of a trace that is corrected.
pub(super) const FEWEST_SAMPLES: usize = 20;

/// Fewest samples of a zone that a line is fitted to.
pub(super) const FEWEST_IN_ZONE: usize = 3;

/// What is wrong with a trace when it is corrected.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum TraceProblem {
    /// Positions and heights do not belong together.
    #[error("{positions} positions but {heights} heights")]
    Lengths {
        /// Number of positions.
        positions: usize,
        /// Number of heights.
        heights: usize,
    },
    /// A position that is not finite or not above the one before.
    #[error("position {number} is not above the one before it")]
    Order {
        /// Its number, from 1.
        number: usize,
    },
    /// Too few samples with a height.
    #[error("only {found} of {samples} samples have a height; {FEWEST_SAMPLES} are needed")]
    TooFewSamples {
        /// Samples with a height.
        found: usize,
        /// Samples.
        samples: usize,
    },
    /// A position or a height that no instrument gives.
    #[error("sample {number} lies {} away; no trace is longer than 1 km", format_length(*distance))]
    TooFar {
        /// Its number, from 1.
        number: usize,
        /// Position or height, m.
        distance: f64,
    },
    /// Nothing stands out of the noise.
    #[error(
        "the trace has one level: heights spread over {} (noise {}), and no channel stands out",
        format_length(*relief),
        format_length(*noise)
    )]
    NoChannel {
        /// Spread of the heights about their slope, m.
        relief: f64,
        /// Noise from sample to sample, m.
        noise: f64,
    },
    /// All heights lie on one straight line.
    #[error("{}", straight_words(*rise, *length))]
    Straight {
        /// Height of its end over its start, m.
        rise: f64,
        /// Length of the trace, m.
        length: f64,
    },
    /// There is relief, but nothing that goes down between two lands.
    #[error(
        "no channel lies between two lands: the trace holds {ridges} ridge(s) or step(s) of about {}",
        format_length(*height)
    )]
    NoGroove {
        /// Stretches on the upper level.
        ridges: usize,
        /// Their height, m.
        height: f64,
    },
    /// There are hills and valleys, but no level stretch.
    #[error(
        "no land is level: the widest level stretch is {} beside walls that take {} from 25 to 75 % \
         of the depth",
        format_length(*level),
        format_length(*wall)
    )]
    NoLand {
        /// Width of a typical level stretch, m.
        level: f64,
        /// Length of a typical wall, m.
        wall: f64,
    },
    /// The upper stretches are crests or slopes.
    #[error(
        "no land is level: the upper stretches are rounded or slope, by {} where the trace goes {} down",
        format_length(*crest),
        format_length(*depth)
    )]
    RoundLands {
        /// Typical height of the middle half over the outer quarters, or of one end over the other, m.
        crest: f64,
        /// Typical depth, m.
        depth: f64,
    },
    /// Neighbouring lands differ in height by more than the channels are deep.
    #[error(
        "neighbouring lands differ in height by up to {} from a straight line, more than twice the \
         depth of the channels ({}): these are rather steps on the walls of larger channels that the trace does not hold whole",
        format_length(*step),
        format_length(*depth)
    )]
    UnevenLands {
        /// Largest difference of two neighbouring lands, m.
        step: f64,
        /// Typical depth, m.
        depth: f64,
    },
    /// A stated zone does not lie on the trace.
    #[error(
        "the zone {}..{} of `{option}` does not lie on the trace, which runs from {} to {}",
        format_length(*from),
        format_length(*to),
        format_length(*start),
        format_length(*end)
    )]
    ZoneOutside {
        /// The option.
        option: &'static str,
        /// Where the zone begins, m.
        from: f64,
        /// Where it ends, m.
        to: f64,
        /// Where the trace begins, m.
        start: f64,
        /// Where it ends, m.
        end: f64,
    },
    /// A stated zone has too few samples.
    #[error(
        "the zone {}..{} of `{option}` has {samples} sample(s) with a height; {FEWEST_IN_ZONE} are needed",
        format_length(*from),
        format_length(*to)
    )]
    ZoneEmpty {
        /// The option.
        option: &'static str,
        /// Where the zone begins, m.
        from: f64,
        /// Where it ends, m.
        to: f64,
        /// Samples in it.
        samples: usize,
    },
    /// An option names no zone at all.
    #[error("`{option}` names no zone")]
    NoZone {
        /// The option.
        option: &'static str,
    },
    /// A shrinkage that is out of range.
    #[error("`{option}` is {}; it lies within -50 % to 50 %", format_percent(*share, 4))]
    Shrinkage {
        /// The option.
        option: &'static str,
        /// The share.
        share: f64,
    },
    /// A polynomial of a degree that is not offered.
    #[error("the degree {degree} of `--bow` is not one of 1 to {MAX_BOW}")]
    Bow {
        /// The degree.
        degree: u8,
    },
    /// A bow without a line to bend.
    #[error("`--bow` needs one reference line, and `--level` asks for none")]
    BowWithoutLine,
    /// The polynomial is not fixed by the zones.
    #[error("{samples} samples in {zones} zone(s) do not fix a polynomial of degree {degree}")]
    BowUndetermined {
        /// The degree.
        degree: u8,
        /// Zones.
        zones: usize,
        /// Samples in them.
        samples: usize,
    },
    /// A length that must be positive.
    #[error("`{option}` is {}; it must be above zero", format_length(*length))]
    NotALength {
        /// The option.
        option: &'static str,
        /// The length, m.
        length: f64,
    },
    /// A cut-off that the trace cannot carry.
    #[error(
        "the cut-off {} lies outside {} (three samples) to {} (half the trace)",
        format_length(*cutoff),
        format_length(*shortest),
        format_length(*longest)
    )]
    Cutoff {
        /// The cut-off, m.
        cutoff: f64,
        /// Shortest that makes sense, m.
        shortest: f64,
        /// Longest that makes sense, m.
        longest: f64,
    },
    /// A repeat that does not lie on the first trace.
    #[error(
        "repeat {number} does not fit the first trace: their heights correlate by {} at best",
        format_percent(*correlation, 3)
    )]
    RepeatDiffers {
        /// Its number among the repeats, from 1.
        number: usize,
        /// Best correlation coefficient.
        correlation: f64,
    },
    /// Traces that are said to be repeats scatter like different ones.
    #[error(
        "the traces do not repeat each other: one reading scatters by {}, and the channel is {} deep",
        format_length(*scatter),
        format_length(*depth)
    )]
    RepeatsScatter {
        /// Robust standard deviation of one reading, m.
        scatter: f64,
        /// Depth of the channel in their mean, m.
        depth: f64,
    },
    /// Something is wrong with a repeat.
    #[error("repeat {number}: {source}")]
    Repeat {
        /// Its number among the repeats, from 1.
        number: usize,
        /// What is wrong with it.
        source: Box<TraceProblem>,
    },
}

/// A trace without relief, in words.
fn straight_words(rise: f64, length: f64) -> String {
    if rise.abs() <= NO_RELIEF {
        return "all heights of the trace are the same: it holds no channel".to_owned();
    }
    let way = if rise > 0.0 { "rises" } else { "falls" };
    format!(
        "the trace is one straight line that {way} by {} over {}, and nothing departs from it by more than \
         the rounding of the heights: it holds no channel",
        format_length(rise.abs()),
        format_length(length)
    )
}

impl TraceProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::Repeat { source, .. } => source.hint(),
            other => other.fixed_hint().to_owned(),
        }
    }

    /// Hints without numbers.
    fn fixed_hint(&self) -> &'static str {
        match self {
            Self::Lengths { .. } | Self::Order { .. } => {
                "give one height for each position, positions increasing"
            }
            Self::TooFar { .. } => "check the units of the trace",
            Self::TooFewSamples { .. } | Self::Repeat { .. } => {
                "export the whole trace from the instrument, not every tenth point"
            }
            Self::NoChannel { .. } => {
                "check that the trace crosses the channel; a channel this shallow is found when its \
                 lands are stated: --land-zones 0um..50um,200um..250um"
            }
            Self::Straight { .. } => {
                "check that the trace, or the cut through the map, crosses the channel; of a table, --z-column \
                 says which column holds the heights"
            }
            Self::NoGroove { .. } => {
                "if the ridges are the channels (mould master, cast): --invert; else trace from land to \
                 land, or state the lands: --land-zones 0um..50um,200um..250um"
            }
            Self::NoLand { .. } | Self::RoundLands { .. } => {
                "state the lands: --land-zones 0um..50um,200um..250um; or trace farther beyond the channel"
            }
            Self::UnevenLands { .. } => {
                "measure from land to land across the whole channel, or state its lands: --land-zones \
                 0um..50um,200um..250um; if the lands found are right, say so with --level local"
            }
            Self::ZoneOutside { .. } | Self::ZoneEmpty { .. } | Self::NoZone { .. } => {
                "give zones with a unit, from..to, in positions of the file: 0um..50um,200um..250um"
            }
            Self::Shrinkage { .. } => {
                "--shrink-x 1.5% makes the section 1.5 % smaller than what was measured (part from its \
                 master); a negative share makes it larger (channel from its shrunk cast)"
            }
            Self::Bow { .. } => "--bow 2 takes a parabola off, --bow 1 a straight line",
            Self::BowWithoutLine => "leave --bow out, or use --level lands",
            Self::BowUndetermined { .. } => {
                "lower --bow, or state more or longer zones: --level-on"
            }
            Self::NotALength { .. } => "give a length with its unit, such as 0.2um",
            Self::Cutoff { .. } => "choose a cut-off between the two, or leave --cutoff out",
            Self::RepeatDiffers { .. } | Self::RepeatsScatter { .. } => {
                "give repeats of the same line only, in either direction; evaluate others as traces of \
                 their own"
            }
        }
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        match self {
            Self::NoGroove { .. }
            | Self::NoLand { .. }
            | Self::RoundLands { .. }
            | Self::UnevenLands { .. }
            | Self::TooFar { .. } => true,
            Self::Repeat { source, .. } => source.is_ambiguous(),
            _ => false,
        }
    }
}
