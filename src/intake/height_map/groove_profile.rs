//! How well one profile, repeated along a direction, explains the heights of a map.
//!
//! Every point has a position `u` across the direction and `v` along it. The profile is a curve of straight
//! pieces over evenly spaced knots in `u`, fitted to all points by least squares: the normal equations
//! couple neighbouring knots only. It is the mean of all parallel cuts without a choice of cuts.

use super::map_blocks::HeightPoint;
use crate::geometry::Point;

/// Stripes along the direction and bands across it whose scatter gives the uncertainty.
const PARTS: usize = 16;

/// The fitted profile.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct FittedProfile {
    /// Unit vectors along and across the direction, anticlockwise.
    along: Point,
    across: Point,
    /// Place of the first knot and distance of knots.
    first: f64,
    knot: f64,
    values: Vec<f64>,
    /// Part of the variance of the heights left over, corrected for the number of knots.
    pub(super) unexplained: f64,
}

/// Fits the profile across a direction (radians against x).
pub(super) fn fit_profile(points: &[HeightPoint], direction: f64, knot: f64) -> FittedProfile {
    fit_values(points, direction, knot, |p| p[2])
}

/// Fits the profile of any value of points.
fn fit_values(
    points: &[HeightPoint],
    direction: f64,
    knot: f64,
    value: impl Fn(&HeightPoint) -> f64,
) -> FittedProfile {
    let (sine, cosine) = direction.sin_cos();
    let (along, across) = ([cosine, sine], [-sine, cosine]);
    let place = |p: &HeightPoint| across[0] * p[0] + across[1] * p[1];
    let (low, high) = points
        .iter()
        .map(place)
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), u| {
            (low.min(u), high.max(u))
        });
    let pieces = if points.is_empty() {
        0
    } else {
        ((high - low) / knot) as usize + 1
    };
    let mut equations = Equations::new(pieces + 1);
    let (mut sum, mut squares) = (0.0, 0.0);
    for p in points {
        let position = ((place(p) - low) / knot).max(0.0);
        let piece = (position as usize).min(pieces.saturating_sub(1));
        let value = value(p);
        equations.add(piece, position - piece as f64, value);
        sum += value;
        squares += value * value;
    }
    let count = points.len() as f64;
    let (values, explained, knots) = equations.solve();
    let left = (squares - explained).max(0.0) / (count - knots as f64).max(1.0);
    let all = (squares - sum * sum / count.max(1.0)).max(0.0) / (count - 1.0).max(1.0);
    FittedProfile {
        along,
        across,
        first: low,
        knot,
        values,
        unexplained: if all > 0.0 { left / all } else { 1.0 },
    }
}

impl FittedProfile {
    /// Height and slope of the profile at a position; the slope is the mean of the pieces around.
    fn at(&self, u: f64) -> (f64, f64) {
        let position = ((u - self.first) / self.knot).max(0.0);
        let piece = position as usize;
        let value = |k: usize| {
            let inside = k.min(self.values.len().saturating_sub(1));
            self.values.get(inside).copied().unwrap_or(0.0)
        };
        let part = position - piece as f64;
        let height = value(piece) * (1.0 - part) + value(piece + 1) * part;
        let before = value(piece.saturating_sub(1));
        let slope_here = value(piece + 1) - before;
        let slope_next = value(piece + 2) - value(piece);
        let slope = (slope_here * (1.0 - part) + slope_next * part) / (2.0 * self.knot);
        (height, slope)
    }

    /// How far the direction must turn for the profile to fit best, rad, and the standard uncertainty.
    ///
    /// A small turn `d` moves the profile by `d (v - m)` at a point, where `m` is the mean `v` of all
    /// points with its `u`: their mean place is what the fit has taken already. `d` follows by least
    /// squares from the heights left over and the slopes of the profile, together with a tilt along the
    /// groove that the plane may have left. Its uncertainty is from the scatter of the equations between
    /// stripes along the direction, and between bands across it, whichever is larger, since heights left
    /// over are alike within a groove and from point to point. `None` where the profile has no slope.
    pub(super) fn turn(&self, points: &[HeightPoint]) -> Option<(f64, f64)> {
        let along = |p: &HeightPoint| self.along[0] * p[0] + self.along[1] * p[1];
        let direction = self.along[1].atan2(self.along[0]);
        let means = fit_values(points, direction, self.knot, along);
        let (low, high) = points
            .iter()
            .map(along)
            .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
                (low.min(v), high.max(v))
            });
        let stripe = (high - low) / PARTS as f64;
        let band = self.knot * self.values.len() as f64 / PARTS as f64;
        let mut stripes = [TurnEquations::default(); PARTS];
        let mut bands = [TurnEquations::default(); PARTS];
        for p in points {
            let (u, v) = (self.across[0] * p[0] + self.across[1] * p[1], along(p));
            let (height, slope) = self.at(u);
            let lever = v - means.at(u).0;
            let here = TurnEquations::of_point(slope, lever, p[2] - height);
            let places = [(v - low) / stripe, (u - self.first) / band];
            for (sums, place) in [&mut stripes, &mut bands].into_iter().zip(places) {
                if let Some(sum) = sums.get_mut((place.max(0.0) as usize).min(PARTS - 1)) {
                    *sum = sum.plus(&here);
                }
            }
        }
        let none = TurnEquations::default();
        let all = stripes.iter().fold(none, |sum, part| sum.plus(part));
        let (turn, tilt) = all.solve(all.right)?;
        let scatter = |parts: &[TurnEquations]| -> f64 {
            let used = parts.iter().filter(|part| part.matrix[2] > 0.0).count() as f64;
            let squares = parts.iter().map(|part| {
                let left = part.left_over(turn, tilt);
                all.solve(left).map_or(0.0, |(turn, _)| turn * turn)
            });
            (squares.sum::<f64>() * used / (used - 1.0).max(1.0)).sqrt()
        };
        Some((turn.atan(), scatter(&stripes).max(scatter(&bands))))
    }
}

/// Normal equations of the turn `d` and the tilt `t`: height left over `= -d slope lever + t lever`.
#[derive(Debug, Clone, Copy, Default)]
struct TurnEquations {
    /// Turn with turn, turn with tilt, tilt with tilt.
    matrix: [f64; 3],
    right: [f64; 2],
}

impl TurnEquations {
    fn of_point(slope: f64, lever: f64, left: f64) -> Self {
        let (by_turn, by_tilt) = (-slope * lever, lever);
        Self {
            matrix: [by_turn * by_turn, by_turn * by_tilt, by_tilt * by_tilt],
            right: [by_turn * left, by_tilt * left],
        }
    }

    fn plus(&self, other: &Self) -> Self {
        Self {
            matrix: [0, 1, 2].map(|k| self.matrix[k] + other.matrix[k]),
            right: [0, 1].map(|k| self.right[k] + other.right[k]),
        }
    }

    /// Turn and tilt for a right side; `None` where the slopes do not tell them apart.
    fn solve(&self, right: [f64; 2]) -> Option<(f64, f64)> {
        let [a, b, d] = self.matrix;
        let determinant = a * d - b * b;
        let solved = (
            (right[0] * d - right[1] * b) / determinant,
            (right[1] * a - right[0] * b) / determinant,
        );
        let clear = determinant > 1e-9 * a * d;
        (clear && solved.0.is_finite() && solved.1.is_finite()).then_some(solved)
    }

    /// What a solution leaves of the right side.
    fn left_over(&self, turn: f64, tilt: f64) -> [f64; 2] {
        let [a, b, d] = self.matrix;
        [
            self.right[0] - a * turn - b * tilt,
            self.right[1] - b * turn - d * tilt,
        ]
    }
}

/// Normal equations of knots that couple with their neighbours.
struct Equations {
    diagonal: Vec<f64>,
    beside: Vec<f64>,
    right: Vec<f64>,
}

impl Equations {
    fn new(knots: usize) -> Self {
        Self {
            diagonal: vec![0.0; knots],
            beside: vec![0.0; knots],
            right: vec![0.0; knots],
        }
    }

    /// Adds a height at a part of a piece.
    fn add(&mut self, piece: usize, part: f64, height: f64) {
        let rest = 1.0 - part;
        if let (Some([d0, d1]), Some([r0, r1]), Some(beside)) = (
            self.diagonal.get_mut(piece..).and_then(first_two),
            self.right.get_mut(piece..).and_then(first_two),
            self.beside.get_mut(piece),
        ) {
            *d0 += rest * rest;
            *d1 += part * part;
            *r0 += rest * height;
            *r1 += part * height;
            *beside += rest * part;
        }
    }

    /// Values at the knots, the sum of squares they explain, and the number of knots with points.
    fn solve(mut self) -> (Vec<f64>, f64, usize) {
        let largest = self.diagonal.iter().copied().fold(0.0, f64::max);
        // Keeps knots without points at zero and the others where they are.
        let ridge = 1e-9 * largest + f64::MIN_POSITIVE;
        let knots = self.diagonal.iter().filter(|d| **d > 1e-3).count();
        let right = self.right.clone();
        let count = self.diagonal.len();
        let mut before = (0.0, 1.0, 0.0);
        for k in 0..count {
            let (beside, diagonal, value) = before;
            let factor = beside / diagonal;
            let here = self.diagonal[k] + ridge - factor * beside;
            self.diagonal[k] = here;
            self.right[k] -= factor * value;
            before = (self.beside[k], here, self.right[k]);
        }
        let mut after = 0.0;
        for k in (0..count).rev() {
            after = (self.right[k] - self.beside[k] * after) / self.diagonal[k];
            self.right[k] = after;
        }
        let explained = self.right.iter().zip(&right).map(|(v, r)| v * r).sum();
        (self.right, explained, knots)
    }
}

fn first_two(slice: &mut [f64]) -> Option<&mut [f64; 2]> {
    slice.first_chunk_mut()
}
