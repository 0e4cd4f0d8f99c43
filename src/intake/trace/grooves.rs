//! Where the grooves of a trace are, and where their edges.
//!
//! A groove lies between two lands. Between neighbouring lands, samples deeper than a tenth of the deepest
//! place of that stretch (and than the noise) below the line from land to land make a dip; two dips are two
//! grooves when at least [`FEWEST_SAMPLES`] samples between them come back up. A dip counts when it is
//! deeper than [`NOISES`] standard deviations of the lands about their own levels and than
//! [`SHALLOWEST`] of the deepest one. Dips before the first and after the last land are counted, so that numbers
//! do not change with the length of the trace, but have no second edge.
//!
//! The level of a land is the median of its samples within a quarter of the stretch's width from it. An edge
//! is where the profile, followed outwards from the dip, first comes up to that level, interpolated between
//! samples: what stands above the level beyond (an overshoot of the instrument) is outside. Where it stops
//! rising below the level (by [`LEVEL_OFF`] over [`LOOK_AHEAD`] of the depth; a land that drifts), the edge
//! is there, and the wall is drawn up to the level from the next sample.

use std::ops::Range;

use super::groove_problem::GrooveProblem;
use super::profile::Zone;
use crate::intake::order_statistics::{median, scatter_about};
use crate::units::format_length;

/// Fewest samples below the land for a groove, and of a stretch that parts two grooves.
pub(super) const FEWEST_SAMPLES: usize = 3;
/// Standard deviations of the lands that a groove is at least deep.
const NOISES: f64 = 5.0;
/// Fraction of the deepest place that a groove is at least deep.
const SHALLOWEST: f64 = 0.05;
/// Fraction of the deepest place of its stretch at which a dip begins.
const DIP: f64 = 0.1;
/// Fraction of the depth at which a dip begins to which a profile must come back up between two dips:
/// noise on a wall would part them otherwise.
const COMES_BACK: f64 = 0.5;
/// A groove is at least this deep, m: an atom.
const ATOM: f64 = 1e-10;
/// Area above the lands over area below them from which a trace shows ridges.
const RIDGES: f64 = 3.0;
/// Slope below which a profile no longer rises to its land, rad,
const LEVEL_OFF: f64 = std::f64::consts::PI / 180.0;
/// over this fraction of the depth and at least [`LOOK_AHEAD_SAMPLES`].
const LOOK_AHEAD: f64 = 0.1;
const LOOK_AHEAD_SAMPLES: usize = 4;
/// Part of a stretch's width over which the level of a land is taken.
const LEVEL_WIDTH: f64 = 0.25;
/// Fewest samples of a land for its level, where it has them.
const LEVEL_SAMPLES: usize = 16;

/// Heights along a line, with a word for messages.
#[derive(Debug, Clone, Copy)]
pub(super) struct Heights<'a> {
    pub(super) whose: &'static str,
    pub(super) x: &'a [f64],
    pub(super) z: &'a [f64],
}

/// An edge of a groove.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Edge {
    /// Where the profile comes up to the land, m.
    pub(super) x: f64,
    /// Level of the land, m.
    pub(super) z: f64,
}

/// A groove with both edges.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Edges {
    pub(super) left: Edge,
    pub(super) right: Edge,
    /// Samples between the edges, those on an edge left out.
    pub(super) inside: Range<usize>,
    /// Samples of the two lands that their levels come from.
    pub(super) left_land: Range<usize>,
    pub(super) right_land: Range<usize>,
}

/// A groove of a trace.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Groove {
    /// From 1 along the trace.
    pub(super) number: usize,
    /// Its samples below the land by more than a tenth, m.
    pub(super) zone: Zone,
    /// Depth of its deepest sample below the line from land to land, m.
    pub(super) depth: f64,
    /// Its edges, or why it cannot be closed.
    pub(super) edges: Result<Edges, String>,
}

/// A stretch between lands, or between a land and an end of the trace.
struct Stretch {
    samples: Range<usize>,
    left: Option<Range<usize>>,
    right: Option<Range<usize>>,
    /// Depth below the line from land to land of each sample, m.
    depth: Vec<f64>,
}

/// The grooves of a trace that passed [`check`], in order.
///
/// # Errors
/// [`GrooveProblem`] without two lands, without grooves, or with ridges.
pub(super) fn find(heights: Heights<'_>, lands: &[Zone]) -> Result<Vec<Groove>, GrooveProblem> {
    let lands = land_samples(heights.x, lands);
    if lands.len() < 2 {
        return Err(GrooveProblem::NoLands {
            whose: heights.whose,
            lands: lands.len(),
        });
    }
    let stretches = stretches(heights, &lands);
    let depths = || stretches.iter().flat_map(|s| s.depth.iter().copied());
    let deepest = depths().fold(0.0, f64::max);
    let highest = depths().fold(0.0, |high: f64, d| high.max(-d));
    let needed = (NOISES * scatter(heights.z, &lands))
        .max(SHALLOWEST * deepest)
        .max(ATOM);
    let between = stretches
        .iter()
        .filter(|s| s.left.is_some() && s.right.is_some());
    let (above, below) = areas(heights.x, between);
    if highest > needed && above > RIDGES * below {
        return Err(GrooveProblem::Ridges {
            whose: heights.whose,
            height: highest,
            depth: deepest,
        });
    }
    let mut grooves = Vec::new();
    for stretch in &stretches {
        for dip in dips(stretch, needed) {
            grooves.push(groove(heights, stretch, &dip, grooves.len() + 1));
        }
    }
    if grooves.is_empty() {
        return Err(GrooveProblem::NoGroove {
            whose: heights.whose,
            deepest,
            needed,
        });
    }
    Ok(grooves)
}

/// Refuses what is no profile.
///
/// # Errors
/// [`GrooveProblem::Profile`].
pub(super) fn check(heights: Heights<'_>) -> Result<(), GrooveProblem> {
    let (x, z) = (heights.x, heights.z);
    let wrong = |sample: usize| {
        Err(GrooveProblem::Profile {
            whose: heights.whose,
            sample,
        })
    };
    let both = x.iter().zip(z);
    if let Some(index) = both
        .clone()
        .position(|(x, z)| !(x.is_finite() && z.is_finite()))
    {
        return wrong(index + 1);
    }
    if let Some(index) = x.windows(2).position(|pair| pair[0] >= pair[1]) {
        return wrong(index + 2);
    }
    if x.len() != z.len() || x.len() < FEWEST_SAMPLES {
        return wrong(both.count() + 1);
    }
    Ok(())
}

/// Samples of each land, in order, those that share samples joined.
fn land_samples(x: &[f64], zones: &[Zone]) -> Vec<Range<usize>> {
    let range = |zone: &Zone| {
        let from = x.partition_point(|&p| p < zone.from);
        let to = x.partition_point(|&p| p <= zone.to);
        from..to
    };
    let mut lands: Vec<Range<usize>> = zones.iter().map(range).filter(|r| !r.is_empty()).collect();
    lands.sort_by_key(|r| (r.start, r.end));
    let mut joined: Vec<Range<usize>> = Vec::new();
    for land in lands {
        match joined.last_mut() {
            Some(last) if land.start < last.end => last.end = last.end.max(land.end),
            _ => joined.push(land),
        }
    }
    joined
}

/// Level of some samples, m.
pub(super) fn level(z: &[f64], samples: Range<usize>) -> f64 {
    median(&mut z.get(samples).unwrap_or_default().to_vec())
}

/// Standard deviation of the lands about their own levels, from the median distance.
fn scatter(z: &[f64], lands: &[Range<usize>]) -> f64 {
    let mut distances = Vec::new();
    for land in lands {
        let middle = level(z, land.clone());
        let land = z.get(land.clone()).unwrap_or_default();
        distances.extend(land.iter().map(|h| h - middle));
    }
    scatter_about(&mut distances, 0.0)
}

/// The end of a land next to a stretch: within a width of it, and not fewer than [`LEVEL_SAMPLES`].
fn end_of(x: &[f64], land: &Range<usize>, width: f64, is_left: bool) -> Range<usize> {
    if is_left {
        let near = x.partition_point(|&p| p < x[land.end - 1] - width);
        land.start
            .max(near.min(land.end.saturating_sub(LEVEL_SAMPLES)))..land.end
    } else {
        let near = x.partition_point(|&p| p <= x[land.start] + width);
        land.start..land.end.min(near.max(land.start + LEVEL_SAMPLES))
    }
}

fn stretches(heights: Heights<'_>, lands: &[Range<usize>]) -> Vec<Stretch> {
    let (x, z) = (heights.x, heights.z);
    let mut found = Vec::new();
    for index in 0..=lands.len() {
        let left = index.checked_sub(1).map(|i| &lands[i]);
        let right = lands.get(index);
        let samples = left.map_or(0, |l| l.end)..right.map_or(x.len(), |r| r.start);
        if samples.is_empty() {
            continue;
        }
        let width = LEVEL_WIDTH * (x[samples.end - 1] - x[samples.start]);
        let left = left.map(|land| end_of(x, land, width, true));
        let right = right.map(|land| end_of(x, land, width, false));
        let place = |land: &Option<Range<usize>>, at: fn(&Range<usize>) -> usize| {
            land.as_ref().map(|l| (x[at(l)], level(z, l.clone())))
        };
        let ends = (place(&left, |l| l.end - 1), place(&right, |r| r.start));
        let line = |p: f64| match ends {
            (Some(a), Some(b)) => a.1 + (p - a.0) / (b.0 - a.0) * (b.1 - a.1),
            (Some(one), None) | (None, Some(one)) => one.1,
            (None, None) => 0.0,
        };
        found.push(Stretch {
            depth: samples.clone().map(|i| line(x[i]) - z[i]).collect(),
            samples,
            left,
            right,
        });
    }
    found
}

/// Area above and below the lands, as sums over samples times their spacing, m^2.
fn areas<'a>(x: &[f64], stretches: impl Iterator<Item = &'a Stretch>) -> (f64, f64) {
    let (mut above, mut below) = (0.0, 0.0);
    for stretch in stretches {
        for (index, depth) in stretch.samples.clone().zip(&stretch.depth) {
            let next = x.get(index + 1).unwrap_or(&x[index]);
            let before = index.checked_sub(1).map_or(x[index], |i| x[i]);
            let area = 0.5 * (next - before) * depth;
            above -= area.min(0.0);
            below += area.max(0.0);
        }
    }
    (above, below)
}

/// The dips of a stretch that are deep enough, as ranges in it.
fn dips(stretch: &Stretch, needed: f64) -> Vec<Range<usize>> {
    let deepest = stretch.depth.iter().copied().fold(0.0, f64::max);
    let begins = (DIP * deepest).max(0.5 * needed);
    let mut dips: Vec<Range<usize>> = Vec::new();
    // Samples since the last dip that came back up.
    let mut up = 0;
    for (index, &depth) in stretch.depth.iter().enumerate() {
        if depth <= begins {
            up += usize::from(depth <= COMES_BACK * begins);
            continue;
        }
        match dips.last_mut() {
            Some(last) if up < FEWEST_SAMPLES => last.end = index + 1,
            _ => dips.push(index..index + 1),
        }
        up = 0;
    }
    let depth_of = |dip: &Range<usize>| {
        stretch.depth[dip.clone()]
            .iter()
            .copied()
            .fold(0.0, f64::max)
    };
    dips.retain(|dip| depth_of(dip) >= needed);
    dips
}

/// One groove from its dip.
fn groove(heights: Heights<'_>, stretch: &Stretch, dip: &Range<usize>, number: usize) -> Groove {
    let x = heights.x;
    let samples = stretch.samples.start + dip.start..stretch.samples.start + dip.end;
    let zone = Zone {
        from: x[samples.start],
        to: x[samples.end - 1],
    };
    let depth = stretch.depth[dip.clone()]
        .iter()
        .copied()
        .fold(0.0, f64::max);
    Groove {
        number,
        zone,
        depth,
        edges: edges(heights, stretch, &samples).map_err(|why| {
            format!(
                "groove {number} from {} to {} {why}",
                format_length(zone.from),
                format_length(zone.to)
            )
        }),
    }
}

/// The lands of a dip: the stretch's, or the samples that part it from the next dip.
fn edges(heights: Heights<'_>, stretch: &Stretch, dip: &Range<usize>) -> Result<Edges, String> {
    let (x, z) = (heights.x, heights.z);
    let cut_off =
        |side: &str| format!("is cut off by the {side} of the trace, or has no land there");
    let deepest = stretch.depth.iter().copied().fold(0.0, f64::max);
    let is_up = |&index: &usize| stretch.depth[index - stretch.samples.start] <= DIP * deepest;
    // The samples between this dip and the next that come up make a land where there are enough of them.
    let before = (stretch.samples.start..dip.start).rev();
    let first_up = before.take_while(is_up).last().unwrap_or(dip.start);
    let last_up = (dip.end..stretch.samples.end).take_while(is_up).last();
    let end_up = last_up.map_or(dip.end, |last| last + 1);
    let left_land = if first_up == stretch.samples.start || first_up == dip.start {
        stretch.left.clone().ok_or_else(|| cut_off("start"))?
    } else {
        first_up..dip.start
    };
    let right_land = if end_up == stretch.samples.end || end_up == dip.end {
        stretch.right.clone().ok_or_else(|| cut_off("end"))?
    } else {
        dip.end..end_up
    };
    let (left_level, right_level) = (level(z, left_land.clone()), level(z, right_land.clone()));
    let depth = deepest_of(stretch, dip);
    let walks = (
        Walk {
            x,
            z,
            level: left_level,
            ahead: LOOK_AHEAD * depth,
            step: -1,
            last: left_land.start,
        },
        Walk {
            x,
            z,
            level: right_level,
            ahead: LOOK_AHEAD * depth,
            step: 1,
            last: right_land.end - 1,
        },
    );
    let (left, left_out) = walks.0.edge(dip.start)?;
    let (right, right_out) = walks.1.edge(dip.end - 1)?;
    let inside = left_out + 1..right_out;
    if inside.len() < FEWEST_SAMPLES {
        return Err(format!(
            "has {} samples below its lands, fewer than {FEWEST_SAMPLES}",
            inside.len()
        ));
    }
    Ok(Edges {
        left,
        right,
        inside,
        left_land,
        right_land,
    })
}

fn deepest_of(stretch: &Stretch, samples: &Range<usize>) -> f64 {
    let begin = stretch.samples.start;
    let depths = stretch
        .depth
        .get(samples.start - begin..samples.end - begin);
    depths
        .unwrap_or_default()
        .iter()
        .copied()
        .fold(0.0, f64::max)
}

/// A way along the profile, outwards from a dip.
struct Walk<'a> {
    x: &'a [f64],
    z: &'a [f64],
    /// Level of the land, m.
    level: f64,
    /// How far is looked ahead, m.
    ahead: f64,
    /// -1 to the left, 1 to the right.
    step: isize,
    /// Last sample of the land.
    last: usize,
}

impl Walk<'_> {
    /// The edge on the way from a sample of the dip, and the sample on or just outside it.
    fn edge(&self, from: usize) -> Result<(Edge, usize), String> {
        let mut at = from;
        while at != self.last {
            let next = at.wrapping_add_signed(self.step);
            if self.z[next] >= self.level {
                let along = (self.level - self.z[at]) / (self.z[next] - self.z[at]);
                let x = self.x[at] + along * (self.x[next] - self.x[at]);
                return Ok((Edge { x, z: self.level }, next));
            }
            at = next;
            if at != from && !self.rises(at) {
                let edge = Edge {
                    x: self.x[at],
                    z: self.level,
                };
                return Ok((edge, at));
            }
        }
        Err("does not come up to its land".to_owned())
    }

    /// Whether the profile goes on rising beyond a sample.
    fn rises(&self, at: usize) -> bool {
        let x = self.x;
        let far = if self.step > 0 {
            let far = x.partition_point(|&p| p < x[at] + self.ahead);
            far.max(at + LOOK_AHEAD_SAMPLES).min(self.last)
        } else {
            let far = x
                .partition_point(|&p| p <= x[at] - self.ahead)
                .saturating_sub(1);
            far.min(at.saturating_sub(LOOK_AHEAD_SAMPLES))
                .max(self.last)
        };
        self.z[far] - self.z[at] >= LEVEL_OFF.tan() * (x[far] - x[at]).abs()
    }
}
