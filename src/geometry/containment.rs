//! Whether one section lies in another, decided exactly.
//!
//! Walls may touch and share stretches: a common lid is the normal case. The open section `inner` lies in
//! `outer` exactly when
//! 1. no wall of `outer` runs through the fluid of `inner`, and
//! 2. each lumen of `inner` begins in the fluid of `outer`;
//!
//! for by 1 no lumen of `inner`, being connected, can be partly in and partly out. Without proper
//! crossings all contacts are at vertices, where the directions of the walls decide; between contacts a
//! wall cannot change sides. Every decision is an orientation of three given points (see `wall_edges`), so there
//! is no tolerance. Costs O(n log n) for walls that do not run along each other within the boxes of many edges.

use std::cmp::Ordering;
use std::fmt;
use std::ops::ControlFlow;

use super::outline::{Outline, Point};
use super::segment_tree::{Bounds, SegmentTree};
use super::validity::{Coordinates, Role};
use super::wall_edges::{Contact, WallEdges, is_between, order, orientation, unit_scale};

/// Why a section is not inside another.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Escape {
    /// What was seen.
    pub kind: EscapeKind,
    /// Where, m.
    pub at: Point,
    /// The wall of the section that should be inside.
    pub inner: Role,
    /// The wall of the section that should be around it; for [`EscapeKind::Outside`] the first one.
    pub outer: Role,
}

/// What was seen of a section that is not inside another.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum EscapeKind {
    /// The two walls cross.
    Crossing,
    /// The wall of the section around runs through the fluid of the one inside.
    WallInFluid,
    /// A lumen lies outside altogether.
    Outside,
}

impl fmt::Display for Escape {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let (inner, outer, at) = (self.inner, self.outer, Coordinates(self.at));
        match self.kind {
            EscapeKind::Crossing => write!(f, "its {inner} crosses the {outer} at {at}"),
            EscapeKind::WallInFluid => {
                write!(
                    f,
                    "the {outer} runs through the fluid of its {inner} at {at}"
                )
            }
            EscapeKind::Outside => write!(f, "its {inner} lies outside at {at}"),
        }
    }
}

impl Outline {
    /// Proves that this section lies inside another; shared walls are allowed.
    ///
    /// Both outlines must be valid (see [`Outline::problems`]). Exact: a vertex one rounding step outside is
    /// outside.
    ///
    /// # Errors
    /// An [`Escape`] with the place of a wall that is in the way.
    ///
    /// # Examples
    /// ```
    /// use etchwise::geometry::Outline;
    /// let wide = Outline::single(vec![[0.0, 0.0], [9.0, 0.0], [9.0, 4.0], [0.0, 4.0]]);
    /// let low = Outline::single(vec![[0.0, 0.0], [9.0, 0.0], [9.0, 3.0], [0.0, 3.0]]);
    /// assert!(low.proven_inside(&wide).is_ok());
    /// assert!(wide.proven_inside(&low).is_err());
    /// ```
    pub fn proven_inside(&self, around: &Self) -> Result<(), Escape> {
        let proof = Proof::new(&self.clone().oriented(), &around.clone().oriented());
        proof.no_wall_in_fluid()?;
        proof.every_lumen_begins_inside()
    }
}

/// Walls of both sections in one list, those of the inner one first.
struct Proof {
    edges: WallEdges,
    roles: Vec<Role>,
    /// Edges and loops of the inner section.
    inner_edges: usize,
    inner_loops: usize,
    inner: SegmentTree,
    outer: SegmentTree,
    scale: f64,
}

impl Proof {
    fn new(inner: &Outline, outer: &Outline) -> Self {
        let loops = inner.loops().chain(outer.loops());
        let coordinates = loops.flat_map(|l| &l.points).flatten();
        let scale = unit_scale(coordinates.fold(0.0_f64, |m, c| m.max(c.abs())));
        let mut edges = WallEdges::default();
        let mut roles = Vec::new();
        let mut push = |outline: &Outline, edges: &mut WallEdges| {
            for (lumen, walls) in outline.lumens.iter().enumerate() {
                edges.push_loop(&walls.outer, scale);
                roles.push(Role::Outer { lumen });
                for (island, wall) in walls.islands.iter().enumerate() {
                    edges.push_loop(wall, scale);
                    roles.push(Role::Island { lumen, island });
                }
            }
        };
        push(inner, &mut edges);
        let (inner_edges, inner_loops) = (edges.len(), edges.ranges.len());
        push(outer, &mut edges);
        let mut segments = edges.segments();
        let outer = SegmentTree::from_segments(segments.split_off(inner_edges));
        Self {
            inner: SegmentTree::from_segments(segments),
            outer,
            edges,
            roles,
            inner_edges,
            inner_loops,
            scale,
        }
    }

    fn escape(&self, kind: EscapeKind, at: Point, inner: usize, outer: usize) -> Escape {
        Escape {
            kind,
            at: at.map(|c| c / self.scale),
            inner: self.roles[self.edges.loop_of[inner] as usize],
            outer: self.roles[self.edges.loop_of[outer] as usize],
        }
    }

    /// Step 1.
    fn no_wall_in_fluid(&self) -> Result<(), Escape> {
        let mut touches = vec![false; self.edges.ranges.len()];
        for f in self.inner_edges..self.edges.len() {
            let [a, b] = self.edges.ends(f);
            let mut found = None;
            let flow = self.inner.visit_box(&Bounds::of(a, b), &mut |e| {
                if self.edges.touch(e, f) {
                    touches[self.edges.loop_of[f] as usize] = true;
                    found = self.wall_in_fluid(e, f);
                }
                if found.is_some() {
                    ControlFlow::Break(())
                } else {
                    ControlFlow::Continue(())
                }
            });
            if let (true, Some(escape)) = (flow.is_break(), found) {
                return Err(escape);
            }
        }
        for (wall, touched) in touches.into_iter().enumerate().skip(self.inner_loops) {
            let first = self.edges.ranges[wall].start;
            if touched || self.edges.ranges[wall].is_empty() {
                continue;
            }
            let p = self.edges.start[first];
            if self.inner.is_inside(p).0 == Some(true) {
                let nearest = self.inner.nearest(p).map_or(0, |n| n.edge);
                return Err(self.escape(EscapeKind::WallInFluid, p, nearest, first));
            }
        }
        Ok(())
    }

    /// Whether edge `f` of the outer wall, which touches edge `e` of the inner one, enters the fluid
    /// there.
    fn wall_in_fluid(&self, e: usize, f: usize) -> Option<Escape> {
        if let Contact::Crossing(at) = self.edges.contact(e, f) {
            return Some(self.escape(EscapeKind::Crossing, at, e, f));
        }
        let ([c, d], [a, b]) = (self.edges.ends(e), self.edges.ends(f));
        let before = self.edges.start[self.edges.previous(f)];
        let into = |towards: [Point; 2], at: Point, enters: &dyn Fn(Point) -> bool| {
            let enters = towards.into_iter().any(enters);
            enters.then(|| self.escape(EscapeKind::WallInFluid, at, e, f))
        };
        if order(c, a) == Ordering::Equal {
            into([b, before], c, &|p| self.is_in_corner(e, p))
        } else if lies_inside(c, a, b) {
            into([a, b], c, &|p| self.is_in_corner(e, p))
        } else if lies_inside(a, c, d) {
            into([b, before], a, &|p| {
                orientation(c, d, p) == Ordering::Greater
            })
        } else {
            None
        }
    }

    /// Whether the way from the start of an edge towards a point begins in the fluid.
    fn is_in_corner(&self, edge: usize, towards: Point) -> bool {
        let before = self.edges.start[self.edges.previous(edge)];
        let [here, after] = self.edges.ends(edge);
        let left = |side: Ordering| side == Ordering::Greater;
        let (in_side, out_side) = (
            orientation(before, here, towards),
            orientation(here, after, towards),
        );
        match orientation(before, here, after) {
            Ordering::Greater => left(in_side) && left(out_side),
            Ordering::Equal => left(in_side),
            Ordering::Less => left(in_side) || left(out_side),
        }
    }

    /// Step 2.
    fn every_lumen_begins_inside(&self) -> Result<(), Escape> {
        for wall in 0..self.inner_loops {
            let range = &self.edges.ranges[wall];
            if self.roles[wall].is_island() || range.is_empty() {
                continue;
            }
            let edge = range.start;
            let p = self.edges.start[edge];
            let begins_inside = self
                .outer
                .is_inside(p)
                .0
                .unwrap_or_else(|| self.leaves_inwards(edge));
            if !begins_inside {
                let nearest = self.outer.nearest(p).map_or(0, |n| n.edge);
                let outer = self.inner_edges + nearest;
                return Err(self.escape(EscapeKind::Outside, p, edge, outer));
            }
        }
        Ok(())
    }

    /// Whether the fluid left of an inner edge, whose start lies on the outer wall, is fluid of the outer
    /// section.
    fn leaves_inwards(&self, edge: usize) -> bool {
        let [p, towards] = self.edges.ends(edge);
        let mut inwards = false;
        let flow = self.outer.visit_box(&Bounds::of(p, p), &mut |index| {
            let f = self.inner_edges + index;
            let [a, b] = self.edges.ends(f);
            let side = orientation(a, b, towards);
            // Along an outer edge the fluid is on the same side only if both run the same way.
            let is_along = side == Ordering::Equal && order(p, towards) == order(a, b);
            if order(p, a) == Ordering::Equal {
                inwards = is_along || self.is_in_corner(f, towards);
            } else if lies_inside(p, a, b) {
                inwards = is_along || side == Ordering::Greater;
            } else {
                return ControlFlow::Continue(());
            }
            ControlFlow::Break(())
        });
        flow.is_break() && inwards
    }
}

/// Whether a point lies on the edge from `a` to `b`, off its ends.
fn lies_inside(p: Point, a: Point, b: Point) -> bool {
    is_between(p, a, b) && orientation(a, b, p) == Ordering::Equal
}
