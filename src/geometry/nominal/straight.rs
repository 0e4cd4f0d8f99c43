//! Kinds with straight walls only: rectangle, trapezoid, potassium hydroxide groove, triangles, polygons.

use std::f64::consts::{FRAC_PI_2, PI, SQRT_2};

use super::NominalError;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};

/// Most sides of a regular polygon.
const MOST_SIDES: u32 = 1000;

/// Width and height, the lid on top.
pub(super) fn rectangle(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, height) = (p.length("width")?, p.length("height")?);
    let mut wall = Wall::from([-width / 2.0, 0.0], width.min(height));
    wall.line_to([-width / 2.0, -height]);
    wall.line_to([width / 2.0, -height]);
    wall.line_to([width / 2.0, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// Flat floor and two walls at their own angles; the walls must not meet before the depth is reached.
pub(super) fn trapezoid(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (top, depth) = (p.length("top_width")?, p.length("depth")?);
    let cotangent = |angle: f64| angle.cos() / angle.sin();
    let left = cotangent(p.angle("left_angle", 0.0, PI)?);
    let right = cotangent(p.angle("right_angle", 0.0, PI)?);
    if top - depth * (left + right) <= 1e-9 * top {
        let advice = (
            ", where the walls meet",
            "reduce the depth, steepen the walls or widen the top; for a V use kind triangle",
        );
        return Err(p.refuse("depth", depth, "below", top / (left + right), advice));
    }
    let mut wall = Wall::from([-top / 2.0, 0.0], top.min(depth));
    wall.line_to([-top / 2.0 + depth * left, -depth]);
    wall.line_to([top / 2.0 - depth * right, -depth]);
    wall.line_to([top / 2.0, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// Walls at `atan(sqrt 2)`: floor width `opening - sqrt(2) depth`, a V where that is not above 0.
///
/// The angle between the (100) surface and the (111) planes of a cubic crystal.
pub(super) fn koh_groove(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (opening, depth) = (p.length("opening")?, p.length("depth")?);
    let floor = opening - SQRT_2 * depth;
    let mut wall = Wall::from([-opening / 2.0, 0.0], opening.min(depth));
    if floor > 1e-9 * opening {
        wall.line_to([-floor / 2.0, -depth]);
        wall.line_to([floor / 2.0, -depth]);
    } else {
        wall.line_to([0.0, -opening / SQRT_2]);
    }
    wall.line_to([opening / 2.0, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// Base at the lid and its two inner angles.
pub(super) fn triangle(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let base = p.length("base")?;
    let left = p.angle("left_angle", 0.0, PI)?;
    let right = p.angle("right_angle", 0.0, PI)?;
    if left + right >= PI - 1e-9 {
        let advice = (
            ", 180 deg less the left angle",
            "the two angles of a triangle must add up to less than 180 deg",
        );
        return Err(p.refuse("right_angle", right, "below", PI - left, advice));
    }
    // Law of sines for the left side, then its two components.
    let side = base * right.sin() / (left + right).sin();
    let apex = [-base / 2.0 + side * left.cos(), -side * left.sin()];
    Ok(below_base(p, base, apex))
}

/// Base at the lid, height, and where the apex lies.
pub(super) fn triangle_height(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (base, height) = (p.length("base")?, p.length("height")?);
    let apex_offset = p.signed_length("apex_offset")?;
    Ok(below_base(p, base, [apex_offset, -height]))
}

/// Three sides, `a` at the lid, `b` on the left.
pub(super) fn triangle_sides(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (a, b, c) = (p.length("a")?, p.length("b")?, p.length("c")?);
    for (name, side, others) in [("a", a, b + c), ("b", b, c + a), ("c", c, a + b)] {
        if side >= others * (1.0 - 1e-9) {
            let advice = (
                ", the sum of the other two",
                "each side of a triangle must be shorter than the other two together",
            );
            return Err(p.refuse(name, side, "below", others, advice));
        }
    }
    // Heron: sixteen times the square of the area, as a product of differences that lose few digits.
    let product = (a + b + c) * (b + c - a) * (c + a - b) * (a + b - c);
    let height = product.sqrt() / (2.0 * a);
    let from_left = (a * a + (b - c) * (b + c)) / (2.0 * a);
    Ok(below_base(p, a, [from_left - a / 2.0, -height]))
}

/// A triangle below its base.
fn below_base(p: &Parameters<'_>, base: f64, apex: [f64; 2]) -> Shape {
    let mut wall = Wall::from([-base / 2.0, 0.0], base.min(-apex[1]));
    wall.line_to(apex);
    wall.line_to([base / 2.0, 0.0]);
    Shape::groove(p.kind(), wall)
}

/// Equal sides, one of them flat at the bottom.
pub(super) fn regular_polygon(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let sides = p.count("sides", 3, MOST_SIDES)?;
    let half_angle = PI / f64::from(sides);
    let (side, across) = (
        p.optional_length("side")?,
        p.optional_length("across_flats")?,
    );
    let radius = match (side, across) {
        (Some(side), None) => side / (2.0 * half_angle.sin()),
        (None, Some(across)) => across / (2.0 * half_angle.cos()),
        _ => {
            return Err(NominalError::OneOf {
                kind: p.kind(),
                parameters: "`side` and `across_flats`",
                given: p.count_given(&["side", "across_flats"]),
            });
        }
    };
    let corner = |i: u32| {
        let (sin, cos) = (f64::from(2 * i + 1) * half_angle - FRAC_PI_2).sin_cos();
        [radius * cos, radius * sin]
    };
    let mut wall = Wall::from(corner(0), radius);
    for i in 1..sides {
        wall.line_to(corner(i));
    }
    Ok(Shape::closed(p.kind(), wall))
}

/// Four equal sides, the long diagonal horizontal.
pub(super) fn rhombus(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let side = p.length("side")?;
    let angle = p.angle("acute_angle", 0.0, PI)?;
    if angle > FRAC_PI_2 * (1.0 + 1e-12) {
        let advice = ("", "give the smaller of the two inner angles");
        return Err(p.refuse("acute_angle", angle, "at most", FRAC_PI_2, advice));
    }
    let (long, short) = (side * (angle / 2.0).cos(), side * (angle / 2.0).sin());
    let mut wall = Wall::from([long, 0.0], short);
    wall.line_to([0.0, short]);
    wall.line_to([-long, 0.0]);
    wall.line_to([0.0, -short]);
    Ok(Shape::closed(p.kind(), wall))
}
