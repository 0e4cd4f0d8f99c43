//! The plane of a grooved surface: fitted to the lands, so that grooves do not tilt it.
//!
//! A least-squares plane through all points leans into a groove that lies off the middle. Here the slope
//! is first the geometric median of the gradients (E. Weiszfeld, Tohoku Math. J. 43 (1937) 355-386, from
//! memory), which flanks that are the smaller part of the surface hardly move. With that slope off, the
//! heights of the lands are the uppermost strong peak of the histogram; a plane is fitted to the points
//! around it with the biweight of J. W. Tukey (A. E. Beaton and J. W. Tukey, Technometrics 16 (1974)
//! 147-185, doi:10.1080/00401706.1974.10489171, from memory), which gives points on flanks and floors no
//! weight at all.

use super::map_blocks::{HeightPoint, MapBlocks};
use crate::geometry::Point;
use crate::intake::order_statistics::{median, scatter_about};

/// Classes of the histogram of heights.
const CLASSES: usize = 200;
/// Part of the heights at each end that the histogram leaves out.
const TAIL: f64 = 0.005;
/// Height of a peak against the highest that makes it strong.
const STRONG_PEAK: f64 = 0.4;
/// Tuning constant of the biweight, in standard deviations (95 % efficiency for normal errors).
const BIWEIGHT: f64 = 4.685;
/// Repetitions of each weighted fit; they settle within ten.
const REPEATS: usize = 15;
/// Extent of the points used against that of the map below which their plane is not trusted, in standard
/// deviations along the narrowest direction.
const LEAST_EXTENT: f64 = 0.1;

/// The plane of the lands.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct LandPlane {
    /// `z = plane[0] + plane[1] x + plane[2] y`, from the first point of the map.
    pub(super) plane: [f64; 3],
    /// Root mean square distance of the land points from it, m.
    pub(super) rms: f64,
    /// Part of the points that are land.
    pub(super) share: f64,
    /// Whether the slope is that of the land points, rather than of the gradients alone.
    pub(super) fitted: bool,
}

/// Fits the plane of the lands; `None` with fewer than three points.
pub(super) fn land_plane(blocks: &MapBlocks) -> Option<LandPlane> {
    let points = blocks.points();
    if points.len() < 3 {
        return None;
    }
    let slope = median_slope(blocks).unwrap_or([0.0; 2]);
    let heights: Vec<f64> = points
        .iter()
        .map(|p| p[2] - slope[0] * p[0] - slope[1] * p[1])
        .collect();
    let (level, reach) = upper_level(&heights);
    let start = [level, slope[0], slope[1]];
    let rough = weighted_fit(&points, start, reach);
    let spread = spread_around(&points, rough, reach);
    let limit = (BIWEIGHT * spread).clamp(1e-3 * reach, reach);
    let fine = weighted_fit(&points, rough, limit);
    let used: Vec<&HeightPoint> = points
        .iter()
        .filter(|p| distance(p, fine).abs() < limit)
        .collect();
    let fitted = used.len() >= 3 && reaches_far(&used, blocks);
    let plane = if fitted { fine } else { start };
    let rms = {
        let near = points.iter().map(|p| distance(p, plane));
        let (sum, count) = near
            .filter(|d| d.abs() < reach)
            .fold((0.0, 0.0), |(sum, count), d| (sum + d * d, count + 1.0));
        if fitted {
            let sum: f64 = used.iter().map(|p| distance(p, plane).powi(2)).sum();
            (sum / used.len() as f64).sqrt()
        } else if count > 0.0 {
            f64::sqrt(sum / count)
        } else {
            0.0
        }
    };
    Some(LandPlane {
        plane,
        rms,
        share: used.len() as f64 / points.len() as f64,
        fitted,
    })
}

/// Height of a point above a plane.
fn distance(point: &HeightPoint, plane: [f64; 3]) -> f64 {
    point[2] - plane[0] - plane[1] * point[0] - plane[2] * point[1]
}

/// The geometric median of the gradients between neighbouring blocks.
fn median_slope(blocks: &MapBlocks) -> Option<Point> {
    let mut gradients: Vec<Point> = Vec::new();
    for row in 0..blocks.size[1].saturating_sub(1) {
        for column in 0..blocks.size[0].saturating_sub(1) {
            let here = blocks.height(column, row);
            let along_x = (blocks.height(column + 1, row) - here) / blocks.spacing[0];
            let along_y = (blocks.height(column, row + 1) - here) / blocks.spacing[1];
            if along_x.is_finite() && along_y.is_finite() {
                gradients.push([along_x, along_y]);
            }
        }
    }
    let mut centre = [0, 1].map(|axis| {
        let mut values: Vec<f64> = gradients.iter().map(|gradient| gradient[axis]).collect();
        median(&mut values)
    });
    if gradients.is_empty() {
        return None;
    }
    let sizes = gradients
        .iter()
        .map(|g| (g[0] - centre[0]).hypot(g[1] - centre[1]));
    let smallest = 1e-6 * sizes.sum::<f64>() / gradients.len() as f64 + f64::MIN_POSITIVE;
    for _ in 0..4 * REPEATS {
        let mut sums = [0.0; 3];
        for g in &gradients {
            let weight = 1.0 / (g[0] - centre[0]).hypot(g[1] - centre[1]).max(smallest);
            sums[0] += weight * g[0];
            sums[1] += weight * g[1];
            sums[2] += weight;
        }
        centre = [sums[0] / sums[2], sums[1] / sums[2]];
    }
    centre.iter().all(|c| c.is_finite()).then_some(centre)
}

/// Height of the uppermost strong peak of the histogram, and how far from it heights may belong to it.
fn upper_level(heights: &[f64]) -> (f64, f64) {
    let mut sorted = heights.to_vec();
    sorted.sort_unstable_by(f64::total_cmp);
    let at = |part: f64| {
        let place = (part * (sorted.len().saturating_sub(1)) as f64).round() as usize;
        sorted.get(place).copied().unwrap_or(0.0)
    };
    let (low, high) = (at(TAIL), at(1.0 - TAIL));
    let class = (high - low) / CLASSES as f64;
    if class <= 0.0 {
        return (low, f64::MIN_POSITIVE);
    }
    let mut counts = [0.0; CLASSES];
    for z in &sorted {
        let place = (z - low) / class;
        if place >= 0.0
            && let Some(count) = counts.get_mut(place as usize)
        {
            *count += 1.0;
        }
    }
    let smooth: Vec<f64> = (0..CLASSES)
        .map(|k| {
            let near = |step: usize, weight: f64| {
                let below = k.checked_sub(step).and_then(|j| counts.get(j));
                let above = counts.get(k + step);
                weight * (below.unwrap_or(&0.0) + above.unwrap_or(&0.0))
            };
            0.5 * near(0, 3.0) + near(1, 2.0) + near(2, 1.0)
        })
        .collect();
    let highest = smooth.iter().copied().fold(0.0, f64::max);
    let peak = (0..CLASSES)
        .rev()
        .find(|&k| {
            let here = smooth[k];
            let beside = [k.checked_sub(1), k.checked_add(1)];
            let mut beside = beside.iter().flatten().filter_map(|&j| smooth.get(j));
            here >= STRONG_PEAK * highest && beside.all(|&other| here >= other)
        })
        .unwrap_or(CLASSES - 1);
    // The upper side of the peak is free of flanks: half its height is reached at 1.18 standard deviations.
    let half = 0.5 * smooth.get(peak).copied().unwrap_or(0.0);
    let above = smooth.iter().skip(peak).take_while(|count| **count > half);
    let half_width = above.count() as f64;
    let reach = (BIWEIGHT / 1.18 * half_width).max(5.0);
    (low + (peak as f64 + 0.5) * class, reach * class)
}

/// A plane fitted with biweights of the distance from it, repeated from a start.
fn weighted_fit(points: &[HeightPoint], start: [f64; 3], limit: f64) -> [f64; 3] {
    let mut plane = start;
    let centre =
        [0, 1].map(|axis| points.iter().map(|p| p[axis]).sum::<f64>() / points.len().max(1) as f64);
    for _ in 0..REPEATS {
        // Normal equations of c + bx (x - x0) + by (y - y0).
        let mut m = [0.0; 6];
        let mut v = [0.0; 3];
        for p in points {
            let ratio = distance(p, plane) / limit;
            if ratio.abs() < 1.0 {
                let weight = (1.0 - ratio * ratio).powi(2);
                let (x, y) = (p[0] - centre[0], p[1] - centre[1]);
                let part = [1.0, x, y, x * x, x * y, y * y];
                for (sum, part) in m.iter_mut().zip(part) {
                    *sum += weight * part;
                }
                for (sum, part) in v.iter_mut().zip([1.0, x, y]) {
                    *sum += weight * part * p[2];
                }
            }
        }
        let matrix = nalgebra::Matrix3::new(m[0], m[1], m[2], m[1], m[3], m[4], m[2], m[4], m[5]);
        let solved = matrix
            .cholesky()
            .map(|l| l.solve(&nalgebra::Vector3::from(v)));
        let Some(s) = solved.filter(|s| s.iter().all(|c| c.is_finite())) else {
            break;
        };
        plane = [s[0] - s[1] * centre[0] - s[2] * centre[1], s[1], s[2]];
    }
    plane
}

/// Standard deviation of the points near a plane, from their median distance.
fn spread_around(points: &[HeightPoint], plane: [f64; 3], reach: f64) -> f64 {
    let distances = points.iter().map(|p| distance(p, plane));
    let mut near: Vec<f64> = distances.filter(|d| d.abs() < reach).collect();
    if near.is_empty() {
        return 0.0;
    }
    scatter_about(&mut near, 0.0)
}

/// Whether the points spread widely enough in every direction to carry a plane.
fn reaches_far(used: &[&HeightPoint], blocks: &MapBlocks) -> bool {
    let count = used.len() as f64;
    let mean = [0, 1].map(|axis| used.iter().map(|p| p[axis]).sum::<f64>() / count);
    let mut m = [0.0; 3];
    for p in used {
        // In parts of the map's size, so that a long map is not narrow.
        let x = (p[0] - mean[0]) / (blocks.size[0] as f64 * blocks.spacing[0]);
        let y = (p[1] - mean[1]) / (blocks.size[1] as f64 * blocks.spacing[1]);
        m = [
            m[0] + x * x / count,
            m[1] + x * y / count,
            m[2] + y * y / count,
        ];
    }
    let half = 0.5 * (m[0] + m[2]);
    let smaller = half - (0.5 * (m[0] - m[2])).hypot(m[1]);
    smaller.max(0.0).sqrt() >= LEAST_EXTENT
}
