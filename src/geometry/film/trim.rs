//! What is left of the pieces of a film's surface once everything under film or in the solid is off.

use std::ops::ControlFlow;

use rayon::iter::{IntoParallelRefIterator, ParallelIterator};

use super::super::outline::Point;
use super::super::segment_tree::{Bounds, SegmentTree};
use super::curve::{Cover, Curve, Open, dot, left_of, minus};
use super::pieces::{Piece, Surface};
use super::walls::{ROUNDING, Walls};

/// A stretch of a piece that is part of the new wall.
#[derive(Debug, Clone, Copy)]
pub(super) struct Part {
    pub(super) curve: Curve,
    /// From and to, arc length along the curve.
    pub(super) stretch: [f64; 2],
}

impl Part {
    pub(super) fn start(&self) -> Point {
        self.curve.at(self.stretch[0])
    }

    pub(super) fn end(&self) -> Point {
        self.curve.at(self.stretch[1])
    }

    /// Whether it is the whole piece.
    pub(super) fn is_whole(&self) -> bool {
        self.stretch[0] <= 0.0 && self.stretch[1] >= self.curve.length()
    }
}

/// The walls, where regions of film are found, and how far they reach from there.
pub(super) struct Trimmer<'a> {
    walls: &'a Walls,
    surface: &'a Surface,
    /// Own tree over the boxes of the regions; without it region `i` lies around edge `i`.
    boxes: Option<SegmentTree>,
    reach: f64,
}

impl<'a> Trimmer<'a> {
    /// - `is_everywhere`: whether all walls carry the film
    pub(super) fn new(
        walls: &'a Walls,
        surface: &'a Surface,
        reach: f64,
        is_everywhere: bool,
    ) -> Self {
        let boxes = (!is_everywhere).then(|| boxes_of(&surface.covers));
        Self {
            walls,
            surface,
            boxes,
            reach,
        }
    }

    /// The parts that make up the new wall, in the order of the pieces.
    pub(super) fn parts(&self) -> Vec<Part> {
        let of_pieces: Vec<Vec<Part>> = self
            .surface
            .pieces
            .par_iter()
            .map(|piece| self.parts_of(piece))
            .collect();
        of_pieces.into_iter().flatten().collect()
    }

    fn parts_of(&self, piece: &Piece) -> Vec<Part> {
        let curve = piece.curve;
        let mut open = Open::whole(&curve, ROUNDING);
        if self.is_buried(&curve) {
            return Vec::new();
        }
        self.cover(piece, &mut open);
        if self.boxes.is_some() && !piece.is_wall && !open.is_closed() {
            self.cut_off_solid(&curve, &mut open);
        }
        let parts = open.stretches.iter();
        parts.map(|&stretch| Part { curve, stretch }).collect()
    }

    /// Whether one wall is so near to the middle that the whole piece is under its film; a quick test.
    fn is_buried(&self, curve: &Curve) -> bool {
        let half = 0.5 * curve.length();
        let enough = self.reach - half - ROUNDING;
        if self.boxes.is_some() || enough <= 0.0 {
            return false;
        }
        let nearest = self
            .walls
            .tree
            .nearest_or_within(curve.at(half), enough, &mut 0);
        nearest.is_some_and(|wall| wall.distance < enough)
    }

    fn cover(&self, piece: &Piece, open: &mut Open) {
        let (tree, reach) = match &self.boxes {
            Some(boxes) => (boxes, 0.0),
            None => (&self.walls.tree, self.reach),
        };
        let near = Near::new(&piece.curve, reach);
        let flow = tree.visit_where(&|bounds| near.meets(bounds), &mut |index| {
            if !piece.own.contains(&index) {
                open.cover(&piece.curve, &self.surface.covers[index]);
            }
            if open.is_closed() {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            }
        });
        debug_assert!(flow.is_break() == open.is_closed());
    }

    /// Takes away what lies in the solid, by the crossings with all walls.
    fn cut_off_solid(&self, curve: &Curve, open: &mut Open) {
        let near = Near::new(curve, ROUNDING);
        let mut places = Vec::new();
        let flow = self
            .walls
            .tree
            .visit_where(&|bounds| near.meets(bounds), &mut |edge| {
                curve.meet_edge(self.walls.edges.ends(edge), ROUNDING, &mut places);
                ControlFlow::Continue(())
            });
        debug_assert!(flow.is_continue());
        open.take_away(&mut places, |s| !self.walls.is_fluid(curve.at(s)));
    }
}

/// A tree over the boxes of regions.
pub(super) fn boxes_of(covers: &[Cover]) -> SegmentTree {
    let diagonal = |b: Bounds| [b.low, b.high];
    SegmentTree::from_segments(covers.iter().map(|c| diagonal(c.bounds())).collect())
}

/// Whether a point lies deeper than `slack` in any of the regions.
pub(super) fn is_under(boxes: &SegmentTree, covers: &[Cover], p: Point, slack: f64) -> bool {
    let found = boxes.visit_box(&Bounds::of(p, p), &mut |index| {
        if covers[index].buries(p, slack) {
            ControlFlow::Break(())
        } else {
            ControlFlow::Continue(())
        }
    });
    found.is_break()
}

/// Which boxes may come within a distance of a piece.
struct Near {
    bounds: Bounds,
    middle: Point,
    normal: Point,
    /// Half the extent along the normal, and half the length, each with the distance.
    across: f64,
    around: f64,
}

impl Near {
    fn new(curve: &Curve, reach: f64) -> Self {
        let reach = reach + ROUNDING;
        let half = 0.5 * curve.length();
        let Bounds { low, high } = curve.bounds();
        let (normal, thick) = match curve {
            Curve::Line { direction, .. } => (left_of(*direction), 0.0),
            Curve::Arc { start, .. } => (*start, half),
        };
        Self {
            bounds: Bounds {
                low: [low[0] - reach, low[1] - reach],
                high: [high[0] + reach, high[1] + reach],
            },
            middle: curve.at(half),
            normal,
            across: thick + reach,
            around: half + reach,
        }
    }

    fn meets(&self, other: &Bounds) -> bool {
        if !self.bounds.meets(other) {
            return false;
        }
        let centre = [0, 1].map(|k| f64::midpoint(other.low[k], other.high[k]));
        let half = [0, 1].map(|k| 0.5 * (other.high[k] - other.low[k]));
        let off = dot(self.normal, minus(centre, self.middle)).abs();
        off <= self.across + half[0] * self.normal[0].abs() + half[1] * self.normal[1].abs()
            && other.distance_squared(self.middle) <= self.around * self.around
    }
}
