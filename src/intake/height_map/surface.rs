//! A height map: heights on a rectangular grid.

use std::fmt::Write as _;

use super::map_problem::MapProblem;
use crate::intake::step::Step;

/// Largest number of points of a height map; their heights take 512 MB.
pub const MAX_MAP_POINTS: usize = 64_000_000;

/// Heights on a rectangular grid, metres.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct HeightMap {
    /// Points along x and along y.
    pub size: [usize; 2],
    /// Distance of neighbours along x and along y, m.
    pub spacing: [f64; 2],
    /// Heights upwards, m, row by row along x, rows in the order of rising y; NaN where missing.
    pub heights: Vec<f64>,
    /// What the file says besides, key and value as written, in its order.
    pub metadata: Vec<(String, String)>,
    /// How it was read, with every defect of the file by name.
    pub steps: Vec<Step>,
}

impl HeightMap {
    /// Height of a point, m; NaN where it is missing or outside the map.
    ///
    /// # Examples
    /// ```
    /// use etchwise::intake::HeightMap;
    /// let map = HeightMap {
    ///     size: [2, 2],
    ///     spacing: [1e-6, 1e-6],
    ///     heights: vec![0.0, 1e-6, 2e-6, f64::NAN],
    ///     ..HeightMap::default()
    /// };
    /// assert_eq!(map.height(1, 0), 1e-6);
    /// assert!(map.height(1, 1).is_nan() && map.height(5, 0).is_nan());
    /// ```
    pub fn height(&self, column: usize, row: usize) -> f64 {
        if column >= self.size[0] {
            return f64::NAN;
        }
        let place = row
            .checked_mul(self.size[0])
            .and_then(|start| start.checked_add(column));
        let height = place.and_then(|place| self.heights.get(place));
        height.copied().unwrap_or(f64::NAN)
    }

    /// Distance between the first and the last point along x and along y, m.
    pub fn extent(&self) -> [f64; 2] {
        [0, 1].map(|axis| self.size[axis].saturating_sub(1) as f64 * self.spacing[axis])
    }

    /// Number of points without a height.
    pub fn missing(&self) -> usize {
        self.heights.iter().filter(|z| !z.is_finite()).count()
    }

    /// Lowest and highest height, m; `None` where no point has one.
    pub fn height_range(&self) -> Option<[f64; 2]> {
        height_range(&self.heights)
    }
}

/// Lowest and highest of the heights that are there.
pub(super) fn height_range(heights: &[f64]) -> Option<[f64; 2]> {
    let mut range: Option<[f64; 2]> = None;
    for &z in heights.iter().filter(|z| z.is_finite()) {
        range = Some(range.map_or([z, z], |[low, high]| [low.min(z), high.max(z)]));
    }
    range
}

/// A map as a matrix of text: one line for each row in the order of rising y, heights along x in metres,
/// separated by commas, seventeen significant digits, `NaN` where missing.
///
/// # Examples
/// ```
/// use etchwise::intake::{HeightMap, heights_csv};
/// let map = HeightMap {
///     size: [2, 1],
///     spacing: [1e-6, 1e-6],
///     heights: vec![1e-6, f64::NAN],
///     ..HeightMap::default()
/// };
/// assert_eq!(heights_csv(&map), "9.9999999999999995e-7,NaN\n");
/// ```
pub fn heights_csv(map: &HeightMap) -> String {
    let mut text = String::new();
    for row in map.heights.chunks(map.size[0].max(1)) {
        for (column, z) in row.iter().enumerate() {
            let comma = if column == 0 { "" } else { "," };
            // Writing to a String cannot fail.
            let _ = if z.is_finite() {
                write!(text, "{comma}{z:.16e}")
            } else {
                write!(text, "{comma}NaN")
            };
        }
        text.push('\n');
    }
    text
}

/// The number of points of a map within the limit.
pub(crate) fn checked_points(along_x: u64, along_y: u64) -> Result<usize, MapProblem> {
    let points = along_x.checked_mul(along_y);
    match points.and_then(|points| usize::try_from(points).ok()) {
        Some(0) => Err(MapProblem::NoPoints { along_x, along_y }),
        Some(points) if points <= MAX_MAP_POINTS => Ok(points),
        _ => Err(MapProblem::TooManyPoints {
            limit: MAX_MAP_POINTS,
            along_x,
            along_y,
        }),
    }
}
