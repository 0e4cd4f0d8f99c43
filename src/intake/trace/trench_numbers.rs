//! Widths, depths and wall angles of a groove, in the words of trench sheets.
//!
//! Depth counts downwards from the line through both edges. What each number is, where trench sheets and
//! foundries differ, is common practice without a source. A trace gives one height for each position, so it
//! shows no undercut below an edge: for an isotropic etch it is [`IsotropicFit::depth`] if that shape fits.

use super::shape_fits::{self, IsotropicFit, KohFit};
use super::wall_curves::Line;
use crate::geometry::Point;

/// Depths at which the walls are taken for their fits, as fractions: from a tenth to nine tenths.
const FIRST_LEVEL: f64 = 0.1;
const LEVELS: u32 = 81;
const LEVEL_STEP: f64 = 0.01;

/// A wall and the straight line through it between 10 and 90 % of the depth.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallNumbers {
    /// Angle against the level, rad, up to a right angle; by least squares of positions at equal steps of
    /// depth.
    pub angle: f64,
    /// Root mean square distance from the line, m.
    pub rms: f64,
    /// Where the line meets the lands, m.
    pub top: f64,
    /// Where it meets the largest depth, m.
    pub foot: f64,
}

/// Numbers of a groove.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct TrenchNumbers {
    /// From edge to edge, m.
    pub opening_width: f64,
    /// Between the straight lines through the walls, at the lands, m.
    pub top_width: f64,
    /// At half of the largest depth, m.
    pub middle_width: f64,
    /// Between the straight lines through the walls, at the largest depth, m; zero where they meet above.
    pub bottom_width: f64,
    /// Largest depth, m.
    pub depth: f64,
    /// Mean depth over the middle third of the opening, m.
    pub floor_depth: f64,
    /// Left wall.
    pub left_wall: WallNumbers,
    /// Right wall.
    pub right_wall: WallNumbers,
    /// Middle width less the mean of top and bottom width, m: positive for bowed walls.
    pub bow: f64,
    /// Largest depth over opening width.
    pub aspect_ratio: f64,
    /// Area below the line through the edges, m^2.
    pub area: f64,
    /// Trapezoid with walls on (111) planes; `None` where none fits.
    pub koh: Option<KohFit>,
    /// Flat floor between quarter circles; `None` where none fits.
    pub isotropic: Option<IsotropicFit>,
}

impl TrenchNumbers {
    /// Numbers of a curve from edge to edge; `None` without depth.
    pub(super) fn new(walls: &[Point], base: Line) -> Option<Self> {
        let depths: Vec<Point> = walls.iter().map(|&[x, z]| [x, base.at(x) - z]).collect();
        let depth = depths.iter().fold(0.0, |d: f64, p| d.max(p[1]));
        let (first, last) = (depths.first()?[0], depths.last()?[0]);
        let opening_width = last - first;
        if !(depth > 0.0 && opening_width > 0.0) {
            return None;
        }
        let mirrored: Vec<Point> = depths.iter().rev().map(|&[x, d]| [-x, d]).collect();
        let left_wall = wall(&depths, depth)?;
        let right = wall(&mirrored, depth)?;
        let right_wall = WallNumbers {
            top: -right.top,
            foot: -right.foot,
            ..right
        };
        let half = |wall: &[Point]| first_at(wall, &[0.5 * depth]).first().copied();
        let middle_width = -half(&mirrored)? - half(&depths)?;
        let top_width = right_wall.top - left_wall.top;
        let bottom_width = (right_wall.foot - left_wall.foot).max(0.0);
        let third = opening_width / 3.0;
        let points = shape_fits::along(&depths);
        Some(Self {
            opening_width,
            top_width,
            middle_width,
            bottom_width,
            depth,
            floor_depth: area_between(&depths, first + third, last - third) / third,
            left_wall,
            right_wall,
            bow: middle_width - 0.5 * (top_width + bottom_width),
            aspect_ratio: depth / opening_width,
            area: area_between(&depths, first, last),
            koh: shape_fits::koh(&points),
            isotropic: shape_fits::isotropic(&points),
        })
    }
}

/// Where a wall, followed from its begin, first reaches each of growing depths.
fn first_at(wall: &[Point], levels: &[f64]) -> Vec<f64> {
    let mut found = Vec::with_capacity(levels.len());
    for pair in wall.windows(2) {
        let ([x0, d0], [x1, d1]) = (pair[0], pair[1]);
        while let Some(&level) = levels.get(found.len()) {
            if d1 < level {
                break;
            }
            let t = if d1 > d0 {
                ((level - d0) / (d1 - d0)).max(0.0)
            } else {
                0.0
            };
            found.push(x0 + t * (x1 - x0));
        }
    }
    found
}

/// The line through a wall from the left edge down.
fn wall(depths: &[Point], depth: f64) -> Option<WallNumbers> {
    let levels: Vec<f64> = (0..LEVELS)
        .map(|i| (FIRST_LEVEL + LEVEL_STEP * f64::from(i)) * depth)
        .collect();
    let places = first_at(depths, &levels);
    let count = places.len() as f64;
    if places.len() < levels.len() {
        return None;
    }
    let x_mean = places.iter().sum::<f64>() / count;
    let d_mean = levels.iter().sum::<f64>() / count;
    let (mut square, mut product) = (0.0, 0.0);
    for (x, d) in places.iter().zip(&levels) {
        square += (d - d_mean).powi(2);
        product += (d - d_mean) * (x - x_mean);
    }
    let run = (product / square).max(0.0);
    let angle = 1.0_f64.atan2(run);
    let off = |(x, d): (&f64, &f64)| (x - x_mean - run * (d - d_mean)).powi(2);
    let rms = (places.iter().zip(&levels).map(off).sum::<f64>() / count).sqrt();
    Some(WallNumbers {
        angle,
        rms: rms * angle.sin(),
        top: x_mean - run * d_mean,
        foot: x_mean + run * (depth - d_mean),
    })
}

/// Area of a curve given as position and depth between two positions, m^2.
fn area_between(depths: &[Point], from: f64, to: f64) -> f64 {
    let mut area = 0.0;
    for pair in depths.windows(2) {
        let ([x0, d0], [x1, d1]) = (pair[0], pair[1]);
        let (a, b) = (x0.max(from), x1.min(to));
        if b > a {
            let at = |x: f64| d0 + (x - x0) / (x1 - x0) * (d1 - d0);
            area += 0.5 * (at(a) + at(b)) * (b - a);
        }
    }
    area
}
