//! Kinds bounded by circles and ellipses: circle, ellipse, half ellipse, segment, sector, annulus.

use std::f64::consts::{PI, TAU};

use super::NominalError;
use super::parameters::Parameters;
use super::shape::{Shape, Wall};
use crate::geometry::curves::{arc, elliptical_arc};
use crate::geometry::{Loop, Outline, Point};

/// The angle of the downward axis, rad.
const DOWN: f64 = 1.5 * PI;

/// A full circle as a wall.
fn full_circle(
    p: &Parameters<'_>,
    centre: Point,
    radius: f64,
    smaller: f64,
) -> Result<Wall, NominalError> {
    let curve = arc(centre, radius, 0.0, TAU, p.chord_error(smaller))
        .map_err(|source| p.curve_error(source))?;
    let start = [centre[0] + radius, centre[1]];
    let mut wall = Wall::from(start, radius);
    wall.curve_to(&curve, start);
    Ok(wall)
}

/// A circle about the origin.
pub(super) fn circle(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let diameter = p.length("diameter")?;
    let wall = full_circle(p, [0.0; 2], diameter / 2.0, diameter)?;
    Ok(Shape::closed(p.kind(), wall))
}

/// An ellipse about the origin.
pub(super) fn ellipse(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, height) = (p.length("width")?, p.length("height")?);
    let axes = [width / 2.0, height / 2.0];
    let smaller = width.min(height);
    let curve = elliptical_arc([0.0; 2], axes, 0.0, TAU, p.chord_error(smaller))
        .map_err(|source| p.curve_error(source))?;
    let mut wall = Wall::from([axes[0], 0.0], smaller);
    wall.curve_to(&curve, [axes[0], 0.0]);
    Ok(Shape::closed(p.kind(), wall))
}

/// The lower half of an ellipse under its horizontal axis.
pub(super) fn half_ellipse(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (width, depth) = (p.length("width")?, p.length("depth")?);
    let smaller = width.min(depth);
    let curve = elliptical_arc(
        [0.0; 2],
        [width / 2.0, depth],
        PI,
        PI,
        p.chord_error(smaller),
    )
    .map_err(|source| p.curve_error(source))?;
    let mut wall = Wall::from([-width / 2.0, 0.0], smaller);
    wall.curve_to(&curve, [width / 2.0, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// The part of a circle below a chord: `radius = (width^2/4 + depth^2) / (2 depth)`.
pub(super) fn circular_segment(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let depth = p.length("depth")?;
    let (radius, width) = match (p.optional_length("radius")?, p.optional_length("width")?) {
        (Some(radius), None) => {
            if depth >= 2.0 * radius * (1.0 - 1e-9) {
                let advice = (
                    ", the diameter",
                    "reduce the depth, or use kind circle for the whole circle",
                );
                return Err(p.refuse("depth", depth, "below", 2.0 * radius, advice));
            }
            (radius, 2.0 * (depth * (2.0 * radius - depth)).sqrt())
        }
        (None, Some(width)) => {
            let radius = (width * width / 4.0 + depth * depth) / (2.0 * depth);
            (radius, width)
        }
        _ => {
            return Err(NominalError::OneOf {
                kind: p.kind(),
                parameters: "`radius` and `width`",
                given: p.count_given(&["radius", "width"]),
            });
        }
    };
    // Half the angle at the centre; from the half-angle form, which keeps its digits for shallow segments.
    let half = 2.0 * (2.0 * depth / width).atan();
    let smaller = width.min(depth);
    let curve = arc(
        [0.0, radius - depth],
        radius,
        DOWN - half,
        2.0 * half,
        p.chord_error(smaller),
    )
    .map_err(|source| p.curve_error(source))?;
    let mut wall = Wall::from([-width / 2.0, 0.0], smaller);
    wall.curve_to(&curve, [width / 2.0, 0.0]);
    Ok(Shape::groove(p.kind(), wall))
}

/// A pie piece with its apex at the origin, symmetrical about the downward axis.
pub(super) fn circular_sector(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let radius = p.length("radius")?;
    let angle = p.angle("angle", 0.0, TAU * (1.0 - 1e-9))?;
    let half_width = radius * (angle / 2.0).min(PI / 2.0).sin();
    let smaller = radius.min(2.0 * half_width);
    let chord_error = p.chord_error(smaller);
    let curve = arc([0.0; 2], radius, DOWN - angle / 2.0, angle, chord_error)
        .map_err(|source| p.curve_error(source))?;
    let mut wall = Wall::from([0.0; 2], smaller);
    if let [start, .., end] = curve.as_slice() {
        wall.line_to(*start);
        wall.curve_to(&curve, *end);
    }
    Ok(Shape::closed(p.kind(), wall))
}

/// The space between two circles; the chord error refers to the concentric gap.
pub(super) fn annulus(p: &Parameters<'_>) -> Result<Shape, NominalError> {
    let (outer, inner) = (p.length("outer_diameter")?, p.length("inner_diameter")?);
    let offset = p.signed_length("offset")?;
    let gap = (outer - inner) / 2.0;
    if gap <= 1e-9 * outer {
        let advice = (", the outer diameter", "make the inner circle smaller");
        return Err(p.refuse("inner_diameter", inner, "below", outer, advice));
    }
    if offset.abs() >= gap * (1.0 - 1e-9) {
        let advice = (
            ", where the circles touch",
            "move the inner circle towards the centre or make it smaller",
        );
        let (relation, limit) = if offset > 0.0 {
            ("below", gap)
        } else {
            ("above", -gap)
        };
        return Err(p.refuse("offset", offset, relation, limit, advice));
    }
    let wall = full_circle(p, [0.0; 2], outer / 2.0, gap)?;
    let island = full_circle(p, [offset, 0.0], inner / 2.0, gap)?;
    let mut outline = Outline::single(wall.closed());
    if let Some(lumen) = outline.lumens.first_mut() {
        lumen.islands.push(Loop::new(island.closed()));
    }
    Ok(Shape {
        kind: p.kind(),
        outline,
        flat_lid: false,
    })
}
