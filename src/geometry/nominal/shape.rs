//! A wall under construction, and the finished shape with its flat lid.

use crate::geometry::{Outline, Point};

/// Vertices nearer than this fraction of the section's smaller dimension are one vertex.
const MERGE_DISTANCE: f64 = 1e-12;

/// The outline of a kind, and whether its top is a flat lid.
#[derive(Debug, Clone)]
pub(super) struct Shape {
    /// Name of the kind.
    pub(super) kind: &'static str,
    /// The outline. With a flat lid, the one lumen's outer wall starts at the lid's left end, runs
    /// anticlockwise below and ends at the lid's right end, so that the closing edge is the lid, at `y = 0`.
    pub(super) outline: Outline,
    /// Whether the closing edge of the outer wall is a flat lid on top.
    pub(super) flat_lid: bool,
}

impl Shape {
    /// A shape under a flat lid from the open wall, left end to right end of the lid.
    pub(super) fn groove(kind: &'static str, wall: Wall) -> Self {
        Self {
            kind,
            outline: Outline::single(wall.points),
            flat_lid: true,
        }
    }

    /// A closed shape without a lid.
    pub(super) fn closed(kind: &'static str, wall: Wall) -> Self {
        Self {
            kind,
            outline: Outline::single(wall.closed()),
            flat_lid: false,
        }
    }

    /// The outer wall of the first lumen.
    pub(super) fn wall(&self) -> &[Point] {
        self.outline
            .lumens
            .first()
            .map_or(&[], |lumen| lumen.outer.points.as_slice())
    }

    /// Left and right end of the lid, `None` without a flat lid.
    pub(super) fn lid(&self) -> Option<(Point, Point)> {
        match self.wall() {
            [left, .., right] if self.flat_lid => Some((*left, *right)),
            _ => None,
        }
    }
}

/// A wall under construction. A vertex that falls onto the one before it takes its place.
#[derive(Debug, Clone)]
pub(super) struct Wall {
    points: Vec<Point>,
    smaller: f64,
}

impl Wall {
    /// A wall starting at a point; `smaller` is the section's smaller dimension, m.
    pub(super) fn from(start: Point, smaller: f64) -> Self {
        Self {
            points: vec![start],
            smaller,
        }
    }

    /// The section's smaller dimension as given at the start, m.
    pub(super) fn smaller(&self) -> f64 {
        self.smaller
    }

    /// A straight piece.
    pub(super) fn line_to(&mut self, end: Point) {
        if self.points.len() > 1 && self.points.last().is_some_and(|&p| self.is_same(p, end)) {
            self.points.pop();
        } else if self.points.first().is_some_and(|&p| self.is_same(p, end))
            && self.points.len() == 1
        {
            return;
        }
        self.points.push(end);
    }

    /// A curve given with both ends; only its inner vertices are taken, then the exact `end`.
    pub(super) fn curve_to(&mut self, curve: &[Point], end: Point) {
        if let [_, inner @ .., _] = curve {
            for &p in inner {
                self.line_to(p);
            }
        }
        self.line_to(end);
    }

    /// The vertices, without a last one that falls onto the first.
    pub(super) fn closed(mut self) -> Vec<Point> {
        while let [first, .., last] = self.points.as_slice() {
            if !self.is_same(*first, *last) {
                break;
            }
            self.points.pop();
        }
        self.points
    }

    /// The vertices as they are.
    pub(super) fn into_points(self) -> Vec<Point> {
        self.points
    }

    fn is_same(&self, a: Point, b: Point) -> bool {
        (a[0] - b[0]).hypot(a[1] - b[1]) <= MERGE_DISTANCE * self.smaller
    }
}
