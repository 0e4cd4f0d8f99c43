//! Points given one by one: the rectangular grid they lie on, where they do.

use super::map_problem::MapProblem;
use super::surface::checked_points;

/// Largest number of points given one by one.
pub(super) const MAX_LISTED_POINTS: usize = 16_000_000;
/// Smallest part of the grid that must be filled.
const LEAST_FILLED: f64 = 0.25;
/// Largest distance of a point from its place on the grid, in parts of the spacing.
const LARGEST_OFFSET: f64 = 0.05;
/// Distances between neighbouring coordinates must fall into two groups this far apart.
const GROUPS_APART: f64 = 10.0;
/// Coordinates closer than this part of their range are the same.
const SAME_PART: f64 = 2e-7;

/// The grid that points lie on.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct PointGrid {
    pub(super) size: [usize; 2],
    pub(super) spacing: [f64; 2],
    /// Lowest x and y.
    pub(super) origin: [f64; 2],
    /// Heights row by row along x, rows in the order of rising y.
    pub(super) heights: Vec<f64>,
    /// Farthest distance of a point from its place, in parts of the spacing.
    pub(super) largest_offset: f64,
}

/// Puts points on their grid.
///
/// - `rounding`: relative rounding of the stored coordinates along x and along y
///
/// Along each axis the sorted coordinates are split where the distance of neighbours jumps; the groups
/// must lie at whole multiples of one spacing to within a twentieth of it. Time is n log n.
pub(super) fn grid_of_points(
    [x, y, z]: [&[f64]; 3],
    rounding: [f64; 2],
) -> Result<PointGrid, MapProblem> {
    let along = [
        axis_grid(x, "x", rounding[0])?,
        axis_grid(y, "y", rounding[1])?,
    ];
    let size = along.map(|axis| axis.count);
    let sites = checked_points(size[0] as u64, size[1] as u64)?;
    let points = x.len().min(y.len()).min(z.len());
    if (points as f64) < LEAST_FILLED * sites as f64 {
        return Err(MapProblem::NotAGrid {
            reason: format!(
                "{points} points fill too little of the {} x {} places their coordinates span",
                size[0], size[1]
            ),
        });
    }
    let mut heights = vec![f64::NAN; sites];
    let mut taken = vec![false; sites];
    let mut largest_offset: f64 = 0.0;
    for ((&px, &py), &pz) in x.iter().zip(y).zip(z) {
        let (Some((column, off_x)), Some((row, off_y))) = (along[0].place(px), along[1].place(py))
        else {
            continue;
        };
        largest_offset = largest_offset.max(off_x).max(off_y);
        if largest_offset > LARGEST_OFFSET {
            return Err(MapProblem::NotAGrid {
                reason: format!("a point lies {largest_offset:.2} of the spacing from its place"),
            });
        }
        let site = row * size[0] + column;
        if taken.get(site).copied().unwrap_or(true) {
            return Err(MapProblem::NotAGrid {
                reason: "two points lie on one place".to_owned(),
            });
        }
        if let (Some(flag), Some(slot)) = (taken.get_mut(site), heights.get_mut(site)) {
            *flag = true;
            *slot = pz;
        }
    }
    Ok(PointGrid {
        size,
        spacing: along.map(|axis| axis.spacing),
        origin: along.map(|axis| axis.first),
        heights,
        largest_offset,
    })
}

/// Evenly spaced coordinates.
#[derive(Debug, Clone, Copy)]
struct AxisGrid {
    first: f64,
    spacing: f64,
    count: usize,
}

impl AxisGrid {
    /// Index of a coordinate, and its distance from there in parts of the spacing.
    fn place(&self, coordinate: f64) -> Option<(usize, f64)> {
        if !coordinate.is_finite() {
            return None;
        }
        if self.count == 1 {
            return Some((0, 0.0));
        }
        let steps = (coordinate - self.first) / self.spacing;
        let index = steps.round();
        (index > -0.5 && index < self.count as f64 - 0.5)
            .then(|| (index as usize, (steps - index).abs()))
    }
}

/// The even spacing behind the coordinates of one axis.
fn axis_grid(
    coordinates: &[f64],
    axis: &'static str,
    rounding: f64,
) -> Result<AxisGrid, MapProblem> {
    let mut sorted: Vec<f64> = coordinates
        .iter()
        .copied()
        .filter(|c| c.is_finite())
        .collect();
    sorted.sort_unstable_by(f64::total_cmp);
    let (Some(&first), Some(&last)) = (sorted.first(), sorted.last()) else {
        return Err(MapProblem::NoHeights {
            points: coordinates.len(),
        });
    };
    let same = SAME_PART * (last - first) + rounding * first.abs().max(last.abs());
    if last - first <= same {
        return Ok(AxisGrid {
            first,
            spacing: 0.0,
            count: 1,
        });
    }
    let limit = group_limit(&sorted, same);
    let centres = group_centres(&sorted, limit);
    let uneven = |reason: &str| MapProblem::NotAGrid {
        reason: format!("{reason} along {axis}"),
    };
    let limit = limit.ok_or_else(|| uneven("the coordinates form no groups"))?;
    let mut gaps: Vec<f64> = centres.windows(2).map(|pair| pair[1] - pair[0]).collect();
    if gaps.iter().any(|gap| *gap < limit) || gaps.is_empty() {
        return Err(uneven("the coordinates form no groups"));
    }
    let middle = gaps.len() / 2;
    let (_, median, _) = gaps.select_nth_unstable_by(middle, f64::total_cmp);
    let rough = *median;
    let (from, to) = (centres.first(), centres.last());
    let (Some(&from), Some(&to)) = (from, to) else {
        return Err(uneven("the coordinates form no groups"));
    };
    let steps = ((to - from) / rough).round().max(1.0);
    let spacing = (to - from) / steps;
    let even = centres.iter().all(|centre| {
        let place = (centre - from) / spacing;
        (place - place.round()).abs() <= LARGEST_OFFSET
    });
    if !even || steps >= 1e9 {
        return Err(uneven("the coordinates are not evenly spaced"));
    }
    Ok(AxisGrid {
        first: from,
        spacing,
        count: steps as usize + 1,
    })
}

/// The distance that separates jitter from spacing: where the sorted distances first fall far.
fn group_limit(sorted: &[f64], same: f64) -> Option<f64> {
    let mut gaps: Vec<f64> = sorted
        .windows(2)
        .map(|pair| (pair[1] - pair[0]).max(same))
        .collect();
    gaps.push(same);
    gaps.sort_unstable_by(|a, b| b.total_cmp(a));
    let fall = gaps
        .windows(2)
        .find(|pair| pair[0] >= GROUPS_APART * pair[1])?;
    Some((fall[0] * fall[1]).sqrt())
}

/// Mean coordinate of each group.
fn group_centres(sorted: &[f64], limit: Option<f64>) -> Vec<f64> {
    let Some(limit) = limit else {
        return Vec::new();
    };
    let groups = sorted.chunk_by(|a, b| b - a < limit);
    groups
        .map(|group| group.iter().sum::<f64>() / group.len() as f64)
        .collect()
}
