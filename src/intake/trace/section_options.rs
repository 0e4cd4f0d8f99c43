//! What is stated about tip, walls and lid when a trace becomes sections.

use super::corrected::CorrectedTrace;
use super::groove_problem::GrooveProblem;

/// A stylus tip: a ball that continues as a cone.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Tip {
    /// Radius of the ball, m, zero or more.
    pub radius: f64,
    /// Full angle of the cone, rad, above 0 and below pi.
    pub cone_angle: f64,
}

/// Where the lid lies.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq)]
pub enum LidChoice {
    /// On the line through both edges of the groove.
    #[default]
    Both,
    /// Level, at the height of the left land.
    Left,
    /// Level, at the height of the right land.
    Right,
    /// On the line of least squares through both lands.
    Fit,
}

impl LidChoice {
    /// All choices.
    pub const ALL: [Self; 4] = [Self::Both, Self::Left, Self::Right, Self::Fit];

    /// Its name on the command line.
    pub fn as_str(self) -> &'static str {
        match self {
            Self::Both => "both",
            Self::Left => "left",
            Self::Right => "right",
            Self::Fit => "fit",
        }
    }
}

/// What is stated about tip, walls and lid.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct SectionOptions {
    /// The tip that read the trace (`--tip-radius`, `--tip-angle`); `None` where it is not known.
    pub tip: Option<Tip>,
    /// Angle of the walls against the level floor, rad (`--walls`), for flanks that show the tip.
    pub walls: Option<f64>,
    /// Where the lid lies (`--lid`).
    pub lid: LidChoice,
    /// Height of the lid above that, m (`--lid-gap`); negative: below. The gap ends at the edges of the
    /// groove.
    pub lid_gap: f64,
    /// How far the middle of the lid hangs down, m (`--lid-sag`); negative: bulges up. An arc of a circle
    /// from edge to edge.
    pub lid_sag: f64,
    /// The other half of a channel made of two halves face to face, in place of a flat lid.
    pub lid_trace: Option<Box<CorrectedTrace>>,
    /// How far the other half lies to the right of the middle of this one, m (`--lid-offset`).
    pub lid_offset: f64,
    /// Only this groove, from 1 (`--groove`); all when `None`.
    pub groove: Option<usize>,
    /// Largest vertical distance of left-out samples from the polygon, m; [`THINNING`] of the depth when
    /// `None`, zero to leave out only samples on a straight line.
    pub simplify: Option<f64>,
}

/// Largest vertical distance of left-out samples from the polygon, as a fraction of the depth, where
/// nothing is stated: moves K by at most about three times as much.
pub const THINNING: f64 = 1e-5;

/// Largest `--simplify`, as a fraction of the depth of a groove: beyond that it is the tolerance that makes
/// the section.
const SIMPLIFY_LIMIT: f64 = 0.02;

impl SectionOptions {
    /// Refuses a tolerance of the polygon that is not small against a groove.
    pub(super) fn check_simplify(&self, depth: f64) -> Result<(), GrooveProblem> {
        match self.simplify {
            Some(value) if value > SIMPLIFY_LIMIT * depth => Err(GrooveProblem::Option {
                option: "--simplify",
                value,
                allowed: "at most a fiftieth of the depth of the groove",
            }),
            _ => Ok(()),
        }
    }

    /// Refuses values that mean nothing.
    ///
    /// # Errors
    /// The option with such a value.
    pub fn check(&self) -> Result<(), GrooveProblem> {
        let refuse = |option: &'static str, value: f64, allowed: &'static str| {
            Err(GrooveProblem::Option {
                option,
                value,
                allowed,
            })
        };
        if let Some(Tip { radius, cone_angle }) = self.tip {
            if !(radius.is_finite() && radius >= 0.0) {
                return refuse("--tip-radius", radius, "a length of zero or more");
            }
            if !(cone_angle > 0.01 && cone_angle < 3.13) {
                return refuse(
                    "--tip-angle",
                    cone_angle.to_degrees(),
                    "above 0.6 deg and below 179 deg, the full angle of the cone",
                );
            }
        }
        if let Some(angle) = self.walls
            && !(angle > 0.01 && angle <= std::f64::consts::FRAC_PI_2 + 1e-9)
        {
            let allowed = "above 0.6 deg and up to 90 deg, against the level floor";
            return refuse("--walls", angle.to_degrees(), allowed);
        }
        if self.lid_trace.is_some() && self.lid_sag.abs() > 0.0 {
            return refuse(
                "--lid-sag",
                self.lid_sag,
                "zero under the other half of a channel",
            );
        }
        for (option, value) in [
            ("--lid-gap", self.lid_gap),
            ("--lid-sag", self.lid_sag),
            ("--lid-offset", self.lid_offset),
        ] {
            if !value.is_finite() {
                return refuse(option, value, "a length");
            }
        }
        match self.simplify {
            Some(value) if !(value.is_finite() && value >= 0.0) => {
                refuse("--simplify", value, "a length of zero or more")
            }
            _ => Ok(()),
        }
    }
}
