//! Where the grooves of a trace are, and where their edges.
//!
//! A groove lies between two lands. Between neighbouring lands, samples deeper than a tenth of the deepest
//! place of that stretch (and than the noise) below the line from land to land make a dip; two dips are two
//! grooves when at least [`FEWEST_SAMPLES`] samples between them come back up. A dip counts when it is
//! deeper than [`NOISES`] standard deviations of the lands about their own levels and than
//! [`SHALLOWEST`] of the deepest one. Dips before the first and after the last land are counted, so that numbers
//! do not change with the length of the trace, but have no second edge.
//!
//! The level of a land is the median of its samples within one width of the stretch from it. An edge
//! is where the profile, followed outwards from the dip, comes up to that level: what stands above the level
//! beyond (an overshoot of the instrument) is outside. A land that bends or scatters may be reached far
//! from the wall only, so from [`SHOULDER`] of the depth (or the scatter of the land) below it the wall is
//! continued in a straight line.

use std::ops::Range;

use super::groove_problem::GrooveProblem;
use super::profile::Zone;
use crate::units::format_length;

/// Fewest samples below the land for a groove, and of a stretch that parts two grooves.
pub(super) const FEWEST_SAMPLES: usize = 3;
/// Standard deviations of the lands that a groove is at least deep.
const NOISES: f64 = 5.0;
/// Fraction of the deepest place that a groove is at least deep.
const SHALLOWEST: f64 = 0.05;
/// Fraction of the deepest place of its stretch at which a dip begins.
const DIP: f64 = 0.1;
/// Fraction of the depth below a land from which the wall is continued in a straight line.
const SHOULDER: f64 = 0.002;
/// Standard deviations of the land from which it is continued so where it scatters more.
const SHOULDER_NOISES: f64 = 4.0;
/// A groove is at least this deep, m: an atom.
const ATOM: f64 = 1e-10;
/// Area above the lands over area below them from which a trace shows ridges.
const RIDGES: f64 = 3.0;
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

/// The upper median: one of the values.
fn median(values: &mut [f64]) -> f64 {
    let middle = values.len() / 2;
    if values.is_empty() {
        return 0.0;
    }
    *values.select_nth_unstable_by(middle, f64::total_cmp).1
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
        distances.extend(land.iter().map(|h| (h - middle).abs()));
    }
    // A normal distribution has half its values within 0.6745 standard deviations.
    median(&mut distances) / 0.6745
}

/// The end of a land next to a stretch: within one width of the stretch, and not fewer than
/// [`LEVEL_SAMPLES`].
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
        let width = x[samples.end - 1] - x[samples.start];
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
    for (index, &depth) in stretch.depth.iter().enumerate() {
        if depth <= begins {
            continue;
        }
        match dips.last_mut() {
            Some(last) if index - last.end < FEWEST_SAMPLES => last.end = index + 1,
            _ => dips.push(index..index + 1),
        }
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
    let z = heights.z;
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
    let shoulder = |land: &Range<usize>| {
        let noise = SHOULDER_NOISES * scatter(z, std::slice::from_ref(land));
        (SHOULDER * deepest).max(noise).min(0.5 * DIP * deepest)
    };
    let left = Wall {
        heights,
        level: left_level,
        shoulder: shoulder(&left_land),
    };
    let right = Wall {
        heights,
        level: right_level,
        shoulder: shoulder(&right_land),
    };
    let middle = dip.start.midpoint(dip.end);
    let (left, first) = left.edge(
        (left_land.start..dip.start).rev(),
        (dip.start..middle, false),
    )?;
    let (right, last) = right.edge(dip.end..right_land.end, (middle..dip.end, true))?;
    let inside = first..last + 1;
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

/// One side of a dip.
#[derive(Debug, Clone, Copy)]
struct Wall<'a> {
    heights: Heights<'a>,
    /// Level of its land, m.
    level: f64,
    /// Depth below it from which the wall is continued in a straight line, m.
    shoulder: f64,
}

impl Wall<'_> {
    /// The edge, and the last sample inside of it.
    ///
    /// - `walk`: samples outwards from the dip, to the far end of the land
    /// - `within`: samples of the dip on this side, and whether they are walked backwards to go inwards
    fn edge(
        self,
        walk: impl Iterator<Item = usize>,
        (within, backwards): (Range<usize>, bool),
    ) -> Result<(Edge, usize), String> {
        let (x, z, level) = (self.heights.x, self.heights.z, self.level);
        let mut inner = if backwards {
            within.end.saturating_sub(1)
        } else {
            within.start
        };
        let mut passed = None;
        for index in walk {
            if z[index] >= level {
                let up = self.crossing(index, inner, level);
                let at = match passed {
                    // The land is reached before the straight line would reach it.
                    Some((continued, from)) if nearer(from, continued, up) => continued,
                    _ => up,
                };
                let last = passed.map_or(inner, |(_, from)| from.0);
                return Ok((Edge { x: at, z: level }, last));
            }
            if passed.is_none() && z[index] >= level - self.shoulder {
                let near = self.crossing(index, inner, level - self.shoulder);
                let deep = self.from_inside(inner, &within, backwards);
                passed = deep.map(|deep| (2.0 * near - deep, (inner, x[inner])));
            }
            inner = index;
        }
        match passed {
            Some((continued, from)) => Ok((
                Edge {
                    x: continued,
                    z: level,
                },
                from.0,
            )),
            None => Err("does not come up to its land".to_owned()),
        }
    }

    /// Where the profile crosses a height between two neighbouring samples.
    fn crossing(self, out: usize, inner: usize, height: f64) -> f64 {
        let (x, z) = (self.heights.x, self.heights.z);
        let t = (z[out] - height) / (z[out] - z[inner]);
        x[out] + t.clamp(0.0, 1.0) * (x[inner] - x[out])
    }

    /// Where the wall, followed inwards from a sample, first lies two shoulders deep.
    fn from_inside(self, start: usize, within: &Range<usize>, backwards: bool) -> Option<f64> {
        let z = self.heights.z;
        let height = self.level - 2.0 * self.shoulder;
        let mut outer = start;
        if z[outer] <= height {
            let out = if backwards {
                outer + 1
            } else {
                outer.checked_sub(1)?
            };
            return Some(self.crossing(out, outer, height));
        }
        let inwards: Box<dyn Iterator<Item = usize>> = if backwards {
            Box::new((within.start..start).rev())
        } else {
            Box::new(start + 1..within.end)
        };
        for index in inwards {
            if z[index] <= height {
                return Some(self.crossing(outer, index, height));
            }
            outer = index;
        }
        None
    }
}

/// Whether a continued wall ends before the place where the land is reached, seen from a sample inside.
fn nearer(from: (usize, f64), continued: f64, up: f64) -> bool {
    (continued - from.1).abs() < (up - from.1).abs()
}
