//! Pieces of a film's surface, straight or round, and the regions of film that may cover them.
//!
//! A piece is measured by its arc length. To trim it by a region, the places where it meets the region's
//! sides are computed in closed form, and the stretches between them are judged by their middles; so no
//! decision hangs on which of two nearly equal numbers is the smaller.

use super::super::curves::distance_to_segment;
use super::super::outline::Point;
use super::super::segment_tree::Bounds;

pub(super) fn plus(a: Point, b: Point, factor: f64) -> Point {
    [a[0] + factor * b[0], a[1] + factor * b[1]]
}

pub(super) fn minus(a: Point, b: Point) -> Point {
    [a[0] - b[0], a[1] - b[1]]
}

pub(super) fn dot(a: Point, b: Point) -> f64 {
    a[0] * b[0] + a[1] * b[1]
}

pub(super) fn cross(a: Point, b: Point) -> f64 {
    a[0] * b[1] - a[1] * b[0]
}

pub(super) fn distance(a: Point, b: Point) -> f64 {
    (a[0] - b[0]).hypot(a[1] - b[1])
}

/// The direction turned anticlockwise by a right angle.
pub(super) fn left_of(direction: Point) -> Point {
    [-direction[1], direction[0]]
}

/// The square box around a circle.
pub(super) fn around(centre: Point, radius: f64) -> Bounds {
    Bounds {
        low: centre.map(|c| c - radius),
        high: centre.map(|c| c + radius),
    }
}

/// A straight or round piece, travelled with the open section on its left.
#[derive(Debug, Clone, Copy)]
pub(super) enum Curve {
    /// From `from` along the unit vector `direction`.
    Line {
        from: Point,
        to: Point,
        direction: Point,
        length: f64,
    },
    /// Clockwise about `centre`, from the unit vector `start` over `sweep` radians.
    Arc {
        centre: Point,
        radius: f64,
        start: Point,
        from: Point,
        to: Point,
        sweep: f64,
    },
}

impl Curve {
    pub(super) fn line(from: Point, to: Point) -> Self {
        let along = minus(to, from);
        let length = along[0].hypot(along[1]);
        let direction = if length > 0.0 {
            [along[0] / length, along[1] / length]
        } else {
            [0.0; 2]
        };
        Self::Line {
            from,
            to,
            direction,
            length,
        }
    }

    pub(super) fn length(&self) -> f64 {
        match *self {
            Self::Line { length, .. } => length,
            Self::Arc { radius, sweep, .. } => radius * sweep,
        }
    }

    /// The point at an arc length; the ends come out bit by bit as given.
    pub(super) fn at(&self, s: f64) -> Point {
        match *self {
            Self::Line {
                from,
                to,
                direction,
                length,
            } => {
                if s >= length {
                    to
                } else if s <= 0.0 {
                    from
                } else {
                    plus(from, direction, s)
                }
            }
            Self::Arc {
                centre,
                radius,
                start,
                from,
                to,
                sweep,
            } => {
                if s >= radius * sweep {
                    to
                } else if s <= 0.0 {
                    from
                } else {
                    let (sin, cos) = (s / radius).sin_cos();
                    // Clockwise: the second axis is `start` turned to its right.
                    plus(
                        plus(centre, start, radius * cos),
                        [start[1], -start[0]],
                        radius * sin,
                    )
                }
            }
        }
    }

    /// Arc lengths where the piece meets the line `normal . (p - q) = offset`.
    fn meet_line(&self, q: Point, normal: Point, offset: f64, found: &mut Vec<f64>) {
        match *self {
            Self::Line {
                from, direction, ..
            } => {
                let rate = dot(normal, direction);
                if rate.abs() > 0.0 {
                    found.push((offset - dot(normal, minus(from, q))) / rate);
                }
            }
            Self::Arc {
                centre,
                radius,
                start,
                ..
            } => {
                let cosine = (offset - dot(normal, minus(centre, q))) / radius;
                push_angles(start, normal, cosine, radius, found);
            }
        }
    }

    /// Arc lengths where the piece meets a circle.
    fn meet_circle(&self, c: Point, r: f64, found: &mut Vec<f64>) {
        match *self {
            Self::Line {
                from, direction, ..
            } => {
                let to_centre = minus(c, from);
                let (along, off) = (dot(direction, to_centre), cross(direction, to_centre).abs());
                if off <= r {
                    let half = ((r - off) * (r + off)).sqrt();
                    found.extend([along - half, along + half]);
                }
            }
            Self::Arc {
                centre,
                radius,
                start,
                ..
            } => {
                let between = minus(c, centre);
                let apart = between[0].hypot(between[1]);
                if apart > 0.0 {
                    let share = (radius - r) / apart * ((radius + r) / radius);
                    let cosine = f64::midpoint(apart / radius, share);
                    let towards = [between[0] / apart, between[1] / apart];
                    push_angles(start, towards, cosine, radius, found);
                }
            }
        }
    }

    /// Arc lengths where the piece meets the line through a wall edge, if that is at the edge.
    pub(super) fn meet_edge(&self, [a, b]: [Point; 2], slack: f64, found: &mut Vec<f64>) {
        let edge = minus(b, a);
        let length = edge[0].hypot(edge[1]);
        let direction = [edge[0] / length, edge[1] / length];
        let first = found.len();
        self.meet_line(a, left_of(direction), 0.0, found);
        let mut kept = first;
        for i in first..found.len() {
            let along = dot(direction, minus(self.at(found[i]), a));
            if (-slack..=length + slack).contains(&along) {
                found[kept] = found[i];
                kept += 1;
            }
        }
        found.truncate(kept);
    }
}

/// The clockwise angles from `start`, as arc lengths, at which a unit vector makes the angle of this
/// cosine with `axis`.
fn push_angles(start: Point, axis: Point, cosine: f64, radius: f64, found: &mut Vec<f64>) {
    if cosine.abs() <= 1.0 {
        let middle = cross(axis, start).atan2(dot(axis, start));
        let half = cosine.acos();
        let turn = std::f64::consts::TAU;
        found.extend([middle - half, middle + half].map(|angle| radius * angle.rem_euclid(turn)));
    }
}

/// A region of film.
#[derive(Debug, Clone, Copy)]
pub(super) enum Cover {
    /// Everything within `reach` of an edge, on both of its sides.
    Around {
        ends: [Point; 2],
        direction: Point,
        reach: f64,
    },
    /// On the fluid side of the line from `origin` along `direction`, up to `reach`, over `range`.
    Layer {
        origin: Point,
        direction: Point,
        range: [f64; 2],
        reach: f64,
    },
    /// The sector of a circle clockwise from the unit vector `start` to `end`, less than a half turn.
    Sector {
        centre: Point,
        start: Point,
        end: Point,
        reach: f64,
    },
}

impl Cover {
    /// Arc lengths where a piece may enter or leave the region; `slack` widens sides shared with others.
    fn meet(&self, curve: &Curve, slack: f64, found: &mut Vec<f64>) {
        match *self {
            Self::Around {
                ends,
                direction,
                reach,
            } => {
                let normal = left_of(direction);
                curve.meet_line(ends[0], normal, reach, found);
                curve.meet_line(ends[0], normal, -reach, found);
                curve.meet_circle(ends[0], reach, found);
                curve.meet_circle(ends[1], reach, found);
            }
            Self::Layer {
                origin,
                direction,
                range,
                reach,
            } => {
                curve.meet_line(origin, direction, range[0] - slack, found);
                curve.meet_line(origin, direction, range[1] + slack, found);
                curve.meet_line(origin, left_of(direction), 0.0, found);
                curve.meet_line(origin, left_of(direction), reach, found);
            }
            Self::Sector {
                centre,
                start,
                end,
                reach,
            } => {
                curve.meet_line(centre, left_of(start), slack, found);
                curve.meet_line(centre, left_of(end), -slack, found);
                curve.meet_circle(centre, reach, found);
            }
        }
    }

    /// Whether a point lies in the region, deeper than `slack` under the surface of the film.
    pub(super) fn holds(&self, p: Point, slack: f64) -> bool {
        match *self {
            Self::Around {
                ends: [a, b],
                reach,
                ..
            } => distance_to_segment(p, a, b) < reach - slack,
            Self::Layer {
                origin,
                direction,
                range,
                reach,
            } => {
                let from = minus(p, origin);
                let (along, up) = (dot(direction, from), cross(direction, from));
                (range[0] - slack..=range[1] + slack).contains(&along)
                    && (-slack..reach - slack).contains(&up)
            }
            Self::Sector {
                centre,
                start,
                end,
                reach,
            } => {
                let from = minus(p, centre);
                cross(start, from) <= slack
                    && cross(end, from) >= -slack
                    && from[0].hypot(from[1]) < reach - slack
            }
        }
    }

    /// A quick test: `true` only if no point of the stretch lies in the region.
    pub(super) fn misses(&self, curve: &Curve, [from, to]: [f64; 2]) -> bool {
        let Self::Around {
            ends: [c, d],
            direction,
            reach,
        } = *self
        else {
            return false;
        };
        let Curve::Line { .. } = curve else {
            let middle = curve.at(f64::midpoint(from, to));
            return distance_to_segment(middle, c, d) >= reach + 0.5 * (to - from);
        };
        let (a, b) = (curve.at(from), curve.at(to));
        let (first, last) = (cross(direction, minus(a, c)), cross(direction, minus(b, c)));
        if first.min(last) >= reach || first.max(last) <= -reach {
            return true;
        }
        // Two segments that do not cross are nearest to each other at an end of one of them.
        first * last > 0.0
            && distance_to_segment(a, c, d) >= reach
            && distance_to_segment(b, c, d) >= reach
            && distance_to_segment(c, a, b) >= reach
            && distance_to_segment(d, a, b) >= reach
    }

    /// Whether a point lies deeper than `slack` inside every side of the region.
    pub(super) fn buries(&self, p: Point, slack: f64) -> bool {
        match *self {
            Self::Around { .. } => self.holds(p, slack),
            Self::Layer {
                origin,
                direction,
                range,
                reach,
            } => {
                let from = minus(p, origin);
                let (along, up) = (dot(direction, from), cross(direction, from));
                let inside = |x: f64, low: f64, high: f64| x > low + slack && x < high - slack;
                inside(along, range[0], range[1]) && inside(up, 0.0, reach)
            }
            Self::Sector {
                centre,
                start,
                end,
                reach,
            } => {
                let from = minus(p, centre);
                cross(start, from) < -slack
                    && cross(end, from) > slack
                    && from[0].hypot(from[1]) < reach - slack
            }
        }
    }

    /// A box around the region.
    pub(super) fn bounds(&self) -> Bounds {
        match *self {
            Self::Around { ends, reach, .. } => {
                around(ends[0], reach).union(around(ends[1], reach))
            }
            Self::Layer {
                origin,
                direction,
                range,
                reach,
            } => {
                let up = left_of(direction);
                let [a, b] = range.map(|s| plus(origin, direction, s));
                Bounds::of(a, b).union(Bounds::of(plus(a, up, reach), plus(b, up, reach)))
            }
            Self::Sector { centre, reach, .. } => around(centre, reach),
        }
    }
}

/// The stretches of a piece that are still open.
#[derive(Debug)]
pub(super) struct Open {
    pub(super) stretches: Vec<[f64; 2]>,
    places: Vec<f64>,
    length: f64,
    slack: f64,
}

impl Open {
    pub(super) fn whole(curve: &Curve, slack: f64) -> Self {
        Self {
            stretches: vec![[0.0, curve.length()]],
            places: Vec::new(),
            length: curve.length(),
            slack,
        }
    }

    pub(super) fn is_closed(&self) -> bool {
        self.stretches.is_empty()
    }

    /// Takes away what a region covers.
    pub(super) fn cover(&mut self, curve: &Curve, cover: &Cover) {
        let mut places = std::mem::take(&mut self.places);
        places.clear();
        cover.meet(curve, self.slack, &mut places);
        let slack = self.slack;
        self.take_away(&mut places, |s| cover.holds(curve.at(s), slack));
        self.places = places;
    }

    /// Takes away the stretches between the places whose middles are to go.
    pub(super) fn take_away(&mut self, places: &mut Vec<f64>, goes: impl Fn(f64) -> bool) {
        places.retain(|s| *s > 0.0 && *s < self.length);
        places.extend([0.0, self.length]);
        places.sort_unstable_by(f64::total_cmp);
        for pair in places.windows(2) {
            let (from, to) = (pair[0], pair[1]);
            let is_open = |s: &[f64; 2]| s[0] < to && s[1] > from;
            if from < to && self.stretches.iter().any(is_open) && goes(f64::midpoint(from, to)) {
                self.subtract(from, to);
            }
        }
    }

    fn subtract(&mut self, from: f64, to: f64) {
        let shortest = 4.0 * self.slack;
        let mut left = Vec::with_capacity(self.stretches.len() + 1);
        for &[a, b] in &self.stretches {
            for part in [[a, b.min(from)], [a.max(to), b]] {
                let untouched = part[0] <= a && part[1] >= b;
                if untouched || part[1] - part[0] > shortest {
                    left.push(part);
                    if untouched {
                        break;
                    }
                }
            }
        }
        self.stretches = left;
    }
}
