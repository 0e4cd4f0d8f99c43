//! How the wall of a section moves in one case of the sensitivity study.
//!
//! One definition serves two uses: the speed `dn_w` with which a place of the wall moves out of the fluid
//! per unit of change, which the shape derivative `dK = closed integral of (dphi/dn)^2 dn_w ds` needs, and
//! the outline after a finite change, which a new solve needs. Each straight edge of the outline carries a
//! velocity that is linear along it, so an edge stays straight and both uses agree to first order.
//!
//! SI: metres and radians, `x` to the right, `y` upwards.

use crate::geometry::{Loop, Outline, Point, WallStretch};

/// A velocity linear in the place: `V(p) = at_pivot + gradient (p - pivot)`.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct LinearField {
    /// Where the velocity is `at_pivot`, m.
    pub pivot: Point,
    /// Velocity there, m per unit of change.
    pub at_pivot: Point,
    /// Rows of the velocity gradient, per unit of change.
    pub gradient: [Point; 2],
}

/// How one edge of the outline moves.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum EdgeMotion {
    /// It stays on its line.
    Rests,
    /// Out of the fluid along its normal, at the speed of the motion.
    AlongNormal,
    /// With the linear field of this index.
    Follows(u32),
}

/// What a unit of change is.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Measure {
    /// A relative change: unit 1.
    Relative,
    /// A length, m.
    Length,
    /// An angle, rad.
    Angle,
}

impl Measure {
    /// SI unit of a change.
    pub fn unit(self) -> &'static str {
        match self {
            Self::Relative => "1",
            Self::Length => "m",
            Self::Angle => "rad",
        }
    }
}

/// One case: which walls move, and how fast per unit of change.
#[derive(Debug, Clone, PartialEq)]
pub struct WallMotion {
    /// Short name, the key in machine output.
    pub name: String,
    /// What exactly moves, one sentence.
    pub definition: String,
    /// What a unit of change is.
    pub measure: Measure,
    /// Length of which a relative change is one, m: the depth for `depth`, the width for `width`.
    pub reference_length: Option<f64>,
    /// Speed of the edges that move along their normals, m per unit of change; out of the fluid is positive.
    pub(super) normal_speed: f64,
    /// The stretch that moves alone, where it has a name of its own.
    pub(super) stretch: Option<WallStretch>,
    pub(super) fields: Vec<LinearField>,
    /// One entry for each edge of each loop.
    pub(super) edges: Vec<Vec<EdgeMotion>>,
}

impl LinearField {
    /// The same velocity everywhere.
    pub(super) fn uniform(velocity: Point) -> Self {
        Self {
            pivot: [0.0; 2],
            at_pivot: velocity,
            gradient: [[0.0; 2]; 2],
        }
    }

    /// Stretching about a pivot, by `[x, y]` per unit of change.
    pub(super) fn stretching(pivot: Point, [along_x, along_y]: [f64; 2]) -> Self {
        Self {
            pivot,
            at_pivot: [0.0; 2],
            gradient: [[along_x, 0.0], [0.0, along_y]],
        }
    }

    /// Turning about a pivot, anticlockwise for a positive `rate`.
    pub(super) fn turning(pivot: Point, rate: f64) -> Self {
        Self {
            pivot,
            at_pivot: [0.0; 2],
            gradient: [[0.0, -rate], [rate, 0.0]],
        }
    }

    /// Velocity at a place, m per unit of change.
    pub fn velocity(&self, p: Point) -> Point {
        let [dx, dy] = [p[0] - self.pivot[0], p[1] - self.pivot[1]];
        let [[xx, xy], [yx, yy]] = self.gradient;
        [
            self.at_pivot[0] + xx * dx + xy * dy,
            self.at_pivot[1] + yx * dx + yy * dy,
        ]
    }
}

impl WallMotion {
    /// How an edge moves; an edge that the motion does not know rests.
    pub(super) fn edge(&self, loop_index: usize, edge: usize) -> EdgeMotion {
        self.edges
            .get(loop_index)
            .and_then(|edges| edges.get(edge))
            .copied()
            .unwrap_or(EdgeMotion::Rests)
    }

    /// Velocity of the edge at a place on it, m per unit of change; `normal` is its unit normal out of the
    /// fluid.
    pub fn velocity(&self, loop_index: usize, edge: usize, at: Point, normal: Point) -> Point {
        match self.edge(loop_index, edge) {
            EdgeMotion::Rests => [0.0; 2],
            EdgeMotion::AlongNormal => normal.map(|n| self.normal_speed * n),
            EdgeMotion::Follows(field) => self
                .fields
                .get(field as usize)
                .map_or([0.0; 2], |field| field.velocity(at)),
        }
    }

    /// `dn_w`: speed out of the fluid at a place on an edge, m per unit of change.
    pub fn outward_speed(&self, loop_index: usize, edge: usize, at: Point, normal: Point) -> f64 {
        let v = self.velocity(loop_index, edge, at, normal);
        v[0] * normal[0] + v[1] * normal[1]
    }

    /// Whether the whole section keeps its shape: all edges follow one even stretching.
    pub(super) fn is_similarity(&self) -> bool {
        let [LinearField { gradient, .. }] = self.fields[..] else {
            return false;
        };
        let [[xx, xy], [yx, yy]] = gradient;
        let is_even = (xx - yy).abs() + (xy + yx).abs() <= 0.0;
        let all = self.edges.iter().flatten();
        is_even && all.clone().all(|e| *e == EdgeMotion::Follows(0))
    }

    /// Whether any edge moves.
    pub(super) fn moves(&self) -> bool {
        self.edges.iter().flatten().any(|e| *e != EdgeMotion::Rests)
    }

    /// Largest speed of a vertex with its edges, m per unit of change.
    pub(super) fn largest_speed(&self, outline: &Outline) -> f64 {
        let mut largest = 0.0_f64;
        for (index, wall) in outline.loops().enumerate() {
            for (edge, (a, b)) in wall.edges().enumerate() {
                let Some(normal) = outward_normal(a, b) else {
                    continue;
                };
                for p in [a, b] {
                    let v = self.velocity(index, edge, p, normal);
                    largest = largest.max(v[0].hypot(v[1]));
                }
            }
        }
        largest
    }
}

/// Unit normal out of the fluid of an edge with the fluid on its left; `None` for an edge without length.
pub(super) fn outward_normal(a: Point, b: Point) -> Option<Point> {
    let (x, y) = (b[0] - a[0], b[1] - a[1]);
    let length = x.hypot(y);
    (length > 0.0).then(|| [y / length, -x / length])
}

/// Unit normals of all edges of a loop; an edge without length takes that of the one before.
pub(super) fn outward_normals(wall: &Loop) -> Vec<Point> {
    let mut last = [0.0, 1.0];
    wall.edges()
        .map(|(a, b)| {
            last = outward_normal(a, b).unwrap_or(last);
            last
        })
        .collect()
}
