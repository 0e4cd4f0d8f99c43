//! The lands of a trace: the level stretches beside and between its channels.
//!
//! Drift is slow and walls are fast. After the typical slope is taken off, the trace is cut into stretches
//! above and below half height by its swings, which needs no assumption on the shape of a channel. In each
//! upper stretch the most frequent height and a robust line through the samples near it give the land; it
//! ends where samples leave that line. What the lands say about drift is taken off and the search repeated.

use super::profile::{Profile, Zone};
use super::robust_line::{Line, robust_line, typical_slope};
use super::swings::{Stretch, stretches, swing_thresholds};
use super::trace_problem::{FEWEST_IN_ZONE, TraceProblem};
use crate::intake::order_statistics::{
    half_sample_mode, median, noise_of_neighbours, quantile, thinned,
};

/// Samples this near to the land, in depths, may belong to it while its line is sought.
const NEAR_LAND: f64 = 0.15;

/// Share of a land left out beside each wall, where edges are rounded or overshoot.
const BESIDE_WALL: f64 = 0.1;

/// A land is level if it is at least this wide in lengths that a wall takes from 25 to 75 % of the depth.
/// Slow waves have crests of 0.4 to 0.5, V-grooves with lands of a sixth of their width 0.67.
const LEVEL_WIDTH: f64 = 0.6;

/// Lands are rounded if their middle half lies this much above their outer quarters, in depths.
const ROUNDED: f64 = 0.04;

/// Lands slope if they are steeper, against each other, than this share of a wall.
const SLOPING: f64 = 0.25;

/// A single hill whose flanks take more than this share of the trace from 25 to 75 % of its height is bow.
const SLOW_WALL: f64 = 0.05;

/// Neighbouring lands lie on one level within this share of the depth, as a median.
const ALTERNATING: f64 = 0.5;

/// The crest of a rounded land: what lies within this share of the depth of its highest sample.
pub(super) const CREST: f64 = 0.02;

/// Walls beside rounded lands take at most this share of the trace from 25 to 75 % of the depth; a wave and
/// a half over the whole trace takes a ninth.
const CREST_WALL: f64 = 0.08;

/// Samples of the thinned copy of a long trace.
const THINNED: usize = 50_000;

/// One land.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Land {
    /// From where samples join its line to where they leave it, m.
    pub(super) flat: Zone,
    /// The same without the parts next to walls, m.
    pub(super) zone: Zone,
    /// Its line, m over the reference of the search.
    line: Line,
}

/// What stands out of a trace.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct Ground {
    /// Lands from left to right.
    pub(super) lands: Vec<Land>,
    /// The channels between them, from land to land, m.
    pub(super) grooves: Vec<Zone>,
    /// Typical depth, m.
    pub(super) depth: f64,
    /// Typical robust scatter of a land about its own line, m.
    pub(super) noise: f64,
    /// Typical width at half height of lands between two channels, m.
    pub(super) ridge_width: Option<f64>,
    /// Typical width of channels at half height, m.
    pub(super) groove_width: f64,
    /// Width of the narrowest land or channel at half height, m.
    pub(super) narrowest: f64,
    /// Whether the trace both starts and ends below.
    pub(super) ends_low: bool,
    /// Why no land is level, where the crests of the shoulders stand for them.
    pub(super) not_level: Option<TraceProblem>,
}

impl Ground {
    /// Depth times total width of lands, m^2.
    fn weight(&self) -> f64 {
        let widths = self.lands.iter().map(|land| land.flat.to - land.flat.from);
        self.depth * widths.sum::<f64>()
    }

    /// Middle and height of each land over the reference of the search.
    fn knots(&self) -> Vec<(f64, f64)> {
        let knot = |land: &Land| {
            let middle = 0.5 * (land.zone.from + land.zone.to);
            (middle, land.line.at(middle))
        };
        self.lands.iter().map(knot).collect()
    }

    /// The lands without the parts next to walls.
    pub(super) fn zones(&self) -> Vec<Zone> {
        self.lands.iter().map(|land| land.zone).collect()
    }
}

/// Finds the lands of a trace without missing points and without spikes.
///
/// Drift is followed on a thinned copy where there is one; the lands themselves are sought in all samples.
pub(super) fn find_lands(good: &Profile) -> Result<Ground, TraceProblem> {
    if let Some(coarse) = thinned_copy(good) {
        let noise = noise_of_neighbours(&good.z);
        let mut level = good.z.clone();
        let found = drift_followed(&coarse).and_then(|(_, knots)| {
            take_off(&good.x, &mut level, &knots);
            survey(&good.x, &level, noise)
        });
        if found.is_ok() {
            return found;
        }
    }
    drift_followed(good).map(|(ground, _)| ground)
}

/// What stands out, in size and number; of long traces in a thinned copy where that shows it.
pub(super) fn find_lands_roughly(good: &Profile) -> Result<Ground, TraceProblem> {
    if let Some(coarse) = thinned_copy(good)
        && let Ok((ground, _)) = drift_followed(&coarse)
    {
        return Ok(ground);
    }
    drift_followed(good).map(|(ground, _)| ground)
}

/// Medians of blocks of a long trace.
fn thinned_copy(good: &Profile) -> Option<Profile> {
    let size = good.x.len().div_ceil(THINNED);
    (size > 1).then(|| Profile {
        x: good
            .x
            .chunks(size)
            .map(|block| block[block.len() / 2])
            .collect(),
        z: good
            .z
            .chunks(size)
            .map(|block| median(&mut block.to_vec()))
            .collect(),
    })
}

/// Lands, and the drift that they show as knots of a broken line.
fn drift_followed(good: &Profile) -> Result<(Ground, Vec<(f64, f64)>), TraceProblem> {
    let (Some(&start), Some(&end)) = (good.x.first(), good.x.last()) else {
        return Err(TraceProblem::NoChannel {
            relief: 0.0,
            noise: 0.0,
        });
    };
    let noise = noise_of_neighbours(&good.z);
    let slope = typical_slope(&good.x, &good.z);
    let mut knots = vec![(start, 0.0), (end, slope * (end - start))];
    let mut level = good.z.clone();
    take_off(&good.x, &mut level, &knots);
    let first = survey(&good.x, &level, noise);
    let mut ground = first.map_err(|problem| one_level(good, noise).unwrap_or(problem))?;
    for _ in 0..2 {
        let rest = ground.knots();
        take_off(&good.x, &mut level, &rest);
        let middles: Vec<f64> = rest.iter().map(|(x, _)| *x).collect();
        let before = piecewise(&knots, &middles);
        let sum = rest
            .iter()
            .zip(before)
            .map(|((x, z), before)| (*x, z + before));
        let sum = sum.collect();
        match survey(&good.x, &level, noise) {
            Ok(better) => {
                ground = better;
                knots = sum;
            }
            Err(_) => break,
        }
    }
    Ok((ground, knots))
}

/// Whether nothing stands out of one straight line through all samples: the typical slope of noise is
/// not known well enough to tell.
fn one_level(good: &Profile, noise: f64) -> Option<TraceProblem> {
    let line = robust_line(&good.x, &good.z, 100)?;
    let rests: Vec<f64> = good
        .x
        .iter()
        .zip(&good.z)
        .map(|(x, z)| z - line.at(*x))
        .collect();
    let relief = rests.iter().copied().fold(f64::NEG_INFINITY, f64::max)
        - rests.iter().copied().fold(f64::INFINITY, f64::min);
    swing_thresholds(&rests, noise)
        .is_empty()
        .then_some(TraceProblem::NoChannel { relief, noise })
}

/// Takes a broken line off.
fn take_off(x: &[f64], z: &mut [f64], knots: &[(f64, f64)]) {
    for (height, reference) in z.iter_mut().zip(piecewise(knots, x)) {
        *height -= reference;
    }
}

/// Heights of the broken line through knots, its outer pieces prolonged; zero for less than two knots.
pub(super) fn piecewise(knots: &[(f64, f64)], x: &[f64]) -> Vec<f64> {
    let mut piece = 0;
    x.iter()
        .map(|&x| {
            while piece + 2 < knots.len() && knots[piece + 1].0 < x {
                piece += 1;
            }
            match knots.get(piece..piece + 2) {
                Some(&[(x0, z0), (x1, z1)]) => z0 + (z1 - z0) * (x - x0) / (x1 - x0),
                _ => 0.0,
            }
        })
        .collect()
}

/// The lands that account for most: of all thresholds the one with the largest product of depth and total
/// width of lands. Dust is higher than channels but narrow, ripple on a land is wide but low.
fn survey(x: &[f64], z: &[f64], noise: f64) -> Result<Ground, TraceProblem> {
    let mut best: Option<(f64, Ground)> = None;
    let mut on_crests = None;
    let mut first_problem = None;
    for threshold in swing_thresholds(z, noise) {
        match at_threshold(x, z, threshold) {
            Ok(ground) if ground.not_level.is_some() => on_crests = on_crests.or(Some(ground)),
            Ok(ground) => {
                let weight = ground.weight();
                if best.as_ref().is_none_or(|(heaviest, _)| weight > *heaviest) {
                    best = Some((weight, ground));
                }
            }
            Err(problem) => first_problem = first_problem.or(Some(problem)),
        }
    }
    if let Some(ground) = best.map(|(_, ground)| ground).or(on_crests) {
        return Ok(ground);
    }
    Err(first_problem.unwrap_or_else(|| {
        let mut heights = thinned(z, 20_000);
        let relief = quantile(&mut heights, 0.99) - quantile(&mut heights, 0.01);
        TraceProblem::NoChannel { relief, noise }
    }))
}

/// A wall: where it crosses half height, and how far it takes from 25 to 75 % of the depth.
fn wall_run(x: &[f64], z: &[f64], crossing: usize, levels: (f64, f64)) -> f64 {
    let (low, high) = levels;
    let lower = low + 0.25 * (high - low);
    let upper = low + 0.75 * (high - low);
    // Between samples, since a wall may take few of them.
    let side = |forwards: bool, level: f64, is_up: bool| {
        let wanted = |z: f64| if is_up { z >= level } else { z <= level };
        let (hit, before) = if forwards {
            let hit = (crossing..z.len()).find(|&k| wanted(z[k]))?;
            (hit, hit.checked_sub(1)?)
        } else {
            let hit = (0..crossing).rev().find(|&k| wanted(z[k]))?;
            (hit, hit + 1)
        };
        if before >= z.len() {
            return None;
        }
        let share = (level - z[before]) / (z[hit] - z[before]);
        Some(x[before] + share.clamp(0.0, 1.0) * (x[hit] - x[before]))
    };
    let falls = crossing > 0 && z.get(crossing).is_some_and(|&z1| z[crossing - 1] > z1);
    let ends = [side(!falls, upper, true), side(falls, lower, false)];
    match ends {
        [Some(a), Some(b)] => (a - b).abs(),
        _ => f64::NAN,
    }
}

/// Lands and channels of the stretches at one threshold.
fn at_threshold(x: &[f64], z: &[f64], threshold: f64) -> Result<Ground, TraceProblem> {
    let all = stretches(z, threshold);
    let lows: Vec<Option<f64>> = all
        .iter()
        .map(|s| (!s.high).then(|| quantile(&mut thinned(&z[s.from..s.to], 500), 0.1)))
        .collect();
    let mut lands = Vec::new();
    let mut depths = Vec::new();
    let mut runs = Vec::new();
    for (k, stretch) in all.iter().enumerate().filter(|(_, s)| s.high) {
        let before = k
            .checked_sub(1)
            .and_then(|k| lows.get(k).copied().flatten());
        let after = lows.get(k + 1).copied().flatten();
        let low = match (before, after) {
            (Some(a), Some(b)) => 0.5 * (a + b),
            (Some(low), None) | (None, Some(low)) => low,
            (None, None) => continue,
        };
        let Some(land) = land_of(x, z, *stretch, low) else {
            continue;
        };
        for (crossing, low) in [(stretch.from, before), (stretch.to, after)] {
            if let Some(low) = low {
                runs.push(wall_run(x, z, crossing, (low, land.line.level)));
                depths.push(land.line.level - low);
            }
        }
        lands.push(land);
    }
    let depth = median(&mut depths);
    drop_floors(&mut lands, depth);
    if lands.len() < 2 {
        runs.retain(|run| run.is_finite());
        let length = x[x.len() - 1] - x[0];
        if median(&mut runs) > SLOW_WALL * length {
            // A bow or a wave, not a ridge.
            return Err(TraceProblem::NoChannel {
                relief: threshold.max(depth),
                noise: noise_of_neighbours(z),
            });
        }
        let height = if depth.is_finite() { depth } else { threshold };
        return Err(TraceProblem::NoGroove {
            ridges: lands.len(),
            height,
        });
    }
    if alternating(&lands, depth) {
        return Err(TraceProblem::NoChannel {
            relief: threshold.max(depth),
            noise: noise_of_neighbours(z),
        });
    }
    let wall = typical_wall(x, &runs);
    let level = check_level(&lands, wall, depth).and_then(|()| check_rounded(x, z, &lands, depth));
    let Err(problem) = level else {
        return Ok(described(x, &all, lands, depth));
    };
    // Shoulders without a level part: a flat lid lies on their crests.
    let crests = crests(x, z, &all, depth);
    let is_fast = wall <= CREST_WALL * (x[x.len() - 1] - x[0]);
    if !is_fast || crests.len() < lands.len() {
        return Err(problem);
    }
    Ok(Ground {
        not_level: Some(problem),
        ..described(x, &all, crests, depth)
    })
}

/// Drops lands that lie far below one beside them, the lowest first: ripple on the floor of a channel.
fn drop_floors(lands: &mut Vec<Land>, depth: f64) {
    let far = ALTERNATING * depth;
    while lands.len() > 2 {
        let below = |k: usize| {
            let level = lands[k].line.level;
            let before = k.checked_sub(1).map(|k| lands[k].line.level);
            let after = lands.get(k + 1).map(|land| land.line.level);
            let higher = before.into_iter().chain(after).fold(level, f64::max);
            higher - level
        };
        let Some(worst) = (0..lands.len()).max_by(|&a, &b| below(a).total_cmp(&below(b))) else {
            return;
        };
        // A negative or missing depth says nothing.
        let deepest = below(worst);
        if deepest.is_nan() || far.is_nan() || deepest <= far {
            return;
        }
        lands.remove(worst);
    }
}

/// Whether every other land lies a good part of the depth lower: floors were taken for lands.
fn alternating(lands: &[Land], depth: f64) -> bool {
    let steps = lands.windows(2).map(|pair| {
        let [a, b] = [pair[0].line, pair[1].line];
        (a.level - b.level).abs()
    });
    let mut steps: Vec<f64> = steps.collect();
    steps.len() > 2 && median(&mut steps) > ALTERNATING * depth
}

/// The top of each upper stretch: the samples around its highest one within [`CREST`] of the depth.
fn crests(x: &[f64], z: &[f64], all: &[Stretch], depth: f64) -> Vec<Land> {
    let crest = |stretch: &Stretch| {
        let samples = stretch.from..stretch.to;
        let top = samples.clone().max_by(|&a, &b| z[a].total_cmp(&z[b]))?;
        let is_top = |k: &usize| z[*k] >= z[top] - CREST * depth;
        let mut first = (stretch.from..=top).rev().take_while(is_top).last()?;
        let mut last = (top..stretch.to).take_while(is_top).last()?;
        while last + 1 < first + FEWEST_IN_ZONE + 1 {
            if first == stretch.from && last + 1 == stretch.to {
                return None;
            }
            first = first.saturating_sub(1).max(stretch.from);
            last = (last + 1).min(stretch.to - 1);
        }
        let heights = &z[first..=last];
        let zone = Zone {
            from: x[first],
            to: x[last],
        };
        Some(Land {
            flat: zone,
            zone,
            line: Line {
                middle: 0.5 * (zone.from + zone.to),
                level: heights.iter().sum::<f64>() / heights.len() as f64,
                slope: 0.0,
                scatter: noise_of_neighbours(heights),
            },
        })
    };
    all.iter().filter(|s| s.high).filter_map(crest).collect()
}

/// How far walls take from 25 to 75 % of the depth, m.
fn typical_wall(x: &[f64], runs: &[f64]) -> f64 {
    let mut runs: Vec<f64> = runs.iter().copied().filter(|run| run.is_finite()).collect();
    let spacing = (x[x.len() - 1] - x[0]) / x.len() as f64;
    if runs.is_empty() {
        spacing
    } else {
        median(&mut runs).max(spacing)
    }
}

/// Whether lands are wide against the walls beside them.
fn check_level(lands: &[Land], wall: f64, depth: f64) -> Result<(), TraceProblem> {
    let mut widths: Vec<f64> = lands.iter().map(|l| l.flat.to - l.flat.from).collect();
    let level = median(&mut widths);
    if level < LEVEL_WIDTH * wall {
        return Err(TraceProblem::NoLand { level, wall });
    }
    // The slope of all lands together is tilt; an even number has no middle one.
    let mean = lands.iter().map(|land| land.line.slope).sum::<f64>() / lands.len() as f64;
    let steepness = lands.iter().map(|land| (land.line.slope - mean).abs());
    let slope = median(&mut steepness.collect::<Vec<_>>());
    if slope > SLOPING * 0.5 * depth / wall {
        let crest = slope * level;
        return Err(TraceProblem::RoundLands { crest, depth });
    }
    Ok(())
}

/// Whether lands are the rounded crests of waves.
fn check_rounded(x: &[f64], z: &[f64], lands: &[Land], depth: f64) -> Result<(), TraceProblem> {
    let mut crests: Vec<f64> = lands
        .iter()
        .filter_map(|land| {
            let first = x.partition_point(|x| *x < land.flat.from);
            let last = x.partition_point(|x| *x <= land.flat.to);
            let quarter = (last - first) / 4;
            let mean = |from: usize, to: usize| {
                let rests = (from..to).map(|k| z[k] - land.line.at(x[k]));
                rests.sum::<f64>() / (to - from) as f64
            };
            (quarter > 0).then(|| {
                let outer = mean(first, first + quarter) + mean(last - quarter, last);
                mean(first + quarter, last - quarter) - 0.5 * outer
            })
        })
        .collect();
    let crest = median(&mut crests);
    if crest > ROUNDED * depth {
        return Err(TraceProblem::RoundLands { crest, depth });
    }
    Ok(())
}

/// The rest of what is said about lands.
fn described(x: &[f64], all: &[Stretch], lands: Vec<Land>, depth: f64) -> Ground {
    let last = all.len().saturating_sub(1);
    let widths = |high: bool| -> Vec<f64> {
        all.iter()
            .enumerate()
            .filter(|(k, s)| s.high == high && *k > 0 && *k < last)
            .map(|(_, s)| x[s.to.min(x.len() - 1)] - x[s.from])
            .collect()
    };
    let (mut ridges, mut gaps) = (widths(true), widths(false));
    let narrowest = ridges
        .iter()
        .chain(&gaps)
        .copied()
        .fold(f64::INFINITY, f64::min);
    let mut noise: Vec<f64> = lands.iter().map(|land| land.line.scatter).collect();
    let grooves = lands
        .windows(2)
        .map(|pair| Zone {
            from: pair[0].flat.to,
            to: pair[1].flat.from,
        })
        .collect();
    Ground {
        grooves,
        depth,
        noise: median(&mut noise),
        ridge_width: (!ridges.is_empty()).then(|| median(&mut ridges)),
        groove_width: median(&mut gaps),
        narrowest,
        not_level: None,
        ends_low: all.first().is_some_and(|s| !s.high) && all.last().is_some_and(|s| !s.high),
        lands,
    }
}

/// The land of one upper stretch.
fn land_of(x: &[f64], z: &[f64], stretch: Stretch, low: f64) -> Option<Land> {
    let (xs, zs) = (&x[stretch.from..stretch.to], &z[stretch.from..stretch.to]);
    if xs.len() < FEWEST_IN_ZONE {
        return None;
    }
    let mut sorted = thinned(zs, 2000);
    sorted.sort_by(f64::total_cmp);
    let mode = half_sample_mode(&sorted);
    let depth = mode - low;
    if depth.is_nan() || depth <= 0.0 {
        return None;
    }
    let mut line = Line {
        middle: 0.5 * (xs[0] + xs[xs.len() - 1]),
        level: mode,
        slope: 0.0,
        scatter: 0.0,
    };
    let stride = (xs.len() / 4000).max(1);
    for _ in 0..3 {
        let near = xs
            .iter()
            .zip(zs)
            .step_by(stride)
            .filter(|(x, z)| (*z - line.at(**x)).abs() <= NEAR_LAND * depth);
        let (near_x, near_z): (Vec<f64>, Vec<f64>) = near.unzip();
        match robust_line(&near_x, &near_z, 60) {
            Some(better) if near_x.len() >= FEWEST_IN_ZONE => line = better,
            _ => break,
        }
    }
    let tolerance = (4.0 * line.scatter).clamp(0.01 * depth, 0.1 * depth);
    let on_line: Vec<bool> = xs
        .iter()
        .zip(zs)
        .map(|(x, z)| (z - line.at(*x)).abs() <= tolerance)
        .collect();
    let first = joins(on_line.iter().copied())?;
    let last = xs.len() - 1 - joins(on_line.iter().rev().copied())?;
    if last < first + FEWEST_IN_ZONE - 1 {
        return None;
    }
    let flat = Zone {
        from: xs[first],
        to: xs[last],
    };
    // Too few samples would be left of a short one.
    let is_short = last - first < 2 * FEWEST_IN_ZONE;
    let inset = if is_short {
        0.0
    } else {
        BESIDE_WALL * (flat.to - flat.from)
    };
    let zone = Zone {
        from: flat.from + if stretch.from > 0 { inset } else { 0.0 },
        to: flat.to - if stretch.to < z.len() { inset } else { 0.0 },
    };
    // Uneven samples may leave a part without any.
    let inside = xs.iter().filter(|x| (zone.from..=zone.to).contains(*x));
    let zone = if inside.count() < FEWEST_IN_ZONE {
        flat
    } else {
        zone
    };
    Some(Land { flat, zone, line })
}

/// Where samples join the line: the first that lies on it with at least three of the next four.
fn joins(on_line: impl Iterator<Item = bool>) -> Option<usize> {
    let on_line: Vec<bool> = on_line.collect();
    (0..on_line.len()).find(|&k| {
        let next = &on_line[k..on_line.len().min(k + 5)];
        on_line[k] && next.iter().filter(|on| !**on).count() <= next.len() / 5
    })
}
