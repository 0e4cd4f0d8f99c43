//! The walls of an outline as one flat list of edges, and exact questions about pairs of them.
//!
//! Orientation is Shewchuk's adaptive predicate (crate `robust`), so "left of", "on" and "right of" are
//! decided without rounding. Coordinates may be multiplied by a power of two, which is exact, to keep
//! the predicate clear of overflow and underflow.
//!
//! Source: Shewchuk (1997), Adaptive precision floating-point arithmetic and fast robust geometric
//! predicates, Discrete & Computational Geometry 18, 305-363 (cited from memory).

use super::outline::{Loop, Point};
use std::cmp::Ordering;
use std::ops::Range;

/// Edges of many loops; edge `i` runs from `start[i]` to the start of [`WallEdges::next`].
#[derive(Debug, Default)]
pub(crate) struct WallEdges {
    /// Start point of each edge.
    pub(crate) start: Vec<Point>,
    /// Loop of each edge.
    pub(crate) loop_of: Vec<u32>,
    /// Index of the start vertex in its loop as given.
    pub(crate) vertex: Vec<u32>,
    /// Edges of each loop; empty for a loop that was left out.
    pub(crate) ranges: Vec<Range<usize>>,
}

/// How two edges that are not neighbours in one loop meet; an end belongs to the edge it starts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Contact {
    /// They do not meet, or only where the next edge of one of them starts.
    None,
    /// They cross in the inside of both, here.
    Crossing(Point),
    /// They lie on one line and share a stretch that begins here.
    Overlap(Point),
    /// Both start at the same point.
    SharedStart,
    /// The first edge starts on the inside of the second.
    FirstOnSecond,
    /// The second edge starts on the inside of the first.
    SecondOnFirst,
}

impl WallEdges {
    /// Appends a loop without its zero-length edges and past its vertices that are not finite, every
    /// coordinate times `factor`.
    pub(crate) fn push_loop(&mut self, wall: &Loop, factor: f64) {
        let first = self.start.len();
        let loop_index = self.ranges.len() as u32;
        let vertices = || {
            let points = wall.points.iter().enumerate();
            points.filter(|(_, p)| p.iter().all(|c| c.is_finite()))
        };
        for ((index, &a), (_, &b)) in vertices().zip(vertices().cycle().skip(1)) {
            if order(a, b) != Ordering::Equal {
                // Adding zero turns a negative zero into the positive one.
                self.start.push([a[0] * factor + 0.0, a[1] * factor + 0.0]);
                self.vertex.push(index as u32);
                self.loop_of.push(loop_index);
            }
        }
        self.ranges.push(first..self.start.len());
    }

    /// Appends a loop without edges, so that loop indices stay those of the outline.
    pub(crate) fn push_left_out(&mut self) {
        let end = self.start.len();
        self.ranges.push(end..end);
    }

    /// Number of edges.
    pub(crate) fn len(&self) -> usize {
        self.start.len()
    }

    /// The edge after edge `i` in its loop.
    pub(crate) fn next(&self, i: usize) -> usize {
        let range = &self.ranges[self.loop_of[i] as usize];
        if i + 1 == range.end {
            range.start
        } else {
            i + 1
        }
    }

    /// The edge before edge `i` in its loop.
    pub(crate) fn previous(&self, i: usize) -> usize {
        let range = &self.ranges[self.loop_of[i] as usize];
        if i == range.start {
            range.end - 1
        } else {
            i - 1
        }
    }

    /// Both end points of edge `i`.
    pub(crate) fn ends(&self, i: usize) -> [Point; 2] {
        [self.start[i], self.start[self.next(i)]]
    }

    /// All edges as pairs of points.
    pub(crate) fn segments(&self) -> Vec<[Point; 2]> {
        (0..self.len()).map(|i| self.ends(i)).collect()
    }

    /// Whether the two edges follow each other in one loop, or are the same.
    pub(crate) fn are_neighbours(&self, e: usize, f: usize) -> bool {
        e == f || self.next(e) == f || self.next(f) == e
    }

    /// Whether the wall doubles back over itself at the start of edge `i`, within [`rounding`].
    pub(crate) fn is_spike(&self, i: usize) -> bool {
        let (u, [v, w]) = (self.start[self.previous(i)], self.ends(i));
        let (a, b) = ([u[0] - v[0], u[1] - v[1]], [w[0] - v[0], w[1] - v[1]]);
        if a[0] * b[0] + a[1] * b[1] <= 0.0 {
            return false;
        }
        let longer = a[0].hypot(a[1]).max(b[0].hypot(b[1]));
        let off_line = (a[0] * b[1] - a[1] * b[0]).abs() / longer;
        off_line <= rounding(&[u, v, w]) || orientation(u, v, w) == Ordering::Equal
    }

    /// Whether two edges that are not neighbours have any point in common.
    pub(crate) fn touch(&self, e: usize, f: usize) -> bool {
        let ([a, b], [c, d]) = (self.ends(e), self.ends(f));
        if a[1].max(b[1]) < c[1].min(d[1])
            || c[1].max(d[1]) < a[1].min(b[1])
            || a[0].max(b[0]) < c[0].min(d[0])
            || c[0].max(d[0]) < a[0].min(b[0])
            || self.are_neighbours(e, f)
        {
            return false;
        }
        // The boxes meet; then the edges meet exactly when neither lies on one side of the other.
        let first = separates(orientation(a, b, c), orientation(a, b, d));
        first && separates(orientation(c, d, a), orientation(c, d, b))
    }

    /// How two edges that are not neighbours meet.
    pub(crate) fn contact(&self, e: usize, f: usize) -> Contact {
        if !self.touch(e, f) {
            return Contact::None;
        }
        let ([a, b], [c, d]) = (self.ends(e), self.ends(f));
        let (side_a, side_b) = (orientation(c, d, a), orientation(c, d, b));
        let (side_c, side_d) = (orientation(a, b, c), orientation(a, b, d));
        if side_a == Ordering::Equal && side_b == Ordering::Equal {
            let low = later(earlier(a, b), earlier(c, d));
            if order(low, earlier(later(a, b), later(c, d))) == Ordering::Less {
                return Contact::Overlap(low);
            }
        }
        if order(a, c) == Ordering::Equal {
            Contact::SharedStart
        } else if side_a == Ordering::Equal && is_between(a, c, d) {
            Contact::FirstOnSecond
        } else if side_c == Ordering::Equal && is_between(c, a, b) {
            Contact::SecondOnFirst
        } else if [side_a, side_b, side_c, side_d].contains(&Ordering::Equal) {
            Contact::None
        } else {
            Contact::Crossing(crossing_point([a, b], [c, d]))
        }
    }

    /// Whether the two edges lie on one line and share a stretch.
    pub(crate) fn overlap(&self, e: usize, f: usize) -> bool {
        matches!(self.contact(e, f), Contact::Overlap(_))
    }
}

/// Lexicographic order of finite points: by `x`, then by `y`.
pub(crate) fn order(a: Point, b: Point) -> Ordering {
    a.partial_cmp(&b).unwrap_or(Ordering::Less)
}

/// `Greater` when `c` lies left of the line from `a` to `b`, `Less` right of it, `Equal` on it; exact.
pub(crate) fn orientation(a: Point, b: Point, c: Point) -> Ordering {
    let coordinate = |p: Point| robust::Coord { x: p[0], y: p[1] };
    robust::orient2d(coordinate(a), coordinate(b), coordinate(c))
        .partial_cmp(&0.0)
        .unwrap_or(Ordering::Equal)
}

/// How far rounded coordinates may leave points off the line they were meant to lie on: 8 rounding
/// steps of the largest coordinate.
pub(crate) fn rounding(points: &[Point]) -> f64 {
    let largest = points.iter().flatten().fold(0.0_f64, |m, c| m.max(c.abs()));
    8.0 * f64::EPSILON * largest
}

/// The power of two that brings the largest of the magnitudes into `[1, 4)`; 1 for zero.
pub(crate) fn unit_scale(largest: f64) -> f64 {
    if largest > 0.0 && largest.is_finite() {
        let exponent = (largest.to_bits() >> 52) & 0x7ff;
        f64::from_bits(2046_u64.saturating_sub(exponent).clamp(1, 2045) << 52)
    } else {
        1.0
    }
}

/// Where two crossing segments cross, to rounding.
fn crossing_point([a, b]: [Point; 2], [c, d]: [Point; 2]) -> Point {
    let (r, s) = ([b[0] - a[0], b[1] - a[1]], [d[0] - c[0], d[1] - c[1]]);
    let denominator = r[0] * s[1] - r[1] * s[0];
    let t = ((c[0] - a[0]) * s[1] - (c[1] - a[1]) * s[0]) / denominator;
    let t = if t.is_finite() {
        t.clamp(0.0, 1.0)
    } else {
        0.5
    };
    [a[0] + t * r[0], a[1] + t * r[1]]
}

fn separates(first: Ordering, second: Ordering) -> bool {
    first != second || first == Ordering::Equal
}

/// Whether a point of the line through `a` and `b` lies between them.
pub(crate) fn is_between(p: Point, a: Point, b: Point) -> bool {
    order(earlier(a, b), p) == Ordering::Less && order(p, later(a, b)) == Ordering::Less
}

fn earlier(a: Point, b: Point) -> Point {
    if order(b, a) == Ordering::Less { b } else { a }
}

fn later(a: Point, b: Point) -> Point {
    if order(b, a) == Ordering::Less { a } else { b }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_scale_is_an_exact_power_of_two() {
        for largest in [1.0, 1.5, 3e-6, 7e200, 1e-300, f64::MAX, f64::MIN_POSITIVE] {
            let scaled = largest * unit_scale(largest);
            assert!((1.0..4.0).contains(&scaled), "{largest} gave {scaled}");
        }
    }

    #[test]
    fn a_vertex_one_rounding_step_off_an_edge_does_not_touch_it() {
        let mut edges = WallEdges::default();
        let above = 0.3_f64.next_up();
        edges.push_loop(&Loop::new(vec![[0.1, 0.1], [0.7, 0.7], [0.7, 0.0]]), 1.0);
        edges.push_loop(&Loop::new(vec![[0.3, above], [0.3, 0.9], [0.2, 0.9]]), 1.0);
        edges.push_loop(&Loop::new(vec![[0.3, 0.3], [0.3, 0.9], [0.2, 0.9]]), 1.0);
        assert_eq!(edges.contact(3, 0), Contact::None);
        assert_eq!(edges.contact(6, 0), Contact::FirstOnSecond);
        assert_eq!(edges.contact(0, 6), Contact::SecondOnFirst);
    }
}
