//! What can be wrong with a trace when its channels become sections.

use crate::units::{format_length, format_significant};

/// What is wrong with a trace when its channels become sections.
///
/// Positions and lengths are metres in the fields.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum GrooveProblem {
    /// A stated value means nothing.
    #[error("{option}: {} is not possible: {allowed}", option_value(option, *value))]
    Option {
        /// Which option.
        option: &'static str,
        /// Its value: lengths in metres, angles in degrees.
        value: f64,
        /// What it may be.
        allowed: &'static str,
    },
    /// The profile is not one: fewer than three samples, lists of different length, a position or height
    /// that is not finite, or positions that do not grow.
    #[error("{whose}: sample {sample} has no finite height, or its position does not grow")]
    Profile {
        /// `trace` or `lid trace`.
        whose: &'static str,
        /// Which sample, from 1; the number of samples plus 1 where there are too few.
        sample: usize,
    },
    /// There are no two lands to look between.
    #[error("{whose}: {} found, and a groove lies between two of them", lands_found(*lands))]
    NoLands {
        /// `trace` or `lid trace`.
        whose: &'static str,
        /// Lands with samples in them.
        lands: usize,
    },
    /// Nothing between the lands lies below them far enough.
    #[error(
        "{whose}: no groove between the lands: the lowest place lies {} below them, and {} are needed to \
         tell it from noise",
        format_length(*deepest), format_length(*needed)
    )]
    NoGroove {
        /// `trace` or `lid trace`.
        whose: &'static str,
        /// Depth of the lowest place, m.
        deepest: f64,
        /// What would count, m.
        needed: f64,
    },
    /// The trace shows ridges.
    #[error(
        "{whose}: ridges, not grooves: up to {} above the lands, {} below",
        format_length(*height), format_length(*depth)
    )]
    Ridges {
        /// `trace` or `lid trace`.
        whose: &'static str,
        /// Height of the highest place over the lands, m.
        height: f64,
        /// Depth of the lowest place below them, m.
        depth: f64,
    },
    /// There are grooves, but none of them can be closed.
    #[error("no groove can be closed: {first}")]
    NoneUsable {
        /// Why the first one cannot.
        first: String,
    },
    /// The groove asked for cannot be closed.
    #[error("{why}")]
    NotUsable {
        /// Why.
        why: String,
    },
    /// There is no groove of that number.
    #[error("--groove: there is no groove {number}, the trace has {count}")]
    GrooveNumber {
        /// The number asked for.
        number: usize,
        /// How many there are.
        count: usize,
    },
    /// The lid leaves nothing of the groove.
    #[error("groove {groove}: the lid leaves no section: it lies on or below the floor everywhere")]
    NoArea {
        /// Which groove.
        groove: usize,
    },
    /// A lid set lower touches the floor.
    #[error("groove {groove}: a lid {} lower cuts the floor and leaves {lumens} parts", format_length(*lower))]
    LidCuts {
        /// Which groove.
        groove: usize,
        /// How much lower, m.
        lower: f64,
        /// How many parts are left.
        lumens: usize,
    },
    /// A lid hangs or bulges by more than half its width.
    #[error(
        "groove {groove}: --lid-sag: {} is more than half the width of {}",
        format_length(*sag), format_length(*width)
    )]
    SagTooLarge {
        /// Which groove.
        groove: usize,
        /// The sag, m.
        sag: f64,
        /// From edge to edge, m.
        width: f64,
    },
    /// The other half has another number of grooves.
    #[error(
        "the lid trace has {lid} grooves and the trace {count}: which belong together is not known"
    )]
    LidGrooves {
        /// Grooves of the lid trace.
        lid: usize,
        /// Grooves of the trace.
        count: usize,
    },
    /// The polygon is not a valid outline, or the smallest, stated and largest section are not nested.
    #[error("groove {groove}: no valid section: {problem}")]
    Polygon {
        /// Which groove.
        groove: usize,
        /// What is wrong and where.
        problem: String,
    },
}

/// How many lands there are, in words.
fn lands_found(lands: usize) -> String {
    match lands {
        0 => "no land was".to_owned(),
        1 => "only one land was".to_owned(),
        n => format!("{n} lands were"),
    }
}

/// The value of an option with its unit.
fn option_value(option: &str, value: f64) -> String {
    match option {
        "--tip-angle" | "--walls" => format!("{} deg", format_significant(value, 4)),
        _ => format_length(value),
    }
}

impl GrooveProblem {
    /// What the user can do, in one sentence.
    pub fn hint(&self) -> String {
        match self {
            Self::Option { option, .. } => format!("correct {option} or leave it out"),
            Self::Profile { .. } => {
                "give at least three samples with finite heights and growing positions".to_owned()
            }
            Self::NoLands { .. } => {
                "measure some way over the level surface on both sides of the channel, or state where \
                 the lands are with --land-zones"
                    .to_owned()
            }
            Self::NoGroove { .. } => {
                "check that the trace crosses the channel, and where the lands are; for a trace of a \
                 mould or a master give --invert"
                    .to_owned()
            }
            Self::Ridges { .. } => {
                "give --invert if this is the mould or the master of the channel; otherwise check where \
                 the lands are"
                    .to_owned()
            }
            Self::NoneUsable { .. } | Self::NotUsable { .. } => {
                "measure past both edges, with more samples across the groove, or choose another groove \
                 with --groove"
                    .to_owned()
            }
            Self::GrooveNumber { count, .. } => match count {
                1 => "give --groove 1 or leave it out".to_owned(),
                count => format!("give a number from 1 to {count}"),
            },
            Self::NoArea { .. } => "set the lid higher: check --lid, --lid-gap and --lid-sag".to_owned(),
            Self::LidCuts { .. } => "make --lid-gap smaller in size, or leave it out".to_owned(),
            Self::SagTooLarge { .. } => {
                "give the distance between the middle of the lid and the line through the edges"
                    .to_owned()
            }
            Self::LidGrooves { .. } => {
                "give a lid trace of one groove, or one with as many grooves as the trace".to_owned()
            }
            Self::Polygon { groove, .. } => format!(
                "look at the trace there; leave the groove out by choosing others than {groove} with \
                 --groove"
            ),
        }
    }

    /// Whether a unit, a scale or a choice is missing or in doubt, rather than the file being wrong.
    pub fn is_ambiguous(&self) -> bool {
        matches!(
            self,
            Self::NoLands { .. } | Self::Ridges { .. } | Self::LidGrooves { .. }
        )
    }
}
