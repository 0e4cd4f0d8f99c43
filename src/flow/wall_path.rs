//! A loop of the wall by its arc length.

use crate::geometry::{Loop, Point, distance};

/// A closed polygon with the arc length of every vertex.
#[derive(Debug, Clone, PartialEq)]
pub(crate) struct WallPath {
    points: Vec<Point>,
    /// Arc length of every vertex, and the whole length at the end; starts with zero.
    arc: Vec<f64>,
}

impl WallPath {
    pub(crate) fn new(wall: &Loop) -> Self {
        let mut arc = vec![0.0];
        let mut total = 0.0;
        for (a, b) in wall.edges() {
            total += distance(a, b);
            arc.push(total);
        }
        Self {
            points: wall.points.clone(),
            arc,
        }
    }

    /// Length of the loop, m.
    pub(crate) fn length(&self) -> f64 {
        self.arc.last().copied().unwrap_or(0.0)
    }

    /// Arc lengths of the vertices, m, and the length of the loop at the end.
    pub(crate) fn vertices(&self) -> &[f64] {
        &self.arc
    }

    /// Arc length of a place on an edge, m; `None` for an edge that the loop has not.
    pub(crate) fn on_edge(&self, edge: usize, at: Point) -> Option<f64> {
        let start = self.points.get(edge)?;
        Some(self.arc.get(edge)? + distance(*start, at))
    }

    /// Place on an edge at an arc length, m.
    pub(crate) fn on_edge_at(&self, edge: usize, arc_length: f64) -> Point {
        let (a, b) = self.edge(edge);
        let length = self.arc[edge + 1] - self.arc[edge];
        let share = (arc_length - self.arc[edge]) / length;
        [a[0] + share * (b[0] - a[0]), a[1] + share * (b[1] - a[1])]
    }

    /// The edge at an arc length between zero and the length.
    pub(crate) fn edge_at(&self, arc_length: f64) -> usize {
        let after = self.arc.partition_point(|&a| a <= arc_length);
        after
            .saturating_sub(1)
            .min(self.points.len().saturating_sub(1))
    }

    /// Ends of an edge.
    pub(crate) fn edge(&self, edge: usize) -> (Point, Point) {
        let n = self.points.len();
        (self.points[edge % n], self.points[(edge + 1) % n])
    }

    /// Unit normal of an edge, to the right of its direction: out of the fluid. Zero for an edge without
    /// length.
    pub(crate) fn edge_normal(&self, edge: usize) -> Point {
        let (a, b) = self.edge(edge);
        right_of(a, b).unwrap_or([0.0; 2])
    }

    /// Place at any arc length, which is taken round the loop.
    pub(crate) fn position(&self, arc_length: f64) -> Point {
        let s = taken_round(arc_length, self.length());
        let edge = self.edge_at(s);
        let (a, b) = self.edge(edge);
        let length = self.arc[edge + 1] - self.arc[edge];
        let t = if length > 0.0 {
            (s - self.arc[edge]) / length
        } else {
            0.0
        };
        [a[0] + t * (b[0] - a[0]), a[1] + t * (b[1] - a[1])]
    }

    /// Unit normal of the chord between two arc lengths, out of the fluid; that of the edge in the middle
    /// where the chord has no length.
    pub(crate) fn chord_normal(&self, low: f64, high: f64) -> Point {
        right_of(self.position(low), self.position(high)).unwrap_or_else(|| {
            let middle = taken_round(0.5 * (low + high), self.length());
            self.edge_normal(self.edge_at(middle))
        })
    }
}

/// Length of the way along a loop from one arc length forward to another, m; from a place to itself, once round.
///
/// - `total`: length of the loop, m
pub(super) fn way_forward(from: f64, to: f64, total: f64) -> f64 {
    let way = to - from;
    if way > 0.0 { way } else { way + total }
}

/// An arc length taken round a loop, from zero to its length, or an angle round a circle.
///
/// The remainder of a division takes hundreds of instructions, and nearly all arc lengths are there already.
pub(super) fn taken_round(arc_length: f64, total: f64) -> f64 {
    if (0.0..total).contains(&arc_length) {
        arc_length
    } else if -total < arc_length && arc_length < 0.0 {
        arc_length + total
    } else {
        arc_length.rem_euclid(total)
    }
}

/// Unit vector to the right of the way from `a` to `b`.
fn right_of(a: Point, b: Point) -> Option<Point> {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    let length = distance(a, b);
    (length > 0.0).then(|| [y / length, -x / length])
}
