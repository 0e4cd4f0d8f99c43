//! Wall shear per pressure gradient, wall by wall: mean, extremes and percentiles.
//!
//! A wall is a stretch with a name of its own, or all stretches left over that face one way: `lid` where the
//! normal out of the fluid points up within 45 degrees (the lid and the floor take the limit itself),
//! `floor` down, `left` and `right`, islands included. Percentiles are by length: the shear that `p` per
//! cent of the wall's length does not exceed. Beside a singular corner the mean over a stated length
//! stands for the shear, so that no number depends on the grid's closeness to the corner.

use crate::geometry::{DIRECTION_NAMES, Outline, Point, WallStretch};

use super::many::map_many;
use super::wall_curve::{LoopCurve, PointKind, WallCurve};
use super::wall_path::taken_round;

/// Percentiles that are worked out, per cent of the wall's length.
pub const PERCENTILES: [f64; 5] = [5.0, 25.0, 50.0, 75.0, 95.0];
/// Name of all walls together.
pub const WHOLE_WALL: &str = "whole wall";

/// The wall shear of a section, wall by wall.
#[derive(Debug, Clone, PartialEq)]
pub struct WallReport {
    /// All walls together.
    pub whole: WallStatistics,
    /// Every wall: the named ones in their order, then the directions that occur.
    pub walls: Vec<WallStatistics>,
    /// The stretches that make up the walls, in order along each loop.
    pub parts: Vec<WallPart>,
    /// Both sides of every singular corner.
    pub singular_corners: Vec<SingularCorner>,
}

/// Wall shear of one wall; everything but names and counts is per pressure gradient, m.
#[derive(Debug, Clone, PartialEq)]
pub struct WallStatistics {
    /// Name or direction.
    pub name: String,
    /// Length, m.
    pub length: f64,
    /// Mean over the length.
    pub mean: f64,
    /// Smallest value.
    pub min: f64,
    /// Largest value; nearer to a singular corner than the stated length, the mean over it.
    pub max: f64,
    /// Where the largest value is, m.
    pub max_at: Point,
    /// The [`PERCENTILES`].
    pub percentiles: [f64; 5],
    /// Sides of singular corners that belong to this wall.
    pub singular_sides: usize,
}

/// A stretch of one loop that belongs to one wall.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct WallPart {
    /// Index of the loop.
    pub loop_index: usize,
    /// Arc length at which it begins, m.
    pub from: f64,
    /// Arc length at which it ends, m; at most the length of the loop.
    pub to: f64,
    /// Index into [`WallReport::walls`].
    pub wall: usize,
}

/// A re-entrant corner with the mean shear beside it, per pressure gradient, m.
#[derive(Debug, Clone, PartialEq)]
pub struct SingularCorner {
    /// Where, m.
    pub at: Point,
    /// Index of the loop.
    pub loop_index: usize,
    /// Arc length from the first vertex of the loop, m.
    pub arc_length: f64,
    /// Mean over the stated length before the corner and after it, with the fluid on the left.
    pub means: [f64; 2],
    /// Index into [`WallReport::walls`] of either side.
    pub walls: [usize; 2],
}

impl WallReport {
    /// The walls of a section.
    ///
    /// - `outline`: as it was solved; `named`: stretches of it with names
    pub fn new(outline: &Outline, curve: &WallCurve, named: &[WallStretch]) -> Self {
        let (mut parts, names) = parts(outline, curve, named);
        // Only the directions that occur.
        let mut used: Vec<bool> = vec![false; names.len()];
        for part in &parts {
            used[part.wall] = true;
        }
        let kept: Vec<usize> = (0..names.len()).filter(|&k| used[k]).collect();
        for part in &mut parts {
            part.wall = kept.partition_point(|&k| k < part.wall);
        }
        let measured = measured_parts(curve, &parts);
        let mut report = Self {
            whole: statistics(WHOLE_WALL, measured.iter()),
            walls: kept
                .iter()
                .enumerate()
                .map(|(wall, &k)| {
                    let own = measured.iter().filter(move |part| part.wall == wall);
                    statistics(&names[k], own)
                })
                .collect(),
            parts,
            singular_corners: Vec::new(),
        };
        report.add_singular_corners(curve);
        report
    }

    /// Index of the wall at a place; `None` off the loops.
    pub fn wall_at(&self, loop_index: usize, arc_length: f64) -> Option<usize> {
        let after = self
            .parts
            .partition_point(|part| (part.loop_index, part.from) <= (loop_index, arc_length));
        let part = self.parts.get(after.checked_sub(1)?)?;
        (part.loop_index == loop_index).then_some(part.wall)
    }

    /// Takes both sides of the singular corners into the largest values.
    fn add_singular_corners(&mut self, curve: &WallCurve) {
        for (loop_index, along) in curve.loops.iter().enumerate() {
            let total = along.length();
            for (arc_length, at, means) in singular_corners(along) {
                let nudge = 1e-9 * total;
                let sides = [arc_length - nudge, arc_length + nudge];
                let walls =
                    sides.map(|s| self.wall_at(loop_index, taken_round(s, total)).unwrap_or(0));
                for (mean, wall) in means.into_iter().zip(walls) {
                    for statistics in self
                        .walls
                        .get_mut(wall)
                        .into_iter()
                        .chain([&mut self.whole])
                    {
                        statistics.singular_sides += 1;
                        if mean > statistics.max {
                            statistics.max = mean;
                            statistics.max_at = at;
                        }
                    }
                }
                self.singular_corners.push(SingularCorner {
                    at,
                    loop_index,
                    arc_length,
                    means,
                    walls,
                });
            }
        }
    }
}

/// Arc length, place and both means of the singular corners of a loop.
fn singular_corners(along: &LoopCurve) -> Vec<(f64, Point, [f64; 2])> {
    let total = along.length();
    let sides: Vec<_> = along
        .points
        .iter()
        .filter(|point| point.kind == PointKind::SingularCorner)
        .collect();
    let mut found: Vec<(f64, Point, [f64; 2])> = sides
        .chunk_by(|a, b| a.arc_length.total_cmp(&b.arc_length).is_eq())
        .filter_map(|pair| match pair {
            [before, after] => {
                let means = [before.shear_per_gradient, after.shear_per_gradient];
                Some((before.arc_length, before.at, means))
            }
            _ => None,
        })
        .collect();
    // A corner on the first vertex has its sides at both ends of the list.
    if let (Some(first), Some(last)) = (sides.first(), sides.last())
        && first.arc_length <= 0.0
        && last.arc_length >= total
    {
        let means = [last.shear_per_gradient, first.shear_per_gradient];
        found.insert(0, (0.0, first.at, means));
    }
    found
}

/// The stretches of all loops with their walls, and the names of the walls: the named ones, then all
/// directions.
fn parts(
    outline: &Outline,
    curve: &WallCurve,
    named: &[WallStretch],
) -> (Vec<WallPart>, Vec<String>) {
    let names = named
        .iter()
        .map(|stretch| stretch.name.clone())
        .chain(DIRECTION_NAMES.map(str::to_owned))
        .collect();
    let mut parts: Vec<WallPart> = Vec::new();
    for (loop_index, along) in curve.loops.iter().enumerate().take(outline.loops().count()) {
        let total = along.length();
        let own: Vec<(f64, f64, usize)> = named
            .iter()
            .enumerate()
            .filter(|(_, stretch)| stretch.loop_index == loop_index)
            .flat_map(|(k, s)| [(s.from, s.to, k), (s.from - total, s.to - total, k)])
            .collect();
        let mut breaks: Vec<f64> = own.iter().flat_map(|s| [s.0, s.1]).collect();
        breaks.retain(|b| (0.0..=total).contains(b));
        breaks.extend(along.path.vertices());
        breaks.sort_by(f64::total_cmp);
        breaks.dedup_by(|a, b| *a - *b <= 1e-12 * total);
        for pair in breaks.windows(2) {
            let (from, to) = (pair[0], pair[1]);
            let middle = 0.5 * (from + to);
            let wall = own
                .iter()
                .find(|(low, high, _)| (*low..*high).contains(&middle))
                .map_or_else(|| named.len() + direction(along, middle), |s| s.2);
            match parts.last_mut() {
                Some(last) if last.loop_index == loop_index && last.wall == wall => last.to = to,
                _ => parts.push(WallPart {
                    loop_index,
                    from,
                    to,
                    wall,
                }),
            }
        }
    }
    (parts, names)
}

/// Index into [`DIRECTION_NAMES`] of the way the wall faces.
fn direction(along: &LoopCurve, arc_length: f64) -> usize {
    let path = &along.path;
    let edge = path.edge_at(arc_length);
    let length = path.vertices()[edge + 1] - path.vertices()[edge];
    // Edges below the spacing may zigzag, as those of a digitised wall do.
    let normal = if length >= along.spacing {
        path.edge_normal(edge)
    } else {
        let half = 0.5 * along.spacing;
        path.chord_normal(arc_length - half, arc_length + half)
    };
    // The lid and the floor keep a wall at 45 degrees in spite of rounding.
    if normal[1].abs() >= normal[0].abs() - 1e-9 {
        usize::from(normal[1] < 0.0)
    } else {
        2 + usize::from(normal[0] > 0.0)
    }
}

/// What one part says.
struct Measured {
    wall: usize,
    length: f64,
    /// Integral of the shear.
    integral: f64,
    min: f64,
    max: f64,
    max_at: Point,
    /// Shear and length of its pieces.
    pieces: Vec<(f64, f64)>,
}

/// Every part in turn.
fn measured_parts(curve: &WallCurve, parts: &[WallPart]) -> Vec<Measured> {
    let singular: Vec<Vec<f64>> = curve.loops.iter().map(LoopCurve::singular_places).collect();
    let measured = map_many(parts, |part| {
        let along = curve.loops.get(part.loop_index)?;
        let singular = singular.get(part.loop_index)?;
        Some(measure(along, part, singular, curve.singular_length))
    });
    measured.into_iter().flatten().collect()
}

/// Statistics over some parts.
fn statistics<'a>(name: &str, parts: impl Iterator<Item = &'a Measured>) -> WallStatistics {
    let mut found = WallStatistics {
        name: name.to_owned(),
        length: 0.0,
        mean: 0.0,
        min: f64::INFINITY,
        max: f64::NEG_INFINITY,
        max_at: [0.0; 2],
        percentiles: [0.0; 5],
        singular_sides: 0,
    };
    let mut pieces: Vec<(f64, f64)> = Vec::new();
    let mut integral = 0.0;
    for part in parts {
        integral += part.integral;
        found.length += part.length;
        found.min = found.min.min(part.min);
        if part.max > found.max {
            (found.max, found.max_at) = (part.max, part.max_at);
        }
        pieces.extend_from_slice(&part.pieces);
    }
    found.mean = integral / found.length;
    pieces.sort_by(|a, b| a.0.total_cmp(&b.0));
    found.percentiles = PERCENTILES.map(|p| percentile(&pieces, 0.01 * p * found.length));
    found
}

/// Integral, extremes and pieces of one part.
///
/// - `singular`: arc lengths of the singular corners of its loop, sorted, m
fn measure(along: &LoopCurve, part: &WallPart, singular: &[f64], singular_length: f64) -> Measured {
    let mut found = Measured {
        wall: part.wall,
        length: part.to - part.from,
        integral: along.integral(part.from, part.to),
        min: f64::INFINITY,
        max: f64::NEG_INFINITY,
        max_at: [0.0; 2],
        pieces: Vec::new(),
    };
    let total = along.length();
    let first = along.points.partition_point(|p| p.arc_length <= part.from);
    let end = along.points.partition_point(|p| p.arc_length < part.to);
    let inner = along.points.get(first..end).unwrap_or(&[]);
    let places: Vec<f64> = std::iter::once(part.from)
        .chain(inner.iter().map(|point| point.arc_length))
        .chain([part.to])
        .collect();
    // A little inside, so that the value at a corner is that of this side.
    let nudge = 1e-9 * (part.to - part.from);
    for &place in &places {
        let inside = place.clamp(part.from + nudge, part.to - nudge);
        let value = if along.is_convex_corner(place) {
            0.0
        } else {
            along.shear_at(inside)
        };
        found.min = found.min.min(value);
        let after = singular.partition_point(|&s| s < place);
        let next_to = [
            after.checked_sub(1),
            Some(after),
            Some(0),
            singular.len().checked_sub(1),
        ];
        let near = next_to
            .iter()
            .flatten()
            .filter_map(|&k| singular.get(k))
            .any(|corner| {
                let apart = taken_round(corner - place, total);
                apart.min(total - apart) < singular_length
            });
        if !near && value > found.max {
            found.max = value;
            found.max_at = along.path.position(place);
        }
    }
    for pair in places.windows(2) {
        let half = 0.5 * (pair[1] - pair[0]);
        if half > 0.0 {
            for place in [pair[0] + 0.5 * half, pair[0] + 1.5 * half] {
                found.pieces.push((along.shear_at(place), half));
            }
        }
    }
    found
}

/// The shear that a length of the wall does not exceed, linear between the middles of sorted pieces.
fn percentile(pieces: &[(f64, f64)], length: f64) -> f64 {
    let (mut before, mut last) = (0.0, None::<(f64, f64)>);
    for &(value, piece) in pieces {
        let middle = before + 0.5 * piece;
        if middle >= length {
            return last.map_or(value, |(middle_before, value_before)| {
                let share = (length - middle_before) / (middle - middle_before);
                value_before + share * (value - value_before)
            });
        }
        last = Some((middle, value));
        before += piece;
    }
    last.map_or(0.0, |(_, value)| value)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn percentiles_of_a_linear_shear_are_linear() {
        let pieces: Vec<(f64, f64)> = (0..100).map(|k| (f64::from(k) + 0.5, 0.02)).collect();
        for p in [5.0, 25.0, 50.0, 95.0] {
            let found = percentile(&pieces, 0.01 * p * 2.0);
            assert!((found - p).abs() < 1e-9, "{p}: {found}");
        }
        assert!((percentile(&[(3.0, 1.0)], 0.5) - 3.0).abs() < 1e-12);
        assert!(percentile(&[], 0.0).abs() < 1e-12);
    }
}
