//! Posts: closed shapes placed in a section become islands; a post must touch neither wall nor post.

use std::collections::BTreeMap;
use std::f64::consts::TAU;

use robust::{Coord, orient2d};

use super::error::Amount;
use super::kinds::{KindInfo, post_parameters};
use super::parameters::{Parameters, describe};
use super::shape::Shape;
use super::{NominalError, NominalSpec, SpecValue};
use crate::geometry::{Loop, Outline, Point};

/// Names of the parameters that place a post.
const PLACEMENT: [&str; 3] = ["x", "y", "rotation"];

/// Most vertices of all posts of a section, before the last one.
const MOST_VERTICES: usize = 4_000_000;

/// Lower left and upper right corner of a box.
type Extent = (Point, Point);

/// Places the posts of a section as islands.
pub(super) fn place(p: &Parameters<'_>, mut shape: Shape) -> Result<Shape, NominalError> {
    let members = match p.value("posts") {
        None => return Ok(shape),
        Some(SpecValue::List(members)) => members,
        Some(other) => return Err(p.not_readable("posts", describe(other))),
    };
    let walls = shape.outline.clone();
    let mut vertices = 0;
    let mut boxes: Vec<Vec<Option<Extent>>> = walls
        .lumens
        .iter()
        .map(|lumen| lumen.islands.iter().map(|i| bounds(&i.points)).collect())
        .collect();
    for (i, member) in members.iter().enumerate() {
        let nested = |source| NominalError::Nested {
            place: format!("`posts`, number {}", i + 1),
            source: Box::new(source),
        };
        if vertices > MOST_VERTICES {
            return Err(nested(NominalError::TooManyVertices {
                limit: MOST_VERTICES,
            }));
        }
        let SpecValue::Spec(spec) = member else {
            return Err(nested(p.not_readable("posts", describe(member))));
        };
        let post = Post::read(p, spec).map_err(nested)?;
        let lumen = post.lumen(&walls, &shape.outline, &boxes).map_err(nested)?;
        vertices += post.points.len();
        if let Some(boxes) = boxes.get_mut(lumen) {
            boxes.push(bounds(&post.points));
        }
        if let Some(lumen) = shape.outline.lumens.get_mut(lumen) {
            lumen.islands.push(Loop::new(post.points));
        }
    }
    shape.flat_lid = shape.flat_lid && shape.outline.lumens.len() == 1;
    Ok(shape)
}

/// A post in place.
struct Post {
    centre: Point,
    points: Vec<Point>,
}

impl Post {
    /// Builds the post about its centre of area, turns it and puts the centre at `x`, `y`.
    fn read(p: &Parameters<'_>, spec: &NominalSpec) -> Result<Self, NominalError> {
        let (placement, values): (BTreeMap<_, _>, BTreeMap<_, _>) = spec
            .values
            .clone()
            .into_iter()
            .partition(|(name, _)| PLACEMENT.contains(&name.as_str()));
        let plain = NominalSpec {
            kind: spec.kind.clone(),
            values,
        };
        let shape = plain.shape(p.nesting() + 1)?;
        let (1, true) = (
            shape.outline.lumens.len(),
            shape.outline.lumens.iter().all(|l| l.islands.is_empty()),
        ) else {
            return Err(NominalError::NotAPost { kind: shape.kind });
        };
        let place = Parameters::of(&POST, &placement, p.nesting() + 1);
        let centre = [place.signed_length("x")?, place.signed_length("y")?];
        let (sin, cos) = place.angle("rotation", -TAU, TAU)?.sin_cos();
        let middle = shape.outline.centroid();
        let points = shape
            .wall()
            .iter()
            .map(|q| {
                let (dx, dy) = (q[0] - middle[0], q[1] - middle[1]);
                [
                    centre[0] + cos * dx - sin * dy,
                    centre[1] + sin * dx + cos * dy,
                ]
            })
            .collect();
        Ok(Self { centre, points })
    }

    /// Number of the lumen that the post stands in, clear of everything.
    ///
    /// - `walls`: the section without posts
    /// - `all`: the section with the posts placed so far
    /// - `boxes`: bounds of the islands of `all`, by lumen
    fn lumen(
        &self,
        walls: &Outline,
        all: &Outline,
        boxes: &[Vec<Option<Extent>>],
    ) -> Result<usize, NominalError> {
        let first = self.points.first().copied().unwrap_or(self.centre);
        for wall in walls.loops() {
            if let Some(near) = meeting(&self.points, &wall.points) {
                return Err(self.meets("the wall", near));
            }
        }
        let lumen = all
            .lumens
            .iter()
            .position(|lumen| contains(&lumen.outer.points, first))
            .ok_or_else(|| self.outside(walls))?;
        let fixed = walls.lumens.get(lumen).map_or(0, |l| l.islands.len());
        let islands = all.lumens.get(lumen).map_or(&[][..], |l| &l.islands);
        let boxes = boxes.get(lumen).map_or(&[][..], Vec::as_slice);
        let own = bounds(&self.points);
        let is_near = |other: &Option<Extent>| match (own, *other) {
            (Some(own), Some(other)) => overlap(own, other),
            _ => false,
        };
        let near = islands.iter().zip(boxes).enumerate();
        for (i, (island, _)) in near.filter(|(_, (_, other))| is_near(other)) {
            let inside = |outer: &[Point], inner: &[Point]| {
                inner.first().copied().filter(|&q| contains(outer, q))
            };
            let near = meeting(&self.points, &island.points)
                .or_else(|| inside(&island.points, &self.points))
                .or_else(|| inside(&self.points, &island.points));
            if let Some(near) = near {
                let obstacle = if i < fixed {
                    "an island"
                } else {
                    "another post"
                };
                return Err(self.meets(obstacle, near));
            }
        }
        Ok(lumen)
    }

    fn meets(&self, obstacle: &'static str, near: Point) -> NominalError {
        NominalError::PostMeets {
            x: Amount::length(self.centre[0]),
            y: Amount::length(self.centre[1]),
            obstacle,
            near_x: Amount::length(near[0]),
            near_y: Amount::length(near[1]),
        }
    }

    fn outside(&self, walls: &Outline) -> NominalError {
        let (low, high) = walls.bounds().unwrap_or(([0.0; 2], [0.0; 2]));
        NominalError::PostOutside {
            x: Amount::length(self.centre[0]),
            y: Amount::length(self.centre[1]),
            low,
            high,
        }
    }
}

/// The placement of a post as a table of its own.
static POST: KindInfo = KindInfo {
    name: "post",
    summary: "placement of a post",
    parameters: post_parameters(),
};

/// A vertex of `wall` near which the two loops cross or touch.
pub(super) fn meeting(post: &[Point], wall: &[Point]) -> Option<Point> {
    let whole = bounds(post)?;
    let post_edges = || post.iter().zip(post.iter().cycle().skip(1));
    wall.iter()
        .zip(wall.iter().cycle().skip(1))
        .filter(|&(&c, &d)| overlap(whole, edge_bounds(c, d)))
        .find(|&(&c, &d)| {
            let edge = edge_bounds(c, d);
            post_edges()
                .any(|(&a, &b)| overlap(edge, edge_bounds(a, b)) && segments_meet(a, b, c, d))
        })
        .map(|(&c, _)| c)
}

/// Whether two closed segments have a point in common; exact signs.
pub(super) fn segments_meet(a: Point, b: Point, c: Point, d: Point) -> bool {
    let side = |p: Point, q: Point, r: Point| {
        let at = |p: Point| Coord { x: p[0], y: p[1] };
        orient2d(at(p), at(q), at(r))
    };
    if !overlap(edge_bounds(a, b), edge_bounds(c, d)) {
        return false;
    }
    let apart = |u: f64, v: f64| (u > 0.0 && v > 0.0) || (u < 0.0 && v < 0.0);
    !apart(side(a, b, c), side(a, b, d)) && !apart(side(c, d, a), side(c, d, b))
}

/// Whether a point is inside a loop, by even-odd crossings of a horizontal ray.
pub(super) fn contains(wall: &[Point], p: Point) -> bool {
    wall.iter()
        .zip(wall.iter().cycle().skip(1))
        .filter(|&(a, b)| {
            (a[1] > p[1]) != (b[1] > p[1])
                && p[0] < a[0] + (p[1] - a[1]) / (b[1] - a[1]) * (b[0] - a[0])
        })
        .count()
        % 2
        == 1
}

/// Lower left and upper right corner of an edge's bounds.
fn edge_bounds(a: Point, b: Point) -> Extent {
    (
        [a[0].min(b[0]), a[1].min(b[1])],
        [a[0].max(b[0]), a[1].max(b[1])],
    )
}

/// Lower left and upper right corner of the bounds of a loop.
fn bounds(points: &[Point]) -> Option<Extent> {
    points
        .iter()
        .map(|&p| (p, p))
        .reduce(|(low, high), (p, _)| {
            (
                [low[0].min(p[0]), low[1].min(p[1])],
                [high[0].max(p[0]), high[1].max(p[1])],
            )
        })
}

/// Whether two boxes have a point in common.
fn overlap(a: Extent, b: Extent) -> bool {
    a.0[0] <= b.1[0] && b.0[0] <= a.1[0] && a.0[1] <= b.1[1] && b.0[1] <= a.1[1]
}
