//! One trace on its way to sections: its surface, its grooves and the walls of each.

use std::borrow::Cow;

use super::corrected::CorrectedTrace;
use super::flanks::{self, ANGLE_MARGIN, Flank, Steep};
use super::groove_problem::GrooveProblem;
use super::grooves::{self, Edges, Groove, Heights};
use super::profile::Profile;
use super::section_options::{SectionOptions, THINNING, Tip};
use super::tip;
use super::trench_numbers::TrenchNumbers;
use super::wall_curves::{Line, Stated, WallCurves};

/// Flanks from this angle on may show a tip that is not stated, rad: cones of styli are 60 to 90 degrees wide, so
/// their flanks 60 to 45 degrees steep (common practice, no source),
const SUSPECT_FROM: f64 = 45.0 * std::f64::consts::PI / 180.0;
/// up to this angle, a cone of 20 degrees,
const SUSPECT_TO: f64 = 80.0 * std::f64::consts::PI / 180.0;
/// when they are straight within this fraction of the depth.
const STRAIGHT: f64 = 0.02;
/// The two may differ by this much, rad: the two sides of real tips do (common practice, no source).
const ALIKE: f64 = 10.0 * std::f64::consts::PI / 180.0;
/// A flank that may show a tip ends where it is flatter than this, rad.
const FLAT: f64 = 5.0 * std::f64::consts::PI / 180.0;

/// A trace with its surface and its grooves.
#[derive(Debug)]
pub(super) struct Half<'a> {
    whose: &'static str,
    x: &'a [f64],
    /// As read, or with the tip taken back.
    z: Cow<'a, [f64]>,
    tip_shape: Vec<bool>,
    tip: Option<Tip>,
    /// Factors from measured to wanted lengths along the trace and heights.
    factors: [f64; 2],
    pub(super) is_inverted: bool,
    pub(super) grooves: Vec<Groove>,
    /// Largest distance between the heights as read and with the tip taken back, m.
    pub(super) moved: f64,
}

/// Why flanks count as tip shape.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Grounds {
    /// The stated tip cannot show steeper ones.
    Stated,
    /// No tip is stated, and both flanks are straight and alike.
    Suspected,
}

/// The walls of a groove.
#[derive(Debug)]
pub(super) struct Walls {
    pub(super) edges: Edges,
    pub(super) curves: WallCurves,
    pub(super) flanks: Vec<Flank>,
    pub(super) grounds: Grounds,
    /// Tolerance of thinning, m.
    pub(super) tolerance: f64,
}

impl<'a> Half<'a> {
    /// Takes the tip back and finds the grooves.
    ///
    /// # Errors
    /// [`GrooveProblem`] for what is no profile, and without grooves between lands.
    pub(super) fn new(
        whose: &'static str,
        trace: &'a CorrectedTrace,
        tip: Option<Tip>,
    ) -> Result<Self, GrooveProblem> {
        let profile = &trace.profile;
        grooves::check(Heights {
            whose,
            x: &profile.x,
            z: &profile.z,
        })?;
        // A share of all there is, or more, is refused where it is typed in.
        let factor = |share: f64| if share < 1.0 { 1.0 - share } else { 1.0 };
        let factors = trace.shrinkage.map(factor);
        let (z, tip_shape) = match tip {
            Some(tip) => {
                let up = if trace.inverted {
                    -factors[1]
                } else {
                    factors[1]
                };
                let measured = Profile {
                    x: profile.x.iter().map(|x| x / factors[0]).collect(),
                    z: profile.z.iter().map(|z| z / up).collect(),
                };
                let mut back = tip::take_back(&measured, tip);
                for height in &mut back.height {
                    *height *= up;
                }
                (Cow::Owned(back.height), back.is_tip_shape)
            }
            None => (Cow::Borrowed(profile.z.as_slice()), Vec::new()),
        };
        let moved = profile
            .z
            .iter()
            .zip(z.iter())
            .fold(0.0, |m: f64, (a, b)| m.max((a - b).abs()));
        let mut half = Self {
            whose,
            x: &profile.x,
            z,
            tip_shape,
            tip,
            factors,
            is_inverted: trace.inverted,
            grooves: Vec::new(),
            moved,
        };
        half.grooves = grooves::find(half.heights(), &trace.lands)?;
        Ok(half)
    }

    pub(super) fn heights(&self) -> Heights<'_> {
        Heights {
            whose: self.whose,
            x: self.x,
            z: &self.z,
        }
    }

    /// The walls of a groove with edges.
    pub(super) fn walls(&self, groove: &Groove, edges: &Edges, options: &SectionOptions) -> Walls {
        let heights = self.heights();
        let stated = Stated {
            walls: options.walls,
            is_inverted: self.is_inverted,
            tolerance: options.simplify.unwrap_or(THINNING * groove.depth),
        };
        let (steep, grounds) = match self.tip {
            Some(tip) => {
                let slope = tip.steepest_flank().tan() * self.factors[1] / self.factors[0];
                let steepest = slope.atan();
                let steep = Steep {
                    begin: (steepest - ANGLE_MARGIN).max(0.5 * steepest),
                    go_on: 0.5 * steepest,
                    is_inverted: self.is_inverted,
                };
                (Some(steep), Grounds::Stated)
            }
            None => (suspect(heights, edges, stated), Grounds::Suspected),
        };
        let samples = edges.left_land.start..edges.right_land.end;
        let mut found = steep.map_or(Vec::new(), |steep| {
            flanks::find(heights, &self.tip_shape, steep, samples, groove.depth)
        });
        found.retain(|f| self.x[f.to] > edges.left.x && self.x[f.from] < edges.right.x);
        Walls {
            curves: WallCurves::new(heights, edges, &found, stated),
            edges: edges.clone(),
            flanks: found,
            grounds,
            tolerance: stated.tolerance,
        }
    }
}

/// What counts as steep where both walls are straight and alike, as a tip would show them.
fn suspect(heights: Heights<'_>, edges: &Edges, stated: Stated) -> Option<Steep> {
    let read = WallCurves::new(heights, edges, &[], stated).as_read;
    let numbers = TrenchNumbers::new(&read, Line::through(edges))?;
    let walls = [numbers.left_wall, numbers.right_wall];
    let suspicious = walls.iter().all(|wall| {
        (SUSPECT_FROM..SUSPECT_TO).contains(&wall.angle) && wall.rms <= STRAIGHT * numbers.depth
    });
    let [left, right] = walls.map(|wall| wall.angle);
    (suspicious && (left - right).abs() <= ALIKE).then(|| Steep {
        begin: left.min(right) - ANGLE_MARGIN,
        go_on: FLAT,
        is_inverted: stated.is_inverted,
    })
}
