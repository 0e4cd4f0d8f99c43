//! The walls under a film: directions, which stretches carry it, and which side of them is fluid.

use std::cmp::Ordering;

use super::super::outline::{Outline, Point};
use super::super::segment_tree::SegmentTree;
use super::super::wall_edges::{WallEdges, orientation, unit_scale};
use super::FilmOn;
use super::curve::{cross, dot, left_of, minus};

/// Rounding of a distance between scaled points, whose coordinates are below 4.
pub(super) const ROUNDING: f64 = 2e-14;
/// Cosine of 45 degrees, less a rounding reserve so that walls at 45 degrees carry the film.
const STEEPEST: f64 = std::f64::consts::FRAC_1_SQRT_2 * (1.0 - 1e-9);

/// The walls of an outline, scaled by a power of two so that the largest coordinate is 1 to 4.
pub(super) struct Walls {
    /// The fluid lies left of every edge.
    pub(super) edges: WallEdges,
    pub(super) direction: Vec<Point>,
    pub(super) length: Vec<f64>,
    /// Whether each edge carries the film.
    pub(super) coated: Vec<bool>,
    /// Lumen of each loop.
    pub(super) lumen_of: Vec<usize>,
    pub(super) tree: SegmentTree,
    /// Scaled coordinates are those of the outline times this.
    pub(super) scale: f64,
}

impl Walls {
    /// - `outline`: valid, outer loops anticlockwise, islands clockwise
    pub(super) fn new(outline: &Outline, on: FilmOn) -> Self {
        let coordinates = outline.loops().flat_map(|l| &l.points).flatten();
        let scale = unit_scale(coordinates.fold(0.0_f64, |m, c| m.max(c.abs())));
        let mut edges = WallEdges::default();
        let mut lumen_of = Vec::new();
        for (index, lumen) in outline.lumens.iter().enumerate() {
            for wall in std::iter::once(&lumen.outer).chain(&lumen.islands) {
                edges.push_loop(wall, scale);
                lumen_of.push(index);
            }
        }
        let (mut direction, mut length) = (Vec::new(), Vec::new());
        for i in 0..edges.len() {
            let [a, b] = edges.ends(i);
            let along = minus(b, a);
            let size = along[0].hypot(along[1]);
            direction.push([along[0] / size, along[1] / size]);
            length.push(size);
        }
        // The normal into the fluid points up on the floor and down on the lid.
        let coated = direction
            .iter()
            .map(|d| match on {
                FilmOn::All => true,
                FilmOn::Floor => d[0] >= STEEPEST,
                FilmOn::Lid => d[0] <= -STEEPEST,
            })
            .collect();
        let tree = SegmentTree::from_segments(edges.segments());
        Self {
            edges,
            direction,
            length,
            coated,
            lumen_of,
            tree,
            scale,
        }
    }

    pub(super) fn len(&self) -> usize {
        self.edges.len()
    }

    /// Unit normal of an edge into the fluid.
    pub(super) fn normal(&self, edge: usize) -> Point {
        left_of(self.direction[edge])
    }

    /// Turn of the wall at the start of an edge, rad, positive to the left, and exactly which way.
    pub(super) fn turn(&self, edge: usize) -> (f64, Ordering) {
        let before = self.edges.previous(edge);
        let (d, e) = (self.direction[before], self.direction[edge]);
        let [here, after] = self.edges.ends(edge);
        let side = orientation(self.edges.start[before], here, after);
        (cross(d, e).atan2(dot(d, e)), side)
    }

    /// Whether a point off the wall lies in the fluid.
    pub(super) fn is_fluid(&self, p: Point) -> bool {
        let Some(nearest) = self.tree.nearest(p) else {
            return false;
        };
        let vertex = if nearest.along <= 0.0 {
            nearest.edge
        } else if nearest.along >= 1.0 {
            self.edges.next(nearest.edge)
        } else {
            let [a, b] = self.edges.ends(nearest.edge);
            return orientation(a, b, p) == Ordering::Greater;
        };
        // Left of both edges, or of one where the solid is a wedge; also right for points that rounding
        // puts nearest to the vertex of a nearly straight wall.
        let before = self.edges.previous(vertex);
        let is_left = |edge: usize| {
            let [a, b] = self.edges.ends(edge);
            orientation(a, b, p) == Ordering::Greater
        };
        if self.turn(vertex).1 == Ordering::Greater {
            is_left(before) && is_left(vertex)
        } else {
            is_left(before) || is_left(vertex)
        }
    }
}
