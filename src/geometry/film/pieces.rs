//! What the surface of a film is made of before it is trimmed, and the regions that trim it.
//!
//! On all walls: each edge moved into the fluid by the thickness, and an arc about each re-entrant
//! vertex. Everything within the thickness of any wall is film. Two edges that meet at a fluid corner
//! below 180 degrees are cut at the mitre where both are long enough for it; else trimming finds the ends.
//!
//! On some walls: a layer on each coated edge, square at its ends; a sector at each re-entrant vertex
//! between two coated edges; and the walls without film, which remain where no layer lies on them.
//! Where a coated stretch ends at a wall that leans at up to 135 degrees (measured in the fluid), the
//! layer runs on under its own level until it meets that wall.

use std::cmp::Ordering;

use super::super::outline::Point;
use super::curve::{Cover, Curve, plus};
use super::walls::{ROUNDING, Walls};

/// A layer that runs on to a wall goes this share of the thickness into it, so that both surely meet.
const OVERSHOOT: f64 = 1e-4;
/// Flattest turn at which the layer runs on to the wall beside it: 180 less 135 degrees.
const RUNS_ON: f64 = std::f64::consts::FRAC_PI_4 * (1.0 - 1e-9);

/// A piece before trimming.
#[derive(Debug, Clone, Copy)]
pub(super) struct Piece {
    pub(super) curve: Curve,
    /// Regions that do not trim it, because they lie on one side of it: `usize::MAX` for none.
    pub(super) own: [usize; 3],
    /// Whether it is a wall without film, which is never in the solid.
    pub(super) is_wall: bool,
}

/// Pieces and regions of one film.
#[derive(Debug, Default)]
pub(super) struct Surface {
    pub(super) pieces: Vec<Piece>,
    pub(super) covers: Vec<Cover>,
    /// The area that the film fills at most, overlaps counted twice.
    pub(super) largest_area: f64,
}

/// No region.
const NONE: usize = usize::MAX;

struct Builder<'a> {
    walls: &'a Walls,
    reach: f64,
    surface: Surface,
    /// Turn at the start of each edge.
    turns: Vec<(f64, Ordering)>,
    /// How far a mitre at the start of each edge cuts into both edges; 0 for no mitre.
    mitre: Vec<f64>,
}

/// The pieces and regions of a film on all walls.
pub(super) fn on_all(walls: &Walls, reach: f64) -> Surface {
    let mut builder = Builder::new(walls, reach, true);
    for edge in 0..walls.len() {
        builder.surface.covers.push(Cover::Around {
            ends: walls.edges.ends(edge),
            direction: walls.direction[edge],
            reach,
        });
    }
    for edge in 0..walls.len() {
        builder.top(edge, [0.0; 2], [edge, NONE, NONE]);
        if builder.turns[edge].1 == Ordering::Less {
            builder.arc(edge, [walls.edges.previous(edge), edge, NONE]);
        }
    }
    builder.surface
}

/// The pieces and regions of a film on the coated walls.
pub(super) fn on_some(walls: &Walls, reach: f64) -> Surface {
    let mut builder = Builder::new(walls, reach, false);
    for edge in 0..walls.len() {
        if walls.coated[edge] {
            builder.layer(edge);
        } else {
            let [from, to] = walls.edges.ends(edge);
            builder.push(Curve::line(from, to), [NONE; 3], true);
        }
        let before = walls.edges.previous(edge);
        if builder.turns[edge].1 == Ordering::Less && walls.coated[before] && walls.coated[edge] {
            let own = builder.surface.covers.len();
            builder.surface.covers.push(Cover::Sector {
                centre: walls.edges.start[edge],
                start: walls.normal(before),
                end: walls.normal(edge),
                reach,
            });
            builder.arc(edge, [own, NONE, NONE]);
        }
    }
    builder.surface
}

impl<'a> Builder<'a> {
    fn new(walls: &'a Walls, reach: f64, is_everywhere: bool) -> Self {
        let turns: Vec<(f64, Ordering)> = (0..walls.len()).map(|i| walls.turn(i)).collect();
        let coated = |i: usize| walls.coated[i] && walls.coated[walls.edges.previous(i)];
        let wish: Vec<f64> = (0..walls.len())
            .map(|i| {
                if turns[i].1 == Ordering::Greater && coated(i) {
                    reach * (0.5 * turns[i].0).tan()
                } else {
                    0.0
                }
            })
            .collect();
        // What a mitre cuts off must lie under the other layer, which ends square on some walls.
        let overlap = |i: usize| {
            let turn = turns[i].0.min(std::f64::consts::FRAC_PI_2);
            if is_everywhere || wish[i] <= 0.0 {
                0.0
            } else {
                reach * turn.sin() + ROUNDING
            }
        };
        let fits = |i: usize| {
            let next = walls.edges.next(i);
            wish[i] + wish[next] <= walls.length[i] + ROUNDING
                && overlap(i).max(overlap(next)) <= walls.length[i]
        };
        let mitre = (0..walls.len())
            .map(|i| {
                if fits(i) && fits(walls.edges.previous(i)) {
                    wish[i]
                } else {
                    0.0
                }
            })
            .collect();
        Self {
            walls,
            reach,
            surface: Surface::default(),
            turns,
            mitre,
        }
    }

    fn push(&mut self, curve: Curve, own: [usize; 3], is_wall: bool) {
        if curve.length() > ROUNDING {
            self.surface.pieces.push(Piece {
                curve,
                own,
                is_wall,
            });
        }
    }

    /// Above the start of an edge: its own offset point.
    fn offset(&self, vertex: usize, edge: usize) -> Point {
        plus(
            self.walls.edges.start[vertex],
            self.walls.normal(edge),
            self.reach,
        )
    }

    /// The common point of both offset edges at a vertex; the same bits for both.
    fn mitre_point(&self, vertex: usize) -> Point {
        let [n, m] = [self.walls.edges.previous(vertex), vertex].map(|e| self.walls.normal(e));
        let sum = [n[0] + m[0], n[1] + m[1]];
        // The sum of two unit vectors has the square length 2 + 2 n.m.
        let square = 0.5 * (sum[0] * sum[0] + sum[1] * sum[1]);
        plus(self.walls.edges.start[vertex], sum, self.reach / square)
    }

    /// The edge moved by the thickness, cut at its mitres or lengthened at its ends.
    fn top(&mut self, edge: usize, lengthened: [f64; 2], own: [usize; 3]) {
        let next = self.walls.edges.next(edge);
        let end = |vertex: usize, outwards: f64| {
            if self.mitre[vertex] > 0.0 {
                self.mitre_point(vertex)
            } else if outwards.abs() > 0.0 {
                let direction = self.walls.direction[edge];
                plus(self.offset(vertex, edge), direction, outwards)
            } else {
                self.offset(vertex, edge)
            }
        };
        let (from, to) = (end(edge, -lengthened[0]), end(next, lengthened[1]));
        let length = self.walls.length[edge] + lengthened[0] + lengthened[1];
        self.surface.largest_area += length * self.reach;
        let remains = self.walls.length[edge] - self.mitre[edge] - self.mitre[next];
        if remains > ROUNDING {
            self.push(Curve::line(from, to), own, false);
        }
    }

    /// The arc about a re-entrant vertex.
    fn arc(&mut self, vertex: usize, own: [usize; 3]) {
        let before = self.walls.edges.previous(vertex);
        let curve = Curve::Arc {
            centre: self.walls.edges.start[vertex],
            radius: self.reach,
            start: self.walls.normal(before),
            from: self.offset(vertex, before),
            to: self.offset(vertex, vertex),
            sweep: -self.turns[vertex].0,
        };
        self.surface.largest_area += (0.5 * self.reach * curve.length()).max(0.0);
        self.push(curve, own, false);
    }

    /// How far the layer on a coated edge runs on beyond a vertex, and whether its end there is a face.
    fn end(&self, vertex: usize, neighbour: usize) -> (f64, bool) {
        let (turn, side) = self.turns[vertex];
        if self.walls.coated[neighbour] {
            // Between two layers: the side of one can come to light only where they overlap.
            (0.0, side == Ordering::Greater)
        } else if side == Ordering::Greater && turn >= RUNS_ON {
            let lean = (std::f64::consts::FRAC_PI_2 - turn).max(0.0);
            (self.reach * (lean.tan() + OVERSHOOT), true)
        } else {
            (0.0, true)
        }
    }

    /// The layer on a coated edge: its region, its surface, and its faces at the ends.
    fn layer(&mut self, edge: usize) {
        let (walls, reach) = (self.walls, self.reach);
        let next = walls.edges.next(edge);
        let (before, has_first) = self.end(edge, walls.edges.previous(edge));
        let (after, has_last) = self.end(next, next);
        let index = self.surface.covers.len();
        let own = [index, NONE, NONE];
        let [a, b] = walls.edges.ends(edge);
        let (direction, up) = (walls.direction[edge], walls.normal(edge));
        self.surface.covers.push(Cover::Layer {
            origin: a,
            direction,
            range: [-before, walls.length[edge] + after],
            reach,
        });
        self.top(edge, [before, after], own);
        // Travelled with the film on the right: up the first face, down the last.
        if has_first {
            let foot = plus(a, direction, -before);
            self.push(Curve::line(foot, plus(foot, up, reach)), own, false);
            self.push(Curve::line(a, foot), own, false);
        }
        if has_last {
            let foot = plus(b, direction, after);
            self.push(Curve::line(plus(foot, up, reach), foot), own, false);
            self.push(Curve::line(foot, b), own, false);
        }
    }
}
