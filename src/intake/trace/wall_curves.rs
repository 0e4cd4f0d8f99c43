//! The walls of a groove as curves: as read, as stated, and upright.
//!
//! Between its touched ends a flank that shows the tip may lie anywhere below what was read. The wall
//! farthest from that falls straight down from its upper end to the level of its lowest sample: this holds
//! for walls without undercut whose floor is nowhere deeper under the flank than where it was touched beside it.
//! With a stated wall angle it falls from its upper end at that angle to the same level, never above what
//! was read.
//!
//! A trace that was turned over (a mould master, a cast) was touched from inside the channel's wall: the flank of
//! the ridge may lie anywhere below what was read, and so the wall of the channel anywhere above. There
//! the upright wall rises from the end of the floor, which is the edge of the ridge's top, and makes the *smallest*
//! section; as read is the largest.

use super::flanks::Flank;
use super::grooves::{Edges, Heights};
use super::thinning;
use crate::geometry::Point;

/// A straight line over the section.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Line {
    pub(super) from: Point,
    pub(super) slope: f64,
}

impl Line {
    pub(super) fn at(&self, x: f64) -> f64 {
        self.from[1] + (x - self.from[0]) * self.slope
    }

    /// The line through both edges.
    pub(super) fn through(edges: &Edges) -> Self {
        Self {
            from: [edges.left.x, edges.left.z],
            slope: (edges.right.z - edges.left.z) / (edges.right.x - edges.left.x),
        }
    }
}

/// The walls of a groove, from left to right; nothing stands above the line through the edges.
#[derive(Debug, Clone, PartialEq)]
pub(super) struct WallCurves {
    pub(super) as_read: Vec<Point>,
    /// As read with the flanks that show the tip as stated.
    pub(super) stated: Vec<Point>,
    /// With these flanks upright from the end that was touched first; `None` where there is none.
    pub(super) upright: Option<Vec<Point>>,
    /// Samples inside.
    pub(super) samples: usize,
}

/// What is stated about walls and polygon.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) struct Stated {
    /// Angle of the walls against the level, rad.
    pub(super) walls: Option<f64>,
    /// Whether the trace was turned over.
    pub(super) is_inverted: bool,
    /// Tolerance of thinning, m.
    pub(super) tolerance: f64,
}

impl WallCurves {
    /// The curves of a groove with some flanks that show the tip.
    pub(super) fn new(
        heights: Heights<'_>,
        edges: &Edges,
        flanks: &[Flank],
        options: Stated,
    ) -> Self {
        let base = Line::through(edges);
        let inside = edges.inside.clone();
        let mut points = vec![[edges.left.x, edges.left.z]];
        points.extend(inside.clone().map(|i| [heights.x[i], heights.z[i]]));
        points.push([edges.right.x, edges.right.z]);
        let sample = |index: usize| inside.start + index - 1;
        let is_end = |index: usize| {
            flanks
                .iter()
                .any(|f| [f.from, f.to].contains(&sample(index)))
        };
        let kept = thinning::kept(&points, is_end, options.tolerance);
        let thinned: Vec<Point> = kept.into_iter().map(|i| points[i]).collect();
        let as_read = below(&thinned, base);
        let mut stated = Rebuilt::new(&as_read);
        let mut upright = Rebuilt::new(&as_read);
        for flank in flanks {
            let ends = [heights.x[flank.from], heights.x[flank.to]];
            let Some((first, last)) = between(&as_read, ends) else {
                continue;
            };
            let read = &as_read[first..=last];
            if let (Some(angle), false) = (options.walls, flank.is_bottomless) {
                let wall = if options.is_inverted {
                    turned_over(restored(&turned_over(read.to_vec()), angle))
                } else {
                    restored(read, angle)
                };
                stated.replace(first, last, wall);
            }
            let wall = if options.is_inverted {
                let inside = [read[0][0], read[read.len() - 1][0]];
                turned_over(straight_down(&turned_over(read.to_vec()), inside, base))
            } else {
                straight_down(read, ends, base)
            };
            upright.replace(first, last, wall);
        }
        let reached = !flanks.iter().any(|f| f.is_bottomless);
        Self {
            samples: inside.len(),
            stated: below(&stated.finish(), base),
            upright: reached.then(|| below(&upright.finish(), base)),
            as_read,
        }
    }
}

/// A curve in which stretches are replaced from left to right.
struct Rebuilt<'a> {
    old: &'a [Point],
    new: Vec<Point>,
    next: usize,
}

impl<'a> Rebuilt<'a> {
    fn new(old: &'a [Point]) -> Self {
        Self {
            old,
            new: Vec::with_capacity(old.len()),
            next: 0,
        }
    }

    fn replace(&mut self, first: usize, last: usize, points: Vec<Point>) {
        if first >= self.next {
            self.new.extend_from_slice(&self.old[self.next..first]);
            self.new.extend(points);
            self.next = last + 1;
        }
    }

    fn finish(mut self) -> Vec<Point> {
        self.new.extend(self.old.iter().skip(self.next));
        self.new.dedup();
        self.new
    }
}

/// First and last vertex between two positions; `None` for fewer than two.
fn between(points: &[Point], [from, to]: [f64; 2]) -> Option<(usize, usize)> {
    let first = points.partition_point(|p| p[0] < from);
    let end = points.partition_point(|p| p[0] <= to);
    (first + 1 < end).then(|| (first, end - 1))
}

/// The curve with what stands above the line cut off at the line.
fn below(points: &[Point], line: Line) -> Vec<Point> {
    let mut cut: Vec<Point> = Vec::with_capacity(points.len());
    for (index, &[x, z]) in points.iter().enumerate() {
        let above = z - line.at(x);
        if let Some(&[x0, z0]) = index.checked_sub(1).and_then(|i| points.get(i)) {
            let before = z0 - line.at(x0);
            if before * above < 0.0 {
                let at = x0 + before / (before - above) * (x - x0);
                if at > x0 && at < x {
                    cut.push([at, line.at(at)]);
                }
            }
        }
        cut.push([x, z.min(line.at(x))]);
    }
    cut
}

fn turned_over(mut points: Vec<Point>) -> Vec<Point> {
    for point in &mut points {
        point[1] = -point[1];
    }
    points
}

fn lowest(points: &[Point]) -> f64 {
    points.iter().fold(f64::INFINITY, |low, p| low.min(p[1]))
}

/// The farthest wall of a flank: from its upper end straight down to the level of its lowest vertex.
///
/// - `ends`: positions of the touched samples, which may lie beyond the edges, m
fn straight_down(read: &[Point], ends: [f64; 2], base: Line) -> Vec<Point> {
    let floor = lowest(read);
    let (Some(&first), Some(&last)) = (read.first(), read.last()) else {
        return Vec::new();
    };
    let outside = |x: f64| [x, base.at(x)];
    let begin = if ends[0] < first[0] {
        outside(ends[0])
    } else {
        first
    };
    let end = if ends[1] > last[0] {
        outside(ends[1])
    } else {
        last
    };
    vec![begin, [begin[0], floor], [end[0], floor], end]
}

/// A flank that falls from its upper end at an angle, to the level of its lowest vertex, never above what was
/// read.
fn restored(read: &[Point], angle: f64) -> Vec<Point> {
    let floor = lowest(read);
    let (Some(&first), Some(&last)) = (read.first(), read.last()) else {
        return Vec::new();
    };
    let falls = first[1] >= last[1];
    let top = if falls { first } else { last };
    if angle > std::f64::consts::FRAC_PI_2 - 1e-6 {
        return vec![first, [first[0], floor], [last[0], floor], last];
    }
    let slope = angle.tan();
    let wall = |x: f64| (top[1] - (x - top[0]).abs() * slope).max(floor);
    let reach = (top[1] - floor) / slope;
    let foot = if falls {
        top[0] + reach
    } else {
        top[0] - reach
    };
    let mut places: Vec<Point> = Vec::with_capacity(read.len() + 1);
    for &[x, z] in read {
        if let Some(&[x0, z0]) = places.last()
            && x0 < foot
            && foot < x
        {
            places.push([foot, z0 + (foot - x0) / (x - x0) * (z - z0)]);
        }
        places.push([x, z]);
    }
    let mut points: Vec<Point> = vec![first];
    for pair in places.windows(2) {
        let ([x0, z0], [x, z]) = (pair[0], pair[1]);
        let (before, after) = (z0 - wall(x0), z - wall(x));
        if before * after < 0.0 {
            let at = x0 + before / (before - after) * (x - x0);
            points.push([at, wall(at)]);
        }
        points.push([x, z.min(wall(x))]);
    }
    points.push(last);
    points.dedup();
    points
}
