//! Lines across the groove: which part of them lies on the map, and heights along them.
//!
//! Heights between points are interpolated bilinearly. Nearer methods need more neighbours, so that a
//! missing point would spread, and they overshoot beside steep flanks.

use rayon::iter::ParallelIterator;
use rayon::slice::ParallelSlice;

use super::surface::HeightMap;
use crate::geometry::Point;

/// Weight below which a neighbour does not count, so that a sample on a point needs that point only.
const NO_WEIGHT: f64 = 1e-9;
/// Places of a cut that one thread sums.
const PLACES_AT_A_TIME: usize = 64;

/// A frame with its middle on the middle of the map.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct CutFrame {
    middle: Point,
    /// Half the extent of the map.
    half: Point,
    /// Unit vector along the groove.
    pub(super) along: Point,
    /// Unit vector across it, towards rising x (rising y where the groove runs along x).
    pub(super) across: Point,
    /// Distance of samples across and of averaged rows along the groove: that of points.
    pub(super) step_across: f64,
    pub(super) step_along: f64,
}

/// Heights across the groove, averaged over parallel lines.
#[derive(Debug, Clone, Default, PartialEq)]
pub(super) struct LineMean {
    pub(super) heights: Vec<f64>,
    /// Samples of single lines without a height.
    pub(super) missing: usize,
    /// Lines that were averaged.
    pub(super) rows: usize,
    /// Fewest samples behind one of the means that are there.
    pub(super) fewest: usize,
    /// Root mean square of the standard deviations between lines, m.
    pub(super) spread: Option<f64>,
}

impl CutFrame {
    /// The frame of a map and a direction.
    pub(super) fn new(map: &HeightMap, direction: f64) -> Self {
        let (sine, cosine) = direction.sin_cos();
        let along = [cosine, sine];
        let mut across = [sine, -cosine];
        if across[0] < -1e-12 || (across[0].abs() <= 1e-12 && across[1] < 0.0) {
            across = [-across[0], -across[1]];
        }
        let extent = map.extent();
        let step = |way: Point| 1.0 / (way[0] / map.spacing[0]).hypot(way[1] / map.spacing[1]);
        Self {
            middle: extent.map(|length| 0.5 * length),
            half: extent.map(|length| 0.5 * length),
            along,
            across,
            step_across: step(across),
            step_along: step(along),
        }
    }

    /// The point at a station and a distance across.
    pub(super) fn point(&self, station: f64, distance: f64) -> Point {
        [0, 1].map(|axis| {
            self.middle[axis] + station * self.along[axis] + distance * self.across[axis]
        })
    }

    /// The part of the line at a station that lies on the map.
    pub(super) fn on_map(&self, station: f64) -> Option<(f64, f64)> {
        let (mut from, mut to) = (f64::NEG_INFINITY, f64::INFINITY);
        for axis in 0..2 {
            let (start, slope) = (station * self.along[axis], self.across[axis]);
            // Rounding must not push a line along the very edge off the map.
            let limit = self.half[axis] * (1.0 + 1e-9);
            if slope.abs() < 1e-12 {
                if start.abs() > limit {
                    return None;
                }
                continue;
            }
            let ends = [(-limit - start) / slope, (limit - start) / slope];
            from = from.max(ends[0].min(ends[1]));
            to = to.min(ends[0].max(ends[1]));
        }
        (from < to).then_some((from, to))
    }

    /// The part of all lines between two stations that lies on the map.
    pub(super) fn on_map_between(&self, first: f64, last: f64) -> Option<(f64, f64)> {
        // The map is convex, so the outermost lines decide.
        let (a, b) = (self.on_map(first)?, self.on_map(last)?);
        let (from, to) = (a.0.max(b.0), a.1.min(b.1));
        (from < to).then_some((from, to))
    }

    /// Farthest station of the map either way.
    pub(super) fn farthest(&self) -> f64 {
        self.along[0].abs() * self.half[0] + self.along[1].abs() * self.half[1]
    }

    /// Half the length along the groove of the largest rectangle of parallel lines around the middle.
    pub(super) fn widest_half_length(&self) -> f64 {
        let [c, s] = self.along.map(f64::abs);
        let [width, height] = self.half;
        // Half lengths a along and b across with `a c + b s <= width` and `a s + b c <= height`.
        let across_at = |a: f64| {
            let by_width = if s > 1e-12 {
                (width - a * c) / s
            } else {
                f64::INFINITY
            };
            let by_height = if c > 1e-12 {
                (height - a * s) / c
            } else {
                f64::INFINITY
            };
            by_width.min(by_height)
        };
        let mut candidates = Vec::new();
        for (a, limit) in [(0.5 * width, c), (0.5 * height, s), (width, c), (height, s)] {
            if limit > 1e-12 {
                candidates.push(a / limit);
            }
        }
        if (c - s).abs() > 1e-12 {
            candidates.push((width * c - height * s) / ((c - s) * (c + s)));
        }
        let area = |a: f64| {
            let b = across_at(a);
            if a > 0.0 && b > 0.0 { a * b } else { 0.0 }
        };
        // With the groove along an axis of the map the limits are walls, and the corner is best.
        candidates
            .into_iter()
            .map(|a| a * (1.0 - 1e-12))
            .max_by(|a, b| area(*a).total_cmp(&area(*b)))
            .filter(|a| area(*a) > 0.0)
            .unwrap_or(0.0)
    }
}

/// Means over the lines at the stations, sampled at the distances; a plane is taken off first.
pub(super) fn line_mean(
    map: &HeightMap,
    plane: [f64; 3],
    frame: &CutFrame,
    stations: &[f64],
    distances: &[f64],
) -> LineMean {
    // Each place is summed by one thread in the order of the lines, so that results do not depend on the
    // number of threads.
    let parts: Vec<(Vec<PlaceSum>, usize)> = distances
        .par_chunks(PLACES_AT_A_TIME)
        .map(|distances| sums_of_lines(map, plane, frame, stations, distances))
        .collect();
    let missing = parts.iter().map(|(_, missing)| missing).sum();
    let sums: Vec<PlaceSum> = parts.into_iter().flat_map(|(sums, _)| sums).collect();
    let filled = sums.iter().filter(|sum| sum[2] > 0.0);
    let fewest = filled.map(|sum| sum[2] as usize).min().unwrap_or(0);
    let (squares, freedoms) = sums
        .iter()
        .filter(|sum| sum[2] > 1.0)
        .fold((0.0, 0.0), |(squares, freedoms), sum| {
            (squares + sum[1], freedoms + sum[2] - 1.0)
        });
    LineMean {
        heights: sums
            .iter()
            .map(|sum| if sum[2] > 0.0 { sum[0] } else { f64::NAN })
            .collect(),
        missing,
        rows: stations.len(),
        fewest,
        spread: (freedoms > 0.0).then(|| f64::sqrt(squares / freedoms)),
    }
}

/// Mean, sum of squared deviations, and number of samples at a place of the cut.
type PlaceSum = [f64; 3];

/// Sums over the lines at some places, and the samples that are missing.
fn sums_of_lines(
    map: &HeightMap,
    plane: [f64; 3],
    frame: &CutFrame,
    stations: &[f64],
    distances: &[f64],
) -> (Vec<PlaceSum>, usize) {
    let mut sums = vec![[0.0; 3]; distances.len()];
    let mut missing = 0;
    for &station in stations {
        for (sum, &distance) in sums.iter_mut().zip(distances) {
            let point = frame.point(station, distance);
            let height = interpolated(map, point);
            if height.is_finite() {
                let level = height - plane[0] - plane[1] * point[0] - plane[2] * point[1];
                // Welford's update keeps small deviations of large heights.
                sum[2] += 1.0;
                let step = level - sum[0];
                sum[0] += step / sum[2];
                sum[1] += step * (level - sum[0]);
            } else {
                missing += 1;
            }
        }
    }
    (sums, missing)
}

/// Height between the points of the map; NaN where a neighbour with weight is missing.
fn interpolated(map: &HeightMap, point: Point) -> f64 {
    let place = |axis: usize| {
        let last = map.size[axis].saturating_sub(1);
        let position = (point[axis] / map.spacing[axis]).clamp(0.0, last as f64);
        let cell = (position as usize).min(last.saturating_sub(1));
        (cell, position - cell as f64)
    };
    let ((column, part_x), (row, part_y)) = (place(0), place(1));
    let start = row * map.size[0] + column;
    let beside = |row_start: usize| {
        let left = map.heights.get(row_start).copied().unwrap_or(f64::NAN);
        if part_x <= NO_WEIGHT {
            return left;
        }
        let right = map.heights.get(row_start + 1).copied().unwrap_or(f64::NAN);
        if part_x >= 1.0 - NO_WEIGHT {
            return right;
        }
        left + part_x * (right - left)
    };
    let lower = if part_y >= 1.0 - NO_WEIGHT {
        0.0
    } else {
        (1.0 - part_y) * beside(start)
    };
    let upper = if part_y <= NO_WEIGHT {
        0.0
    } else {
        part_y * beside(start + map.size[0])
    };
    lower + upper
}
