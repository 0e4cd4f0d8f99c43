//! Flanks that show the shape of the tip, as ranges of samples.
//!
//! With a stated tip a flank is tip shape where the ball touched two places at once (see `tip`) and where it is
//! at least as steep as the cone can show, less [`ANGLE_MARGIN`]. Without one, a pair of straight flanks of one
//! angle may be: then both are taken from the edge to the foot. Slopes are chords over a fortieth of
//! the depth, so that noise does not make a flank. Ends move outwards along the flank while it goes on;
//! samples between two such stretches do not count as touched when they are fewer than
//! [`FEWEST_SEGMENTS`] intervals. At its foot a flank has one sample more, which may have been read while the tip
//! still hung on the flank, and at its top one more where that is higher, so that the edge is between its ends.
//!
//! A trace that was turned over was touched from the other side: its flanks are looked for as they were
//! measured, with foot and top exchanged.

use super::grooves::Heights;

/// A flank within this of the steepest the tip can show is tip shape, rad: cone angles and scales are not known
/// better (common practice, no source).
pub(super) const ANGLE_MARGIN: f64 = 3.0 * std::f64::consts::PI / 180.0;
/// Length of a chord as a fraction of the depth, and of the look ahead at the ends of a flank.
const CHORD: f64 = 0.04;
const LOOK_AHEAD: f64 = 0.005;
/// A single interval this high against the depth is a flank whatever the chord says.
const STEP: f64 = 0.1;
/// A stretch lower than this fraction of the depth is no flank; a floor that lies deeper than both ends of
/// a flank by this much was not touched.
const LOWEST: f64 = 0.05;
/// Fewest intervals of a stretch between two flanks that counts as touched.
const FEWEST_SEGMENTS: usize = 3;

/// What counts as steep.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Steep {
    /// A flank has parts this steep, rad,
    pub(super) begin: f64,
    /// and goes on while it is this steep, rad.
    pub(super) go_on: f64,
    /// Whether the trace was turned over after it was measured.
    pub(super) is_inverted: bool,
}

/// A flank that shows the tip.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Flank {
    /// First and last sample; both were touched, those between not surely.
    pub(super) from: usize,
    pub(super) to: usize,
    /// Its angle against the level, rad.
    pub(super) angle: f64,
    /// Whether it is deeper between its ends than at both of them, as measured: what lies between two flanks
    /// was not touched.
    pub(super) is_bottomless: bool,
}

/// The flanks of some samples.
///
/// - `tip_shape`: for each interval between samples of `heights`, whether it is the shape of the ball
/// - `samples`: where to look
/// - `depth`: of the groove, m
pub(super) fn find(
    heights: Heights<'_>,
    tip_shape: &[bool],
    steep: Steep,
    samples: std::ops::Range<usize>,
    depth: f64,
) -> Vec<Flank> {
    let first = samples.start;
    let x = heights.x.get(samples.clone()).unwrap_or_default();
    let up = if steep.is_inverted { -1.0 } else { 1.0 };
    let z = heights.z.get(samples).unwrap_or_default();
    let z: Vec<f64> = z.iter().map(|z| up * z).collect();
    if x.len() < 2 {
        return Vec::new();
    }
    let mut is_flank = steep_intervals(x, &z, steep, depth);
    for (mark, shape) in is_flank.iter_mut().zip(tip_shape.iter().skip(first)) {
        *mark |= shape;
    }
    let mut ranges: Vec<(usize, usize)> = Vec::new();
    for (index, _) in is_flank.iter().enumerate().filter(|(_, mark)| **mark) {
        match ranges.last_mut() {
            Some(last) if index - last.1 < FEWEST_SEGMENTS => last.1 = index + 1,
            _ => ranges.push((index, index + 1)),
        }
    }
    let flank = |(from, to): (usize, usize)| {
        let (before, after) = (from.saturating_sub(1), (to + 1).min(z.len() - 1));
        let (from, to) = if z[from] < z[to] {
            (before, if z[after] > z[to] { after } else { to })
        } else {
            (if z[before] > z[from] { before } else { from }, after)
        };
        let inside = z[from..=to].iter();
        let low = inside.clone().copied().fold(f64::INFINITY, f64::min);
        let high = inside.copied().fold(f64::NEG_INFINITY, f64::max);
        (high - low > LOWEST * depth).then(|| Flank {
            from: first + from,
            to: first + to,
            angle: angle(&x[from..=to], &z[from..=to]),
            is_bottomless: z[from].min(z[to]) - low > LOWEST * depth,
        })
    };
    ranges.into_iter().filter_map(flank).collect()
}

/// Angle of the middle one of the intervals by steepness, rad.
fn angle(x: &[f64], z: &[f64]) -> f64 {
    let pairs = x.windows(2).zip(z.windows(2));
    let mut slopes: Vec<f64> = pairs
        .map(|(x, z)| ((z[1] - z[0]) / (x[1] - x[0])).abs())
        .collect();
    slopes.sort_by(f64::total_cmp);
    slopes.get(slopes.len() / 2).copied().unwrap_or(0.0).atan()
}

/// Which intervals are steep, or go on from one that is.
fn steep_intervals(x: &[f64], z: &[f64], steep: Steep, depth: f64) -> Vec<bool> {
    let last = x.len() - 1;
    let (begin, half) = (steep.begin.tan(), 0.5 * CHORD * depth);
    let mut marks = vec![false; last];
    let mut falls = vec![false; last];
    for index in 0..last {
        let middle = 0.5 * (x[index] + x[index + 1]);
        let a = x
            .partition_point(|&p| p <= middle - half)
            .saturating_sub(1)
            .min(index);
        let b = x
            .partition_point(|&p| p < middle + half)
            .clamp(index + 1, last);
        let chord = (z[b] - z[a]) / (x[b] - x[a]);
        let step = z[index + 1] - z[index];
        let slope = step / (x[index + 1] - x[index]);
        let is_step = step.abs() >= STEP * depth && slope.abs() >= begin;
        marks[index] = chord.abs() >= begin || is_step;
        falls[index] = if is_step { step < 0.0 } else { chord < 0.0 };
    }
    let seeds = marks.clone();
    let (go_on, ahead) = (steep.go_on.tan(), LOOK_AHEAD * depth);
    for index in (0..last).filter(|&i| seeds[i]) {
        let sign = if falls[index] { -1.0 } else { 1.0 };
        // To the right of the interval while it goes on, then to the left.
        let mut end = index + 1;
        while end < last && !marks[end] {
            let far = x
                .partition_point(|&p| p < x[end] + ahead)
                .clamp(end + 1, last);
            if sign * (z[far] - z[end]) < go_on * (x[far] - x[end]) {
                break;
            }
            marks[end] = true;
            end += 1;
        }
        let mut start = index;
        while start > 0 && !marks[start - 1] {
            let far = x.partition_point(|&p| p <= x[start] - ahead);
            let far = far.saturating_sub(1).min(start - 1);
            if sign * (z[start] - z[far]) < go_on * (x[start] - x[far]) {
                break;
            }
            marks[start - 1] = true;
            start -= 1;
        }
    }
    marks
}
