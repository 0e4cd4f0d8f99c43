//! What is left of the pieces of a film's surface once everything under film or in the solid is off.

use std::ops::ControlFlow;

use rayon::iter::{IntoParallelRefIterator, ParallelIterator};

use super::super::outline::Point;
use super::super::segment_tree::{Bounds, SegmentTree};
use super::curve::{Cover, Curve, Open, around, dot, left_of, minus};
use super::pieces::{Piece, Surface};
use super::walls::{ROUNDING, Walls};

/// Most walls tried one by one before all that are near.
const MIDDLES: usize = 64;

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
        if self.boxes.is_none() {
            self.cover_from_middles(piece, &mut open);
        }
        for stretch in open.stretches.clone() {
            self.cover(piece, stretch, &mut open);
        }
        if self.boxes.is_some() && !piece.is_wall && !open.is_closed() {
            self.cut_off_solid(&curve, &mut open);
        }
        let parts = open.stretches.iter();
        parts.map(|&stretch| Part { curve, stretch }).collect()
    }

    /// Takes away what is under the film of the wall nearest to the middle of each open stretch, until the
    /// middles are clear: for most pieces that is all.
    fn cover_from_middles(&self, piece: &Piece, open: &mut Open) {
        let mut clear = 0;
        for _ in 0..MIDDLES {
            let Some(&[from, to]) = open.stretches.get(clear) else {
                return;
            };
            let middle = piece.curve.at(f64::midpoint(from, to));
            let half = 0.5 * (to - from);
            // A wall so near that it covers the whole stretch ends the search for the nearest.
            let enough = self.reach - half - ROUNDING;
            let nearest = self
                .walls
                .tree
                .nearest_or_within(middle, enough, &mut 0)
                .filter(|wall| wall.distance < self.reach - ROUNDING);
            match nearest {
                Some(wall) if !piece.own.contains(&wall.edge) => {
                    open.cover(&piece.curve, &self.surface.covers[wall.edge]);
                }
                _ => clear += 1,
            }
        }
    }

    /// Takes away what any region covers of one stretch.
    fn cover(&self, piece: &Piece, stretch: [f64; 2], open: &mut Open) {
        let (tree, reach) = match &self.boxes {
            Some(boxes) => (boxes, 0.0),
            None => (&self.walls.tree, self.reach),
        };
        let near = Near::new(&piece.curve, stretch, reach);
        let flow = tree.visit_where(&|bounds| near.meets(bounds), &mut |index| {
            let cover = &self.surface.covers[index];
            if !piece.own.contains(&index) && !cover.misses(&piece.curve, stretch) {
                open.cover(&piece.curve, cover);
            }
            if open.is_closed() {
                ControlFlow::Break(())
            } else {
                ControlFlow::Continue(())
            }
        });
        debug_assert!(flow.is_continue() || open.is_closed());
    }

    /// Takes away what lies in the solid, by the crossings with all walls.
    fn cut_off_solid(&self, curve: &Curve, open: &mut Open) {
        let near = Near::new(curve, [0.0, curve.length()], ROUNDING);
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
    fn new(curve: &Curve, [from, to]: [f64; 2], reach: f64) -> Self {
        let reach = reach + ROUNDING;
        let half = 0.5 * (to - from);
        let middle = curve.at(f64::midpoint(from, to));
        let (normal, thick, bounds) = match *curve {
            Curve::Line { direction, .. } => {
                let bounds = Bounds::of(curve.at(from), curve.at(to));
                (left_of(direction), 0.0, bounds)
            }
            Curve::Arc { centre, radius, .. } => {
                let out = minus(middle, centre).map(|c| c / radius);
                // A round stretch is at most its sagitta away from its tangent.
                (out, 0.5 * half * half / radius, around(middle, half))
            }
        };
        Self {
            bounds: Bounds {
                low: bounds.low.map(|c| c - reach),
                high: bounds.high.map(|c| c + reach),
            },
            middle,
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
